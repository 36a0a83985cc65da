//! What a waveform says: pure mathematics on equally spaced voltage and current.
//!
//! ```text
//! samples ──► mains: frequency and zero crossings ──► half-periods ──► voltage change
//!         └─► first current, peak, I2t           └──► the last whole periods:
//!                                                     RMS, power, DC part, harmonics
//! ```
//! Windows between samples are taken on the straight line between them, so that a
//! period need not be a whole number of samples.

mod change;
mod harmonics;
mod mains;
mod window;

use serde::{Deserialize, Serialize};

use crate::quantity::Waveform;

pub use change::{COUNTED, Reference, VoltageChange, relative_change};
pub use harmonics::{ClassA, HalfWave, MOST_HARMONICS, class_a_limit};

use super::types::Figure;
use mains::Mains;
use window::Window;

/// First current: the first sample above this share of the highest.
const FIRST_CURRENT: f64 = 0.02;

/// What a waveform says of a switch-on.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Shape {
    /// Samples.
    pub samples: usize,
    /// From sample to sample, s.
    pub interval_s: f64,
    /// Measured frequency of the voltage, Hz.
    pub frequency_hz: f64,
    /// First current, seconds from the block's first sample.
    pub t0_s: f64,
    /// Whether current flowed in the block's first sample already, so that more may
    /// have flowed before it.
    pub begins_late: bool,
    /// Phase of the voltage at the first current, degrees after its rising zero.
    pub switching_angle_deg: Figure<f64>,
    /// Highest momentary current, either way, A.
    pub peak_a: f64,
    /// Whether the peak lies in a positive half-period.
    pub peak_positive: bool,
    /// When, seconds after the first current.
    pub peak_after_s: f64,
    /// Integral of the squared current from the first current to the block's end, A2 s.
    pub i2t_a2s: f64,
    /// Every whole half-period from the first current on.
    pub half_periods: Vec<HalfPeriod>,
    /// The last whole periods.
    pub tail: Tail,
    /// What its DC part and even harmonics say.
    pub half_wave: HalfWave,
}

/// A half-period of the voltage.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct HalfPeriod {
    /// Its start, seconds from the block's first sample.
    pub from_s: f64,
    /// Whether the voltage is positive in it.
    pub positive: bool,
    /// RMS voltage, V.
    pub rms_v: f64,
    /// RMS current, A.
    pub rms_a: f64,
    /// Active part of the fundamental current, RMS, A.
    pub active_a: f64,
    /// Reactive part of the fundamental current, RMS, A; positive where it lags.
    pub reactive_a: f64,
}

/// The last whole periods of a block: at most 200 ms, 10 periods of 50 Hz or 12 of
/// 60 Hz, as IEC 61000-4-7 has it (from memory).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Tail {
    /// Its start, seconds from the block's first sample.
    pub from_s: f64,
    /// Whole periods in it.
    pub periods: usize,
    /// RMS voltage, V.
    pub rms_v: f64,
    /// RMS current with its DC part, A.
    pub rms_a: f64,
    /// RMS current of positive and of negative half-periods, each over its own time, A.
    pub rms_by_polarity_a: (f64, f64),
    /// Highest momentary current over RMS; absent where no current flows.
    pub crest_factor: Option<f64>,
    /// Active power, W.
    pub power_w: f64,
    /// Apparent power, VA.
    pub apparent_va: f64,
    /// Active over apparent power; absent where that is nothing.
    pub power_factor: Option<f64>,
    /// DC part of the current, A, with its sign.
    pub dc_a: f64,
    /// RMS of each harmonic of the current from the fundamental on, A: up to the 40th,
    /// or to what the interval can tell.
    pub harmonics_a: Vec<f64>,
}

