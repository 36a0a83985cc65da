//! Noncentral t, and the tolerance factors that follow from it.

use super::chi_square::chi_square_above;
use super::special::{root, root_from, stirling_error};
use super::{normal_cdf, normal_quantile};

/// Where the digits hold, checked against SciPy and the integral in 50 digits.
const FREEDOM: std::ops::RangeInclusive<f64> = 1.0..=1e6;
const SHIFT: std::ops::RangeInclusive<f64> = -1000.0..=1000.0;

/// What is left of the scale's density beyond the sum: e^-60.
const CUT: f64 = 60.0;

/// Probability that noncentral t, (Z + delta) / s with s^2 = chi-square / nu, lies
/// below `t`.
///
/// The integral over s of the normal probability of t s - delta. Every part of
/// it is positive and in logs, so it neither cancels nor underflows for large
/// delta, as the usual series does above 38. Nothing where `nu` lies outside 1 to
/// 1e6, `delta` outside -1000 to 1000, or `t` is not a number.
pub fn noncentral_t_cdf(t: f64, nu: f64, delta: f64) -> Option<f64> {
    inside(nu, delta).then_some(())?;
    (!t.is_nan()).then(|| Scale::of(nu, delta).share(|s| normal_cdf(shifted(t, s, delta))))
}

/// The value that noncentral t stays below with probability `p`.
///
/// Nothing outside the domain of [`noncentral_t_cdf`], or where `p` lies outside
/// [1e-6, 1 - 1e-6].
pub fn noncentral_t_quantile(p: f64, nu: f64, delta: f64) -> Option<f64> {
    if !inside(nu, delta) || !(1e-6..=1.0 - 1e-6).contains(&p) {
        return None;
    }
    let scale = Scale::of(nu, delta);
    let misses = |t: f64| {
        if p < 0.5 {
            libm::log(scale.share(|s| normal_cdf(shifted(t, s, delta))) / p)
        } else {
            libm::log((1.0 - p) / scale.share(|s| normal_cdf(-shifted(t, s, delta))))
        }
    };
    Some(root_from(misses, delta, 0.5))
}

fn inside(nu: f64, delta: f64) -> bool {
    FREEDOM.contains(&nu) && SHIFT.contains(&delta)
}

/// t s - delta; an infinite t stays so.
fn shifted(t: f64, s: f64, delta: f64) -> f64 {
    t * s - delta
}

/// Nodes and weights over the scale s = sqrt(chi-square / nu), equally spaced in
/// ln s: the trapezoid rule converges faster than any power there.
struct Scale(Vec<(f64, f64)>);

impl Scale {
    fn of(nu: f64, delta: f64) -> Self {
        // Half the width of the narrower one of density and normal step.
        let narrow = (2.0 * nu + (delta.abs() + 2.0).powi(2)).sqrt();
        let step = (0.5 / narrow).min(0.1);
        let far = CUT / nu;
        let (from, to) = (-(far + far.sqrt()), far.sqrt());
        let first = (from / step).floor() as i64;
        let last = (to / step).ceil() as i64;
        let half = nu / 2.0;
        let front =
            2.0 * (half / (2.0 * std::f64::consts::PI)).sqrt() * libm::exp(-stirling_error(half));
        let node = |i: i64| {
            let u = i as f64 * step;
            (libm::exp(u), step * front * libm::exp(-nu * turned(u)))
        };
        Self((first..=last).map(node).collect())
    }

    fn share(&self, normal: impl Fn(f64) -> f64) -> f64 {
        let sum: f64 = self.0.iter().map(|(s, weight)| weight * normal(*s)).sum();
        sum.clamp(0.0, 1.0)
    }
}

/// (e^2u - 1) / 2 - u, without cancellation near 0.
fn turned(u: f64) -> f64 {
    if u.abs() > 0.1 {
        return 0.5 * libm::expm1(2.0 * u) - u;
    }
    let mut term = u * u;
    let mut sum = term;
    for k in 3..20 {
        term *= 2.0 * u / f64::from(k);
        sum += term;
    }
    sum
}

