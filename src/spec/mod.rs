//! The YAML files as typed values, every problem with file, line, column and a
//! hint. No look-ups: what a name refers to is `plan`'s business.

pub mod bench;
pub mod driver;
pub mod plate;
pub mod sequence;
mod source;
pub mod virtual_unit;

pub use source::{Located, Place, Problem, Source, Weight};
