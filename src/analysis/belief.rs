//! Is the body's sensor believable?

use crate::quantity::Reading;
use crate::record::Status;

use super::cell::{CellView, Track, highest, mean, time, within};
use super::types::Drawn;

/// A body that differs by more than this from ambient is not cold (house default).
const COLD_WITHIN_K: f64 = 3.0;
/// Two readings in turn differ by noise; the one that ended a wait lay below the limit.
const NOISE_K: f64 = 0.5;
/// A fall is one by more than this, and by this share of the rise before.
const FALL_K: f64 = 10.0;
const FALL_SHARE: f64 = 0.2;
/// Power is steady while it stays above this share.
const STEADY_SHARE: f64 = 0.9;
/// Readings that stay the same to the last digit for so long are stuck, where the
/// instrument resolves this much (house defaults).
const STUCK_S: f64 = 300.0;
const STUCK_ROWS: usize = 60;
const FINE_K: f64 = 0.05;
/// More of the rows than this without a value leave no picture.
const LOST_SHARE: f64 = 0.1;

/// How far the body is from ambient before energising; nothing where it is unknown.
pub(super) fn before(view: &CellView) -> Option<f64> {
    let body = view.before_energising(view.body)?;
    Some(body - view.before_energising(view.ambient)?)
}

/// Why a switch-on is not one from cold.
pub(super) fn cold(view: &CellView) -> Result<(), String> {
    if view.switched.energised.is_none() {
        return Err("it was not energised".to_owned());
    }
    let Some(apart) = before(view) else {
        return Err("body or ambient was not read before energising".to_owned());
    };
    if apart.abs() <= COLD_WITHIN_K + NOISE_K {
        return Ok(());
    }
    Err(format!(
        "the body was {apart:.1} K from ambient before energising"
    ))
}

/// Why the temperatures of this cell are not to be believed.
pub(super) fn disbelief(view: &CellView, drawn: Option<&Drawn>) -> Vec<String> {
    let (Some(_), Some(energised)) = (view.body, view.energised_s()) else {
        return Vec::new();
    };
    let body = view.energised(view.body, Reading::Temperature);
    let power = view.energised(view.meter, Reading::Power);
    let works = drawn.is_some_and(|d| d.power_w > 5.0 * d.floor_w && d.vanished_s.is_none());
    [
        lost(view),
        apart_from_ambient(view),
        (works && cold(view).is_ok())
            .then(|| no_rise(view, &body, energised))
            .flatten(),
        (!view.plan.appliance.thermostat)
            .then(|| falls(&body, &power))
            .flatten(),
        stuck(view, &body),
        swapped(view, &body),
    ]
    .into_iter()
    .flatten()
    .collect()
}

fn lost(view: &CellView) -> Option<String> {
    let rows = || {
        view.rows
            .iter()
            .filter(|row| Some(row.role) == view.body && row.energised)
    };
    let (all, none) = (
        rows().count(),
        rows().filter(|r| r.status != Status::Ok).count(),
    );
    let worst = rows().find(|r| r.status != Status::Ok)?;
    (none as f64 > LOST_SHARE * all as f64).then(|| {
        format!(
            "{none} of {all} readings of the body hold no value (the first, at {:.0} s, {})",
            time(worst),
            worst.status.word()
        )
    })
}

/// In the first cell the unit is as cold as the room; a sensor that says otherwise
/// is not on the unit, or is of another type.
fn apart_from_ambient(view: &CellView) -> Option<String> {
    let apart = before(view)?;
    (view.index == 0 && apart.abs() > COLD_WITHIN_K + NOISE_K).then(|| {
        format!("the body differed from ambient by {apart:.1} K before the first cold start")
    })
}

fn no_rise(view: &CellView, body: &[(f64, f64)], energised: f64) -> Option<String> {
    let guards = &view.plan.guards;
    let until = energised + guards.rise_within.get();
    // Cut short before then, nothing can be said.
    body.last().filter(|(t, _)| *t >= until)?;
    let start = view
        .before_energising(view.body)
        .or(body.first().map(|p| p.1))?;
    let rise = highest(within(body, energised, until))?.1 - start;
    (rise < guards.least_rise.get()).then(|| {
        format!(
            "the body rose by {rise:.1} K, not {}, within {} although power was drawn",
            guards.least_rise, guards.rise_within
        )
    })
}

/// A fall of the body while the power stays what it was.
fn falls(body: &[(f64, f64)], power: &[(f64, f64)]) -> Option<String> {
    let start = body.first()?.1;
    let top = highest(body)?;
    let lowest = within(body, top.0, f64::INFINITY)
        .iter()
        .copied()
        .reduce(|low, next| if next.1 < low.1 { next } else { low })?;
    let fall = top.1 - lowest.1;
    if fall <= FALL_K.max(FALL_SHARE * (top.1 - start)) {
        return None;
    }
    let around = |t: f64| mean(within(power, t - 30.0, t + 30.0));
    let (then, now) = (around(top.0)?, around(lowest.0)?);
    (then > 0.0 && now >= STEADY_SHARE * then)
        .then(|| format!("the body fell by {fall:.1} K while the power stayed at {now:.1} W"))
}

fn stuck(view: &CellView, body: &[(f64, f64)]) -> Option<String> {
    let gauge = super::measured::Gauge::of(view.plan, view.body?, Reading::Temperature)?;
    if gauge.resolution() > FINE_K {
        return None;
    }
    let longest = body
        .chunk_by(|a, b| a.1 == b.1)
        .filter(|chunk| chunk.len() >= STUCK_ROWS)
        .map(|chunk| (chunk[chunk.len() - 1].0 - chunk[0].0, chunk[0].1))
        .find(|(length, _)| *length >= STUCK_S)?;
    let (length, value) = longest;
    Some(format!(
        "the body read {value} °C to the last digit for {length:.0} s"
    ))
}

/// Ambient hotter than the body in the last minute before OFF.
fn swapped(view: &CellView, body: &[(f64, f64)]) -> Option<String> {
    let until = body.last()?.0;
    let ambient: Track = view.energised(view.ambient, Reading::Temperature);
    let last_minute = |track: &[(f64, f64)]| mean(within(track, until - 60.0, until));
    let hotter = last_minute(&ambient)? - last_minute(body)?;
    (hotter > COLD_WITHIN_K).then(|| {
        format!(
            "ambient was {hotter:.1} K hotter than the body while energised: \
             the channels look swapped, or the sensor is not on the unit"
        )
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_body_that_falls_at_steady_power_is_not_believed() {
        let body: Track = (0..600)
            .map(|i| {
                let t = f64::from(i);
                (
                    t,
                    if t < 300.0 {
                        20.0 + 0.2 * t
                    } else {
                        80.0 - 0.15 * (t - 300.0)
                    },
                )
            })
            .collect();
        let steady: Track = (0..600).map(|i| (f64::from(i), 9.0)).collect();
        assert!(falls(&body, &steady).unwrap().contains("fell by"));
        let fading: Track = (0..600)
            .map(|i| (f64::from(i), 9.0 - 0.012 * f64::from(i)))
            .collect();
        assert_eq!(falls(&body, &fading), None);
        assert_eq!(falls(&body[..350], &steady), None);
    }
}
