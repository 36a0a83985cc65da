//! One picture for a person in a hurry: the verdict, each position against its plate,
//! the thermal link's margins.

use super::axis::{Axis, SMALL, number};
use super::canvas::{Anchor, Canvas, Lettering};
use super::ink::{BAND, Dash, GRID, INK, LIMIT, MAIN, SOFT};
use super::names::{cell_title, shown, wrapped};
use super::power::{allowed, short};
use super::warmth::limits;
use super::{DrawError, Scene};
use crate::analysis::{CellResult, Figure};
use crate::judge::Outcome;

const ROW: f64 = 34.0;
const LEFT: f64 = 330.0;
const RIGHT: f64 = 1110.0;
const TOP: f64 = 210.0;

/// The picture's height for so many cells.
pub(super) fn height(cells: usize) -> u32 {
    (TOP + 2.0 * (ROW * cells as f64) + 250.0) as u32
}

/// Draws it below the title block.
pub(super) fn draw(canvas: &Canvas, scene: &Scene) -> Result<(), DrawError> {
    verdict(canvas, scene)?;
    let cells = scene.analysis.cells.len() as f64;
    let first = TOP + 30.0;
    powers(canvas, scene, first)?;
    warmths(canvas, scene, first + ROW * cells + 120.0)
}

fn verdict(canvas: &Canvas, scene: &Scene) -> Result<(), DrawError> {
    let judgement = scene.judgement;
    let colour = ink_of(judgement.verdict);
    let (left, top) = (40.0, 92.0);
    canvas.fill((left, top), (left + 14.0, top + 72.0), colour, 1.0)?;
    let word = judgement.verdict.word().to_uppercase();
    canvas.text(&word, (left + 30.0, top + 36.0), Anchor::Left, Lettering::bold(38.0, colour))?;
    for (n, line) in wrapped(&judgement.because, 108).iter().take(3).enumerate() {
        let at = (left + 30.0 + 26.0 * word.chars().count() as f64 + 60.0, top + 16.0 + 21.0 * n as f64);
        canvas.text(line, at, Anchor::Left, Lettering::plain(16.0, INK))?;
    }
    Ok(())
}

/// Never by colour alone: the word stands beside it.
fn ink_of(outcome: Outcome) -> plotters::style::RGBColor {
    match outcome {
        Outcome::Pass | Outcome::ConditionalPass => MAIN,
        Outcome::ConditionalFail | Outcome::Fail => LIMIT,
        Outcome::NotJudged => SOFT,
    }
}

fn powers(canvas: &Canvas, scene: &Scene, top: f64) -> Result<(), DrawError> {
    heading(canvas, top, "settled power, per cent of the plate value", "measured", "allowed")?;
    let share = |cell: &CellResult, watts: f64| reference(scene, cell).map(|r| watts / r * 100.0);
    let highest = scene.analysis.cells.iter().filter_map(|c| share(c, c.steady.known()?.power_w.value));
    let axis = Axis::new(0.0, highest.fold(150.0, f64::max) * 1.02, LEFT, RIGHT);
    let bottom = top + ROW * scene.analysis.cells.len() as f64;
    ticks(canvas, &axis, top, bottom, " %")?;
    for (n, cell) in scene.analysis.cells.iter().enumerate() {
        let y = top + ROW * (n as f64 + 0.5);
        label(canvas, cell, y)?;
        let band = allowed(scene, cell);
        if let (Some(band), Some(_)) = (&band, reference(scene, cell)) {
            let at = |watts: f64| axis.within(share(cell, watts).unwrap_or(0.0));
            let from = band.at_least.map_or(LEFT, at);
            let to = band.at_most.map_or(RIGHT, at);
            canvas.fill((from, y - 11.0), (to, y + 11.0), BAND, 0.45)?;
            for limit in [band.at_least, band.at_most].into_iter().flatten() {
                canvas.line(&[(at(limit), y - 13.0), (at(limit), y + 13.0)], LIMIT, 2.0, Dash::Solid)?;
            }
        }
        match &cell.steady {
            Figure::Known(steady) => {
                let (value, u) = (steady.power_w.value, steady.power_w.expanded);
                if let (Some(middle), Some(width)) = (share(cell, value), share(cell, u)) {
                    bar(canvas, &axis, y, middle, width)?;
                }
                figure(canvas, y, &format!("{} W ± {} W", short(value), short(u)))?;
            }
            Figure::Absent(reason) => absent(canvas, y, reason)?,
        }
        limits_text(canvas, y, band.map(|b| between(b.at_least, b.at_most)))?;
    }
    Ok(())
}

/// What 100 % is: the plate's power, else the middle of explicit limits.
fn reference(scene: &Scene, cell: &CellResult) -> Option<f64> {
    let rated = scene.plan.rated_in(&cell.cell).map(|r| (r.power.low.get() + r.power.high.get()) / 2.0);
    let middle = || {
        let band = allowed(scene, cell)?;
        Some((band.at_least? + band.at_most?) / 2.0)
    };
    rated.or_else(middle).filter(|r| *r > 0.0)
}

