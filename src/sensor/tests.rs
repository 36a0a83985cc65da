//! The whole published tables, the inverses, the ends of every range.

use proptest::prelude::*;

use super::*;
use crate::quantity::{Celsius, Ohms, Reading, Readings, Volts};

/// One line of `thermocouples.csv`: °C, mV as NIST SRD 60 prints it, mV and mV/K as
/// the Python library `thermocouples_reference` 0.20 evaluates the same function.
struct Line {
    couple: Couple,
    t: f64,
    printed: f64,
    function: f64,
    slope: f64,
}

const THERMOCOUPLES: &str = include_str!("../../tests/data/oracle/sensors/thermocouples.csv");
const PT100: &str = include_str!("../../tests/data/oracle/sensors/pt100.csv");

fn lines() -> Vec<Line> {
    let number = |text: &str| text.parse::<f64>().unwrap();
    let line = |line: &str| {
        let cells: Vec<&str> = line.split(',').collect();
        let couple = Couple::ALL.into_iter().find(|c| c.letter() == cells[0]);
        Line {
            couple: couple.unwrap(),
            t: number(cells[1]),
            printed: number(cells[2]),
            function: number(cells[3]),
            slope: number(cells[4]),
        }
    };
    THERMOCOUPLES.lines().skip(1).map(line).collect()
}

fn millivolts(couple: Couple, t: f64) -> f64 {
    voltage(couple, Celsius::of(t)).unwrap().get() * 1e3
}

fn back(couple: Couple, mv: f64) -> Option<f64> {
    temperature_at(couple, Volts::of(mv * 1e-3), Celsius::of(0.0)).map(Celsius::get)
}

#[test]
fn every_line_of_the_published_tables_is_met() {
    let lines = lines();
    // K -270..1372, J -210..1200, T -270..400, a line a degree.
    assert_eq!(lines.len(), 1643 + 1411 + 671);
    for line in lines {
        let (mv, at) = (millivolts(line.couple, line.t), (line.couple, line.t));
        // The table is printed to 0.001 mV; a tie may have been rounded either way.
        assert!((mv - line.printed).abs() < 0.000_500_1, "{at:?}: {mv}");
        assert!((mv - line.function).abs() < 2e-9, "{at:?}: {mv}");
        let slope = seebeck(line.couple, Celsius::of(line.t)).unwrap() * 1e3;
        // At 0 °C (K, T) and 760 °C (J) two stretches meet with slopes of their own.
        let meets = line.t == 0.0 || line.t == 760.0;
        let allowed = if meets { 1e-3 } else { 2e-9 };
        assert!((slope - line.slope).abs() < allowed, "{at:?}: {slope}");
    }
}

#[test]
fn every_voltage_leads_back_to_its_temperature() {
    for line in lines() {
        let t = back(line.couple, line.function).unwrap();
        // The table's nine decimals are worth 1 uK at 1 uV/K near -270 °C.
        assert!(
            (t - line.t).abs() < 1e-5,
            "{:?}: {t}",
            (line.couple, line.t)
        );
    }
}

#[test]
fn pt100_is_as_iec_60751_says_at_every_degree() {
    let mut count = 0;
    for line in PT100.lines().skip(1) {
        let cells: Vec<f64> = line.split(',').map(|c| c.parse().unwrap()).collect();
        let at = Celsius::of(cells[0]);
        let ohms = pt100_resistance(at).unwrap().get();
        assert!((ohms - cells[1]).abs() < 2e-9, "{line}: {ohms}");
        assert!((pt100_slope(at).unwrap() - cells[2]).abs() < 2e-9, "{line}");
        let t = pt100_temperature(Ohms::of(cells[1])).unwrap().get();
        assert!((t - cells[0]).abs() < 1e-7, "{line}: {t}");
        count += 1;
    }
    assert_eq!(count, 1051);
    // The standard's own table, to 0.01 ohm (from memory, but for 100, 200 and the ends).
    for (t, ohms) in [
        (-200.0, 18.52),
        (-100.0, 60.26),
        (-50.0, 80.31),
        (0.0, 100.0),
        (50.0, 119.40),
        (100.0, 138.51),
        (200.0, 175.86),
        (300.0, 212.05),
        (400.0, 247.09),
        (500.0, 280.98),
        (600.0, 313.71),
        (850.0, 390.48),
    ] {
        let computed = pt100_resistance(Celsius::of(t)).unwrap().get();
        assert!((computed - ohms).abs() < 0.005_01, "{t}: {computed}");
    }
}

