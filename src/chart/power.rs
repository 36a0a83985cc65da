//! Power over time: the switch-on in seconds at full height, the soak in minutes
//! zoomed to the plate's band and the settled level. One axis could show only one of
//! the two: the inrush lasts seconds, the soak half an hour.

use super::axis::{Panel, SMALL, number, spread};
use super::canvas::{Anchor, Canvas, Lettering};
use super::ink::{BAND, Dash, INK, LIMIT, MAIN, SOFT, WINDOW};
use super::names::wrapped;
use super::series::Series;
use super::{DrawError, Scene};
use crate::analysis::{CellResult, Figure};
use crate::plan::Action;
use crate::quantity::Reading;
use crate::spec::plate;
use crate::spec::sequence::{RoleKind, RuleKind};

/// Allowed power in a cell and where it comes from.
#[derive(Debug, Clone)]
pub(super) struct Allowed {
    pub(super) at_least: Option<f64>,
    pub(super) at_most: Option<f64>,
    pub(super) source: &'static str,
}

/// The band of a cell: a rule's explicit limits, else the plate's.
pub(super) fn allowed(scene: &Scene, cell: &CellResult) -> Option<Allowed> {
    let explicit = scene.plan.rules.iter().find_map(|rule| match &rule.kind {
        RuleKind::PowerLimits { at_least, at_most } if rule.position.as_ref().is_none_or(|p| *p == cell.cell.position) => {
            Some(Allowed { at_least: at_least.map(|w| w.get()), at_most: at_most.map(|w| w.get()), source: "limit" })
        }
        _ => None,
    });
    explicit.or_else(|| {
        let rated = scene.plan.rated_in(&cell.cell)?;
        let band = plate::limits(scene.plan.appliance.kind, rated.power);
        let at_least = band.at_least.map(|w| w.get());
        Some(Allowed { at_least, at_most: Some(band.at_most.get()), source: "plate band" })
    })
}

/// Both panels in a rectangle.
pub(super) fn draw(canvas: &Canvas, scene: &Scene, number: usize, [left, top, right, bottom]: [f64; 4]) -> Result<(), DrawError> {
    let cell = &scene.analysis.cells[number];
    let meter = scene.plan.role_of_kind(RoleKind::PowerMeter).map(|(n, _)| n);
    let power = Series::of(scene.samples, number, meter, Reading::Power);
    let (Figure::Known(on), false) = (&cell.energised_s, power.0.is_empty()) else {
        return nothing(canvas, [left, top, right, bottom], cell);
    };
    let off = cell.off_s.known().copied().unwrap_or_else(|| power.0.last().map_or(*on, |(t, _)| *t));
    let middle = left + 0.36 * (right - left);
    let allowed = allowed(scene, cell);
    switch_on(canvas, scene, cell, &power.since(*on, 1.0), [left, top, middle - 70.0, bottom])?;
    let soak = power.since(*on, 60.0).between(0.0, (off - on) / 60.0);
    soaked(canvas, cell, &soak, allowed.as_ref(), (*on, off), [middle + 60.0, top, right - 190.0, bottom])
}

fn nothing(canvas: &Canvas, [left, top, right, bottom]: [f64; 4], cell: &CellResult) -> Result<(), DrawError> {
    canvas.frame((left, top), (right, bottom), SOFT)?;
    let why = cell.energised_s.reason().unwrap_or("no reading of the power");
    let middle = ((left + right) / 2.0, (top + bottom) / 2.0);
    canvas.text(&format!("no power: {why}"), middle, Anchor::Centre, Lettering::bold(20.0, SOFT))
}

