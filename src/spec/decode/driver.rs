//! A driver file.

use crate::quantity::{Kelvins, Reading, Seconds, Volts};
use crate::spec::driver::{
    Accuracy, Coupling, Driver, Framing, IdentityQuery, ReadingQuery, Setting, Settings,
    TemperatureEffect, Terminator, Thermal,
};
use crate::spec::fields::{Field, Fields, list, located, named, some};
use crate::spec::scalars::{
    Allowed, choice, command, duration, name, pause, quantity, share, temperature, value_of, whole,
};
use crate::spec::sequence::RoleKind;
use crate::spec::{Located, Problem};

use super::bench::{READINGS, difference};
use super::waveform::waveform;

/// The words for kinds of role, in YAML files.
pub(super) const ROLE_KINDS: &[(&str, RoleKind)] = &[
    ("supply", RoleKind::Supply),
    ("power meter", RoleKind::PowerMeter),
    ("temperature", RoleKind::Temperature),
    ("position switch", RoleKind::PositionSwitch),
];

const TERMINATORS: &[(&str, Terminator)] = &[
    ("LF", Terminator::Lf),
    ("CRLF", Terminator::CrLf),
    ("CR", Terminator::Cr),
];

const COUPLINGS: &[(&str, Coupling)] = &[("dc", Coupling::Dc), ("ac", Coupling::Ac)];

/// A whole driver file.
pub(in crate::spec) fn driver(field: Field<'_>) -> Option<Driver> {
    let fields = field.fields()?;
    let name = fields.required("driver", name);
    let fills = fields.required("fills", some(located(choice(ROLE_KINDS))));
    let framing = fields.required("framing", framing);
    let identity = fields.required("identity", identity);
    let on_opening = fields.or("on opening", Vec::new(), list(command(&[])));
    let channels = fields.or("channels", 0, whole(0, 9_999));
    let readings = fields.or("readings", Vec::new(), list(reading_query(channels)));
    let waveform = fields.optional("waveform", waveform);
    let settings = fields.or("settings", Settings::default(), settings);
    let errors = fields.optional("errors", command(&[]));
    let accuracy = fields.or("accuracy", Vec::new(), named(accuracy));
    let update_interval = fields.required("update interval", duration);
    let temperature_effect = fields.optional("temperature effect", temperature_effect);
    let isolation = fields.optional("isolation", quantity::<Volts>(Allowed::NotNegative));
    let coupling = fields.or("coupling", Coupling::Dc, choice(COUPLINGS));
    let suited = match (&fills, &readings, &settings) {
        (Some(fills), Some(readings), Some(settings)) => suited(field, fills, readings, settings),
        _ => None,
    };
    if let (Some(readings), Some(accuracy)) = (&readings, &accuracy) {
        warn_of_unknown_accuracy(&fields, field, readings, accuracy);
    }
    fields.finish()?;
    suited?;
    Some(Driver {
        name: name?,
        fills: fills?.into_iter().map(|kind| kind.value).collect(),
        framing: framing?,
        identity: identity?,
        on_opening: on_opening?,
        readings: readings?,
        waveform: waveform?,
        settings: settings?,
        errors: errors?,
        accuracy: accuracy?,
        update_interval: update_interval?,
        channels: channels?,
        temperature_effect: temperature_effect?,
        isolation: isolation?,
        coupling: coupling?,
    })
}

fn framing(field: Field<'_>) -> Option<Framing> {
    let fields = field.fields()?;
    let sends = fields.required("sends", choice(TERMINATORS));
    let replies = fields.required("replies end with", choice(TERMINATORS));
    let reply_within = fields.required("reply within", duration);
    let gap = fields.or("gap", Seconds::ZERO, pause);
    let tries = fields.or("tries", 3, whole(1, 10));
    fields.finish()?;
    Some(Framing {
        sends: sends?,
        replies: replies?,
        reply_within: reply_within?,
        gap: gap?,
        tries: tries?,
    })
}

fn identity(field: Field<'_>) -> Option<IdentityQuery> {
    let fields = field.fields()?;
    let ask = fields.required("ask", command(&[]));
    let count = fields.or("fields", 4, whole(1, 32));
    fields.finish()?;
    Some(IdentityQuery {
        ask: ask?,
        fields: count? as usize,
    })
}

