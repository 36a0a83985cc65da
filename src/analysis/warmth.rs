//! Temperatures: the highest, at the highest ambient, and whether they can be believed.

use super::types::{Figure, Peak};
use super::uncertain::Budget;
use super::view::{Timed, View, value_at};
use crate::quantity::{Moment, Reading, Seconds};
use crate::record::{Sample, Status};
use crate::spec::sequence::MeasuredAt;
use crate::stats::mean_and_deviation;

/// Body and ambient this near are a cold start (house default).
pub(super) const COLD_K: f64 = 3.0;

/// Readings before energising that tell a cold start.
const BEFORE: Seconds = Seconds::whole(60);

/// The highest temperature is known only when it fell for this long.
const FELL_FOR_S: f64 = 120.0;

/// A surface sensor may read too low by this share of the rise (house default).
const CONTACT: f64 = 0.01;

/// An ambient that is hotter than the body by this much while energised is another channel.
const SWAPPED_K: f64 = 3.0;

/// Share of readings without a value from which on a sensor is not believed.
const TOO_MANY_LOST: f64 = 0.1;

/// As many equal readings in a row are a stuck sensor.
const STUCK: usize = 60;

/// Falling by this much within [`FALL_WITHIN_S`] at steady power is a loose sensor.
const FALL_K: f64 = 8.0;
const FALL_WITHIN_S: f64 = 60.0;

/// Power that changes by less than this share is steady.
const STEADY_POWER: f64 = 0.1;

/// Whether the body was near ambient before energising.
pub(super) fn cold_start(view: &View, samples: &[Sample]) -> Figure<()> {
    let Some(on) = view.on else { return Figure::Absent("not energised".to_owned()) };
    // The mean of the last minute before energising: a rest ends by the same mean.
    let before = |role: Option<usize>| {
        let role = role?;
        let until = samples.partition_point(|s| s.reply < on);
        let of_role = samples[..until].iter().rev().filter(|s| s.role == role && s.status == Status::Ok);
        let readings = of_role.filter_map(|s| Some((s.reply, s.readings.get(Reading::Temperature)?)));
        let last: Vec<f64> = readings.take_while(|(at, _)| on.since(*at) <= BEFORE).map(|(_, t)| t).collect();
        mean_and_deviation(&last).map(|(mean, _)| mean)
    };
    match (before(view.body()), before(view.ambient())) {
        (Some(body), Some(ambient)) if (body - ambient).abs() <= COLD_K => Figure::Known(()),
        (Some(body), Some(ambient)) => Figure::Absent(format!(
            "the body was {:.1} K away from ambient before energising, {COLD_K} K are allowed",
            body - ambient
        )),
        _ => Figure::Absent("body or ambient was not read before energising".to_owned()),
    }
}

/// The highest temperature of the body from energising until it fell for two minutes
/// after OFF.
pub(super) fn body_peak(view: &View) -> (Figure<Peak>, Option<Budget>) {
    let Some(role) = view.body() else { return (Figure::Absent("no role `body`".to_owned()), None) };
    let series = view.since_on(role, Reading::Temperature);
    let Some((at, indicated)) = highest(&series) else {
        return (Figure::Absent(not_read(view)), None);
    };
    let last = series.last().map_or(at, |(last, _)| *last);
    let off = view.off.unwrap_or(last);
    if last.since(at.max(off)).get() < FELL_FOR_S {
        let why = "the after-heat was not watched: the body must fall for two minutes after OFF";
        return (Figure::Absent(why.to_owned()), None);
    }
    let ambient = ambient_at(view, at);
    let Some(ambient_degc) = ambient else {
        return (Figure::Absent("ambient was not read".to_owned()), None);
    };
    let mut budget = Budget::reading(view.plan, &view.plan.bay.roles[role], Reading::Temperature, indicated);
    budget.rectangular("contact of a surface sensor (house default)", CONTACT * (indicated - ambient_degc));
    let peak = Peak {
        temperature_degc: budget.estimate(),
        at_s: at.as_secs_f64(),
        ambient_degc,
        after_heat: at > off,
    };
    (Figure::Known(peak), Some(budget))
}

fn not_read(view: &View) -> String {
    if view.on.is_none() { "not energised".to_owned() } else { "the body was not read".to_owned() }
}

/// The highest temperature referred to the highest ambient, 1 K/K, with the placement's
/// allowance. An unfinished rise or a missing allowance leaves it unknown.
pub(super) fn body_worst(view: &View, peak: &Figure<Peak>, budget: Option<Budget>, settled: bool) -> Figure<super::types::Estimate> {
    let (Figure::Known(peak), Some(mut budget)) = (peak, budget) else {
        return Figure::Absent(peak.reason().unwrap_or("the highest temperature is not known").to_owned());
    };
    if !settled {
        return Figure::Absent("the rise was not finished: the soak did not settle".to_owned());
    }
    budget.shift(view.plan.appliance.highest_ambient.get() - peak.ambient_degc);
    if let Some(role) = view.ambient() {
        let role = &view.plan.bay.roles[role];
        let ambient = Budget::reading(view.plan, role, Reading::Temperature, peak.ambient_degc);
        budget.include("ambient: ", &ambient, 1.0);
        budget.shift(peak.ambient_degc - ambient.value());
    }
    match view.plan.appliance.link.as_ref().map(|link| &link.measured_at) {
        Some(MeasuredAt::Elsewhere { allowance: Some(allowance), .. }) => budget.shift(allowance.get()),
        Some(MeasuredAt::Elsewhere { allowance: None, place, .. }) => {
            return Figure::Absent(format!("measured at {place}, not on the link's body, and no allowance is stated"));
        }
        Some(MeasuredAt::LinkBody) | None => {}
    }
    Figure::Known(budget.estimate())
}

