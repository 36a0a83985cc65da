//! Distributions, regression, autocorrelation and uncertainty budgets behind a
//! guarded front: every function says where it holds, and gives nothing outside.

mod autocorrelation;
mod budget;
mod distribution;
mod fit;
mod line;

pub use autocorrelation::{Effective, effective_of, effective_with};
pub use budget::{Combined, Part, combine};
pub use distribution::{coverage_factor, normal_cdf, student_quantile};
pub use fit::{FirstOrder, first_order};
pub use line::{Line, RunningLine, line_through};

/// Half-width of a rectangular distribution per standard deviation (JCGM 100, 4.3.7).
pub const RECTANGULAR: f64 = 1.732_050_807_568_877_2;

/// Full width of a rectangular distribution per standard deviation: a resolution
/// counts with this (JCGM 100, F.2.2.1).
pub const RESOLUTION: f64 = 3.464_101_615_137_754_5;
