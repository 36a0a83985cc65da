//! Does the meter lose the DC part of a half-wave load?

use crate::plan::Plan;
use crate::spec::sequence::{HeatingElement, RoleKind};

use super::types::{CellResult, Steady};
use super::waveform::HalfWave;

/// Half-way between 1/sqrt(2), the factor of a half-wave resistor, and 0.917, which
/// a meter shows that loses its DC part (computed).
const FACTOR_MIDDLE: f64 = 0.81;
/// Half-way between the current of a half-wave resistor over that of the same one
/// fed whole, 0.707, and what such a meter shows, 0.38559 / 0.70711 = 0.545 (computed).
const CURRENT_MIDDLE: f64 = 0.626;
/// Behind a diode the same resistor takes half of the power; the share may be off by
/// so much before it counts as another resistor.
const SAME_RESISTOR: f64 = 0.05;

/// Why current and power factor of a cell are not to be believed: the position is fed
/// through a diode and the meter loses the DC part. The power is right under a sine
/// voltage all the same.
pub(super) fn lost(plan: &Plan, cells: &[CellResult], index: usize) -> Option<String> {
    let cell = &cells[index];
    let position = &cell.cell.position;
    let behind_diode = |position: &String| plan.appliance.diode_in.contains(position);
    if !behind_diode(position) || cell.energised_s.known().is_none() {
        return None;
    }
    let whole = cells.iter().filter(|other| {
        !behind_diode(&other.cell.position)
            && other.cell.supply == cell.cell.supply
            && other.cell.condition == cell.cell.condition
    });
    let resistive = resistive(plan);
    let reasons: Vec<String> = [
        by_driver(plan),
        by_waveform(cell),
        resistive.then(|| by_factor(cell)).flatten(),
        resistive.then(|| by_current(cell, whole)).flatten(),
    ]
    .into_iter()
    .flatten()
    .collect();
    if reasons.is_empty() {
        return None;
    }
    let why = reasons.join("; ");
    Some(format!(
        "position {position} is fed through a diode and the meter loses the DC part: {why}"
    ))
}

/// A plain resistor alone, without a fan beside it.
fn resistive(plan: &Plan) -> bool {
    plan.appliance.element == HeatingElement::Resistor && !plan.appliance.fan
}

fn by_driver(plan: &Plan) -> Option<String> {
    let (_, role) = plan.role_of_kind(RoleKind::PowerMeter)?;
    let driver = &plan.instruments.get(role.instrument)?.driver;
    (!driver.coupling.is_dc()).then(|| format!("driver {} says that it is AC-coupled", driver.name))
}

fn by_waveform(cell: &CellResult) -> Option<String> {
    let wave = cell.waveform.known()?;
    (wave.shape.half_wave == HalfWave::DcLost).then(|| {
        format!(
            "its waveform has even harmonics, but a DC part of {:.3} A only",
            wave.shape.tail.dc_a.abs()
        )
    })
}

fn by_factor(cell: &CellResult) -> Option<String> {
    let steady = cell.steady.known()?;
    let factor = steady.power_w.value / (steady.voltage_v * steady.current_a?);
    (factor > FACTOR_MIDDLE)
        .then(|| format!("a plain resistor shows a power factor of {factor:.3}, not 0.707"))
}

/// Against a position in which the same resistor is fed whole.
fn by_current<'a>(
    cell: &CellResult,
    mut whole: impl Iterator<Item = &'a CellResult>,
) -> Option<String> {
    let half = cell.steady.known()?;
    let share = |more: &Steady| {
        let power = half.power_w.value / more.power_w.value;
        let same = (power - 0.5).abs() <= 0.5 * SAME_RESISTOR;
        same.then(|| half.current_a.zip(more.current_a)).flatten()
    };
    let (position, ratio) = whole.find_map(|other| {
        let (less, more) = share(other.steady.known()?)?;
        Some((&other.cell.position, less / more))
    })?;
    (ratio < CURRENT_MIDDLE).then(|| {
        format!(
            "it shows {ratio:.3} of the current of position {position}, where the same resistor is fed whole, not 0.707"
        )
    })
}
