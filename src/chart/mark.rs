//! `VIRTUAL BENCH` across a picture (invariant 4): slanted, repeated so that every
//! part of it holds the words, and laid over everything so that nothing hides them;
//! it only darkens, so that data stay legible.

use super::DrawError;
use super::encode::Pixels;
use super::fonts::Face;
use super::ink::INK;

/// The words.
pub const WORDS: &str = "VIRTUAL BENCH";

/// By how much it darkens.
const STRENGTH: f64 = 0.09;
/// From one mark to the next along its line and across, in pixels.
const BESIDE: usize = 130;
const BELOW: usize = 150;
/// Cosine and sine of the slant, 18 degrees.
const SLANT: (f64, f64) = (0.951_056_516, 0.309_016_994);

/// Darkens `pixels` with the words.
///
/// # Errors
/// Where the font fails.
pub fn across(pixels: &mut Pixels) -> Result<(), DrawError> {
    let stamp = Stamp::cut()?;
    let width = pixels.width as usize;
    for (i, pixel) in pixels.rgb.chunks_exact_mut(3).enumerate() {
        let (x, y) = ((i % width) as f64, (i / width) as f64);
        let shade = stamp.at(x * SLANT.0 - y * SLANT.1, x * SLANT.1 + y * SLANT.0);
        if shade > 0.0 {
            for value in pixel {
                *value = (f64::from(*value) * (1.0 - STRENGTH * shade)).round() as u8;
            }
        }
    }
    Ok(())
}

/// One mark with the room around it: coverage from 0 to 1, row by row.
struct Stamp {
    width: usize,
    height: usize,
    ink: Vec<f32>,
}

impl Stamp {
    fn cut() -> Result<Self, DrawError> {
        let face = Face::bold(58.0, INK);
        let (width, height) = (face.width(WORDS).ceil() as usize + BESIDE, BELOW);
        let mut stamp = Self {
            width,
            height,
            ink: vec![0.0; width * height],
        };
        let at = (BESIDE as i32 / 2, height as i32 / 2 - 10);
        let drawn = face.font(1.0).draw(WORDS, at, |x, y, ink| {
            let (x, y) = (usize::try_from(x), usize::try_from(y));
            if let (Ok(x), Ok(y)) = (x, y)
                && x < width
                && y < height
            {
                stamp.ink[y * width + x] = ink;
            }
            Ok::<(), std::convert::Infallible>(())
        });
        match drawn {
            Ok(Ok(())) => Ok(stamp),
            Ok(Err(never)) => match never {},
            Err(error) => Err(DrawError::Draw(error.to_string())),
        }
    }

    /// Coverage at a place of the endless pattern; every other row is shifted by half.
    fn at(&self, u: f64, v: f64) -> f64 {
        let row = (v / self.height as f64).floor();
        let shift = if row.rem_euclid(2.0) == 0.0 {
            0.0
        } else {
            0.5 * self.width as f64
        };
        let (u, v) = (
            (u + shift).rem_euclid(self.width as f64),
            v.rem_euclid(self.height as f64),
        );
        let (x, y) = (u.floor(), v.floor());
        let (a, b) = (u - x, v - y);
        let (x, y) = (x as usize % self.width, y as usize % self.height);
        let (right, below) = ((x + 1) % self.width, (y + 1) % self.height);
        let ink = |x: usize, y: usize| f64::from(self.ink[y * self.width + x]);
        (1.0 - b) * ((1.0 - a) * ink(x, y) + a * ink(right, y))
            + b * ((1.0 - a) * ink(x, below) + a * ink(right, below))
    }
}
