//! Switch-on, from samples.

use super::types::{Figure, Inrush};
use super::uncertain::Budget;
use super::view::{View, value_at};
use crate::quantity::{Moment, Reading};
use crate::record::Status;

/// Current above this share of the peak is the first current.
const FIRST_CURRENT: f64 = 0.01;

/// A neighbour of the peak that is lower by more than this share leaves the peak
/// unresolved (house default).
const RESOLVED: f64 = 0.05;

/// A supply that sags by more than this limits the inrush.
const SAG: f64 = 0.03;

/// What happened at switch-on.
pub(super) fn inrush(view: &View, steady_w: Option<f64>) -> Figure<Inrush> {
    let Some(on) = view.on else { return absent("not energised") };
    let Some(meter) = view.meter() else { return absent("no power meter") };
    let steps = view.steps("inrush");
    let Some(last_step) = steps.last() else { return absent("no step captures the inrush") };
    let inside = |step: u32| step <= *last_step;
    let currents: Vec<(Moment, f64)> = view
        .readings(meter, Reading::Current)
        .filter(|(s, _)| s.reply >= on && inside(s.step))
        .map(|(s, value)| (s.reply, value))
        .collect();
    let Some(peak) = highest(&currents) else { return absent("no reading of the current") };
    let (peak_at, peak_a) = currents[peak];
    let first = currents.iter().position(|(_, a)| *a > FIRST_CURRENT * peak_a).unwrap_or(0);
    if peak_a <= 0.0 {
        return absent("no current flowed");
    }
    let t0 = currents[first].0;
    let powers: Vec<(Moment, f64)> = view
        .readings(meter, Reading::Power)
        .filter(|(s, _)| s.reply >= on && inside(s.step))
        .map(|(s, value)| (s.reply, value))
        .collect();
    let peak_w = highest(&powers).map_or(0.0, |n| powers[n].1);
    let role = &view.plan.bay.roles[meter];
    Figure::Known(Inrush {
        t0_s: t0.as_secs_f64(),
        peak_a: Budget::reading(view.plan, role, Reading::Current, peak_a).estimate(),
        peak_w,
        peak_after_s: peak_at.since(t0).get(),
        ratio: steady_w.filter(|s| *s > 0.0).map(|s| peak_w / s),
        half_way_s: steady_w.and_then(|s| half_way(&powers, peak_w, s)),
        above_steady_wh: steady_w.map(|s| above(&powers, s)),
        lower_bound: lower_bound(view, meter, &currents, first, peak, *last_step),
        supply_limited: supply_limited(view, meter, peak_at, *last_step),
    })
}

fn absent(reason: &str) -> Figure<Inrush> {
    Figure::Absent(reason.to_owned())
}

fn highest(series: &[(Moment, f64)]) -> Option<usize> {
    (0..series.len()).max_by(|a, b| series[*a].1.total_cmp(&series[*b].1).then(b.cmp(a)))
}

fn half_way(powers: &[(Moment, f64)], peak_w: f64, steady: f64) -> Option<f64> {
    let peak = highest(powers)?;
    let half = (peak_w + steady) / 2.0;
    let later = powers[peak..].iter().find(|(_, w)| *w <= half)?;
    Some(later.0.since(powers[peak].0).get())
}

/// Energy above the settled power, Wh, by trapezoids.
fn above(powers: &[(Moment, f64)], steady: f64) -> f64 {
    let excess = |w: f64| (w - steady).max(0.0);
    let joules: f64 =
        powers.windows(2).map(|p| p[1].0.since(p[0].0).get() * (excess(p[0].1) + excess(p[1].1)) / 2.0).sum();
    joules / 3600.0
}

/// Why a higher, shorter peak may have gone unseen.
fn lower_bound(
    view: &View,
    meter: usize,
    currents: &[(Moment, f64)],
    first: usize,
    peak: usize,
    last_step: u32,
) -> Vec<String> {
    let mut reasons = Vec::new();
    let on = view.on.unwrap_or(Moment::START);
    let lost = view.samples.iter().filter(|s| s.role == meter && s.reply >= on && s.step <= last_step);
    let lost = lost.filter(|s| s.status != Status::Ok).count();
    if lost > 0 {
        reasons.push(format!("{lost} samples carry no value (overload or no reply)"));
    }
    let peak_a = currents[peak].1;
    let lower = |neighbour: Option<&(Moment, f64)>| neighbour.is_some_and(|(_, a)| *a < (1.0 - RESOLVED) * peak_a);
    if peak <= first {
        reasons.push("the highest sample is the first one: what came before it is not seen".to_owned());
    } else if lower(currents.get(peak - 1)) || lower(currents.get(peak + 1)) {
        reasons.push("the samples beside the highest are more than 5 % lower: the peak lies between them".to_owned());
    }
    reasons
}

fn supply_limited(view: &View, meter: usize, peak_at: Moment, last_step: u32) -> Option<String> {
    let volts: Vec<(Moment, f64)> = view
        .readings(meter, Reading::Voltage)
        .filter(|(s, _)| view.on.is_some_and(|on| s.reply >= on) && s.step <= last_step)
        .map(|(s, v)| (s.reply, v))
        .collect();
    let at_peak = value_at(&volts, peak_at)?;
    let late = &volts[volts.len() * 3 / 4..];
    let later = late.iter().map(|(_, v)| v).sum::<f64>() / late.len() as f64;
    let sag = 1.0 - at_peak / later;
    (sag > SAG).then(|| format!("the voltage sagged by {:.1} % at the peak", sag * 100.0))
}
