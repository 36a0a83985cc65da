//! Who fills which role: bay, instruments, drivers and lines, and whether they can.

use chrono::NaiveDate;

use super::calibration::calibration_stands;
use super::notes::{Notes, listed};
use super::sensing::sensor_fits;
use super::types::{PlannedBay, PlannedInstrument, PlannedLine, PlannedRole};
use crate::quantity::Reading;
use crate::spec::bench::{Bay, Bench, Instrument, Port, RoleFilled};
use crate::spec::driver::{Driver, Thermal};
use crate::spec::nearest;
use crate::spec::sequence::{RoleKind, RoleNeed, Sequence};

/// A bay with everything behind its roles.
pub(super) struct Wired {
    pub(super) bay: PlannedBay,
    pub(super) instruments: Vec<PlannedInstrument>,
    pub(super) lines: Vec<PlannedLine>,
}

/// The files that are crossed.
#[derive(Clone, Copy)]
pub(super) struct Files<'a> {
    pub(super) sequence: &'a Sequence,
    pub(super) bench: &'a Bench,
    pub(super) drivers: &'a [Driver],
    pub(super) today: Option<NaiveDate>,
}

/// The bay that is asked for, else the first.
pub(super) fn choose_bay<'a>(
    files: Files<'a>,
    wanted: Option<&str>,
    notes: &mut Notes,
) -> Option<&'a Bay> {
    let bays = &files.bench.bays;
    let Some(wanted) = wanted else {
        if bays.is_empty() {
            notes.error(
                &files.bench.name.place,
                "the bench has no bay",
                "add one below `bays:`",
            );
        }
        return bays.first();
    };
    let found = bays.iter().find(|bay| bay.name.value == wanted);
    if found.is_none() {
        let known: Vec<&str> = bays.iter().map(|bay| bay.name.value.as_str()).collect();
        notes.unknown(&files.bench.name.place, "bay", wanted, &known);
    }
    found
}

/// Fills every role that the sequence needs.
pub(super) fn wire(files: Files, bay: &Bay, notes: &mut Notes) -> Wired {
    let mut wired = Wired {
        bay: PlannedBay {
            name: bay.name.value.clone(),
            rated_current: bay.rated_current,
            source: bay.source,
            roles: Vec::new(),
        },
        instruments: Vec::new(),
        lines: Vec::new(),
    };
    for need in &files.sequence.roles {
        if let Some(filled) = filled_by(need, bay, notes) {
            fill(files, need, filled, &mut wired, notes);
        }
    }
    one_role_per_channel(bay, &wired, notes);
    one_line_per_port(files.bench, &wired, notes);
    wired
}

fn filled_by<'a>(need: &RoleNeed, bay: &'a Bay, notes: &mut Notes) -> Option<&'a RoleFilled> {
    let found = bay
        .roles
        .iter()
        .find(|filled| filled.role.value == need.name.value);
    if found.is_none() {
        let known: Vec<&str> = bay.roles.iter().map(|f| f.role.value.as_str()).collect();
        let meant = match nearest(&need.name.value, known.iter().copied()) {
            Some(near) => format!("did you mean `{near}`? "),
            None => String::new(),
        };
        notes.error(
            &need.name.place,
            format!(
                "bay `{}` has no instrument for the role `{}`",
                bay.name.value, need.name.value
            ),
            format!(
                "{meant}add it below the bay's roles, or take it out here; the bay fills: {}",
                listed(&known)
            ),
        );
    }
    found
}

