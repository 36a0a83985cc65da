//! What the distributions are made of: incomplete beta and gamma functions with
//! prefactors that keep their digits for large parameters, and a root finder.

/// Parts of a continued fraction or series at most: enough for parameters up to
/// 1e9, whose sums need about the root of them.
const MOST_TERMS: usize = 400_000;
const TINY: f64 = 1e-300;
const PRECISE: f64 = 1e-16;

/// ln Gamma(a + 1) less Stirling's a ln a - a + ln(2 pi a) / 2, for a > 0.
pub(super) fn stirling_error(a: f64) -> f64 {
    if a < 16.0 {
        let stirling = (a + 0.5) * libm::log(a) - a + 0.5 * libm::log(2.0 * std::f64::consts::PI);
        return libm::lgamma(a + 1.0) - stirling;
    }
    // The asymptotic series (Abramowitz and Stegun 6.1.41).
    let b = 1.0 / (a * a);
    (1.0 / 12.0 - b * (1.0 / 360.0 - b * (1.0 / 1260.0 - b * (1.0 / 1680.0 - b / 1188.0)))) / a
}

/// a ln(a / m) + m - a, without cancellation where `off` = m - a is small (the deviance
/// of Loader 2000, "Fast and accurate computation of binomial probabilities").
fn deviance(a: f64, m: f64, off: f64) -> f64 {
    if m <= 0.0 {
        return f64::INFINITY;
    }
    let v = -off / (a + m);
    if v.abs() >= 0.1 {
        return a * libm::log(a / m) + off;
    }
    // ln(a / m) = 2 artanh v; its first term makes -off v with off.
    let mut sum = -off * v;
    let mut power = 2.0 * a * v;
    for odd in (3..).step_by(2) {
        power *= v * v;
        let next = sum + power / f64::from(odd);
        if next == sum {
            break;
        }
        sum = next;
    }
    sum
}

/// The regularised incomplete beta function I_x(a, b), with y = 1 - x given apart
/// so that neither loses digits. For a, b > 0 and x from 0 to 1.
pub(super) fn beta(a: f64, b: f64, x: f64, y: f64) -> f64 {
    if x <= 0.0 {
        return 0.0;
    }
    if y <= 0.0 {
        return 1.0;
    }
    if x > (a + 1.0) / (a + b + 2.0) {
        return 1.0 - beta_fraction(b, a, y, x);
    }
    beta_fraction(a, b, x, y)
}

/// The continued fraction (Abramowitz and Stegun 26.5.8) by Lentz's method.
fn beta_fraction(a: f64, b: f64, x: f64, y: f64) -> f64 {
    let n = a + b;
    // x^a y^b / B(a, b)
    let spread = (a / n * b / (2.0 * std::f64::consts::PI)).sqrt();
    let corrections = stirling_error(n) - stirling_error(a) - stirling_error(b);
    // n x - a, from the smaller one of x and y: the other one is rounded too coarsely.
    let off = if x < y { n * x - a } else { b - n * y };
    let front =
        spread * libm::exp(corrections - deviance(a, n * x, off) - deviance(b, n * y, -off));
    let keep = |value: f64| if value.abs() < TINY { TINY } else { value };
    let mut c = 1.0;
    let mut d = 1.0 / keep(1.0 - n * x / (a + 1.0));
    let mut fraction = d;
    for i in 1..MOST_TERMS {
        let m = i as f64;
        let even = m * (b - m) * x / ((a + 2.0 * m - 1.0) * (a + 2.0 * m));
        d = 1.0 / keep(1.0 + even * d);
        c = keep(1.0 + even / c);
        fraction *= d * c;
        let odd = -(a + m) * (n + m) * x / ((a + 2.0 * m) * (a + 2.0 * m + 1.0));
        d = 1.0 / keep(1.0 + odd * d);
        c = keep(1.0 + odd / c);
        fraction *= d * c;
        if (d * c - 1.0).abs() <= PRECISE {
            break;
        }
    }
    (front / a * fraction).clamp(0.0, 1.0)
}

/// The regularised incomplete gamma functions P(a, x) and Q(a, x) = 1 - P, for a > 0.
pub(super) fn gamma(a: f64, x: f64) -> (f64, f64) {
    if x <= 0.0 {
        return (0.0, 1.0);
    }
    if x == f64::INFINITY {
        return (1.0, 0.0);
    }
    // x^a e^-x / Gamma(a)
    let front = (a / (2.0 * std::f64::consts::PI)).sqrt()
        * libm::exp(-deviance(a, x, x - a) - stirling_error(a));
    if x < a + 1.0 {
        let below = (front * gamma_series(a, x)).min(1.0);
        (below, 1.0 - below)
    } else {
        let above = (front * gamma_fraction(a, x)).min(1.0);
        (1.0 - above, above)
    }
}

/// Abramowitz and Stegun 6.5.29.
fn gamma_series(a: f64, x: f64) -> f64 {
    let mut term = 1.0 / a;
    let mut sum = term;
    for i in 1..MOST_TERMS {
        term *= x / (a + i as f64);
        sum += term;
        if term <= sum * PRECISE {
            break;
        }
    }
    sum
}

