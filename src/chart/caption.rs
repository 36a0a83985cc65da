//! What cells and findings are called in pictures and file names, and which
//! finding belongs to which cell.

use super::Scene;
use super::ink::{Ink, Marker};
use super::words::{clean, safe_name, squeezed};
use crate::judge::{Finding, Outcome};
use crate::plan::{Cell, PlannedRule};
use crate::spec::sequence::{RuleKind, RuleWeight};

/// A supply in words: `230 V, 50 Hz`.
pub fn supply(cell: &Cell) -> String {
    format!("{}, {}", cell.supply.voltage, cell.supply.frequency)
}

/// A cell in words: `high · refill full · 230 V, 50 Hz`.
pub fn cell(cell: &Cell) -> String {
    let condition = cell.condition.as_deref().map(clean);
    let parts = [Some(clean(&cell.position)), condition, Some(supply(cell))];
    parts.into_iter().flatten().collect::<Vec<_>>().join(" · ")
}

/// A safe file name for the picture `kind` of cell `index`; the number keeps names
/// apart whose words differ only in what a file name cannot hold.
pub fn file_name(scene: &Scene, kind: &str, index: usize) -> String {
    let mut words = format!("{kind} {:02}", index + 1);
    if let Some(cell) = scene.plan.cells.get(index) {
        for part in [cell.condition.as_deref(), Some(cell.position.as_str())] {
            words.push(' ');
            words.push_str(&safe_name(part.unwrap_or_default()));
        }
        let supply = format!(
            " {}V {}Hz",
            cell.supply.voltage.get(),
            cell.supply.frequency.get()
        );
        words.push_str(&supply);
    }
    format!("{}.png", safe_name(&words))
}

/// What a finding is about, by the first words of its rule.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum About {
    Power,
    Holding,
    Opening,
}

impl About {
    /// What `finding` is about, where it is one of these.
    pub fn of(finding: &Finding) -> Option<About> {
        let rule = finding.rule.to_lowercase();
        if rule.starts_with("power") {
            Some(About::Power)
        } else if rule.contains("holding") {
            Some(About::Holding)
        } else if rule.contains("opening") {
            Some(About::Opening)
        } else {
            None
        }
    }
}

/// What a judgement says of a cell.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Said<'a> {
    /// A finding is about this very cell.
    Here(&'a Finding),
    /// A rule is for this cell too, but judges the worst condition: another one.
    Elsewhere(&'a Finding),
}

impl<'a> Said<'a> {
    /// About `about` in cell `index`: the required finding before one that informs,
    /// then the gravest.
    pub fn of(scene: &Scene<'a>, index: usize, about: About) -> Option<Self> {
        let cell = scene.plan.cells.get(index)?;
        let supply = squeezed(&supply(cell));
        let found = scene.judgement.findings.iter().filter(|finding| {
            About::of(finding) == Some(about)
                && finding.position.as_ref() == Some(&cell.position)
                && finding.supply.as_deref().map(squeezed).as_ref() == Some(&supply)
        });
        let weight = |finding: &&Finding| {
            let required = finding.weight == RuleWeight::Required;
            (required, finding.outcome.rank())
        };
        let (here, elsewhere): (Vec<_>, Vec<_>) =
            found.partition(|finding| finding.condition == cell.condition);
        let here = here.into_iter().max_by_key(weight).map(Said::Here);
        let elsewhere = elsewhere
            .into_iter()
            .filter(|_| has_rule(scene, cell, about))
            .max_by_key(weight);
        here.or(elsewhere.map(Said::Elsewhere))
    }

    /// The finding, wherever it was made.
    pub fn finding(self) -> &'a Finding {
        match self {
            Said::Here(finding) | Said::Elsewhere(finding) => finding,
        }
    }

    /// The graver of two; what is said here counts before what is said elsewhere.
    pub fn graver(self, other: Self) -> Self {
        let weight = |said: Said| {
            let here = matches!(said, Said::Here(_));
            (here, said.finding().outcome.rank())
        };
        if weight(other) > weight(self) {
            other
        } else {
            self
        }
    }

    /// The condition in which the finding was made, if not in this one.
    pub fn worst_condition(self) -> Option<String> {
        let Said::Elsewhere(finding) = self else {
            return None;
        };
        Some(clean(finding.condition.as_deref().unwrap_or("another")))
    }
}

/// Whether a rule about `about` is for `cell`.
fn has_rule(scene: &Scene, cell: &Cell, about: About) -> bool {
    let is_about = |kind: &RuleKind| match about {
        About::Power => matches!(kind, RuleKind::PlatePower | RuleKind::PowerLimits { .. }),
        About::Holding => *kind == RuleKind::LinkHolding,
        About::Opening => *kind == RuleKind::LinkOpening,
    };
    let mut rules = scene.plan.rules.iter();
    rules.any(|rule| is_about(&rule.kind) && is_for(rule, cell))
}

/// Whether `rule` is for `cell`, by position and condition.
pub fn is_for(rule: &PlannedRule, cell: &Cell) -> bool {
    rule.position.as_ref().is_none_or(|p| *p == cell.position)
        && (rule.condition.is_none() || rule.condition == cell.condition)
}

/// The shape and the colour that go with an outcome's word.
pub fn looks(outcome: Outcome) -> (Marker, Ink) {
    match outcome {
        Outcome::Pass => (Marker::Disc, Ink(0, 92, 66)),
        Outcome::ConditionalPass => (Marker::Ring, Ink(0, 92, 66)),
        Outcome::ConditionalFail => (Marker::Triangle, Ink(146, 78, 0)),
        Outcome::Fail => (Marker::Cross, Ink(158, 16, 32)),
        Outcome::NotJudged => (Marker::Diamond, Ink(84, 88, 98)),
    }
}
