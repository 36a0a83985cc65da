//! The settled input at the unit's plug, with its budget, before it is referred to
//! another voltage or ambient.

use crate::quantity::Reading;
use crate::stats::{Effective, effective_of};

use super::budget::Share;
use super::cell::{CellView, mean};
use super::measured::Gauge;
use super::types::Estimate;

/// The resistance of leads is known to this share of itself (house default).
const LEADS_WITHIN: f64 = 0.2;

/// Power and voltage at the plug.
pub(super) struct AtPlug {
    pub(super) power_w: Estimate,
    pub(super) volts: Estimate,
    /// Effective number of independent rows.
    pub(super) effective: f64,
}

/// The mean of power rows, with the mean voltage and current of the same rows and the
/// mean of the room.
///
/// # Errors
/// Where there is no meter, too few rows, or an accuracy is not stated.
pub(super) fn at_plug(
    view: &CellView,
    power: &[(f64, f64)],
    voltage_v: f64,
    current_a: Option<f64>,
    room_degc: Option<f64>,
) -> Result<AtPlug, String> {
    let gauge = |reading| {
        view.meter
            .and_then(|role| Gauge::of(view.plan, role, reading))
            .ok_or("there is no power meter")
    };
    let values: Vec<f64> = power.iter().map(|(_, value)| *value).collect();
    let worth = effective_of(&values).ok_or("too few power readings")?;
    let indicated = mean(power).unwrap_or(0.0);
    let drift = 0.5 * worth.trend.abs() * (worth.n as f64 - 1.0);
    let apparent = voltage_v * current_a.unwrap_or(0.0);
    let reactive = libm::sqrt((apparent * apparent - indicated * indicated).max(0.0));
    let (meter, voltmeter) = (gauge(Reading::Power)?, gauge(Reading::Voltage)?);
    let power_w = meter
        .estimate(indicated)?
        .moved(0.0, meter.surroundings(indicated, reactive, room_degc)?)
        .moved(
            0.0,
            [
                scatter(&worth),
                Share::rectangular("drift over the window", drift, "W"),
            ],
        );
    let volts = voltmeter
        .estimate(voltage_v)?
        .moved(0.0, voltmeter.surroundings(voltage_v, 0.0, room_degc)?);
    let (power_w, volts) = without_leads(view, power_w, volts, current_a)?;
    Ok(AtPlug {
        power_w,
        volts,
        effective: worth.effective,
    })
}

/// Takes off what the leads between the meter and the plug drop and draw: I R, and
/// I2 R, for a current in phase with the voltage.
fn without_leads(
    view: &CellView,
    power_w: Estimate,
    volts: Estimate,
    current_a: Option<f64>,
) -> Result<(Estimate, Estimate), String> {
    let leads = view
        .meter
        .and_then(|role| view.plan.bay.roles.get(role)?.connection.lead_resistance);
    let Some(leads) = leads else {
        return Ok((power_w, volts));
    };
    let amps = current_a.ok_or("the leads' drop needs the current, and none was read")?;
    let less = |value: Estimate, drop: f64, unit: &str| {
        let line = Share::rectangular(
            format!("leads of {leads} from the meter to the plug"),
            LEADS_WITHIN * drop,
            unit,
        );
        value.moved(-drop, [line])
    };
    let drop_v = amps * leads.get();
    Ok((less(power_w, amps * drop_v, "W"), less(volts, drop_v, "V")))
}

/// Type A: the scatter about the trend over what the rows are worth. Too few
/// independent rows average nothing out.
fn scatter(worth: &Effective) -> Share {
    match worth.of_mean() {
        Some(mean) => Share::from_data("scatter of the mean", mean.standard, "W", mean.freedom),
        None => Share::from_data(
            "scatter (too few independent rows for a mean)",
            worth.scatter,
            "W",
            1.0,
        ),
    }
}
