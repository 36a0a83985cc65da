//! The picture of one cell's temperatures, from energising to the end of rest, so
//! that the after-heat is in it, with the thermal link's temperatures as lines.

use super::axis::{drawable, extent, widened};
use super::caption::{self, About, Said};
use super::fonts::{Face, SMALL, TEXT};
use super::header::{self, FIGURES_END, Header, KeyFigure};
use super::ink::{
    AMBIENT, BODY, DASH_DOT, DASHED, Dash, INK, Ink, LEVEL, LIMIT, Marker, OTHERS, SHORT, Stroke,
    TraceInk,
};
use super::labels::{self, Label};
use super::number::{fixed, short, with_uncertainty};
use super::panel::Panel;
use super::power::{margin, outcome, record_time};
use super::series::{Span, Trace, thinned};
use super::sheet::{Align, Frame, Sheet};
use super::words::clean;
use super::{DrawError, Picture, Scene};
use crate::analysis::{CellResult, Figure};
use crate::plan::PlannedLink;
use crate::quantity::{Celsius, Reading};
use crate::spec::sequence::RoleKind;

type Drawn = Result<(), DrawError>;

const HEIGHT: f64 = 900.0;
/// Markers stand this far apart along a line, in pixels.
const MARKERS_APART: f64 = 150.0;
/// More roles than these are not drawn; the picture says how many.
const MOST_OTHERS: usize = 6;

const TF: Stroke = Stroke::solid(LIMIT, 2.0);
const OPENS: Stroke = Stroke::broken(LIMIT, 2.0, DASH_DOT);
const TH: Stroke = Stroke::broken(LIMIT, 2.0, DASHED);
const TM: Stroke = Stroke::broken(LIMIT, 1.0, DASHED);
const WORST: Stroke = Stroke::broken(LEVEL, 2.5, SHORT);

/// One role's temperatures.
struct Role {
    name: String,
    looks: TraceInk,
    trace: Trace,
}

/// Everything that is drawn.
struct Temperatures<'a> {
    result: Option<&'a CellResult>,
    link: Option<&'a PlannedLink>,
    roles: Vec<Role>,
    left_out: usize,
    span: Span,
}

/// Draws the temperatures of cell `index`.
///
/// # Errors
/// Those of drawing and encoding.
pub fn draw(scene: &Scene, index: usize) -> Result<Picture, DrawError> {
    let all = Temperatures::of(scene, index);
    let header = Header {
        title: format!("Temperatures · {}", caption::cell(&scene.plan.cells[index])),
        record_time: record_time(&all.span),
        outcome: gravest(scene, index).map(outcome),
    };
    let figures = key_figures(scene, &all);
    let name = caption::file_name(scene, "temperature", index);
    header::picture(scene, name, HEIGHT, &header, |sheet| {
        header::key_figures(sheet, &figures)?;
        let below = disbelief(sheet, &all)?;
        panel(sheet, scene, &all, below)
    })
}

impl<'a> Temperatures<'a> {
    fn of(scene: &Scene<'a>, index: usize) -> Self {
        let mut roles = Vec::new();
        let (mut others, mut left_out) = (0, 0);
        for (role, planned) in scene.plan.bay.roles.iter().enumerate() {
            if planned.kind != RoleKind::Temperature {
                continue;
            }
            let looks = match planned.name.as_str() {
                "body" => BODY,
                "ambient" => AMBIENT,
                _ if others == MOST_OTHERS => {
                    left_out += 1;
                    continue;
                }
                _ => {
                    others += 1;
                    OTHERS[(others - 1) % OTHERS.len()]
                }
            };
            roles.push(Role {
                name: clean(&planned.name),
                looks,
                trace: Trace::of(scene, index, role, Reading::Temperature, |_| true),
            });
        }
        Self {
            result: scene.analysis.cells.get(index),
            link: scene.plan.appliance.link.as_ref(),
            roles,
            left_out,
            span: Span::of(scene, index),
        }
    }

    /// The body at the highest ambient, where it is known and can be drawn: value and U.
    fn worst(&self) -> Option<(f64, f64)> {
        let worst = self.result?.body_worst.known()?;
        Some((drawable(worst.value)?, worst.expanded))
    }

