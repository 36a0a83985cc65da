//! What a simulated meter takes a waveform with: armed, triggered by the first
//! current, and read as a block of the driver's format.

use super::unit::Specimen;
use crate::quantity::{Reading, shortest};
use crate::spec::driver::{BlockFormat, Driver, SampleInterval, WaveformQuery};

/// From sample to sample where the driver asks for it, s (house value: 5 kS/s).
const INTERVAL_S: f64 = 2e-4;
/// Part of a block from before the first current, s (house value).
const BEFORE_S: f64 = 0.01;

/// A switching on that was taken down: the specimen as it was then.
#[derive(Debug, Clone)]
pub struct Taken {
    pub(super) specimen: Specimen,
    /// When, in seconds of the run.
    pub(super) at: f64,
    /// Frequency of the mains, Hz.
    pub(super) hertz: f64,
    /// Phase of the mains then, in turns after its rising zero.
    pub(super) turns: f64,
    /// When it went off again.
    pub(super) off: Option<f64>,
}

/// A single acquisition.
#[derive(Debug, Clone, Default)]
pub struct Scope {
    armed: bool,
    taken: Option<Box<Taken>>,
}

/// Momentary values without an instrument between.
#[derive(Debug, Clone, Default)]
pub struct Momentary {
    pub(super) volts: Vec<f64>,
    pub(super) amps: Vec<f64>,
}

impl Scope {
    /// The next switching on is taken; what was taken before is gone.
    pub fn arm(&mut self) {
        self.armed = true;
        self.taken = None;
    }

    pub(super) fn switched_on(&mut self, taken: &Taken) {
        if std::mem::take(&mut self.armed) {
            self.taken = Some(Box::new(taken.clone()));
        }
    }

    pub(super) fn switched_off(&mut self, now: f64) {
        if let Some(taken) = &mut self.taken {
            taken.off.get_or_insert(now);
        }
    }

    /// Whether the block is complete.
    pub fn is_ready(&self, driver: &Driver, now: f64) -> bool {
        let length = interval_s(driver) * points(driver) as f64;
        self.taken
            .as_ref()
            .is_some_and(|taken| now >= taken.at + length)
    }

    /// When it was taken, seconds of the run; before everything where nothing was.
    pub fn taken_at(&self) -> f64 {
        self.taken.as_ref().map_or(f64::NEG_INFINITY, |t| t.at)
    }

    /// What was taken.
    pub fn samples(&self, driver: &Driver) -> Option<Momentary> {
        let taken = self.taken.as_ref()?;
        let step = interval_s(driver);
        let before = libm::round(BEFORE_S / step);
        let mut specimen = taken.specimen.clone();
        let mut out = Momentary::default();
        for n in 0..points(driver) {
            let since = (n as f64 - before) * step;
            let t = taken.at + since;
            if since < 0.0 || taken.off.is_some_and(|off| t >= off) {
                out.volts.push(0.0);
                out.amps.push(0.0);
                continue;
            }
            specimen.advance(t);
            let turns = taken.turns + taken.hertz * since;
            let (volts, amps) = specimen.momentary(t, turns);
            out.volts.push(volts);
            out.amps.push(amps);
        }
        Some(out)
    }
}

impl Momentary {
    /// An AC-coupled input takes out the mean of what flows.
    pub fn lose_dc(&mut self) {
        let first = self.amps.iter().position(|i| *i != 0.0).unwrap_or(0);
        let flowing = &mut self.amps[first..];
        let mean = flowing.iter().sum::<f64>() / flowing.len().max(1) as f64;
        for amps in flowing {
            *amps -= mean;
        }
    }
}

/// From sample to sample, s.
pub fn interval_s(driver: &Driver) -> f64 {
    match driver.waveform.as_ref().map(|w| &w.interval) {
        Some(SampleInterval::Fixed(span)) => span.get(),
        _ => INTERVAL_S,
    }
}

fn points(driver: &Driver) -> usize {
    driver.waveform.as_ref().map_or(0, |w| w.points as usize)
}

/// Writes pairs as a definite block, text as a line.
pub fn write_block(query: &WaveformQuery, volts: &[f64], amps: &[f64], out: &mut Vec<u8>) {
    let voltage_first = query.gives.first() == Some(&Reading::Voltage);
    let (per_volt, per_amp) = query.scale.map_or((1.0, 1.0), |(v, a)| (1.0 / v, 1.0 / a));
    let mut body = Vec::with_capacity(query.format.width() * 2 * volts.len());
    for (volts, amps) in volts.iter().zip(amps) {
        let pair = [volts * per_volt, amps * per_amp];
        let pair = if voltage_first {
            pair
        } else {
            [pair[1], pair[0]]
        };
        for value in pair {
            write_number(query.format, value, &mut body);
        }
    }
    if query.format == BlockFormat::Text {
        body.pop();
    } else {
        let count = body.len().to_string();
        out.extend_from_slice(format!("#{}{count}", count.len()).as_bytes());
    }
    out.extend_from_slice(&body);
}

fn write_number(format: BlockFormat, value: f64, out: &mut Vec<u8>) {
    let single = value as f32;
    // A cast to a whole number stops at its ends, which say "overload".
    let count = libm::round(value) as i16;
    match format {
        BlockFormat::Float32Little => out.extend_from_slice(&single.to_le_bytes()),
        BlockFormat::Float32Big => out.extend_from_slice(&single.to_be_bytes()),
        BlockFormat::Float64Little => out.extend_from_slice(&value.to_le_bytes()),
        BlockFormat::Float64Big => out.extend_from_slice(&value.to_be_bytes()),
        BlockFormat::Int16Little => out.extend_from_slice(&count.to_le_bytes()),
        BlockFormat::Int16Big => out.extend_from_slice(&count.to_be_bytes()),
        BlockFormat::Text => {
            out.extend_from_slice(shortest(f64::from(single)).as_bytes());
            out.push(b',');
        }
    }
}
