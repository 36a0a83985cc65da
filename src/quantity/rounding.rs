//! Comparisons that forgive the last binary digits, and shortest decimals.

/// Relative width within which two values count as equal (invariant 10):
/// 4.5 x 1.2 is not 5.4 in binary, and a limit is meant in decimal.
const SAME: f64 = 1e-9;

/// Whether `a` and `b` agree to 1e-9 of the larger.
pub fn near(a: f64, b: f64) -> bool {
    (a - b).abs() <= SAME * a.abs().max(b.abs())
}

/// `value <= limit`, the boundary included after rounding to 1e-9 relative.
pub fn at_most(value: f64, limit: f64) -> bool {
    value <= limit || near(value, limit)
}

/// `value >= limit`, the boundary included after rounding to 1e-9 relative.
pub fn at_least(value: f64, limit: f64) -> bool {
    value >= limit || near(value, limit)
}

/// The shortest decimal that reads back as the same number.
pub fn shortest(value: f64) -> String {
    let text = format!("{value}");
    if text == "-0" { "0".to_owned() } else { text }
}

/// A number in so many significant digits (at least one), without idle zeros.
pub fn significant(value: f64, digits: usize) -> String {
    format!("{value:.*e}", digits.saturating_sub(1))
        .parse()
        .map_or_else(|_| value.to_string(), shortest)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn decimal_boundaries_that_miss_in_binary_are_met() {
        for (a, b, limit) in [(4.5, 1.2, 5.4), (26.0, 0.9, 23.4), (400.0, 1.15, 460.0)] {
            assert!(at_most(limit, a * b) && at_least(limit, a * b), "{a} x {b}");
            assert!(!at_most(limit * (1.0 + 1e-6), a * b));
            assert!(!at_least(limit * (1.0 - 1e-6), a * b));
        }
    }

    #[test]
    fn shortest_reads_back() {
        for x in [0.1, -0.0, 230.0, 1e-7, 9.530000000000001] {
            assert_eq!(shortest(x).parse::<f64>().unwrap(), x);
        }
        assert_eq!(shortest(-0.0), "0");
    }
}
