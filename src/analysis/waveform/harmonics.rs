//! Harmonics of the current, the limits of IEC 61000-3-2 class A, and what they say
//! of a half-wave load.

use serde::{Deserialize, Serialize};

use super::mains::Mains;
use super::window::Window;
use super::{Shape, Tail};
use crate::quantity::at_most;

/// Harmonics are told up to this one.
pub const MOST_HARMONICS: usize = 40;
/// Up to this input there are no limits (IEC 61000-3-2, read).
const FREE_UP_TO_W: f64 = 75.0;
/// A half-wave load has a second harmonic above this share of the fundamental, even
/// beside a fan; a plain one has 0.424 (computed).
const SECOND: f64 = 0.1;
/// Its DC part is 1.5 of the second harmonic's amplitude (computed, A/pi against
/// 0.212207 A), whatever else flows beside it; below this share of that it is lost.
const DC_TO_SECOND: f64 = 0.5;

/// What DC part and even harmonics say.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum HalfWave {
    /// No even harmonics: no half-wave load.
    None,
    /// Even harmonics and the DC part that belongs to them.
    Seen,
    /// Even harmonics without the DC part that belongs to them: the instrument lost it.
    DcLost,
}

/// The harmonic nearest to its limit, or furthest above it.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct ClassA {
    /// Its number.
    pub harmonic: usize,
    /// Its RMS, A.
    pub rms_a: f64,
    /// Its limit, A.
    pub limit_a: f64,
    /// How many harmonics were compared, from the second on.
    pub compared: usize,
}

impl ClassA {
    /// Whether every harmonic that was compared keeps its limit.
    pub fn kept(&self) -> bool {
        at_most(self.rms_a, self.limit_a)
    }
}

/// RMS of every harmonic from the fundamental on, by a discrete Fourier transform
/// over a rectangular window of whole periods.
pub(super) fn rms(samples: &[f64], window: &Window, periods: usize, mains: &Mains) -> Vec<f64> {
    // The n-th harmonic lies below half the sampling rate.
    let to_a_period = window.length() / periods.max(1) as f64;
    let told = ((to_a_period / 2.0 - 1e-6).floor() as usize).min(MOST_HARMONICS);
    (1..=told)
        .map(|n| {
            let turn = |k: usize| std::f64::consts::PI * n as f64 * mains.turns_of_pi(k as f64);
            let cosine = window.mean(|k| samples[k] * libm::cos(turn(k)));
            let sine = window.mean(|k| samples[k] * libm::sin(turn(k)));
            std::f64::consts::SQRT_2 * libm::hypot(cosine, sine)
        })
        .collect()
}

/// Limit of a harmonic in amperes RMS; nothing for the fundamental and beyond the
/// 40th. IEC 61000-3-2 class A (read).
pub fn class_a_limit(harmonic: usize) -> Option<f64> {
    let n = harmonic as f64;
    match harmonic {
        2 => Some(1.08),
        3 => Some(2.30),
        4 => Some(0.43),
        5 => Some(1.14),
        6 => Some(0.30),
        7 => Some(0.77),
        9 => Some(0.40),
        11 => Some(0.33),
        13 => Some(0.21),
        15..=39 if harmonic % 2 == 1 => Some(0.15 * 15.0 / n),
        8..=40 if harmonic.is_multiple_of(2) => Some(0.23 * 8.0 / n),
        _ => None,
    }
}

impl Shape {
    /// The harmonic nearest to its limit of IEC 61000-3-2 class A.
    ///
    /// # Errors
    /// Where no limits apply, or no harmonic is told.
    pub fn class_a(&self) -> Result<ClassA, String> {
        let power_w = self.tail.power_w;
        if at_most(power_w, FREE_UP_TO_W) {
            return Err(format!(
                "class A sets no limits up to {FREE_UP_TO_W} W; it drew {power_w:.1} W"
            ));
        }
        let compared = self.tail.harmonics_a.len().saturating_sub(1);
        let limited = self.tail.harmonics_a.iter().zip(1..);
        limited
            .filter_map(|(rms_a, harmonic)| {
                Some(ClassA {
                    harmonic,
                    rms_a: *rms_a,
                    limit_a: class_a_limit(harmonic)?,
                    compared,
                })
            })
            .max_by(|a, b| (a.rms_a / a.limit_a).total_cmp(&(b.rms_a / b.limit_a)))
            .ok_or_else(|| "its samples lie too far apart for any harmonic".to_owned())
    }
}

/// What a tail's DC part and second harmonic say.
pub(super) fn half_wave(tail: &Tail) -> HalfWave {
    let [first, second, ..] = tail.harmonics_a[..] else {
        return HalfWave::None;
    };
    if second <= SECOND * first || second <= 0.0 {
        return HalfWave::None;
    }
    let amplitude = std::f64::consts::SQRT_2 * second;
    if tail.dc_a.abs() < DC_TO_SECOND * amplitude {
        HalfWave::DcLost
    } else {
        HalfWave::Seen
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn class_a_limits_are_the_standards() {
        // IEC 61000-3-2 class A (read).
        for (n, limit) in [
            (2, 1.08),
            (3, 2.30),
            (4, 0.43),
            (5, 1.14),
            (6, 0.30),
            (7, 0.77),
            (8, 0.23),
            (9, 0.40),
            (11, 0.33),
            (13, 0.21),
            (15, 0.15),
            (40, 0.046),
            (39, 0.15 * 15.0 / 39.0),
        ] {
            let found = class_a_limit(n).unwrap();
            assert!((found - limit).abs() < 1e-12, "{n}: {found}");
        }
        assert_eq!([0, 1, 41, 42].map(class_a_limit), [None; 4]);
        let all = (2..=40).filter_map(class_a_limit);
        assert_eq!(all.count(), 39);
    }
}
