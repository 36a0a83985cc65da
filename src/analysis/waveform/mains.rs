//! Frequency and zero crossings of the voltage.

use super::window::Window;

/// A crossing counts once the voltage has passed this share of its highest, so that
/// noise around zero makes none.
const BEYOND: f64 = 0.1;
/// A measured frequency further than this from the nominal one is another frequency.
const OFF_NOMINAL: f64 = 0.05;
/// Longest tail, s: 10 periods of 50 Hz, 12 of 60 Hz (IEC 61000-4-7, from memory).
const TAIL_S: f64 = 0.2;

/// The voltage's period and phase, in samples.
#[derive(Debug, Clone, Copy)]
pub(super) struct Mains {
    /// Samples to a half-period.
    half: f64,
    /// Sample number of a rising zero crossing of the fundamental, in the first period.
    rising: f64,
    /// Periods to a tail.
    most_periods: usize,
}

impl Mains {
    /// The mains behind sampled volts.
    ///
    /// # Errors
    /// Where there is no voltage, or its frequency is not the nominal one.
    pub(super) fn of(volts: &[f64], step_s: f64, nominal_hz: f64) -> Result<Self, String> {
        let nominal = 1.0 / (nominal_hz * step_s);
        if !(nominal.is_finite() && nominal >= 4.0) {
            return Err("its samples lie too far apart for the mains frequency".to_owned());
        }
        let highest = volts.iter().fold(0.0_f64, |top, v| top.max(v.abs()));
        if highest <= 0.0 {
            return Err("it holds no voltage".to_owned());
        }
        let crossings = rising_crossings(volts, BEYOND * highest);
        let period = match (crossings.first(), crossings.last()) {
            (Some(first), Some(last)) if crossings.len() >= 2 => {
                (last - first) / (crossings.len() - 1) as f64
            }
            _ => nominal,
        };
        if (period / nominal - 1.0).abs() > OFF_NOMINAL {
            return Err(format!(
                "its voltage has {:.1} Hz, not {nominal_hz} Hz",
                1.0 / (period * step_s)
            ));
        }
        let rising = phase(volts, period).ok_or("it is shorter than one period")?;
        Ok(Self {
            half: 0.5 * period,
            rising,
            most_periods: libm::round(TAIL_S * nominal_hz).max(1.0) as usize,
        })
    }

    pub(super) fn hertz(&self, step_s: f64) -> f64 {
        1.0 / (2.0 * self.half * step_s)
    }

    /// Phase of the voltage at a sample, degrees from 0 up to 360.
    pub(super) fn angle_deg(&self, sample: f64) -> f64 {
        let turns = (sample - self.rising) / (2.0 * self.half);
        let angle = 360.0 * (turns - turns.floor());
        if angle >= 360.0 { 0.0 } else { angle }
    }

    /// Half-period number from the start of sample `n`, counted in turns of pi.
    pub(super) fn turns_of_pi(&self, sample: f64) -> f64 {
        (sample - self.rising) / self.half
    }

    /// Every half-period between sample 0 and `last`, and whether it is a positive one.
    pub(super) fn half_periods(&self, last: f64) -> impl Iterator<Item = (Window, bool)> {
        const SLACK: f64 = 1e-6;
        let first = (-(self.rising + SLACK) / self.half).ceil() as i64;
        let (rising, half) = (self.rising, self.half);
        (first..)
            .map(move |k| (k, rising + k as f64 * half))
            .take_while(move |(_, from)| from + half <= last + SLACK)
            .map(move |(k, from)| (Window::new(from, (from + half).min(last)), k % 2 == 0))
    }

    /// The last whole periods that begin after `from`, and how many they are.
    pub(super) fn last_periods(&self, from: f64, last: f64) -> Option<(Window, usize)> {
        let period = 2.0 * self.half;
        // A whole number of half-periods from a crossing on, so that polarities are whole.
        let end = self.rising + ((last - self.rising + 1e-6) / self.half).floor() * self.half;
        let fit = ((end - from + 1e-6) / period).floor() as usize;
        let periods = fit.min(self.most_periods);
        (periods > 0).then(|| {
            let end = end.min(last);
            (Window::new(end - periods as f64 * period, end), periods)
        })
    }
}

