//! Highest temperatures, after-heat included, and the worst case from them.

use crate::quantity::{Reading, shortest};
use crate::spec::sequence::{HeatingElement, MeasuredAt, RoleKind};

use super::budget::Share;
use super::cell::{CellView, highest, time};
use super::measured::Gauge;
use super::steady::Window;
use super::types::{Estimate, Figure, Peak, Steady};

/// The body must be seen falling for so long after OFF.
const FALLING_FOR_S: f64 = 120.0;
/// Or be so near ambient that nothing climbs any more.
const COOL_WITHIN_K: f64 = 3.5;

/// Highest temperature of the body from energising on, corrected for calibration.
pub(super) fn body_peak(view: &CellView) -> Figure<Peak> {
    match peak(view) {
        Ok(peak) => Figure::Known(peak),
        Err(reason) => Figure::Absent(reason),
    }
}

fn peak(view: &CellView) -> Result<Peak, String> {
    let body = view.body.ok_or("the bay has no role body")?;
    let energised = view.energised_s().ok_or("it was not energised")?;
    let track = view.track(view.body, Reading::Temperature, |row| {
        time(row) >= energised
    });
    let (at_s, indicated) = highest(&track).ok_or("no temperature of the body was read")?;
    let ambient = ambient_near(view, at_s)?;
    let off = view.switched.off.map(|off| off.as_secs_f64());
    Ok(Peak {
        temperature_degc: estimate_of(view, body, indicated, ambient.value)?,
        at_s,
        ambient_degc: ambient.value,
        after_heat: off.is_some_and(|off| at_s > off),
    })
}

/// A reading of the body with its budget, at a moment in seconds since the start.
pub(super) fn body_estimate(
    view: &CellView,
    indicated: f64,
    at_s: f64,
) -> Result<Estimate, String> {
    let body = view.body.ok_or("the bay has no role body")?;
    let ambient = ambient_near(view, at_s)?;
    estimate_of(view, body, indicated, ambient.value)
}

fn estimate_of(
    view: &CellView,
    role: usize,
    indicated: f64,
    ambient_degc: f64,
) -> Result<Estimate, String> {
    let gauge = Gauge::of(view.plan, role, Reading::Temperature).ok_or("it has no sensor")?;
    let surroundings = gauge.surroundings(indicated, 0.0, Some(ambient_degc))?;
    let read = gauge.estimate(indicated)?.moved(0.0, surroundings);
    Ok(in_contact(view, role, read, ambient_degc))
}

fn ambient_near(view: &CellView, at_s: f64) -> Result<Estimate, String> {
    let indicated = view
        .ambient_at(at_s)
        .ok_or("ambient was not read near the highest temperature")?;
    ambient_estimate(view, indicated)
}

/// The bay's ambient with its budget.
fn ambient_estimate(view: &CellView, indicated: f64) -> Result<Estimate, String> {
    view.ambient
        .and_then(|role| Gauge::of(view.plan, role, Reading::Temperature))
        .ok_or("the bay has no role ambient")?
        .estimate(indicated)
}

/// A sensor on a surface reads too low by up to a share of the rise over ambient: the
/// error lies on one side, so that half of it is added and each value between nothing
/// and the whole is alike likely (JCGM 100, 4.3.7 and F.2.4.5 in their sense).
fn in_contact(view: &CellView, role: usize, read: Estimate, ambient_degc: f64) -> Estimate {
    let planned = view.plan.bay.roles.get(role);
    let Some(share) = planned.and_then(|role| role.connection.contact_error) else {
        return read;
    };
    let most = share.get() * (read.value - ambient_degc).max(0.0);
    let line = Share::rectangular(
        format!("contact of the sensor, reads up to {share} of the rise too low, one-sided"),
        0.5 * most,
        "K",
    );
    read.moved(0.5 * most, [line])
}

