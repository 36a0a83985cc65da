//! Which limits are drawn: those that a finding was judged by, else those that the
//! plan's rules give.

use super::Scene;
use super::axis::drawable;
use super::caption::{About, Said, is_for};
use super::words::clean;
use crate::analysis::plate_point;
use crate::plan::Cell;
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
        let rated = plate_point(scene.plan, cell).map(|point| point.rated);
        let watts = |w: f64| drawable(w);
        let mut limits = Self {
            rated: rated.map(|span| (span.low.get(), span.high.get())),
            ..Self::default()
        };
        let judged = Said::of(scene, index, About::Power)
            .map(Said::finding)
            .filter(|finding| finding.unit == Watts::UNIT)
            .filter(|finding| finding.at_least.is_some() || finding.at_most.is_some());
        if let Some(finding) = judged {
            limits.at_least = finding.at_least.and_then(watts);
            limits.at_most = finding.at_most.and_then(watts);
            limits.source = clean(&finding.source);
        }
        limits.fill_by_the_rules(scene, cell, rated);
        limits
    }

    /// A side that no finding was judged by is drawn from the rules: a house lower
    /// limit beside a plate band that has none, and the other way round.
    fn fill_by_the_rules(&mut self, scene: &Scene, cell: &Cell, rated: Option<Span<Watts>>) {
        for rule in scene.plan.rules.iter().filter(|rule| is_for(rule, cell)) {
            let (low, high) = match (&rule.kind, rated) {
                (RuleKind::PlatePower, Some(rated)) => {
                    let band = plate::limits(scene.plan.appliance.kind, rated);
                    (band.at_least, Some(band.at_most))
                }
                (RuleKind::PowerLimits { at_least, at_most }, _) => (*at_least, *at_most),
                _ => continue,
            };
            let fills = (self.at_least.is_none() && low.is_some())
                || (self.at_most.is_none() && high.is_some());
            if !fills {
                continue;
            }
            self.at_least = self.at_least.or(low.map(Watts::get));
            self.at_most = self.at_most.or(high.map(Watts::get));
            let source = clean(&rule.source);
            self.source = match self.source.is_empty() {
                true => source,
                false => format!("{}; {source}", self.source),
            };
        }
    }

    /// The one value that stands for the plate: the middle of what it promises.
    pub fn plate(&self) -> Option<f64> {
        self.rated.map(|(low, high)| 0.5 * (low + high))
    }
}
