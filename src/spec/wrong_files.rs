//! For the tests of the decoders: shipped files with one thing changed, and what
//! must be said about it.

use super::shipped::{self, Shipped};
use super::{Loaded, Problem, load_bench, load_driver, load_sequence, load_virtual_unit};

/// A change to a shipped file, and the problem that it must bring.
pub(super) struct Wrong {
    /// The text that is replaced, at its first occurrence.
    pub(super) old: &'static str,
    /// What is put there.
    pub(super) new: &'static str,
    /// `line:column` of the problem.
    pub(super) at: &'static str,
    /// A part of the message.
    pub(super) says: &'static str,
    /// A part of the hint.
    pub(super) hint: &'static str,
}

/// The kinds of file, each with a shipped one.
#[derive(Debug, Clone, Copy)]
pub(super) enum Kind {
    Sequence,
    Bench,
    Driver(&'static str),
    VirtualUnit,
}

impl Kind {
    fn shipped(self) -> Shipped {
        match self {
            Kind::Sequence => shipped::SEQUENCES[0],
            Kind::Bench => shipped::VIRTUAL_BENCH,
            Kind::Driver(name) => *shipped::DRIVERS
                .iter()
                .find(|file| file.path.contains(name))
                .expect("a shipped driver"),
            Kind::VirtualUnit => shipped::VIRTUAL_UNITS[0],
        }
    }

    /// What loading says, and whether there was a value.
    pub(super) fn load(self, bytes: &[u8]) -> (bool, Vec<Problem>) {
        fn both<T>(loaded: Loaded<T>) -> (bool, Vec<Problem>) {
            (loaded.value.is_some(), loaded.problems)
        }
        match self {
            Kind::Sequence => both(load_sequence("file", bytes)),
            Kind::Bench => both(load_bench("file", bytes)),
            Kind::Driver(_) => both(load_driver("file", bytes)),
            Kind::VirtualUnit => both(load_virtual_unit("file", bytes)),
        }
    }

    /// The shipped file with some changes. The dryer is taken with a single supply in a
    /// single line, so that each supply is a first occurrence.
    pub(super) fn changed(self, changes: &[(&str, &str)]) -> String {
        let mut text = self.shipped().text.to_owned();
        if let Kind::Sequence = self {
            let low = "        - {voltage: 220 V, frequency: 50 Hz}\n";
            let high = "        - {voltage: 240 V, frequency: 50 Hz}\n";
            text = text
                .replace(high, "")
                .replace(low, &low.replace("220", "230"));
        }
        for (old, new) in changes {
            assert!(text.contains(old), "`{old}` is not in {:?}", self);
            text = text.replacen(old, new, 1);
        }
        text
    }

    /// Holds every row to its one problem.
    pub(super) fn check(self, rows: &[Wrong]) {
        let mut missed = Vec::new();
        for row in rows {
            let text = self.changed(&[(row.old, row.new)]);
            let (value, problems) = self.load(text.as_bytes());
            let good = match problems.as_slice() {
                [problem] => row.fits(problem),
                _ => false,
            };
            if value || !good {
                missed.push((row.new, row.at, problems));
            }
        }
        assert!(missed.is_empty(), "{missed:#?}");
    }
}

impl Wrong {
    fn fits(&self, problem: &Problem) -> bool {
        let (line, column) = problem.place.line_column();
        format!("{line}:{column}") == self.at
            && problem.message.contains(self.says)
            && problem.hint.as_deref().unwrap_or("").contains(self.hint)
    }
}

/// A row of [`Kind::check`]: what is replaced by what, and where that says what,
/// with which hint.
pub(super) const fn wrong(
    old: &'static str,
    new: &'static str,
    at: &'static str,
    says: &'static str,
    hint: &'static str,
) -> Wrong {
    Wrong {
        old,
        new,
        at,
        says,
        hint,
    }
}