fn switch_on(canvas: &Canvas, scene: &Scene, cell: &CellResult, power: &Series, rect: [f64; 4]) -> Result<(), DrawError> {
    let shown_s = inrush_length(scene, cell);
    let part = power.between(-2.0, shown_s);
    let highest = part.values().fold(0.0, f64::max);
    let panel = Panel::new(rect, (-2.0_f64.min(shown_s / 20.0), shown_s), (0.0, highest * 1.18 + 1e-3));
    panel.draw(canvas, "switch-on", "time after energising / s", "power / W")?;
    part.draw(canvas, &panel, MAIN, 2.0, Dash::Solid)?;
    let text = Lettering::plain(SMALL, INK);
    match &cell.inrush {
        Figure::Known(inrush) => {
            let peak = part.0.iter().filter_map(|(t, v)| Some((*t, (*v)?))).reduce(|a, b| if b.1 > a.1 { b } else { a });
            if let Some((t, w)) = peak {
                let at = panel.at(t, w);
                canvas.dot(at, 4.0, MAIN)?;
                let (x, anchor) = if at.0 > (panel.left + panel.right) / 2.0 { (at.0 - 10.0, Anchor::Right) } else { (at.0 + 10.0, Anchor::Left) };
                let ratio = inrush.ratio.map_or_else(String::new, |r| format!(", {r:.1} x settled"));
                canvas.text(&format!("peak {} W, {} A{ratio}", short(w), short(inrush.peak_a.value)), (x, at.1 - 12.0), anchor, text)?;
            }
            if !inrush.lower_bound.is_empty() {
                let at = (panel.right - 8.0, panel.top + 16.0);
                canvas.text("a lower bound", at, Anchor::Right, Lettering::plain(SMALL, LIMIT))?;
            }
        }
        Figure::Absent(reason) => {
            let at = ((panel.left + panel.right) / 2.0, panel.top + 20.0);
            canvas.text(&format!("inrush: {reason}"), at, Anchor::Centre, text)?;
        }
    }
    Ok(())
}

/// What the first panel shows: the inrush step, else a minute.
fn inrush_length(scene: &Scene, cell: &CellResult) -> f64 {
    let of_cell = scene.plan.steps.iter().filter(|s| s.cell.is_some_and(|n| scene.plan.cells[n] == cell.cell));
    let length = of_cell.filter_map(|s| match &s.action {
        Action::Inrush(timed) => Some(timed.length.get()),
        _ => None,
    });
    length.reduce(f64::max).unwrap_or(60.0)
}

fn soaked(
    canvas: &Canvas,
    cell: &CellResult,
    power: &Series,
    allowed: Option<&Allowed>,
    (on, off): (f64, f64),
    rect: [f64; 4],
) -> Result<(), DrawError> {
    let minutes = |s: f64| (s - on) / 60.0;
    let range = zoom(cell, power, allowed);
    let panel = Panel::new(rect, (0.0, minutes(off)), range);
    if let Some(allowed) = allowed {
        let low = allowed.at_least.unwrap_or(f64::NEG_INFINITY).max(range.0);
        let high = allowed.at_most.unwrap_or(f64::INFINITY).min(range.1);
        if low < high {
            canvas.fill(panel.at(0.0, high), panel.at(f64::INFINITY, low), BAND, 0.28)?;
        }
    }
    let steady = cell.steady.known();
    if let Some(steady) = steady {
        let (from, to) = (minutes(steady.from_s), minutes(steady.to_s));
        canvas.fill(panel.at(from, f64::INFINITY), panel.at(to, f64::NEG_INFINITY), WINDOW, 0.45)?;
    }
    let title = match &cell.steady {
        Figure::Known(s) => {
            let settled = cell.settled_s.known().map_or_else(String::new, |t| format!(", settled after {} min", short(t / 60.0)));
            let cycling = if s.duty < 0.999 { format!(" while on, duty {:.0} %", s.duty * 100.0) } else { String::new() };
            format!("soak: {} W ± {} W{cycling}{settled}", short(s.power_w.value), short(s.power_w.expanded))
        }
        Figure::Absent(_) => "soak".to_owned(),
    };
    panel.draw(canvas, &title, "time after energising / min", "power / W")?;
    power.draw(canvas, &panel, MAIN, 2.0, Dash::Solid)?;
    if let Figure::Absent(reason) = &cell.steady {
        for (n, line) in wrapped(&format!("no settled power: {reason}"), 70).iter().take(3).enumerate() {
            let at = ((panel.left + panel.right) / 2.0, panel.top + 24.0 + 20.0 * n as f64);
            canvas.text(line, at, Anchor::Centre, Lettering::plain(16.0, LIMIT))?;
        }
    }
    labels(canvas, &panel, cell, allowed)
}