#[test]
fn nothing_is_known_outside_the_ranges() {
    for (couple, low, high) in [
        (Couple::K, -270.0, 1372.0),
        (Couple::J, -210.0, 1200.0),
        (Couple::T, -270.0, 400.0),
    ] {
        for (end, away) in [(low, -1.0), (high, 1.0)] {
            let mv = millivolts(couple, end);
            assert!((back(couple, mv).unwrap() - end).abs() < 1e-6, "{couple:?}");
            assert_eq!(back(couple, mv + away * 0.001), None, "{couple:?} {end}");
            let beyond = Celsius::of(end + away * 0.01);
            assert_eq!(voltage(couple, beyond), None);
            assert_eq!(seebeck(couple, beyond), None);
            // Terminals beyond the range can't be compensated.
            assert_eq!(temperature_at(couple, Volts::of(0.0), beyond), None);
        }
    }
    for (end, away) in [(-200.0, -1.0), (850.0, 1.0)] {
        let ohms = pt100_resistance(Celsius::of(end)).unwrap().get();
        let t = pt100_temperature(Ohms::of(ohms)).unwrap().get();
        assert!((t - end).abs() < 1e-6);
        assert_eq!(pt100_temperature(Ohms::of(ohms + away * 0.01)), None);
        assert_eq!(pt100_resistance(Celsius::of(end + away * 0.01)), None);
    }
}

#[test]
fn the_functions_rise_all_the_way_also_where_stretches_meet() {
    for couple in Couple::ALL {
        let low = if couple == Couple::J { -2100 } else { -2700 };
        let rising = (low..13_720)
            .filter_map(|t| voltage(couple, Celsius::of(f64::from(t) * 0.1)))
            .collect::<Vec<_>>();
        assert!(rising.is_sorted_by(|a, b| a < b), "{couple:?}");
    }
}

#[test]
fn the_terminals_count() {
    // K 4.096 mV read with the terminals at 25 °C is 124.3 °C: NIST's table has
    // 1.000 mV at 25 °C and 5.096 mV between 124 and 125 °C.
    let t = temperature_at(Couple::K, Volts::of(4.096e-3), Celsius::of(25.0)).unwrap();
    assert!((t.get() - 124.3).abs() < 0.05, "{t}");
    // No voltage: as warm as the terminals.
    let t = temperature_at(Couple::J, Volts::of(0.0), Celsius::of(23.4)).unwrap();
    assert!((t.get() - 23.4).abs() < 1e-6, "{t}");
}

fn couple(couple: Couple, class: CoupleClass) -> Sensor {
    Sensor::Thermocouple { couple, class }
}

#[test]
fn tolerances_are_those_of_the_classes() {
    use Couple::{J, K, T};
    use CoupleClass::{One, Two};
    let pt = |class| Sensor::Pt100 { class };
    // IEC 60584-1:2013 and IEC 60751, as restated; each computed by hand.
    for (sensor, t, wide) in [
        (couple(K, One), -40.0, Some(1.5)),
        (couple(K, One), 375.0, Some(1.5)),
        (couple(K, One), 500.0, Some(2.0)),
        (couple(K, One), 1000.0, Some(4.0)),
        (couple(K, One), 1000.1, None),
        (couple(K, One), -40.1, None),
        (couple(K, Two), 100.0, Some(2.5)),
        (couple(K, Two), 1200.0, Some(9.0)),
        (couple(K, Two), 1200.1, None),
        (couple(J, One), 750.0, Some(3.0)),
        (couple(J, Two), 750.0, Some(5.625)),
        (couple(J, Two), 750.1, None),
        (couple(T, One), 100.0, Some(0.5)),
        (couple(T, One), 350.0, Some(1.4)),
        (couple(T, Two), 100.0, Some(1.0)),
        (couple(T, Two), 200.0, Some(1.5)),
        (couple(T, Two), 350.1, None),
        (pt(PlatinumClass::AA), 100.0, Some(0.27)),
        (pt(PlatinumClass::AA), -0.1, None),
        (pt(PlatinumClass::A), 100.0, Some(0.35)),
        (pt(PlatinumClass::A), -30.0, Some(0.21)),
        (pt(PlatinumClass::A), 300.1, None),
        (pt(PlatinumClass::B), 0.0, Some(0.3)),
        (pt(PlatinumClass::B), -50.0, Some(0.55)),
        (pt(PlatinumClass::B), 500.1, None),
        (pt(PlatinumClass::C), 600.0, Some(6.6)),
        (pt(PlatinumClass::C), 600.1, None),
    ] {
        let found = tolerance(sensor, Celsius::of(t)).map(|k| k.get());
        match (found, wide) {
            (Some(found), Some(wide)) => {
                assert!((found - wide).abs() < 1e-12, "{sensor:?} at {t}: {found}");
            }
            (found, wide) => assert_eq!(found, wide, "{sensor:?} at {t}"),
        }
    }
}