fn between(at_least: Option<f64>, at_most: Option<f64>) -> String {
    match (at_least, at_most) {
        (Some(low), Some(high)) => format!("{} to {} W", number(low), number(high)),
        (None, Some(high)) => format!("to {} W", number(high)),
        (Some(low), None) => format!("from {} W", number(low)),
        (None, None) => String::new(),
    }
}

fn warmths(canvas: &Canvas, scene: &Scene, top: f64) -> Result<(), DrawError> {
    heading(canvas, top, "body at the highest ambient, °C", "worst case", "to the nearest limit")?;
    let limits = limits(scene);
    let values = scene.analysis.cells.iter().filter_map(|c| c.body_worst.known()).map(|w| w.value + w.expanded);
    let highest = values.chain(limits.iter().map(|(v, ..)| *v)).fold(60.0, f64::max);
    let axis = Axis::new(20.0, highest + 6.0, LEFT, RIGHT);
    let bottom = top + ROW * scene.analysis.cells.len() as f64;
    ticks(canvas, &axis, top, bottom, "")?;
    for (value, _, dash) in &limits {
        let x = axis.within(*value);
        canvas.line(&[(x, top - 4.0), (x, bottom)], LIMIT, 2.0, *dash)?;
    }
    let names: Vec<String> = limits.iter().rev().map(|(v, name, _)| format!("{name} {} °C", number(*v))).collect();
    canvas.text(&names.join("    "), (RIGHT, top - 16.0), Anchor::Right, Lettering::plain(SMALL, LIMIT))?;
    for (n, cell) in scene.analysis.cells.iter().enumerate() {
        let y = top + ROW * (n as f64 + 0.5);
        label(canvas, cell, y)?;
        match &cell.body_worst {
            Figure::Known(worst) => {
                bar(canvas, &axis, y, worst.value, worst.expanded)?;
                figure(canvas, y, &format!("{:.1} °C ± {:.1} K", worst.value, worst.expanded))?;
                let nearest = limits.iter().map(|(v, ..)| v - worst.value).reduce(f64::min);
                limits_text(canvas, y, nearest.map(|m| format!("{m:+.1} K")))?;
            }
            Figure::Absent(reason) => absent(canvas, y, reason)?,
        }
    }
    Ok(())
}

fn heading(canvas: &Canvas, top: f64, title: &str, value: &str, limits: &str) -> Result<(), DrawError> {
    canvas.text(title, (40.0, top - 16.0), Anchor::Left, Lettering::bold(17.0, INK))?;
    canvas.text(value, (RIGHT + 16.0, top - 16.0), Anchor::Left, Lettering::bold(SMALL, INK))?;
    canvas.text(limits, (RIGHT + 235.0, top - 16.0), Anchor::Left, Lettering::bold(SMALL, INK))
}

fn ticks(canvas: &Canvas, axis: &Axis, top: f64, bottom: f64, unit: &str) -> Result<(), DrawError> {
    for tick in axis.ticks(8.0) {
        let x = axis.at(tick);
        canvas.line(&[(x, top), (x, bottom)], GRID, 1.0, Dash::Solid)?;
        canvas.text(&format!("{}{unit}", number(tick)), (x, bottom + 14.0), Anchor::Centre, Lettering::plain(SMALL, SOFT))?;
    }
    canvas.frame((LEFT, top), (RIGHT, bottom), INK)
}

fn label(canvas: &Canvas, cell: &CellResult, y: f64) -> Result<(), DrawError> {
    canvas.text(&shown(&cell_title(&cell.cell), 36), (LEFT - 12.0, y), Anchor::Right, Lettering::plain(SMALL, INK))
}

fn bar(canvas: &Canvas, axis: &Axis, y: f64, value: f64, u: f64) -> Result<(), DrawError> {
    let (from, to) = (axis.within(value - u), axis.within(value + u));
    canvas.line(&[(from, y), (to, y)], INK, 3.0, Dash::Solid)?;
    for end in [from, to] {
        canvas.line(&[(end, y - 6.0), (end, y + 6.0)], INK, 1.5, Dash::Solid)?;
    }
    canvas.diamond((axis.within(value), y), 7.0, MAIN)
}

fn figure(canvas: &Canvas, y: f64, text: &str) -> Result<(), DrawError> {
    canvas.text(text, (RIGHT + 16.0, y), Anchor::Left, Lettering::plain(SMALL, INK))
}

fn limits_text(canvas: &Canvas, y: f64, text: Option<String>) -> Result<(), DrawError> {
    canvas.text(&text.unwrap_or_default(), (RIGHT + 235.0, y), Anchor::Left, Lettering::plain(SMALL, LIMIT))
}

fn absent(canvas: &Canvas, y: f64, reason: &str) -> Result<(), DrawError> {
    canvas.text(&shown(reason, 84), (LEFT + 12.0, y), Anchor::Left, Lettering::plain(SMALL, LIMIT))
}
