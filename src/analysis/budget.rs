//! Uncertainty budgets: estimates from named lines, and estimates from estimates.
//!
//! A line keeps its input's own standard uncertainty, its sensitivity and what
//! error it speaks of, so that two estimates that share an error are combined with
//! its correlation (JCGM 100, 5.2.2), and so that a reader can follow each line.

use serde::{Deserialize, Serialize};

use crate::stats::{Combined, Correlation, Part, RECTANGULAR, RESOLUTION, combine_correlated};

use super::types::Estimate;

/// Which distribution an input is taken to have.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Distribution {
    /// Normal, or Student's where the degrees of freedom are few.
    Normal,
    /// Equally likely between two ends.
    Rectangular,
}

impl Distribution {
    /// The word in files for people.
    pub fn word(self) -> &'static str {
        match self {
            Distribution::Normal => "normal",
            Distribution::Rectangular => "rectangular",
        }
    }
}

/// An error that more than one line of a budget may speak of.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SharedError {
    /// Which, in words that are the same wherever it counts.
    pub error: String,
    /// Correlation coefficient between two lines that speak of it, 0 to 1.
    pub correlation: f64,
}

/// One line of an uncertainty budget.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Share {
    /// What it comes from.
    pub from: String,
    /// Standard uncertainty of the input, in `unit`.
    pub input: f64,
    /// Unit of the input.
    pub unit: String,
    /// Change of the estimate per unit of the input, with its sign.
    pub sensitivity: f64,
    /// Its contribution |c u| in the estimate's unit.
    pub standard: f64,
    /// Degrees of freedom; absent where it is no estimate from data (infinite).
    pub freedom: Option<f64>,
    /// The input's distribution.
    pub distribution: Distribution,
    /// The error that it speaks of, where another line may speak of it too.
    pub shared: Option<SharedError>,
}

impl Share {
    fn new(from: impl Into<String>, input: f64, unit: &str, distribution: Distribution) -> Self {
        Share {
            from: from.into(),
            input,
            unit: unit.to_owned(),
            sensitivity: 1.0,
            standard: input.abs(),
            freedom: None,
            distribution,
            shared: None,
        }
    }

    /// An error that lies within `half_width` on either side, each value alike likely
    /// (JCGM 100, 4.3.7).
    pub fn rectangular(from: impl Into<String>, half_width: f64, unit: &str) -> Self {
        let standard = half_width.abs() / RECTANGULAR;
        Self::new(from, standard, unit, Distribution::Rectangular)
    }

    /// A display's last digit: within half of it on either side (JCGM 100, F.2.2.1).
    pub fn resolution(from: impl Into<String>, digit: f64, unit: &str) -> Self {
        let standard = digit.abs() / RESOLUTION;
        Self::new(from, standard, unit, Distribution::Rectangular)
    }

    /// A normal error of known standard uncertainty, such as a certificate's U / k.
    pub fn normal(from: impl Into<String>, standard: f64, unit: &str) -> Self {
        Self::new(from, standard, unit, Distribution::Normal)
    }

    /// A standard uncertainty estimated from data with its degrees of freedom (type A).
    pub fn from_data(from: impl Into<String>, standard: f64, unit: &str, freedom: f64) -> Self {
        Share {
            freedom: freedom.is_finite().then_some(freedom),
            ..Self::normal(from, standard, unit)
        }
    }

    /// The same line seen through a further sensitivity, in the unit of the result.
    #[must_use]
    pub fn times(mut self, sensitivity: f64) -> Self {
        self.sensitivity *= sensitivity;
        self.standard = (self.sensitivity * self.input).abs();
        self
    }

    /// The same line, as speaking of an error that others may speak of too.
    #[must_use]
    pub fn shared_by(mut self, error: impl Into<String>, correlation: f64) -> Self {
        self.shared = Some(SharedError {
            error: error.into(),
            correlation: correlation.clamp(0.0, 1.0),
        });
        self
    }

    /// Whether it comes from data (type A of JCGM 100).
    pub fn is_type_a(&self) -> bool {
        self.freedom.is_some()
    }

    fn part(&self) -> Part {
        Part {
            standard: self.sensitivity * self.input,
            freedom: self.freedom.unwrap_or(f64::INFINITY),
        }
    }
}

impl Estimate {
    /// A value with its budget; lines of nothing are left out, the others sorted by
    /// size. Lines that speak of one error are combined with its correlation.
    pub fn combined(value: f64, mut lines: Vec<Share>) -> Self {
        lines.retain(|line| line.standard > 0.0);
        lines.sort_by(|a, b| b.standard.total_cmp(&a.standard));
        let parts: Vec<Part> = lines.iter().map(Share::part).collect();
        let Combined {
            freedom,
            coverage,
            expanded,
            ..
        } = combine_correlated(&parts, &correlations(&lines));
        Estimate {
            value,
            expanded,
            coverage,
            freedom: freedom.is_finite().then_some(freedom),
            budget: lines,
        }
    }

