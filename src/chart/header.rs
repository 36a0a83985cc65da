//! What every picture has: the title block, key figures below it, and the marks
//! that say what it is a picture of.

use super::caption;
use super::encode::Pixels;
use super::fonts::{FIGURE, Face, HEAD, SMALL, TEXT, TITLE};
use super::ink::{RULE, SOFT, Stroke};
use super::sheet::{Align, Frame, Sheet, paint};
use super::words::clean;
use super::{DrawError, Picture, Scene, mark};
use crate::judge::Outcome;

/// Width of every picture.
pub const WIDTH: f64 = 1600.0;
/// Margin to the left and right.
pub const MARGIN: f64 = 28.0;
/// Where the title block ends.
const BLOCK_END: f64 = 112.0;
/// Where key figures end.
pub const FIGURES_END: f64 = 206.0;

/// What the title block says.
#[derive(Debug, Clone, PartialEq)]
pub struct Header {
    /// The picture's title.
    pub title: String,
    /// The stretch of the record that it shows, in words.
    pub record_time: String,
    /// An outcome, where there is one, and what it is the outcome of.
    pub outcome: Option<(Option<Outcome>, String)>,
}

/// A picture `height` pixels high, with its title block, drawn on by `draw`.
///
/// # Errors
/// Those of drawing and encoding.
pub fn picture(
    scene: &Scene,
    name: String,
    height: f64,
    header: &Header,
    draw: impl FnOnce(&mut Sheet) -> Result<(), DrawError>,
) -> Result<Picture, DrawError> {
    let mut pixels: Pixels = paint((WIDTH as u32, height as u32), |sheet| {
        block(sheet, scene, header)?;
        draw(sheet)
    })?;
    let mut notes = vec![
        ("Title", clean(&header.title)),
        ("Description", about(scene)),
        (
            "Software",
            format!("rateplate {}", env!("CARGO_PKG_VERSION")),
        ),
    ];
    if scene.virtual_bench {
        mark::across(&mut pixels)?;
        notes.push(("Warning", mark::WORDS.to_owned()));
    }
    let png = pixels.to_png(&notes)?;
    Ok(Picture { name, png })
}

/// Unit, appliance and sequence on one line.
fn about(scene: &Scene) -> String {
    let other = match scene.judgement.other_rules {
        Some(_) => "JUDGED BY OTHER RULES than those fixed before the run · ",
        None => "",
    };
    format!(
        "{other}unit {} · {} · {}, edition {}",
        clean(scene.unit),
        clean(&scene.plan.appliance.model),
        clean(&scene.plan.title),
        clean(&scene.plan.edition),
    )
}

fn block(sheet: &mut Sheet, scene: &Scene, header: &Header) -> Result<(), DrawError> {
    let right = WIDTH - MARGIN;
    let badge = match &header.outcome {
        Some((outcome, of)) => outcome_badge(sheet, *outcome, of)?,
        None => 0.0,
    };
    let room = right - MARGIN - badge - 30.0;
    let title = TITLE.fit(&header.title, room);
    sheet.text((MARGIN, 44.0), &title, TITLE, Align::Left)?;
    let line = TEXT.fit(&about(scene), room);
    sheet.text((MARGIN, 72.0), &line, TEXT, Align::Left)?;
    let mut time = SMALL.fit(&header.record_time, room);
    if scene.virtual_bench {
        let face = Face::bold(SMALL.em, SMALL.ink);
        let words = format!("{}: not evidence", mark::WORDS);
        sheet.text((MARGIN, 97.0), &words, face, Align::Left)?;
        let taken = face.width(&words) + 24.0;
        time = SMALL.fit(&header.record_time, room - taken);
        sheet.text((MARGIN + taken, 97.0), &time, SMALL, Align::Left)?;
    } else {
        sheet.text((MARGIN, 97.0), &time, SMALL, Align::Left)?;
    }
    let rule = Stroke::solid(RULE, 1.0);
    sheet.line((MARGIN, BLOCK_END), (right, BLOCK_END), rule)
}

