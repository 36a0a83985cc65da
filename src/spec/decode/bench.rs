//! The bench file.

use chrono::NaiveDate;

use crate::quantity::{Amps, Dimension, Ohms, Reading};
use crate::sensor::{Couple, CoupleClass, PlatinumClass, Sensor};
use crate::spec::Located;
use crate::spec::bench::{
    Bay, Bench, CalibrationPoint, Connection, Instrument, Line, Parity, Port, RoleFilled,
    SerialSettings, Source,
};
use crate::spec::fields::{Field, Fields, list, located, named, shown};
use crate::spec::scalars::{
    Allowed, choice, located_name, name, number, quantity, share, text, value_of, whole,
};

/// `bench:`, `lines:`, `instruments:`, `bays:`.
pub(in crate::spec) fn bench(field: Field<'_>) -> Option<Bench> {
    let fields = field.fields()?;
    let name = fields.required("bench", located_name);
    let lines = fields.required("lines", named(line));
    let instruments = fields.required("instruments", named(instrument));
    let bays = fields.required("bays", named(bay));
    fields.finish()?;
    Some(Bench {
        name: name?,
        lines: lines?,
        instruments: instruments?,
        bays: bays?,
    })
}

fn line(name: Located<String>, field: Field<'_>) -> Option<Line> {
    let fields = field.fields()?;
    let path = fields.required("port", crate::spec::scalars::name);
    let port = match path.as_deref() {
        Some("virtual") => Some(Port::Virtual),
        _ => serial(&fields, path),
    };
    fields.finish()?;
    Some(Line { name, port: port? })
}

fn serial(fields: &Fields<'_>, path: Option<String>) -> Option<Port> {
    let baud = fields.or("baud", 9600, baud);
    let data_bits = fields.or("data bits", 8, choice(&[("7", 7), ("8", 8)]));
    let parity = fields.or("parity", Parity::None, choice(PARITIES));
    let stop_bits = fields.or("stop bits", 1, choice(&[("1", 1), ("2", 2)]));
    Some(Port::Serial(SerialSettings {
        path: path?,
        baud: baud?,
        data_bits: data_bits?,
        parity: parity?,
        stop_bits: stop_bits?,
    }))
}

const PARITIES: &[(&str, Parity)] = &[
    ("none", Parity::None),
    ("odd", Parity::Odd),
    ("even", Parity::Even),
];

/// 0 leaves a pseudo-terminal's speed alone; else what serial ports can do.
fn baud(field: Field<'_>) -> Option<u32> {
    let baud = whole(0, 4_000_000)(field)?;
    if 0 < baud && baud < 50 {
        return field.wrong(
            format!("no port runs at {baud} baud"),
            "write for example `9600`",
        );
    }
    Some(baud)
}

fn instrument(name: Located<String>, field: Field<'_>) -> Option<Instrument> {
    let fields = field.fields()?;
    let line = fields.required("line", located_name);
    let driver = fields.required("driver", located_name);
    let identity = fields.required("identity", located(identity));
    let certificate = fields.optional("certificate", text);
    let due = fields.optional("due", date);
    let calibration = fields.or("calibration", Vec::new(), list(calibration_point));
    fields.finish()?;
    Some(Instrument {
        name,
        line: line?,
        driver: driver?,
        identity: identity?,
        certificate: certificate?,
        due: due?,
        calibration: calibration?,
    })
}

/// The start of an identity reply, which is ASCII as all that is read from a wire.
fn identity(field: Field<'_>) -> Option<String> {
    let identity = name(field)?;
    if !identity.is_ascii() {
        return field.wrong(
            "an identity reply is ASCII",
            "copy the start of the instrument's reply to `*IDN?`",
        );
    }
    Some(identity)
}

fn date(field: Field<'_>) -> Option<NaiveDate> {
    let text = field.scalar("2030-12-31")?;
    // `%Y` alone would take signs, blanks and missing zeros.
    let shape = text.len() == 10 && text.bytes().all(|b| b.is_ascii_digit() || b == b'-');
    match NaiveDate::parse_from_str(text, "%Y-%m-%d") {
        Ok(date) if shape => Some(date),
        _ => field.wrong(
            format!("`{}` is not a date", shown(text)),
            "write year, month and day: `2030-12-31`",
        ),
    }
}

