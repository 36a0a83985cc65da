//! Combining standard uncertainties (JCGM 100), independent or correlated.

use super::coverage_factor;

/// Correlations closer to +-1 than this are full ones.
const FULL: f64 = 1.0 - 1e-9;

/// One input of a budget, already times its sensitivity.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Part {
    /// Standard uncertainty in the result's unit. Its sign, that of the sensitivity,
    /// counts where the input is correlated with another one.
    pub standard: f64,
    /// Its degrees of freedom; infinite where it is no estimate from data.
    pub freedom: f64,
}

/// The correlation between the inputs behind two parts of a budget.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Correlation {
    /// Place of one part in the budget.
    pub a: usize,
    /// Place of the other.
    pub b: usize,
    /// Correlation coefficient of the inputs, -1 to 1.
    pub r: f64,
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

impl Combined {
    /// From u_c^2 and u_c^4 / nu_eff.
    fn from(variance: f64, spent: f64) -> Self {
        let freedom = if spent > 0.0 {
            variance * variance / spent
        } else {
            f64::INFINITY
        };
        let standard = variance.sqrt();
        // Rounding must not cost a whole degree of freedom: 4.999999999 is 5.
        let coverage = coverage_factor(freedom * (1.0 + 1e-9));
        Self {
            standard,
            freedom,
            coverage,
            expanded: coverage * standard,
        }
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
    Combined::from(variance, spent)
}

/// u_c^2 = sum u_i^2 + 2 sum r_ij u_i u_j with signed u_i (JCGM 100, 5.2.2).
///
/// Effective degrees of freedom: the formula of Welch and Satterthwaite holds for
/// independent parts, so parts are first put together until they are:
///
/// 1. parts with r = +-1 are added, signs and all, to one part, with the fewest
///    degrees of freedom among them;
/// 2. parts that are joined by other correlations become one group with its
///    variance, covariances included. Where all of them have the same number of
///    degrees of freedom they come from paired observations, and the variance of
///    any sum of these has exactly this number (JCGM 100 H.2, n - 1). Where not, the
///    fewer of two numbers are taken, which is conservative: the fewest among them,
///    and that for the variance of independent estimates, u^4 / sum((u_i c_i)^2 / nu_i)
///    with c_i = u_i + sum r_ij u_j, which is low for small differences.
///
/// A correlation with an absent part, or of a part with itself, says nothing; of two
/// for the same pair the later one counts; beyond +-1 it is +-1, and one that is
/// not a number is full, with the sign that enlarges u_c. What is fully correlated
/// with a part shares its correlations. Where correlations contradict each other (by
/// more than published coefficients are rounded) u_c = sum |u_i|, which none can
/// exceed. A u_c^2 below zero by rounding is zero.
pub fn combine_correlated(parts: &[Part], correlations: &[Correlation]) -> Combined {
    let Some(shared) = Shared::of(parts, correlations).merged() else {
        return worst(parts);
    };
    let (mut variance, mut spent) = (0.0, 0.0);
    for group in connected(shared.parts.len(), |i, j| shared.r[i][j] != 0.0) {
        let Some((own, share)) = shared.group(&group) else {
            return worst(parts);
        };
        variance += own;
        spent += share;
    }
    Combined::from(variance, spent)
}

/// Every part at its full size in the same direction.
fn worst(parts: &[Part]) -> Combined {
    let sum: f64 = parts.iter().map(|p| p.standard.abs()).sum();
    let fewest = parts
        .iter()
        .map(|p| p.freedom.max(1.0))
        .fold(f64::INFINITY, f64::min);
    Combined::from(sum * sum, sum.powi(4) / fewest)
}

/// Parts with the matrix of their correlations.
struct Shared {
    parts: Vec<Part>,
    r: Vec<Vec<f64>>,
}

impl Shared {
    fn of(parts: &[Part], correlations: &[Correlation]) -> Self {
        let n = parts.len();
        let mut matrix = vec![vec![0.0; n]; n];
        for (i, row) in matrix.iter_mut().enumerate() {
            row[i] = 1.0;
        }
        for Correlation { a, b, r } in correlations.iter().copied() {
            if a >= n || b >= n || a == b {
                continue;
            }
            let enlarges = (parts[a].standard * parts[b].standard).signum();
            let r = if r.is_nan() {
                enlarges
            } else {
                r.clamp(-1.0, 1.0)
            };
            matrix[a][b] = r;
            matrix[b][a] = r;
        }
        Self {
            parts: parts.to_vec(),
            r: matrix,
        }
    }

