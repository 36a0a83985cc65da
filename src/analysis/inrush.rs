//! Switch-on, from samples.

use crate::plan::{Action, PlannedStep};
use crate::quantity::Reading;
use crate::record::{Sample, Status};
use crate::spec::sequence::Timed;

use super::cell::{CellView, Track, highest, mean, time, within};
use super::measured::Gauge;
use super::types::{Estimate, Figure, Inrush, Steady, Wave};
use super::waveform::Shape;

/// First current: above this share of the highest, and above twice the floor.
const FIRST_CURRENT: f64 = 0.01;
/// The peak is as long as the current stays above this share of its highest.
const PEAK_ABOVE: f64 = 0.9;
/// A peak shorter than this many intervals may be higher between them.
const INTERVALS: f64 = 5.0;
/// A peak stands out from the settled power by this factor.
const STANDS_OUT: f64 = 1.1;
/// The supply limits where its voltage sags by more than this share.
const SAG: f64 = 0.03;

/// The current is at the source's limit from this share of it on.
const AT_LIMIT: f64 = 0.97;

/// From cold it is an inrush; else it is a quantity of its own, of which the peak is kept.
pub(super) fn parted(
    captured: Figure<Inrush>,
    cold: Result<(), String>,
) -> (Figure<Inrush>, Figure<Estimate>) {
    match (captured, cold) {
        (captured @ Figure::Known(_), Ok(())) => {
            let why = "it was a cold start".to_owned();
            (captured, Figure::Absent(why))
        }
        (Figure::Known(captured), Err(reason)) => {
            let why = format!("it was no cold start: {reason}");
            (Figure::Absent(why), Figure::Known(captured.peak_a))
        }
        (Figure::Absent(reason), _) => (Figure::Absent(reason.clone()), Figure::Absent(reason)),
    }
}

/// The switch-on of a cell; `steady` where its settled input is known, `wave` where a
/// waveform was taken.
pub(super) fn inrush(
    view: &CellView,
    steady: Option<&Steady>,
    wave: Option<&Wave>,
) -> Figure<Inrush> {
    if view.switched.energised.is_none() {
        return Figure::Absent("it was not energised".to_owned());
    }
    let step = view.step(|action| matches!(action, Action::Inrush(_)));
    let Some((step, Action::Inrush(timed))) = step.map(|s| (s, &s.action)) else {
        return Figure::Absent("the sequence captures no inrush here".to_owned());
    };
    match captured(view, step, timed, steady, wave) {
        Ok(inrush) => Figure::Known(inrush),
        Err(reason) => Figure::Absent(reason),
    }
}

fn captured(
    view: &CellView,
    step: &PlannedStep,
    timed: &Timed,
    steady: Option<&Steady>,
    wave: Option<&Wave>,
) -> Result<Inrush, String> {
    let track = |reading| {
        view.track(view.meter, reading, |row| {
            row.step == step.number && row.energised
        })
    };
    let (current, power) = (track(Reading::Current), track(Reading::Power));
    let gauge = view
        .meter
        .and_then(|role| Gauge::of(view.plan, role, Reading::Current))
        .ok_or("there is no power meter")?;
    let top = highest(&current).ok_or("no current was read")?;
    let threshold = (FIRST_CURRENT * top.1).max(2.0 * gauge.floor());
    let t0_s = current
        .iter()
        .find(|(_, amps)| *amps > threshold)
        .map(|(t, _)| *t)
        .ok_or("no current flowed")?;
    let peak_w = highest(&power).ok_or("no power was read")?.1;
    let steady_w = steady.map(|s| s.power_w.value).filter(|watts| *watts > 0.0);
    let after = power_after(view, top.0);
    let interval_s = timed.every.get().max(gauge.update_s());
    let sampled = gauge.estimate(top.1)?;
    // The waveform's, unless the rows show that the current rose on behind it.
    let higher = wave.filter(|wave| {
        let peak = &wave.peak_rms_a;
        let apart = libm::hypot(peak.expanded, sampled.expanded);
        sampled.value <= peak.value + apart
    });
    let source = view.plan.bay.source;
    let limit = source.current_limit.map(|amps| amps.get());
    let peak_a = higher.map_or(sampled, |wave| wave.peak_rms_a.clone());
    let at_limit = limit.and_then(|limit| at_limit(peak_a.value, limit));
    Ok(Inrush {
        t0_s,
        from_waveform: higher.is_some(),
        peak_w,
        peak_after_s: higher.map_or(top.0 - t0_s, |wave| wave.peak_rms_after_s),
        source_ohm: source.impedance.map(|ohms| ohms.get()),
        switching_angle_deg: wave.and_then(|w| w.shape.switching_angle_deg.known().copied()),
        ratio: steady_w.map(|watts| peak_w / watts),
        half_way_s: steady_w.and_then(|watts| half_way(&after, peak_w, watts, top.0)),
        above_steady_wh: steady_w
            .map(|watts| above(&view.energised(view.meter, Reading::Power), watts)),
        lower_bound: match wave {
            Some(wave) => lower_bound_beside(wave, view, step, &current, (t0_s, interval_s)),
            None => lower_bound(view, step, &current, interval_s, f64::NEG_INFINITY),
        },
        supply_limited: at_limit
            .or_else(|| wave.and_then(|wave| sagged(&wave.shape)))
            .or_else(|| supply_limited(&track(Reading::Voltage), &current, t0_s + interval_s)),
        peak_a,
    })
}