fn reading_query<'a>(channels: Option<u32>) -> impl Fn(Field<'a>) -> Option<ReadingQuery> {
    move |field| {
        let fields = field.fields()?;
        let ask = match channels {
            Some(0) => fields.required("ask", command(&[])),
            _ => fields.required("ask", command(&["channel"])),
        };
        let gives = fields.required("gives", some(located(choice(READINGS))));
        fields.finish()?;
        let gives = gives?;
        let words: Vec<Located<String>> = gives
            .iter()
            .map(|g| g.clone().map(|reading| reading.word().to_owned()))
            .collect();
        crate::spec::fields::all_different(&words, field.notes)?;
        Some(ReadingQuery {
            ask: ask?,
            gives: gives.into_iter().map(|g| g.value).collect(),
        })
    }
}

fn settings(field: Field<'_>) -> Option<Settings> {
    let fields = field.fields()?;
    let voltage = fields.optional("voltage", setting);
    let frequency = fields.optional("frequency", setting);
    let position = fields.optional("position", setting);
    let output = fields.optional("output", output);
    fields.finish()?;
    let (on, off, state) = output?.map_or((None, None, None), |o| (Some(o.0), Some(o.1), o.2));
    Some(Settings {
        voltage: voltage?,
        frequency: frequency?,
        position: position?,
        output_on: on,
        output_off: off,
        output_state: state,
    })
}

fn setting(field: Field<'_>) -> Option<Setting> {
    let fields = field.fields()?;
    let set = fields.required("set", command(&["value"]));
    let confirm = fields.optional("confirm", command(&[]));
    fields.finish()?;
    Some(Setting {
        set: set?,
        confirm: confirm?,
    })
}

fn output(field: Field<'_>) -> Option<(String, String, Option<String>)> {
    let fields = field.fields()?;
    let on = fields.required("on", command(&[]));
    let off = fields.required("off", command(&[]));
    let state = fields.optional("state", command(&[]));
    fields.finish()?;
    Some((on?, off?, state?))
}

/// Whether the driver can do what its kinds of role are for.
fn suited(
    whole: Field<'_>,
    fills: &[Located<RoleKind>],
    readings: &[ReadingQuery],
    settings: &Settings,
) -> Option<()> {
    let gives = |wanted: Reading| readings.iter().any(|query| query.gives.contains(&wanted));
    let mut suited = Some(());
    for kind in fills {
        let lack = match kind.value {
            RoleKind::Supply if settings.voltage.is_none() => Some("`settings: voltage`"),
            RoleKind::Supply if settings.output_off.is_none() => Some("`settings: output`"),
            // OFF counts only when it has been read back.
            RoleKind::Supply if settings.output_state.is_none() => {
                Some("`settings: output: state`")
            }
            RoleKind::PowerMeter if !gives(Reading::Power) => Some("a reading of power"),
            RoleKind::Temperature => match Thermal::of(readings).as_slice() {
                [] if gives(Reading::ThermocoupleVoltage)
                    || gives(Reading::TerminalTemperature) =>
                {
                    Some("`thermocouple voltage` and `terminal temperature` in one reply")
                }
                [] => Some("a reading of temperature"),
                [_] => None,
                [one, other, ..] => {
                    suited = which_counts(whole, kind, *one, *other);
                    None
                }
            },
            RoleKind::PositionSwitch if settings.position.is_none() => Some("`settings: position`"),
            _ => None,
        };
        if let Some(lack) = lack {
            suited = whole.notes.error(
                &kind.place,
                format!("it can't fill `{}` without {lack}", kind.word()),
                format!("add {lack}, or take `{}` out", kind.word()),
            );
        }
    }
    suited
}

/// A role polls every query of its driver: of two temperatures neither counts.
fn which_counts(
    whole: Field<'_>,
    kind: &Located<RoleKind>,
    one: Thermal,
    other: Thermal,
) -> Option<()> {
    let word = |thermal: Thermal| thermal.readings()[0].word();
    whole.notes.error(
        &kind.place,
        format!(
            "it gives both {} and {}: which one is the role's temperature?",
            word(one),
            word(other)
        ),
        "take one of the two out; an instrument that does both needs a driver for each",
    )
}

