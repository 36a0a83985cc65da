//! From bytes to typed values, with every problem on the way.

use super::bench::Bench;
use super::driver::Driver;
use super::fields::{Field, Notes};
use super::sequence::Sequence;
use super::virtual_unit::VirtualUnit;
use super::{Problem, Weight, decode, yaml};

/// What came of reading a file.
#[derive(Debug, Clone, PartialEq)]
pub struct Loaded<T> {
    /// The value; there if and only if no problem is an error.
    pub value: Option<T>,
    /// One error of syntax, or every problem of meaning in the order of the file.
    pub problems: Vec<Problem>,
}

/// Reads a sequence file; `name` is what messages call it.
pub fn load_sequence(name: &str, bytes: &[u8]) -> Loaded<Sequence> {
    load(name, bytes, "the sequence", decode::sequence)
}

/// Reads a bench file; `name` is what messages call it.
pub fn load_bench(name: &str, bytes: &[u8]) -> Loaded<Bench> {
    load(name, bytes, "the bench", decode::bench)
}

/// Reads a driver file; `name` is what messages call it.
pub fn load_driver(name: &str, bytes: &[u8]) -> Loaded<Driver> {
    load(name, bytes, "the driver", decode::driver)
}

/// Reads a virtual unit's file; `name` is what messages call it.
pub fn load_virtual_unit(name: &str, bytes: &[u8]) -> Loaded<VirtualUnit> {
    load(name, bytes, "the virtual unit", decode::virtual_unit)
}

fn load<T>(
    name: &str,
    bytes: &[u8],
    what: &str,
    decode: impl FnOnce(Field<'_>) -> Option<T>,
) -> Loaded<T> {
    let root = match yaml::read(name, bytes) {
        Ok(root) => root,
        Err(problem) => {
            return Loaded {
                value: None,
                problems: vec![problem],
            };
        }
    };
    let notes = Notes::default();
    let value = decode(Field::root(&root, what, &notes));
    let mut problems = notes.into_problems();
    let failed = problems.iter().any(|p| p.weight == Weight::Error);
    if value.is_none() && !failed {
        // Holds the promise of `value` against a decoder that gives up silently.
        problems.push(Problem::error(&root.place, format!("{what} can't be read")));
    }
    Loaded {
        value: value.filter(|_| !failed),
        problems,
    }
}
