//! From indicated values to estimates: correction, accuracy, calibration,
//! resolution, and their combination.

use crate::plan::{Plan, PlannedInstrument};
use crate::quantity::Reading;
use crate::spec::bench::CalibrationPoint;

use super::budget::Share;
use super::types::Estimate;

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

    /// The indicated value corrected by its calibration, with its budget.
    ///
    /// # Errors
    /// See [`Gauge::lines`].
    pub(super) fn estimate(&self, indicated: f64) -> Result<Estimate, String> {
        let lines = self.lines(indicated)?;
        Ok(Estimate::combined(self.corrected(indicated), lines))
    }

    /// Shares of accuracy on the range in force, resolution and calibration.
    ///
    /// # Errors
    /// Where the driver states no accuracy: then nothing can be said of U.
    pub(super) fn lines(&self, indicated: f64) -> Result<Vec<Share>, String> {
        let word = self.reading.word();
        let Some(accuracy) = self.accuracy() else {
            return Err(format!(
                "driver {} states no accuracy of {word}",
                self.instrument.driver.name
            ));
        };
        let of = |what: &str| format!("{what}, {word} of {}", self.role);
        let error = format!("accuracy, {word} of instrument {}", self.instrument.name);
        let unit = self.unit();
        Ok(vec![
            Share::rectangular(of("accuracy"), accuracy.half_width(indicated), unit)
                .shared_by(error, accuracy.correlation),
            Share::resolution(of("resolution"), accuracy.resolution, unit),
            Share::normal(of("calibration"), self.calibration(indicated).1, unit),
        ])
    }

    /// Unit of its errors: those of a temperature are in kelvins.
    fn unit(&self) -> &'static str {
        match self.reading {
            Reading::Temperature => "K",
            other => other.unit(),
        }
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
