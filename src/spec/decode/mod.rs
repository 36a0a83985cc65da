//! One decoder per kind of file: from the tree to the typed value.

mod bench;
mod driver;
mod rules;
mod sequence;
mod soak;
mod steps;
mod virtual_unit;
mod waveform;

pub(super) use bench::bench;
pub(super) use driver::driver;
pub(super) use sequence::sequence;
pub(super) use virtual_unit::virtual_unit;