    /// With fully correlated parts added to one; nothing where they contradict.
    fn merged(&self) -> Option<Self> {
        let sets = connected(self.parts.len(), |i, j| self.r[i][j].abs() >= FULL);
        let ways: Vec<Vec<(usize, f64)>> = sets
            .iter()
            .map(|set| self.ways(set))
            .collect::<Option<_>>()?;
        let sum = |ways: &Vec<(usize, f64)>| Part {
            standard: ways
                .iter()
                .map(|(i, way)| way * self.parts[*i].standard)
                .sum(),
            freedom: fewest(&self.parts, ways.iter().map(|(i, _)| *i)),
        };
        let between = |left: &[(usize, f64)], right: &[(usize, f64)]| {
            left.iter()
                .flat_map(|(i, a)| right.iter().map(move |(j, b)| a * b * self.r[*i][*j]))
                .fold(
                    0.0,
                    |most: f64, r| if r.abs() > most.abs() { r } else { most },
                )
        };
        Some(Self {
            parts: ways.iter().map(sum).collect(),
            r: ways
                .iter()
                .map(|left| ways.iter().map(|right| between(left, right)).collect())
                .collect(),
        })
    }

    /// Which way each part of a fully correlated set goes when the first one goes
    /// up; nothing where a stated correlation says otherwise.
    fn ways(&self, set: &[usize]) -> Option<Vec<(usize, f64)>> {
        let mut ways = vec![(set[0], 1.0)];
        while ways.len() < set.len() {
            let next = set.iter().find_map(|j| {
                let known = ways.iter().any(|(i, _)| i == j);
                let from = ways.iter().find(|(i, _)| self.r[*i][*j].abs() >= FULL)?;
                (!known).then(|| (*j, from.1 * self.r[from.0][*j].signum()))
            })?;
            ways.push(next);
        }
        let agree = ways.iter().all(|(i, a)| {
            ways.iter()
                .all(|(j, b)| self.r[*i][*j] == 0.0 || self.r[*i][*j] * a * b > 0.9)
        });
        agree.then_some(ways)
    }

