//! The room's tests over whole benches: messages in, replies out.

use super::*;
use crate::quantity::{Moment, Reading, Readings, Seconds};
use crate::sensor::{Couple, CoupleClass, PlatinumClass, temperature_of, tolerance};
use crate::spec::shipped::{DRIVERS, VIRTUAL_BENCH, VIRTUAL_UNITS};
use crate::spec::{load_bench, load_driver, load_virtual_unit};

/// A table for people, with `--nocapture`.
pub(super) fn show(table: &str) {
    use std::io::Write;
    let _ = writeln!(std::io::stderr(), "\n{table}");
}

/// The shipped bench around `unit`, switch in the unit's own order, seed 1, 23 degC.
pub(super) fn staging_of(unit: VirtualUnit) -> Staging {
    let drivers: Vec<Driver> = DRIVERS
        .iter()
        .map(|s| load_driver(s.path, s.text.as_bytes()).value.unwrap())
        .collect();
    let bench = load_bench(VIRTUAL_BENCH.path, VIRTUAL_BENCH.text.as_bytes())
        .value
        .unwrap();
    let connections = bench.bays[0].roles.iter().map(|role| {
        let instrument = bench
            .instruments
            .iter()
            .find(|i| i.name.value == role.instrument.value)
            .unwrap();
        let driver = drivers
            .iter()
            .find(|d| d.name == instrument.driver.value)
            .unwrap();
        Connection {
            line: instrument.line.value.clone(),
            instrument: instrument.name.value.clone(),
            identity: instrument.identity.value.clone(),
            driver: driver.clone(),
            role: role.role.value.clone(),
            kind: driver.fills[0],
            channel: role.channel.as_ref().map(|c| c.value),
            sensor: role.sensor.as_ref().map(|s| s.value),
        }
    });
    Staging {
        positions: unit
            .positions
            .iter()
            .map(|p| p.name.value.clone())
            .collect(),
        connections: connections.collect(),
        unit,
        seed: 1,
        faults: Vec::new(),
        ambient: Celsius::of(23.0),
        speed: 1.0,
    }
}

/// The dryer, with faults.
pub(super) fn dryer(faults: &[&str]) -> Staging {
    let shipped = VIRTUAL_UNITS[0];
    let unit = load_virtual_unit(shipped.path, shipped.text.as_bytes());
    let mut staging = staging_of(unit.value.unwrap());
    staging.faults = faults.iter().map(|f| f.parse().unwrap()).collect();
    staging
}

fn at(seconds: f64) -> Moment {
    Moment::START + Seconds::of(seconds)
}

/// Sends a line and waits for the reply: what came, and after how long.
fn ask(far: &mut dyn FarSide, line: &str, now: Moment) -> Option<(String, f64)> {
    far.receive(line.as_bytes(), now);
    far.receive(b"\n", now);
    let due = far.due()?;
    let mut out = Vec::new();
    far.deliver(Moment::from_micros(due.as_micros() - 1), &mut out);
    assert!(out.is_empty(), "a reply came before its time");
    far.deliver(due, &mut out);
    let text = String::from_utf8_lossy(&out);
    let text = text.strip_suffix('\n').expect("the driver's terminator");
    Some((text.to_owned(), due.since(now).get()))
}

fn reply(far: &mut dyn FarSide, line: &str, now: Moment) -> String {
    ask(far, line, now).map_or_else(|| "(nothing)".to_owned(), |(text, _)| text)
}

fn fields(text: &str) -> Vec<f64> {
    text.split([';', ',']).map(|f| f.parse().unwrap()).collect()
}

const METER: &str = ":MEAS:VOLT:AC?;:MEAS:CURR:AC?;:MEAS:POW:ACT?";
const BODY: &str = "MEAS:TEMP? (@1)";
const AMBIENT: &str = "MEAS:TEMP? (@2)";
const ERRORS: &str = "SYST:ERR?";

/// A bench whose output is on at 230 V in `position` from the start.
fn energised(staging: Staging, position: u32) -> VirtualBench {
    let bench = VirtualBench::new(staging).unwrap();
    let mut supply = bench.far_side("supply line");
    let mut switch = bench.far_side("switch line");
    switch.receive(format!("ROUT:POS {position}\n").as_bytes(), Moment::START);
    supply.receive(b"SOUR:VOLT 230\nOUTP ON\n", Moment::START);
    assert!(supply.due().is_none() && switch.due().is_none());
    bench
}