    fn minutes(&self, t: f64) -> f64 {
        (t - self.span.energised) / 60.0
    }
}

/// The graver of the thermal-link findings of the cell.
fn gravest<'a>(scene: &Scene<'a>, index: usize) -> Option<Said<'a>> {
    [About::Holding, About::Opening]
        .into_iter()
        .filter_map(|about| Said::of(scene, index, about))
        .reduce(Said::graver)
}

fn key_figures(scene: &Scene, all: &Temperatures) -> Vec<KeyFigure> {
    let highest_ambient = short(scene.plan.appliance.highest_ambient.get(), 4);
    let mut figures = vec![
        match all.result.map(|result| &result.body_peak) {
            Some(Figure::Known(peak)) => {
                let t = &peak.temperature_degc;
                let (value, expanded) = with_uncertainty(t.value, t.expanded);
                let when = if peak.after_heat { "after-heat, " } else { "" };
                let note = format!(
                    "{when}{} min after energising; ambient {} °C",
                    fixed(all.minutes(peak.at_s), 1),
                    short(peak.ambient_degc, 3)
                );
                KeyFigure::known("body, highest", format!("{value} °C ± {expanded} K"), note)
            }
            Some(Figure::Absent(why)) => KeyFigure::absent("body, highest", why),
            None => KeyFigure::absent("body, highest", "not run"),
        },
        match all.result.map(|result| &result.body_worst) {
            Some(Figure::Known(worst)) => {
                let (value, expanded) = with_uncertainty(worst.value, worst.expanded);
                let note = format!("at the highest ambient, {highest_ambient} °C");
                KeyFigure::known(
                    "body, worst case",
                    format!("{value} °C ± {expanded} K"),
                    note,
                )
            }
            Some(Figure::Absent(why)) => KeyFigure::absent("body, worst case", why),
            None => KeyFigure::absent("body, worst case", "not run"),
        },
    ];
    figures.extend(margins(all));
    figures
}

/// Margins of the worst case to the link's temperatures.
fn margins(all: &Temperatures) -> Vec<KeyFigure> {
    let Some(link) = all.link else {
        let why = "the sequence names no thermal link";
        return vec![KeyFigure::absent("margin to the thermal link", why)];
    };
    let one = |name: &str, limit: f64, note: String| match all.worst() {
        Some((worst, expanded)) => KeyFigure::known(name, margin(limit - worst, expanded), note),
        None => KeyFigure::absent(name, "there is no worst case"),
    };
    let th = match link.th {
        Some(th) => one(
            "margin to Th",
            th.get(),
            format!("Th {th}, from the data sheet"),
        ),
        None => KeyFigure::absent("margin to Th", "the sequence states no Th"),
    };
    let opens = link.opens_from;
    let note = format!("earliest opening {opens} (IEC 60691)");
    vec![th, one("margin to Tf − 10 K", opens.get(), note)]
}

/// Why the temperatures are not to be believed, below the key figures; returns the
/// height that it took.
fn disbelief(sheet: &mut Sheet, all: &Temperatures) -> Result<f64, DrawError> {
    let reasons = all.result.map(|result| result.disbelief.join("; "));
    let Some(reasons) = reasons.filter(|reasons| !reasons.is_empty()) else {
        return Ok(0.0);
    };
    let face = Face::bold(TEXT.em, LIMIT);
    let room = header::WIDTH - 2.0 * header::MARGIN - 30.0;
    let text = face.fit(&format!("not believed: {}", clean(&reasons)), room);
    let y = FIGURES_END + 20.0;
    sheet.marker(
        (header::MARGIN + 9.0, y - 6.0),
        6.0,
        Marker::Triangle,
        LIMIT,
    )?;
    sheet.text((header::MARGIN + 26.0, y), &text, face, Align::Left)?;
    Ok(26.0)
}

/// A line of the thermal link.
struct LinkLine {
    value: f64,
    name: String,
    note: &'static str,
    stroke: Stroke,
}

