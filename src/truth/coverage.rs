//! How often U covers the truth, and how far values lie from it in units of u.

use super::TruthError;
use super::equilibrium::{Settled, settled};
use super::play::Played;
use super::proportion::Proportion;
use super::setting::{Kind, Setting};
use super::unit::Unit;
use crate::analysis::{CellResult, Estimate};

/// What is estimated.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Quantity {
    /// Settled power at the cell's voltage.
    Power,
    /// Highest temperature of the link's body in the unit's own room.
    Body,
    /// The same at the highest ambient.
    Worst,
}

impl Quantity {
    /// All.
    pub const ALL: [Quantity; 3] = [Quantity::Power, Quantity::Body, Quantity::Worst];

    /// In words.
    pub fn words(self) -> &'static str {
        match self {
            Quantity::Power => "settled power",
            Quantity::Body => "body, highest",
            Quantity::Worst => "body, worst case",
        }
    }

    /// Its unit.
    pub fn unit(self) -> &'static str {
        match self {
            Quantity::Power => "W",
            Quantity::Body | Quantity::Worst => "K",
        }
    }

    /// What analysis says of it.
    pub(super) fn of(self, result: &CellResult) -> Option<&Estimate> {
        match self {
            Quantity::Power => result.steady.known().map(|steady| &steady.power_w),
            Quantity::Body => result.body_peak.known().map(|peak| &peak.temperature_degc),
            Quantity::Worst => result.body_worst.known(),
        }
    }

    fn truth(self, settled: &Settled) -> f64 {
        match self {
            Quantity::Power => settled.power_w,
            Quantity::Body => settled.body_degc,
            Quantity::Worst => settled.worst_degc,
        }
    }
}

/// Coverage of one quantity over a population.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Coverage {
    /// Of what.
    pub quantity: Quantity,
    /// In which appliance; absent: in both together.
    pub kind: Option<Kind>,
    /// Values whose U covers the truth, of all values.
    pub covered: Proportion,
    /// Units that left no value.
    pub without: u64,
    k: f64,
    expanded: f64,
    pull: f64,
    pull_squares: f64,
}

impl Coverage {
    fn new(quantity: Quantity, kind: Option<Kind>) -> Self {
        Coverage {
            quantity,
            kind,
            covered: Proportion::default(),
            without: 0,
            k: 0.0,
            expanded: 0.0,
            pull: 0.0,
            pull_squares: 0.0,
        }
    }

    fn add(&mut self, estimate: &Estimate, truth: f64) {
        let error = estimate.value - truth;
        let pull = error * estimate.coverage / estimate.expanded;
        self.covered.add(error.abs() <= estimate.expanded);
        self.k += estimate.coverage;
        self.expanded += estimate.expanded;
        self.pull += pull;
        self.pull_squares += pull * pull;
    }

    fn mean(&self, sum: f64) -> f64 {
        sum / (self.covered.of.max(1)) as f64
    }

    /// Mean coverage factor.
    pub fn mean_k(&self) -> f64 {
        self.mean(self.k)
    }

    /// Mean U.
    pub fn mean_expanded(&self) -> f64 {
        self.mean(self.expanded)
    }

    /// Mean of (value - truth) / u.
    pub fn mean_pull(&self) -> f64 {
        self.mean(self.pull)
    }

    /// Standard deviation of (value - truth) / u.
    pub fn pull_deviation(&self) -> f64 {
        let variance = self.mean(self.pull_squares) - self.mean_pull() * self.mean_pull();
        libm::sqrt(variance.max(0.0))
    }
}

/// A row for each quantity of both appliances together, and of each.
pub(super) fn rows() -> Vec<Coverage> {
    let kinds = [None, Some(Kind::Plain), Some(Kind::Fan)];
    let of = |quantity| kinds.map(|kind| Coverage::new(quantity, kind));
    Quantity::ALL.into_iter().flat_map(of).collect()
}

/// Counts one unit in; gives its truths, cell by cell.
pub(super) fn count(
    rows: &mut [Coverage],
    setting: &Setting,
    unit: &Unit,
    played: &Played,
) -> Result<Vec<Settled>, TruthError> {
    let cells = &setting.plan.cells;
    let truths: Vec<Settled> = cells
        .iter()
        .map(|cell| settled(setting, unit, cell))
        .collect::<Result<_, _>>()?;
    let position = setting.kind.position();
    let judged = cells.iter().position(|cell| cell.position == position);
    let truth = judged.and_then(|cell| truths.get(cell));
    let result = played.cell(position);
    let is_for = |row: &&mut Coverage| row.kind.is_none_or(|kind| kind == setting.kind);
    for row in rows.iter_mut().filter(is_for) {
        let estimate = result.and_then(|result| row.quantity.of(result));
        match (estimate, truth) {
            (Some(estimate), Some(truth)) => row.add(estimate, row.quantity.truth(truth)),
            _ => row.without += 1,
        }
    }
    Ok(truths)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_row_counts_what_u_covers_and_the_pull() {
        let mut row = Coverage::new(Quantity::Power, None);
        for (value, expanded) in [(10.0, 1.0), (11.0, 1.0), (11.1, 1.0), (9.0, 2.0)] {
            let estimate = Estimate {
                value,
                expanded,
                coverage: 2.0,
                freedom: None,
                budget: Vec::new(),
            };
            row.add(&estimate, 10.0);
        }
        assert_eq!(row.covered, Proportion { count: 3, of: 4 });
        // Pulls 0, 2, 2.2, -1.
        assert!((row.mean_pull() - 0.8).abs() < 1e-9);
        assert!((row.pull_deviation() - 1.349_073_8).abs() < 1e-6);
        assert!((row.mean_expanded() - 1.25).abs() < 1e-12 && row.mean_k() == 2.0);
    }
}
