//! Referring an input to another voltage and another ambient.

use crate::plan::{Plan, PlannedAppliance};
use crate::quantity::{at_most, shortest};
use crate::spec::plate::CORRECTABLE;
use crate::spec::sequence::HeatingElement;

use super::budget::{Distribution, Share};
use super::types::{CellResult, Estimate, Exponent, Figure, Steady};

/// An ambient further than this from the reference is not corrected (house default).
const REFERABLE_K: f64 = 10.0;
/// A PTC's input changes by a share of -1/(T - Ta) per kelvin of the room, T being the
/// element's own temperature: this share at least and at most, seen from a body that
/// is somewhat cooler than the element (house default, from the PTC model).
const SHARE_OF_RISE: (f64, f64) = (0.6, 1.0);
/// The same where no body is measured: nothing up to this per kelvin (house default).
const LARGEST_PER_KELVIN: f64 = 0.015;
/// A body nearer to ambient than this says nothing of the element (house default).
const LEAST_RISE_K: f64 = 10.0;
/// Supplies nearer than this say nothing of an exponent.
const LEAST_LOG_RATIO: f64 = 0.02;
/// Exponents that no heater has.
const PLAUSIBLE: std::ops::RangeInclusive<f64> = -0.5..=2.5;

/// The exponent that is taken where none is measured: the middle of its interval.
pub(super) fn usual_exponent(appliance: &PlannedAppliance) -> Exponent {
    let (low, high) = appliance.element.voltage_exponent(appliance.fan);
    let what = match (appliance.element, appliance.fan) {
        (HeatingElement::Resistor, _) => "plain resistor",
        (HeatingElement::Ptc, false) => "PTC in still air",
        (HeatingElement::Ptc, true) => "PTC with a fan",
    };
    let interval = Share::rectangular("", 0.5 * (high - low), "");
    Exponent {
        value: 0.5 * (low + high),
        standard: interval.input,
        distribution: Distribution::Rectangular,
        source: format!("{what}, {low} to {high}, house default"),
    }
}

/// The exponent between two settled inputs of one position and condition at two
/// supplies: n = ln(P1/P2) / ln(V1/V2), with the uncertainty of both inputs. Both are
/// referred to one ambient first. Nothing where the supplies are too near each other
/// or the result is none that a heater has.
fn measured_exponent(
    appliance: &PlannedAppliance,
    one: &Steady,
    other: &Steady,
) -> Option<Exponent> {
    let (v1, v2) = (one.plug_v.value, other.plug_v.value);
    let ratio = libm::log(v1 / v2);
    let usable = ratio.is_finite() && ratio.abs() >= LEAST_LOG_RATIO;
    let input = |steady: &Steady| in_reference_ambient(appliance, steady).ok();
    let (p1, p2) = (input(one)?, input(other)?);
    if !usable || p1.value <= 0.0 || p2.value <= 0.0 {
        return None;
    }
    let relative = |e: &Estimate| e.scaled(1.0 / e.value);
    let value = libm::log(p1.value / p2.value) / ratio;
    let of_power = relative(&p1).minus(&relative(&p2)).standard();
    let of_voltage = relative(&one.plug_v)
        .minus(&relative(&other.plug_v))
        .standard();
    let standard = libm::hypot(of_power, value * of_voltage) / ratio.abs();
    PLAUSIBLE.contains(&value).then(|| Exponent {
        value,
        standard,
        distribution: Distribution::Normal,
        source: format!("measured between {v1:.1} V and {v2:.1} V"),
    })
}

/// The input of a cell as it was measured at the plug, referred to the reference
/// ambient of the plan, where the plan states one.
///
/// # Errors
/// In words, where the room was too far from it.
fn in_reference_ambient(appliance: &PlannedAppliance, steady: &Steady) -> Result<Estimate, String> {
    let measured = &steady.at_plug_w;
    let Some(reference) = appliance.reference_ambient else {
        return Ok(measured.clone());
    };
    if appliance.element == HeatingElement::Resistor {
        return Ok(measured.clone());
    }
    let Some(ambient) = &steady.ambient_degc else {
        // Nothing is known of the room: what it can have done is in no budget.
        return Err("the ambient of its settled window is not known".to_owned());
    };
    let to_go = reference.get() - ambient.value;
    if !at_most(to_go.abs(), REFERABLE_K) {
        return Err(format!(
            "the room was at {:.1} °C, further than {REFERABLE_K} K from the reference ambient {reference}, and no input is corrected so far",
            ambient.value
        ));
    }
    let (low, high) = per_kelvin(steady, ambient.value);
    let middle = 0.5 * (low + high);
    let factor = libm::exp(middle * to_go);
    let value = measured.value * factor;
    let per_kelvin_w = middle * value;
    let mut lines: Vec<Share> = ambient
        .budget
        .iter()
        .map(|line| line.clone().times(-per_kelvin_w))
        .collect();
    lines.push(
        Share::rectangular(
            format!("input referred from {:.1} °C to {reference} of ambient, effect of {:.2} to {:.2} %/K (house default)",
                ambient.value, 100.0 * low, 100.0 * high),
            0.5 * (high - low),
            "1/K",
        )
        .times(value * to_go),
    );
    Ok(measured.scaled(factor).moved(0.0, lines))
}