#[test]
fn a_raw_reading_that_is_missing_or_another_sensors_gives_no_temperature() {
    let k = couple(Couple::K, CoupleClass::One);
    let pt = Sensor::Pt100 {
        class: PlatinumClass::B,
    };
    let volts = Readings::one(Reading::ThermocoupleVoltage, 0.004_096);
    let mut both = volts;
    both.set(Reading::TerminalTemperature, 25.0);
    let ohms = Readings::one(Reading::Resistance, 138.5055);
    assert_eq!(temperature_of(k, &volts), None);
    assert_eq!(temperature_of(k, &ohms), None);
    assert_eq!(temperature_of(pt, &both), None);
    assert!((temperature_of(k, &both).unwrap().get() - 124.3).abs() < 0.05);
    assert!((temperature_of(pt, &ohms).unwrap().get() - 100.0).abs() < 1e-6);
    let at = Celsius::of(100.0);
    assert_eq!(sensitivity(pt, Reading::ThermocoupleVoltage, at, at), None);
    assert_eq!(sensitivity(k, Reading::Power, at, at), None);
    assert_eq!(sensitivity(k, Reading::Temperature, at, at), Some(1.0));
}

#[test]
fn a_sensor_reads_back_from_a_stored_plan() {
    let k = couple(Couple::K, CoupleClass::One);
    let text = r#"{"thermocouple":{"couple":"K","class":"1"}}"#;
    assert_eq!(serde_json::to_string(&k).unwrap(), text);
    assert_eq!(serde_json::from_str::<Sensor>(text).unwrap(), k);
    let wrong = r#"{"thermocouple":{"couple":"K","class":"AA"}}"#;
    assert!(serde_json::from_str::<Sensor>(wrong).is_err());
    assert_eq!(k.words(), "thermocouple K, class 1 (IEC 60584-1)");
}

proptest! {
    #[test]
    fn raw_and_back_within_a_tenth_of_a_millikelvin(
        which in 0..4_usize, share in 0.0..1.0, terminals in -10.0..60.0,
    ) {
        let (sensor, low, high) = match which {
            0 => (couple(Couple::K, CoupleClass::One), -270.0, 1372.0),
            1 => (couple(Couple::J, CoupleClass::One), -210.0, 1200.0),
            2 => (couple(Couple::T, CoupleClass::One), -270.0, 400.0),
            _ => (Sensor::Pt100 { class: PlatinumClass::A }, -200.0, 850.0),
        };
        let at = Celsius::of(low + share * (high - low));
        let raw = raw_of(sensor, at, Celsius::of(terminals)).unwrap();
        let found = temperature_of(sensor, &raw).unwrap();
        prop_assert!((found - at).get().abs() < 1e-4, "{} for {}", found, at);
    }

    /// Against the difference quotient of the conversion itself.
    #[test]
    fn sensitivities_are_the_conversions_slopes(
        which in 0..4_usize, t in -40.0..350.0, terminals in 0.0..50.0,
    ) {
        let sensor = match which {
            3 => Sensor::Pt100 { class: PlatinumClass::A },
            n => couple(Couple::ALL[n], CoupleClass::One),
        };
        // Away from 0 °C, where two stretches meet.
        prop_assume!(f64::abs(t) > 1.0 && f64::abs(terminals) > 1.0);
        let (at, terminals) = (Celsius::of(t), Celsius::of(terminals));
        let raw = raw_of(sensor, at, terminals).unwrap();
        for (reading, value) in raw.iter() {
            let step = match reading {
                Reading::ThermocoupleVoltage => 1e-6,
                _ => 0.01,
            };
            let moved = |by: f64| {
                let mut raw = raw;
                raw.set(reading, value + by);
                temperature_of(sensor, &raw).unwrap()
            };
            let slope = (moved(step) - moved(-step)).get() / (2.0 * step);
            let stated = sensitivity(sensor, reading, at, terminals).unwrap();
            prop_assert!((slope / stated - 1.0).abs() < 1e-4, "{:?}: {} {}", reading, slope, stated);
        }
    }

    #[test]
    fn no_number_makes_it_panic(volts in any::<f64>(), terminals in any::<f64>(), ohms in any::<f64>()) {
        for couple in Couple::ALL {
            if let (Some(v), Some(t)) = (Volts::new(volts), Celsius::new(terminals)) {
                let _ = temperature_at(couple, v, t);
                let _ = voltage(couple, t);
            }
        }
        let _ = Ohms::new(ohms).and_then(pt100_temperature);
    }
}
