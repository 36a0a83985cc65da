//! The waveform of a cell: what it says, with uncertainty from the meter's accuracy.

use crate::quantity::Reading;
use crate::record::Event;

use super::Input;
use super::cell::CellView;
use super::change;
use super::measured::Gauge;
use super::types::{Estimate, Figure, Harmonic, Steady, Wave};
use super::waveform::{HalfPeriod, Shape, shape};

/// What the waveform of a cell says, or why there is none.
pub(super) fn wave(input: &Input, view: &CellView, steady: Option<&Steady>) -> Figure<Wave> {
    match fetched(input, view, steady) {
        Ok(wave) => Figure::Known(wave),
        Err(reason) => Figure::Absent(reason),
    }
}

fn fetched(input: &Input, view: &CellView, steady: Option<&Steady>) -> Result<Wave, String> {
    let stored = input.waveforms.iter().find(|w| w.cell == view.index);
    let Some(stored) = stored else {
        return Err(why_none(view));
    };
    let gauge = view
        .meter
        .and_then(|role| Gauge::of(view.plan, role, Reading::Current))
        .ok_or("there is no power meter")?;
    let hertz = view.cell.supply.frequency.get();
    let shape = shape(&stored.wave, hertz, gauge.floor())
        .map_err(|reason| format!("the waveform says nothing: {reason}"))?;
    let (peak_rms, peak_rms_after_s) = highest_period(&shape)
        .ok_or("the waveform says nothing: it holds no whole period after the first current")?;
    let of = |amps: f64| gauge.estimate(amps);
    let harmonic = shape.class_a().and_then(|found| {
        // The accuracy on the range that the whole current needs.
        let lines = gauge.lines(shape.tail.rms_a)?;
        Ok(Harmonic {
            number: found.harmonic,
            rms_a: Estimate::combined(found.rms_a, lines),
            limit_a: found.limit_a,
            compared: found.compared,
        })
    });
    let change = change::change(view, &shape, &gauge, steady);
    Ok(Wave {
        momentary_peak_a: of(shape.peak_a)?,
        peak_rms_a: of(peak_rms)?,
        peak_rms_after_s,
        length_s: shape.interval_s * (shape.samples - 1) as f64,
        harmonic: figure(harmonic),
        change: figure(change),
        shape,
    })
}

/// Known, or absent with its reason.
pub(super) fn figure<T>(result: Result<T, String>) -> Figure<T> {
    match result {
        Ok(value) => Figure::Known(value),
        Err(reason) => Figure::Absent(reason),
    }
}

fn why_none(view: &CellView) -> String {
    let failed = view.happenings.iter().find_map(|h| match &h.event {
        Event::WaveformFailed { cell, reason } if *cell == view.index => Some(reason),
        _ => None,
    });
    match failed {
        Some(reason) => format!("the waveform was not fetched: {reason}"),
        None => "no waveform was taken".to_owned(),
    }
}

/// The highest RMS over two half-periods in turn, and when they began after the first
/// current. A load behind a diode draws in one of them only.
fn highest_period(shape: &Shape) -> Option<(f64, f64)> {
    let rms = |pair: &[HalfPeriod]| {
        let squares = pair.iter().map(|half| half.rms_a * half.rms_a);
        libm::sqrt(0.5 * squares.sum::<f64>())
    };
    let periods = shape.half_periods.windows(2);
    let all = periods.map(|pair| (rms(pair), (pair[0].from_s - shape.t0_s).max(0.0)));
    all.reduce(|top, next| if next.0 > top.0 { next } else { top })
}