/// What a waveform says at a nominal mains frequency; `floor_a` is the current below
/// which nothing is told from nothing.
///
/// # Errors
/// Why it says nothing: no voltage, another frequency, no current, too short.
pub fn shape(wave: &Waveform, nominal_hz: f64, floor_a: f64) -> Result<Shape, String> {
    let (volts, amps) = (wave.voltage_v(), wave.current_a());
    let step_s = wave.interval_s();
    let last = wave.len() - 1;
    let top = top(amps, 0..wave.len());
    if top.1 <= 2.0 * floor_a || top.1 <= 0.0 {
        return Err("no current flows in it".to_owned());
    }
    let threshold = (FIRST_CURRENT * top.1).max(2.0 * floor_a);
    let t0 = amps.iter().position(|i| i.abs() > threshold).unwrap_or(0);
    let mains = Mains::of(volts, step_s, nominal_hz)?;
    let half_periods = half_periods(wave, &mains, t0);
    let tail = tail(wave, &mains, t0)?;
    let since_t0 = Window::new(t0 as f64, last as f64);
    Ok(Shape {
        samples: wave.len(),
        interval_s: step_s,
        frequency_hz: mains.hertz(step_s),
        t0_s: t0 as f64 * step_s,
        begins_late: t0 == 0,
        switching_angle_deg: match t0 {
            0 => Figure::Absent("the block begins with current already flowing".to_owned()),
            _ => Figure::Known(mains.angle_deg(t0 as f64)),
        },
        peak_a: top.1,
        peak_positive: amps[top.0] > 0.0,
        peak_after_s: (top.0 - t0) as f64 * step_s,
        i2t_a2s: since_t0.integral(|n| amps[n] * amps[n]) * step_s,
        half_wave: harmonics::half_wave(&tail),
        half_periods,
        tail,
    })
}

/// Index and size of the largest sample of either sign.
fn top(samples: &[f64], range: std::ops::Range<usize>) -> (usize, f64) {
    range.fold((0, 0.0), |top, n| {
        let size = samples[n].abs();
        if size > top.1 { (n, size) } else { top }
    })
}

fn half_periods(wave: &Waveform, mains: &Mains, t0: usize) -> Vec<HalfPeriod> {
    let last = (wave.len() - 1) as f64;
    mains
        .half_periods(last)
        .filter(|(window, _)| window.to() > t0 as f64)
        .map(|(window, positive)| {
            let amps = wave.current_a();
            let turn =
                |n: usize| std::f64::consts::PI * (n as f64 - window.from()) / window.length();
            let sign = if positive { 1.0 } else { -1.0 };
            let root2 = sign * std::f64::consts::SQRT_2;
            HalfPeriod {
                from_s: window.from() * wave.interval_s(),
                positive,
                rms_v: window.rms(wave.voltage_v()),
                rms_a: window.rms(amps),
                active_a: root2 * window.mean(|n| amps[n] * libm::sin(turn(n))),
                reactive_a: -root2 * window.mean(|n| amps[n] * libm::cos(turn(n))),
            }
        })
        .collect()
}

fn tail(wave: &Waveform, mains: &Mains, t0: usize) -> Result<Tail, String> {
    let (volts, amps, step_s) = (wave.voltage_v(), wave.current_a(), wave.interval_s());
    let (window, periods) = mains
        .last_periods(t0 as f64, (wave.len() - 1) as f64)
        .ok_or("it is shorter than one period after the first current")?;
    let (rms_v, rms_a) = (window.rms(volts), window.rms(amps));
    let power_w = window.mean(|n| volts[n] * amps[n]);
    let apparent_va = rms_v * rms_a;
    let highest = top(amps, window.samples()).1;
    Ok(Tail {
        from_s: window.from() * step_s,
        periods,
        rms_v,
        rms_a,
        rms_by_polarity_a: (
            by_polarity(wave, mains, &window, true),
            by_polarity(wave, mains, &window, false),
        ),
        crest_factor: (rms_a > 0.0).then(|| highest / rms_a),
        power_w,
        apparent_va,
        power_factor: (apparent_va > 0.0).then(|| power_w / apparent_va),
        dc_a: window.mean(|n| amps[n]),
        harmonics_a: harmonics::rms(amps, &window, periods, mains),
    })
}

/// RMS current over the half-periods of one sign that lie in the window whole.
fn by_polarity(wave: &Waveform, mains: &Mains, window: &Window, positive: bool) -> f64 {
    let amps = wave.current_a();
    let squares: Vec<f64> = mains
        .half_periods(window.to())
        .filter(|(half, sign)| *sign == positive && half.from() >= window.from() - 1e-6)
        .map(|(half, _)| half.mean(|n| amps[n] * amps[n]))
        .collect();
    let count = squares.len().max(1) as f64;
    libm::sqrt(squares.iter().sum::<f64>() / count)
}

#[cfg(test)]
mod tests;
