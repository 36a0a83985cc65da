//! What an `abnormal` step did to the thermal link.

use crate::plan::Action;
use crate::quantity::Reading;
use crate::spec::sequence::MeasuredAt;

use super::cell::{CellView, highest, within};
use super::temperature::body_estimate;
use super::types::{Estimate, Figure, Opening};

/// A link has opened where the power stays below this share of its highest: a fan
/// beside the link may still run (house default).
const OPENED_BELOW: f64 = 0.1;
/// For so long, seconds.
const OPENED_FOR_S: f64 = 10.0;
/// After an opening Tm is held for this long (IEC 60691, definition of Tm).
const HELD_FOR_S: f64 = 600.0;

/// The openings of a cell's `abnormal` steps, one for each step.
pub(super) fn openings(view: &CellView) -> Vec<Opening> {
    view.steps()
        .filter_map(|step| match &step.action {
            Action::Abnormal { fault, .. } => Some(opening(view, step.number, fault)),
            _ => None,
        })
        .collect()
}

fn opening(view: &CellView, step: u32, fault: &str) -> Opening {
    let power = view.track(view.meter, Reading::Power, |row| {
        row.step == step && row.energised
    });
    let body = view.track(view.body, Reading::Temperature, |row| row.step >= step);
    let top = highest(&power).map_or(0.0, |(_, watts)| watts);
    let draws = |p: &(f64, f64)| p.1 >= OPENED_BELOW * top;
    let opened_s = (top > 0.0).then(|| vanished(&power, draws)).flatten();
    let absent = |reason: &str| Opening {
        fault: fault.to_owned(),
        opened_s,
        at_opening_degc: Figure::Absent(reason.to_owned()),
        peak_degc: Figure::Absent(reason.to_owned()),
        closed_again_s: None,
    };
    let Some(opened) = opened_s else {
        let why = if power.is_empty() {
            "the step was not run"
        } else {
            "the link did not open"
        };
        return absent(why);
    };
    let link = view.plan.appliance.link.as_ref();
    if link.is_some_and(|l| matches!(l.measured_at, MeasuredAt::OutsideOnly { .. })) {
        return absent("the link was not measured, only its outside");
    }
    Opening {
        fault: fault.to_owned(),
        opened_s,
        at_opening_degc: figure(at_opening(view, &body, opened)),
        peak_degc: figure(peak_after(view, &body, opened)),
        closed_again_s: power
            .iter()
            .find(|p| p.0 > opened && draws(p))
            .map(|p| p.0 - opened),
    }
}

fn figure(found: Result<Estimate, String>) -> Figure<Estimate> {
    match found {
        Ok(estimate) => Figure::Known(estimate),
        Err(reason) => Figure::Absent(reason),
    }
}

/// When the power vanished for ten seconds.
fn vanished(power: &[(f64, f64)], draws: impl Fn(&(f64, f64)) -> bool) -> Option<f64> {
    power
        .chunk_by(|a, b| draws(a) == draws(b))
        .skip_while(|chunk| !draws(&chunk[0]))
        .filter(|chunk| !draws(&chunk[0]))
        .find(|chunk| chunk[chunk.len() - 1].0 - chunk[0].0 >= OPENED_FOR_S)
        .map(|chunk| chunk[0].0)
}

fn at_opening(view: &CellView, body: &[(f64, f64)], opened: f64) -> Result<Estimate, String> {
    let before = body.iter().rev().find(|(t, _)| *t <= opened);
    let (at, indicated) = before.ok_or("no temperature of the body was read before it opened")?;
    body_estimate(view, *indicated, *at)
}

fn peak_after(view: &CellView, body: &[(f64, f64)], opened: f64) -> Result<Estimate, String> {
    let after = within(body, opened, opened + HELD_FOR_S);
    let (at, indicated) = highest(after).ok_or("the body was not read after it opened")?;
    let last = body.last().map_or(opened, |(t, _)| *t);
    if last < opened + HELD_FOR_S {
        return Err(format!(
            "the body was followed for {:.0} s after the link opened, not for 10 min",
            last - opened
        ));
    }
    body_estimate(view, indicated, at)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_pause_is_no_opening_and_a_power_that_never_came_is_none() {
        let power = |off: std::ops::Range<i32>| -> Vec<(f64, f64)> {
            (0..100)
                .map(|i| (f64::from(i), if off.contains(&i) { 0.2 } else { 50.0 }))
                .collect()
        };
        let draws = |p: &(f64, f64)| p.1 >= 5.0;
        assert_eq!(vanished(&power(40..45), draws), None);
        assert_eq!(vanished(&power(40..60), draws), Some(40.0));
        assert_eq!(vanished(&power(0..20), draws), None);
    }
}
