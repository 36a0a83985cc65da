//! The chi-square distribution.

use super::normal_quantile;
use super::special::{gamma, root_from};

/// Degrees of freedom for which the digits hold, checked against SciPy.
const FREEDOM: std::ops::RangeInclusive<f64> = 1.0..=1e9;

/// Probability that chi-square with `nu` degrees of freedom lies below `x`:
/// P(nu/2, x/2), Abramowitz and Stegun 26.4.19. Fractional `nu` is allowed.
///
/// Nothing where `nu` lies outside 1 to 1e9 or `x` is negative or not a number.
pub fn chi_square_cdf(x: f64, nu: f64) -> Option<f64> {
    (FREEDOM.contains(&nu) && x >= 0.0).then(|| gamma(nu / 2.0, x / 2.0).0)
}

/// Probability that it lies above `x`, without the loss of digits of 1 - cdf.
pub(super) fn chi_square_above(x: f64, nu: f64) -> f64 {
    gamma(nu / 2.0, x / 2.0).1
}

/// The value that chi-square with `nu` degrees of freedom stays below with
/// probability `p`: the root of [`chi_square_cdf`] or of its complement.
///
/// Nothing where `nu` lies outside 1 to 1e9, or `p` outside [1e-6, 1 - 1e-6].
pub fn chi_square_quantile(p: f64, nu: f64) -> Option<f64> {
    if !FREEDOM.contains(&nu) || !(1e-6..=1.0 - 1e-6).contains(&p) {
        return None;
    }
    // Wilson and Hilferty's cube (Abramowitz and Stegun 26.4.17) is the start.
    let c = 2.0 / (9.0 * nu);
    let cube_root = 1.0 - c + normal_quantile(p)? * c.sqrt();
    let guess = libm::log(nu * cube_root.max(0.01).powi(3));
    let misses = |log_x: f64| {
        let (below, above) = gamma(nu / 2.0, libm::exp(log_x) / 2.0);
        if p < 0.5 {
            libm::log(below / p)
        } else {
            libm::log((1.0 - p) / above)
        }
    };
    Some(libm::exp(root_from(misses, guess, 0.01 / nu.sqrt())))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_degrees_are_an_exponential() {
        for p in [1e-6, 0.025, 0.5, 0.975, 0.999_99] {
            let x = chi_square_quantile(p, 2.0).unwrap();
            assert!((x / (-2.0 * libm::log1p(-p)) - 1.0).abs() < 1e-9, "{p}");
        }
    }

    #[test]
    fn what_cannot_be_said_is_not_said() {
        for (p, nu) in [
            (0.0, 3.0),
            (1.0, 3.0),
            (0.5, 0.9),
            (0.5, 2e9),
            (f64::NAN, 3.0),
        ] {
            assert_eq!(chi_square_quantile(p, nu), None);
        }
        for (x, nu) in [(-1.0, 3.0), (f64::NAN, 3.0), (1.0, f64::NAN)] {
            assert_eq!(chi_square_cdf(x, nu), None);
        }
        assert_eq!(chi_square_cdf(f64::INFINITY, 3.0), Some(1.0));
        assert_eq!(chi_square_cdf(0.0, 3.0), Some(0.0));
    }
}
