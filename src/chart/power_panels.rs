//! The two panels of a cell's input.

use super::DrawError;
use super::axis::{drawable, extent, widened};
use super::fonts::{Face, SMALL, TEXT};
use super::ink::{
    BAND, DASHED, DOTTED, INK, LEVEL, LIMIT, MEAN, Marker, PAPER, PLATE, POWER, SHORT, Stroke,
};
use super::labels::{self, Label};
use super::number::{short, with_uncertainty};
use super::panel::Panel;
use super::power::{Input, PANELS_TOP};
use super::series::{Point, thinned};
use super::sheet::{Align, Frame, Sheet};

type Drawn = Result<(), DrawError>;

/// Room below the panels for ticks and the axis' name.
const BELOW: f64 = 62.0;
/// Left and right side of the two panels.
pub const SWITCH_ON_SIDES: (f64, f64) = (84.0, 486.0);
/// See [`SWITCH_ON_SIDES`].
pub const SOAK_SIDES: (f64, f64) = (790.0, 1334.0);
/// Longest and shortest stretch that the panel of the switch-on shows, in seconds.
const LONGEST_SWITCH_ON: f64 = 120.0;
const SHORTEST_SWITCH_ON: f64 = 1.0;
/// Where no step says how long the switch-on is watched.
const USUAL_SWITCH_ON: f64 = 60.0;
/// The soak's first share that may leave the panel, so that the settled level is
/// drawn large.
const RUNNING_IN: f64 = 0.2;

const LINE: Stroke = Stroke::solid(POWER, 2.0);
const SETTLED: Stroke = Stroke::broken(LEVEL, 2.0, SHORT);
const AT_LIMIT: Stroke = Stroke::broken(LIMIT, 2.0, DASHED);
const AT_MEAN: Stroke = Stroke::broken(MEAN, 2.0, &[14.0, 4.0]);
const AT_PLATE: Stroke = Stroke::broken(PLATE, 2.0, DOTTED);

/// The switch-on in seconds, from zero to its peak.
pub fn switch_on(sheet: &mut Sheet, input: &Input, height: f64) -> Drawn {
    let frame = frame(SWITCH_ON_SIDES, height);
    let length = input
        .span
        .inrush
        .map_or(USUAL_SWITCH_ON, |end| (end - input.t0).ceil())
        .clamp(SHORTEST_SWITCH_ON, LONGEST_SWITCH_ON);
    let early: Vec<Point> = input
        .trace
        .points()
        .filter(|point| point.t - input.t0 <= length)
        .collect();
    let limits = &input.limits;
    let level = input.steady().map(|steady| steady.power_w.value);
    let marks = [limits.at_most, limits.plate(), level];
    let values = early.iter().map(|point| point.v);
    let (low, high) = extent(values.chain(marks.into_iter().flatten()).chain([0.0]))
        .map_or((0.0, 1.0), |range| widened(range, 0.12));
    let low = not_below_zero((low, high), early.iter().map(|point| point.v));
    let panel = Panel::new(frame, (-0.02 * length, length), (low, high));

    panel.grid(sheet)?;
    lines_behind(sheet, &panel, input, false)?;
    curve(sheet, &panel, input, |t| t - input.t0)?;
    if let Some(peak) = highest(&early) {
        name_peak(sheet, &panel, input, peak)?;
    } else {
        panel.nothing(sheet, "no sample of the input")?;
    }
    panel.rim(
        sheet,
        "switch-on: power in W",
        "seconds after the first current",
    )?;
    let column = Frame::new(frame.right, frame.top, 724.0, frame.bottom);
    labels::draw(sheet, column, &line_labels(&panel, input, column, false))
}

/// The soak in minutes, its power scale drawn close around plate and settled level.
pub fn soak(sheet: &mut Sheet, input: &Input, height: f64) -> Drawn {
    let frame = frame(SOAK_SIDES, height);
    let span = &input.span;
    let minutes = |t: f64| (t - span.energised) / 60.0;
    let last = input.trace.last().map(|point| minutes(point.t));
    // OFF comes a moment after the last sample; one that is far from it is not believed.
    let off = span.off.map(minutes);
    let off = off.filter(|off| last.is_some_and(|last| (last..last + 0.5).contains(off)));
    let end = off.or(last).unwrap_or(1.0).max(0.05);
    let panel = Panel::new(frame, (0.0, end), soak_range(input, minutes, end));

    lines_behind(sheet, &panel, input, true)?;
    curve(sheet, &panel, input, minutes)?;
    settled_level(sheet, &panel, input, minutes)?;
    leaves_panel(sheet, &panel, input, minutes)?;
    if input.trace.runs.is_empty() {
        let why = format!("no settled input: {}", input.why_not_steady());
        panel.nothing(sheet, &why)?;
    } else if input.steady().is_none() {
        let why = format!("no settled input: {}", input.why_not_steady());
        reason(sheet, &panel, &why)?;
    }
    panel.rim(
        sheet,
        "soak: power in W, scale drawn close",
        "minutes after energising",
    )?;
    let column = Frame::new(frame.right, frame.top, 1592.0, frame.bottom);
    labels::draw(sheet, column, &line_labels(&panel, input, column, true))
}