    /// A group's u^2 and u^4 / nu; nothing where its correlations contradict.
    fn group(&self, group: &[usize]) -> Option<(f64, f64)> {
        if !possible(
            group
                .iter()
                .map(|i| group.iter().map(|j| self.r[*i][*j]).collect()),
        ) {
            return None;
        }
        let covariance =
            |i: usize, j: usize| self.r[i][j] * self.parts[i].standard * self.parts[j].standard;
        let rows: Vec<f64> = group
            .iter()
            .map(|i| group.iter().map(|j| covariance(*i, *j)).sum())
            .collect();
        let variance = rows.iter().sum::<f64>().max(0.0);
        let fewest = fewest(&self.parts, group.iter().copied());
        let as_one = variance * variance / fewest;
        let paired = group
            .iter()
            .map(|i| &self.parts[*i])
            .all(|part| part.standard == 0.0 || part.freedom.max(1.0) == fewest);
        if paired {
            return Some((variance, as_one));
        }
        let apart: f64 = group
            .iter()
            .zip(&rows)
            .map(|(i, row)| row * row / self.parts[*i].freedom.max(1.0))
            .sum();
        Some((variance, as_one.max(apart)))
    }
}

/// Whether a matrix of correlations has no negative direction, by more than three
/// published digits round (elimination in place, pivots from the top).
fn possible(rows: impl Iterator<Item = Vec<f64>>) -> bool {
    const ROUNDED: f64 = 0.01;
    let mut r: Vec<Vec<f64>> = rows.collect();
    for k in 0..r.len() {
        let pivot = r[k][k];
        if pivot < -ROUNDED {
            return false;
        }
        if pivot <= ROUNDED {
            // Nothing is left of it: what it shares with others must be little too.
            if (k + 1..r.len()).any(|j| r[k][j].abs() > ROUNDED.sqrt()) {
                return false;
            }
            continue;
        }
        let top = r[k].clone();
        for row in &mut r[k + 1..] {
            let share = row[k] / pivot;
            for (value, above) in row.iter_mut().zip(&top) {
                *value -= share * above;
            }
        }
    }
    true
}

/// The fewest degrees of freedom among parts that are not nothing; at least 1.
fn fewest(parts: &[Part], set: impl Iterator<Item = usize>) -> f64 {
    set.map(|i| &parts[i])
        .filter(|part| part.standard != 0.0)
        .map(|part| part.freedom.max(1.0))
        .fold(f64::INFINITY, f64::min)
}

/// Sets of places that `joined` connects, directly or through others, in order.
fn connected(n: usize, joined: impl Fn(usize, usize) -> bool) -> Vec<Vec<usize>> {
    let mut sets: Vec<Vec<usize>> = Vec::new();
    for i in 0..n {
        let (touched, apart): (Vec<_>, Vec<_>) = sets
            .into_iter()
            .partition(|set| set.iter().any(|j| joined(i, *j)));
        sets = apart;
        let mut set: Vec<usize> = touched.into_iter().flatten().chain([i]).collect();
        set.sort_unstable();
        sets.push(set);
    }
    sets.sort();
    sets
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

    fn part(standard: f64, freedom: f64) -> Part {
        Part { standard, freedom }
    }

    fn joined(a: usize, b: usize, r: f64) -> Correlation {
        Correlation { a, b, r }
    }

    #[test]
    fn full_correlation_is_one_part_with_its_own_degrees() {
        // 3 and 4 with nu 5 are 7 with nu 5, not 5 with 14.
        let parts = [part(3.0, 5.0), part(4.0, 5.0), part(1.0, f64::INFINITY)];
        let all = combine_correlated(&parts, &[joined(0, 1, 1.0)]);
        assert!((all.standard - 50f64.sqrt()).abs() < 1e-12);
        assert!((all.freedom - 2500.0 / (7f64.powi(4) / 5.0)).abs() < 1e-9);
        // The third of a chain belongs to it, though it is joined to one only.
        let chain = combine_correlated(
            &[part(3.0, 5.0), part(4.0, 9.0), part(-2.0, 9.0)],
            &[joined(0, 1, 1.0), joined(1, 2, 1.0)],
        );
        assert!((chain.standard - 5.0).abs() < 1e-12 && (chain.freedom - 5.0).abs() < 1e-9);
    }

    #[test]
    fn partial_correlation_takes_the_fewer_degrees() {
        // Paired observations: nu is theirs, whatever the sum is.
        let paired = [part(3.0, 4.0), part(4.0, 4.0)];
        let sum = combine_correlated(&paired, &[joined(0, 1, 0.5)]);
        assert!((sum.standard - 37f64.sqrt()).abs() < 1e-12);
        assert!((sum.freedom - 4.0).abs() < 1e-9);
        // A small difference of two large independent estimates is known worse.
        let apart = [part(3.0, 4.0), part(-4.0, 9.0)];
        let difference = combine_correlated(&apart, &[joined(0, 1, 0.99)]);
        assert!(difference.freedom < 4.0, "{difference:?}");
    }

    #[test]
    fn nothing_negative_and_nothing_absurd_escapes() {
        let third = 0.1 + 0.2;
        let none = combine_correlated(&[part(third, 3.0), part(-0.3, 3.0)], &[joined(0, 1, 1.0)]);
        assert!(none.standard.abs() < 1e-15 && none.expanded.abs() < 1e-14);
        let parts = [part(1.0, 9.0), part(2.0, 9.0), part(3.0, 9.0)];
        for contradiction in [
            [joined(0, 1, 1.0), joined(1, 2, 1.0), joined(0, 2, -1.0)],
            [joined(0, 1, 0.9), joined(1, 2, 0.9), joined(0, 2, -0.9)],
            [joined(0, 1, -0.9), joined(1, 2, -0.9), joined(0, 2, -0.9)],
        ] {
            let all = combine_correlated(&parts, &contradiction);
            assert!((all.standard - 6.0).abs() < 1e-12, "{all:?}");
        }
        let odd = [
            joined(0, 7, 1.0),
            joined(1, 1, -1.0),
            joined(0, 1, f64::NAN),
            joined(0, 2, 5.0),
            joined(0, 2, 0.0),
        ];
        let all = combine_correlated(&parts, &odd);
        assert!((all.standard - 18f64.sqrt()).abs() < 1e-12, "{all:?}");
        assert_eq!(combine_correlated(&[], &odd), combine(&[]));
    }

    proptest! {
        #[test]
        fn correlation_adds_or_subtracts(
            a in 1e-3..1e3f64, b in 1e-3..1e3f64, nu in 1.0..99.0f64,
        ) {
            let with = |r| combine_correlated(&[part(a, nu), part(b, nu)], &[joined(0, 1, r)]);
            prop_assert!((with(1.0).standard - (a + b)).abs() < 1e-12 * (a + b));
            prop_assert!((with(-1.0).standard - (a - b).abs()).abs() < 1e-12 * (a + b));
            let half = with(0.5).standard;
            prop_assert!(with(0.0).standard <= half && half <= with(0.9).standard);
        }

        #[test]
        fn without_correlations_it_is_the_plain_combination(
            parts in prop::collection::vec((-9.0..9.0f64, 1.0..50.0f64), 0..6),
        ) {
            let parts: Vec<Part> = parts.iter().map(|(u, nu)| part(*u, *nu)).collect();
            let (plain, found) = (combine(&parts), combine_correlated(&parts, &[]));
            prop_assert!((plain.standard - found.standard).abs() <= 1e-12 * plain.standard);
            prop_assert!((plain.freedom / found.freedom - 1.0).abs() < 1e-9
                || plain.freedom == found.freedom);
        }

        #[test]
        fn another_unit_changes_nothing(
            parts in prop::collection::vec((-9.0..9.0f64, 1.0..50.0f64), 3),
            r in -0.5..0.5f64, unit in 1e-6..1e6f64,
        ) {
            let scaled = |by: f64| {
                let parts: Vec<Part> = parts.iter().map(|(u, nu)| part(u * by, *nu)).collect();
                combine_correlated(&parts, &[joined(0, 1, r), joined(1, 2, r)])
            };
            let (one, other) = (scaled(1.0), scaled(unit));
            prop_assert!((other.standard / unit - one.standard).abs() <= 1e-9 * one.standard);
            prop_assert!((other.freedom / one.freedom - 1.0).abs() < 1e-6);
        }

        #[test]
        fn more_noise_never_shrinks_the_expanded_uncertainty(
            fixed in -5.0..5.0f64, noise in 1e-3..5.0f64, factor in 1.0..4.0f64,
            nu in 1.0..200.0f64, r in 0.0..1.0f64,
        ) {
            let with = |u: f64| combine_correlated(
                &[part(fixed.abs(), f64::INFINITY), part(u, nu)],
                &[joined(0, 1, r)],
            ).expanded;
            prop_assert!(with(noise * factor) >= with(noise) * (1.0 - 1e-9));
        }
    }
}