#[test]
fn each_instrument_says_that_it_is_virtual() {
    let bench = VirtualBench::new(dryer(&[])).unwrap();
    for (line, name) in [
        ("supply line", "SUPPLY"),
        ("meter line", "METER"),
        ("scanner line", "SCANNER"),
        ("switch line", "SWITCH"),
    ] {
        let mut far = bench.far_side(line);
        let wanted = format!("RATEPLATE,VIRTUAL-{name},0001,0.1 x1");
        assert_eq!(reply(&mut *far, "*IDN?", at(0.0)), wanted);
        assert_eq!(reply(&mut *far, "*idn?\r", at(0.1)), wanted);
    }
    let mut staging = dryer(&[]);
    staging.speed = 20.0;
    let bench = VirtualBench::new(staging).unwrap();
    assert!(reply(&mut *bench.far_side("meter line"), "*IDN?", at(0.0)).ends_with(" x20"));
    assert!(ask(&mut *bench.far_side("nowhere"), "*IDN?", at(0.0)).is_none());
}

#[test]
fn replies_take_whole_milliseconds_that_grow_with_their_length() {
    let bench = VirtualBench::new(dryer(&[])).unwrap();
    let mut far = bench.far_side("meter line");
    let (_, long) = ask(&mut *far, METER, at(1.0)).unwrap();
    let (_, short) = ask(&mut *far, ERRORS, at(2.0)).unwrap();
    for seconds in [long, short] {
        assert!((seconds * 1e3 - (seconds * 1e3).round()).abs() < 1e-9);
        assert!((0.001..0.02).contains(&seconds), "{seconds} s");
    }
    assert!(short < long);
}

#[test]
fn the_supply_obeys_and_tells() {
    let bench = VirtualBench::new(dryer(&[])).unwrap();
    let mut far = bench.far_side("supply line");
    let mut say = |line: &str| reply(&mut *far, line, at(0.5));
    assert_eq!(say("OUTP?"), "0");
    assert_eq!(say("SOUR:VOLT 230"), "(nothing)");
    assert_eq!(say("SOUR:VOLT?"), "230.000");
    assert_eq!(say("SOUR:FREQ 60"), "(nothing)");
    assert_eq!(say("SOUR:FREQ?"), "60.000");
    assert_eq!(say("OUTP ON"), "(nothing)");
    assert_eq!(say("OUTP?"), "1");
    assert_eq!(say("OUTP OFF"), "(nothing)");
    assert_eq!(say("OUTP?"), "0");
    assert_eq!(say(ERRORS), "0,\"No error\"");
    assert_eq!((bench.output_is_on(), bench.offs_seen()), (false, 1));
}

#[test]
fn what_is_wrong_stands_in_the_error_queue() {
    let bench = VirtualBench::new(dryer(&[])).unwrap();
    let mut far = bench.far_side("supply line");
    let mut say = |line: &str| reply(&mut *far, line, at(0.5));
    for line in [
        "VOLT:NONSENSE?",
        "SOUR:VOLT 400",
        "SOUR:VOLT two",
        "SOUR:VOLT nan",
    ] {
        assert_eq!(say(line), "(nothing)");
    }
    assert_eq!(say(ERRORS), "-113,\"Undefined header\"");
    assert_eq!(say(ERRORS), "-222,\"Data out of range\"");
    assert_eq!(say(ERRORS), "-104,\"Data type error\"");
    assert_eq!(say("*CLS"), "(nothing)");
    assert_eq!(say(ERRORS), "0,\"No error\"");
    assert_eq!(say("SOUR:VOLT?"), "0.000");
    far.receive(&[b'x'; 5000], at(1.0));
    assert_eq!(
        reply(&mut *far, ERRORS, at(1.0)),
        "-363,\"Input buffer overrun\""
    );
    let mut switch = bench.far_side("switch line");
    switch.receive(b"ROUT:POS 3\nROUT:POS 1.5\nROUT:POS 2\n", at(1.0));
    assert_eq!(
        reply(&mut *switch, ERRORS, at(1.0)),
        "-222,\"Data out of range\""
    );
    assert_eq!(reply(&mut *switch, "ROUT:POS?", at(1.0)), "2");
    let mut scanner = bench.far_side("scanner line");
    assert_eq!(
        reply(&mut *scanner, "MEAS:TEMP? (@9)", at(1.0)),
        "(nothing)"
    );
    assert_eq!(
        reply(&mut *scanner, ERRORS, at(1.0)),
        "-222,\"Data out of range\""
    );
    assert_eq!(reply(&mut *scanner, "MEAS:TEMP? (@8)", at(1.0)), "9.91E37");
}

