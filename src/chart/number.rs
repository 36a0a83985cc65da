//! Numbers for people: as many digits as mean something, a real minus sign.

/// Above this, and below its inverse, numbers are written with an exponent.
const LARGE: f64 = 1e6;

/// `value` to `places` decimals.
pub fn fixed(value: f64, places: usize) -> String {
    if !value.is_finite() {
        return "?".to_owned();
    }
    if value.abs() >= LARGE {
        return with_exponent(value, 4);
    }
    signed(format!("{value:.places$}"))
}

/// `value` to `digits` significant digits, or whole where it has more; trailing zeros
/// dropped.
pub fn short(value: f64, digits: usize) -> String {
    if !value.is_finite() {
        return "?".to_owned();
    }
    if value == 0.0 {
        return "0".to_owned();
    }
    if value.abs() >= LARGE || value.abs() < 1e-4 {
        return with_exponent(value, digits);
    }
    let text = format!("{value:.*}", decimals(value, digits));
    signed(without_zeros(&text).to_owned())
}

/// A value and its uncertainty, both to the second significant digit of the latter
/// (JCGM 100 7.2.6: at most two digits).
pub fn with_uncertainty(value: f64, expanded: f64) -> (String, String) {
    if !expanded.is_finite() || expanded <= 0.0 {
        return (short(value, 4), short(expanded, 2));
    }
    let places = decimals(expanded, 2).min(6);
    (fixed(value, places), fixed(expanded, places))
}

/// A difference with its sign always written, cut where its uncertainty is.
pub fn with_sign(value: f64, expanded: f64) -> String {
    let (text, _) = with_uncertainty(value, expanded);
    if value > 0.0 && value.is_finite() {
        format!("+{text}")
    } else {
        text
    }
}

/// Decimals that show `digits` significant digits of `value`.
fn decimals(value: f64, digits: usize) -> usize {
    let exponent = format!("{:.*e}", digits.saturating_sub(1), value.abs());
    let power: i32 = exponent
        .rsplit('e')
        .next()
        .and_then(|power| power.parse().ok())
        .unwrap_or(0);
    usize::try_from(digits as i32 - 1 - power).unwrap_or(0)
}

fn with_exponent(value: f64, digits: usize) -> String {
    let text = format!("{value:.*e}", digits.saturating_sub(1));
    match text.split_once('e') {
        Some((mantissa, power)) => signed(format!("{}e{power}", without_zeros(mantissa))),
        None => signed(text),
    }
}

fn without_zeros(text: &str) -> &str {
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.')
    } else {
        text
    }
}

/// A hyphen becomes a minus sign, and a zero has none.
fn signed(text: String) -> String {
    match text.strip_prefix('-') {
        Some(rest) if rest.chars().all(|c| c == '0' || c == '.') => rest.to_owned(),
        Some(rest) => format!("−{}", rest.replace('-', "−")),
        None => text.replace('-', "−"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_carry_no_idle_digits() {
        for (value, text) in [
            (2500.0, "2500"),
            (10.8, "10.8"),
            (5.3999999999999995, "5.4"),
            (0.11, "0.11"),
            (-0.0, "0"),
            (-1.5, "−1.5"),
            (123456.7, "123457"),
            (1.25e9, "1.25e9"),
            (2.5e-7, "2.5e−7"),
            (f64::NAN, "?"),
            (f64::INFINITY, "?"),
        ] {
            assert_eq!(short(value, 4), text, "{value:?}");
        }
        assert_eq!(fixed(-0.04, 1), "0.0");
        assert_eq!(fixed(2500.0, 0), "2500");
        assert_eq!(with_sign(4.0, 1.9), "+4.0");
        assert_eq!(with_sign(-4.0, 1.9), "−4.0");
    }

    #[test]
    fn a_value_is_cut_where_its_uncertainty_is() {
        for (value, expanded, shown) in [
            (9.53421, 0.1234, ("9.53", "0.12")),
            (1498.3, 14.2, ("1498", "14")),
            (93.44, 1.96, ("93.4", "2.0")),
            (9.0, 0.0, ("9", "0")),
            (9.0, 0.00999, ("9.000", "0.010")),
            (9.0, f64::NAN, ("9", "?")),
        ] {
            let found = with_uncertainty(value, expanded);
            assert_eq!((found.0.as_str(), found.1.as_str()), shown);
        }
    }
}