fn frame((left, right): (f64, f64), height: f64) -> Frame {
    Frame::new(left, PANELS_TOP, right, height - BELOW - 8.0)
}

/// The range of the soak's power scale.
fn soak_range(input: &Input, minutes: impl Fn(f64) -> f64, end: f64) -> (f64, f64) {
    let limits = &input.limits;
    let marks = [limits.at_least, limits.at_most, limits.plate()];
    let mut values: Vec<f64> = marks.into_iter().flatten().collect();
    if let Some(steady) = input.steady() {
        let (power, expanded) = (steady.power_w.value, steady.power_w.expanded);
        values.extend([power - expanded, power + expanded]);
        if steady.duty < 0.999 {
            values.push(steady.mean_w);
        }
    }
    let late = input.trace.points();
    values.extend(
        late.filter(|point| minutes(point.t) >= RUNNING_IN * end)
            .map(|point| point.v),
    );
    // Where there is no lower limit, as much again is shown below the plate.
    if let (None, Some(plate), Some(most)) = (limits.at_least, limits.plate(), limits.at_most) {
        values.push(plate - 0.5 * (most - plate).max(0.0));
    }
    let (low, high) = extent(values).map_or((0.0, 1.0), |range| widened(range, 0.14));
    let low = not_below_zero((low, high), input.trace.points().map(|point| point.v));
    (low, high)
}

/// The lower end of a range: a little below zero at most, unless values are.
fn not_below_zero((low, high): (f64, f64), mut values: impl Iterator<Item = f64>) -> f64 {
    if low < 0.0 && values.all(|v| v >= 0.0) {
        low.max(-0.02 * high.max(0.0))
    } else {
        low
    }
}

/// Band, plate and limits.
fn lines_behind(sheet: &mut Sheet, panel: &Panel, input: &Input, windowed: bool) -> Drawn {
    let limits = &input.limits;
    if limits.at_least.is_some() || limits.at_most.is_some() {
        panel.band(sheet, (limits.at_least, limits.at_most), BAND)?;
    }
    panel.grid(sheet)?;
    if windowed && let Some(steady) = input.steady() {
        let minutes = |t: f64| (t - input.span.energised) / 60.0;
        let window = (minutes(steady.from_s), minutes(steady.to_s));
        let early = input.steady().is_some_and(|steady| steady.extrapolated);
        let word = if early {
            "not settled"
        } else {
            "settled window"
        };
        panel.window(sheet, window, word)?;
    }
    for limit in [limits.at_least, limits.at_most].into_iter().flatten() {
        level(sheet, panel, limit, AT_LIMIT)?;
    }
    if let Some(plate) = limits.plate() {
        level(sheet, panel, plate, AT_PLATE)?;
    }
    if let Some(steady) = input.steady() {
        if windowed && steady.duty < 0.999 {
            level(sheet, panel, steady.mean_w, AT_MEAN)?;
        }
        level(sheet, panel, steady.power_w.value, SETTLED)?;
    }
    Ok(())
}

fn level(sheet: &mut Sheet, panel: &Panel, value: f64, stroke: Stroke) -> Drawn {
    if !panel.y.holds(value) {
        return Ok(());
    }
    let y = panel.y.at(value);
    sheet.line((panel.frame.left, y), (panel.frame.right, y), stroke)
}

/// The power itself, run by run; a run of one sample is a dot.
fn curve(sheet: &mut Sheet, panel: &Panel, input: &Input, x: impl Fn(f64) -> f64) -> Drawn {
    for run in &input.trace.runs {
        let kept = thinned(run, |t| panel.x.at(x(t)));
        let path: Vec<_> = kept.iter().map(|p| panel.at(x(p.t), p.v)).collect();
        sheet.path(&path, LINE, Some(panel.frame))?;
        if let [only] = path[..]
            && panel.frame.clip(only, only).is_some()
        {
            sheet.disc(only, 3.0, POWER)?;
        }
    }
    Ok(())
}

/// The settled level over its window, with U as a bar.
fn settled_level(
    sheet: &mut Sheet,
    panel: &Panel,
    input: &Input,
    minutes: impl Fn(f64) -> f64,
) -> Drawn {
    let Some(steady) = input.steady() else {
        return Ok(());
    };
    let (value, expanded) = (steady.power_w.value, steady.power_w.expanded);
    let from = panel.at(minutes(steady.from_s), value);
    let to = panel.at(minutes(steady.to_s), value);
    let inside = Some(panel.frame);
    sheet.path(&[from, to], Stroke::solid(LEVEL, 3.0), inside)?;
    let Some(expanded) = drawable(expanded).filter(|u| *u > 0.0) else {
        return Ok(());
    };
    let x = 0.5 * (from.0 + to.0);
    let (top, bottom) = (panel.y.at(value + expanded), panel.y.at(value - expanded));
    for (ink, width) in [(PAPER, 5.0), (LEVEL, 2.0)] {
        if ink == PAPER && bottom - top < 16.0 {
            continue;
        }
        let bar = Stroke::solid(ink, width);
        sheet.path(&[(x, top), (x, bottom)], bar, inside)?;
        for y in [top, bottom] {
            sheet.path(&[(x - 7.0, y), (x + 7.0, y)], bar, inside)?;
        }
    }
    Ok(())
}

