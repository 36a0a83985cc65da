//! Polling intervals and soaks, step by step as they are written.

use super::notes::Notes;
use super::resolve::written_steps;
use super::wiring::Wired;
use crate::quantity::Seconds;
use crate::spec::Place;
use crate::spec::sequence::{CriterionKind, RoleKind, Sequence, Soak, StepAction};

/// Longest polling interval while energised: a slower one would trip too late (house default).
const SLOWEST_ENERGISED: Seconds = Seconds::whole(10);

/// Three readings, each at least 5 min after the one before (UL 1278 39.1.8 in a restatement).
const THREE_READINGS: Seconds = Seconds::whole(600);

/// The sampling method's shortest log (IEC 62301 ed. 2, from memory).
const SAMPLING: Seconds = Seconds::whole(900);
const SAMPLING_MOST: Seconds = Seconds::whole(10_800);

/// A slope over fewer rows says nothing of its own uncertainty (house default).
const SLOPE_ROWS: f64 = 6.0;

/// Settling looks at means over this long at least, seconds.
const FINEST_S: f64 = 5.0;

/// Whether a step's interval is asked while the unit is energised.
#[derive(Clone, Copy, PartialEq, Eq)]
enum While {
    Energised,
    Off,
}

/// Reports intervals that are too fast for the meter or too slow for the guards, and
/// soaks that their criterion does not fit into.
pub(super) fn intervals(sequence: &Sequence, wired: &Wired, notes: &mut Notes) {
    let meter = wired
        .bay
        .roles
        .iter()
        .find(|r| r.kind == RoleKind::PowerMeter);
    let update = meter.map(|role| wired.instruments[role.instrument].driver.update_interval);
    for step in written_steps(sequence) {
        let place = &step.verb.place;
        if let Some((every, when)) = interval_of(&step.action) {
            if let Some(update) = update {
                not_too_fast(place, &step.verb.value, every, update, notes);
            }
            if when == While::Energised {
                not_too_slow(place, every, notes);
            }
        }
        if let StepAction::Soak(soak) = &step.action {
            criterion_fits(place, soak, notes);
        }
    }
}

fn interval_of(action: &StepAction) -> Option<(Seconds, While)> {
    match action {
        StepAction::Inrush(timed) | StepAction::Measure(timed) | StepAction::RunIn(timed) => {
            Some((timed.every, While::Energised))
        }
        StepAction::Soak(soak) => Some((soak.every, While::Energised)),
        StepAction::Abnormal(abnormal) => Some((abnormal.every, While::Energised)),
        StepAction::Acclimatise(waiting) | StepAction::Rest(waiting) => {
            Some((waiting.every, While::Off))
        }
        _ => None,
    }
}

fn not_too_fast(place: &Place, verb: &str, every: Seconds, update: Seconds, notes: &mut Notes) {
    if every < update {
        notes.warning(
            place,
            format!(
                "`{verb}` asks every {every}, and the power meter has a new value every {update}"
            ),
            format!("write `every: {update}` or more; the meter is asked at its own interval"),
        );
    }
}

fn not_too_slow(place: &Place, every: Seconds, notes: &mut Notes) {
    if every > SLOWEST_ENERGISED {
        notes.error(
            place,
            format!("polled every {every} while energised: a guard would trip too late"),
            format!("poll at least every {SLOWEST_ENERGISED} (house default)"),
        );
    }
}

fn criterion_fits(place: &Place, soak: &Soak, notes: &mut Notes) {
    let (needs, what) = match soak.until.kind {
        CriterionKind::Slope { window } => (window, "window"),
        CriterionKind::ChangeWithin { interval } => (interval, "interval"),
        CriterionKind::ThreeReadings => (THREE_READINGS, "three readings"),
        CriterionKind::SamplingMethod => (SAMPLING, "log"),
    };
    if let CriterionKind::Slope { window } = soak.until.kind {
        // Readings faster than that are worth no more.
        let rows = (window.get() / soak.every.get().max(FINEST_S) + 1e-9).floor();
        if rows < SLOPE_ROWS {
            notes.error(
                place,
                format!(
                    "a reading every {} leaves {rows:.0} means of at least {FINEST_S} s in the criterion's window of {window}, and a slope needs {SLOPE_ROWS}: it can never settle",
                    soak.every
                ),
                "widen the `window`, poll faster, or take `three readings` or `change within`",
            );
        }
    }
    if soak.until.kind == CriterionKind::SamplingMethod && soak.at_most > SAMPLING_MOST {
        notes.warning(
            place,
            format!("the sampling method gives up after {SAMPLING_MOST}"),
            format!("write `at most: {SAMPLING_MOST}`, or take another criterion"),
        );
    }
    if needs > soak.at_most {
        notes.error(
            place,
            format!(
                "the criterion's {what} of {needs} does not fit into `at most`, {}: it can never settle",
                soak.at_most
            ),
            format!("write `at most:` well above {needs}"),
        );
    } else if needs > soak.at_least {
        notes.warning(
            place,
            format!(
                "the criterion's {what} of {needs} is longer than `at least`, {}",
                soak.at_least
            ),
            format!("write `at least: {needs}` or more: the soak can't end earlier in any case"),
        );
    }
}
