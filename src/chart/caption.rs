//! What cells and findings are called in pictures and file names, and which
//! finding belongs to which cell.

use super::Scene;
use super::ink::{Ink, Marker};
use super::words::{clean, safe_name, squeezed};
use crate::judge::{Finding, Outcome};
use crate::plan::Cell;

/// A supply in words: `230 V 50 Hz`.
pub fn supply(cell: &Cell) -> String {
    format!("{} {}", cell.supply.voltage, cell.supply.frequency)
}

/// A cell in words: `high · refill full · 230 V 50 Hz`.
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

/// Whether `finding` names this very cell; what it leaves open, it names in every cell.
pub fn names(finding: &Finding, cell: &Cell) -> bool {
    let position = finding.position.as_ref();
    let condition = finding.condition.as_ref();
    let supply = finding.supply.as_deref();
    position.is_none_or(|position| *position == cell.position)
        && condition.is_none_or(|condition| Some(condition) == cell.condition.as_ref())
        && supply.is_none_or(|words| squeezed(words) == squeezed(&self::supply(cell)))
}

/// The finding about `about` that names cell `index`; the gravest of several.
pub fn finding<'a>(scene: &Scene<'a>, index: usize, about: About) -> Option<&'a Finding> {
    let cell = scene.plan.cells.get(index)?;
    let found = scene.judgement.findings.iter();
    found
        .filter(|finding| About::of(finding) == Some(about))
        .filter(|finding| names_one_cell(scene, finding) && names(finding, cell))
        .max_by_key(|finding| gravity(finding.outcome))
}

/// A finding without a position, where cells differ in theirs, is about no one cell.
fn names_one_cell(scene: &Scene, finding: &Finding) -> bool {
    let cells = &scene.plan.cells;
    let alike = |differ: &dyn Fn(&Cell) -> bool| !cells.iter().any(differ);
    let first = cells.first();
    (finding.position.is_some()
        || alike(&|cell| first.is_some_and(|first| first.position != cell.position)))
        && (finding.condition.is_some()
            || alike(&|cell| first.is_some_and(|first| first.condition != cell.condition)))
}

/// How grave an outcome is for the unit, as the unit's verdict ranks them.
pub fn gravity(outcome: Outcome) -> u8 {
    match outcome {
        Outcome::Pass => 0,
        Outcome::ConditionalPass => 1,
        Outcome::ConditionalFail => 2,
        Outcome::NotJudged => 3,
        Outcome::Fail => 4,
    }
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