/// Says where the line goes on above the panel.
fn leaves_panel(
    sheet: &mut Sheet,
    panel: &Panel,
    input: &Input,
    minutes: impl Fn(f64) -> f64,
) -> Drawn {
    let Some(peak) = input.trace.highest().filter(|peak| peak.v > panel.y.high) else {
        return Ok(());
    };
    let (x, top) = (panel.x.at(minutes(peak.t)), panel.frame.top);
    let x = x.clamp(panel.frame.left + 14.0, panel.frame.right - 14.0);
    let arrow = [(x, top + 5.0), (x + 7.0, top + 17.0), (x - 7.0, top + 17.0)];
    sheet.polygon(&arrow, POWER)?;
    let text = format!("up to {} W", short(peak.v, 4));
    let face = TEXT.in_ink(POWER);
    sheet.text_on_paper((x + 16.0, top + 19.0), &text, face, Align::Left)
}

fn reason(sheet: &mut Sheet, panel: &Panel, why: &str) -> Drawn {
    let face = Face::bold(SMALL.em, INK);
    let lines = face.wrap(why, panel.frame.width() - 40.0, 4);
    let mut y = panel.frame.bottom - 14.0 - (lines.len() as f64 - 1.0) * face.leading();
    for line in &lines {
        sheet.text_on_paper((panel.frame.left + 18.0, y), line, face, Align::Left)?;
        y += face.leading();
    }
    Ok(())
}

fn highest(points: &[Point]) -> Option<Point> {
    points
        .iter()
        .copied()
        .fold(None, |found: Option<Point>, point| match found {
            Some(found) if found.v >= point.v => Some(found),
            _ => Some(point),
        })
}

/// A ring around the peak, and its value above it, clear of level lines.
fn name_peak(sheet: &mut Sheet, panel: &Panel, input: &Input, peak: Point) -> Drawn {
    let after = peak.t - input.t0;
    let at = panel.at(after, peak.v);
    sheet.marker(at, 5.5, Marker::Ring, POWER)?;
    let when = short(after.max(0.0), 2);
    let text = format!("peak {} W after {when} s", short(peak.v, 4));
    let limits = &input.limits;
    let level = input.steady().map(|steady| steady.power_w.value);
    let levels = [limits.at_most, limits.at_least, limits.plate(), level];
    let levels: Vec<f64> = levels.into_iter().flatten().collect();
    panel.name(sheet, at, &text, Face::bold(TEXT.em, POWER), &levels)
}

/// Labels at the right-hand ends of the lines; `whole` adds sources and U.
fn line_labels(panel: &Panel, input: &Input, column: Frame, whole: bool) -> Vec<Label> {
    let limits = &input.limits;
    let room = labels::text_room(column.width());
    let mut found = Vec::new();
    for (limit, words) in [(limits.at_most, "at most"), (limits.at_least, "at least")] {
        let Some(limit) = limit.filter(|limit| panel.y.holds(*limit)) else {
            continue;
        };
        let text = format!("{words} {} W", short(limit, 5));
        let mut lines = vec![(text, TEXT.in_ink(LIMIT))];
        if whole && found.is_empty() {
            let source = SMALL.wrap(&limits.source, room, 4);
            lines.extend(source.into_iter().map(|line| (line, SMALL)));
        } else if whole {
            lines.push(("by the same".to_owned(), SMALL));
        }
        found.push(label(panel, limit, lines, AT_LIMIT));
    }
    if let Some(plate) = limits.plate().filter(|plate| panel.y.holds(*plate)) {
        let text = format!("plate {} W", short(plate, 4));
        let lines = vec![(text, TEXT.in_ink(PLATE))];
        found.push(label(panel, plate, lines, AT_PLATE));
    }
    if let Some(steady) = input.steady() {
        let power = &steady.power_w;
        let (value, expanded) = with_uncertainty(power.value, power.expanded);
        let word = match steady.extrapolated {
            true if whole => "extrapolated",
            true => "extrap.",
            false if steady.duty < 0.999 => "on",
            false => "settled",
        };
        let mut lines = vec![(format!("{word} {value} W"), Face::bold(TEXT.em, LEVEL))];
        if whole {
            lines.push((format!("± {expanded} W"), TEXT.in_ink(LEVEL)));
        }
        found.push(label(panel, power.value, lines, SETTLED));
        if whole && steady.duty < 0.999 && panel.y.holds(steady.mean_w) {
            let text = format!("mean {} W", short(steady.mean_w, 4));
            let lines = vec![(text, TEXT.in_ink(MEAN))];
            found.push(label(panel, steady.mean_w, lines, AT_MEAN));
        }
    }
    found
}

fn label(panel: &Panel, value: f64, lines: Vec<(String, Face)>, stroke: Stroke) -> Label {
    Label {
        y: panel.y.at(value),
        lines,
        stroke,
        marker: None,
    }
}
