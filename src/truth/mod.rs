//! The judging measured against a known truth: units whose true power and
//! temperature are known run the whole way (plan, run in simulated time, record in
//! memory, the same reader, analysis, judge), each on a bench of its own whose
//! instruments err exactly as the uncertainty budget says.
//!
//! What the truth is for each quantity, the module `equilibrium` says.

mod campaign;
mod coverage;
mod equilibrium;
mod limit;
mod memory;
mod outcomes;
mod play;
mod proportion;
mod report;
mod setting;
mod table;
mod unit;

#[cfg(test)]
mod tests;

pub use campaign::{Campaign, measure};
pub use coverage::{Coverage, Quantity};
pub use limit::{AtLimit, FALSE_PASSES};
pub use outcomes::{FaultRow, Outcomes, Place};
pub use proportion::Proportion;
pub use report::{Early, Part, Report};
pub use setting::Kind;
pub use table::{csv, text};

use crate::virtual_bench::StagingError;

/// Why the truth could not be held against anything.
#[derive(Debug, thiserror::Error)]
pub enum TruthError {
    /// The files that are carried within don't fit this program.
    #[error("the files of the known truth: {0}")]
    Files(String),
    /// The virtual bench can't be staged.
    #[error("the virtual bench: {0}")]
    Staging(#[from] StagingError),
    /// Simulated time can't be started.
    #[error("simulated time can't be started: {0}")]
    Time(String),
    /// A record in memory could not be written or read.
    #[error("the record: {0}")]
    Record(String),
}
