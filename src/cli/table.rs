//! The verdict as a table for a terminal of 80 columns or more.

use crate::analysis::{Analysis, CellResult, Figure};
use crate::judge::{Finding, Judgement, Outcome};
use crate::plan::Plan;
use crate::record::{Folder, RunOutcome};
use crate::spec::sequence::RuleWeight;

use super::progress::cell_words;

/// Everything that a person wants to see first.
pub fn verdict_table(folder: &Folder, analysis: &Analysis, judgement: &Judgement) -> String {
    let mut lines = Vec::new();
    lines.push(String::new());
    if let Some(mark) = &folder.manifest.virtual_bench {
        lines.push(format!("{mark}: no evidence about a real unit"));
    }
    lines.push(format!(
        "{}, unit {} ({}, edition {})",
        folder.plan.appliance.model, folder.manifest.unit, folder.plan.title, folder.plan.edition
    ));
    lines.push(String::new());
    lines.extend(results(&folder.plan, analysis));
    lines.push(String::new());
    lines.extend(findings(&judgement.findings));
    lines.push(String::new());
    lines.extend(wrapped("limits     ", &judgement.convention));
    if let Some(other) = &judgement.other_rules {
        lines.extend(wrapped("RULES      ", other));
    }
    for mark in &judgement.marks {
        lines.extend(wrapped(
            "UNIT       ",
            &format!("{}: {}", mark.word().to_uppercase(), mark.by()),
        ));
    }
    if let Some(ended) = ended(&folder.manifest.outcome) {
        lines.push(ended);
    }
    lines.push(format!(
        "VERDICT    {}",
        judgement.verdict.word().to_uppercase()
    ));
    lines.extend(wrapped("because    ", &judgement.because));
    lines.join("\n")
}

fn ended(outcome: &RunOutcome) -> Option<String> {
    match outcome {
        RunOutcome::Complete => None,
        RunOutcome::Tripped { reason, .. } => Some(format!("the run tripped: {reason}")),
        RunOutcome::Stopped => Some("the run was stopped by the operator".to_owned()),
        RunOutcome::Failed { reason } => Some(format!("the run failed: {reason}")),
        RunOutcome::Interrupted => Some("the run was interrupted and closed afterwards".to_owned()),
    }
}

fn results(plan: &Plan, analysis: &Analysis) -> Vec<String> {
    let head = ["cell", "inrush", "settled", "steady power", "body, highest"];
    let rows = analysis.cells.iter().map(result_row).collect::<Vec<_>>();
    let mut lines = aligned(&head, &rows);
    lines.extend(plate_line(plan));
    lines.extend(analysis.cells.iter().flat_map(remarks));
    lines
}

/// What a cell's settled input must not be read without.
fn remarks(cell: &CellResult) -> Vec<String> {
    let Some(steady) = cell.steady.known() else {
        return Vec::new();
    };
    let mut remarks = Vec::new();
    if steady.extrapolated {
        remarks.push(steady.criterion.clone());
    }
    if steady.duty < 0.999 {
        remarks.push(format!(
            "on for {} % of the time, mean {} W ({})",
            digits(100.0 * steady.duty, 3),
            digits(steady.mean_w, 4),
            steady.mean_from
        ));
    }
    let label = format!("{}: ", cell_words(&cell.cell));
    remarks
        .iter()
        .flat_map(|remark| wrapped("  ", &format!("{label}{remark}")))
        .collect()
}

fn plate_line(plan: &Plan) -> Option<String> {
    let entry = |p: &crate::plan::PlannedPlate| {
        let power = if p.power.low == p.power.high {
            p.power.low.to_string()
        } else {
            format!("{} to {}", p.power.low, p.power.high)
        };
        format!("{} {power}", p.position)
    };
    let entries: Vec<String> = plan.appliance.plate.iter().map(entry).collect();
    (!entries.is_empty()).then(|| format!("plate: {}", entries.join(", ")))
}

fn result_row(cell: &CellResult) -> Vec<String> {
    vec![
        cell_words(&cell.cell),
        shown(&cell.inrush, |inrush| {
            format!("{} A", digits(inrush.peak_a.value, 3))
        }),
        shown(&cell.settled_s, |s| format!("{} min", digits(s / 60.0, 3))),
        shown(&cell.steady, |steady| {
            format!(
                "{} +-{} W",
                digits(steady.power_w.value, 4),
                digits(steady.power_w.expanded, 2)
            )
        }),
        shown(&cell.body_peak, |peak| {
            let value = &peak.temperature_degc;
            format!(
                "{} +-{} °C",
                decimals(value.value, 1),
                decimals(value.expanded, 1)
            )
        }),
    ]
}

fn shown<T>(figure: &Figure<T>, text: impl Fn(&T) -> String) -> String {
    figure.known().map_or_else(|| "-".to_owned(), text)
}

fn findings(findings: &[Finding]) -> Vec<String> {
    let head = [
        "finding", "value", "limits", "margin", "conforms", "decision", "outcome",
    ];
    let supplies: Vec<&String> = findings.iter().filter_map(|f| f.supply.as_ref()).collect();
    let several = supplies.windows(2).any(|pair| pair[0] != pair[1]);
    let rows: Vec<Vec<String>> = findings
        .iter()
        .map(|finding| finding_row(finding, several))
        .collect();
    let mut lines = aligned(&head, &rows);
    for finding in findings {
        if let Some(risks) = &finding.risks {
            lines.extend(wrapped(
                "  ",
                &format!(
                    "{}: for the stated process {:.2} % of units conform; {:.3} % are accepted and do not, {:.3} % conform and are not accepted",
                    finding.rule,
                    100.0 * risks.conforming,
                    100.0 * risks.consumer,
                    100.0 * risks.producer
                ),
            ));
        }
        if finding.outcome != Outcome::Pass && !finding.reason.is_empty() {
            lines.extend(wrapped(
                "  ",
                &format!("{}: {}", finding.rule, finding.reason),
            ));
        }
    }
    lines
}

