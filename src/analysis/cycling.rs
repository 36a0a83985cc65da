//! A load that a thermostat switches: when it is on, its mean over whole cycles, its
//! duty, and the input that stands for a representative period.

use super::cell::{Track, highest, within};

/// A load is on above this share of its highest power.
pub(super) const ON: f64 = 0.5;
/// Whole cycles that on-state power, cycle mean and duty need.
const FEWEST_CYCLES: usize = 4;
/// An energy counter further than this from the rows is not believed (house default).
const COUNTER_AGREES: f64 = 0.1;
/// The clause's own numbers (IEC 60335-1 clause 10.1, from memory).
const TIMES_THE_MEAN: f64 = 2.0;
const EXCEEDED_FOR: f64 = 0.1;

/// What a window says of a load that may cycle.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct OnTimes {
    /// Stretches with power, their first and last rows left out where it cycles.
    pub(super) stretches: Vec<(f64, f64)>,
    /// Share of the time of whole cycles in which it is on.
    pub(super) duty: f64,
    /// Mean power over them.
    pub(super) mean_w: f64,
    /// What the mean rests on, in words.
    pub(super) mean_from: String,
    /// The input of a representative period, and how it was found.
    pub(super) representative: Option<(f64, String)>,
}

/// On times over the window's power and energy rows.
///
/// # Errors
/// Fewer than four whole cycles of a load that cycles, in words.
pub(super) fn on_times(
    thermostat: bool,
    power: &[(f64, f64)],
    energy: &[(f64, f64)],
) -> Result<OnTimes, String> {
    let (Some(first), Some(last)) = (power.first(), power.last()) else {
        return Err("no power was read in the settled window".to_owned());
    };
    let threshold = ON * highest(power).map_or(0.0, |(_, p)| p);
    let is_on = |p: &(f64, f64)| p.1 > threshold;
    if !thermostat || power.iter().all(is_on) {
        let (mean_w, mean_from) = mean_power(power, energy);
        return Ok(OnTimes {
            stretches: vec![(first.0, last.0)],
            duty: 1.0,
            mean_w,
            mean_from,
            representative: representative(power),
        });
    }
    let begins: Vec<usize> = (1..power.len())
        .filter(|i| is_on(&power[*i]) && !is_on(&power[i - 1]))
        .collect();
    let cycles = begins.len().saturating_sub(1);
    let (Some(from), Some(to)) = (begins.first(), begins.last()) else {
        return Err("its thermostat shows no cycle in the settled window".to_owned());
    };
    if cycles < FEWEST_CYCLES {
        return Err(format!(
            "its thermostat shows {cycles} of {FEWEST_CYCLES} whole cycles in the settled window"
        ));
    }
    let whole = &power[*from..=*to];
    let (mean_w, mean_from) = mean_power(whole, energy);
    let on: f64 = weights(whole)
        .zip(whole)
        .filter(|(_, row)| is_on(row))
        .map(|(weight, _)| weight)
        .sum();
    Ok(OnTimes {
        stretches: stretches(power, is_on),
        duty: on / (whole[whole.len() - 1].0 - whole[0].0),
        mean_w,
        mean_from: format!("{cycles} whole cycles, {mean_from}"),
        representative: representative(whole),
    })
}

/// A row that straddles the switching holds a part of both states.
fn stretches(power: &[(f64, f64)], is_on: impl Fn(&(f64, f64)) -> bool) -> Vec<(f64, f64)> {
    power
        .chunk_by(|a, b| is_on(a) == is_on(b))
        .filter(|chunk| is_on(&chunk[0]))
        .filter_map(|chunk| match chunk {
            [_, inner @ .., _] if !inner.is_empty() => Some((inner[0].0, inner[inner.len() - 1].0)),
            _ => None,
        })
        .collect()
}

/// The time for which each row stands: half of the way to its neighbours.
fn weights(track: &[(f64, f64)]) -> impl Iterator<Item = f64> + '_ {
    (0..track.len()).map(|i| {
        let before = track[i.saturating_sub(1)].0;
        let after = track[(i + 1).min(track.len() - 1)].0;
        0.5 * (after - before)
    })
}

/// Mean by time: an energy counter's where there is one that agrees, else the rows'.
fn mean_power(power: &[(f64, f64)], energy: &[(f64, f64)]) -> (f64, String) {
    let rows = by_time(power);
    let words = || "rows weighted by time".to_owned();
    let (from, to) = (power[0].0, power[power.len() - 1].0);
    let counted = counted(within(energy, from, to), to - from);
    match counted {
        None => (rows, words()),
        Some(counted) if (counted - rows).abs() <= COUNTER_AGREES * rows.abs() => {
            (counted, "energy counter".to_owned())
        }
        Some(counted) => (
            rows,
            format!(
                "{}; the energy counter says {counted:.3} W and is not believed",
                words()
            ),
        ),
    }
}

/// Power from a counter whose rows cover at least nine tenths of a stretch.
fn counted(energy: &[(f64, f64)], length_s: f64) -> Option<f64> {
    let (first, last) = (energy.first()?, energy.last()?);
    let covered = last.0 - first.0;
    (covered > 0.0 && covered >= 0.9 * length_s).then(|| (last.1 - first.1) * 3600.0 / covered)
}

