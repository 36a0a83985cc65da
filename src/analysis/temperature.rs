//! Highest temperatures, after-heat included, and the worst case from them.

use crate::quantity::Reading;
use crate::spec::sequence::{MeasuredAt, RoleKind};

use super::cell::{CellView, highest, time};
use super::measured::{Gauge, Line, estimate};
use super::steady::Window;
use super::types::{Estimate, Figure, Peak};

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
    let gauge = Gauge::of(view.plan, body, Reading::Temperature).ok_or("no sensor on the body")?;
    let ambient = view
        .ambient_at(at_s)
        .ok_or("ambient was not read near the highest temperature")?;
    let off = view.switched.off.map(|off| off.as_secs_f64());
    Ok(Peak {
        temperature_degc: estimate(gauge.corrected(indicated), gauge.lines(indicated)?),
        at_s,
        ambient_degc: ambient_corrected(view, ambient),
        after_heat: off.is_some_and(|off| at_s > off),
    })
}

fn ambient_gauge<'a>(view: &CellView<'a>) -> Option<Gauge<'a>> {
    Gauge::of(view.plan, view.ambient?, Reading::Temperature)
}

fn ambient_corrected(view: &CellView, indicated: f64) -> f64 {
    ambient_gauge(view).map_or(indicated, |gauge| gauge.corrected(indicated))
}

/// The worst case that is judged against the link: the peak moved to the highest
/// ambient by 1 K/K (never down: a test in a hotter room is not credited), the placement
/// allowance, and the rise that an early finish left to come.
///
/// Absent where the soak had not settled (the rise still to come is unknown), where
/// the body was not followed until it had fallen for two minutes after OFF, and where
/// an allowance off the link's body is missing.
pub(super) fn body_worst(
    view: &CellView,
    peak: &Figure<Peak>,
    settled: &Figure<Window>,
) -> Figure<Estimate> {
    match worst(view, peak, settled) {
        Ok(worst) => Figure::Known(worst),
        Err(reason) => Figure::Absent(reason),
    }
}

fn worst(
    view: &CellView,
    peak: &Figure<Peak>,
    settled: &Figure<Window>,
) -> Result<Estimate, String> {
    let peak = match peak {
        Figure::Known(peak) => peak,
        Figure::Absent(reason) => return Err(reason.clone()),
    };
    if let Some(reason) = settled.reason() {
        return Err(format!("the rise still to come is unknown: {reason}"));
    }
    followed(view, peak)?;
    let allowance = allowance(view)?;
    let hottest = view.plan.appliance.highest_ambient.get();
    let moved = (hottest - peak.ambient_degc).max(0.0);
    let body = view
        .body
        .and_then(|role| Gauge::of(view.plan, role, Reading::Temperature));
    let mut lines = body
        .ok_or("no sensor on the body")?
        .lines(peak.temperature_degc.value)?;
    if moved > 0.0 {
        let ambient = ambient_gauge(view).ok_or("the bay has no role ambient")?;
        lines.extend(ambient.lines(peak.ambient_degc)?);
    }
    let early = settled.known().and_then(|window| window.extrapolated);
    let to_come = early.map_or(0.0, |early| early.rise_still_to_come_k.max(0.0));
    lines.extend(early.map(|early| Line::stated("extrapolation", early.rise_standard)));
    let value = peak.temperature_degc.value + moved + allowance + to_come;
    Ok(estimate(value, lines))
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

/// How much hotter than the measured place the link may be; nothing to allow on its
/// own body, or where there is no link.
fn allowance(view: &CellView) -> Result<f64, String> {
    let Some(link) = &view.plan.appliance.link else {
        return Ok(0.0);
    };
    match &link.measured_at {
        MeasuredAt::LinkBody => Ok(0.0),
        MeasuredAt::Elsewhere {
            allowance: Some(kelvins),
            ..
        } => Ok(kelvins.get()),
        MeasuredAt::Elsewhere { place, .. } => Err(format!(
            "measured at {place}, off the link's body, and no allowance for it is stated"
        )),
    }
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
    let gauge = Gauge::of(view.plan, role, Reading::Temperature).ok_or("no sensor")?;
    let ambient = view
        .ambient_at(at_s)
        .ok_or("ambient was not read near the highest temperature")?;
    let mut lines = gauge.lines(indicated)?;
    if let Some(gauge) = ambient_gauge(view) {
        lines.extend(gauge.lines(ambient)?);
    }
    Ok(estimate(
        gauge.corrected(indicated) - ambient_corrected(view, ambient),
        lines,
    ))
}
