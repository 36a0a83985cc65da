//! The summary's two tables of rows: a value with its U on a scale that all rows
//! share, its numbers, and its outcome.

use super::axis::{Scale, drawable, extent, widened};
use super::caption::{self, About, Said};
use super::fonts::{Face, SMALL, TEXT};
use super::header::{self, MARGIN, WIDTH};
use super::ink::{BAND, DASHED, DOTTED, GRID, INK, LIMIT, Marker, PLATE, POWER, SOFT, Stroke};
use super::limits::PowerLimits;
use super::number::with_uncertainty;
use super::power::{allowed, margin};
use super::sheet::{Align, Frame, Sheet};
use super::words::clean;
use super::{DrawError, Scene};
use crate::judge::Outcome;

/// Height of a row where there are few and where there are many.
const TALL: f64 = 50.0;
const LOW: f64 = 34.0;
/// Room for the rows of one table before they get lower.
const ROOM: f64 = 260.0;
/// Above and below the rows: head, scale.
const ABOVE: f64 = 58.0;
const BELOW: f64 = 56.0;
/// Where the scale begins and ends, where numbers begin, where outcomes begin.
const SCALE_LEFT: f64 = 370.0;
const SCALE_RIGHT: f64 = 960.0;
const NUMBERS: f64 = 984.0;
const OUTCOMES: f64 = 1396.0;

/// A value on the scale.
struct Mark {
    value: f64,
    expanded: f64,
    marker: Marker,
    /// What is named above the rows; empty where nothing needs a name.
    name: &'static str,
}

/// One row.
struct Row {
    name: String,
    /// What is allowed, on the scale; an absent end is open.
    band: Option<(Option<f64>, Option<f64>)>,
    marks: Vec<Mark>,
    numbers: String,
    said: Option<(Option<Outcome>, String)>,
}

/// A table of rows on one scale.
pub struct Rows {
    head: &'static str,
    beside: String,
    axis: &'static str,
    /// The value that all rows share, and its looks.
    reference: (f64, Stroke),
    least: (f64, f64),
    limit: (f64, f64),
    rows: Vec<Row>,
    /// Why there are no rows.
    nothing: &'static str,
}

/// The input of `cells` in per cent of the plate.
pub fn power(scene: &Scene, cells: &[usize]) -> Rows {
    Rows {
        head: "Power input against the plate",
        beside: "settled input, with U".to_owned(),
        axis: "per cent of the plate's value",
        reference: (100.0, Stroke::broken(PLATE, 2.0, DOTTED)),
        least: (75.0, 125.0),
        limit: (-50.0, 300.0),
        rows: cells.iter().map(|cell| power_row(scene, *cell)).collect(),
        nothing: "the plan has no cells",
    }
}

fn power_row(scene: &Scene, index: usize) -> Row {
    let limits = PowerLimits::of(scene, index);
    let result = scene.analysis.cells.get(index);
    let percent = |watts: f64| {
        let plate = limits.plate().filter(|plate| *plate > 0.0)?;
        drawable(100.0 * watts / plate)
    };
    let steady = result.and_then(|result| result.steady.known());
    let numbers = match (steady, result) {
        (Some(steady), _) => {
            let power = &steady.power_w;
            let (value, expanded) = with_uncertainty(power.value, power.expanded);
            let held = match limits.plate() {
                Some(_) => allowed(&limits),
                None => "no plate value".to_owned(),
            };
            format!("{value} W ± {expanded} W; {held}")
        }
        (None, Some(result)) => clean(result.steady.reason().unwrap_or_default()),
        (None, None) => "not run".to_owned(),
    };
    let mark = steady.and_then(|steady| {
        Some(Mark {
            value: percent(steady.power_w.value)?,
            expanded: percent(steady.power_w.expanded)?,
            marker: Marker::Disc,
            name: "",
        })
    });
    let has_limits = limits.at_least.is_some() || limits.at_most.is_some();
    let band = (
        limits.at_least.and_then(percent),
        limits.at_most.and_then(percent),
    );
    Row {
        name: caption::cell(&scene.plan.cells[index]),
        band: (has_limits && limits.plate().is_some()).then_some(band),
        marks: mark.into_iter().collect(),
        numbers,
        said: said(scene, index, &[About::Power]),
    }
}