fn fill(files: Files, need: &RoleNeed, filled: &RoleFilled, wired: &mut Wired, notes: &mut Notes) {
    let instruments = &files.bench.instruments;
    let Some(instrument) = instruments
        .iter()
        .find(|i| i.name.value == filled.instrument.value)
    else {
        let known: Vec<&str> = instruments.iter().map(|i| i.name.value.as_str()).collect();
        return notes.unknown(
            &filled.instrument.place,
            "instrument",
            &filled.instrument.value,
            &known,
        );
    };
    let Some(driver) = files
        .drivers
        .iter()
        .find(|d| d.name == instrument.driver.value)
    else {
        let known: Vec<&str> = files.drivers.iter().map(|d| d.name.as_str()).collect();
        return notes.unknown(
            &instrument.driver.place,
            "driver",
            &instrument.driver.value,
            &known,
        );
    };
    can_fill(need, filled, driver, notes);
    channel_fits(filled, driver, notes);
    sensor_fits(need, filled, driver, notes);
    let Some(line) = line_of(files.bench, instrument, wired, notes) else {
        return;
    };
    let number = instrument_of(files, instrument, driver, line, wired, notes);
    wired.bay.roles.push(PlannedRole {
        name: need.name.value.clone(),
        kind: need.kind,
        instrument: number,
        channel: filled.channel.as_ref().map(|channel| channel.value),
        place: need.place.clone(),
        connection: filled.connection.clone(),
        sensor: filled.sensor.as_ref().map(|sensor| sensor.value),
    });
}

/// What a kind of role needs of a driver beyond saying that it fills it.
fn can_fill(need: &RoleNeed, filled: &RoleFilled, driver: &Driver, notes: &mut Notes) {
    let place = &filled.instrument.place;
    if !driver.fills.contains(&need.kind) {
        let fills: Vec<&str> = driver.fills.iter().map(|kind| kind.word()).collect();
        notes.error(
            place,
            format!(
                "driver `{}` can't fill the role `{}`, a {}",
                driver.name,
                need.name.value,
                need.kind.word()
            ),
            format!("it fills: {}", fills.join(", ")),
        );
        return;
    }
    let gives = |reading| driver.readings.iter().any(|q| q.gives.contains(&reading));
    let lacking: &[(&str, bool)] = &match need.kind {
        RoleKind::Supply => vec![
            ("settings: voltage", driver.settings.voltage.is_none()),
            ("settings: output on", driver.settings.output_on.is_none()),
            ("settings: output off", driver.settings.output_off.is_none()),
            (
                "settings: output state, by which OFF is confirmed",
                driver.settings.output_state.is_none(),
            ),
        ],
        RoleKind::PowerMeter => vec![
            ("a reading of power", !gives(Reading::Power)),
            ("a reading of current", !gives(Reading::Current)),
            ("a reading of voltage", !gives(Reading::Voltage)),
        ],
        RoleKind::Temperature => vec![("a reading of temperature", driver.thermal().is_none())],
        RoleKind::PositionSwitch => {
            vec![("settings: position", driver.settings.position.is_none())]
        }
    };
    for (what, _) in lacking.iter().filter(|(_, lacks)| *lacks) {
        notes.error(
            place,
            format!(
                "driver `{}` lacks {what}, which a {} needs",
                driver.name,
                need.kind.word()
            ),
            "add it to the driver from the instrument's manual, or use another instrument",
        );
    }
    for reading in read_by(need.kind, driver) {
        if gives(*reading) && driver.accuracy_of(*reading).is_none() {
            notes.warning(
                place,
                format!(
                    "driver `{}` states no accuracy of {}: what rests on it will be not judged",
                    driver.name,
                    reading.word()
                ),
                "add it below the driver's `accuracy:`, from the instrument's manual",
            );
        }
    }
}

/// What the results of a kind of role rest on. A driver that states the accuracy of
/// the whole chain in kelvins needs none of its raw readings.
fn read_by(kind: RoleKind, driver: &Driver) -> &'static [Reading] {
    match kind {
        RoleKind::PowerMeter => &[Reading::Voltage, Reading::Current, Reading::Power],
        RoleKind::Temperature if driver.accuracy_of(Reading::Temperature).is_some() => &[],
        RoleKind::Temperature => driver.thermal().map_or(&[], Thermal::readings),
        RoleKind::Supply | RoleKind::PositionSwitch => &[],
    }
}