/// Rows of the inrush: energised, up to the end of its step. The first of them come
/// while the step that energises is still waiting for its confirmation.
fn is_of(step: &PlannedStep, row: &Sample) -> bool {
    row.energised && row.step <= step.number
}

/// Power while energised from a moment on, through inrush and soak.
fn power_after(view: &CellView, from: f64) -> Track {
    let power = view.energised(view.meter, Reading::Power);
    within(&power, from, f64::INFINITY).to_vec()
}

/// Seconds from the peak until the power has fallen half-way to settled.
/// Nothing where the peak does not stand out: what falls then is a thermostat's pause.
fn half_way(after: &[(f64, f64)], peak_w: f64, steady_w: f64, peak_s: f64) -> Option<f64> {
    if peak_w < STANDS_OUT * steady_w {
        return None;
    }
    let half = 0.5 * (peak_w + steady_w);
    let fallen = after.iter().find(|(_, watts)| *watts <= half)?;
    Some(fallen.0 - peak_s)
}

/// Energy above settled power in Wh, by trapezoids, until power first meets it.
fn above(power: &[(f64, f64)], steady_w: f64) -> f64 {
    let begun = power.iter().position(|(_, watts)| *watts > steady_w);
    let Some(begun) = begun else {
        return 0.0;
    };
    let joules: f64 = power[begun..]
        .windows(2)
        .take_while(|pair| pair[1].1 > steady_w)
        .map(|pair| (0.5 * (pair[0].1 + pair[1].1) - steady_w) * (pair[1].0 - pair[0].0))
        .sum();
    joules / 3600.0
}

/// The same beside a waveform: it sees the first moments whole, so only rows behind it
/// that hold no value, and a short peak among them, may hide more.
fn lower_bound_beside(
    wave: &Wave,
    view: &CellView,
    step: &PlannedStep,
    current: &[(f64, f64)],
    (t0_s, interval_s): (f64, f64),
) -> Vec<String> {
    let covered_until = t0_s - interval_s + wave.length_s - wave.shape.t0_s;
    let behind: Vec<(f64, f64)> = within(current, covered_until, f64::INFINITY).to_vec();
    let higher = highest(&behind).filter(|top| top.1 > wave.peak_rms_a.value);
    let seen = if higher.is_some() { current } else { &[] };
    let mut reasons = lower_bound(view, step, seen, interval_s, covered_until);
    if wave.shape.begins_late {
        reasons.push("the waveform begins with current already flowing".to_owned());
    }
    reasons
}

/// The current is as high as the source gives.
fn at_limit(peak_a: f64, limit_a: f64) -> Option<String> {
    (peak_a >= AT_LIMIT * limit_a).then(|| {
        format!("the current came to {peak_a:.2} A, the source gives at most {limit_a:.2} A")
    })
}

/// Whether the voltage of the waveform sags while the current is high. The first
/// half-period is left out: the switch lies within it.
fn sagged(shape: &Shape) -> Option<String> {
    let halves = shape.half_periods.get(1..)?;
    let top = halves.iter().map(|half| half.rms_a).reduce(f64::max)?;
    let full = halves.iter().map(|half| half.rms_v).reduce(f64::max)?;
    let lowest = halves
        .iter()
        .filter(|half| half.rms_a >= 0.5 * top)
        .map(|half| half.rms_v)
        .reduce(f64::min)?;
    let sag = 1.0 - lowest / full;
    (sag > SAG).then(|| {
        format!(
            "the voltage sagged to {lowest:.1} V in a half-period, {:.1} % below {full:.1} V",
            100.0 * sag
        )
    })
}