/// Where the voltage rises through zero, between samples, once it has been below
/// `-beyond` and before it is above `beyond`.
fn rising_crossings(volts: &[f64], beyond: f64) -> Vec<f64> {
    let mut crossings = Vec::new();
    let mut been_below = false;
    let mut at = None;
    for n in 0..volts.len() {
        let (now, before) = (volts[n], if n > 0 { volts[n - 1] } else { 0.0 });
        if now < -beyond {
            been_below = true;
            at = None;
        }
        if been_below && before < 0.0 && now >= 0.0 {
            at = Some((n - 1) as f64 + before / (before - now));
        }
        if been_below && now > beyond {
            crossings.extend(at.take());
            been_below = false;
        }
    }
    crossings
}

/// First rising zero of the fundamental, from the last whole periods of the block;
/// nothing where there is not one.
fn phase(volts: &[f64], period: f64) -> Option<f64> {
    let last = (volts.len() - 1) as f64;
    let periods = ((last + 1e-6) / period).floor();
    if periods < 1.0 {
        return None;
    }
    // The end of the block: its start may lie before the output was on.
    let taken = (periods - 1.0).clamp(1.0, 10.0);
    let window = Window::new((last - taken * period).max(0.0), last);
    let turn = |n: usize| 2.0 * std::f64::consts::PI * n as f64 / period;
    let sine = window.mean(|n| volts[n] * libm::sin(turn(n)));
    let cosine = window.mean(|n| volts[n] * libm::cos(turn(n)));
    let turns = libm::atan2(cosine, sine) / (2.0 * std::f64::consts::PI);
    let first = -turns - (-turns).floor();
    Some(first * period)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sine(hertz: f64, phase_deg: f64, step_s: f64, n: usize) -> Vec<f64> {
        (0..n)
            .map(|k| {
                let turns = hertz * step_s * k as f64 + phase_deg / 360.0;
                325.0 * libm::sin(2.0 * std::f64::consts::PI * turns)
            })
            .collect()
    }

    #[test]
    fn frequency_and_phase_are_measured() {
        for (hertz, phase) in [(50.0, 0.0), (49.9, 77.0), (50.2, 200.0), (60.0, 359.0)] {
            let volts = sine(hertz, phase, 1e-4, 3000);
            let nominal = if hertz > 55.0 { 60.0 } else { 50.0 };
            let mains = Mains::of(&volts, 1e-4, nominal).unwrap();
            assert!((mains.hertz(1e-4) - hertz).abs() < 1e-3, "{hertz}");
            let apart = (mains.angle_deg(0.0) - phase).abs();
            assert!(
                apart.min(360.0 - apart) < 0.05,
                "{hertz} Hz, {phase}: {apart}"
            );
        }
    }

    #[test]
    fn another_frequency_no_voltage_and_too_little_are_told() {
        let told = |volts: &[f64], step| Mains::of(volts, step, 50.0).unwrap_err();
        assert!(told(&sine(60.0, 0.0, 1e-4, 3000), 1e-4).contains("60.0 Hz, not 50 Hz"));
        assert!(told(&[0.0; 3000], 1e-4).contains("no voltage"));
        assert!(told(&sine(50.0, 0.0, 1e-4, 150), 1e-4).contains("shorter than one period"));
        assert!(told(&sine(50.0, 0.0, 1e-2, 300), 1e-2).contains("too far apart"));
    }

    #[test]
    fn noise_around_zero_makes_no_crossings() {
        let mut volts = sine(50.0, 0.0, 1e-4, 2000);
        for (n, v) in volts.iter_mut().enumerate() {
            *v += if n % 2 == 0 { 20.0 } else { -20.0 };
        }
        assert!(rising_crossings(&volts, 32.5).len().abs_diff(9) <= 1);
    }
}
