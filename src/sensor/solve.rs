//! Inverting a rising function.

/// Where the rising function `f` (value and slope) takes the value `wanted`,
/// between `low` and `high`; the nearer end where it lies outside.
///
/// Newton's steps, each kept within a bracket that only shrinks: where a step
/// leaves it, or the slope is useless, the bracket is halved instead. Ends where
/// the function can't be told from `wanted`, or neighbouring numbers are reached.
pub(super) fn rising(f: impl Fn(f64) -> (f64, f64), wanted: f64, low: f64, high: f64) -> f64 {
    let (mut low, mut high) = (low, high);
    if wanted <= f(low).0 {
        return low;
    }
    if wanted >= f(high).0 {
        return high;
    }
    let mut at = 0.5 * (low + high);
    // Halving alone takes 60 steps from 2000 K to the last bit; Newton takes 5.
    for _ in 0..200 {
        let (value, slope) = f(at);
        let over = value - wanted;
        if over == 0.0 {
            break;
        }
        if over > 0.0 {
            high = at;
        } else {
            low = at;
        }
        let step = at - over / slope;
        let next = if step > low && step < high {
            step
        } else {
            0.5 * (low + high)
        };
        if (next - at).abs() < 1e-10 {
            return next;
        }
        at = next;
    }
    at
}

/// A polynomial and its slope, by Horner's scheme; coefficients from power 0 on.
pub(super) fn polynomial(coefficients: &[f64], x: f64) -> (f64, f64) {
    coefficients
        .iter()
        .rev()
        .fold((0.0, 0.0), |(value, slope), c| {
            (value * x + c, slope * x + value)
        })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_polynomial_has_its_value_and_slope() {
        // 2 - 3 x + x^3 at 2: 4, slope 9 (by hand).
        assert_eq!(polynomial(&[2.0, -3.0, 0.0, 1.0], 2.0), (4.0, 9.0));
        assert_eq!(polynomial(&[], 2.0), (0.0, 0.0));
    }

    #[test]
    fn a_flat_spot_does_not_throw_the_search_off() {
        // x^3 has no slope at 0, where the search begins.
        let cube = |x: f64| (x * x * x, 3.0 * x * x);
        assert!((rising(cube, 8.0, -10.0, 10.0) - 2.0).abs() < 1e-9);
        assert_eq!(rising(cube, 1e6, -10.0, 10.0), 10.0);
        assert_eq!(rising(cube, -1e6, -10.0, 10.0), -10.0);
    }
}