fn link_lines(link: Option<&PlannedLink>, hottest: f64) -> Vec<LinkLine> {
    let Some(link) = link else {
        return Vec::new();
    };
    let line = |value: Celsius, name: &str, note, stroke| LinkLine {
        value: value.get(),
        name: format!("{name}  {value}"),
        note,
        stroke,
    };
    let mut lines = vec![
        line(link.tf, "Tf", "functioning temperature", TF),
        line(
            link.opens_from,
            "Tf − 10 K",
            "earliest opening, IEC 60691",
            OPENS,
        ),
    ];
    lines.extend(
        link.th
            .map(|th| line(th, "Th", "holding, from the data sheet", TH)),
    );
    // Tm matters only where the link has opened; else it would flatten the rest.
    let tm = link.tm.filter(|_| hottest > link.tf.get());
    lines.extend(tm.map(|tm| line(tm, "Tm", "maximum limit", TM)));
    lines
}

fn panel(sheet: &mut Sheet, scene: &Scene, all: &Temperatures, below: f64) -> Drawn {
    let top = FIGURES_END + 44.0 + below;
    let frame = Frame::new(84.0, top, 1236.0, HEIGHT - 70.0);
    let points = || all.roles.iter().flat_map(|role| role.trace.points());
    let hottest = points().map(|p| p.v).fold(f64::MIN, f64::max);
    let lines = link_lines(all.link, hottest);
    let values = points()
        .map(|p| p.v)
        .chain(lines.iter().map(|line| line.value));
    let worst = all.worst();
    let worst_ends = worst.map_or([None, None], |(v, u)| [Some(v - u), Some(v + u)]);
    let y = extent(values.chain(worst_ends.into_iter().flatten()))
        .map_or((0.0, 1.0), |range| widened(range, 0.06));
    let x = extent(points().map(|p| all.minutes(p.t)).chain([0.0])).unwrap_or((0.0, 1.0));
    let (from, to) = (x.0.max(-2.0), x.1.max(x.0 + 1.0 / 60.0));
    let panel = Panel::new(frame, (from - 0.01 * (to - from), to), y);

    panel.grid(sheet)?;
    settled_window(sheet, &panel, all)?;
    for line in &lines {
        let y = panel.y.at(line.value);
        sheet.path(
            &[(frame.left, y), (frame.right, y)],
            line.stroke,
            Some(frame),
        )?;
    }
    if let Some(worst) = worst {
        worst_case(sheet, &panel, worst)?;
    }
    if all.roles.iter().all(|role| role.trace.runs.is_empty()) {
        panel.nothing(sheet, "no sample of a temperature")?;
    }
    for role in all.roles.iter().rev() {
        trace(sheet, &panel, all, role)?;
    }
    off(sheet, &panel, all)?;
    highest(sheet, &panel, all, &lines)?;
    let head = match all.left_out {
        0 => "temperatures in °C".to_owned(),
        n => format!("temperatures in °C ({n} more roles are in the record)"),
    };
    panel.rim(sheet, &head, "minutes after energising, to the end of rest")?;
    let column = Frame::new(frame.right, frame.top, 1592.0, frame.bottom);
    labels::draw(sheet, column, &line_labels(scene, &panel, all, &lines))
}

fn settled_window(sheet: &mut Sheet, panel: &Panel, all: &Temperatures) -> Drawn {
    let steady = all.result.and_then(|result| result.steady.known());
    let Some((from, to)) = steady.and_then(|s| drawable(s.from_s).zip(drawable(s.to_s))) else {
        return Ok(());
    };
    panel.window(
        sheet,
        (all.minutes(from), all.minutes(to)),
        "settled window",
    )
}

/// The worst case as a line at its height, with U as a bar at the right.
fn worst_case(sheet: &mut Sheet, panel: &Panel, (value, expanded): (f64, f64)) -> Drawn {
    let frame = panel.frame;
    let y = panel.y.at(value);
    sheet.path(&[(frame.left, y), (frame.right, y)], WORST, Some(frame))?;
    if drawable(expanded).is_some_and(|u| u > 0.0) {
        let x = frame.right - 20.0;
        let bar = Stroke::solid(LEVEL, 2.0);
        let (top, bottom) = (panel.y.at(value + expanded), panel.y.at(value - expanded));
        sheet.path(&[(x, top), (x, bottom)], bar, Some(frame))?;
        for y in [top, bottom] {
            sheet.path(&[(x - 7.0, y), (x + 7.0, y)], bar, Some(frame))?;
        }
    }
    Ok(())
}

