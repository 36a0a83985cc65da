//! Temperatures from energising to the end of the rest, with the link's limits.

use super::axis::{Panel, SMALL, number, spread};
use super::canvas::{Anchor, Canvas, Lettering};
use super::ink::{AMBIENT, Dash, INK, LIMIT, MAIN, OTHERS, SOFT};
use super::names::shown;
use super::series::Series;
use super::{DrawError, Scene};
use crate::analysis::Figure;
use crate::quantity::Reading;
use crate::spec::sequence::RoleKind;
use plotters::style::RGBColor;

/// One line of the panel.
struct Curve {
    name: String,
    series: Series,
    colour: RGBColor,
    width: f64,
    dash: Dash,
}

/// The panel in a rectangle.
pub(super) fn draw(canvas: &Canvas, scene: &Scene, cell: usize, [left, top, right, bottom]: [f64; 4]) -> Result<(), DrawError> {
    let result = &scene.analysis.cells[cell];
    let on = result.energised_s.known().copied().unwrap_or(0.0);
    let curves = curves(scene, cell, on);
    let last = curves.iter().filter_map(|c| c.series.0.last()).map(|(t, _)| *t).fold(1.0, f64::max);
    let values = || curves.iter().flat_map(|c| c.series.values());
    let limits = limits(scene);
    let highest = values().chain(limits.iter().map(|(v, ..)| *v)).fold(30.0, f64::max);
    let lowest = values().fold(20.0, f64::min);
    let rect = [left, top, right - 190.0, bottom];
    let panel = Panel::new(rect, (0.0, last), (lowest - 4.0, highest + 0.08 * (highest - lowest)));
    panel.draw(canvas, "temperatures, after-heat included", "time after energising / min", "temperature / °C")?;
    if let Some(off) = result.off_s.known() {
        let x = panel.x.within((off - on) / 60.0);
        canvas.line(&[(x, panel.top), (x, panel.bottom)], INK, 1.5, Dash::Short)?;
        canvas.text("OFF", (x + 6.0, panel.top + 14.0), Anchor::Left, Lettering::bold(SMALL, INK))?;
    }
    for curve in &curves {
        curve.series.draw(canvas, &panel, curve.colour, curve.width, curve.dash)?;
    }
    if let Figure::Known(peak) = &result.body_peak {
        let at = panel.at((peak.at_s - on) / 60.0, peak.temperature_degc.value);
        canvas.diamond(at, 6.0, MAIN)?;
        let value = &peak.temperature_degc;
        let text = format!("highest {:.1} °C ± {:.1} K", value.value, value.expanded);
        canvas.text(&text, (at.0 + 10.0, at.1 - 16.0), Anchor::Left, Lettering::plain(SMALL, INK))?;
    } else if let Some(reason) = result.body_peak.reason() {
        let at = ((panel.left + panel.right) / 2.0, panel.top + 40.0);
        canvas.text(&shown(&format!("highest: {reason}"), 100), at, Anchor::Centre, Lettering::plain(16.0, LIMIT))?;
    }
    marks(canvas, &panel, &curves, &limits)
}

fn curves(scene: &Scene, cell: usize, on: f64) -> Vec<Curve> {
    let mut others = OTHERS.into_iter().cycle();
    let roles = scene.plan.bay.roles.iter().enumerate().filter(|(_, r)| r.kind == RoleKind::Temperature);
    let curve = |(n, role): (usize, &crate::plan::PlannedRole)| {
        let series = Series::of(scene.samples, cell, Some(n), Reading::Temperature).since(on, 60.0);
        let series = series.between(0.0, f64::INFINITY);
        let name = shown(&role.name, 16);
        match role.name.as_str() {
            "body" => Curve { name, series, colour: MAIN, width: 2.5, dash: Dash::Solid },
            "ambient" => Curve { name, series, colour: AMBIENT, width: 2.0, dash: Dash::Dotted },
            _ => Curve { name, series, colour: others.next().unwrap_or(SOFT), width: 2.0, dash: Dash::Long },
        }
    };
    roles.map(curve).collect()
}

/// The link's limits: value, name, dash.
pub(super) fn limits(scene: &Scene) -> Vec<(f64, &'static str, Dash)> {
    let Some(link) = &scene.plan.appliance.link else { return Vec::new() };
    let mut limits = vec![(link.tf.get(), "Tf", Dash::Solid), (link.opens_from.get(), "Tf - 10 K", Dash::Long)];
    limits.extend(link.th.map(|th| (th.get(), "Th", Dash::Short)));
    limits
}

fn marks(canvas: &Canvas, panel: &Panel, curves: &[Curve], limits: &[(f64, &'static str, Dash)]) -> Result<(), DrawError> {
    let mut labels: Vec<(f64, String, RGBColor)> = Vec::new();
    for (value, name, dash) in limits {
        let y = panel.y.within(*value);
        canvas.line(&[(panel.left, y), (panel.right, y)], LIMIT, 1.5, *dash)?;
        labels.push((y, format!("{name}  {} °C", number(*value)), LIMIT));
    }
    for curve in curves {
        if let Some(last) = curve.series.last() {
            labels.push((panel.y.within(last), curve.name.clone(), curve.colour));
        }
    }
    let wanted: Vec<f64> = labels.iter().map(|(y, ..)| *y).collect();
    let places = spread(&wanted, 19.0, panel.top + 8.0, panel.bottom - 8.0);
    for ((y, text, colour), place) in labels.iter().zip(places) {
        canvas.line(&[(panel.right, *y), (panel.right + 10.0, place)], *colour, 1.0, Dash::Solid)?;
        canvas.text(text, (panel.right + 13.0, place), Anchor::Left, Lettering::plain(SMALL, *colour))?;
    }
    Ok(())
}
