//! The plan under test: the shipped files, and one change for every kind of problem.

use super::*;
use crate::spec::driver::Driver;
use crate::spec::{self, Weight, shipped};

mod bench;
mod cells;
mod guarding;
mod ratings;
mod reading;
mod roles;
mod rules;
mod sensing;
mod steps;
mod waveforms;

/// The demo bench.
const BENCH: &str = shipped::VIRTUAL_BENCH.text;

/// Title of the dryer's sequence.
const TITLE: &str = "Cupboard dryer, incoming qualification";

/// A workshop's sequence without `each`.
const FLAT: &str = include_str!("flat.yaml");

fn shipped_drivers() -> Vec<Driver> {
    let load = |file: &shipped::Shipped| spec::load_driver(file.path, file.text.as_bytes());
    let drivers = shipped::DRIVERS.iter();
    drivers
        .map(|file| load(file).value.expect(file.path))
        .collect()
}

/// A shipped sequence's text by a part of its name.
fn shipped_as(name: &str) -> &'static str {
    let mut files = shipped::SEQUENCES.iter();
    files.find(|file| file.path.contains(name)).unwrap().text
}

/// The shipped dryer up to its house lower limit, which is the last of its rules and
/// would answer beside every rule that a test is about.
///
/// It is taken with a single supply that is its whole supply range.
fn dryer() -> &'static str {
    static TEXT: std::sync::LazyLock<String> = std::sync::LazyLock::new(|| {
        let whole = shipped_as("cupboard-dryer");
        let end = whole
            .find("  - power: {at least")
            .expect("the house lower limit");
        let from = whole.find("      supplies:").expect("supplies");
        let to = from + whole[from..].find("      steps:").expect("steps");
        let one = "      supplies:\n        - {voltage: 230 V, frequency: 50 Hz}\n";
        let text = format!("{}{one}{}", &whole[..from], &whole[to..end]);
        let ambient = "  highest ambient: 35 °C\n";
        text.replace(ambient, &format!("{ambient}  supply range: 230 V\n"))
    });
    &TEXT
}

/// What is crossed in a test.
struct Crossing {
    sequence: String,
    bench: String,
    drivers: Vec<Driver>,
    bay: Option<&'static str>,
    today: Option<chrono::NaiveDate>,
}

impl Crossing {
    fn of(sequence: &str, bench: &str) -> Self {
        Self {
            sequence: sequence.to_owned(),
            bench: bench.to_owned(),
            drivers: shipped_drivers(),
            bay: None,
            today: chrono::NaiveDate::from_ymd_opt(2026, 12, 1),
        }
    }

    /// Changes the driver of a name.
    fn driver(mut self, name: &str, change: impl FnOnce(&mut Driver)) -> Self {
        change(self.drivers.iter_mut().find(|d| d.name == name).unwrap());
        self
    }

    #[track_caller]
    fn resolve(&self) -> Resolved {
        let sequence = spec::load_sequence("s.yaml", self.sequence.as_bytes());
        let bench = spec::load_bench("b.yaml", self.bench.as_bytes());
        let problems = [sequence.problems, bench.problems].concat();
        assert!(problems.is_empty(), "{}", spec::render(&problems));
        resolve(
            &sequence.value.unwrap(),
            &bench.value.unwrap(),
            &self.drivers,
            self.bay,
            self.today,
        )
    }
}

/// Crosses the texts of a sequence and a bench with the shipped drivers.
#[track_caller]
fn cross(sequence: &str, bench: &str) -> Resolved {
    Crossing::of(sequence, bench).resolve()
}

#[track_caller]
fn planned(sequence: &str) -> Plan {
    let resolved = cross(sequence, BENCH);
    assert!(
        resolved.problems.is_empty(),
        "{}",
        spec::render(&resolved.problems)
    );
    resolved.plan.unwrap()
}

/// The text with its first `from` changed.
#[track_caller]
fn changed(text: &str, from: &str, to: &str) -> String {
    assert!(text.contains(from), "{from:?} is not there");
    text.replacen(from, to, 1)
}

impl Resolved {
    /// Holds that one problem lies at this text and says all of these words, in its
    /// message and its hint; and that errors alone leave no plan.
    #[track_caller]
    fn says(&self, weight: Weight, at: &str, message: &str, hint: &str) -> &Self {
        let all = spec::render(&self.problems);
        let found = self.problems.iter().filter(|p| {
            p.weight == weight
                && p.place.text() == at
                && p.message.contains(message)
                && p.hint.as_ref().is_some_and(|h| h.contains(hint))
        });
        assert_eq!(found.count(), 1, "not once in:\n{all}");
        let has_errors = self.problems.iter().any(|p| p.weight == Weight::Error);
        assert_eq!(self.plan.is_none(), has_errors);
        self
    }

    #[track_caller]
    fn refuses(&self, at: &str, message: &str, hint: &str) -> &Self {
        self.says(Weight::Error, at, message, hint)
    }

    #[track_caller]
    fn warns(&self, at: &str, message: &str, hint: &str) -> &Self {
        self.says(Weight::Warning, at, message, hint)
    }

    /// Holds that this is all that is said.
    #[track_caller]
    fn only(&self) {
        assert_eq!(self.problems.len(), 1, "{}", spec::render(&self.problems));
    }

    /// Holds that nothing is said.
    #[track_caller]
    fn is_clean(&self) {
        assert!(self.problems.is_empty(), "{}", spec::render(&self.problems));
    }
}