/// The outcome's word with its shape at the upper right; returns the width taken.
fn outcome_badge(sheet: &mut Sheet, outcome: Option<Outcome>, of: &str) -> Result<f64, DrawError> {
    let right = WIDTH - MARGIN;
    let mut widest = 0.0_f64;
    if let Some(outcome) = outcome {
        let (marker, ink) = caption::looks(outcome);
        let face = Face::bold(38.0, ink);
        let width = face.width(outcome.word());
        sheet.text((right, 50.0), outcome.word(), face, Align::Right)?;
        sheet.marker((right - width - 26.0, 36.0), 13.0, marker, ink)?;
        widest = width + 46.0;
    }
    let lines = TEXT.wrap(of, 560.0, 2);
    for (n, line) in lines.iter().enumerate() {
        let baseline = 78.0 + n as f64 * TEXT.leading();
        sheet.text((right, baseline), line, TEXT, Align::Right)?;
        widest = widest.max(TEXT.width(line));
    }
    Ok(widest)
}

/// A figure that is to be found at a glance.
#[derive(Debug, Clone, PartialEq)]
pub struct KeyFigure {
    /// What it is.
    pub name: String,
    /// The value with its unit, or a dash.
    pub value: String,
    /// A note, or why there is no value.
    pub note: String,
}

impl KeyFigure {
    /// A known value.
    pub fn known(name: &str, value: String, note: String) -> Self {
        Self {
            name: name.to_owned(),
            value,
            note,
        }
    }

    /// A value that is not there, and why.
    pub fn absent(name: &str, why: &str) -> Self {
        Self::known(name, "none".to_owned(), clean(why))
    }
}

/// Key figures side by side below the title block.
///
/// # Errors
/// Those of the sheet.
pub fn key_figures(sheet: &mut Sheet, figures: &[KeyFigure]) -> Result<(), DrawError> {
    let each = (WIDTH - 2.0 * MARGIN) / figures.len().max(1) as f64;
    for (n, figure) in figures.iter().enumerate() {
        let left = MARGIN + n as f64 * each;
        let room = each - 22.0;
        if n > 0 {
            let x = left - 12.0;
            let rule = Stroke::solid(RULE, 1.0);
            sheet.line((x, BLOCK_END + 10.0), (x, FIGURES_END - 6.0), rule)?;
        }
        let name = SMALL.fit(&figure.name, room);
        sheet.text((left, 132.0), &name, SMALL, Align::Left)?;
        let value = FIGURE.fit(&figure.value, room);
        sheet.text((left, 157.0), &value, FIGURE, Align::Left)?;
        for (line, text) in SMALL.wrap(&figure.note, room, 2).iter().enumerate() {
            let baseline = 178.0 + line as f64 * 19.0;
            sheet.text((left, baseline), text, SMALL, Align::Left)?;
        }
    }
    Ok(())
}

/// A remark along the lower edge of a picture `height` high.
///
/// # Errors
/// Those of the sheet.
pub fn remark(sheet: &mut Sheet, height: f64, text: &str) -> Result<(), DrawError> {
    let room = WIDTH - 2.0 * MARGIN;
    let text = SMALL.fit(text, room);
    sheet.text((MARGIN, height - 12.0), &text, SMALL, Align::Left)
}

/// A head within a picture, with a rule below it.
///
/// # Errors
/// Those of the sheet.
pub fn head(sheet: &mut Sheet, baseline: f64, text: &str, beside: &str) -> Result<(), DrawError> {
    sheet.text((MARGIN, baseline), text, HEAD, Align::Left)?;
    let x = MARGIN + HEAD.width(text) + 16.0;
    let beside = SMALL.fit(beside, WIDTH - MARGIN - x);
    sheet.text((x, baseline), &beside, SMALL, Align::Left)?;
    let y = baseline + 9.0;
    let rule = Frame::new(MARGIN, y, WIDTH - MARGIN, y + 1.0);
    sheet.fill(rule, SOFT)
}