#[test]
fn any_bytes_at_all_are_survived() {
    let bench = VirtualBench::new(dryer(&[])).unwrap();
    let chance = super::chance::Chance::of(3, "bytes");
    for line in ["supply line", "meter line", "scanner line", "switch line"] {
        let mut far = bench.far_side(line);
        for n in 0..3000 {
            let bits = chance.bits(n).to_le_bytes();
            far.receive(&bits, at(n as f64 * 0.01));
            far.receive(b"SOUR:VOLT \nMEAS:TEMP? (@\n\n", at(n as f64 * 0.01));
            far.deliver(at(n as f64 * 0.01), &mut Vec::new());
        }
        far.deliver(at(100.0), &mut Vec::new());
        far.receive(b"\n*CLS\n", at(100.0));
        assert_eq!(reply(&mut *far, ERRORS, at(101.0)), "0,\"No error\"");
    }
}

#[test]
fn values_change_at_update_ticks_only() {
    let bench = energised(dryer(&[]), 2);
    let mut far = bench.far_side("meter line");
    let a = reply(&mut *far, METER, at(5.001));
    let b = reply(&mut *far, METER, at(5.09));
    let c = reply(&mut *far, METER, at(5.101));
    assert_eq!(a, b);
    assert_ne!(b, c);
}

#[test]
fn a_look_before_off_does_not_see_the_off() {
    let bench = energised(dryer(&[]), 2);
    let mut meter = bench.far_side("meter line");
    bench
        .far_side("supply line")
        .receive(b"OUTP OFF\n", at(60.05));
    let before = fields(&reply(&mut *meter, METER, at(60.06)));
    let after = fields(&reply(&mut *meter, METER, at(60.1)));
    assert!(before[2] > 5.0, "{before:?}");
    assert!(
        after[0].abs() < 0.3 && after[1].abs() < 5e-4 && after[2].abs() < 0.05,
        "{after:?}"
    );
}

#[test]
fn shown_values_are_within_the_stated_accuracy_of_the_truth() {
    let bench = energised(dryer(&[]), 2);
    let mut meter = bench.far_side("meter line");
    let mut scanner = bench.far_side("scanner line");
    let now = at(1500.0);
    let shown = fields(&reply(&mut *meter, METER, now));
    let body = fields(&reply(&mut *scanner, BODY, now))[0];
    let truth = bench.truth(now);
    assert!((shown[0] - 230.0).abs() < 0.4);
    assert!((shown[1] - truth.current.get()).abs() < 4e-4);
    assert!(
        (shown[2] - truth.power.get()).abs() < 0.035,
        "{shown:?} {truth:?}"
    );
    assert!((body - truth.link.get()).abs() < 2.0);
}

#[test]
fn an_overload_is_said_and_not_shown() {
    let mut staging = dryer(&[]);
    for connection in &mut staging.connections {
        for accuracy in &mut connection.driver.accuracy {
            accuracy.ranges.retain(|full| *full <= 0.1);
            if accuracy.ranges.is_empty() && accuracy.reading.word() == "power" {
                accuracy.ranges.push(5.0);
            }
        }
    }
    let bench = energised(staging, 2);
    let reply = reply(&mut *bench.far_side("meter line"), METER, at(10.0));
    assert!(reply.ends_with(";9.9E37"), "{reply}");
}