/// Relative change of a PTC's input per kelvin of the room: dP/P = -1/(T - Ta)
/// (electro-thermal model of a PTC; computed), as an interval.
fn per_kelvin(steady: &Steady, ambient_degc: f64) -> (f64, f64) {
    let rise = steady
        .body_degc
        .map(|body| body - ambient_degc)
        .filter(|rise| *rise >= LEAST_RISE_K);
    match rise {
        Some(rise) => (-SHARE_OF_RISE.1 / rise, -SHARE_OF_RISE.0 / rise),
        None => (-LARGEST_PER_KELVIN, 0.0),
    }
}

/// Refers every settled input to the supply of its cell and to the reference ambient.
///
/// Where a position was run at two supplies in the same condition, the exponent is
/// measured between them and taken if it is known better than the house default.
pub(super) fn refer(plan: &Plan, cells: &mut [CellResult]) {
    let exponents: Vec<Option<Exponent>> = (0..cells.len())
        .map(|index| best_exponent(plan, cells, index))
        .collect();
    for (result, exponent) in cells.iter_mut().zip(exponents) {
        let Figure::Known(steady) = &mut result.steady else {
            continue;
        };
        if let Some(exponent) = exponent {
            steady.exponent = exponent;
        }
        match referred(&plan.appliance, steady, result.cell.supply.voltage.get()) {
            Ok(power) => steady.power_w = power,
            Err(reason) => result.steady = Figure::Absent(reason),
        }
    }
}

/// The exponent measured with the nearest other supply.
fn best_exponent(plan: &Plan, cells: &[CellResult], index: usize) -> Option<Exponent> {
    let here = &cells[index];
    let steady = here.steady.known()?;
    let volts = |result: &CellResult| result.cell.supply.voltage.get();
    let away = |other: &CellResult| (volts(other) - volts(here)).abs();
    let alike = |other: &&CellResult| {
        other.cell.position == here.cell.position
            && other.cell.condition == here.cell.condition
            && other.cell.supply.frequency == here.cell.supply.frequency
            && away(other) > 0.0
            && other.steady.known().is_some()
    };
    let nearest = cells
        .iter()
        .filter(alike)
        .min_by(|a, b| away(a).total_cmp(&away(b)))?;
    let measured = measured_exponent(&plan.appliance, steady, nearest.steady.known()?)?;
    (measured.standard < steady.exponent.standard).then_some(measured)
}

/// The settled input of a cell at `to` volts at the plug and in the reference ambient.
///
/// The exponent is the one measured between two supplies, else the house default's
/// interval, whose width enters U.
pub fn at_voltage(plan: &Plan, steady: &Steady, to: f64) -> Figure<Estimate> {
    match referred(&plan.appliance, steady, to) {
        Ok(estimate) => Figure::Known(estimate),
        Err(reason) => Figure::Absent(reason),
    }
}

