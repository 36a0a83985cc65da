//! Normal and Student's t.

use statrs::distribution::{ContinuousCDF, StudentsT};

/// Share of a normal distribution within two standard deviations.
const TWO_SIGMA: f64 = 0.954_499_736_103_641_6;

/// Below this many degrees of freedom the library's t quantile is right to 1e-9;
/// far above it is silently wrong or never returns (measured against SciPy).
const SERIES_FROM: f64 = 1000.0;

/// Probability that a standard normal value lies below `z`; not a number for one.
pub fn normal_cdf(z: f64) -> f64 {
    0.5 * libm::erfc(-z / std::f64::consts::SQRT_2)
}

/// The value that Student's t with `nu` degrees of freedom stays below with
/// probability `p`; infinite `nu` is the normal distribution.
///
/// Nothing where `nu` is below 1 or not a number, or `p` lies outside
/// [1e-6, 1 - 1e-6], where the library's digits are lost.
pub fn student_quantile(p: f64, nu: f64) -> Option<f64> {
    if nu.is_nan() || nu < 1.0 || !(1e-6..=1.0 - 1e-6).contains(&p) {
        return None;
    }
    if nu < SERIES_FROM {
        return Some(StudentsT::new(0.0, 1.0, nu).ok()?.inverse_cdf(p));
    }
    let z = normal_quantile(p);
    if nu.is_infinite() {
        return Some(z);
    }
    Some(cornish_fisher(z, nu))
}

/// Coverage factor k of an expanded uncertainty at 95.45 % from the effective
/// degrees of freedom, truncated down to a whole number of at least 1
/// (JCGM 100, G.4.1 and G.6.4).
pub fn coverage_factor(nu_eff: f64) -> f64 {
    let whole = if nu_eff.is_nan() {
        1.0
    } else {
        nu_eff.floor().max(1.0)
    };
    student_quantile(0.5 + 0.5 * TWO_SIGMA, whole).unwrap_or(2.0)
}

fn normal_quantile(p: f64) -> f64 {
    -std::f64::consts::SQRT_2 * statrs::function::erf::erfc_inv(2.0 * p)
}

/// Three terms of the Cornish-Fisher series (Abramowitz and Stegun 26.7.5).
fn cornish_fisher(z: f64, nu: f64) -> f64 {
    let z2 = z * z;
    let first = z * (z2 + 1.0) / 4.0;
    let second = z * ((5.0 * z2 + 16.0) * z2 + 3.0) / 96.0;
    let third = z * (((3.0 * z2 + 19.0) * z2 + 17.0) * z2 - 15.0) / 384.0;
    z + (first + (second + third / nu) / nu) / nu
}

#[cfg(test)]
mod tests {
    use super::*;

    fn two_sided(level: f64, nu: f64) -> f64 {
        student_quantile(0.5 + 0.5 * level, nu).unwrap()
    }

    // NIST Technical Note 1297, Table B.1 (two decimals).
    #[test]
    fn t_table_of_nist_tn_1297() {
        let at_9545 = [
            (1.0, 13.97),
            (2.0, 4.53),
            (4.0, 2.87),
            (5.0, 2.65),
            (9.0, 2.32),
            (10.0, 2.28),
            (16.0, 2.17),
            (20.0, 2.13),
            (50.0, 2.05),
        ];
        for (nu, t) in at_9545 {
            assert!((coverage_factor(nu) - t).abs() < 0.0051, "nu {nu}");
        }
        assert!((coverage_factor(f64::INFINITY) - 2.0).abs() < 1e-9);
        for (nu, t) in [
            (1.0, 12.71),
            (4.0, 2.78),
            (9.0, 2.26),
            (16.0, 2.12),
            (20.0, 2.09),
        ] {
            assert!((two_sided(0.95, nu) - t).abs() < 0.0051, "nu {nu}");
        }
        assert!((two_sided(0.99, 16.0) - 2.92).abs() < 0.0051);
    }

    // SciPy 1.17.1: t(0.975) is 1.95997 from a million degrees of freedom on, where
    // the library alone gives 1.8266 at 1e7 and never returns at 1e8.
    #[test]
    fn very_many_degrees_of_freedom_are_normal() {
        for nu in [1e6, 3e6, 1e7, 1e8, 1e10, f64::INFINITY] {
            let t = student_quantile(0.975, nu).unwrap();
            assert!((t - 1.959_964).abs() < 1e-5, "nu {nu}: {t}");
        }
    }

    #[test]
    fn both_ways_agree_where_they_meet() {
        for p in [0.9, 0.975, 0.9999] {
            let below = student_quantile(p, 999.999_999).unwrap();
            let above = student_quantile(p, 1000.0).unwrap();
            assert!((below - above).abs() < 1e-8, "{p}: {below} {above}");
        }
    }

    #[test]
    fn what_cannot_be_said_is_not_said() {
        for (p, nu) in [
            (1e-7, 5.0),
            (1.0 - 1e-7, 5.0),
            (f64::NAN, 5.0),
            (0.9, 0.5),
            (0.9, f64::NAN),
        ] {
            assert_eq!(student_quantile(p, nu), None);
        }
        assert!(coverage_factor(0.2) > 13.0 && coverage_factor(f64::NAN) > 13.0);
    }

    // JCGM 106: y -5.47 V, u 0.05 V, limit -5.40 V gives 0.92 (computed 0.9192433).
    #[test]
    fn normal_probabilities() {
        assert!((normal_cdf((-5.40 + 5.47) / 0.05) - 0.919_243_3).abs() < 1e-7);
        assert!((normal_cdf(0.0) - 0.5).abs() < 1e-15);
        assert!((normal_cdf(2.0) - 0.977_249_868).abs() < 1e-9);
        assert!(normal_cdf(f64::INFINITY) == 1.0 && normal_cdf(f64::NEG_INFINITY) == 0.0);
    }
}