/// The worst case that is judged against the link: the peak with the rise still to
/// come, moved to the highest ambient (never down: a test in a hotter room is not
/// credited) and for plain resistors to the highest supply voltage, with what the link
/// may be hotter by than the place that is measured.
///
/// Absent where the soak had not settled (the rise still to come is unknown), where
/// the body was not followed until it had fallen for two minutes after OFF, and where
/// an allowance off the link's body is missing.
pub(super) fn body_worst(
    view: &CellView,
    peak: &Figure<Peak>,
    settled: &Figure<Window>,
    steady: Option<&Steady>,
) -> Figure<Estimate> {
    match worst(view, peak, settled, steady) {
        Ok(worst) => Figure::Known(worst),
        Err(reason) => Figure::Absent(reason),
    }
}

fn worst(
    view: &CellView,
    peak: &Figure<Peak>,
    settled: &Figure<Window>,
    steady: Option<&Steady>,
) -> Result<Estimate, String> {
    let peak = match peak {
        Figure::Known(peak) => peak,
        Figure::Absent(reason) => return Err(reason.clone()),
    };
    let window = match settled {
        Figure::Known(window) => window,
        Figure::Absent(reason) => {
            return Err(format!("the rise still to come is unknown: {reason}"));
        }
    };
    followed(view, peak)?;
    let (to_come, standard) = match window.extrapolated {
        Some(early) => (early.rise_still_to_come_k, early.rise_standard),
        None => window.rise_to_come_k.unwrap_or((0.0, 0.0)),
    };
    let seen = peak.temperature_degc.moved(
        to_come.max(0.0) * left_at_off(view, window),
        [Share::normal(
            "rise still to come, predicted",
            standard,
            "K",
        )],
    );
    let at_room = at_highest_ambient(view, seen, peak.ambient_degc)?;
    let at_supply = at_highest_supply(view, at_room, peak, steady)?;
    at_the_link(view, at_supply, steady)
}

/// Which share of the rise that was still to come at the end of the criterion's window
/// is still to come at OFF: what was climbed meanwhile lies in the peak.
fn left_at_off(view: &CellView, window: &Window) -> f64 {
    let since = view.energised_until_s().map(|off| off - window.to_s);
    match (since, window.rise_tau_s) {
        (Some(since), Some(tau)) if since > 0.0 && tau > 0.0 => libm::exp(-since / tau),
        _ => 1.0,
    }
}

/// Moves a temperature to the highest ambient: 1 K per K, unless the sequence states
/// what was measured.
fn at_highest_ambient(
    view: &CellView,
    seen: Estimate,
    ambient_degc: f64,
) -> Result<Estimate, String> {
    let appliance = &view.plan.appliance;
    let to_go = appliance.highest_ambient.get() - ambient_degc;
    if to_go <= 0.0 {
        return Ok(seen);
    }
    let effect = appliance
        .link
        .as_ref()
        .and_then(|link| link.ambient_effect.as_ref());
    let per_kelvin = effect.map_or(1.0, |effect| effect.value.get());
    let ambient = ambient_estimate(view, ambient_degc)?;
    let mut lines: Vec<Share> = ambient
        .budget
        .into_iter()
        .map(|line| line.times(-per_kelvin))
        .collect();
    if let Some(effect) = effect {
        let from = format!("effect of the room on the link ({})", effect.source);
        let standard = 0.5 * effect.expanded.get();
        lines.push(Share::normal(from, standard, "K/K").times(to_go));
    }
    Ok(seen.moved(per_kelvin * to_go, lines))
}

