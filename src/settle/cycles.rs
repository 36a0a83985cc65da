//! Whole cycles of a load that a thermostat switches.

use super::criteria::Point;
use super::{Sums, Watched};

/// A load is off below this share of its highest power, and on above the other:
/// half of it, with a hysteresis so that noise does not switch it.
const OFF_BELOW: f64 = 0.45;
const ON_ABOVE: f64 = 0.55;

/// Cycles are kept up to this number; no criterion looks further back.
const KEPT: usize = 64;

/// Cuts values into cycles, each from one switching on to the next.
#[derive(Debug, Clone, Default)]
pub(super) struct Cycles {
    highest_w: f64,
    on: bool,
    switched_off: bool,
    began: Option<f64>,
    sums: Sums,
    ambient_known: bool,
    complete: Vec<Point>,
}

impl Cycles {
    /// Takes a value in, at `t` seconds after energising.
    pub(super) fn take(&mut self, t: f64, watched: Watched, value: f64) {
        if watched == Watched::Power {
            self.switch(t, value);
        }
        self.ambient_known |= watched == Watched::Ambient;
        self.sums.add(watched, value);
    }

    /// Whether the load was on and went off.
    pub(super) fn has_switched_off(&self) -> bool {
        self.switched_off
    }

    /// Complete cycles, oldest first.
    pub(super) fn complete(&self) -> &[Point] {
        &self.complete
    }

    fn switch(&mut self, t: f64, power_w: f64) {
        self.highest_w = self.highest_w.max(power_w);
        if self.highest_w <= 0.0 {
            return;
        }
        if self.on && power_w < OFF_BELOW * self.highest_w {
            self.on = false;
            self.switched_off = true;
        } else if !self.on && power_w > ON_ABOVE * self.highest_w {
            self.on = true;
            // The first time on starts cold and is no cycle.
            if self.switched_off {
                self.close(t);
            }
        }
    }

    fn close(&mut self, t: f64) {
        if let Some(from) = self.began {
            self.complete.push(Point {
                from,
                to: t,
                power: self.sums.power.mean(),
                rise: self.sums.rise(self.ambient_known),
            });
            if self.complete.len() > KEPT {
                self.complete.remove(0);
            }
        }
        self.began = Some(t);
        self.sums = Sums::default();
    }
}