fn calibration_point(field: Field<'_>) -> Option<CalibrationPoint> {
    let fields = field.fields()?;
    let reading = fields.required("reading", choice(READINGS));
    let channel = fields.optional("channel", whole(1, 9_999));
    // Without the reading's word the other values can't be told right from wrong.
    let (point, width) = match reading {
        Some(reading) => (reading.dimension(), difference(reading)),
        None => return None,
    };
    let at = fields.required("at", value_of(point, Allowed::Any));
    let correction = fields.required("correction", value_of(width, Allowed::Any));
    let expanded = fields.required("U", value_of(width, Allowed::NotNegative));
    let coverage = fields.required("k", number(Allowed::Positive));
    fields.finish()?;
    Some(CalibrationPoint {
        reading: reading?,
        channel: channel?,
        at: at?,
        correction: correction?,
        expanded: expanded?,
        coverage: coverage?,
    })
}

/// The words for readings, in YAML files.
pub(super) const READINGS: &[(&str, Reading)] = &[
    ("voltage", Reading::Voltage),
    ("current", Reading::Current),
    ("power", Reading::Power),
    ("power factor", Reading::PowerFactor),
    ("frequency", Reading::Frequency),
    ("temperature", Reading::Temperature),
    ("energy", Reading::Energy),
    ("thermocouple voltage", Reading::ThermocoupleVoltage),
    ("terminal temperature", Reading::TerminalTemperature),
    ("resistance", Reading::Resistance),
];

/// What a difference between two readings measures: kelvins between temperatures.
pub(super) fn difference(reading: Reading) -> Dimension {
    match reading {
        Reading::Temperature | Reading::TerminalTemperature => Dimension::TemperatureDifference,
        other => other.dimension(),
    }
}

fn bay(name: Located<String>, field: Field<'_>) -> Option<Bay> {
    let fields = field.fields()?;
    let rated_current = fields.required("rated current", quantity::<Amps>(Allowed::Positive));
    let source = fields.or("source", Source::default(), source);
    let roles = fields.required("roles", named(role));
    fields.finish()?;
    Some(Bay {
        name,
        rated_current: rated_current?,
        source: source?,
        roles: roles?,
    })
}

fn source(field: Field<'_>) -> Option<Source> {
    let fields = field.fields()?;
    let impedance = fields.optional("impedance", quantity::<Ohms>(Allowed::NotNegative));
    let current_limit = fields.optional("current limit", quantity::<Amps>(Allowed::Positive));
    fields.finish()?;
    Some(Source {
        impedance: impedance?,
        current_limit: current_limit?,
    })
}

fn role(role: Located<String>, field: Field<'_>) -> Option<RoleFilled> {
    let fields = field.fields()?;
    let instrument = fields.required("instrument", located_name);
    let channel = fields.optional("channel", located(whole(1, 9_999)));
    let attachment = fields.optional("attachment", text);
    let contact_error = fields.optional("contact error", share);
    let lead_resistance = fields.optional("lead resistance", quantity::<Ohms>(Allowed::Positive));
    let sensor = fields.optional("sensor", located(sensor));
    fields.finish()?;
    Some(RoleFilled {
        role,
        instrument: instrument?,
        channel: channel?,
        connection: Connection {
            attachment: attachment?,
            contact_error: contact_error?,
            lead_resistance: lead_resistance?,
        },
        sensor: sensor?,
    })
}

const SENSOR_TYPES: &[(&str, Option<Couple>)] = &[
    ("K", Some(Couple::K)),
    ("J", Some(Couple::J)),
    ("T", Some(Couple::T)),
    ("Pt100", None),
];

const COUPLE_CLASSES: &[(&str, CoupleClass)] = &[("1", CoupleClass::One), ("2", CoupleClass::Two)];

const PLATINUM_CLASSES: &[(&str, PlatinumClass)] = &[
    ("AA", PlatinumClass::AA),
    ("A", PlatinumClass::A),
    ("B", PlatinumClass::B),
    ("C", PlatinumClass::C),
];

fn sensor(field: Field<'_>) -> Option<Sensor> {
    let fields = field.fields()?;
    // Without the type the classes can't be told right from wrong.
    let sensor = match fields.required("type", choice(SENSOR_TYPES))? {
        Some(couple) => fields
            .required("class", choice(COUPLE_CLASSES))
            .map(|class| Sensor::Thermocouple { couple, class }),
        None => fields
            .required("class", choice(PLATINUM_CLASSES))
            .map(|class| Sensor::Pt100 { class }),
    };
    fields.finish()?;
    sensor
}