/// A finding's row; `several` where the supplies have to be told apart.
fn finding_row(finding: &Finding, several: bool) -> Vec<String> {
    let unit = &finding.unit;
    let with_unit = |value: f64| format!("{} {unit}", digits(value, 4)).trim_end().to_owned();
    let mut rule = finding.rule.clone();
    let supply = finding.supply.as_ref().filter(|_| several);
    let place: Vec<&str> = finding
        .condition
        .iter()
        .chain(supply)
        .map(String::as_str)
        .collect();
    if !place.is_empty() {
        rule = format!("{rule} ({})", place.join(", "));
    }
    if finding.weight == RuleWeight::Information {
        rule = format!("{rule} [information]");
    }
    let value = match (finding.value, finding.expanded) {
        (Some(value), Some(u)) => format!("{} +-{} {unit}", digits(value, 4), digits(u, 2)),
        (Some(value), None) => with_unit(value),
        (None, _) => "-".to_owned(),
    };
    let limits = match (finding.at_least, finding.at_most) {
        (Some(low), Some(high)) => format!("{} to {}", digits(low, 4), with_unit(high)),
        (Some(low), None) => format!("from {}", with_unit(low)),
        (None, Some(high)) => format!("to {}", with_unit(high)),
        (None, None) => "-".to_owned(),
    };
    let margin = finding.margin.map_or_else(
        || "-".to_owned(),
        |m| format!("{m:+.2} {}", finding.margin_unit()),
    );
    vec![
        rule,
        value,
        limits,
        margin,
        finding.probability.map_or_else(|| "-".to_owned(), likely),
        finding.decision.clone().map_or_else(
            || "-".to_owned(),
            |decision| decision.split(" (").next().unwrap_or_default().to_owned(),
        ),
        finding.outcome.word().to_owned(),
    ]
}

/// A probability of conformity for people: never a plain 100 %.
fn likely(probability: f64) -> String {
    match 100.0 * probability {
        p if p > 99.99 => ">99.99 %".to_owned(),
        p if p < 0.01 => "<0.01 %".to_owned(),
        p => format!("{p:.2} %"),
    }
}

/// Columns as wide as their widest cell, two blanks between.
fn aligned(head: &[&str], rows: &[Vec<String>]) -> Vec<String> {
    let width = |column: usize| {
        let cells = rows.iter().map(|row| row[column].chars().count());
        cells
            .chain([head[column].chars().count()])
            .max()
            .unwrap_or(0)
    };
    let widths: Vec<usize> = (0..head.len()).map(width).collect();
    let line = |cells: Vec<&str>| {
        let padded = cells
            .iter()
            .zip(&widths)
            .map(|(cell, width)| format!("{cell}{}", " ".repeat(width - cell.chars().count())));
        padded.collect::<Vec<_>>().join("  ").trim_end().to_owned()
    };
    let rule: Vec<String> = widths.iter().map(|width| "-".repeat(*width)).collect();
    let mut lines = vec![
        line(head.to_vec()),
        line(rule.iter().map(String::as_str).collect()),
    ];
    lines.extend(
        rows.iter()
            .map(|row| line(row.iter().map(String::as_str).collect())),
    );
    lines
}

/// A text in lines of at most 80 columns behind a label.
fn wrapped(label: &str, text: &str) -> Vec<String> {
    let indent = " ".repeat(label.chars().count());
    let mut lines = vec![label.to_owned()];
    let mut empty = true;
    for word in text.split_whitespace() {
        let line = lines.last_mut().expect("there is a first line");
        if !empty && line.chars().count() + 1 + word.chars().count() > 80 {
            lines.push(format!("{indent}{word}"));
            continue;
        }
        if !empty {
            line.push(' ');
        }
        line.push_str(word);
        empty = false;
    }
    lines
}

/// A number in so many significant digits, without an exponent.
fn digits(value: f64, significant: i32) -> String {
    if value == 0.0 || !value.is_finite() {
        return "0".to_owned();
    }
    let magnitude = value.abs().log10().floor() as i32;
    decimals(value, (significant - 1 - magnitude).clamp(0, 6) as usize)
}

fn decimals(value: f64, places: usize) -> String {
    format!("{value:.places$}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_keep_their_significant_digits() {
        assert_eq!(digits(9.0312, 4), "9.031");
        assert_eq!(digits(1500.4, 4), "1500");
        assert_eq!(digits(0.0123, 2), "0.012");
        assert_eq!(digits(0.0, 3), "0");
        assert_eq!(digits(-0.56, 2), "-0.56");
    }

    #[test]
    fn a_long_reason_is_wrapped_behind_its_label() {
        let text = "word ".repeat(40);
        let lines = wrapped("because    ", &text);
        assert!(lines.len() > 2 && lines.iter().all(|line| line.chars().count() <= 80));
        assert!(lines[1].starts_with("           word"));
    }
}