fn trace(sheet: &mut Sheet, panel: &Panel, all: &Temperatures, role: &Role) -> Drawn {
    let TraceInk { stroke, marker } = role.looks;
    let mut next_marker = panel.frame.left + 0.4 * MARKERS_APART;
    for run in &role.trace.runs {
        let kept = thinned(run, |t| panel.x.at(all.minutes(t)));
        let path: Vec<_> = kept
            .iter()
            .map(|p| panel.at(all.minutes(p.t), p.v))
            .collect();
        sheet.path(&path, stroke, Some(panel.frame))?;
        if let [only] = path[..] {
            sheet.disc(only, 3.0, stroke.ink)?;
        }
        for at in path {
            if at.0 >= next_marker && panel.frame.clip(at, at).is_some() {
                sheet.marker(at, 4.5, marker, stroke.ink)?;
                next_marker = at.0 + MARKERS_APART;
            }
        }
    }
    Ok(())
}

/// The moment of OFF.
fn off(sheet: &mut Sheet, panel: &Panel, all: &Temperatures) -> Drawn {
    let Some(off) = all.span.off.map(|off| all.minutes(off)) else {
        return Ok(());
    };
    if !panel.x.holds(off) {
        return Ok(());
    }
    let Frame {
        top,
        bottom,
        right,
        left,
    } = panel.frame;
    let x = panel.x.at(off);
    let looks: Dash = &[3.0, 3.0];
    sheet.line((x, top), (x, bottom), Stroke::broken(INK, 1.5, looks))?;
    let text = format!("OFF after {} min", fixed(off, 1));
    let face = Face::bold(TEXT.em, INK);
    let fits_right = x + 8.0 + face.width(&text) < right;
    let (x, align) = if fits_right {
        (x + 8.0, Align::Left)
    } else {
        ((x - 8.0).max(left), Align::Right)
    };
    sheet.text_on_paper((x, bottom - 12.0), &text, face, align)
}

/// A ring around the body's highest temperature, and its value.
fn highest(sheet: &mut Sheet, panel: &Panel, all: &Temperatures, lines: &[LinkLine]) -> Drawn {
    let Some(body) = all.roles.iter().find(|role| role.name == "body") else {
        return Ok(());
    };
    let Some(peak) = body.trace.highest() else {
        return Ok(());
    };
    let ink: Ink = body.looks.stroke.ink;
    let at = panel.at(all.minutes(peak.t), peak.v);
    sheet.marker(at, 6.0, Marker::Ring, ink)?;
    let text = format!("highest {} °C", fixed(peak.v, 1));
    let mut levels: Vec<f64> = lines.iter().map(|line| line.value).collect();
    levels.extend(all.worst().map(|worst| worst.0));
    panel.name(sheet, at, &text, Face::bold(TEXT.em, ink), &levels)
}

fn line_labels(scene: &Scene, panel: &Panel, all: &Temperatures, lines: &[LinkLine]) -> Vec<Label> {
    let mut found: Vec<Label> = lines
        .iter()
        .map(|line| Label {
            y: panel.y.at(line.value),
            lines: vec![
                (line.name.clone(), TEXT.in_ink(LIMIT)),
                (line.note.to_owned(), SMALL),
            ],
            stroke: line.stroke,
            marker: None,
        })
        .collect();
    if let Some((value, expanded)) = all.worst() {
        let (shown, expanded) = with_uncertainty(value, expanded);
        let at = short(scene.plan.appliance.highest_ambient.get(), 4);
        found.push(Label {
            y: panel.y.at(value),
            lines: vec![
                (
                    format!("body, worst {shown} °C ± {expanded} K"),
                    Face::bold(TEXT.em, LEVEL),
                ),
                (format!("at {at} °C ambient"), SMALL),
            ],
            stroke: WORST,
            marker: None,
        });
    }
    for role in &all.roles {
        let Some(last) = role.trace.last() else {
            continue;
        };
        let text = format!("{} {} °C at the end", role.name, fixed(last.v, 1));
        found.push(Label {
            y: panel.y.at(last.v),
            lines: vec![(text, TEXT.in_ink(role.looks.stroke.ink))],
            stroke: role.looks.stroke,
            marker: Some(role.looks.marker),
        });
    }
    found
}
