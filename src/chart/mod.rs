//! Drawings.

use crate::analysis::Analysis;
use crate::judge::Judgement;
use crate::plan::Plan;
use crate::record::Sample;

/// What is drawn.
pub struct Scene<'a> {
    /// Plan.
    pub plan: &'a Plan,
    /// Analysis.
    pub analysis: &'a Analysis,
    /// Judgement.
    pub judgement: &'a Judgement,
    /// Samples.
    pub samples: &'a [Sample],
    /// Unit.
    pub unit: &'a str,
    /// Virtual.
    pub virtual_bench: bool,
}

/// A picture.
pub struct Picture {
    /// Name.
    pub name: String,
    /// PNG.
    pub png: Vec<u8>,
}

/// Why not.
#[derive(Debug, thiserror::Error)]
#[error("not drawn")]
pub struct DrawError;

/// Draws.
///
/// # Errors
/// Never.
pub fn draw(scene: &Scene) -> Result<Vec<Picture>, DrawError> {
    let _ = scene.unit;
    Ok(vec![Picture { name: "summary.png".into(), png: vec![] }])
}
