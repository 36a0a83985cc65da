//! From indicated values to estimates: correction, accuracy, calibration,
//! resolution, and their combination.

use crate::plan::{Plan, PlannedInstrument};
use crate::quantity::Reading;
use crate::spec::bench::CalibrationPoint;
use crate::stats::{Part, RECTANGULAR, RESOLUTION, combine};

use super::types::{Estimate, Share};

/// One named line of a budget, before it is combined.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Line {
    pub(super) from: String,
    pub(super) part: Part,
}

impl Line {
    /// A line that is no estimate from data.
    pub(super) fn stated(from: impl Into<String>, standard: f64) -> Self {
        Line::of(from, standard, f64::INFINITY)
    }

    /// A line with its degrees of freedom.
    pub(super) fn of(from: impl Into<String>, standard: f64, freedom: f64) -> Self {
        Line {
            from: from.into(),
            part: Part { standard, freedom },
        }
    }

    /// The same line times a sensitivity.
    pub(super) fn times(mut self, sensitivity: f64) -> Self {
        self.part.standard *= sensitivity.abs();
        self
    }
}

/// Combines a budget into an estimate; shares of nothing are left out.
pub(super) fn estimate(value: f64, lines: Vec<Line>) -> Estimate {
    let parts: Vec<Part> = lines.iter().map(|line| line.part).collect();
    let combined = combine(&parts);
    let mut budget: Vec<Share> = lines
        .into_iter()
        .filter(|line| line.part.standard > 0.0)
        .map(|line| Share {
            from: line.from,
            standard: line.part.standard,
        })
        .collect();
    budget.sort_by(|a, b| b.standard.total_cmp(&a.standard));
    Estimate {
        value,
        expanded: combined.expanded,
        coverage: combined.coverage,
        budget,
    }
}

/// One reading of the instrument that fills a role.
pub(super) struct Gauge<'a> {
    instrument: &'a PlannedInstrument,
    channel: Option<u32>,
    reading: Reading,
    role: &'a str,
}

impl<'a> Gauge<'a> {
    /// The gauge behind role `role`.
    pub(super) fn of(plan: &'a Plan, role: usize, reading: Reading) -> Option<Self> {
        let planned = plan.bay.roles.get(role)?;
        Some(Gauge {
            instrument: plan.instruments.get(planned.instrument)?,
            channel: planned.channel,
            reading,
            role: &planned.name,
        })
    }

    /// Floor of its accuracy; 0 where none is stated.
    pub(super) fn floor(&self) -> f64 {
        self.accuracy().map_or(0.0, |a| a.floor)
    }

    /// Resolution of its reading; 0 where none is stated.
    pub(super) fn resolution(&self) -> f64 {
        self.accuracy().map_or(0.0, |a| a.resolution)
    }

    /// How often a new value is there, seconds.
    pub(super) fn update_s(&self) -> f64 {
        self.instrument.driver.update_interval.get()
    }

    fn accuracy(&self) -> Option<&'a crate::spec::driver::Accuracy> {
        self.instrument.driver.accuracy_of(self.reading)
    }

    /// The indicated value with its calibration's correction.
    pub(super) fn corrected(&self, indicated: f64) -> f64 {
        indicated + self.calibration(indicated).0
    }

    /// Shares of accuracy on the range in force, resolution and calibration.
    ///
    /// # Errors
    /// Where the driver states no accuracy: then nothing can be said of U.
    pub(super) fn lines(&self, indicated: f64) -> Result<Vec<Line>, String> {
        let word = self.reading.word();
        let Some(accuracy) = self.accuracy() else {
            return Err(format!(
                "driver {} states no accuracy of {word}",
                self.instrument.driver.name
            ));
        };
        let of = |what: &str| format!("{what}, {word} of {}", self.role);
        let mut lines = vec![
            Line::stated(of("accuracy"), accuracy.half_width(indicated) / RECTANGULAR),
            Line::stated(of("resolution"), accuracy.resolution / RESOLUTION),
        ];
        let calibration = self.calibration(indicated).1;
        if calibration > 0.0 {
            lines.push(Line::stated(of("calibration"), calibration));
        }
        Ok(lines)
    }

    /// Correction and standard uncertainty at an indicated value: interpolated
    /// between calibration points, those of the ends beyond them.
    fn calibration(&self, indicated: f64) -> (f64, f64) {
        let mut points: Vec<&CalibrationPoint> = self
            .instrument
            .calibration
            .iter()
            .filter(|p| p.reading == self.reading)
            .filter(|p| p.channel.is_none() || p.channel == self.channel)
            .collect();
        points.sort_by(|a, b| a.at.total_cmp(&b.at));
        let of = |p: &CalibrationPoint| (p.correction, p.expanded / p.coverage.max(1.0));
        let above = points.partition_point(|p| p.at <= indicated);
        match (above.checked_sub(1).map(|i| points[i]), points.get(above)) {
            (None, None) => (0.0, 0.0),
            (Some(only), None) => of(only),
            (None, Some(only)) => of(only),
            (Some(low), Some(high)) => {
                let share = (indicated - low.at) / (high.at - low.at);
                let between = |a: f64, b: f64| a + share * (b - a);
                let ((c0, u0), (c1, u1)) = (of(low), of(high));
                (between(c0, c1), between(u0, u1))
            }
        }
    }
}
