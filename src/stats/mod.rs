//! Distributions, regression, autocorrelation and uncertainty budgets behind a
//! guarded front: every function says where it holds, and gives nothing outside.

mod autocorrelation;
mod binomial;
mod budget;
mod chi_square;
mod distribution;
mod fit;
mod line;
mod noncentral;
mod paired;
mod risk;
mod special;

#[cfg(test)]
mod oracle;
#[cfg(test)]
mod published;

pub use autocorrelation::{Effective, effective_of, effective_with};
pub use binomial::{binomial_cdf, clopper_pearson};
pub use budget::{Combined, Correlation, Part, combine, combine_correlated};
pub use chi_square::{chi_square_cdf, chi_square_quantile};
pub use distribution::{
    coverage_factor, normal_cdf, normal_quantile, student_cdf, student_quantile,
};
pub use fit::{FirstOrder, first_order};
pub use line::{Line, RunningLine, line_through};
pub use noncentral::{
    noncentral_t_cdf, noncentral_t_quantile, tolerance_factor, tolerance_factor_two_sided,
};
pub use paired::{PairedMeans, paired_means};
pub use risk::{Interval, Risks, conformity, conformity_t, global_risks};

/// Half-width of a rectangular distribution per standard deviation (JCGM 100, 4.3.7).
pub const RECTANGULAR: f64 = 1.732_050_807_568_877_2;

/// Full width of a rectangular distribution per standard deviation: a resolution
/// counts with this (JCGM 100, F.2.2.1).
pub const RESOLUTION: f64 = 3.464_101_615_137_754_5;
