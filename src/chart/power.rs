//! The picture of one cell's input: key figures, the switch-on in seconds and the
//! soak in minutes side by side, for the one lasts seconds and the other half an
//! hour.

use super::axis::drawable;
use super::caption::{self, About, Said};
use super::header::{self, FIGURES_END, Header, KeyFigure};
use super::limits::PowerLimits;
use super::number::{fixed, short, with_sign, with_uncertainty};
use super::series::{Span, Trace};
use super::words::clean;
use super::{DrawError, Picture, Scene, power_panels};
use crate::analysis::{CellResult, Figure, Inrush, Steady};
use crate::judge::Outcome;
use crate::quantity::Reading;
use crate::spec::sequence::RoleKind;

/// Height of the picture.
const HEIGHT: f64 = 900.0;
/// Where its panels begin.
pub const PANELS_TOP: f64 = FIGURES_END + 44.0;

/// Everything that the panels of a cell's input need.
pub struct Input<'a> {
    /// What analysis says of the cell, where it says anything.
    pub result: Option<&'a CellResult>,
    /// Power while energised.
    pub trace: Trace,
    /// When it was energised and when not any more.
    pub span: Span,
    /// First current, seconds since the record's start.
    pub t0: f64,
    /// Limits and plate.
    pub limits: PowerLimits,
}

impl<'a> Input<'a> {
    fn of(scene: &Scene<'a>, index: usize) -> Self {
        let result = scene.analysis.cells.get(index);
        let trace = match scene.plan.role_of_kind(RoleKind::PowerMeter) {
            Some((role, _)) => {
                let energised = |sample: &crate::record::Sample| sample.energised;
                Trace::of(scene, index, role, Reading::Power, energised)
            }
            None => Trace::default(),
        };
        let span = Span::of(scene, index);
        let inrush = result.and_then(|result| result.inrush.known());
        let t0 = inrush
            .and_then(|inrush| drawable(inrush.t0_s))
            .unwrap_or(span.energised);
        Self {
            result,
            trace,
            span,
            t0,
            limits: PowerLimits::of(scene, index),
        }
    }

    /// The settled input, where it is known and can be drawn.
    pub fn steady(&self) -> Option<&'a Steady> {
        let steady = self.result?.steady.known()?;
        let all = [steady.power_w.value, steady.from_s, steady.to_s];
        all.iter().all(|v| drawable(*v).is_some()).then_some(steady)
    }

    /// Why there is no settled input.
    pub fn why_not_steady(&self) -> &'a str {
        match self.result {
            Some(result) => result.steady.reason().unwrap_or("it cannot be drawn"),
            None => "not run",
        }
    }
}

/// Draws the input of cell `index`.
///
/// # Errors
/// Those of drawing and encoding.
pub fn draw(scene: &Scene, index: usize) -> Result<Picture, DrawError> {
    let input = Input::of(scene, index);
    let cell = &scene.plan.cells[index];
    let header = Header {
        title: format!("Power input · {}", caption::cell(cell)),
        record_time: record_time(&input.span),
        outcome: Said::of(scene, index, About::Power).map(outcome),
    };
    let figures = key_figures(&input);
    let name = caption::file_name(scene, "power", index);
    header::picture(scene, name, HEIGHT, &header, |sheet| {
        header::key_figures(sheet, &figures)?;
        power_panels::switch_on(sheet, &input, HEIGHT)?;
        power_panels::soak(sheet, &input, HEIGHT)
    })
}

/// What the title block says of a finding.
pub fn outcome(said: Said) -> (Option<Outcome>, String) {
    let finding = said.finding();
    let rule = clean(&finding.rule);
    match said.worst_condition() {
        Some(worst) => (
            None,
            format!("{rule}: judged in the worst condition, {worst}"),
        ),
        None => (Some(finding.outcome), rule),
    }
}

/// The stretch of the record that a cell's pictures show, in words.
pub fn record_time(span: &Span) -> String {
    match span.sampled {
        Some((from, to)) => format!(
            "record time {} s to {} s; energised at {} s",
            fixed(from, 1),
            fixed(to, 1),
            fixed(span.energised, 1)
        ),
        None => "not run: there are no samples".to_owned(),
    }
}