fn by_time(power: &[(f64, f64)]) -> f64 {
    let total = power[power.len() - 1].0 - power[0].0;
    let sum: f64 = weights(power).zip(power).map(|(w, p)| w * p.1).sum();
    if total > 0.0 { sum / total } else { power[0].1 }
}

/// Where the maximum exceeds twice the mean, the value exceeded for more than 10 % of
/// the period; else the mean (IEC 60335-1 clause 10.1, from memory).
fn representative(power: &[(f64, f64)]) -> Option<(f64, String)> {
    let mean = by_time(power);
    let (_, top) = highest(power)?;
    if top <= TIMES_THE_MEAN * mean {
        let how = "the mean: the maximum is not above twice the mean".to_owned();
        return Some((mean, how));
    }
    let mut falling: Track = weights(power).zip(power).map(|(w, p)| (w, p.1)).collect();
    falling.sort_by(|a, b| b.1.total_cmp(&a.1));
    let total: f64 = falling.iter().map(|(weight, _)| weight).sum();
    let mut exceeded = 0.0;
    let value = falling.iter().find(|(weight, _)| {
        exceeded += weight;
        exceeded > EXCEEDED_FOR * total
    })?;
    let how = "the value exceeded for more than 10 % of the period: the maximum is above twice \
               the mean";
    Some((value.1, how.to_owned()))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// On for `on` of every `period` rows, a row each second, from the off state on.
    fn switching(cycles: usize, on: usize, period: usize, watts: f64) -> Track {
        let rows = (cycles + 1) * period + 1;
        (0..rows)
            .map(|i| {
                let is_on = i % period >= period - on;
                (i as f64, if is_on { watts } else { 0.0 })
            })
            .collect()
    }

    #[test]
    fn four_whole_cycles_give_mean_and_duty_and_three_do_not() {
        let four = on_times(true, &switching(4, 100, 300, 60.0), &[]).unwrap();
        assert!((four.duty - 1.0 / 3.0).abs() < 1e-3, "{}", four.duty);
        assert!((four.mean_w - 20.0).abs() < 0.1, "{}", four.mean_w);
        assert_eq!(four.mean_from, "4 whole cycles, rows weighted by time");
        assert_eq!(four.stretches.len(), 5);
        let three = on_times(true, &switching(3, 100, 300, 60.0), &[]).unwrap_err();
        assert_eq!(
            three,
            "its thermostat shows 3 of 4 whole cycles in the settled window"
        );
    }

    // Rows come ten times as fast while it is on: a plain mean of rows would say 52 W.
    #[test]
    fn a_mean_is_weighted_by_time() {
        let mut power = Track::new();
        for cycle in 0..6 {
            let t = 300.0 * f64::from(cycle);
            power.extend((0..20).map(|i| (t + 10.0 * f64::from(i), 0.0)));
            power.extend((0..100).map(|i| (t + 200.0 + f64::from(i), 60.0)));
        }
        let found = on_times(true, &power, &[]).unwrap();
        assert!((found.mean_w - 20.0).abs() < 1.0, "{}", found.mean_w);
        assert!((found.duty - 1.0 / 3.0).abs() < 0.02, "{}", found.duty);
    }

    #[test]
    fn the_energy_counter_gives_the_mean_unless_it_stands_still_or_stops() {
        let power = switching(5, 100, 300, 60.0);
        let mut total = 0.0;
        let counting: Track = power
            .iter()
            .map(|(t, watts)| {
                total += 1.01 * watts / 3600.0;
                (*t, total)
            })
            .collect();
        let found = on_times(true, &power, &counting).unwrap();
        assert!((found.mean_w - 20.2).abs() < 0.1, "{}", found.mean_w);
        assert_eq!(found.mean_from, "5 whole cycles, energy counter");
        let frozen: Track = power.iter().map(|(t, _)| (*t, 7.0)).collect();
        let found = on_times(true, &power, &frozen).unwrap();
        assert!((found.mean_w - 20.0).abs() < 0.1);
        assert!(found.mean_from.contains("0.000 W and is not believed"));
        let half = &counting[..counting.len() / 2];
        let found = on_times(true, &power, half).unwrap();
        assert_eq!(found.mean_from, "5 whole cycles, rows weighted by time");
    }

    // Computed by hand from the clause's words.
    #[test]
    fn a_representative_period_takes_the_mean_or_what_is_exceeded_for_a_tenth() {
        let of = |on: usize| {
            let found = on_times(true, &switching(5, on, 300, 60.0), &[]).unwrap();
            found.representative.unwrap()
        };
        // Two thirds on: 60 W is below twice 40 W.
        let (value, how) = of(200);
        assert!((value - 40.0).abs() < 0.1 && how.starts_with("the mean"));
        // One third on: 60 W exceeds twice 20 W, and is there for more than a tenth.
        assert_eq!(of(100).0, 60.0);
        // On for a fifteenth: nothing is exceeded for a tenth of the time but nothing.
        assert_eq!(of(20).0, 0.0);
    }

    #[test]
    fn a_load_that_does_not_cycle_is_on_all_the_time() {
        let steady: Track = (0..60).map(|i| (f64::from(i), 9.0)).collect();
        let found = on_times(false, &steady, &[]).unwrap();
        assert_eq!((found.duty, found.mean_w), (1.0, 9.0));
        assert_eq!(found.representative.unwrap().0, 9.0);
        assert!(on_times(true, &[], &[]).is_err());
    }
}
