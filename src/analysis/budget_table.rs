//! The budgets of every result: a table for people, and rows for a machine.

use super::budget::Share;
use super::types::{Analysis, CellResult, Estimate};
use crate::quantity::{shortest, significant};
use crate::record::defused;

const HEAD: [&str; 20] = [
    "condition",
    "position",
    "supply",
    "quantity",
    "value",
    "unit",
    "expanded_u",
    "coverage_k",
    "freedom",
    "line",
    "type",
    "distribution",
    "input_u",
    "input_unit",
    "sensitivity",
    "contribution_u",
    "contribution_unit",
    "share_of_variance",
    "line_freedom",
    "correlation",
];

/// So many degrees of freedom are as good as infinite.
const MANY: f64 = 1000.0;

/// One estimate of a cell with its name and unit; an error's unit is that of a
/// difference.
struct Named<'a> {
    name: String,
    unit: &'static str,
    error_unit: &'static str,
    estimate: &'a Estimate,
}

fn results(cell: &CellResult) -> Vec<Named<'_>> {
    let steady = cell.steady.known();
    let result = |name: &str, unit, error_unit, estimate| Named {
        name: name.to_owned(),
        unit,
        error_unit,
        estimate,
    };
    let mut all: Vec<Named> = Vec::new();
    if let Some(inrush) = cell.inrush.known() {
        all.push(result("inrush peak", "A", "A", &inrush.peak_a));
    }
    if let Some(steady) = steady {
        all.push(result("power at the plug", "W", "W", &steady.at_plug_w));
        all.push(result("voltage at the plug", "V", "V", &steady.plug_v));
        all.push(result(
            "power, referred to supply and ambient",
            "W",
            "W",
            &steady.power_w,
        ));
    }
    if let Some(peak) = cell.body_peak.known() {
        all.push(result("body, highest", "°C", "K", &peak.temperature_degc));
    }
    if let Some(worst) = cell.body_worst.known() {
        all.push(result("body, worst case", "°C", "K", worst));
    }
    for (role, rise) in &cell.rises {
        if let Some(rise) = rise.known() {
            all.push(result(&format!("rise of {role}"), "K", "K", rise));
        }
    }
    all
}

/// The largest lines first, each with what it is of: `budgets.txt`.
pub fn budgets_text(analysis: &Analysis) -> String {
    let mut text = String::from(
        "Uncertainty budgets (JCGM 100), the largest line first. u is the contribution\n\
         |c u| to the result; type A comes from this record's own scatter.\n",
    );
    for cell in &analysis.cells {
        text.push_str(&format!("\n{}\n", defused_line(&cell.cell.words())));
        for result in results(cell) {
            text.push_str(&of_estimate(&result));
        }
    }
    text
}

fn of_estimate(result: &Named) -> String {
    let e = result.estimate;
    let freedom = e
        .freedom
        .filter(|nu| *nu < MANY)
        .map_or_else(|| "very many".to_owned(), |nu| format!("{nu:.1}"));
    let mut text = format!(
        "  {} = {} {unit}, U = {} {error} (k = {:.3} at 95.45 %, {freedom} degrees of freedom)\n",
        defused_line(&result.name),
        significant(e.value, 6),
        significant(e.expanded, 3),
        e.coverage,
        unit = result.unit,
        error = result.error_unit,
    );
    let variance: f64 = e.budget.iter().map(|line| line.standard.powi(2)).sum();
    for line in &e.budget {
        text.push_str(&of_line(line, result.error_unit, variance));
    }
    text
}

