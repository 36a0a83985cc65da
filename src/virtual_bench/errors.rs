//! How the instruments of a virtual bench err: drawn once for a bench and seed.

use super::chance::Chance;
use crate::quantity::Reading;
use crate::spec::bench::CalibrationPoint;
use crate::stats::RECTANGULAR;

/// A surface sensor reads up to this share of its rise too low (house value).
const CONTACT: f64 = 0.01;

/// Which distributions errors come from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Drawn {
    /// For rehearsals: the gain within the share of the reading and the offset within
    /// the rest of the accuracy, each evenly; contact errors of a house value.
    #[default]
    House,
    /// Exactly as an uncertainty budget states them: the whole accuracy as one even
    /// draw within its half-width, the calibration's residual normal with U/k.
    AsStated,
    /// With the same standard uncertainties as stated, each normal.
    Normal,
}

/// What the errors of a bench are drawn from.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Errors {
    /// Which distributions.
    pub drawn: Drawn,
    /// Calibration points by instrument: what it shows lies off by their corrections,
    /// and by a draw from their uncertainty. Not looked at by [`Drawn::House`].
    pub calibration: Vec<(String, CalibrationPoint)>,
    /// How far the true voltage lies off the one that is set, as a share of it.
    pub supply: f64,
}

/// The error of one reading of one instrument.
#[derive(Debug, Clone, Default)]
pub(super) struct Flaw {
    gain: f64,
    offset: f64,
    /// A standard normal draw.
    residual: f64,
    /// Points of this reading: where, correction, standard uncertainty; rising.
    calibration: Vec<(f64, f64, f64)>,
}

impl Errors {
    pub(super) fn flaw(
        &self,
        chance: Chance,
        instrument: &str,
        reading: Reading,
        channel: Option<u32>,
    ) -> Flaw {
        let (gain, offset) = match self.drawn {
            Drawn::House => {
                return Flaw {
                    gain: chance.even(0),
                    offset: chance.even(1),
                    ..Flaw::default()
                };
            }
            Drawn::AsStated => (chance.even(0), chance.even(0)),
            Drawn::Normal => {
                let draw = chance.normal(0) / RECTANGULAR;
                (draw, draw)
            }
        };
        let is_for = |point: &CalibrationPoint| {
            point.reading == reading && (point.channel.is_none() || point.channel == channel)
        };
        let mut calibration: Vec<(f64, f64, f64)> = self
            .calibration
            .iter()
            .filter(|(name, point)| name == instrument && is_for(point))
            .map(|(_, p)| (p.at, p.correction, p.expanded / p.coverage.max(1.0)))
            .collect();
        calibration.sort_by(|a, b| a.0.total_cmp(&b.0));
        Flaw {
            gain,
            offset,
            residual: chance.normal(2),
            calibration,
        }
    }

    /// Share of the rise that a surface sensor reads too low: anything up to
    /// [`CONTACT`], as the demo bench's `contact error` states it.
    pub(super) fn contact(&self, chance: Chance) -> f64 {
        0.5 * CONTACT * (1.0 + self.within(chance))
    }

    /// Where within its class's tolerance a sensor lies, from -1 to 1.
    pub(super) fn deviation(&self, chance: Chance) -> f64 {
        self.within(chance)
    }

    /// A draw of standard deviation 1 / sqrt 3: evenly from -1 to 1, or normal.
    fn within(&self, chance: Chance) -> f64 {
        match self.drawn {
            Drawn::House | Drawn::AsStated => chance.even(0),
            Drawn::Normal => chance.normal(0) / RECTANGULAR,
        }
    }
}

impl Flaw {
    /// What is shown too much at a true value whose accuracy has these two parts.
    pub(super) fn of(&self, truth: f64, share: f64, constant: f64) -> f64 {
        let (correction, standard) = self.calibration_at(truth);
        self.gain * share + self.offset * constant + self.residual * standard - correction
    }