/// The margins of `cells` to the thermal link in kelvin.
pub fn thermal(scene: &Scene, cells: &[usize]) -> Rows {
    let link = scene.plan.appliance.link.as_ref();
    let beside = match link {
        Some(link) => {
            let th = link
                .th
                .map_or("Th not stated".to_owned(), |th| format!("Th, {th}"));
            format!(
                "worst body temperature at {} ambient · disc: to {th} · diamond: to Tf − 10 K, {} · outcome: the graver of the two",
                scene.plan.appliance.highest_ambient, link.opens_from
            )
        }
        None => String::new(),
    };
    Rows {
        head: "Margin to the thermal link",
        beside,
        axis: "kelvin below the limit",
        reference: (0.0, Stroke::broken(LIMIT, 2.0, DASHED)),
        least: (-5.0, 20.0),
        limit: (-200.0, 300.0),
        rows: match link {
            Some(_) => cells.iter().map(|cell| thermal_row(scene, *cell)).collect(),
            None => Vec::new(),
        },
        nothing: "the sequence names no thermal link",
    }
}

fn thermal_row(scene: &Scene, index: usize) -> Row {
    let link = scene.plan.appliance.link.as_ref();
    let result = scene.analysis.cells.get(index);
    let worst = result.and_then(|result| result.body_worst.known());
    let limits = link.map(|link| {
        let opens = (link.opens_from.get(), "Tf − 10 K", Marker::Diamond);
        let holds = link.th.map(|th| (th.get(), "Th", Marker::Disc));
        holds.into_iter().chain([opens]).collect::<Vec<_>>()
    });
    let mut marks = Vec::new();
    let mut words = Vec::new();
    if let Some(worst) = worst {
        let (value, expanded) = with_uncertainty(worst.value, worst.expanded);
        words.push(format!("{value} °C ± {expanded} K"));
        for (limit, name, marker) in limits.into_iter().flatten() {
            let margin = margin(limit - worst.value, worst.expanded);
            words.push(format!("{margin} to {name}"));
            marks.extend(drawable(limit - worst.value).map(|value| Mark {
                value,
                expanded: worst.expanded,
                marker,
                name,
            }));
        }
    } else {
        let why = result.and_then(|result| result.body_worst.reason());
        words.push(clean(why.unwrap_or("not run")));
    }
    Row {
        name: caption::cell(&scene.plan.cells[index]),
        band: Some((Some(0.0), None)),
        marks,
        numbers: words.join("; "),
        said: said(scene, index, &[About::Holding, About::Opening]),
    }
}

/// The gravest outcome of what is said about the cell, or where it was judged.
fn said(scene: &Scene, index: usize, abouts: &[About]) -> Option<(Option<Outcome>, String)> {
    let all = abouts
        .iter()
        .filter_map(|about| Said::of(scene, index, *about));
    let said = all.reduce(Said::graver)?;
    Some(match said.worst_condition() {
        Some(worst) => (None, format!("worst: {worst}")),
        None => {
            let outcome = said.finding().outcome;
            (Some(outcome), outcome.word().to_owned())
        }
    })
}

impl Rows {
    /// Height of the table.
    pub fn height(&self) -> f64 {
        ABOVE + self.row() * self.rows.len().max(1) as f64 + BELOW
    }

    fn row(&self) -> f64 {
        (ROOM / self.rows.len().max(1) as f64).clamp(LOW, TALL)
    }

    /// Draws the table from `top` down; returns where it ends.
    ///
    /// # Errors
    /// Those of the sheet.
    pub fn draw(&self, sheet: &mut Sheet, top: f64) -> Result<f64, DrawError> {
        header::head(sheet, top + 18.0, self.head, &self.beside)?;
        let first = top + ABOVE;
        if self.rows.is_empty() {
            sheet.text((MARGIN, first + 20.0), self.nothing, TEXT, Align::Left)?;
            return Ok(top + self.height());
        }
        let bottom = first + self.row() * self.rows.len() as f64;
        let scale = self.scale();
        self.ground(sheet, &scale, first, bottom)?;
        for (n, row) in self.rows.iter().enumerate() {
            row.draw(sheet, &scale, first + (n as f64 + 0.5) * self.row())?;
        }
        Ok(top + self.height())
    }

