//! `results.csv`: a row per cell, a column per quantity with its unit.

use super::types::{Analysis, CellResult, Figure};
use super::waveform::HalfWave;
use crate::quantity::shortest;
use crate::record::defused;

/// Columns before the rises of the other temperature roles.
const HEAD: [&str; 47] = [
    "condition",
    "position",
    "supply_voltage_v",
    "supply_frequency_hz",
    "energised_s",
    "off_s",
    "cold_start",
    "inrush_peak_a",
    "inrush_peak_u_a",
    "inrush_peak_w",
    "inrush_peak_after_s",
    "inrush_ratio",
    "inrush_lower_bound",
    "inrush_momentary_a",
    "inrush_momentary_u_a",
    "switch_in_peak_a",
    "switch_in_peak_u_a",
    "source_impedance_ohm",
    "switching_angle_deg",
    "i2t_a2s",
    "wave_rms_a",
    "wave_dc_a",
    "wave_crest_factor",
    "wave_power_factor",
    "wave_half_wave",
    "worst_harmonic",
    "worst_harmonic_a",
    "worst_harmonic_limit_a",
    "voltage_change_dmax_percent",
    "voltage_change_dc_percent",
    "voltage_change_above_3_3_percent_s",
    "settled_after_s",
    "steady_power_w",
    "steady_power_u_w",
    "mean_power_w",
    "duty",
    "representative_power_w",
    "extrapolated",
    "voltage_v",
    "samples",
    "effective_samples",
    "body_peak_degc",
    "body_peak_u_k",
    "body_peak_after_heat",
    "body_worst_degc",
    "body_worst_u_k",
    "absent_because",
];

/// `results.csv` in bytes; absent values are empty cells, their reasons stand in the
/// last fixed column.
///
/// # Errors
/// Where a row can't be formed.
pub fn results_csv(analysis: &Analysis) -> Result<Vec<u8>, csv::Error> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    let rises: Vec<String> = analysis.cells.first().map_or_else(Vec::new, |cell| {
        let column = |name: &String| format!("{}_rise_k", defused(name).replace(' ', "_"));
        cell.rises.iter().map(|(name, _)| column(name)).collect()
    });
    writer.write_record(HEAD.iter().map(|h| (*h).to_owned()).chain(rises))?;
    for cell in &analysis.cells {
        writer.write_record(row(cell))?;
    }
    writer
        .into_inner()
        .map_err(|e| csv::Error::from(e.into_error()))
}

fn row(cell: &CellResult) -> Vec<String> {
    let number = |value: Option<f64>| value.map_or_else(String::new, shortest);
    let flag = |value: Option<bool>| {
        value
            .map_or("", |set| if set { "1" } else { "0" })
            .to_owned()
    };
    let inrush = cell.inrush.known().filter(|_| cell.dc_lost.is_none());
    // What rests on a current without its DC part is no result.
    let wave = cell.waveform.known().filter(|_| cell.dc_lost.is_none());
    let harmonic = wave.and_then(|w| w.harmonic.known());
    let change = wave.and_then(|w| w.change.known());
    let or_unknown = |value: Option<Option<f64>>| match value {
        Some(value) => value.map_or_else(|| "unknown".to_owned(), shortest),
        None => String::new(),
    };
    let steady = cell.steady.known();
    let peak = cell.body_peak.known();
    let worst = cell.body_worst.known();
    let mut row = vec![
        defused(cell.cell.condition.as_deref().unwrap_or("")),
        defused(&cell.cell.position),
        shortest(cell.cell.supply.voltage.get()),
        shortest(cell.cell.supply.frequency.get()),
        number(cell.energised_s.known().copied()),
        number(cell.off_s.known().copied()),
        flag(Some(cell.cold_start.known().is_some())),
        number(inrush.map(|i| i.peak_a.value)),
        number(inrush.map(|i| i.peak_a.expanded)),
        number(inrush.map(|i| i.peak_w)),
        number(inrush.map(|i| i.peak_after_s)),
        number(inrush.and_then(|i| i.ratio)),
        flag(inrush.map(|i| !i.lower_bound.is_empty())),
        number(wave.map(|w| w.momentary_peak_a.value)),
        number(wave.map(|w| w.momentary_peak_a.expanded)),
        number(cell.switch_in_peak.known().map(|e| e.value)),
        number(cell.switch_in_peak.known().map(|e| e.expanded)),
        or_unknown(inrush.map(|i| i.source_ohm)),
        or_unknown(inrush.map(|i| i.switching_angle_deg)),
        number(wave.map(|w| w.shape.i2t_a2s)),
        number(wave.map(|w| w.shape.tail.rms_a)),
        number(wave.map(|w| w.shape.tail.dc_a)),
        number(wave.and_then(|w| w.shape.tail.crest_factor)),
        number(wave.and_then(|w| w.shape.tail.power_factor)),
        flag(wave.map(|w| w.shape.half_wave != HalfWave::None)),
        harmonic.map_or_else(String::new, |h| h.number.to_string()),
        number(harmonic.map(|h| h.rms_a.value)),
        number(harmonic.map(|h| h.limit_a)),
        number(change.map(|c| 100.0 * c.dmax.value)),
        number(change.and_then(|c| c.dc.known().map(|dc| 100.0 * dc.value))),
        number(change.map(|c| c.over_s.value)),
        number(cell.settled_s.known().copied()),
        number(steady.map(|s| s.power_w.value)),
        number(steady.map(|s| s.power_w.expanded)),
        number(steady.map(|s| s.mean_w)),
        number(steady.map(|s| s.duty)),
        number(steady.and_then(|s| s.representative_w)),
        flag(steady.map(|s| s.extrapolated)),
        number(steady.map(|s| s.voltage_v)),
        steady.map_or_else(String::new, |s| s.samples.to_string()),
        number(steady.map(|s| s.effective)),
        number(peak.map(|p| p.temperature_degc.value)),
        number(peak.map(|p| p.temperature_degc.expanded)),
        flag(peak.map(|p| p.after_heat)),
        number(worst.map(|w| w.value)),
        number(worst.map(|w| w.expanded)),
        defused(&reasons(cell).join("; ")),
    ];
    row.extend(
        cell.rises
            .iter()
            .map(|(_, rise)| number(rise.known().map(|e| e.value))),
    );
    row
}

/// Why values of a cell are absent, or not to be believed.
fn reasons(cell: &CellResult) -> Vec<String> {
    let mut all = Vec::new();
    let mut add = |what: &str, reason: Option<&str>| {
        if let Some(reason) = reason {
            all.push(format!("{what}: {reason}"));
        }
    };
    add("energised", cell.energised_s.reason());
    add("cold start", cell.cold_start.reason());
    add("inrush", cell.inrush.reason());
    if cell.waveform.reason() != Some("no waveform was taken") {
        add("waveform", cell.waveform.reason());
    }
    if let Some(wave) = cell.waveform.known() {
        add("harmonics", wave.harmonic.reason());
        add("voltage change", wave.change.reason());
    }
    add("current and power factor", cell.dc_lost.as_deref());
    add("settled", cell.settled_s.reason());
    add("steady power", cell.steady.reason());
    add("body", cell.body_peak.reason());
    add("body at the highest ambient", cell.body_worst.reason());
    for (name, rise) in &cell.rises {
        add(name, Figure::reason(rise));
    }
    all.extend(
        cell.disbelief
            .iter()
            .map(|why| format!("not believed: {why}")),
    );
    all
}