    /// Correction and standard uncertainty, straight between points, those of the
    /// ends beyond them.
    fn calibration_at(&self, value: f64) -> (f64, f64) {
        let points = &self.calibration;
        let above = points.partition_point(|p| p.0 <= value);
        let below = above.checked_sub(1).and_then(|i| points.get(i));
        match (below, points.get(above)) {
            (Some(low), Some(high)) => {
                let share = (value - low.0) / (high.0 - low.0);
                let between = |a: f64, b: f64| a + share * (b - a);
                (between(low.1, high.1), between(low.2, high.2))
            }
            (Some(only), None) | (None, Some(only)) => (only.1, only.2),
            (None, None) => (0.0, 0.0),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn point(at: f64, correction: f64, expanded: f64) -> (String, CalibrationPoint) {
        let point = CalibrationPoint {
            reading: Reading::Power,
            channel: None,
            at,
            correction,
            expanded,
            coverage: 2.0,
        };
        ("meter".to_owned(), point)
    }

    fn flaws(errors: &Errors, reading: Reading) -> impl Iterator<Item = f64> + '_ {
        (0..4000).map(move |seed| {
            let chance = Chance::of(seed, "meter power 0");
            let flaw = errors.flaw(chance, "meter", reading, None);
            // Half-width 0.3 at 100.
            flaw.of(100.0, 0.1, 0.2)
        })
    }

    fn mean_and_deviation(values: impl Iterator<Item = f64>) -> (f64, f64, f64) {
        let values: Vec<f64> = values.collect();
        let n = values.len() as f64;
        let mean = values.iter().sum::<f64>() / n;
        let variance = values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / n;
        let largest = values.iter().fold(0.0_f64, |a, v| a.max(v.abs()));
        (mean, variance.sqrt(), largest)
    }

    #[test]
    fn the_whole_accuracy_is_one_even_draw_where_the_budget_says_so() {
        let errors = |drawn| Errors {
            drawn,
            ..Errors::default()
        };
        let as_stated = errors(Drawn::AsStated);
        let (mean, deviation, largest) = mean_and_deviation(flaws(&as_stated, Reading::Power));
        assert!(mean.abs() < 0.012, "{mean}");
        assert!((deviation - 0.3 / RECTANGULAR).abs() < 0.005, "{deviation}");
        assert!(largest <= 0.3 && largest > 0.299, "{largest}");
        let normal = errors(Drawn::Normal);
        let (mean, deviation, largest) = mean_and_deviation(flaws(&normal, Reading::Power));
        assert!(mean.abs() < 0.012, "{mean}");
        assert!((deviation - 0.3 / RECTANGULAR).abs() < 0.009, "{deviation}");
        assert!(largest > 0.45, "{largest}");
        // Two draws of their own scatter less than one of the same half-width.
        let house = errors(Drawn::House);
        let (_, deviation, _) = mean_and_deviation(flaws(&house, Reading::Power));
        assert!(deviation < 0.14, "{deviation}");
    }

    #[test]
    fn calibration_moves_what_is_shown_and_scatters_by_its_own_uncertainty() {
        let errors = Errors {
            drawn: Drawn::AsStated,
            calibration: vec![point(50.0, 1.0, 1.0), point(150.0, 3.0, 3.0)],
            ..Errors::default()
        };
        let (mean, deviation, _) = mean_and_deviation(flaws(&errors, Reading::Power));
        assert!((mean + 2.0).abs() < 0.06, "{mean}");
        let expected = libm::hypot(0.3 / RECTANGULAR, 1.0);
        assert!((deviation - expected).abs() < 0.04, "{deviation}");
        let (mean, ..) = mean_and_deviation(flaws(&errors, Reading::Voltage));
        assert!(mean.abs() < 0.012, "{mean}");
        let flaw = errors.flaw(Chance::of(1, "x"), "meter", Reading::Power, None);
        assert_eq!(flaw.calibration_at(10.0), (1.0, 0.5));
        assert_eq!(flaw.calibration_at(1e4), (3.0, 1.5));
    }
}
