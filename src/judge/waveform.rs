//! Findings that rest on the waveform of a switch-on.

use crate::analysis::{CellResult, Estimate, Figure, Wave};
use crate::spec::sequence::RuleKind;

use super::finding::Draft;
use super::rules::{Ask, certainly_above, upper};
use super::types::{Finding, Outcome};

/// Findings of a rule that needs a waveform; one for each limit that it states.
pub(super) fn findings(ask: &Ask, draft: &Draft, kind: &RuleKind) -> Vec<Finding> {
    match kind {
        RuleKind::MomentaryInrush { at_most } => {
            let means = "its momentary inrush is too high";
            let draft = draft.clone().compares(upper(at_most.get()), "A", means);
            ask.each(&draft, momentary)
        }
        RuleKind::HarmonicsClassA => ask.each(draft, harmonic),
        RuleKind::VoltageChange {
            dmax,
            dc,
            time_above,
        } => {
            let limit = |what: &str, limit: Option<f64>, unit, one: Reads| {
                limit.map_or_else(Vec::new, |limit| {
                    let means = format!("its {what} is too large, by this one switch-on");
                    let mut draft = draft.clone().compares(upper(limit), unit, &means);
                    draft.rule = format!("{}, {what}", draft.rule);
                    ask.each(&draft, |draft, result| change(draft, result, one))
                })
            };
            let percent = |limit: crate::quantity::Ratio| 100.0 * limit.get();
            [
                limit("dmax", dmax.map(percent), "%", |wave| {
                    let change = known(&wave.change)?;
                    Ok((change.dmax.scaled(100.0), None))
                }),
                limit("dc", dc.map(percent), "%", |wave| {
                    let dc = known(&known(&wave.change)?.dc)?;
                    Ok((dc.scaled(100.0), None))
                }),
                limit(
                    "time above 3.3 %",
                    time_above.map(|time| time.get()),
                    "s",
                    |wave| {
                        let change = known(&wave.change)?;
                        let longer = change
                            .still_over
                            .then_some("it was still above 3.3 % when the readings ended");
                        Ok((change.over_s.clone(), longer))
                    },
                ),
            ]
            .concat()
        }
        _ => Vec::new(),
    }
}

/// A value of a waveform, and why it is a lower bound only.
type Value = (Estimate, Option<&'static str>);
type Reads = fn(&Wave) -> Result<Value, String>;

fn known<T>(figure: &Figure<T>) -> Result<&T, String> {
    match figure {
        Figure::Known(value) => Ok(value),
        Figure::Absent(reason) => Err(reason.clone()),
    }
}

/// The waveform of a cell, or why nothing of it can be judged.
fn wave(result: &CellResult) -> Result<&Wave, String> {
    known(&result.energised_s)?;
    if let Some(reason) = &result.dc_lost {
        return Err(reason.clone());
    }
    known(&result.waveform)
}

/// Why a switch-on is not the one that a limit is for.
fn not_from_cold(result: &CellResult) -> Result<(), String> {
    if let Figure::Absent(reason) = &result.cold_start {
        return Err(format!("it was no cold start: {reason}"));
    }
    let limited = result
        .inrush
        .known()
        .and_then(|i| i.supply_limited.as_ref());
    match limited {
        Some(reason) => Err(format!("the supply limited it: {reason}")),
        None => Ok(()),
    }
}

fn momentary(draft: &Draft, result: &CellResult) -> Finding {
    let found = wave(result).and_then(|wave| not_from_cold(result).map(|()| wave));
    let wave = match found {
        Ok(wave) => wave,
        Err(reason) => return draft.not_judged(Some(&result.cell), &reason),
    };
    let rises_on = result.inrush.known().is_some_and(|i| !i.from_waveform);
    let late = if wave.shape.begins_late {
        Some("the waveform begins with current already flowing")
    } else {
        rises_on.then_some("the current rose on when the waveform had ended")
    };
    decided(draft, result, &wave.momentary_peak_a, late)
}

fn harmonic(draft: &Draft, result: &CellResult) -> Finding {
    let cell = Some(&result.cell);
    let harmonic = match wave(result).and_then(|wave| known(&wave.harmonic)) {
        Ok(harmonic) => harmonic,
        Err(reason) => return draft.not_judged(cell, &reason),
    };
    let number = harmonic.number;
    let means = format!("its harmonic {number} is too high, by this one switch-on");
    let mut draft = draft.clone().compares(upper(harmonic.limit_a), "A", &means);
    draft.rule = format!("{}, harmonic {number}", draft.rule);
    let finding = draft.decided(cell, &harmonic.rms_a);
    if harmonic.compared >= 39 || finding.outcome != Outcome::Pass {
        return finding;
    }
    let told = harmonic.compared + 1;
    Finding {
        outcome: Outcome::NotJudged,
        reason: format!("the samples lie too far apart: only {told} of 40 harmonics are told"),
        probability: None,
        ..finding
    }
}

fn change(draft: &Draft, result: &CellResult, reads: Reads) -> Finding {
    let found = wave(result)
        .and_then(|wave| not_from_cold(result).map(|()| wave))
        .and_then(reads);
    match found {
        Ok((value, longer)) => decided(draft, result, &value, longer),
        Err(reason) => draft.not_judged(Some(&result.cell), &reason),
    }
}

/// A lower bound can exceed a limit, never meet it.
fn decided(
    draft: &Draft,
    result: &CellResult,
    value: &Estimate,
    lower_bound: Option<&str>,
) -> Finding {
    let finding = draft.decided(Some(&result.cell), value);
    match lower_bound {
        Some(reason) if !certainly_above(value, draft.limits) => Finding {
            outcome: Outcome::NotJudged,
            probability: None,
            reason: format!("it is a lower bound only: {reason}"),
            ..finding
        },
        _ => finding,
    }
}