/// The highest rise over ambient of a temperature role that is neither body nor ambient.
pub(super) fn highest_rise(view: &View, role: usize) -> Figure<super::types::Estimate> {
    let series = view.since_on(role, Reading::Temperature);
    let Some(ambient_role) = view.ambient() else { return Figure::Absent("no role `ambient`".to_owned()) };
    let ambient = view.since_on(ambient_role, Reading::Temperature);
    let rises: Vec<Timed> =
        series.iter().filter_map(|(at, t)| Some((*at, t - value_at(&ambient, *at)?))).collect();
    let Some((at, rise)) = highest(&rises) else { return Figure::Absent(not_read(view)) };
    let (Some(here), Some(there)) = (value_at(&series, at), value_at(&ambient, at)) else {
        return Figure::Absent(not_read(view));
    };
    let roles = &view.plan.bay.roles;
    let mut budget = Budget::reading(view.plan, &roles[role], Reading::Temperature, here);
    let ambient = Budget::reading(view.plan, &roles[ambient_role], Reading::Temperature, there);
    budget.include("ambient: ", &ambient, 1.0);
    budget.shift(-ambient.value());
    budget.rectangular("contact of a surface sensor (house default)", CONTACT * rise);
    Figure::Known(budget.estimate())
}

fn highest(series: &[Timed]) -> Option<Timed> {
    series.iter().copied().reduce(|best, next| if next.1 > best.1 { next } else { best })
}

fn ambient_at(view: &View, at: Moment) -> Option<f64> {
    value_at(&view.since_on(view.ambient()?, Reading::Temperature), at)
}

/// Why the temperatures of a cell are not to be believed.
pub(super) fn disbelief(view: &View, cold_start: &Figure<()>) -> Vec<String> {
    let (Some(on), Some(body_role), Some(ambient_role)) = (view.on, view.body(), view.ambient()) else {
        return Vec::new();
    };
    let body = view.while_on(body_role, Reading::Temperature);
    let ambient = view.while_on(ambient_role, Reading::Temperature);
    let power = view.meter().map_or_else(Vec::new, |meter| view.while_on(meter, Reading::Power));
    let mut reasons = Vec::new();
    reasons.extend(lost_readings(view, body_role));
    reasons.extend(no_rise(view, on, &body, &ambient, &power));
    reasons.extend(swapped(&body, &ambient));
    reasons.extend(stuck(&body));
    reasons.extend(fell(&body, &power));
    if view.cell == 0 {
        reasons.extend(cold_start.reason().filter(|r| r.contains("away")).map(str::to_owned));
    }
    reasons
}

fn lost_readings(view: &View, role: usize) -> Option<String> {
    let on = view.on?;
    let all = view.samples.iter().filter(|s| s.role == role && s.reply >= on);
    let (lost, count) = all.fold((0, 0), |(lost, n), s| (lost + usize::from(s.status != Status::Ok), n + 1));
    let too_many = lost as f64 > TOO_MANY_LOST * f64::from(count);
    too_many.then(|| format!("{lost} of {count} readings of the body carry no value"))
}

/// A body that stays cool although power is drawn: the sensor is not on it.
fn no_rise(view: &View, on: Moment, body: &[Timed], ambient: &[Timed], power: &[Timed]) -> Option<String> {
    let guards = &view.plan.guards;
    let limit = guards.input.get(view.cell)?.get();
    let due = on + guards.rise_within;
    let lasted = body.last().is_some_and(|(at, _)| *at > due);
    let drew = power.iter().any(|(_, w)| *w > 0.1 * limit);
    let least = guards.least_rise.get();
    let first = body.first()?.1;
    let rose = body.iter().take_while(|(at, _)| *at <= due).any(|(at, t)| {
        let over_ambient = value_at(ambient, *at).map_or(0.0, |a| t - a);
        (t - first).max(over_ambient) >= least
    });
    (lasted && drew && !rose)
        .then(|| format!("the body did not rise by {} within {} although power was drawn", guards.least_rise, guards.rise_within))
}

fn swapped(body: &[Timed], ambient: &[Timed]) -> Option<String> {
    let hotter = body.iter().filter_map(|(at, t)| Some(value_at(ambient, *at)? - t)).fold(0.0, f64::max);
    (hotter > SWAPPED_K).then(|| format!("ambient was {hotter:.1} K hotter than the body while energised"))
}

fn stuck(body: &[Timed]) -> Option<String> {
    let mut equal = 1;
    for pair in body.windows(2) {
        equal = if pair[0].1.to_bits() == pair[1].1.to_bits() { equal + 1 } else { 1 };
        if equal >= STUCK {
            return Some(format!("{STUCK} readings of the body in a row are all {} °C", pair[0].1));
        }
    }
    None
}

/// A sudden fall while the power stays: the sensor came off.
fn fell(body: &[Timed], power: &[Timed]) -> Option<String> {
    let mut from = 0;
    for (n, (at, t)) in body.iter().enumerate() {
        while at.since(body[from].0).get() > FALL_WITHIN_S {
            from += 1;
        }
        let fall = body[from..n].iter().map(|(_, before)| before - t).fold(0.0, f64::max);
        let (then, now) = (value_at(power, body[from].0), value_at(power, *at));
        let steady = then.zip(now).is_some_and(|(a, b)| a > 0.0 && (b - a).abs() <= STEADY_POWER * a);
        if fall > FALL_K && steady {
            return Some(format!("the body fell by {fall:.1} K within {FALL_WITHIN_S} s at steady power"));
        }
    }
    None
}