    /// The standard uncertainty u_c = U / k.
    pub fn standard(&self) -> f64 {
        self.expanded / self.coverage
    }

    /// The estimate times a factor known without uncertainty.
    #[must_use]
    pub fn scaled(&self, factor: f64) -> Self {
        let lines = self.budget.iter().map(|line| line.clone().times(factor));
        Self::combined(self.value * factor, lines.collect())
    }

    /// The estimate moved by a correction, with the lines that the correction brings.
    #[must_use]
    pub fn moved(&self, correction: f64, lines: impl IntoIterator<Item = Share>) -> Self {
        let all = self.budget.iter().cloned().chain(lines);
        Self::combined(self.value + correction, all.collect())
    }

    /// This estimate less another. Errors that both share cancel as far as they are
    /// correlated.
    #[must_use]
    pub fn minus(&self, other: &Estimate) -> Self {
        let other_lines = other.budget.iter().map(|line| line.clone().times(-1.0));
        self.moved(-other.value, other_lines)
    }
}

fn correlations(lines: &[Share]) -> Vec<Correlation> {
    let mut found = Vec::new();
    for (a, first) in lines.iter().enumerate() {
        let Some(shared) = &first.shared else {
            continue;
        };
        for (b, second) in lines.iter().enumerate().skip(a + 1) {
            if let Some(other) = second.shared.as_ref().filter(|o| o.error == shared.error) {
                let r = shared.correlation.min(other.correlation);
                if r > 0.0 {
                    found.push(Correlation { a, b, r });
                }
            }
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn gain(standard: f64, correlation: f64) -> Share {
        Share::normal("gain", standard, "W").shared_by("gain of the meter", correlation)
    }

    #[test]
    fn a_common_error_cancels_in_a_difference_as_far_as_it_is_common() {
        let high = Estimate::combined(10.0, vec![gain(0.2, 1.0)]);
        let low = Estimate::combined(6.0, vec![gain(0.15, 1.0)]);
        let less = high.minus(&low);
        assert!((less.value - 4.0).abs() < 1e-12);
        assert!((less.standard() - 0.05).abs() < 1e-12);
        let apart = Estimate::combined(10.0, vec![gain(0.2, 0.0)])
            .minus(&Estimate::combined(6.0, vec![gain(0.15, 0.0)]));
        assert!((apart.standard() - 0.25).abs() < 1e-12);
    }

    #[test]
    fn a_budget_is_sorted_and_keeps_what_each_line_is() {
        let estimate = Estimate::combined(
            3.0,
            vec![
                Share::resolution("digit", 0.01, "V").times(0.5),
                Share::from_data("scatter", 0.2, "W", 9.0),
                Share::rectangular("nothing", 0.0, "W"),
                Share::rectangular("accuracy", 0.1, "W"),
            ],
        );
        let names: Vec<&str> = estimate.budget.iter().map(|s| s.from.as_str()).collect();
        assert_eq!(names, ["scatter", "accuracy", "digit"]);
        assert!(estimate.budget[0].is_type_a() && !estimate.budget[1].is_type_a());
        let digit = &estimate.budget[2];
        assert!((digit.standard - 0.005 / RESOLUTION).abs() < 1e-12);
        assert_eq!((digit.unit.as_str(), digit.sensitivity), ("V", 0.5));
        // Welch-Satterthwaite: nearly all from ten readings.
        assert!(estimate.freedom.is_some_and(|nu| nu > 9.0 && nu < 13.0));
    }

    proptest! {
        #[test]
        fn scaling_the_unit_scales_the_uncertainty(
            value in -50.0..50.0f64, a in 1e-3..2.0f64, b in 1e-3..2.0f64, factor in 0.01..100.0f64,
        ) {
            let lines = vec![Share::from_data("a", a, "W", 5.0), Share::rectangular("b", b, "W")];
            let one = Estimate::combined(value, lines);
            let scaled = one.scaled(factor);
            prop_assert!((scaled.expanded / (factor * one.expanded) - 1.0).abs() < 1e-9);
        }

        #[test]
        fn a_further_line_never_shrinks_u(a in 1e-3..2.0f64, more in 0.0..2.0f64) {
            let one = Estimate::combined(1.0, vec![Share::rectangular("a", a, "W")]);
            let two = one.moved(0.0, [Share::rectangular("b", more, "W")]);
            prop_assert!(two.expanded >= one.expanded * (1.0 - 1e-12));
        }
    }
}