#[test]
fn the_same_messages_give_the_same_bytes() {
    let run = |seed: u64, every: f64| {
        let mut staging = dryer(&[]);
        staging.seed = seed;
        let bench = energised(staging, 2);
        let mut meter = bench.far_side("meter line");
        let mut scanner = bench.far_side("scanner line");
        let mut at_ticks = String::new();
        let mut t = 0.1;
        while t < 200.0 {
            let a = reply(&mut *meter, METER, at(t));
            let b = reply(&mut *scanner, BODY, at(t));
            if (t / 10.0).fract() < 1e-6 {
                at_ticks.push_str(&a);
                at_ticks.push_str(&b);
            }
            t = ((t + every) * 1e6).round() * 1e-6;
        }
        at_ticks
    };
    assert_eq!(run(1, 0.1), run(1, 0.1));
    assert_ne!(run(1, 0.1), run(2, 0.1));
}

#[test]
fn two_instruments_on_a_line_are_refused() {
    let mut staging = dryer(&[]);
    staging.connections[1].line = "supply line".to_owned();
    let error = VirtualBench::new(staging).unwrap_err().to_string();
    assert!(
        error.contains("`supply line` serves `supply` and `meter`"),
        "{error}"
    );
}

#[test]
fn a_position_that_the_unit_lacks_is_refused() {
    let mut staging = dryer(&[]);
    staging.positions.push("turbo".to_owned());
    let error = VirtualBench::new(staging).unwrap_err().to_string();
    assert!(
        error.contains("no position `turbo`; it has low, high"),
        "{error}"
    );
}

/// Body and ambient as the scanner shows them, and the meter's power.
fn shown(bench: &VirtualBench, now: f64) -> (f64, f64, f64) {
    let mut scanner = bench.far_side("scanner line");
    let body = fields(&reply(&mut *scanner, BODY, at(now)))[0];
    let ambient = fields(&reply(&mut *scanner, AMBIENT, at(now)))[0];
    let watts = fields(&reply(&mut *bench.far_side("meter line"), METER, at(now)))[2];
    (body, ambient, watts)
}

/// The same at 20 minutes in the high position, for the good unit and for a fault.
fn good_and(fault: &str) -> ((f64, f64, f64), (f64, f64, f64)) {
    let good = shown(&energised(dryer(&[]), 2), 1200.0);
    (good, shown(&energised(dryer(&[fault]), 2), 1200.0))
}

#[test]
fn each_fault_of_the_unit_is_visible_in_what_the_instruments_show() {
    let (good, dead) = good_and("dead-unit");
    assert!(good.2 > 8.0 && dead.2.abs() < 0.05 && (dead.0 - dead.1).abs() < 2.1);
    let (_, wrong) = good_and("wrong-element");
    assert!(wrong.2 > 10.8 && wrong.0 > 95.0, "{wrong:?}");
    let (_, loose) = good_and("loose-clamp");
    assert!(
        loose.2 < 0.7 * good.2 && loose.0 > good.0 + 3.0,
        "{loose:?}"
    );
    let (_, stuck) = good_and("stuck-fan");
    assert!(
        stuck.2 < 0.8 * good.2 && stuck.0 > good.0 + 3.0,
        "{stuck:?}"
    );
    let (_, link) = good_and("wrong-link");
    assert!(link.2.abs() < 0.05 && link.0 < good.0 - 10.0, "{link:?}");
    let (_, swapped) = good_and("swapped-positions");
    assert!((4.0..5.0).contains(&swapped.2), "{swapped:?}");
    let shorted = energised(dryer(&["shorted-element"]), 1);
    assert!(shorted.truth(at(0.2)).current.get() > 16.0);
}

#[test]
fn a_link_may_open_by_itself_in_the_soak() {
    let bench = energised(dryer(&["link-opens-mid-soak"]), 2);
    assert!(bench.truth(at(419.9)).power.get() > 7.0);
    let after = bench.truth(at(420.1));
    assert!(after.link_open && after.power.get() == 0.0 && after.current.get() == 0.0);
}

#[test]
fn each_fault_of_a_sensor_is_visible_in_what_the_scanner_shows() {
    let (good, fallen) = good_and("sensor-fallen-off");
    assert!(fallen.0 < fallen.1 + 5.0, "{fallen:?}");
    let (_, swapped) = good_and("swapped-channels");
    assert!(swapped.1 > swapped.0 + 30.0, "{swapped:?}");
    let (_, reversed) = good_and("sensor-reversed");
    assert!(reversed.0 < 0.0, "{reversed:?}");
    let (_, other) = good_and("sensor-wrong-type");
    assert!((5.0..15.0).contains(&(good.0 - other.0)), "{other:?}");
    let bench = energised(dryer(&["sensor-open@600s"]), 2);
    let mut scanner = bench.far_side("scanner line");
    assert_ne!(reply(&mut *scanner, BODY, at(599.0)), "9.91E37");
    assert_eq!(reply(&mut *scanner, BODY, at(600.0)), "9.91E37");
    assert_ne!(reply(&mut *scanner, AMBIENT, at(600.0)), "9.91E37");
}

