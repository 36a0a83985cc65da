//! Drawings of a judged record: per cell its power and temperatures over time, and one
//! summary. Same data, same pixels.

mod axis;
mod canvas;
mod encode;
mod ink;
mod names;
mod power;
mod series;
mod summary;
mod warmth;

use crate::analysis::Analysis;
use crate::judge::Judgement;
use crate::plan::Plan;
use crate::record::Sample;

use canvas::{Anchor, Canvas, Lettering, paint};
use ink::{INK, SOFT, WATERMARK};
use names::{cell_title, file_name, shown};

/// Width of every picture in pixels.
const WIDTH: u32 = 1600;

/// Height of a cell's picture in pixels.
const CELL_HEIGHT: u32 = 1040;

/// What is drawn.
#[derive(Debug, Clone, Copy)]
pub struct Scene<'a> {
    /// The plan that was run.
    pub plan: &'a Plan,
    /// What analysis says.
    pub analysis: &'a Analysis,
    /// What the judgement says.
    pub judgement: &'a Judgement,
    /// Every sample, in order.
    pub samples: &'a [Sample],
    /// The unit's number.
    pub unit: &'a str,
    /// Whether the words `VIRTUAL BENCH` stand across each picture.
    pub virtual_bench: bool,
}

/// A finished picture.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Picture {
    /// Its file's name: letters, digits and dashes, `.png`.
    pub name: String,
    /// The PNG.
    pub png: Vec<u8>,
}

/// Why nothing could be drawn.
#[derive(Debug, thiserror::Error)]
pub enum DrawError {
    /// The embedded lettering was not taken.
    #[error("the embedded font can't be used")]
    Font,
    /// The drawing or encoding library refused.
    #[error("{0}")]
    Library(String),
}

impl DrawError {
    fn of(error: impl std::fmt::Display) -> Self {
        DrawError::Library(error.to_string())
    }
}

/// Draws the summary and a picture for each cell.
///
/// # Errors
/// [`DrawError`]; no data can cause one.
pub fn draw(scene: &Scene) -> Result<Vec<Picture>, DrawError> {
    let mut pictures = vec![summary(scene)?];
    for number in 0..scene.analysis.cells.len() {
        pictures.push(cell(scene, number)?);
    }
    Ok(pictures)
}

fn summary(scene: &Scene) -> Result<Picture, DrawError> {
    let height = summary::height(scene.analysis.cells.len());
    let rgb = paint(WIDTH, height, |canvas| {
        backdrop(canvas, scene, height, "summary")?;
        summary::draw(canvas, scene)
    })?;
    finish("summary.png".to_owned(), &rgb, height, scene)
}

fn cell(scene: &Scene, number: usize) -> Result<Picture, DrawError> {
    let of = &scene.analysis.cells[number].cell;
    let rgb = paint(WIDTH, CELL_HEIGHT, |canvas| {
        backdrop(canvas, scene, CELL_HEIGHT, &cell_title(of))?;
        power::draw(canvas, scene, number, [110.0, 130.0, 1590.0, 500.0])?;
        warmth::draw(canvas, scene, number, [110.0, 610.0, 1590.0, 970.0])
    })?;
    finish(file_name(number, of), &rgb, CELL_HEIGHT, scene)
}

fn finish(name: String, rgb: &[u8], height: u32, scene: &Scene) -> Result<Picture, DrawError> {
    let title = format!("{}, unit {}", shown(&scene.plan.appliance.model, 60), shown(scene.unit, 64));
    Ok(Picture { name, png: encode::png(rgb, WIDTH, height, &title, scene.virtual_bench)? })
}

/// The title block, and on a virtual bench the words across everything, so that no
/// crop of the picture loses them.
fn backdrop(canvas: &Canvas, scene: &Scene, height: u32, what: &str) -> Result<(), DrawError> {
    if scene.virtual_bench {
        for (n, y) in (130..height).step_by(110).enumerate() {
            for column in 0..4 {
                let x = f64::from(column) * 480.0 + if n % 2 == 0 { 60.0 } else { -180.0 };
                canvas.text("VIRTUAL BENCH", (x, f64::from(y)), Anchor::Left, Lettering::bold(44.0, WATERMARK))?;
            }
        }
        let mark = Lettering::bold(20.0, INK);
        canvas.text("VIRTUAL BENCH", (f64::from(WIDTH) - 40.0, 34.0), Anchor::Right, mark)?;
    }
    let head = format!("{}, unit {}: {what}", shown(&scene.plan.appliance.model, 40), shown(scene.unit, 40));
    canvas.text(&head, (40.0, 34.0), Anchor::Left, Lettering::bold(24.0, INK))?;
    let plan = scene.plan;
    let below = format!("{}, edition {}", shown(&plan.title, 80), shown(&plan.edition, 20));
    canvas.text(&below, (40.0, 64.0), Anchor::Left, Lettering::plain(16.0, SOFT))
}
