//! Combining standard uncertainties (JCGM 100, independent inputs).

use super::coverage_factor;

/// One input of a budget, already times its sensitivity.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Part {
    /// Standard uncertainty in the result's unit.
    pub standard: f64,
    /// Its degrees of freedom; infinite where it is no estimate from data.
    pub freedom: f64,
}

/// A combined uncertainty.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Combined {
    /// u_c.
    pub standard: f64,
    /// Effective degrees of freedom (Welch-Satterthwaite), not truncated.
    pub freedom: f64,
    /// Coverage factor k at 95.45 %, from the truncated degrees of freedom.
    pub coverage: f64,
    /// U = k u_c.
    pub expanded: f64,
}

/// A correlation between two inputs of a budget.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Correlation {
    /// Index of one part.
    pub a: usize,
    /// Index of the other.
    pub b: usize,
    /// Correlation coefficient, -1 to 1.
    pub r: f64,
}

/// Like [`combine`], with parts that carry the sign of their sensitivity and whose
/// inputs may be correlated: u_c^2 gains 2 sum r c_i u_i c_j u_j (JCGM 100, 5.2.2).
pub fn combine_correlated(parts: &[Part], correlations: &[Correlation]) -> Combined {
    let alone = combine(parts);
    let both = |c: &Correlation| {
        let (a, b) = (parts.get(c.a)?, parts.get(c.b)?);
        Some(2.0 * c.r.clamp(-1.0, 1.0) * a.standard * b.standard)
    };
    let common: f64 = correlations.iter().filter_map(both).sum();
    if common == 0.0 {
        return alone;
    }
    let variance = (alone.standard * alone.standard + common).max(0.0);
    let standard = variance.sqrt();
    Combined {
        standard,
        expanded: alone.coverage * standard,
        ..alone
    }
}

/// u_c^2 = sum u_i^2 and nu_eff = u_c^4 / sum(u_i^4 / nu_i) (JCGM 100, 5.1.2 and G.4.1).
pub fn combine(parts: &[Part]) -> Combined {
    let variance: f64 = parts.iter().map(|p| p.standard * p.standard).sum();
    let spent: f64 = parts
        .iter()
        .filter(|p| p.freedom.is_finite())
        .map(|p| p.standard.powi(4) / p.freedom.max(1.0))
        .sum();
    let freedom = if spent > 0.0 {
        variance * variance / spent
    } else {
        f64::INFINITY
    };
    let standard = variance.sqrt();
    // Rounding must not cost a whole degree of freedom: 4.999999999 is 5.
    let coverage = coverage_factor(freedom * (1.0 + 1e-9));
    Combined {
        standard,
        freedom,
        coverage,
        expanded: coverage * standard,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::stats::student_quantile;
    use proptest::prelude::*;

    // JCGM 100 H.1, end gauge: contributions 25, 9.7, 2.9 and 16.6 nm, u_c 31.71 nm
    // (published 32), nu_eff 16.66 -> 16, U99 93 nm.
    #[test]
    fn end_gauge_of_jcgm_100_h1() {
        let length = 0.050_000_623e9;
        let parts = [
            (25.0, 18.0),
            (9.7, 25.6),
            (length * 0.1 * 0.58e-6, 50.0),
            (length * 11.5e-6 * 0.029, 2.0),
        ]
        .map(|(standard, freedom)| Part { standard, freedom });
        assert!((parts[2].standard - 2.9).abs() < 0.05);
        // Full digits give 16.675; 16.6 is printed.
        assert!((parts[3].standard - 16.6).abs() < 0.1);
        let all = combine(&parts);
        assert!((all.standard - 31.71).abs() < 0.01, "{}", all.standard);
        assert!((all.freedom - 16.66).abs() < 0.1, "{}", all.freedom);
        assert_eq!(all.freedom.floor(), 16.0);
        let t99 = student_quantile(0.995, 16.0).unwrap();
        assert_eq!((t99 * all.standard).round(), 93.0);
        assert!((all.coverage - 2.17).abs() < 0.0051);
    }

    // JCGM 100 G.4.1 (inputs from memory): 0.25, 0.57, 0.82 % with 9, 4, 14 degrees.
    #[test]
    fn product_of_three_of_jcgm_100_g41() {
        let all = combine(
            &[(0.25, 9.0), (0.57, 4.0), (0.82, 14.0)]
                .map(|(standard, freedom)| Part { standard, freedom }),
        );
        assert!((all.standard - 1.03).abs() < 0.005);
        assert!((all.freedom - 19.0).abs() < 0.1);
    }

    #[test]
    fn nothing_uncertain_is_certain() {
        let none = combine(&[]);
        assert_eq!((none.standard, none.expanded), (0.0, 0.0));
        assert!((none.coverage - 2.0).abs() < 1e-9);
    }

    proptest! {
        #[test]
        fn a_larger_share_from_data_never_shrinks_the_whole(
            fixed in 0.0..5.0f64, data in 1e-3..5.0f64, factor in 1.0..4.0f64, freedom in 1.0..200.0f64,
        ) {
            let with = |u: f64| combine(&[
                Part { standard: fixed, freedom: f64::INFINITY },
                Part { standard: u, freedom },
            ]).expanded;
            prop_assert!(with(data * factor) >= with(data) * (1.0 - 1e-9));
        }
    }
}