    fn scale(&self) -> Scale {
        let ends = |row: &Row| {
            let marks = row.marks.iter();
            let marks = marks.flat_map(|m| [m.value - m.expanded, m.value + m.expanded]);
            let band = row.band.unwrap_or((None, None));
            marks
                .chain([band.0, band.1].into_iter().flatten())
                .collect::<Vec<_>>()
        };
        let all = self.rows.iter().flat_map(ends);
        let (low, high) = extent(all.chain([self.least.0, self.least.1])).unwrap_or(self.least);
        let (low, high) = widened((low, high), 0.04);
        Scale {
            low: low.max(self.limit.0),
            high: high.min(self.limit.1),
            from: SCALE_LEFT,
            to: SCALE_RIGHT,
        }
    }

    /// Bands, grid, scale and the shared reference.
    fn ground(
        &self,
        sheet: &mut Sheet,
        scale: &Scale,
        top: f64,
        bottom: f64,
    ) -> Result<(), DrawError> {
        let (row, face) = (self.row(), TEXT.in_ink(SOFT));
        for (value, label) in scale.ticks(8) {
            let x = scale.at(value);
            sheet.line((x, top), (x, bottom), Stroke::solid(GRID, 1.0))?;
            sheet.text((x, bottom + 19.0), &label, face, Align::Centre)?;
        }
        for (n, each) in self.rows.iter().enumerate() {
            each.band(sheet, scale, top + (n as f64 + 0.5) * row)?;
        }
        self.names_of_marks(sheet, scale, top)?;
        let (at, stroke) = self.reference;
        sheet.line(
            (scale.at(at), top - 4.0),
            (scale.at(at), bottom + 4.0),
            stroke,
        )?;
        sheet.line(
            (SCALE_LEFT, bottom),
            (SCALE_RIGHT, bottom),
            Stroke::solid(INK, 1.0),
        )?;
        let middle = 0.5 * (SCALE_LEFT + SCALE_RIGHT);
        sheet.text((middle, bottom + 40.0), self.axis, SMALL, Align::Centre)
    }
}

impl Rows {
    /// Names the marks of the first row that has any, above the rows.
    fn names_of_marks(&self, sheet: &mut Sheet, scale: &Scale, top: f64) -> Result<(), DrawError> {
        let first = self.rows.iter().find(|row| !row.marks.is_empty());
        let marks = first.map_or(&[][..], |row| &row.marks[..]);
        let mut shown: Vec<_> = marks
            .iter()
            .filter(|mark| scale.holds(mark.value) && !mark.name.is_empty())
            .collect();
        shown.sort_by(|a, b| a.value.total_cmp(&b.value));
        let mut free_from = SCALE_LEFT;
        for mark in shown {
            let width = SMALL.width(mark.name);
            let left = (scale.at(mark.value) - 0.5 * width)
                .min(SCALE_RIGHT - width)
                .max(free_from);
            sheet.text_on_paper((left, top - 6.0), mark.name, SMALL, Align::Left)?;
            free_from = left + width + 14.0;
        }
        Ok(())
    }
}

impl Row {
    fn band(&self, sheet: &mut Sheet, scale: &Scale, y: f64) -> Result<(), DrawError> {
        let Some((low, high)) = self.band else {
            return Ok(());
        };
        let x = |v: f64| scale.at(v).clamp(SCALE_LEFT, SCALE_RIGHT);
        let (left, right) = (low.map_or(SCALE_LEFT, x), high.map_or(SCALE_RIGHT, x));
        sheet.fill(Frame::new(left, y - 12.0, right, y + 12.0), BAND)?;
        let edge = Stroke::solid(LIMIT, 2.0);
        for x in [low.map(x), high.map(x)].into_iter().flatten() {
            sheet.line((x, y - 12.0), (x, y + 12.0), edge)?;
        }
        Ok(())
    }