#[cfg(test)]
mod tests {
    use crate::spec::bench::{Parity, Port};
    use crate::spec::load_bench;
    use crate::spec::wrong_files::{Kind, wrong};

    #[test]
    fn serial_settings_have_the_trade_s_defaults() {
        let text = Kind::Bench.changed(&[
            ("{port: virtual}", "{port: /dev/ttyUSB0}"),
            (
                "{port: virtual}",
                "{port: COM7, baud: 115200, data bits: 7, parity: even, stop bits: 2}",
            ),
        ]);
        let bench = load_bench("file", text.as_bytes()).value.expect("a bench");
        let Port::Serial(plain) = &bench.lines[0].port else {
            panic!("{:?}", bench.lines[0]);
        };
        assert_eq!(
            (plain.path.as_str(), plain.baud, plain.data_bits),
            ("/dev/ttyUSB0", 9600, 8)
        );
        assert_eq!((plain.parity, plain.stop_bits), (Parity::None, 1));
        let Port::Serial(set) = &bench.lines[1].port else {
            panic!("{:?}", bench.lines[1]);
        };
        assert_eq!((set.baud, set.data_bits, set.stop_bits), (115_200, 7, 2));
        assert_eq!(set.parity, Parity::Even);
    }

    #[test]
    fn each_wrong_value_of_the_bench_is_one_problem() {
        Kind::Bench.check(&[
            wrong(
                "{port: virtual}",
                "{prot: virtual}",
                "4:17",
                "unknown key `prot`",
                "mean `port`",
            ),
            wrong(
                "{port: virtual}",
                "{port: virtual, baud: 9600}",
                "4:32",
                "unknown key `baud`",
                "known",
            ),
            wrong(
                "{port: virtual}",
                "{port: COM1, baud: 9}",
                "4:35",
                "no port runs at 9",
                "9600",
            ),
            wrong(
                "{port: virtual}",
                "{port: COM1, baud: 9600.0}",
                "4:35",
                "whole number",
                "plain digits",
            ),
            wrong(
                "{port: virtual}",
                "{port: COM1, parity: evn}",
                "4:37",
                "can't be `evn`",
                "mean `even`",
            ),
            wrong(
                "driver: scpi-ac-supply, ",
                "",
                "9:3",
                "lacks `driver`",
                "add",
            ),
            wrong(
                "2099-12-31",
                "31.12.2099",
                "15:10",
                "not a date",
                "2030-12-31",
            ),
            wrong(
                "2099-12-31",
                "2099-02-30",
                "15:10",
                "not a date",
                "2030-12-31",
            ),
            wrong("at: 5 W", "at: 5 V", "17:30", "not a power", "9 W"),
            wrong("U: 10 mW", "U: -10 mW", "17:55", "is negative", "check"),
            wrong("k: 2", "k: 0", "17:65", "above zero", "check"),
            wrong("k: 2", "k: 2 W", "17:65", "plain number", "without a unit"),
            wrong(
                "reading: power",
                "reading: pwer",
                "17:19",
                "can't be `pwer`",
                "mean `power`",
            ),
            wrong(
                "rated current: 16 A",
                "rated current: 16 W",
                "29:20",
                "not a current",
                "A",
            ),
            wrong(
                "channel: 1}",
                "channel: 01}",
                "33:85",
                "whole number",
                "plain digits",
            ),
            wrong(
                "instrument: supply}",
                "}",
                "31:7",
                "lacks `instrument`",
                "add",
            ),
            wrong(
                "channel: 1}",
                "channel: 1, sensor: {type: K}}",
                "33:88",
                "lacks `class`",
                "add",
            ),
            wrong(
                "channel: 1}",
                "channel: 1, sensor: {type: X, class: 1}}",
                "33:103",
                "can't be `X`",
                "one of: K, J, T, Pt100",
            ),
            wrong(
                "channel: 1}",
                "channel: 1, sensor: {type: Pt100, class: 1}}",
                "33:117",
                "can't be `1`",
                "one of: AA, A, B, C",
            ),
            wrong(
                "channel: 1}",
                "channel: 1, sensor: {type: T, class: A}}",
                "33:113",
                "can't be `A`",
                "one of: 1, 2",
            ),
            wrong(
                "channel: 1}",
                "channel: 1, sensor: K}",
                "33:96",
                "must be a mapping",
                "key: value",
            ),
        ]);
    }
}
