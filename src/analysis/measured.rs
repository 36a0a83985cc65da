//! From indicated values to estimates: correction, accuracy, calibration,
//! resolution, and their combination.

use crate::plan::{Plan, PlannedInstrument};
use crate::quantity::{Celsius, Reading};
use crate::sensor::{self, Sensor};
use crate::spec::bench::CalibrationPoint;

use super::budget::Share;
use super::types::Estimate;

/// One reading of the instrument that fills a role.
pub(super) struct Gauge<'a> {
    instrument: &'a PlannedInstrument,
    channel: Option<u32>,
    reading: Reading,
    role: &'a str,
    sensor: Option<Sensor>,
}

/// Terminals are taken to be at this temperature where a budget asks how an error of
/// theirs shows: the sensitivity hardly depends on it.
const TERMINALS_DEGC: f64 = 25.0;

impl<'a> Gauge<'a> {
    /// The gauge behind role `role`.
    pub(super) fn of(plan: &'a Plan, role: usize, reading: Reading) -> Option<Self> {
        let planned = plan.bay.roles.get(role)?;
        Some(Gauge {
            instrument: plan.instruments.get(planned.instrument)?,
            channel: planned.channel,
            reading,
            role: &planned.name,
            sensor: planned.sensor,
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

    /// The indicated value with its calibration's correction; of a raw sensor with those
    /// of the raw readings too.
    pub(super) fn corrected(&self, indicated: f64) -> f64 {
        let raw: f64 = self
            .raw(indicated)
            .iter()
            .map(|(gauge, value, sensitivity)| sensitivity * gauge.calibration(*value).0)
            .sum();
        indicated + raw + self.calibration(indicated).0
    }

    /// The raw readings behind a temperature, each with its value and the kelvins per
    /// unit of it; empty where the instrument itself converts.
    fn raw(&self, indicated: f64) -> Vec<(Gauge<'a>, f64, f64)> {
        let gives = |reading: &Reading| {
            let mut queries = self.instrument.driver.readings.iter();
            queries.any(|query| query.gives.contains(reading))
        };
        // A driver that states the accuracy of the whole chain, sensor input and
        // conversion, means that.
        let whole_chain = self.accuracy().is_some();
        let (Reading::Temperature, Some(sensor), false) = (self.reading, self.sensor, whole_chain)
        else {
            return Vec::new();
        };
        let (Some(at), Some(terminals)) = (Celsius::new(indicated), Celsius::new(TERMINALS_DEGC))
        else {
            return Vec::new();
        };
        let Some(values) = sensor::raw_of(sensor, at, terminals) else {
            return Vec::new();
        };
        sensor::RAW
            .into_iter()
            .filter(gives)
            .filter_map(|reading| {
                let gauge = Gauge { reading, ..*self };
                let sensitivity = sensor::sensitivity(sensor, reading, at, terminals)?;
                Some((gauge, values.get(reading)?, sensitivity))
            })
            .collect()
    }

    /// The indicated value corrected by its calibration, with its budget.
    ///
    /// # Errors
    /// See [`Gauge::lines`].
    pub(super) fn estimate(&self, indicated: f64) -> Result<Estimate, String> {
        let lines = self.lines(indicated)?;
        Ok(Estimate::combined(self.corrected(indicated), lines))
    }

    /// Shares of accuracy on the range in force, resolution, calibration and, of a
    /// temperature, of the sensor's own class.
    ///
    /// # Errors
    /// Where the driver states no accuracy, or the class is not stated that far: then
    /// nothing can be said of U.
    pub(super) fn lines(&self, indicated: f64) -> Result<Vec<Share>, String> {
        let mut lines: Vec<Share> = self.class(indicated)?.into_iter().collect();
        let raw = self.raw(indicated);
        if raw.is_empty() {
            lines.extend(self.own_lines(indicated)?);
        }
        for (gauge, value, sensitivity) in raw {
            let of_raw = gauge.own_lines(value)?;
            lines.extend(of_raw.into_iter().map(|line| line.times(sensitivity)));
        }
        Ok(lines)
    }

    /// The tolerance of the sensor's class; nothing where a certificate covers the
    /// channel with its sensor, and for what is no temperature.
    fn class(&self, indicated: f64) -> Result<Option<Share>, String> {
        let Some(sensor) = self.sensor.filter(|_| self.reading == Reading::Temperature) else {
            return Ok(None);
        };
        let covered = |p: &CalibrationPoint| {
            p.reading == Reading::Temperature && p.channel == self.channel && p.channel.is_some()
        };
        if self.instrument.calibration.iter().any(covered) {
            return Ok(None);
        }
        let tolerance = Celsius::new(indicated).and_then(|at| sensor::tolerance(sensor, at));
        let tolerance = tolerance.ok_or_else(|| {
            format!(
                "{} states no tolerance of its class at {indicated:.0} °C ({})",
                sensor.words(),
                sensor.standard()
            )
        })?;
        let from = format!(
            "sensor of {}, {} ({})",
            self.role,
            sensor.words(),
            sensor.standard()
        );
        Ok(Some(Share::rectangular(from, tolerance.get(), "K")))
    }

    /// What the surroundings add to the accuracy of a reading: reactive power (at a power
    /// factor below 1) to a power, and a room away from the one that it is stated for.
    pub(super) fn surroundings(
        &self,
        indicated: f64,
        reactive_va: f64,
        room_degc: Option<f64>,
    ) -> Result<Vec<Share>, String> {
        let of_reactive = self.accuracy().map_or(0.0, |a| a.of_reactive);
        let of = |what: &str| format!("{what}, {} of {}", self.reading.word(), self.role);
        let mut lines = vec![Share::rectangular(
            of("power factor below 1"),
            of_reactive * reactive_va,
            self.unit(),
        )];
        if let Some(effect) = self.instrument.driver.temperature_effect {
            let room = room_degc.and_then(Celsius::new).ok_or_else(|| {
                format!(
                    "driver {} states a temperature effect, and the room was not read",
                    self.instrument.driver.name
                )
            })?;
            let added = effect.share_at(room) * indicated.abs();
            lines.push(Share::rectangular(
                of("temperature effect"),
                added,
                self.unit(),
            ));
        }
        Ok(lines)
    }

    fn own_lines(&self, indicated: f64) -> Result<Vec<Share>, String> {
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
        // One block of terminals serves every channel: its error is one and the same.
        let correlation = match self.reading {
            Reading::TerminalTemperature => 1.0,
            _ => accuracy.correlation,
        };
        Ok(vec![
            Share::rectangular(of("accuracy"), accuracy.half_width(indicated), unit)
                .shared_by(error, correlation),
            Share::resolution(of("resolution"), accuracy.resolution, unit),
            Share::normal(of("calibration"), self.calibration(indicated).1, unit),
        ])
    }

    /// Unit of its errors: those of a temperature are in kelvins.
    fn unit(&self) -> &'static str {
        match self.reading {
            Reading::Temperature | Reading::TerminalTemperature => "K",
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