/// Abramowitz and Stegun 6.5.31, by Lentz's method.
fn gamma_fraction(a: f64, x: f64) -> f64 {
    let mut b = x + 1.0 - a;
    let mut c = 1.0 / TINY;
    let mut d = 1.0 / b;
    let mut fraction = d;
    for i in 1..MOST_TERMS {
        let m = i as f64;
        let part = -m * (m - a);
        b += 2.0;
        d = part * d + b;
        d = 1.0 / if d.abs() < TINY { TINY } else { d };
        c = b + part / c;
        c = if c.abs() < TINY { TINY } else { c };
        fraction *= d * c;
        if (d * c - 1.0).abs() <= PRECISE {
            break;
        }
    }
    fraction
}

/// Where `f` changes its sign between `low` and `high`: inverse quadratic steps or
/// halving, as Chandrupatla (1997) chooses between them. The nearer end where it
/// does not change.
pub(super) fn root(f: impl Fn(f64) -> f64, low: f64, high: f64) -> f64 {
    // a and b hold the root between them; c is the point that was dropped last.
    let (mut a, mut b) = (high, low);
    let (mut fa, mut fb) = (f(a), f(b));
    let mut share = 0.5;
    for _ in 0..200 {
        let x = a + share * (b - a);
        let fx = f(x);
        let (c, fc) = if (fx > 0.0) == (fa > 0.0) {
            (a, fa)
        } else {
            let dropped = (b, fb);
            (b, fb) = (a, fa);
            dropped
        };
        (a, fa) = (x, fx);
        let best = if fa.abs() < fb.abs() { a } else { b };
        let width = (b - a).abs();
        let smallest = 2.0 * f64::EPSILON * best.abs();
        if fa == 0.0 || width <= smallest {
            return best;
        }
        let (xi, phi) = ((a - b) / (c - b), (fa - fb) / (fc - fb));
        let quadratic = 1.0 - (1.0 - xi).sqrt() < phi && phi < xi.sqrt();
        share = if quadratic {
            fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
        } else {
            0.5
        };
        let edge = (smallest / width / 2.0).min(0.5);
        share = share.clamp(edge, 1.0 - edge);
    }
    if fa.abs() < fb.abs() { a } else { b }
}

/// The root of a function that rises in `x`, from a first guess outward in steps
/// that double. Not a number where none is met in 1000 steps.
pub(super) fn root_from(f: impl Fn(f64) -> f64, guess: f64, step: f64) -> f64 {
    let way = if f(guess) > 0.0 { -1.0 } else { 1.0 };
    let (mut near, mut step) = (guess, way * step);
    for _ in 0..1000 {
        let far = near + step;
        if f(far) * way >= 0.0 {
            return root(f, near.min(far), near.max(far));
        }
        near = far;
        step *= 2.0;
    }
    f64::NAN
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn factorials_and_half_integers() {
        // ln 20! and ln Gamma(1/2 + 1) = ln(sqrt(pi) / 2), computed.
        let log_gamma = |a: f64| {
            stirling_error(a) + (a + 0.5) * libm::log(a) - a
                + 0.5 * libm::log(2.0 * std::f64::consts::PI)
        };
        assert!((log_gamma(20.0) - 42.335_616_460_753_485).abs() < 1e-13);
        assert!((log_gamma(0.5) + 0.120_782_237_635_245_22).abs() < 1e-15);
        // The two ways meet.
        assert!((stirling_error(15.999_999_999) - stirling_error(16.0)).abs() < 1e-12);
    }

    #[test]
    fn closed_forms() {
        for x in [1e-9, 0.03, 0.4, 0.9, 0.999_999] {
            let y = 1.0 - x;
            // I_x(1, b) = 1 - y^b, I_x(a, 1) = x^a, P(1, x) = 1 - e^-x.
            assert!((beta(1.0, 3.0, x, y) - (1.0 - y * y * y)).abs() < 1e-15);
            assert!((beta(2.0, 1.0, x, y) / (x * x) - 1.0).abs() < 1e-13);
            assert!((gamma(1.0, x).0 / -libm::expm1(-x) - 1.0).abs() < 1e-14);
        }
        assert_eq!(
            (beta(2.0, 3.0, 0.0, 1.0), beta(2.0, 3.0, 1.0, 0.0)),
            (0.0, 1.0)
        );
        let middle = beta(1e8, 1e8, 0.5, 0.5);
        assert!((middle - 0.5).abs() < 1e-10, "{middle}");
    }

    #[test]
    fn roots() {
        let found = root(|x| x * x * x - 2.0, 0.0, 5.0);
        assert!((found - libm::cbrt(2.0)).abs() < 1e-15);
        let far = root_from(|x| libm::exp(x) - 1e40, 0.0, 0.1);
        assert!((far - 40.0 * std::f64::consts::LN_10).abs() < 1e-12);
        let left = root_from(|x| x + 1234.5, 1.0, 0.1);
        assert!((left + 1234.5).abs() < 1e-11);
        assert!(root_from(|_| 1.0, 0.0, 1.0).is_nan());
    }
}
