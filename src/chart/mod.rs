//! Drawings of a judged record, as PNG bytes: for each cell the power and the
//! temperatures over time, and one summary of every position against its plate.
//!
//! Everything a picture says comes from plan, analysis, judgement and samples;
//! nothing is decided here. Lines differ by dash, marker and direct label as well
//! as by colour, so that they are told apart in grey too.

mod axis;
mod caption;
mod encode;
mod fonts;
mod header;
mod ink;
mod labels;
mod limits;
mod mark;
mod number;
mod panel;
mod power;
mod power_panels;
mod series;
mod sheet;
mod summary;
mod summary_rows;
mod temperature;
mod words;

#[cfg(test)]
mod example;
#[cfg(test)]
mod looks;

use crate::analysis::Analysis;
use crate::judge::Judgement;
use crate::plan::Plan;
use crate::record::Sample;

/// What is drawn: a judged record.
#[derive(Debug, Clone, Copy)]
pub struct Scene<'a> {
    /// The plan that was run.
    pub plan: &'a Plan,
    /// What analysis says of the record.
    pub analysis: &'a Analysis,
    /// Findings and verdict.
    pub judgement: &'a Judgement,
    /// Every row of the record.
    pub samples: &'a [Sample],
    /// The unit's number, as it was scanned; escaped here.
    pub unit: &'a str,
    /// Whether any instrument was virtual: then every picture says so.
    pub virtual_bench: bool,
}

/// One picture.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Picture {
    /// A safe file name: `[a-z0-9-]` and `.png`, no two alike.
    pub name: String,
    /// The file's bytes: 8 bit RGB.
    pub png: Vec<u8>,
}

/// Why there is no picture. The data are never a reason.
#[derive(Debug, thiserror::Error)]
pub enum DrawError {
    /// An embedded font could not be used.
    #[error("cannot use the embedded font {0}")]
    Font(&'static str),
    /// The drawing library refused.
    #[error("cannot draw: {0}")]
    Draw(String),
    /// The picture could not be encoded.
    #[error("cannot encode the picture")]
    Encode(#[from] png::EncodingError),
}

/// Draws the summary (on several pages where there are many cells) and, for each
/// of the plan's cells, its power and its temperatures.
///
/// # Errors
/// Only where font, drawing library or encoder fail; whatever the record holds or
/// lacks is drawn, or its absence is explained in the picture.
pub fn draw(scene: &Scene) -> Result<Vec<Picture>, DrawError> {
    fonts::register()?;
    let mut pictures = summary::draw(scene)?;
    for cell in 0..scene.plan.cells.len() {
        pictures.push(power::draw(scene, cell)?);
        pictures.push(temperature::draw(scene, cell)?);
    }
    Ok(pictures)
}
