//! Settled input: the soak asked again from the record, then a mean with its
//! uncertainty over the window.

use crate::plan::Action;
use crate::quantity::{Moment, Reading};
use crate::record::{Status, StepEnd};
use crate::settle::{Settle, Settling, Watched};

use super::cell::{CellView, Track, highest, mean, within};
use super::input::at_plug;
use super::measured::Gauge;
use super::referral::usual_exponent;
use super::types::{Drawn, Estimate, Figure, Steady};

/// A load is on above this share of its highest power.
const ON: f64 = 0.5;
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
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Window {
    pub(super) from_s: f64,
    pub(super) to_s: f64,
    pub(super) criterion: String,
}

/// Asks `settle` again with the recorded rows of the cell's soak.
pub(super) fn settled(view: &CellView) -> Figure<Window> {
    let Some(energised) = view.switched.energised else {
        return Figure::Absent("it was not energised".to_owned());
    };
    let soak = view.step(|action| matches!(action, Action::Soak { .. }));
    let Some((
        number,
        Action::Soak {
            at_least,
            every,
            until,
            ..
        },
    )) = soak.map(|step| (step.number, &step.action))
    else {
        return Figure::Absent("it has no soak, so nothing says that it is settled".to_owned());
    };
    let cycling = view.plan.appliance.thermostat;
    let mut settle = Settle::new(until, *at_least, *every, cycling, energised);
    for row in view.rows.iter().filter(|row| row.step == number) {
        if row.status != Status::Ok {
            continue;
        }
        let watched = [
            (view.meter, Reading::Power, Watched::Power),
            (view.body, Reading::Temperature, Watched::Body),
            (view.ambient, Reading::Temperature, Watched::Ambient),
        ];
        for (role, reading, what) in watched {
            if let (true, Some(value)) = (role == Some(row.role), row.readings.get(reading)) {
                settle.take(row.reply, what, value);
            }
        }
    }
    let said = view.end_of(number);
    match settle.state() {
        Settling::Settled {
            from,
            to,
            criterion,
        } => Figure::Known(Window {
            from_s: from.as_secs_f64(),
            to_s: to.as_secs_f64(),
            criterion: criterion.clone(),
        }),
        _ if said == Some(StepEnd::Settled) => Figure::Absent(
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
/// thermostat needs whole cycles: its window begins with the criterion's.
fn measured_window(view: &CellView, settled: &Window) -> Window {
    let measure = view.step(|action| matches!(action, Action::Measure(_)));
    let rows: Track = measure.map_or_else(Track::new, |step| {
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
        criterion: settled.criterion.clone(),
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
    let on = on_times(view, &power)?;
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
    let mean_w = mean(within(&power, on.from_s, on.to_s)).unwrap_or(0.0);
    let plug = at_plug(view, &on_power, voltage, current)?;
    Ok(Steady {
        power_w: plug.power_w.clone(),
        at_plug_w: plug.power_w,
        exponent: usual_exponent(&view.plan.appliance),
        ambient_degc: temperature_in(view, view.ambient, &window),
        body_degc: temperature_in(view, view.body, &window).map(|body| body.value),
        mean_w,
        duty: on.duty,
        voltage_v: plug.volts.value,
        plug_v: plug.volts,
        current_a: current,
        from_s: window.from_s,
        to_s: window.to_s,
        samples: on_power.len(),
        effective: plug.effective,
        criterion: window.criterion,
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

/// When a load is on in a window.
struct OnTimes {
    /// Stretches with power, their first and last rows left out where it cycles.
    stretches: Vec<(f64, f64)>,
    /// Share of whole cycles in which it is on.
    duty: f64,
    /// What the mean is over: whole cycles, or the window.
    from_s: f64,
    to_s: f64,
}

fn on_times(view: &CellView, power: &[(f64, f64)]) -> Result<OnTimes, String> {
    let (from_s, to_s) = (power[0].0, power[power.len() - 1].0);
    let always = OnTimes {
        stretches: vec![(from_s, to_s)],
        duty: 1.0,
        from_s,
        to_s,
    };
    let threshold = ON * highest(power).map_or(0.0, |(_, p)| p);
    let is_on = |p: &(f64, f64)| p.1 > threshold;
    if !view.plan.appliance.thermostat || power.iter().all(is_on) {
        return Ok(always);
    }
    let begins: Vec<usize> = (1..power.len())
        .filter(|i| is_on(&power[*i]) && !is_on(&power[i - 1]))
        .collect();
    let (Some(first), Some(last)) = (begins.first(), begins.last()) else {
        return Err("its thermostat shows no cycle in the settled window".to_owned());
    };
    if first == last {
        return Err("its thermostat shows no whole cycle in the settled window".to_owned());
    }
    let whole = &power[*first..*last];
    let on_rows = whole.iter().filter(|p| is_on(p)).count();
    // A row that straddles the switching holds a part of both states.
    let stretches = power
        .chunk_by(|a, b| is_on(a) == is_on(b))
        .filter(|chunk| is_on(&chunk[0]))
        .filter_map(|chunk| match chunk {
            [_, inner @ .., _] if !inner.is_empty() => Some((inner[0].0, inner[inner.len() - 1].0)),
            _ => None,
        })
        .collect();
    Ok(OnTimes {
        stretches,
        duty: on_rows as f64 / whole.len() as f64,
        from_s: whole[0].0,
        to_s: whole[whole.len() - 1].0,
    })
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
