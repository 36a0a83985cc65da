//! How far a slow second time constant could move a predicted end.
//!
//! A single exponential swallows the beginning of a second, slower one, and its own
//! standard error knows nothing of that. So the end is estimated again with a slower
//! exponential beside it, about the fitted time constant (one Gauss-Newton step): how
//! far the end moves, and how well it is known then, is what the data can exclude.

/// Second time constants that are tried, in multiples of the first.
const SLOWER: [f64; 2] = [3.0, 8.0];
/// End, amplitude, change of the time constant, slow amplitude.
const COLUMNS: usize = 4;

/// The larger of shift and standard error of the end over the slower time constants;
/// nothing where it can't be told. `worth` is the effective number of points.
pub(super) fn possible_shift(points: &[(f64, f64)], end: f64, tau: f64, worth: f64) -> Option<f64> {
    let shifts = SLOWER.map(|times| {
        let (found, error) = end_with(points, tau, times, worth)?;
        let shift = (found - end).abs().max(error);
        shift.is_finite().then_some(shift)
    });
    shifts
        .into_iter()
        .try_fold(0.0_f64, |most, shift| Some(most.max(shift?)))
}

/// End and its standard error with an exponential of `times * tau` beside the first.
fn end_with(points: &[(f64, f64)], tau: f64, times: f64, worth: f64) -> Option<(f64, f64)> {
    let start = points.first()?.0;
    let row = |t: f64| {
        let x = (t - start) / tau;
        let fast = libm::exp(-x);
        [1.0, fast, x * fast, libm::exp(-x / times)]
    };
    let mut matrix = [[0.0; COLUMNS + 2]; COLUMNS];
    for (t, y) in points {
        let r = row(*t);
        for i in 0..COLUMNS {
            for j in 0..COLUMNS {
                matrix[i][j] += r[i] * r[j];
            }
            matrix[i][COLUMNS] += r[i] * y;
        }
    }
    // Beside the solution, the inverse's first column: the variance of the end.
    matrix[0][COLUMNS + 1] = 1.0;
    let solved = solved(matrix)?;
    let squares: f64 = points
        .iter()
        .map(|(t, y)| {
            let r = row(*t);
            let fitted: f64 = (0..COLUMNS).map(|i| r[i] * solved[i].0).sum();
            (y - fitted).powi(2)
        })
        .sum();
    let freedom = (worth.min(points.len() as f64) - COLUMNS as f64).max(1.0);
    let variance = squares / freedom * solved[0].1.max(0.0);
    Some((solved[0].0, variance.sqrt()))
}

/// Gauss with the largest pivot; both right sides at once.
fn solved(mut m: [[f64; COLUMNS + 2]; COLUMNS]) -> Option<[(f64, f64); COLUMNS]> {
    for k in 0..COLUMNS {
        let largest = (k..COLUMNS).max_by(|a, b| m[*a][k].abs().total_cmp(&m[*b][k].abs()))?;
        m.swap(k, largest);
        if m[k][k].abs() < 1e-12 {
            return None;
        }
        let pivot = m[k];
        for (_, row) in m.iter_mut().enumerate().filter(|(i, _)| *i != k) {
            let factor = row[k] / pivot[k];
            for (value, of_pivot) in row.iter_mut().zip(pivot) {
                *value -= factor * of_pivot;
            }
        }
    }
    Some(std::array::from_fn(|i| {
        (m[i][COLUMNS] / m[i][i], m[i][COLUMNS + 1] / m[i][i])
    }))
}