fn of_line(line: &Share, unit: &str, variance: f64) -> String {
    let kind = if line.is_type_a() { "A" } else { "B" };
    let freedom = line
        .freedom
        .map_or_else(String::new, |nu| format!(", {nu:.1} degrees of freedom"));
    let correlated = line
        .shared
        .as_ref()
        .filter(|shared| shared.correlation > 0.0)
        .map_or_else(String::new, |s| {
            format!(", shared with r = {}", s.correlation)
        });
    let plain = line.unit == "1";
    let unit_of_input = if plain { "" } else { line.unit.as_str() };
    let input = if (line.sensitivity - 1.0).abs() < 1e-12 {
        String::new()
    } else {
        format!(
            ", {} times {}",
            format!("{} {}", significant(line.input, 3), unit_of_input).trim_end(),
            significant(line.sensitivity, 3)
        )
    };
    format!(
        "    {:>10} {unit:<2} {:>5.1} %  {}: {kind}, {}{input}{freedom}{correlated}\n",
        significant(line.standard, 3),
        100.0 * line.standard.powi(2) / variance,
        defused_line(&line.from),
        line.distribution.word(),
    )
}

/// A name from a file on one line of a text.
fn defused_line(text: &str) -> String {
    text.chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect()
}

/// `budgets.csv` in bytes: a row for each line of each result's budget; `freedom` is
/// empty where it is infinite.
///
/// # Errors
/// Where a row can't be formed.
pub fn budgets_csv(analysis: &Analysis) -> Result<Vec<u8>, csv::Error> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    writer.write_record(HEAD)?;
    for cell in &analysis.cells {
        for result in results(cell) {
            for line in &result.estimate.budget {
                writer.write_record(row(cell, &result, line))?;
            }
        }
    }
    writer
        .into_inner()
        .map_err(|e| csv::Error::from(e.into_error()))
}

fn row(cell: &CellResult, result: &Named, line: &Share) -> [String; 20] {
    let e = result.estimate;
    let number = |value: Option<f64>| value.map_or_else(String::new, shortest);
    let variance: f64 = e.budget.iter().map(|line| line.standard.powi(2)).sum();
    let supply = &cell.cell.supply;
    [
        defused(cell.cell.condition.as_deref().unwrap_or("")),
        defused(&cell.cell.position),
        format!("{} {}", supply.voltage, supply.frequency),
        defused(&result.name),
        shortest(e.value),
        result.unit.to_owned(),
        shortest(e.expanded),
        shortest(e.coverage),
        number(e.freedom),
        defused(&line.from),
        if line.is_type_a() { "A" } else { "B" }.to_owned(),
        line.distribution.word().to_owned(),
        shortest(line.input),
        line.unit.clone(),
        shortest(line.sensitivity),
        shortest(line.standard),
        result.error_unit.to_owned(),
        shortest(line.standard.powi(2) / variance),
        number(line.freedom),
        number(line.shared.as_ref().map(|shared| shared.correlation)),
    ]
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{good, plan, play};
    use super::*;

    #[test]
    fn every_result_has_its_lines_in_order_of_size() {
        let analysis = play(plan(&["full"]), good).analysis();
        let text = budgets_text(&analysis);
        assert!(text.contains("power at the plug = 4."), "{text}");
        assert!(text.contains("scatter of the mean: A, normal"), "{text}");
        assert!(text.contains("rise of enclosure"), "{text}");
        let csv = String::from_utf8(budgets_csv(&analysis).unwrap()).unwrap();
        let lines: Vec<&str> = csv.lines().collect();
        assert!(lines[0].starts_with("condition,position,supply,quantity"));
        let shares = |quantity: &str| -> Vec<f64> {
            let mut reader = csv::Reader::from_reader(csv.as_bytes());
            reader
                .records()
                .map(Result::unwrap)
                .filter(|r| &r[3] == quantity && &r[1] == "low")
                .map(|r| r[17].parse().unwrap())
                .collect()
        };
        for quantity in ["power at the plug", "body, worst case", "inrush peak"] {
            let found = shares(quantity);
            assert!(found.is_sorted_by(|a, b| a >= b), "{quantity}: {found:?}");
            assert!((found.iter().sum::<f64>() - 1.0).abs() < 1e-9, "{found:?}");
        }
    }
}
