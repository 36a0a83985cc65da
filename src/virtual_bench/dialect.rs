//! A driver's texts turned round: what an instrument of that dialect understands.
//!
//! Each text of the driver becomes a template that an incoming message is held
//! against, so the simulated instrument speaks exactly what the driver file says.

use crate::quantity::Reading;
use crate::spec::driver::{Driver, SampleInterval, Setting};

/// What a message asks for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Ask {
    /// Who are you?
    Identity,
    /// Empty the error queue.
    Clear,
    /// A command on opening that changes nothing here.
    Accept,
    /// The oldest error.
    NextError,
    /// The driver's reading query of this number.
    Read(usize),
    /// Change a setting.
    Set(Knob),
    /// Read a setting back.
    Confirm(Knob),
    /// Output on.
    On,
    /// Output off.
    Off,
    /// Is the output on?
    OutputState,
    /// Take a waveform at the next switching on.
    Arm,
    /// Is it taken?
    WaveformReady,
    /// Its interval in seconds.
    WaveformInterval,
    /// The waveform itself.
    Waveform,
}

/// What can be set.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Knob {
    /// Output voltage, V.
    Voltage,
    /// Output frequency, Hz.
    Frequency,
    /// Position of the unit's switch.
    Position,
}

/// One message that is understood.
#[derive(Debug, Clone)]
struct Template {
    head: String,
    /// What follows the hole; absent: the text has none.
    tail: Option<String>,
    ask: Ask,
}

/// All messages of one driver.
#[derive(Debug, Clone)]
pub struct Dialect {
    templates: Vec<Template>,
    replies: Vec<ReplyShape>,
}

/// How a reading query is answered.
#[derive(Debug, Clone)]
pub struct ReplyShape {
    /// Readings in the order of the reply.
    pub gives: Vec<Reading>,
    /// Between them: `;` where the query is a compound one, else `,`.
    pub separator: u8,
    /// Whether the query names a channel.
    pub channelled: bool,
}

impl Dialect {
    /// The dialect of a driver.
    pub fn of(driver: &Driver) -> Self {
        let mut dialect = Self {
            templates: Vec::new(),
            replies: Vec::new(),
        };
        // Polled messages first: they are looked for most.
        for (number, query) in driver.readings.iter().enumerate() {
            dialect.learn(&query.ask, Ask::Read(number));
            dialect.replies.push(ReplyShape {
                gives: query.gives.clone(),
                separator: if query.ask.contains(';') { b';' } else { b',' },
                channelled: query.ask.contains("{channel}"),
            });
        }
        dialect.learn_settings(driver);
        dialect.learn_waveform(driver);
        dialect.learn(&driver.identity.ask, Ask::Identity);
        if let Some(errors) = &driver.errors {
            dialect.learn(errors, Ask::NextError);
        }
        for command in &driver.on_opening {
            let clears = command.trim().eq_ignore_ascii_case("*CLS");
            dialect.learn(command, if clears { Ask::Clear } else { Ask::Accept });
        }
        // Texts without a hole first, so that `VOLT{value}` does not swallow `VOLT?`.
        dialect.templates.sort_by_key(|t| t.tail.is_some());
        dialect
    }

    fn learn_settings(&mut self, driver: &Driver) {
        let settings = &driver.settings;
        let knobs: [(&Option<Setting>, Knob); 3] = [
            (&settings.voltage, Knob::Voltage),
            (&settings.frequency, Knob::Frequency),
            (&settings.position, Knob::Position),
        ];
        for (setting, knob) in knobs {
            if let Some(setting) = setting {
                self.learn(&setting.set, Ask::Set(knob));
                if let Some(confirm) = &setting.confirm {
                    self.learn(confirm, Ask::Confirm(knob));
                }
            }
        }
        let output = [
            (&settings.output_on, Ask::On),
            (&settings.output_off, Ask::Off),
            (&settings.output_state, Ask::OutputState),
        ];
        for (text, ask) in output {
            if let Some(text) = text {
                self.learn(text, ask);
            }
        }
    }

    fn learn_waveform(&mut self, driver: &Driver) {
        let Some(waveform) = &driver.waveform else {
            return;
        };
        // The last command of several arms; those before it set up.
        for (n, command) in waveform.arm.iter().enumerate() {
            let arms = n + 1 == waveform.arm.len();
            self.learn(command, if arms { Ask::Arm } else { Ask::Accept });
        }
        if let Some(ready) = &waveform.ready {
            self.learn(ready, Ask::WaveformReady);
        }
        if let SampleInterval::Asked(interval) = &waveform.interval {
            self.learn(interval, Ask::WaveformInterval);
        }
        self.learn(&waveform.ask, Ask::Waveform);
    }

