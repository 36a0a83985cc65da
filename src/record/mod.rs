//! The record folder: what a run leaves, and reading it back.

mod types;

pub use types::{
    Event, FileHash, Happening, Manifest, RECORD_FORMAT, RunOutcome, Sample, Status, StepEnd,
};
