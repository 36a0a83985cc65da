//! Distributions, regression, effective numbers: what stands behind an uncertainty.

mod dist;
mod line;
mod series;

pub use dist::{COVERAGE, coverage_factor, normal_cdf, student_t};
pub use line::{Line, RunningLine, fit};
pub use series::{effective_degrees, effective_number, mean_and_deviation};