/// Settled level, band and window in view; the first minutes' peak is not.
fn zoom(cell: &CellResult, power: &Series, allowed: Option<&Allowed>) -> (f64, f64) {
    let level = cell.steady.known().map(|s| s.power_w.value).or(power.last()).unwrap_or(1.0).max(1e-3);
    let mut low = allowed.and_then(|a| a.at_least).map_or(0.6 * level, |l| l.min(level)).max(0.0);
    let mut high = allowed.and_then(|a| a.at_most).map_or(1.4 * level, |h| h.max(level));
    if cell.steady.known().is_some_and(|s| s.duty < 0.999) {
        low = 0.0;
    }
    let room = 0.12 * (high - low);
    low = (low - room).max(0.0);
    high += 1.8 * room;
    (low, high)
}

fn labels(canvas: &Canvas, panel: &Panel, cell: &CellResult, allowed: Option<&Allowed>) -> Result<(), DrawError> {
    let mut marks: Vec<(f64, String, bool)> = Vec::new();
    if let Some(allowed) = allowed {
        let limit = |value: f64, side: &str| (value, format!("{side} {} W, {}", number(value), allowed.source), true);
        marks.extend(allowed.at_most.map(|v| limit(v, "to")));
        marks.extend(allowed.at_least.map(|v| limit(v, "from")));
    }
    marks.extend(cell.steady.known().map(|s| (s.power_w.value, format!("settled {} W", short(s.power_w.value)), false)));
    marks.retain(|(value, ..)| panel.y.holds(*value));
    let wanted: Vec<f64> = marks.iter().map(|(value, ..)| panel.y.at(*value)).collect();
    let places = spread(&wanted, 19.0, panel.top + 8.0, panel.bottom - 8.0);
    for ((value, text, is_limit), place) in marks.iter().zip(places) {
        let y = panel.y.at(*value);
        let (colour, dash) = if *is_limit { (LIMIT, Dash::Long) } else { (INK, Dash::Dotted) };
        canvas.line(&[(panel.left, y), (panel.right, y)], colour, 1.5, dash)?;
        canvas.line(&[(panel.right, y), (panel.right + 10.0, place)], colour, 1.0, Dash::Solid)?;
        canvas.text(text, (panel.right + 13.0, place), Anchor::Left, Lettering::plain(SMALL, colour))?;
    }
    if let Some(steady) = cell.steady.known() {
        let at = |s: f64| panel.x.within((s - cell.energised_s.known().unwrap_or(&0.0)) / 60.0);
        let (from, to) = (at(steady.from_s), at(steady.to_s));
        let (x, anchor) = if from - panel.left > 120.0 { (from - 6.0, Anchor::Right) } else { (to + 6.0, Anchor::Left) };
        let look = Lettering::plain(SMALL, INK);
        canvas.text("measured window", (x, panel.bottom - 14.0), anchor, look)?;
    }
    Ok(())
}

/// Four significant digits.
pub(super) fn short(value: f64) -> String {
    if value == 0.0 || !value.is_finite() {
        return "0".to_owned();
    }
    let magnitude = value.abs().log10().floor();
    let places = (3.0 - magnitude).clamp(0.0, 4.0) as usize;
    number(format!("{value:.places$}").parse().unwrap_or(value))
}