/// Why the highest sample may lie below the true peak; rows before `from` don't matter.
fn lower_bound(
    view: &CellView,
    step: &PlannedStep,
    current: &[(f64, f64)],
    interval_s: f64,
    from: f64,
) -> Vec<String> {
    let mut reasons = Vec::new();
    if let Some(seconds) = peak_length(current).filter(|s| *s < INTERVALS * interval_s) {
        reasons.push(format!(
            "sampled only: the peak lasts {seconds:.2} s and a new value comes every {interval_s:.2} s"
        ));
    }
    let lost = view
        .rows
        .iter()
        .filter(|row| is_of(step, row) && Some(row.role) == view.meter)
        .filter(|row| row.status != Status::Ok && time(row) > from)
        .collect::<Vec<_>>();
    if let Some(first) = lost.first() {
        reasons.push(format!(
            "{} of its rows hold no value (the first, at {:.2} s, {})",
            lost.len(),
            time(first),
            first.status.word()
        ));
    }
    reasons
}

/// How long the current stays above nine tenths of its highest, around that.
fn peak_length(current: &[(f64, f64)]) -> Option<f64> {
    let top = highest(current)?;
    let stretch = current
        .chunk_by(|a, b| (a.1 >= PEAK_ABOVE * top.1) == (b.1 >= PEAK_ABOVE * top.1))
        .find(|chunk| chunk.iter().any(|(t, _)| *t == top.0))?;
    Some(stretch[stretch.len() - 1].0 - stretch[0].0)
}

/// Whether the voltage sags below its later mean while the current is high. The
/// first interval is left out: a mean over the switching itself is no sag.
fn supply_limited(voltage: &[(f64, f64)], current: &[(f64, f64)], from: f64) -> Option<String> {
    let top = highest(current)?.1;
    let later = &voltage[voltage.len() / 2..];
    let settled_v = mean(later)?;
    let high = |t: f64| {
        current
            .iter()
            .find(|(at, _)| *at == t)
            .is_some_and(|(_, amps)| *amps >= 0.5 * top)
    };
    let lowest = voltage
        .iter()
        .filter(|(t, _)| *t >= from && high(*t))
        .map(|(_, volts)| *volts)
        .reduce(f64::min)?;
    let sag = 1.0 - lowest / settled_v;
    (sag > SAG).then(|| {
        format!(
            "the voltage sagged to {lowest:.1} V, {:.1} % below its later {settled_v:.1} V",
            100.0 * sag
        )
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn decay(t: f64) -> f64 {
        10.0 + 40.0 * libm::exp(-t / 20.0)
    }

    #[test]
    fn energy_above_settled_is_the_area_of_the_decay() {
        let power: Track = (0..=6000)
            .map(|i| (f64::from(i) * 0.1, decay(f64::from(i) * 0.1)))
            .collect();
        // 40 W x 20 s = 800 J (computed).
        assert!((above(&power, 10.0) - 800.0 / 3600.0).abs() < 1e-4);
        let half = half_way(&power, 50.0, 10.0, 0.0).unwrap();
        assert!((half - 20.0 * std::f64::consts::LN_2).abs() < 0.11);
        assert_eq!(half_way(&power, 9.0, 10.0, 0.0), None);
    }

    #[test]
    fn a_long_peak_is_seen_whole_and_a_short_one_is_not() {
        let long: Track = (0..100)
            .map(|i| (f64::from(i) * 0.1, decay(f64::from(i) * 0.1)))
            .collect();
        assert!(peak_length(&long).unwrap() > 2.0);
        let mut short = long.clone();
        short[3].1 = 200.0;
        assert_eq!(peak_length(&short), Some(0.0));
    }

    #[test]
    fn a_sagging_supply_is_told() {
        let current: Track = (0..100)
            .map(|i| (f64::from(i), if i < 20 { 10.0 } else { 4.0 }))
            .collect();
        let voltage = |low: f64| -> Track {
            (0..100)
                .map(|i| (f64::from(i), if i < 20 { low } else { 230.0 }))
                .collect()
        };
        assert!(supply_limited(&voltage(222.0), &current, 1.0).is_some());
        assert_eq!(supply_limited(&voltage(224.0), &current, 1.0), None);
        assert_eq!(supply_limited(&[], &current, 1.0), None);
    }
}
