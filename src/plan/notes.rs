//! Collecting problems, and names that are nearly right.

use crate::spec::{Place, Problem, Weight, nearest};

/// Every problem found so far.
#[derive(Debug, Default)]
pub(super) struct Notes(pub(super) Vec<Problem>);

impl Notes {
    /// An error with a hint.
    pub(super) fn error(
        &mut self,
        place: &Place,
        message: impl Into<String>,
        hint: impl Into<String>,
    ) {
        self.0.push(Problem::error(place, message).hint(hint));
    }

    /// A warning with a hint.
    pub(super) fn warning(
        &mut self,
        place: &Place,
        message: impl Into<String>,
        hint: impl Into<String>,
    ) {
        self.0.push(Problem::warning(place, message).hint(hint));
    }

    /// A name that is not among those that are known.
    pub(super) fn unknown(&mut self, place: &Place, what: &str, name: &str, known: &[&str]) {
        let hint = match nearest(name, known.iter().copied()) {
            Some(near) => format!("did you mean `{near}`? known: {}", listed(known)),
            None => format!("known: {}", listed(known)),
        };
        self.error(place, format!("there is no {what} `{name}`"), hint);
    }

    /// Whether nothing can be run.
    pub(super) fn has_errors(&self) -> bool {
        self.0.iter().any(|problem| problem.weight == Weight::Error)
    }
}

fn listed(names: &[&str]) -> String {
    if names.is_empty() {
        "none".to_owned()
    } else {
        names.join(", ")
    }
}
