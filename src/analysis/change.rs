//! The voltage change of a switch-on: from its waveform, and from the rows behind that.

use crate::quantity::{Reading, at_most};
use crate::record::{Sample, Status};

use super::budget::Share;
use super::cell::{CellView, time};
use super::fetched::figure;
use super::measured::Gauge;
use super::types::{Change, Estimate, Figure, Steady};
use super::waveform::{COUNTED, Reference, Shape, relative_change};

/// The voltage change on the reference impedance; its relative uncertainty is that of
/// the current that causes it.
///
/// # Errors
/// Why it can't be said.
pub(super) fn change(
    view: &CellView,
    shape: &Shape,
    gauge: &Gauge,
    steady: Option<&Steady>,
) -> Result<Change, String> {
    let reference = Reference::at(view.cell.supply.voltage.get())?;
    let block = shape.voltage_change(reference)?;
    let of = |d: f64| -> Result<Estimate, String> {
        // A current that alone would make this change.
        let per_amp = relative_change(1.0, 0.0, reference);
        let lines = gauge.lines(d / per_amp)?;
        let lines = lines.into_iter().map(|line| line.times(per_amp)).collect();
        Ok(Estimate::combined(d, lines))
    };
    let rows = behind(view, shape, reference);
    let later = Later::of(&rows);
    let higher = later.highest.filter(|(_, d)| *d > block.dmax);
    let half_s = 0.5 / shape.frequency_hz;
    let mut counted = vec![Share::normal(
        "whole half-periods only",
        half_s / libm::sqrt(6.0),
        "s",
    )];
    if later.over_s > 0.0 {
        counted.push(Share::normal(
            "whole rows only",
            later.row_s / libm::sqrt(6.0),
            "s",
        ));
    }
    let begun = view.energised_s().unwrap_or(0.0);
    Ok(Change {
        dmax: of(higher.map_or(block.dmax, |(_, d)| d))?,
        dmax_after_s: higher.map_or(block.dmax_after_s, |(at, _)| at - begun),
        over_s: Estimate::combined(block.over_s + later.over_s, counted),
        still_over: later.still_over.unwrap_or(block.still_over),
        dc: match (&block.dc, steady.and_then(|s| steady_change(s, reference))) {
            (Figure::Known(d), None) => figure(of(*d)),
            (_, Some(d)) => figure(of(d)),
            (Figure::Absent(reason), None) => {
                Figure::Absent(format!("{reason}, and no settled input is known"))
            }
        },
    })
}

/// The change of a settled input.
fn steady_change(steady: &Steady, reference: Reference) -> Option<f64> {
    of_rms(
        steady.power_w.value,
        steady.voltage_v,
        steady.current_a?,
        reference,
    )
}

/// The change that an input makes, what is not active taken for lagging: the larger one.
fn of_rms(watts: f64, volts: f64, amps: f64, reference: Reference) -> Option<f64> {
    (volts > 0.0).then(|| {
        let active = watts / volts;
        let rest = libm::sqrt((amps * amps - active * active).max(0.0));
        relative_change(active, rest, reference)
    })
}

/// Moments and changes of the rows behind a waveform.
fn behind(view: &CellView, shape: &Shape, reference: Reference) -> Vec<(f64, f64)> {
    let Some(begun) = view.energised_s() else {
        return Vec::new();
    };
    let covered = begun + shape.interval_s * (shape.samples - 1) as f64 - shape.t0_s;
    let off = view.energised_until_s().unwrap_or(f64::INFINITY);
    let is_behind = |row: &&&Sample| {
        let meter = Some(row.role) == view.meter && row.status == Status::Ok;
        meter && row.energised && time(row) > covered && time(row) <= off
    };
    let of_row = |row: &&Sample| {
        let get = |reading| row.readings.get(reading);
        let (watts, volts) = (get(Reading::Power)?, get(Reading::Voltage)?);
        let d = of_rms(watts, volts, get(Reading::Current)?, reference)?;
        Some((time(row), d))
    };
    view.rows
        .iter()
        .filter(is_behind)
        .filter_map(of_row)
        .collect()
}

/// What the rows behind a waveform add.
struct Later {
    highest: Option<(f64, f64)>,
    over_s: f64,
    still_over: Option<bool>,
    /// Longest time from one of them to the next, s.
    row_s: f64,
}

impl Later {
    fn of(rows: &[(f64, f64)]) -> Self {
        let steps = || {
            rows.windows(2)
                .map(|pair| (pair[0].1, pair[1].0 - pair[0].0))
        };
        Later {
            highest: super::cell::highest(rows),
            over_s: steps()
                .filter(|(d, _)| !at_most(*d, COUNTED))
                .map(|(_, length)| length)
                .sum(),
            still_over: rows.last().map(|(_, d)| !at_most(*d, COUNTED)),
            row_s: steps().map(|(_, length)| length).fold(0.0, f64::max),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rows_behind_a_waveform_add_their_time_and_their_highest() {
        let rows = [
            (1.0, 0.01),
            (1.5, 0.05),
            (2.0, 0.04),
            (2.5, 0.033),
            (3.0, 0.02),
        ];
        let later = Later::of(&rows);
        assert_eq!(later.highest, Some((1.5, 0.05)));
        assert_eq!((later.over_s, later.row_s), (1.0, 0.5));
        assert_eq!(later.still_over, Some(false));
        assert_eq!(Later::of(&rows[..3]).still_over, Some(true));
        assert_eq!(Later::of(&[]).still_over, None);
    }

    #[test]
    fn an_input_of_rms_values_makes_the_computed_change() {
        // Computed: 10 A -> 1.739130 %; 8 A at power factor 0.6 lagging -> 1.530435 %.
        let reference = Reference::at(230.0).unwrap();
        for (amps, factor, percent) in [(10.0, 1.0, 1.739130), (8.0, 0.6, 1.530435)] {
            let d = of_rms(230.0 * amps * factor, 230.0, amps, reference).unwrap();
            assert!((100.0 * d - percent).abs() < 5e-7, "{d}");
        }
        assert_eq!(of_rms(0.0, 0.0, 1.0, reference), None);
    }
}
