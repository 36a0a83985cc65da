//! Drift of the room and of the supply: what of a change they explain.
//!
//! A quantity that only looks steady because the room falls, or that moves because
//! the supply does, is not settled. So a criterion is refused while the drift over its
//! own window, times the sensitivity of what is watched, exceeds half of its limit.

use super::limits::{Quantity, round};
use super::points::Point;
use crate::quantity::at_most;
use crate::spec::sequence::{HeatingElement, Soaking};
use crate::stats::line_through;

/// This share of a limit may be explained (house default).
const EXPLAINED: f64 = 0.5;
/// A self-regulating input falls by this share per kelvin of ambient (about
/// -1/(T - Ta), computed from the element's model; house default).
const PTC_PER_KELVIN: f64 = 0.01;
/// Its body's rise falls by up to this much per kelvin, because its temperature holds.
const PTC_RISE: f64 = 1.0;
const PER_HOUR: f64 = 3600.0;

/// How ambient and supply drift over a window; absent where they were not read.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Drift {
    /// Kelvins per hour.
    ambient: Option<f64>,
    /// Share of the voltage per hour.
    supply: Option<f64>,
}

impl Drift {
    pub(super) fn over(points: &[&Point]) -> Self {
        let line = |of: fn(&Point) -> Option<f64>| {
            let track: Vec<(f64, f64)> = points
                .iter()
                .filter_map(|p| Some((p.middle(), of(p)?)))
                .collect();
            line_through(track)
        };
        let supply = line(|p| p.voltage).filter(|line| line.mean_y > 0.0);
        Drift {
            ambient: line(|p| p.ambient).map(|line| line.slope * PER_HOUR),
            supply: supply.map(|line| line.slope / line.mean_y * PER_HOUR),
        }
    }

    /// For what is printed.
    pub(super) fn words(&self) -> String {
        let ambient = match self.ambient {
            Some(kelvins) => format!("ambient {kelvins:+.2} K/h"),
            None => "drift of ambient not known".to_owned(),
        };
        let supply = match self.supply {
            Some(share) => format!("supply {:+.2} %/h", 100.0 * share),
            None => "drift of the supply not known".to_owned(),
        };
        format!("{ambient}, {supply}")
    }

    /// Whether it explains too much of a quantity's limit over `hours`, and why.
    ///
    /// # Errors
    /// The reason, where it does.
    pub(super) fn allows(
        &self,
        soaking: &Soaking,
        quantity: Quantity,
        mean: f64,
        hours: f64,
        per: &str,
    ) -> Result<(), String> {
        let (per_kelvin, per_share) = sensitivities(soaking, quantity, mean);
        let by_ambient = (per_kelvin * self.ambient.unwrap_or(0.0) * hours).abs();
        let by_supply = (per_share * self.supply.unwrap_or(0.0) * hours).abs();
        let Some(written) = quantity.written(by_ambient + by_supply, mean) else {
            return Ok(());
        };
        if at_most(written.change, EXPLAINED * written.limit) {
            return Ok(());
        }
        let share = |part: f64| part >= 0.1 * (by_ambient + by_supply);
        let mut drifts = Vec::new();
        if let Some(kelvins) = self.ambient.filter(|_| share(by_ambient)) {
            drifts.push(format!("ambient drifts {kelvins:+.1} K/h"));
        }
        if let Some(supply) = self.supply.filter(|_| share(by_supply)) {
            drifts.push(format!("the supply drifts {:+.2} %/h", 100.0 * supply));
        }
        Err(format!(
            "{}, which explains {:.2} {unit}{per} of the {}, more than half of its limit of {} \
             {unit}{per} (house default)",
            drifts.join(" and "),
            written.change,
            quantity.word(),
            round(written.limit),
            unit = written.unit,
        ))
    }
}

/// Change of a quantity per kelvin of ambient and per whole of the voltage: the upper
/// end of the intervals by which inputs are corrected (house defaults).
fn sensitivities(soaking: &Soaking, quantity: Quantity, mean: f64) -> (f64, f64) {
    let (_, exponent) = soaking.element.voltage_exponent(soaking.fan);
    let per_kelvin = match (soaking.element, quantity) {
        (HeatingElement::Resistor, _) => 0.0,
        (HeatingElement::Ptc, Quantity::Power(_)) => PTC_PER_KELVIN * mean,
        (HeatingElement::Ptc, Quantity::Rise(_)) => PTC_RISE,
    };
    // A rise is proportional to the input.
    (per_kelvin, exponent * mean)
}
