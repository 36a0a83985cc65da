//! A driver's `waveform:`.

use crate::quantity::{Reading, Seconds};
use crate::spec::Located;
use crate::spec::driver::{BlockFormat, SampleInterval, WaveformQuery};
use crate::spec::fields::{Field, all_different, list, located, some};
use crate::spec::scalars::{Allowed, choice, command, duration, quantity, value_of, whole};

/// House default for the time that a whole block may take.
const REPLY_WITHIN: Seconds = Seconds::whole(10);
/// Most pairs of a block.
const MOST_POINTS: u32 = 500_000;

const FORMATS: &[(&str, BlockFormat)] = &[
    ("float32 little", BlockFormat::Float32Little),
    ("float32 big", BlockFormat::Float32Big),
    ("float64 little", BlockFormat::Float64Little),
    ("float64 big", BlockFormat::Float64Big),
    ("int16 little", BlockFormat::Int16Little),
    ("int16 big", BlockFormat::Int16Big),
    ("text comma", BlockFormat::Text),
];

const GIVEN: &[(&str, Reading)] = &[("voltage", Reading::Voltage), ("current", Reading::Current)];

/// How a block of voltage and current is taken and fetched.
pub(super) fn waveform(field: Field<'_>) -> Option<WaveformQuery> {
    let fields = field.fields()?;
    let arm = fields.required("arm", list(command(&[])));
    let ready = fields.optional("ready", command(&[]));
    let ask = fields.required("ask", command(&[]));
    let gives = fields.required("gives", gives);
    let interval = fields.required("interval", sample_interval);
    let points = fields.required("points", whole(10, MOST_POINTS));
    let format = fields.required("format", choice(FORMATS));
    let scale = fields.optional("scale", scale);
    let reply_within = fields.or("reply within", REPLY_WITHIN, duration);
    let scaled = match (format, &scale) {
        (Some(format), Some(None)) if format.is_whole() => fields.wrong(
            "format",
            "whole numbers need a scale",
            "add `scale: {voltage: 10 mV, current: 1 mA}`, the size of one count",
        ),
        (Some(format), Some(Some(_))) if !format.is_whole() => fields.wrong(
            "scale",
            "only whole numbers take a scale",
            "take it out, or write the format that the block has",
        ),
        _ => Some(()),
    };
    fields.finish()?;
    scaled?;
    Some(WaveformQuery {
        arm: arm?,
        ready: ready?,
        ask: ask?,
        gives: gives?,
        interval: interval?,
        points: points?,
        format: format?,
        scale: scale?,
        reply_within: reply_within?,
    })
}

/// Voltage and current, each once, in either order.
fn gives(field: Field<'_>) -> Option<Vec<Reading>> {
    let given = some(located(choice(GIVEN)))(field)?;
    let words: Vec<Located<String>> = given
        .iter()
        .map(|g| g.clone().map(|reading| reading.word().to_owned()))
        .collect();
    all_different(&words, field.notes)?;
    if given.len() < GIVEN.len() {
        return field.wrong(
            "a waveform needs both voltage and current",
            "write `gives: [voltage, current]`, in the order of the block",
        );
    }
    Some(given.into_iter().map(|g| g.value).collect())
}

/// A query, or a time.
fn sample_interval(field: Field<'_>) -> Option<SampleInterval> {
    let text = field.scalar("0.1 ms")?;
    if text.contains('?') {
        return command(&[])(field).map(SampleInterval::Asked);
    }
    let fixed: Seconds = quantity(Allowed::Within(1e-7, 1e-2))(field)?;
    Some(SampleInterval::Fixed(fixed))
}

fn scale(field: Field<'_>) -> Option<(f64, f64)> {
    let fields = field.fields()?;
    let volts = fields.required(
        "voltage",
        value_of(Reading::Voltage.dimension(), Allowed::Positive),
    );
    let amps = fields.required(
        "current",
        value_of(Reading::Current.dimension(), Allowed::Positive),
    );
    fields.finish()?;
    Some((volts?, amps?))
}

#[cfg(test)]
mod tests {
    use crate::spec::driver::{BlockFormat, SampleInterval};
    use crate::spec::load_driver;
    use crate::spec::wrong_files::{Kind, wrong};

    const METER: Kind = Kind::Driver("power-meter");

    #[test]
    fn the_shipped_meter_has_a_waveform() {
        let text = METER.changed(&[]);
        let driver = load_driver("file", text.as_bytes()).value.unwrap();
        let waveform = driver.waveform.unwrap();
        assert_eq!(waveform.format, BlockFormat::Float32Little);
        assert_eq!(waveform.bytes(), 1500 * 2 * 4);
        assert!(matches!(waveform.interval, SampleInterval::Asked(_)));
    }

    #[test]
    fn a_fixed_interval_and_counts_are_read() {
        let text = METER.changed(&[
            ("interval: \":WAV:INT?\"", "interval: 0.2 ms"),
            (
                "format: float32 little",
                "format: int16 big\n  scale: {voltage: 20 mV, current: 1 mA}",
            ),
        ]);
        let driver = load_driver("file", text.as_bytes()).value.unwrap();
        let waveform = driver.waveform.unwrap();
        assert_eq!(waveform.scale, Some((0.02, 0.001)));
        let SampleInterval::Fixed(interval) = waveform.interval else {
            panic!("{:?}", waveform.interval);
        };
        assert_eq!(interval.get(), 2e-4);
    }

    #[test]
    fn each_wrong_value_of_a_waveform_is_one_problem() {
        METER.check(&[
            wrong(
                "format: float32 little",
                "format: float31",
                "23:11",
                "can't be `float31`",
                "",
            ),
            wrong(
                "format: float32 little",
                "format: int16 little",
                "23:11",
                "need a scale",
                "size of one count",
            ),
            wrong(
                "format: float32 little",
                "format: float32 big\n  scale: {voltage: 1 V, current: 1 A}",
                "24:10",
                "only whole numbers",
                "take it out",
            ),
            wrong(
                "gives: [voltage, current]    #",
                "gives: [voltage]  #",
                "20:10",
                "both voltage and current",
                "order of the block",
            ),
            wrong(
                "gives: [voltage, current]    #",
                "gives: [voltage, power]  #",
                "20:20",
                "can't be `power`",
                "",
            ),
            wrong("points: 1500", "points: 5", "22:11", "from 10 to", "digits"),
            wrong(
                "interval: \":WAV:INT?\"",
                "interval: 0.2",
                "21:13",
                "has no unit",
                "",
            ),
            wrong(
                "interval: \":WAV:INT?\"",
                "interval: 1 s",
                "21:13",
                "out of range",
                "",
            ),
            wrong(
                "update interval: 100 ms",
                "update interval: 100 ms\ncoupling: alternating",
                "12:11",
                "can't be `alternating`",
                "dc, ac",
            ),
        ]);
    }
}
