//! Settled input: the soak asked again from the record, then a mean with its
//! uncertainty over the window.

use crate::plan::Action;
use crate::quantity::{Moment, Reading};
use crate::record::{Status, StepEnd};
use crate::settle::{Prediction, Settle, Settling, watched_in};
use crate::spec::sequence::CriterionKind;

use super::budget::Share;
use super::cell::{CellView, Track, highest, mean, within};
use super::cycling::{ON, on_times};
use super::input::at_plug;
use super::measured::Gauge;
use super::referral::usual_exponent;
use super::types::{Drawn, Estimate, Figure, Steady};

/// Rows behind a prediction that give voltage and current, seconds.
const LAST_MINUTE_S: f64 = 60.0;
/// Power below this share of its highest has vanished, if it does so for a time.
const VANISHED: f64 = 0.01;
const VANISHED_FOR_S: f64 = 10.0;
/// A thermostat that is off for so long, and longer than this many of its longest
/// pauses, is not cycling any more (house defaults).
const OFF_FOR_GOOD_S: f64 = 600.0;
const OFF_FOR_GOOD: f64 = 3.0;
/// Fewer rows than this are no window.
const FEWEST_ROWS: usize = 5;

/// A window, and why its input is settled.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Window {
    pub(super) from_s: f64,
    pub(super) to_s: f64,
    pub(super) criterion: String,
    /// Power still to come at the end of the soak (slope times tau) and its standard
    /// uncertainty, W; absent where no fit holds.
    pub(super) power_to_come_w: Option<(f64, f64)>,
    /// The same of the body's rise, K.
    pub(super) rise_to_come_k: Option<(f64, f64)>,
    /// Time constant of the body's rise, s, where a fit of it holds.
    pub(super) rise_tau_s: Option<f64>,
    /// Where the soak was ended early.
    pub(super) extrapolated: Option<Extrapolated>,
}

/// A soak that predictions ended.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Extrapolated {
    /// Predicted end of the indicated power; its last mean where the power had settled.
    pub(super) power_w: f64,
    /// Its standard uncertainty from the prediction alone.
    pub(super) power_standard: f64,
    /// Rise that was still to come; 0 where no fit of it holds.
    pub(super) rise_still_to_come_k: f64,
    /// Its standard uncertainty.
    pub(super) rise_standard: f64,
}

/// Asks `settle` again with the recorded rows of the cell's soak.
pub(super) fn settled(view: &CellView) -> Figure<Window> {
    let Some(energised) = view.switched.energised else {
        return Figure::Absent("it was not energised".to_owned());
    };
    let soak = view
        .step(|action| matches!(action, Action::Soak { .. }))
        .and_then(|step| Some((step.number, view.plan.soaking(&step.action)?)));
    let Some((number, soaking)) = soak else {
        return Figure::Absent("it has no soak, so nothing says that it is settled".to_owned());
    };
    let at_least = soaking.soak.at_least;
    let mut settle = Settle::new(soaking, energised);
    for row in view.rows.iter().filter(|row| row.step == number) {
        let role = view.plan.bay.roles.get(row.role);
        let Some(role) = role.filter(|_| row.status == Status::Ok) else {
            continue;
        };
        for (what, value) in watched_in(role.kind, &role.name, &row.readings) {
            settle.take(row.reply, what, value);
        }
    }
    let said = view.end_of(number);
    match settle.state().clone() {
        Settling::Settled {
            from,
            to,
            criterion,
        } => Figure::Known(window(&mut settle, from, to, criterion)),
        Settling::Extrapolated {
            from,
            to,
            power,
            rise,
            criterion,
        } => {
            let window = window(&mut settle, from, to, criterion);
            Figure::Known(ended_early(view, window, power, rise))
        }
        _ if matches!(said, Some(StepEnd::Settled | StepEnd::Extrapolated)) => Figure::Absent(
            "the run called it settled, but the recorded rows do not show it".to_owned(),
        ),
        Settling::WentOpen => Figure::Absent("the power vanished during the soak".to_owned()),
        Settling::TooEarly => Figure::Absent(match said {
            None => "its soak was not run".to_owned(),
            _ => format!("its soak ended before the least time of {at_least}"),
        }),
        Settling::NotYet(why) => Figure::Absent(format!("it had not settled: {why}")),
    }
}

/// The window with what was still to come at its end.
fn window(settle: &mut Settle, from: Moment, to: Moment, criterion: String) -> Window {
    let told = settle.prediction();
    let to_come = |p: Option<Prediction>| p.map(|p| (p.still_to_come, p.end_standard));
    let (power, rise) = (to_come(told.power), to_come(told.rise));
    let words = [(power, "W of power"), (rise, "K of rise")]
        .into_iter()
        .filter_map(|(to_come, unit)| to_come.map(|(value, _)| format!("{value:+.3} {unit}")))
        .collect::<Vec<_>>();
    let still = match words.as_slice() {
        [] => String::new(),
        words => format!("; still to come (slope x tau): {}", words.join(", ")),
    };
    Window {
        from_s: from.as_secs_f64(),
        to_s: to.as_secs_f64(),
        criterion: format!("{criterion}{still}"),
        power_to_come_w: power,
        rise_to_come_k: rise,
        rise_tau_s: told.rise.map(|p| p.tau_s),
        extrapolated: None,
    }
}

