//! Collecting problems, and names that are nearly right.

use std::collections::BTreeSet;

use crate::spec::{Place, Problem, Weight, nearest};

/// A hint lists at most so many names; a file may hold thousands.
const MOST_LISTED: usize = 12;

/// Only so many names are compared with a wrong one.
const MOST_COMPARED: usize = 200;

/// Every problem found so far. What a block says again for its next cell is told once.
#[derive(Debug, Default)]
pub(super) struct Notes {
    problems: Vec<Problem>,
    told: BTreeSet<(String, usize, String)>,
}

impl Notes {
    /// An error with a hint.
    pub(super) fn error(
        &mut self,
        place: &Place,
        message: impl Into<String>,
        hint: impl Into<String>,
    ) {
        self.add(Problem::error(place, message).hint(hint));
    }

    /// A warning with a hint.
    pub(super) fn warning(
        &mut self,
        place: &Place,
        message: impl Into<String>,
        hint: impl Into<String>,
    ) {
        self.add(Problem::warning(place, message).hint(hint));
    }

    /// A name that is not among those that are known.
    pub(super) fn unknown(&mut self, place: &Place, what: &str, name: &str, known: &[&str]) {
        let compared = known.iter().copied().take(MOST_COMPARED);
        let hint = match nearest(name, compared) {
            Some(near) => format!("did you mean `{near}`? known: {}", listed(known)),
            None => format!("known: {}", listed(known)),
        };
        self.error(place, format!("there is no {what} `{name}`"), hint);
    }

    /// Whether nothing can be run.
    pub(super) fn has_errors(&self) -> bool {
        self.problems
            .iter()
            .any(|problem| problem.weight == Weight::Error)
    }

    /// The problems in the order of their places, those of the file of `first` first.
    pub(super) fn into_problems(self, first: &Place) -> Vec<Problem> {
        let mut problems = self.problems;
        let file = &first.source.name;
        problems.sort_by_key(|p| (p.place.source.name != *file, p.place.bytes.start));
        problems
    }

    fn add(&mut self, problem: Problem) {
        let place = &problem.place;
        let key = (
            place.source.name.clone(),
            place.bytes.start,
            problem.message.clone(),
        );
        if self.told.insert(key) {
            self.problems.push(problem);
        }
    }
}

/// Names for a hint.
pub(super) fn listed(names: &[&str]) -> String {
    let shown = names
        .iter()
        .take(MOST_LISTED)
        .copied()
        .collect::<Vec<_>>()
        .join(", ");
    match names.len() {
        0 => "none".to_owned(),
        n if n > MOST_LISTED => format!("{shown} and {} more", n - MOST_LISTED),
        _ => shown,
    }
}
