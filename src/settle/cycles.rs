//! The cycles of a load that a thermostat switches.

/// Share of the whole swing that a value must fall by before a top counts as one.
const TURN: f64 = 0.3;

/// The highest point of every whole cycle in a series, oldest first. A series that
/// never turns has none.
pub(super) fn tops(points: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let (low, high) = points.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), (_, y)| (l.min(*y), h.max(*y)));
    let turn = TURN * (high - low);
    let mut tops = Vec::new();
    let mut rising = true;
    let Some(mut extreme) = points.first().copied() else { return tops };
    for &(x, y) in points {
        if rising {
            if y > extreme.1 {
                extreme = (x, y);
            } else if extreme.1 - y > turn {
                tops.push(extreme);
                rising = false;
                extreme = (x, y);
            }
        } else if y < extreme.1 {
            extreme = (x, y);
        } else if y - extreme.1 > turn {
            rising = true;
            extreme = (x, y);
        }
    }
    tops
}