fn channel_fits(filled: &RoleFilled, driver: &Driver, notes: &mut Notes) {
    match (&filled.channel, driver.channels) {
        (None, 0) => {}
        (None, most) => notes.error(
            &filled.instrument.place,
            format!(
                "role `{}` names no channel of `{}`",
                filled.role.value, filled.instrument.value
            ),
            format!("add `channel: 1` to `channel: {most}`"),
        ),
        (Some(channel), 0) => notes.error(
            &channel.place,
            format!("`{}` has no channels", filled.instrument.value),
            "take the channel out",
        ),
        (Some(channel), most) if channel.value == 0 || channel.value > most => notes.error(
            &channel.place,
            format!(
                "`{}` has no channel {}",
                filled.instrument.value, channel.value
            ),
            format!("its channels are 1 to {most}"),
        ),
        _ => {}
    }
}

/// Two roles on one channel would watch the same thing twice and something not at all.
fn one_role_per_channel(bay: &Bay, wired: &Wired, notes: &mut Notes) {
    for (n, role) in wired.bay.roles.iter().enumerate() {
        let before = &wired.bay.roles[..n];
        let Some(other) = before
            .iter()
            .find(|o| o.instrument == role.instrument && o.channel == role.channel)
        else {
            continue;
        };
        if role.kind != other.kind {
            continue;
        }
        if let Some(filled) = bay.roles.iter().find(|f| f.role.value == role.name) {
            notes.error(
                &filled.role.place,
                format!(
                    "roles `{}` and `{}` are filled by the same channel",
                    other.name, role.name
                ),
                "give each a channel of its own",
            );
        }
    }
}

/// The second of two lines on one port can't be opened; the run then ends before
/// anything is energised.
fn one_line_per_port(bench: &Bench, wired: &Wired, notes: &mut Notes) {
    for (n, line) in wired.lines.iter().enumerate() {
        let Port::Serial(settings) = &line.port else {
            continue;
        };
        let same = |other: &&PlannedLine| matches!(&other.port, Port::Serial(s) if s.path == settings.path);
        let Some(other) = wired.lines[..n].iter().find(same) else {
            continue;
        };
        if let Some(written) = bench.lines.iter().find(|l| l.name.value == line.name) {
            notes.warning(
                &written.name.place,
                format!(
                    "lines `{}` and `{}` name the same port, {}: the second can't be opened",
                    other.name, line.name, settings.path
                ),
                "give each line a port of its own, or put both instruments on one line",
            );
        }
    }
}

fn line_of(
    bench: &Bench,
    instrument: &Instrument,
    wired: &mut Wired,
    notes: &mut Notes,
) -> Option<usize> {
    if let Some(known) = wired
        .lines
        .iter()
        .position(|line| line.name == instrument.line.value)
    {
        return Some(known);
    }
    let Some(line) = bench
        .lines
        .iter()
        .find(|line| line.name.value == instrument.line.value)
    else {
        let known: Vec<&str> = bench
            .lines
            .iter()
            .map(|line| line.name.value.as_str())
            .collect();
        notes.unknown(
            &instrument.line.place,
            "line",
            &instrument.line.value,
            &known,
        );
        return None;
    };
    wired.lines.push(PlannedLine {
        name: line.name.value.clone(),
        port: line.port.clone(),
    });
    Some(wired.lines.len() - 1)
}

fn instrument_of(
    files: Files,
    instrument: &Instrument,
    driver: &Driver,
    line: usize,
    wired: &mut Wired,
    notes: &mut Notes,
) -> usize {
    if let Some(known) = wired
        .instruments
        .iter()
        .position(|i| i.name == instrument.name.value)
    {
        return known;
    }
    let is_real = wired.lines[line].port != Port::Virtual;
    calibration_stands(files.today, instrument, driver, is_real, notes);
    wired.instruments.push(PlannedInstrument {
        name: instrument.name.value.clone(),
        line,
        identity: instrument.identity.value.clone(),
        certificate: instrument.certificate.clone(),
        due: instrument.due,
        calibration: instrument.calibration.clone(),
        driver: driver.clone(),
    });
    wired.instruments.len() - 1
}