fn referred(appliance: &PlannedAppliance, steady: &Steady, to: f64) -> Result<Estimate, String> {
    let from = steady.plug_v.value;
    let distance = (from - to).abs() / to;
    if from <= 0.0 || !at_most(distance, CORRECTABLE) {
        return Err(format!(
            "{from:.1} V is {:.1} % off {} V, and beyond {} % an input is not corrected (house default)",
            100.0 * distance,
            shortest(to),
            shortest(100.0 * CORRECTABLE),
        ));
    }
    let here = in_reference_ambient(appliance, steady)?;
    let exponent = &steady.exponent;
    let ratio = libm::log(to / from);
    let factor = libm::exp(exponent.value * ratio);
    let value = here.value * factor;
    let per_volt = -exponent.value * value / from;
    let mut lines: Vec<Share> = steady
        .plug_v
        .budget
        .iter()
        .map(|line| line.clone().times(per_volt))
        .collect();
    let line = Share {
        distribution: exponent.distribution,
        ..Share::normal(
            format!(
                "input referred from {from:.2} V to {} V, exponent {:.2} ({})",
                shortest(to),
                exponent.value,
                exponent.source
            ),
            exponent.standard,
            "1",
        )
    };
    lines.push(line.times(value * ratio));
    Ok(here.scaled(factor).moved(0.0, lines))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{Now, Seen, good, plan, play};
    use super::*;
    use crate::analysis::Analysis;
    use crate::quantity::Celsius;

    fn cells(plan: Plan, unit: impl Fn(Now) -> Seen) -> Analysis {
        play(plan, unit).analysis()
    }

    /// The same plan with a second supply for every cell: 220 V beside 230 V.
    fn two_supplies() -> Plan {
        let mut plan = plan(&["full", "again"]);
        for cell in &mut plan.cells {
            if cell.condition.as_deref() == Some("again") {
                cell.condition = Some("full".to_owned());
                cell.supply.voltage = crate::quantity::Volts::of(220.0);
            }
        }
        plan
    }

    #[test]
    fn an_input_is_referred_to_the_reference_ambient_and_widened_by_the_effect() {
        let at = |reference: f64| {
            let mut plan = plan(&["full"]);
            plan.appliance.reference_ambient = Some(Celsius::of(reference));
            cells(plan, good).cells[0].steady.clone()
        };
        let here = at(23.0).known().unwrap().power_w.clone();
        let cooler = at(18.0).known().unwrap().power_w.clone();
        // 5 K at 0.6 to 1 share of a rise of 40 K: 10 % more at 0.8 (computed).
        let expected = here.value * libm::exp(0.8 * 5.0 / 40.0);
        assert!((cooler.value / expected - 1.0).abs() < 0.002, "{cooler:?}");
        let effect = cooler
            .budget
            .iter()
            .find(|l| l.from.contains("of ambient,"));
        let width = 0.2 / 40.0 * 5.0 * cooler.value / 3f64.sqrt();
        assert!((effect.unwrap().standard / width - 1.0).abs() < 0.02);
        assert!(cooler.expanded > here.expanded);
        assert!(
            at(5.0)
                .reason()
                .unwrap()
                .contains("no input is corrected so far")
        );
    }

    #[test]
    fn a_plain_resistor_does_not_feel_the_room() {
        let mut plan = plan(&["full"]);
        plan.appliance.element = HeatingElement::Resistor;
        plan.appliance.reference_ambient = Some(Celsius::of(5.0));
        let found = cells(plan, good);
        let steady = found.cells[0].steady.known().unwrap();
        assert!((steady.power_w.value - 4.3).abs() < 0.01);
    }

    #[test]
    fn two_supplies_measure_the_exponent() {
        let plan = two_supplies();
        let supplies: Vec<f64> = plan.cells.iter().map(|c| c.supply.voltage.get()).collect();
        let found = cells(plan, |now| {
            let seen = good(now);
            let volts = now.cell.map_or(230.0, |cell| supplies[cell]);
            // d ln P / d ln V = 0.6.
            let factor = libm::exp(0.6 * libm::log(volts / 230.0));
            Seen {
                volts: seen.volts * volts / 230.0,
                watts: seen.watts * factor,
                ..seen
            }
        });
        for cell in &found.cells {
            let steady = cell.steady.known().unwrap();
            // The meter's own accuracy is wider than the house interval here, unless it
            // is known better; what is taken never is known worse.
            assert!(steady.exponent.standard <= 0.3 / 3f64.sqrt() + 1e-12);
            let measured = measured_exponent(
                &crate::analysis::fixture::plan(&["full"]).appliance,
                steady,
                other(&found, cell),
            );
            let measured = measured.unwrap();
            assert!(
                (measured.value - 0.6).abs() < 2.0 * measured.standard,
                "{measured:?}"
            );
        }
    }

    fn other<'a>(found: &'a Analysis, cell: &CellResult) -> &'a Steady {
        found
            .cells
            .iter()
            .find(|c| c.cell.position == cell.cell.position && c.cell.supply != cell.cell.supply)
            .and_then(|c| c.steady.known())
            .unwrap()
    }

    #[test]
    fn no_heater_has_such_an_exponent() {
        let found = cells(plan(&["full"]), good);
        let one = found.cells[0].steady.known().unwrap();
        let appliance = plan(&["full"]).appliance;
        // The same supply twice says nothing.
        assert_eq!(measured_exponent(&appliance, one, one), None);
        let mut strange = one.clone();
        strange.plug_v.value = 240.0;
        strange.at_plug_w.value *= 3.0;
        assert_eq!(measured_exponent(&appliance, one, &strange), None);
    }
}