#[test]
fn each_fault_of_a_line_begins_when_it_is_told_to() {
    let meter = |fault: &str| {
        let bench = VirtualBench::new(dryer(&[fault])).unwrap();
        let mut far = bench.far_side("meter line");
        let before = ask(&mut *far, "*IDN?", at(299.0)).unwrap();
        assert_eq!(before.0, "RATEPLATE,VIRTUAL-METER,0001,0.1 x1", "{fault}");
        far
    };
    let now = at(300.0);
    assert!(ask(&mut *meter("no-reply@300s"), METER, now).is_none());
    assert!(ask(&mut *meter("disconnect@300s"), METER, now).is_none());
    let (_, late) = ask(&mut *meter("late-reply@300s"), METER, now).unwrap();
    assert!((0.75..0.8).contains(&late), "{late} s after 500 ms allowed");
    let (echo, _) = ask(&mut *meter("echo@300s"), METER, now).unwrap();
    assert!(echo.starts_with(&format!("{METER}\n")), "{echo}");
    let (garbled, _) = ask(&mut *meter("garbled@300s"), METER, now).unwrap();
    assert!(garbled.contains('\u{fffd}'), "{garbled}");
    let (stranger, _) = ask(&mut *meter("wrong-identity@300s"), "*IDN?", now).unwrap();
    assert_eq!(stranger, "RATEPLATE,VIRTUAL-STRANGER,0001,0.1 x1");
    assert!(ask(&mut *meter("no-reply:body@300s"), METER, now).is_some());
}

#[test]
fn a_supply_in_trouble_says_so_after_each_command() {
    let bench = VirtualBench::new(dryer(&["error-queue@10s"])).unwrap();
    let mut far = bench.far_side("supply line");
    assert_eq!(reply(&mut *far, "SOUR:VOLT 230", at(9.0)), "(nothing)");
    assert_eq!(reply(&mut *far, ERRORS, at(9.0)), "0,\"No error\"");
    assert_eq!(reply(&mut *far, "OUTP OFF", at(10.0)), "(nothing)");
    assert_eq!(
        reply(&mut *far, ERRORS, at(10.0)),
        "-300,\"Device-specific error\""
    );
    assert_eq!(reply(&mut *far, ERRORS, at(10.0)), "0,\"No error\"");
}

#[test]
fn a_dead_line_forgets_what_was_on_its_way() {
    let bench = VirtualBench::new(dryer(&["disconnect@1s"])).unwrap();
    let mut far = bench.far_side("meter line");
    far.receive(b"*IDN?\n", Moment::from_micros(999_999));
    let mut out = Vec::new();
    far.deliver(at(2.0), &mut out);
    assert!(out.is_empty() && far.due().is_none());
}

/// The dryer with a scanner of another driver, and a sensor on each of its channels.
fn raw_dryer(driver: &str, sensor: Sensor, faults: &[&str]) -> Staging {
    let mut staging = dryer(faults);
    let shipped = DRIVERS.iter().find(|s| s.path.contains(driver)).unwrap();
    let driver = load_driver(shipped.path, shipped.text.as_bytes()).value;
    let scanned = staging.connections.iter_mut();
    for connection in scanned.filter(|c| c.kind == RoleKind::Temperature) {
        connection.driver = driver.clone().unwrap();
        connection.sensor = Some(sensor);
    }
    staging
}

const K: Sensor = Sensor::Thermocouple {
    couple: Couple::K,
    class: CoupleClass::One,
};
const PT: Sensor = Sensor::Pt100 {
    class: PlatinumClass::B,
};

