//! The YAML files as typed values, every problem with file, line, column and a
//! hint. No look-ups: what a name refers to is `plan`'s business.

pub mod bench;
mod decode;
pub mod driver;
mod fields;
mod load;
mod nearest;
pub mod plate;
mod render;
mod rule;
mod scalars;
pub mod sequence;
pub mod shipped;
mod soak;
mod source;
mod syntax;
pub mod virtual_unit;
#[cfg(test)]
mod wrong_files;
mod yaml;

pub use load::{Loaded, load_bench, load_driver, load_sequence, load_virtual_unit};
pub use nearest::nearest;
pub use render::render;
pub use source::{Located, Place, Problem, Source, Weight};
