//! Normal and Student's t.

use super::special::{beta, root};

/// Share of a normal distribution within two standard deviations.
const TWO_SIGMA: f64 = 0.954_499_736_103_641_6;

/// From this many degrees of freedom on, t is turned into a normal value by a
/// series that is right to the last digits there.
const SERIES_FROM: f64 = 1000.0;

/// Probability that a standard normal value lies below `z`; not a number for one.
pub fn normal_cdf(z: f64) -> f64 {
    0.5 * libm::erfc(-z / std::f64::consts::SQRT_2)
}

/// The value that a standard normal one stays below with probability `p`.
///
/// Nothing where `p` is not strictly between 0 and 1. Digits near 1 are those that
/// `p` itself has left there.
pub fn normal_quantile(p: f64) -> Option<f64> {
    if !(p > 0.0 && p < 1.0) {
        return None;
    }
    if p > 0.5 {
        // 1 - p is exact here.
        return normal_quantile(1.0 - p).map(|z| -z);
    }
    // Abramowitz and Stegun 26.2.23, right to 4.5e-4, is the start of Halley's steps.
    let t = (-2.0 * libm::log(p)).sqrt();
    let above = (2.515_517 + t * (0.802_853 + t * 0.010_328))
        / (1.0 + t * (1.432_788 + t * (0.189_269 + t * 0.001_308)));
    let mut z = above - t;
    for _ in 0..3 {
        // (cdf - p) / density, relative to p, so that far tails don't underflow.
        let log_density = -0.5 * z * z - 0.5 * libm::log(2.0 * std::f64::consts::PI);
        let miss = (normal_cdf(z) / p - 1.0) * libm::exp(libm::log(p) - log_density);
        z -= miss / (1.0 + 0.5 * z * miss);
    }
    Some(z)
}

/// Probability that Student's t with `nu` degrees of freedom lies below `t`;
/// infinite `nu` is the normal distribution, fractional `nu` is allowed.
///
/// By the incomplete beta function (Abramowitz and Stegun 26.7.1) below 1000
/// degrees of freedom, from there by Hill's normalising series (1970, algorithm
/// 395 of the Communications of the ACM, from memory). Nothing where `nu` is below
/// 1 or one of both is not a number.
pub fn student_cdf(t: f64, nu: f64) -> Option<f64> {
    if t.is_nan() || nu.is_nan() || nu < 1.0 {
        return None;
    }
    Some(if t < 0.0 {
        student_above(-t, nu)
    } else if t < 0.5 {
        0.5 + student_between(t, nu)
    } else {
        1.0 - student_above(t, nu)
    })
}

/// Probability above `t`, for `t` of at least 0.
fn student_above(t: f64, nu: f64) -> f64 {
    if nu >= SERIES_FROM {
        return normal_cdf(-normalised(t, nu));
    }
    let (x, y) = shares(t, nu);
    0.5 * beta(0.5 * nu, 0.5, x, y)
}

/// Probability between 0 and `t`, for `t` of at least 0: keeps its digits near 0.
fn student_between(t: f64, nu: f64) -> f64 {
    if nu >= SERIES_FROM {
        return 0.5 * libm::erf(normalised(t, nu) / std::f64::consts::SQRT_2);
    }
    let (x, y) = shares(t, nu);
    0.5 * beta(0.5, 0.5 * nu, y, x)
}

/// nu / (nu + t^2) and t^2 / (nu + t^2), without overflow.
fn shares(t: f64, nu: f64) -> (f64, f64) {
    let ratio = t * (t / nu);
    (1.0 / (1.0 + ratio), 1.0 / (1.0 + 1.0 / ratio))
}

/// The normal value with the same probability, for many degrees of freedom.
fn normalised(t: f64, nu: f64) -> f64 {
    if nu.is_infinite() {
        return t;
    }
    let a = nu - 0.5;
    let b = 48.0 * a * a;
    let w = a * libm::log1p(t / nu * t);
    let series = (((-0.4 * w - 3.3) * w - 24.0) * w - 85.5) / (0.8 * w * w + 100.0 + b);
    ((series + w + 3.0) / b + 1.0) * w.sqrt()
}

/// The value that Student's t with `nu` degrees of freedom stays below with
/// probability `p`; infinite `nu` is the normal distribution, fractional `nu` is
/// allowed. The root of [`student_cdf`]; near p = 0.5 it keeps the digits of p - 0.5.
///
/// Nothing where `nu` is below 1 or not a number, or `p` lies outside
/// [1e-6, 1 - 1e-6].
pub fn student_quantile(p: f64, nu: f64) -> Option<f64> {
    if nu.is_nan() || nu < 1.0 || !(1e-6..=1.0 - 1e-6).contains(&p) {
        return None;
    }
    if nu.is_infinite() {
        return normal_quantile(p);
    }
    let from_middle = p - 0.5;
    if from_middle == 0.0 {
        return Some(0.0);
    }
    let size = if nu >= SERIES_FROM {
        many_degrees(normal_quantile(p)?.abs(), nu)
    } else if from_middle.abs() <= 0.25 {
        // No quartile of t lies beyond 1, that of one degree of freedom.
        let misses = |t: f64| student_between(t, nu) - from_middle.abs();
        root(misses, 0.0, 1.0 + 1e-9)
    } else {
        let tail = p.min(1.0 - p);
        // One degree of freedom has the widest tails: cot(pi tail) < 1 / (pi tail).
        let misses = |log_t: f64| libm::log(student_above(libm::exp(log_t), nu) / tail);
        libm::exp(root(misses, -0.7, libm::log(0.32 / tail)))
    };
    Some(size.copysign(from_middle))
}

/// Three terms of the Cornish-Fisher series (Abramowitz and Stegun 26.7.5), then two
/// Newton steps on Hill's series, whose slope is near z / t.
fn many_degrees(z: f64, nu: f64) -> f64 {
    let mut t = cornish_fisher(z, nu);
    for _ in 0..2 {
        let found = normalised(t, nu);
        t += (z - found) * t / found;
    }
    t
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