    fn learn(&mut self, text: &str, ask: Ask) {
        let text = text.trim();
        let hole = ["{channel}", "{value}"]
            .into_iter()
            .find_map(|hole| text.split_once(hole));
        let (head, tail) = match hole {
            Some((head, tail)) => (head, Some(tail.to_owned())),
            None => (text, None),
        };
        self.templates.push(Template {
            head: head.to_owned(),
            tail,
            ask,
        });
    }

    /// What a message asks for, and what stands in its hole. Letters' case is free.
    pub fn understand<'a>(&self, message: &'a [u8]) -> Option<(Ask, Option<&'a [u8]>)> {
        self.templates
            .iter()
            .find_map(|template| template.matched(message))
    }

    /// How reading query `number` is answered.
    pub fn reply(&self, number: usize) -> Option<&ReplyShape> {
        self.replies.get(number)
    }
}

impl Template {
    fn matched<'a>(&self, message: &'a [u8]) -> Option<(Ask, Option<&'a [u8]>)> {
        let head = self.head.as_bytes();
        let Some(tail) = &self.tail else {
            return message
                .eq_ignore_ascii_case(head)
                .then_some((self.ask, None));
        };
        let tail = tail.as_bytes();
        let hole = head.len()..message.len().checked_sub(tail.len())?;
        let inside = message.get(hole)?;
        let around = message[..head.len()].eq_ignore_ascii_case(head)
            && message[message.len() - tail.len()..].eq_ignore_ascii_case(tail);
        around.then_some((self.ask, Some(inside)))
    }
}

/// Writes numbers with a fixed number of decimals, rounded to a resolution.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Display {
    resolution: f64,
    /// The resolution in units of the last decimal.
    step: i64,
    decimals: usize,
}

impl Display {
    /// A display of this resolution, in the reading's base unit; 0 shows six decimals.
    pub fn of(resolution: f64) -> Self {
        let resolution = if resolution > 0.0 && resolution.is_finite() {
            resolution
        } else {
            1e-6
        };
        let decimals = (0..9_usize)
            .find(|d| {
                let scaled = resolution * 10_f64.powi(*d as i32);
                scaled.round() >= 1.0 && (scaled - scaled.round()).abs() < 1e-6 * scaled
            })
            .unwrap_or(9);
        let step = (resolution * 10_f64.powi(decimals as i32)).round().max(1.0) as i64;
        Self {
            resolution,
            step,
            decimals,
        }
    }

    /// Appends `value`.
    pub fn write(self, value: f64, out: &mut Vec<u8>) {
        let units = ((value / self.resolution).round() as i64).saturating_mul(self.step);
        if units < 0 {
            out.push(b'-');
        }
        let mut digits = [b'0'; 32];
        let mut at = digits.len();
        let mut left = units.unsigned_abs();
        let mut count = 0;
        while left > 0 || count <= self.decimals {
            if count == self.decimals && count > 0 {
                at -= 1;
                digits[at] = b'.';
            }
            at -= 1;
            digits[at] = b'0' + (left % 10) as u8;
            left /= 10;
            count += 1;
        }
        out.extend_from_slice(&digits[at..]);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn written(resolution: f64, value: f64) -> String {
        let mut out = Vec::new();
        Display::of(resolution).write(value, &mut out);
        String::from_utf8(out).unwrap()
    }

    #[test]
    fn numbers_have_the_decimals_of_their_resolution() {
        for (resolution, value, text) in [
            (0.01, 230.0, "230.00"),
            (0.01, -0.004, "0.00"),
            (0.01, -0.006, "-0.01"),
            (0.001, 9.530_4, "9.530"),
            (1e-5, 0.041_238_7, "0.04124"),
            (0.5, 20.3, "20.5"),
            (0.25, 20.3, "20.25"),
            (1.0, 99.5, "100"),
            (10.0, 1234.0, "1230"),
            (0.1, 0.05, "0.1"),
            (0.0, 1.0, "1.000000"),
        ] {
            assert_eq!(written(resolution, value), text, "{value} to {resolution}");
        }
        assert_eq!(written(1e-9, 1e300), "9223372036.854775807");
    }

    #[test]
    fn every_number_reads_back_within_half_a_resolution() {
        for n in -5000..5000 {
            let value = f64::from(n) * 0.007_31;
            let back: f64 = written(0.01, value).parse().unwrap();
            assert!((back - value).abs() <= 0.005 + 1e-9);
        }
    }
}