/// The one-sided tolerance factor k: with the stated confidence at least `share` of
/// a normal population lies below mean + k s of `n` of its values (or above
/// mean - k s). Exact: k sqrt(n) is a quantile of noncentral t with n - 1 degrees of
/// freedom and delta = z_share sqrt(n) (ISO 16269-6, from memory).
///
/// Nothing where `n` is below 2, `share` or `confidence` outside 0.5 to 1 - 1e-6, or
/// z_share sqrt(n) above 1000.
pub fn tolerance_factor(n: usize, share: f64, confidence: f64) -> Option<f64> {
    let root_n = asked(n, share, confidence)?;
    let delta = normal_quantile(share)? * root_n;
    Some(noncentral_t_quantile(confidence, n as f64 - 1.0, delta)? / root_n)
}

/// The two-sided tolerance factor k: with the stated confidence at least `share` of
/// a normal population lies within mean +- k s of `n` of its values. Exact: the
/// integral over the mean's error of the probability that s is large enough
/// (ISO 16269-6 with both unknown, from memory).
///
/// Nothing where [`tolerance_factor`] gives nothing by `n`, `share`, `confidence`.
pub fn tolerance_factor_two_sided(n: usize, share: f64, confidence: f64) -> Option<f64> {
    let root_n = asked(n, share, confidence)?;
    let nu = n as f64 - 1.0;
    let widest = normal_quantile(0.5 + 0.5 * share)?;
    // Errors of the mean from 0 to 8.6 of its standard deviations, both signs.
    let step = 0.1;
    let nodes: Vec<(f64, f64)> = (0..=86)
        .map(|i| {
            let z = f64::from(i) * step;
            let both = if i == 0 { 1.0 } else { 2.0 };
            let density = libm::exp(-0.5 * z * z) / (2.0 * std::f64::consts::PI).sqrt();
            (reach(z / root_n, share, widest), both * step * density)
        })
        .collect();
    let misses = |log_k: f64| {
        let k = libm::exp(log_k);
        let good: f64 = nodes
            .iter()
            .map(|(reach, weight)| weight * chi_square_above(nu * (reach / k).powi(2), nu))
            .sum();
        good - confidence
    };
    Some(libm::exp(root_from(misses, libm::log(widest), 0.05)))
}

/// The root of `n`, where a factor can be said.
fn asked(n: usize, share: f64, confidence: f64) -> Option<f64> {
    let known = 0.5..=1.0 - 1e-6;
    ((2..=1_000_000).contains(&n) && known.contains(&share) && known.contains(&confidence))
        .then(|| (n as f64).sqrt())
}

/// The half-width about a point off the centre that holds `share`.
fn reach(off: f64, share: f64, at_centre: f64) -> f64 {
    let misses = |r: f64| normal_cdf(off + r) - normal_cdf(off - r) - share;
    root(misses, at_centre * (1.0 - 1e-9), at_centre + off)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::stats::student_cdf;

    #[test]
    fn without_a_shift_it_is_students_t() {
        for nu in [1.0, 2.5, 9.0, 300.0, 1e5] {
            for t in [-40.0, -2.0, 0.0, 0.3, 5.0] {
                let central = student_cdf(t, nu).unwrap();
                let found = noncentral_t_cdf(t, nu, 0.0).unwrap();
                assert!(
                    (found - central).abs() < 1e-13,
                    "{nu} {t}: {found} {central}"
                );
            }
        }
    }

    #[test]
    fn what_cannot_be_said_is_not_said() {
        for (p, nu, delta) in [
            (0.5, 0.5, 1.0),
            (0.5, 2e6, 1.0),
            (0.5, 5.0, 1001.0),
            (0.5, 5.0, f64::NAN),
            (0.0, 5.0, 1.0),
            (f64::NAN, 5.0, 1.0),
        ] {
            assert_eq!(noncentral_t_quantile(p, nu, delta), None);
        }
        assert_eq!(noncentral_t_cdf(f64::NAN, 5.0, 1.0), None);
        assert_eq!(noncentral_t_cdf(f64::INFINITY, 5.0, 1.0), Some(1.0));
        for (n, share, confidence) in [(1, 0.9, 0.9), (5, 0.4, 0.9), (5, 0.9, 1.0)] {
            assert_eq!(tolerance_factor(n, share, confidence), None);
            assert_eq!(tolerance_factor_two_sided(n, share, confidence), None);
        }
    }
}