/// Moves a temperature to the highest voltage of the supply range, for plain resistors
/// without a fan only: their rise goes with their power. The middle of the exponent's
/// interval is taken, its width and the voltage's own uncertainty enter U.
fn at_highest_supply(
    view: &CellView,
    at_room: Estimate,
    peak: &Peak,
    steady: Option<&Steady>,
) -> Result<Estimate, String> {
    let appliance = &view.plan.appliance;
    if appliance.element != HeatingElement::Resistor || appliance.fan {
        return Ok(at_room);
    }
    let highest = appliance.supply_ends(&view.cell.position).1.get();
    let volts = steady.map_or(view.cell.supply.voltage.get(), |s| s.plug_v.value);
    let ratio = libm::log(highest / volts);
    if !ratio.is_finite() {
        return Err("the voltage at the plug is not known".to_owned());
    }
    let rise = peak.temperature_degc.value - peak.ambient_degc;
    let more = |exponent: f64| rise * (libm::exp(exponent * ratio) - 1.0);
    let exponents = appliance.element.voltage_exponent(appliance.fan);
    let (low, high) = (more(exponents.0), more(exponents.1));
    let mut lines = vec![Share::rectangular(
        format!(
            "rise referred from {volts:.2} V to {} V, exponent {} to {}",
            shortest(highest),
            exponents.0,
            exponents.1
        ),
        0.5 * (high - low).abs(),
        "K",
    )];
    if let Some(steady) = steady {
        let per_volt = -exponents.1 * rise / volts;
        let of_voltage = steady.plug_v.budget.iter().cloned();
        lines.extend(of_voltage.map(|line| line.times(per_volt)));
    }
    Ok(at_room.moved(0.5 * (low + high), lines))
}

/// From the place that is measured to the link: nothing on its own body; elsewhere
/// the allowance and the link's heating by its own current, I2 Rth.
fn at_the_link(
    view: &CellView,
    place: Estimate,
    steady: Option<&Steady>,
) -> Result<Estimate, String> {
    let Some(link) = &view.plan.appliance.link else {
        return Ok(place);
    };
    let MeasuredAt::Elsewhere {
        place: name,
        allowance,
        self_heating,
        ..
    } = &link.measured_at
    else {
        return Ok(place);
    };
    let allowance = allowance.ok_or_else(|| {
        format!("measured at {name}, off the link's body, and no allowance for it is stated")
    })?;
    let heating = self_heating.ok_or_else(|| {
        format!("measured at {name}, off the link's body, and its self-heating is not stated")
    })?;
    let amps = steady
        .and_then(|steady| steady.current_a)
        .ok_or("the link's self-heating needs the settled current, and none was read")?;
    let times = amps / heating.at.get();
    Ok(place.moved(allowance.get() + heating.rise.get() * times * times, []))
}

/// Whether the body was seen to fall for two minutes after OFF and after its peak.
fn followed(view: &CellView, peak: &Peak) -> Result<(), String> {
    let never = || "the body was not followed until it had fallen for 2 min after OFF".to_owned();
    let off = view.switched.off.ok_or_else(never)?.as_secs_f64();
    let after = view.track(view.body, Reading::Temperature, |row| time(row) > off);
    let (last_s, last) = *after.last().ok_or_else(never)?;
    let cool = view
        .ambient_at(last_s)
        .is_some_and(|ambient| last - ambient <= COOL_WITHIN_K);
    if cool || last_s - off.max(peak.at_s) >= FALLING_FOR_S {
        return Ok(());
    }
    Err(never())
}

/// Highest rise over ambient of every temperature role beside body and ambient.
pub(super) fn rises(view: &CellView) -> Vec<(String, Figure<Estimate>)> {
    let others = |(role, _): &(usize, _)| Some(*role) != view.body && Some(*role) != view.ambient;
    view.plan
        .bay
        .roles
        .iter()
        .enumerate()
        .filter(|(_, role)| role.kind == RoleKind::Temperature)
        .filter(others)
        .map(|(index, role)| {
            let rise = match rise(view, index) {
                Ok(rise) => Figure::Known(rise),
                Err(reason) => Figure::Absent(reason),
            };
            (role.name.clone(), rise)
        })
        .collect()
}

fn rise(view: &CellView, role: usize) -> Result<Estimate, String> {
    let energised = view.energised_s().ok_or("it was not energised")?;
    let track = view.track(Some(role), Reading::Temperature, |row| {
        time(row) >= energised
    });
    let (at_s, indicated) = highest(&track).ok_or("no temperature was read")?;
    let ambient = ambient_near(view, at_s)?;
    Ok(estimate_of(view, role, indicated, ambient.value)?.minus(&ambient))
}