    fn draw(&self, sheet: &mut Sheet, scale: &Scale, y: f64) -> Result<(), DrawError> {
        let name = TEXT.fit(&self.name, SCALE_LEFT - MARGIN - 14.0);
        sheet.text((MARGIN, y + 6.0), &name, TEXT, Align::Left)?;
        for mark in &self.marks {
            mark.draw(sheet, scale, y)?;
        }
        if self.marks.is_empty() {
            // Why there is no value stands where the value would be.
            let face = SMALL.in_ink(INK);
            let text = face.fit(&self.numbers, SCALE_RIGHT - SCALE_LEFT - 16.0);
            let middle = 0.5 * (SCALE_LEFT + SCALE_RIGHT);
            sheet.text_on_paper((middle, y + 5.0), &text, face, Align::Centre)?;
        }
        let numbers = if self.marks.is_empty() {
            "none"
        } else {
            &self.numbers
        };
        let numbers = SMALL.in_ink(INK).fit(numbers, OUTCOMES - NUMBERS - 14.0);
        sheet.text((NUMBERS, y + 5.0), &numbers, SMALL.in_ink(INK), Align::Left)?;
        match &self.said {
            Some((Some(outcome), word)) => {
                let (marker, ink) = caption::looks(*outcome);
                sheet.marker((OUTCOMES + 7.0, y), 6.5, marker, ink)?;
                let face = Face::bold(TEXT.em, ink);
                sheet.text((OUTCOMES + 22.0, y + 6.0), word, face, Align::Left)?;
            }
            Some((None, elsewhere)) => {
                let room = WIDTH - MARGIN - OUTCOMES;
                let text = SMALL.fit(elsewhere, room);
                sheet.text((OUTCOMES, y + 6.0), &text, SMALL, Align::Left)?;
            }
            None => sheet.text((OUTCOMES, y + 6.0), "no finding", SMALL, Align::Left)?,
        }
        Ok(())
    }
}

impl Mark {
    /// The value with its U; beyond the scale, an arrow at its edge.
    fn draw(&self, sheet: &mut Sheet, scale: &Scale, y: f64) -> Result<(), DrawError> {
        if !scale.holds(self.value) {
            let (x, tip) = if self.value > scale.high {
                (SCALE_RIGHT - 16.0, SCALE_RIGHT - 2.0)
            } else {
                (SCALE_LEFT + 16.0, SCALE_LEFT + 2.0)
            };
            return sheet.polygon(&[(x, y - 8.0), (tip, y), (x, y + 8.0)], POWER);
        }
        let bar = Stroke::solid(POWER, 2.0);
        if let Some(expanded) = drawable(self.expanded).filter(|u| *u > 0.0) {
            let clamp = |v: f64| scale.at(v).clamp(SCALE_LEFT, SCALE_RIGHT);
            let (left, right) = (clamp(self.value - expanded), clamp(self.value + expanded));
            sheet.line((left, y), (right, y), bar)?;
            for x in [left, right] {
                sheet.line((x, y - 7.0), (x, y + 7.0), bar)?;
            }
        }
        sheet.marker((scale.at(self.value), y), 5.0, self.marker, POWER)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_shared_scale_stays_within_its_limits() {
        let far = Mark {
            value: 1e9,
            expanded: 1.0,
            marker: Marker::Disc,
            name: "",
        };
        let rows = Rows {
            head: "",
            beside: String::new(),
            axis: "",
            reference: (100.0, Stroke::solid(INK, 1.0)),
            least: (75.0, 125.0),
            limit: (-50.0, 300.0),
            rows: vec![Row {
                name: String::new(),
                band: None,
                marks: vec![far],
                numbers: String::new(),
                said: None,
            }],
            nothing: "",
        };
        let scale = rows.scale();
        assert_eq!(scale.high, 300.0);
        assert!(scale.low < 75.0 && scale.holds(100.0));
    }
}