/// The last minute of a soak that predictions ended, and where it would have gone.
fn ended_early(
    view: &CellView,
    window: Window,
    power: Option<Prediction>,
    rise: Option<Prediction>,
) -> Window {
    let from_s = (window.to_s - LAST_MINUTE_S).max(window.from_s);
    let track = view.energised(view.meter, Reading::Power);
    let last = mean(within(&track, from_s, window.to_s)).unwrap_or(0.0);
    // A rise that meets the criterion by itself still has its remaining error.
    let tau_s = rise.map(|p| p.tau_s);
    let rise = rise.map(|p| (p.still_to_come, p.end_standard));
    let rise_tau_s = tau_s.or(window.rise_tau_s);
    let (to_come, rise_standard) = rise.or(window.rise_to_come_k).unwrap_or_default();
    let extrapolated = Extrapolated {
        power_w: power.map_or(last, |p| p.end),
        power_standard: power.map_or(0.0, |p| p.end_standard),
        rise_still_to_come_k: to_come,
        rise_standard,
    };
    Window {
        from_s,
        rise_tau_s,
        extrapolated: Some(extrapolated),
        ..window
    }
}

/// The settled input of a cell, as it was measured at the plug.
pub(super) fn steady(view: &CellView, settled: &Figure<Window>) -> Figure<Steady> {
    let window = match settled {
        Figure::Known(window) => measured_window(view, window),
        Figure::Absent(reason) => return Figure::Absent(reason.clone()),
    };
    match over(view, window) {
        Ok(steady) => Figure::Known(steady),
        Err(reason) => Figure::Absent(reason),
    }
}

/// The window of the step `measure` behind a settled soak, else the criterion's. A
/// thermostat needs whole cycles: its window begins with the criterion's. The sampling
/// method's result is the mean over its own window.
fn measured_window(view: &CellView, settled: &Window) -> Window {
    let sampled = view.steps().any(|step| {
        matches!(&step.action, Action::Soak { until, .. } if until.kind == CriterionKind::SamplingMethod)
    });
    let measure = view.step(|action| matches!(action, Action::Measure(_)));
    let rows: Track = measure
        .filter(|_| !sampled)
        .map_or_else(Track::new, |step| {
            view.track(view.meter, Reading::Power, |row| {
                row.step == step.number && row.energised
            })
        });
    let (Some(first), Some(last)) = (rows.first(), rows.last()) else {
        return settled.clone();
    };
    if rows.len() < FEWEST_ROWS {
        return settled.clone();
    }
    let cycling = view.plan.appliance.thermostat;
    Window {
        from_s: if cycling { settled.from_s } else { first.0 },
        to_s: last.0,
        ..settled.clone()
    }
}

fn over(view: &CellView, window: Window) -> Result<Steady, String> {
    let inside = |reading| {
        let track = view.energised(view.meter, reading);
        within(&track, window.from_s, window.to_s).to_vec()
    };
    let power = inside(Reading::Power);
    if power.len() < FEWEST_ROWS {
        return Err("too few power readings in the settled window".to_owned());
    }
    let thermostat = view.plan.appliance.thermostat;
    let on = on_times(thermostat, &power, &inside(Reading::Energy))?;
    let kept = |track: &[(f64, f64)]| -> Track {
        let is_on = |t: f64| {
            on.stretches
                .iter()
                .any(|(from, to)| (*from..=*to).contains(&t))
        };
        track.iter().copied().filter(|(t, _)| is_on(*t)).collect()
    };
    let on_power = kept(&power);
    if on_power.len() < FEWEST_ROWS {
        return Err("too few power readings while it was on".to_owned());
    }
    let voltage = mean(&kept(&inside(Reading::Voltage)))
        .ok_or("the power meter gave no voltage in the settled window")?;
    let current = mean(&kept(&inside(Reading::Current)));
    let ambient_degc = temperature_in(view, view.ambient, &window);
    let room = ambient_degc.as_ref().map(|ambient| ambient.value);
    let plug = at_plug(view, &on_power, voltage, current, room)?;
    let power_w = match &window.extrapolated {
        Some(early) => to_the_end(&plug.power_w, mean(&on_power).unwrap_or(0.0), early),
        None => plug.power_w,
    };
    let (representative_w, representative_how) = on.representative.unzip();
    Ok(Steady {
        power_w: power_w.clone(),
        at_plug_w: power_w,
        exponent: usual_exponent(&view.plan.appliance),
        ambient_degc,
        body_degc: temperature_in(view, view.body, &window).map(|body| body.value),
        mean_w: on.mean_w,
        mean_from: on.mean_from,
        representative_w,
        representative_how,
        duty: on.duty,
        voltage_v: plug.volts.value,
        plug_v: plug.volts,
        current_a: current,
        from_s: window.from_s,
        to_s: window.to_s,
        samples: on_power.len(),
        effective: plug.effective,
        criterion: window.criterion,
        extrapolated: window.extrapolated.is_some(),
    })
}