fn key_figures(input: &Input) -> Vec<KeyFigure> {
    let mut figures = vec![settled(input)];
    if let Some(steady) = input.steady()
        && steady.duty < 0.999
    {
        let note = format!("on for {} % of the window", short(100.0 * steady.duty, 2));
        let value = format!("{} W", short(steady.mean_w, 4));
        figures.push(KeyFigure::known("mean, off times included", value, note));
    }
    figures.push(plate(input));
    figures.push(match input.result.map(|result| &result.inrush) {
        Some(Figure::Known(inrush)) => switch_on(inrush),
        Some(Figure::Absent(why)) => KeyFigure::absent("switch-on", why),
        None => KeyFigure::absent("switch-on", "not run"),
    });
    figures.push(time_to_settle(input));
    figures
}

fn settled(input: &Input) -> KeyFigure {
    let Some(steady) = input.steady() else {
        return KeyFigure::absent("settled input", input.why_not_steady());
    };
    let name = if steady.extrapolated {
        "extrapolated input"
    } else if steady.duty < 0.999 {
        "settled input, while on"
    } else {
        "settled input"
    };
    let power = &steady.power_w;
    let (value, expanded) = with_uncertainty(power.value, power.expanded);
    let room = steady
        .ambient_degc
        .as_ref()
        .map_or_else(String::new, |room| format!(", {} °C", short(room.value, 3)));
    let note = format!(
        "k = {}; {} independent samples; referred from {} W at {} V{room}",
        short(power.coverage, 3),
        short(steady.effective, 2),
        short(steady.at_plug_w.value, 4),
        short(steady.voltage_v, 4),
    );
    KeyFigure::known(name, format!("{value} W ± {expanded} W"), note)
}

fn plate(input: &Input) -> KeyFigure {
    let limits = &input.limits;
    let allowed = allowed(limits);
    let Some((low, high)) = limits.rated else {
        let why = format!("no promise for this position and supply; {allowed}");
        return KeyFigure::absent("plate", &why);
    };
    let value = if low == high {
        format!("{} W", short(low, 4))
    } else {
        format!("{} W to {} W", short(low, 4), short(high, 4))
    };
    KeyFigure::known("plate", value, allowed)
}

/// What is allowed, in words.
pub fn allowed(limits: &PowerLimits) -> String {
    let at_least = limits.at_least.map(|w| short(w, 5));
    let at_most = limits.at_most.map(|w| short(w, 5));
    match (at_least, at_most) {
        (Some(low), Some(high)) => format!("allowed {low} W to {high} W"),
        (None, Some(high)) => format!("at most {high} W, no lower limit"),
        (Some(low), None) => format!("at least {low} W, no upper limit"),
        (None, None) => "no limit is set".to_owned(),
    }
}

fn switch_on(inrush: &Inrush) -> KeyFigure {
    let peak = &inrush.peak_a;
    let (amps, expanded) = with_uncertainty(peak.value, peak.expanded);
    let mut notes = vec![format!("{amps} A ± {expanded} A")];
    if let Some(ratio) = inrush.ratio {
        notes.push(format!("{} times settled", short(ratio, 3)));
    }
    if let Some(half) = inrush.half_way_s {
        notes.push(format!("half-way in {} s", short(half, 3)));
    }
    if let Some(why) = &inrush.supply_limited {
        notes.push(format!("supply-limited: {}", clean(why)));
    }
    if let Some(why) = inrush.lower_bound.first() {
        notes.push(format!("lower bound: {}", clean(why)));
    }
    let value = format!("{} W", short(inrush.peak_w, 4));
    KeyFigure::known("switch-on peak", value, notes.join("; "))
}

fn time_to_settle(input: &Input) -> KeyFigure {
    let early = input.steady().is_some_and(|steady| steady.extrapolated);
    let name = if early {
        "ended early after"
    } else {
        "settled after"
    };
    match input.result.map(|result| &result.settled_s) {
        Some(Figure::Known(s)) => {
            let criterion = input.steady().map(|steady| clean(&steady.criterion));
            let value = format!("{} min", fixed(s / 60.0, 1));
            KeyFigure::known(name, value, criterion.unwrap_or_default())
        }
        Some(Figure::Absent(why)) => KeyFigure::absent(name, why),
        None => KeyFigure::absent(name, "not run"),
    }
}

/// A margin in kelvin, in words: `+1.3 K`.
pub fn margin(value: f64, expanded: f64) -> String {
    format!("{} K", with_sign(value, expanded))
}
