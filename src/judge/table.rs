//! `findings.csv`: a row per finding.

use super::types::{Finding, Judgement};
use crate::quantity::shortest;
use crate::record::defused;
use crate::spec::sequence::RuleWeight;

const HEAD: [&str; 21] = [
    "rule",
    "condition",
    "position",
    "supply",
    "weight",
    "decision",
    "outcome",
    "value",
    "expanded_u",
    "coverage_k",
    "unit",
    "at_least",
    "at_most",
    "margin",
    "probability",
    "conforming_share",
    "consumers_risk",
    "producers_risk",
    "source",
    "reason",
    "rules",
];

/// `findings.csv` in bytes; the unit of value, U, limits and margin stands beside them.
///
/// # Errors
/// Where a row can't be formed.
pub fn findings_csv(judgement: &Judgement) -> Result<Vec<u8>, csv::Error> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    writer.write_record(HEAD)?;
    let rules = judgement
        .other_rules
        .as_deref()
        .map_or_else(|| "fixed before the run".to_owned(), defused);
    for finding in &judgement.findings {
        writer.write_record(row(finding, &rules))?;
    }
    writer
        .into_inner()
        .map_err(|e| csv::Error::from(e.into_error()))
}

fn row(finding: &Finding, rules: &str) -> [String; 21] {
    let number = |value: Option<f64>| value.map_or_else(String::new, shortest);
    let text = |value: &Option<String>| defused(value.as_deref().unwrap_or(""));
    let weight = match finding.weight {
        RuleWeight::Required => "required",
        RuleWeight::Information => "information",
    };
    [
        defused(&finding.rule),
        text(&finding.condition),
        text(&finding.position),
        text(&finding.supply),
        weight.to_owned(),
        text(&finding.decision),
        finding.outcome.word().to_owned(),
        number(finding.value),
        number(finding.expanded),
        number(finding.coverage),
        defused(&finding.unit),
        number(finding.at_least),
        number(finding.at_most),
        number(finding.margin),
        number(finding.probability),
        number(finding.risks.as_ref().map(|risks| risks.conforming)),
        number(finding.risks.as_ref().map(|risks| risks.consumer)),
        number(finding.risks.as_ref().map(|risks| risks.producer)),
        defused(&finding.source),
        defused(&finding.reason),
        rules.to_owned(),
    ]
}
