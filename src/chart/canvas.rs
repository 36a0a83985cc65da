//! A picture to draw on: lines, fills and text in pixels of the finished picture.
//!
//! Everything is drawn at twice the size and halved, which smooths lines and letters.

use std::sync::LazyLock;

use plotters::backend::BitMapBackend;
use plotters::coord::Shift;
use plotters::drawing::{DrawingArea, IntoDrawingArea};
use plotters::element::{Circle, PathElement, Polygon, Rectangle, Text};
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{
    Color, FontStyle, FontTransform, IntoFont, RGBColor, ShapeStyle, TextStyle, register_font,
};

use super::DrawError;
use super::ink::Dash;

/// How much larger everything is drawn.
const SCALE: u32 = 2;

/// The lettering, embedded: no system font is asked for.
const FACE: &str = "sans-embedded";

static FONTS: LazyLock<bool> = LazyLock::new(|| {
    let regular = register_font(FACE, FontStyle::Normal, dejavu::sans::regular());
    let bold = register_font(FACE, FontStyle::Bold, dejavu::sans::bold());
    regular.is_ok() && bold.is_ok()
});

/// Where a text hangs.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Anchor {
    Left,
    Centre,
    Right,
}

/// How a text looks.
#[derive(Debug, Clone, Copy)]
pub(super) struct Lettering {
    pub(super) size: f64,
    pub(super) bold: bool,
    pub(super) colour: RGBColor,
}

impl Lettering {
    pub(super) const fn plain(size: f64, colour: RGBColor) -> Self {
        Self { size, bold: false, colour }
    }

    pub(super) const fn bold(size: f64, colour: RGBColor) -> Self {
        Self { size, bold: true, colour }
    }
}

/// A point in pixels of the finished picture.
pub(super) type Point = (f64, f64);

/// What is drawn on.
pub(super) struct Canvas<'a> {
    area: DrawingArea<BitMapBackend<'a>, Shift>,
}

/// Draws a picture and gives its RGB bytes, row by row.
pub(super) fn paint(
    width: u32,
    height: u32,
    draw: impl FnOnce(&Canvas) -> Result<(), DrawError>,
) -> Result<Vec<u8>, DrawError> {
    if !*FONTS {
        return Err(DrawError::Font);
    }
    let (wide, high) = (width * SCALE, height * SCALE);
    let mut large = vec![255; (wide * high * 3) as usize];
    {
        let area = BitMapBackend::with_buffer(&mut large, (wide, high)).into_drawing_area();
        let canvas = Canvas { area };
        draw(&canvas)?;
        canvas.area.present().map_err(DrawError::of)?;
    }
    Ok(halved(&large, width as usize, height as usize))
}

/// The mean of every two by two pixels.
fn halved(large: &[u8], width: usize, height: usize) -> Vec<u8> {
    let row = width * 2 * 3;
    let mut small = Vec::with_capacity(width * height * 3);
    for y in 0..height {
        let (upper, lower) = (&large[2 * y * row..][..row], &large[(2 * y + 1) * row..][..row]);
        for x in 0..width {
            for channel in 0..3 {
                let at = 6 * x + channel;
                let sum = [upper[at], upper[at + 3], lower[at], lower[at + 3]];
                small.push((sum.iter().map(|v| u16::from(*v)).sum::<u16>() / 4) as u8);
            }
        }
    }
    small
}

impl Canvas<'_> {
    /// A line through points.
    pub(super) fn line(&self, points: &[Point], colour: RGBColor, width: f64, dash: Dash) -> Result<(), DrawError> {
        let style = ShapeStyle { color: colour.to_rgba(), filled: false, stroke_width: (width * 2.0).round() as u32 };
        for piece in dash.cut(points) {
            let path: Vec<(i32, i32)> = piece.into_iter().map(scaled).collect();
            self.area.draw(&PathElement::new(path, style)).map_err(DrawError::of)?;
        }
        Ok(())
    }

    /// A filled rectangle; `strength` from 0 (nothing) to 1 (opaque).
    pub(super) fn fill(&self, from: Point, to: Point, colour: RGBColor, strength: f64) -> Result<(), DrawError> {
        let shape = Rectangle::new([scaled(from), scaled(to)], colour.mix(strength).filled());
        self.area.draw(&shape).map_err(DrawError::of)
    }

    /// A rectangle's edge.
    pub(super) fn frame(&self, from: Point, to: Point, colour: RGBColor) -> Result<(), DrawError> {
        let (left, top, right, bottom) = (from.0, from.1, to.0, to.1);
        let corners = [(left, top), (right, top), (right, bottom), (left, bottom), (left, top)];
        self.line(&corners, colour, 1.0, Dash::Solid)
    }

    /// A filled dot.
    pub(super) fn dot(&self, at: Point, radius: f64, colour: RGBColor) -> Result<(), DrawError> {
        let shape = Circle::new(scaled(at), (radius * 2.0) as i32, colour.filled());
        self.area.draw(&shape).map_err(DrawError::of)
    }

    /// A filled diamond.
    pub(super) fn diamond(&self, (x, y): Point, r: f64, colour: RGBColor) -> Result<(), DrawError> {
        let corners = [(x, y - r), (x + r, y), (x, y + r), (x - r, y)].map(scaled);
        self.area.draw(&Polygon::new(corners.to_vec(), colour.filled())).map_err(DrawError::of)
    }

    /// A text whose middle line is at `at.1`.
    pub(super) fn text(&self, text: &str, at: Point, anchor: Anchor, look: Lettering) -> Result<(), DrawError> {
        self.write(text, at, anchor, look, FontTransform::None)
    }

    /// A text that runs upwards, centred at `at`.
    pub(super) fn text_upwards(&self, text: &str, at: Point, look: Lettering) -> Result<(), DrawError> {
        self.write(text, at, Anchor::Centre, look, FontTransform::Rotate270)
    }

    fn write(&self, text: &str, at: Point, anchor: Anchor, look: Lettering, turn: FontTransform) -> Result<(), DrawError> {
        let horizontal = match anchor {
            Anchor::Left => HPos::Left,
            Anchor::Centre => HPos::Center,
            Anchor::Right => HPos::Right,
        };
        let weight = if look.bold { FontStyle::Bold } else { FontStyle::Normal };
        let font = (FACE, look.size * f64::from(SCALE)).into_font().style(weight).transform(turn);
        let style = TextStyle::from(font).color(&look.colour).pos(Pos::new(horizontal, VPos::Center));
        self.area.draw(&Text::new(text, scaled(at), style)).map_err(DrawError::of)
    }
}

fn scaled((x, y): Point) -> (i32, i32) {
    // Far outside the picture is far enough: the backend's integers must not overflow.
    let to_pixel = |v: f64| (v * f64::from(SCALE)).round().clamp(-60_000.0, 60_000.0) as i32;
    (to_pixel(x), to_pixel(y))
}