/// Mean of a temperature in a window, where it was read and its accuracy is stated.
fn temperature_in(view: &CellView, role: Option<usize>, window: &Window) -> Option<Estimate> {
    let track = view.track(role, Reading::Temperature, |_| true);
    let indicated = mean(within(&track, window.from_s, window.to_s))?;
    Gauge::of(view.plan, role?, Reading::Temperature)?
        .estimate(indicated)
        .ok()
}

/// An input measured at an indicated mean, moved to the predicted end, with the
/// prediction's share.
fn to_the_end(measured: &Estimate, indicated: f64, early: &Extrapolated) -> Estimate {
    if indicated <= 0.0 {
        return measured.clone();
    }
    let share = measured.value / indicated * early.power_standard;
    measured
        .scaled(early.power_w / indicated)
        .moved(0.0, [Share::normal("extrapolation", share, "W")])
}

/// What a unit drew, settled or not.
pub(super) fn drawn(view: &CellView) -> Figure<Drawn> {
    let (Some(energised), Some(until)) = (view.energised_s(), view.energised_until_s()) else {
        return Figure::Absent("it was not energised".to_owned());
    };
    let power = view.energised(view.meter, Reading::Power);
    let gauge = view
        .meter
        .and_then(|role| Gauge::of(view.plan, role, Reading::Power));
    let (Some(gauge), Some(first)) = (gauge, power.first()) else {
        return Figure::Absent("no power was read while it was energised".to_owned());
    };
    if until - first.0 < VANISHED_FOR_S {
        return Figure::Absent("it was energised too briefly to say".to_owned());
    }
    let floor_w = gauge.floor();
    let top = highest(&power).map_or(0.0, |(_, p)| p);
    let cycling = view.plan.appliance.thermostat;
    let power_w = if cycling {
        let on: Track = power.iter().copied().filter(|p| p.1 > ON * top).collect();
        mean(&on)
    } else {
        mean(within(&power, until - 60.0, until))
    };
    let Some(power_w) = power_w else {
        return Figure::Absent("no power was read in the last minute before OFF".to_owned());
    };
    let vanished = match (top > 5.0 * floor_w, cycling) {
        (false, _) => None,
        (true, false) => vanished(&power, top),
        (true, true) => off_for_good(&power, top),
    };
    Figure::Known(Drawn {
        power_w,
        floor_w,
        vanished_s: vanished.map(|t| t - energised),
    })
}

/// When the power first vanished for ten seconds after it had been there.
fn vanished(power: &[(f64, f64)], top: f64) -> Option<f64> {
    let there = |p: &(f64, f64)| p.1 >= VANISHED * top;
    power
        .chunk_by(|a, b| there(a) == there(b))
        .skip_while(|chunk| !there(&chunk[0]))
        .filter(|chunk| !there(&chunk[0]))
        .find(|chunk| chunk[chunk.len() - 1].0 - chunk[0].0 >= VANISHED_FOR_S)
        .map(|chunk| chunk[0].0)
}

/// When a cycling load went off and did not come on again.
fn off_for_good(power: &[(f64, f64)], top: f64) -> Option<f64> {
    let on = |p: &(f64, f64)| p.1 > ON * top;
    let mut pauses: Vec<(f64, f64)> = power
        .chunk_by(|a, b| on(a) == on(b))
        .filter(|chunk| !on(&chunk[0]))
        .map(|chunk| (chunk[0].0, chunk[chunk.len() - 1].0))
        .collect();
    let last = pauses
        .pop()
        .filter(|last| Some(last.1) == power.last().map(|p| p.0))?;
    let longest = pauses
        .iter()
        .map(|(from, to)| to - from)
        .fold(0.0, f64::max);
    let length = last.1 - last.0;
    (length > OFF_FOR_GOOD_S && length > OFF_FOR_GOOD * longest).then_some(last.0)
}

/// When the cell's soak settled, seconds after energising.
pub(super) fn settled_after(view: &CellView, settled: &Figure<Window>) -> Figure<f64> {
    let energised = view.switched.energised.unwrap_or(Moment::START);
    match settled {
        Figure::Known(window) => Figure::Known(window.to_s - energised.as_secs_f64()),
        Figure::Absent(reason) => Figure::Absent(reason.clone()),
    }
}
