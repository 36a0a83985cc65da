//! Rules, findings, verdict.

mod types;

pub use types::{Finding, Judgement, Outcome};
