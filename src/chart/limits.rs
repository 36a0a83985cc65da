//! Which limits are drawn: those that a finding was judged by, else those that the
//! plan's rules give.

use std::cmp::Ordering;

use super::Scene;
use super::axis::drawable;
use super::caption::{self, About};
use super::words::clean;
use crate::plan::{Cell, PlannedPlate};
use crate::quantity::Watts;
use crate::spec::plate;
use crate::spec::sequence::{RuleKind, Span};

/// What the input of a cell is held against, in watts.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct PowerLimits {
    /// What the plate promises at the cell's voltage: both ends, which may coincide.
    pub rated: Option<(f64, f64)>,
    /// Lower limit.
    pub at_least: Option<f64>,
    /// Upper limit.
    pub at_most: Option<f64>,
    /// Where the limits come from; empty where there are none.
    pub source: String,
}

impl PowerLimits {
    /// The limits of cell `index`.
    pub fn of(scene: &Scene, index: usize) -> Self {
        let Some(cell) = scene.plan.cells.get(index) else {
            return Self::default();
        };
        let rated = rated_at(scene, cell);
        let watts = |w: f64| drawable(w);
        let mut limits = Self {
            rated: rated.map(|span| (span.low.get(), span.high.get())),
            ..Self::default()
        };
        let judged = caption::finding(scene, index, About::Power)
            .filter(|finding| finding.unit == Watts::UNIT)
            .filter(|finding| finding.at_least.is_some() || finding.at_most.is_some());
        if let Some(finding) = judged {
            limits.at_least = finding.at_least.and_then(watts);
            limits.at_most = finding.at_most.and_then(watts);
            limits.source = clean(&finding.source);
        } else {
            limits.by_the_rules(scene, cell, rated);
        }
        limits
    }

    fn by_the_rules(&mut self, scene: &Scene, cell: &Cell, rated: Option<Span<Watts>>) {
        for rule in &scene.plan.rules {
            let is_for = rule.position.as_ref().is_none_or(|p| *p == cell.position)
                && (rule.condition.is_none() || rule.condition == cell.condition);
            match (&rule.kind, rated) {
                _ if !is_for => continue,
                (RuleKind::PlatePower, Some(rated)) => {
                    let band = plate::limits(scene.plan.appliance.kind, rated);
                    self.at_least = band.at_least.map(Watts::get);
                    self.at_most = Some(band.at_most.get());
                }
                (RuleKind::PowerLimits { at_least, at_most }, _) => {
                    self.at_least = at_least.map(Watts::get);
                    self.at_most = at_most.map(Watts::get);
                }
                _ => continue,
            }
            self.source = clean(&rule.source);
            return;
        }
    }

    /// The one value that stands for the plate: the middle of what it promises.
    pub fn plate(&self) -> Option<f64> {
        self.rated.map(|(low, high)| 0.5 * (low + high))
    }
}

/// What the plate promises for the cell's position at the voltage nearest to its
/// supply; for the whole appliance rather than for one of its elements.
fn rated_at(scene: &Scene, cell: &Cell) -> Option<Span<Watts>> {
    let volts = cell.supply.voltage.get();
    let outside = |entry: &PlannedPlate| {
        let (low, high) = (entry.voltage.low.get(), entry.voltage.high.get());
        (low - volts).max(volts - high).max(0.0)
    };
    let entries = scene.plan.appliance.plate.iter();
    let entry = entries
        .filter(|entry| entry.position == cell.position && entry.element.is_none())
        .min_by(|a, b| outside(a).total_cmp(&outside(b)))?;
    let Span { low, high } = entry.power;
    let (to_low, to_high) = (
        (entry.voltage.low.get() - volts).abs(),
        (entry.voltage.high.get() - volts).abs(),
    );
    // A range of power is marked for the ends of the range of voltage.
    Some(match to_low.total_cmp(&to_high) {
        Ordering::Less => Span { low, high: low },
        Ordering::Equal => entry.power,
        Ordering::Greater => Span { low: high, high },
    })
}