/// What the raw scanner says of a channel in the high position at 20 min.
fn raw_reply(driver: &str, sensor: Sensor, faults: &[&str], channel: u32) -> String {
    let bench = energised(raw_dryer(driver, sensor, faults), 2);
    let line = match sensor {
        Sensor::Thermocouple { .. } => format!("MEAS:VOLT:DC? (@{channel});:MEAS:TEMP:RJUN?"),
        Sensor::Pt100 { .. } => format!("MEAS:FRES? (@{channel})"),
    };
    reply(&mut *bench.far_side("scanner line"), &line, at(1200.0))
}

fn degrees(sensor: Sensor, reply: &str) -> Option<f64> {
    let mut raw = Readings::NONE;
    let kinds = match sensor {
        Sensor::Thermocouple { .. } => {
            &[Reading::ThermocoupleVoltage, Reading::TerminalTemperature][..]
        }
        Sensor::Pt100 { .. } => &[Reading::Resistance],
    };
    for (kind, value) in kinds.iter().zip(fields(reply)) {
        raw.set(*kind, value);
    }
    temperature_of(sensor, &raw).map(Celsius::get)
}

#[test]
fn raw_scanners_say_volts_and_ohms_that_lead_back_to_the_truth() {
    let truth = energised(dryer(&[]), 2).truth(at(1200.0));
    for (driver, sensor) in [("thermocouple", K), ("resistance", PT)] {
        for (channel, truth) in [(1, truth.link), (2, truth.ambient), (3, truth.enclosure)] {
            let said = raw_reply(driver, sensor, &[], channel);
            let found = degrees(sensor, &said).unwrap();
            // The class's tolerance, 0.6 K for the scanner, 1 % of the rise for contact.
            let contact = 0.01 * (truth.get() - 23.0).abs();
            let wide = tolerance(sensor, truth).unwrap().get() + 0.6 + contact;
            let off = found - truth.get();
            assert!(off.abs() <= wide, "{said}: {found} for {truth}");
            assert!(off != 0.0);
        }
    }
    let couple = fields(&raw_reply("thermocouple", K, &[], 1));
    assert!((0.001..0.003).contains(&couple[0]), "{couple:?}");
    // Its own warmth, and half a kelvin of accuracy.
    assert!((23.0..25.6).contains(&couple[1]), "{couple:?}");
    assert!((115.0..130.0).contains(&fields(&raw_reply("resistance", PT, &[], 1))[0]));
}

#[test]
fn every_channel_has_the_same_terminals_and_they_drift_slowly() {
    let bench = VirtualBench::new(raw_dryer("thermocouple", K, &[])).unwrap();
    let mut far = bench.far_side("scanner line");
    let mut at_terminals = |channel: u32, now: f64| {
        let line = format!("MEAS:VOLT:DC? (@{channel});:MEAS:TEMP:RJUN?");
        fields(&reply(&mut *far, &line, at(now)))[1]
    };
    let first = at_terminals(1, 0.1);
    assert_eq!(first, at_terminals(2, 0.2));
    let later = at_terminals(1, 3600.0);
    assert!((1.0..2.5).contains(&(later - first)), "{first} {later}");
}

#[test]
fn faults_of_a_raw_sensor_act_on_what_reaches_the_terminals() {
    let good = degrees(K, &raw_reply("thermocouple", K, &[], 1)).unwrap();
    let reversed = raw_reply("thermocouple", K, &["sensor-reversed"], 1);
    assert!(fields(&reversed)[0] < 0.0, "{reversed}");
    // The same voltage the other way round, but for the scanner's noise and offset: so
    // far below the terminals as it was above, or some more, since K weakens there.
    let volts = fields(&raw_reply("thermocouple", K, &[], 1))[0];
    assert!((fields(&reversed)[0] + volts).abs() < 1e-5, "{reversed}");
    let shown = degrees(K, &reversed).unwrap();
    assert!(
        (shown - (2.0 * fields(&reversed)[1] - good)).abs() < 3.0,
        "{shown}"
    );
    // Type J gives 5.269 mV at 100 degC where type K gives 4.096 (NIST SRD 60).
    let other = degrees(K, &raw_reply("thermocouple", K, &["sensor-wrong-type"], 1)).unwrap();
    assert!(
        ((other - 23.0) / (good - 23.0) - 1.28).abs() < 0.05,
        "{other}"
    );
    for (driver, sensor) in [("thermocouple", K), ("resistance", PT)] {
        let open = raw_reply(driver, sensor, &["sensor-open"], 1);
        assert!(open.starts_with("9.91E37"), "{open}");
        assert!(!raw_reply(driver, sensor, &["sensor-open"], 2).starts_with("9.91"));
    }
    // A resistance has no sign; ten times too much of it is beyond any Pt100.
    let good = raw_reply("resistance", PT, &[], 1);
    assert_eq!(raw_reply("resistance", PT, &["sensor-reversed"], 1), good);
    let other = raw_reply("resistance", PT, &["sensor-wrong-type"], 1);
    assert_eq!(degrees(PT, &other), None, "{other}");
}