fn warn_of_unknown_accuracy(
    fields: &Fields<'_>,
    whole: Field<'_>,
    readings: &[ReadingQuery],
    accuracy: &[Accuracy],
) {
    let stated = |reading: Reading| accuracy.iter().any(|a| a.reading == reading);
    let place = fields.find("readings").map_or(whole.key, |f| f.key);
    for reading in Reading::ALL {
        let given = readings.iter().any(|query| query.gives.contains(&reading));
        if given && !stated(reading) {
            whole.notes.add(
                Problem::warning(
                    place,
                    format!("the accuracy of `{}` is not stated", reading.word()),
                )
                .hint("without it nothing that rests on this reading can be judged"),
            );
        }
    }
}

fn accuracy(reading: Located<String>, field: Field<'_>) -> Option<Accuracy> {
    let Some((_, kind)) = READINGS.iter().find(|(word, _)| *word == reading.value) else {
        let known: Vec<&str> = READINGS.iter().map(|(word, _)| *word).collect();
        return field.notes.error(
            &reading.place,
            format!(
                "`{}` is not a reading",
                crate::spec::fields::shown(&reading)
            ),
            match crate::spec::nearest(&reading, known.iter().copied()) {
                Some(meant) => format!("did you mean `{meant}`?"),
                None => format!("one of: {}", known.join(", ")),
            },
        );
    };
    let width = difference(*kind);
    let fields = field.fields()?;
    let of_reading = fields.optional("of reading", share);
    let of_range = fields.optional("of range", share);
    let correlation = fields.optional("correlation", share);
    let of_reactive = fields.optional("of reactive power", share);
    let reactive_of_power = match &of_reactive {
        Some(Some(_)) if *kind != Reading::Power => fields.wrong(
            "of reactive power",
            "only a power has a share of the reactive power",
            "take it out",
        ),
        _ => Some(()),
    };
    let floor = fields.or("floor", 0.0, value_of(width, Allowed::NotNegative));
    let resolution = fields.or("resolution", 0.0, value_of(width, Allowed::NotNegative));
    let full = value_of(kind.dimension(), Allowed::Positive);
    let ranges = fields.or("ranges", Vec::new(), list(full));
    let (of_reading, of_range) = (fraction(of_reading), fraction(of_range));
    let correlation = fraction(correlation);
    let of_reactive = fraction(of_reactive);
    let rising = match (&ranges, of_range) {
        (Some(ranges), _) if !ranges.is_sorted_by(|a, b| a < b) => fields.wrong(
            "ranges",
            "the ranges don't rise",
            "write the smallest first",
        ),
        (Some(ranges), Some(share)) if share > 0.0 && ranges.is_empty() => fields.wrong(
            "of range",
            "a share of the range without ranges",
            "add `ranges: [...]`, the full-scale values",
        ),
        _ => Some(()),
    };
    let stated = match (of_reading, of_range, floor) {
        (Some(0.0), Some(0.0), Some(0.0)) => field.notes.error(
            &reading.place,
            format!("the accuracy of `{}` is nothing at all", kind.word()),
            "write `of reading`, `of range` or `floor` from the instrument's manual",
        ),
        _ => Some(()),
    };
    fields.finish()?;
    rising?;
    stated?;
    reactive_of_power?;
    Some(Accuracy {
        reading: *kind,
        of_reading: of_reading?,
        of_range: of_range?,
        floor: floor?,
        resolution: resolution?,
        ranges: ranges?,
        of_reactive: of_reactive?,
        correlation: correlation?,
    })
}

fn temperature_effect(field: Field<'_>) -> Option<TemperatureEffect> {
    let fields = field.fields()?;
    let per_kelvin = fields.required("per kelvin", share);
    let reference = fields.required("reference", temperature);
    let within = fields.required("within", quantity::<Kelvins>(Allowed::NotNegative));
    fields.finish()?;
    Some(TemperatureEffect {
        per_kelvin: per_kelvin?.get(),
        reference: reference?,
        within: within?,
    })
}

/// An optional share as a fraction; absent is none of it.
fn fraction(share: Option<Option<crate::quantity::Ratio>>) -> Option<f64> {
    share.map(|share| share.map_or(0.0, |share| share.get()))
}

#[cfg(test)]
mod tests {
    use crate::quantity::Reading;
    use crate::spec::wrong_files::{Kind, wrong};
    use crate::spec::{Weight, load_driver};

    const METER: Kind = Kind::Driver("power-meter");

