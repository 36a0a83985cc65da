//! Which sensor hangs on a role's channel, and whether the driver's readings suit it.

use super::notes::Notes;
use super::types::{Plan, PlannedRole};
use crate::sensor::Sensor;
use crate::spec::bench::RoleFilled;
use crate::spec::driver::{Driver, Thermal};
use crate::spec::sequence::{RoleKind, RoleNeed};

/// Reports a sensor that is missing where raw values need one, that the driver's
/// readings can't be from, or that a role has no use for.
pub(super) fn sensor_fits(
    need: &RoleNeed,
    filled: &RoleFilled,
    driver: &Driver,
    notes: &mut Notes,
) {
    let role = &filled.role.value;
    let Some(sensor) = &filled.sensor else {
        if need.kind == RoleKind::Temperature {
            is_needed(filled, driver, notes);
        }
        return;
    };
    if need.kind != RoleKind::Temperature {
        return notes.error(
            &sensor.place,
            format!("role `{role}` is a {}: it has no sensor", need.kind.word()),
            "take `sensor` out",
        );
    }
    let Some(thermal) = driver.thermal().filter(|t| !t.suits(sensor.value)) else {
        return;
    };
    notes.error(
        &sensor.place,
        format!(
            "role `{role}` has a {}, but driver `{}` reads {}",
            kind_of(sensor.value),
            driver.name,
            thermal.readings()[0].word()
        ),
        format!(
            "write the sensor that hangs on the channel, {}, or use another instrument",
            example(thermal)
        ),
    );
}

fn is_needed(filled: &RoleFilled, driver: &Driver, notes: &mut Notes) {
    let Some(thermal) = driver.thermal().filter(|t| *t != Thermal::Converted) else {
        return;
    };
    notes.error(
        &filled.instrument.place,
        format!(
            "driver `{}` gives {}, and role `{}` names no sensor to convert it by",
            driver.name,
            thermal.readings()[0].word(),
            filled.role.value
        ),
        format!("add {} beside the instrument", example(thermal)),
    );
}

fn kind_of(sensor: Sensor) -> &'static str {
    match sensor {
        Sensor::Thermocouple { .. } => "thermocouple",
        Sensor::Pt100 { .. } => "Pt100",
    }
}

fn example(thermal: Thermal) -> &'static str {
    match thermal {
        Thermal::Converted | Thermal::Thermocouple => "`sensor: {type: K, class: 1}`",
        Thermal::Resistance => "`sensor: {type: Pt100, class: A}`",
    }
}

impl Plan {
    /// The sensor by which a role's raw readings become temperatures; nothing where
    /// the instrument itself converts.
    pub fn raw_sensor(&self, role: &PlannedRole) -> Option<Sensor> {
        let thermal = self.instrument_of(role).driver.thermal()?;
        role.sensor.filter(|_| thermal != Thermal::Converted)
    }
}