#[test]
fn a_named_sensor_deviates_within_its_class_also_where_the_instrument_converts() {
    let plain = shown(&energised(dryer(&[]), 2), 1200.0).0;
    let mut seen = Vec::new();
    for class in [CoupleClass::One, CoupleClass::Two] {
        let mut staging = dryer(&[]);
        staging.connections.iter_mut().for_each(|c| {
            c.sensor = Some(Sensor::Thermocouple {
                couple: Couple::K,
                class,
            });
        });
        let off = shown(&energised(staging, 2), 1200.0).0 - plain;
        seen.push(off);
    }
    // The same specimen lies at the same place within either class: 1.5 and 2.5 K.
    assert!(seen[0] != 0.0 && seen[0].abs() <= 1.52, "{seen:?}");
    assert!((seen[1] / seen[0] - 2.5 / 1.5).abs() < 0.1, "{seen:?}");
}

// Settled at 9 W or so: an hour more counts as much as the power says.
#[test]
fn a_meter_with_an_energy_counter_counts_what_was_drawn() {
    let mut staging = dryer(&[]);
    for connection in &mut staging.connections {
        if connection.kind == RoleKind::PowerMeter {
            connection
                .driver
                .readings
                .push(crate::spec::driver::ReadingQuery {
                    ask: ":MEAS:ENER?".to_owned(),
                    gives: vec![Reading::Energy],
                });
        }
    }
    let bench = energised(staging, 2);
    let mut meter = bench.far_side("meter line");
    let counted: Vec<f64> = [0.0, 3600.0, 7200.0, 9000.0]
        .into_iter()
        .map(|t| fields(&reply(&mut *meter, ":MEAS:ENER?", at(t)))[0])
        .collect();
    let watts = fields(&reply(&mut *meter, METER, at(9001.0)))[2];
    assert_eq!(counted[0], 0.0);
    let hour = counted[2] - counted[1];
    assert!((hour - watts).abs() < 0.02 * watts, "{counted:?} {watts}");
    let half = counted[3] - counted[2];
    assert!((half - 0.5 * hour).abs() < 0.01 * hour, "{counted:?}");
    // The first hour holds the inrush too.
    assert!(counted[1] > hour, "{counted:?}");
}

// ---- waveforms ----

const BOOTS: usize = 1;

/// The boot warmer, whose low position is fed through a diode.
fn boots(faults: &[&str]) -> Staging {
    let shipped = VIRTUAL_UNITS
        .iter()
        .find(|file| file.path.contains("boot-warmer"))
        .unwrap();
    let unit = load_virtual_unit(shipped.path, shipped.text.as_bytes());
    let mut staging = staging_of(unit.value.unwrap());
    staging.faults = faults.iter().map(|f| f.parse().unwrap()).collect();
    staging
}

/// Bytes of the reply to a message.
fn block(far: &mut dyn FarSide, line: &str, now: Moment) -> Vec<u8> {
    far.receive(format!("{line}\n").as_bytes(), now);
    let mut out = Vec::new();
    far.deliver(now + Seconds::of(20.0), &mut out);
    out
}