    #[test]
    fn an_accuracy_is_read_in_base_units() {
        let text = METER.changed(&[]);
        let driver = load_driver("file", text.as_bytes())
            .value
            .expect("a driver");
        let current = driver.accuracy_of(Reading::Current).expect("an accuracy");
        assert_eq!(current.floor, 5e-5);
        assert_eq!(current.of_range, 0.001);
        assert_eq!(current.ranges, [0.1, 0.5, 2.0, 8.0, 20.0]);
        // 0.1 % of 0.3 A + 0.1 % of the 0.5 A range + 0.05 mA (computed by hand).
        assert!((current.half_width(0.3) - 8.5e-4).abs() < 1e-15);
    }

    #[test]
    fn what_the_surroundings_add_is_read() {
        let text = METER.changed(&[
            (
                "power: {of reading: 0.1 %,",
                "power: {of reading: 0.1 %, of reactive power: 0.2 %,",
            ),
            (
                "accuracy:",
                "temperature effect: {per kelvin: 0.01 %, reference: 23 °C, within: 5 K}\naccuracy:",
            ),
        ]);
        let loaded = load_driver("file", text.as_bytes());
        let driver = loaded.value.expect("a driver");
        let power = driver.accuracy_of(Reading::Power).expect("an accuracy");
        assert_eq!(power.of_reactive, 0.002);
        let effect = driver.temperature_effect.expect("an effect");
        let share = |room| effect.share_at(crate::quantity::Celsius::of(room));
        assert_eq!((share(23.0), share(28.0)), (0.0, 0.0));
        // 10 K away, 5 K of them beyond: 0.05 % (computed).
        assert!((share(33.0) - 5e-4).abs() < 1e-15 && (share(13.0) - 5e-4).abs() < 1e-15);
        let wrong = METER.changed(&[(
            "voltage: {of reading: 0.1 %,",
            "voltage: {of reading: 0.1 %, of reactive power: 0.2 %,",
        )]);
        assert!(load_driver("file", wrong.as_bytes()).value.is_none());
    }

    #[test]
    fn a_reading_without_accuracy_is_a_warning() {
        let text = METER.changed(&[("gives: [voltage,", "gives: [voltage, frequency,")]);
        let loaded = load_driver("file", text.as_bytes());
        assert!(loaded.value.is_some());
        let [problem] = loaded.problems.as_slice() else {
            panic!("{:#?}", loaded.problems);
        };
        assert_eq!(problem.weight, Weight::Warning);
        assert_eq!(problem.place.text(), "readings");
        assert!(problem.message.contains("frequency"), "{problem:?}");
    }

    #[test]
    fn a_driver_with_two_temperatures_is_refused_whichever_they_are() {
        for (driver, from, to) in [
            (
                "thermocouple-scanner",
                "terminal temperature]",
                "terminal temperature, resistance]",
            ),
            (
                "resistance-scanner",
                "[resistance]",
                "[temperature, resistance]",
            ),
            (
                "temperature-scanner",
                "gives: [temperature]",
                "gives: [temperature, thermocouple voltage, terminal temperature]",
            ),
        ] {
            let text = Kind::Driver(driver).changed(&[(from, to)]);
            let (value, problems) = Kind::Driver(driver).load(text.as_bytes());
            assert!(!value, "{driver}");
            let errors: Vec<_> = problems
                .iter()
                .filter(|p| p.weight == Weight::Error)
                .collect();
            let [error] = errors.as_slice() else {
                panic!("{driver}: {problems:#?}");
            };
            assert_eq!(error.place.line_column(), (3, 9), "{driver}");
            assert!(
                error
                    .message
                    .contains("which one is the role's temperature"),
                "{error:?}"
            );
            assert!(
                error
                    .hint
                    .as_ref()
                    .is_some_and(|h| h.contains("a driver for each"))
            );
        }
    }

    #[test]
    fn microvolts_and_milliohms_are_read_in_base_units() {
        let driver = |name| {
            let text = Kind::Driver(name).changed(&[]);
            load_driver("file", text.as_bytes())
                .value
                .expect("a driver")
        };
        let volts = driver("thermocouple-scanner");
        let volts = volts
            .accuracy_of(Reading::ThermocoupleVoltage)
            .expect("stated");
        assert_eq!(volts.floor, 3e-6);
        // 0.1 over a million misses the literal by its last bit.
        assert!((volts.resolution - 1e-7).abs() < 1e-21);
        let ohms = driver("resistance-scanner");
        assert_eq!(
            ohms.accuracy_of(Reading::Resistance).expect("stated").floor,
            0.01
        );
    }