/// Volts and amperes of a switching on in a position, at a seed, fetched 2 s later.
fn taken(mut staging: Staging, position: usize, seed: u64) -> (Vec<f64>, Vec<f64>) {
    staging.seed = seed;
    let bench = VirtualBench::new(staging).unwrap();
    let mut supply = bench.far_side("supply line");
    let mut switch = bench.far_side("switch line");
    let mut meter = bench.far_side("meter line");
    switch.receive(format!("ROUT:POS {position}\n").as_bytes(), Moment::START);
    supply.receive(b"SOUR:VOLT 230\n", Moment::START);
    meter.receive(b":WAV:ARM\n", Moment::START);
    assert_eq!(block(&mut *meter, ":WAV:READY?", at(0.5)), b"0\n");
    supply.receive(b"OUTP ON\n", at(1.0));
    assert_eq!(block(&mut *meter, ":WAV:READY?", at(1.2)), b"0\n");
    assert_eq!(block(&mut *meter, ":WAV:READY?", at(2.0)), b"1\n");
    assert_eq!(block(&mut *meter, ":WAV:INT?", at(2.0)), b"0.0002\n");
    let bytes = block(&mut *meter, ":WAV:DATA?", at(3.0));
    assert_eq!(&bytes[..7], b"#512000");
    assert_eq!(bytes.len(), 7 + 12_000 + 1);
    let numbers: Vec<f64> = bytes[7..12_007]
        .chunks_exact(4)
        .map(|b| f64::from(f32::from_le_bytes(b.try_into().unwrap())))
        .collect();
    let of = |n: usize| numbers.iter().skip(n).step_by(2).copied().collect();
    (of(0), of(1))
}

fn mean(values: &[f64]) -> f64 {
    values.iter().sum::<f64>() / values.len() as f64
}

#[test]
fn the_meter_delivers_the_first_moments_of_a_switching_on() {
    // Ten periods of 50 Hz behind the 10 ms before the first current.
    let periods = 50..1050;
    let (volts, amps) = taken(boots(&[]), 2, 1);
    assert!(volts[..50].iter().all(|v| v.abs() < 0.5));
    let rms = mean(
        &volts[periods.clone()]
            .iter()
            .map(|v| v * v)
            .collect::<Vec<_>>(),
    )
    .sqrt();
    assert!((rms - 230.0).abs() < 0.5, "{rms}");
    let products = volts[periods.clone()].iter().zip(&amps[periods.clone()]);
    let watts = mean(&products.map(|(v, i)| v * i).collect::<Vec<_>>());
    // 230 V at 588 ohm within 1 % of spread: 90.0 W (computed).
    assert!((watts - 90.0).abs() < 3.0, "{watts}");
    // Behind the diode: no current the other way, DC the peak over pi (computed).
    let (_, half) = taken(boots(&[]), 1, 1);
    let peak = half.iter().copied().fold(0.0, f64::max);
    assert!(half.iter().all(|i| *i > -0.01));
    let dc = mean(&half[periods.clone()]);
    assert!(
        (dc - peak / std::f64::consts::PI).abs() < 0.01,
        "{dc} {peak}"
    );
}

#[test]
fn each_seed_switches_at_another_phase() {
    let first = |seed| taken(boots(&[]), 2, seed).0[50];
    let all: Vec<f64> = (1..=6).map(first).collect();
    assert_eq!(first(3), all[2]);
    for (n, volts) in all.iter().enumerate() {
        assert!(all[n + 1..].iter().all(|other| (other - volts).abs() > 0.5));
    }
}

#[test]
fn a_meter_that_loses_the_dc_part_loses_it_everywhere() {
    let (_, half) = taken(boots(&["meter-loses-dc"]), 1, 1);
    assert!(mean(&half[50..1050]).abs() < 0.01);
    let factor = |faults: &[&str]| {
        let bench = energised(boots(faults), BOOTS as u32);
        let mut meter = bench.far_side("meter line");
        let [volts, amps, watts] = fields(&reply(&mut *meter, METER, at(10.0)))[..] else {
            panic!("three fields");
        };
        watts / (volts * amps)
    };
    // 0.707 and 0.917 (computed).
    assert!((factor(&[]) - 0.707).abs() < 0.005);
    assert!((factor(&["meter-loses-dc"]) - 0.917).abs() < 0.005);
    assert!((factor(&["meter-loses-dc@60s"]) - 0.707).abs() < 0.005);
}

#[test]
fn a_waveform_that_was_not_taken_is_no_value() {
    let bench = energised(boots(&[]), 2);
    let mut meter = bench.far_side("meter line");
    assert_eq!(block(&mut *meter, ":WAV:DATA?", at(5.0)), b"9.91E37\n");
    assert_ne!(reply(&mut *meter, ERRORS, at(30.0)), "0,\"No error\"");
}