    #[test]
    fn each_wrong_value_of_a_driver_is_one_problem() {
        METER.check(&[
            wrong(
                "sends: LF",
                "sends: NL",
                "4:18",
                "can't be `NL`",
                "one of: LF, CRLF, CR",
            ),
            wrong(
                "tries: 3",
                "tries: 0",
                "4:84",
                "whole number from 1 to 10",
                "digits",
            ),
            wrong(
                "reply within: 500 ms",
                "reply within: 500",
                "4:58",
                "has no unit",
                "`500 ms`",
            ),
            wrong(
                "\"*IDN?\"",
                "\"*IDN?\\n\"",
                "5:17",
                "can't be sent",
                "line end",
            ),
            wrong("\"*IDN?\"", "\"*IDÑ?\"", "5:17", "can't be sent", "ASCII"),
            wrong("\"*IDN?\"", "\"\"", "5:17", "1 to 255", "one command"),
            wrong(
                "\"*CLS\"",
                "\"*CLS {value}\"",
                "6:14",
                "no meaning here",
                "write the command out",
            ),
            wrong(
                "VOLT:AC?;",
                "VOLT:AC? (@{channel});",
                "8:10",
                "no meaning here",
                "write the command out",
            ),
            wrong(
                "[voltage, current, power]",
                "[voltage, power, power]",
                "9:29",
                "stands twice",
                "one of",
            ),
            wrong(
                "[voltage, current, power]",
                "[voltage, current]",
                "3:9",
                "can't fill `power meter`",
                "reading of power",
            ),
            wrong(
                "update interval: 100 ms",
                "update interval: 0 ms",
                "11:18",
                "longer than nothing",
                "20 min",
            ),
            wrong(
                "  power: {",
                "  powr: {",
                "15:3",
                "not a reading",
                "mean `power`",
            ),
            wrong(
                "of reading: 0.1 %",
                "of reading: 101 %",
                "13:25",
                "out of range",
                "0 % to 100 %",
            ),
            wrong(
                "ranges: [150 V, 300 V]",
                "ranges: [300 V, 150 V]",
                "13:91",
                "don't rise",
                "smallest",
            ),
            wrong(
                ", ranges: [150 V, 300 V]",
                "",
                "13:42",
                "without ranges",
                "ranges",
            ),
            wrong(
                "{of reading: 0.1 %, of range: 0.05 %, floor: 10 mV, ",
                "{",
                "13:3",
                "nothing at all",
                "manual",
            ),
        ]);
        Kind::Driver("ac-supply").check(&[
            wrong(
                "VOLT {value}",
                "VOLT 230",
                "8:18",
                "lacks `{value}`",
                "put `{value}`",
            ),
            wrong(
                "{value}",
                "{volts}",
                "8:18",
                "no meaning here",
                "`{value}` is put in",
            ),
            wrong(
                ", state: \"OUTP?\"",
                "",
                "3:9",
                "can't fill `supply`",
                "state",
            ),
            wrong(", off: \"OUTP OFF\"", "", "10:3", "lacks `off`", "add"),
        ]);
        Kind::Driver("temperature-scanner").check(&[
            wrong("(@{channel})", "(@1)", "8:10", "lacks `{channel}`", "put"),
            wrong(
                "floor: 1 K",
                "floor: 1 °C",
                "15:43",
                "not a temperature difference",
                "K",
            ),
            wrong(
                "isolation: 300 V",
                "isolation: 300",
                "13:12",
                "has no unit",
                "`300 V`",
            ),
        ]);
        Kind::Driver("thermocouple-scanner").check(&[
            wrong(
                "gives: [thermocouple voltage, terminal temperature]",
                "gives: [thermocouple voltage]",
                "3:9",
                "can't fill `temperature` without `thermocouple voltage` and `terminal temperature`",
                "in one reply",
            ),
            wrong(
                "floor: 3 uV",
                "floor: 3 K",
                "17:53",
                "not a voltage",
                "V",
            ),
        ]);
        Kind::Driver("position-switch").check(&[wrong(
            "position:",
            "voltage:",
            "3:9",
            "can't fill `position switch`",
            "take `position switch` out",
        )]);
    }
}
