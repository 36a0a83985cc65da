//! The sheet that is drawn on: shapes and text in pixels of the finished picture.
//! It is drawn at twice the size and halved, which smooths what the library does
//! not.

use plotters::backend::{BitMapBackend, DrawingBackend};
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{RGBColor, ShapeStyle, TextStyle};

use super::DrawError;
use super::encode::Pixels;
use super::fonts::Face;
use super::ink::{Ink, Marker, PAPER, Stroke};

/// Pixels drawn to a pixel of the finished picture, along each side.
const SCALE: f64 = 2.0;

/// An upright rectangle in pixels; y grows downwards.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Frame {
    pub left: f64,
    pub top: f64,
    pub right: f64,
    pub bottom: f64,
}

impl Frame {
    /// From its sides.
    pub const fn new(left: f64, top: f64, right: f64, bottom: f64) -> Self {
        Self {
            left,
            top,
            right,
            bottom,
        }
    }

    /// Width.
    pub fn width(&self) -> f64 {
        self.right - self.left
    }

    /// Height.
    pub fn height(&self) -> f64 {
        self.bottom - self.top
    }

    /// The part of the line from `a` to `b` that lies inside.
    pub fn clip(&self, a: At, b: At) -> Option<(At, At)> {
        let (dx, dy) = (b.0 - a.0, b.1 - a.1);
        let (mut from, mut to) = (0.0_f64, 1.0_f64);
        for (step, room) in [
            (-dx, a.0 - self.left),
            (dx, self.right - a.0),
            (-dy, a.1 - self.top),
            (dy, self.bottom - a.1),
        ] {
            if step == 0.0 {
                if room < 0.0 {
                    return None;
                }
            } else if step < 0.0 {
                from = from.max(room / step);
            } else {
                to = to.min(room / step);
            }
        }
        let along = |t: f64| (a.0 + t * dx, a.1 + t * dy);
        (from <= to).then(|| (along(from), along(to)))
    }
}

/// A point in pixels.
pub type At = (f64, f64);

/// Which part of a text stands at its point.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Align {
    Left,
    Centre,
    Right,
}

/// What is drawn on.
pub struct Sheet<'a> {
    backend: BitMapBackend<'a>,
}

type Drawn = Result<(), DrawError>;

/// A white sheet of `width` x `height` pixels, drawn on by `draw`.
///
/// # Errors
/// Those of `draw`.
pub fn paint(
    (width, height): (u32, u32),
    draw: impl FnOnce(&mut Sheet) -> Drawn,
) -> Result<Pixels, DrawError> {
    let size = (width * SCALE as u32, height * SCALE as u32);
    let mut rgb = vec![255; 3 * size.0 as usize * size.1 as usize];
    let mut sheet = Sheet {
        backend: BitMapBackend::with_buffer(&mut rgb, size),
    };
    draw(&mut sheet)?;
    sheet.backend.present().map_err(refused)?;
    drop(sheet);
    let (width, height) = size;
    Ok(Pixels { width, height, rgb }.halved())
}

fn refused(error: impl std::fmt::Display) -> DrawError {
    DrawError::Draw(error.to_string())
}

impl Sheet<'_> {
    /// A filled rectangle.
    pub fn fill(&mut self, frame: Frame, ink: Ink) -> Drawn {
        let (from, to) = (
            scaled((frame.left, frame.top)),
            scaled((frame.right, frame.bottom)),
        );
        if from.0 >= to.0 || from.1 >= to.1 {
            return Ok(());
        }
        self.backend
            .draw_rect(from, to, &filled(ink), true)
            .map_err(refused)
    }

    /// A line of one piece.
    pub fn line(&mut self, from: At, to: At, stroke: Stroke) -> Drawn {
        self.path(&[from, to], stroke, None)
    }

    /// A rectangle's outline.
    pub fn outline(&mut self, frame: Frame, stroke: Stroke) -> Drawn {
        let Frame {
            left,
            top,
            right,
            bottom,
        } = frame;
        let corners = [
            (left, top),
            (right, top),
            (right, bottom),
            (left, bottom),
            (left, top),
        ];
        self.path(&corners, stroke, None)
    }

    /// A line through `points`, broken as its stroke says, inside `within`.
    pub fn path(&mut self, points: &[At], stroke: Stroke, within: Option<Frame>) -> Drawn {
        for (from, to) in broken(points, stroke.dash) {
            let kept = match within {
                Some(frame) => frame.clip(from, to),
                None => Some((from, to)),
            };
            if let Some((from, to)) = kept {
                self.piece(from, to, stroke)?;
            }
        }
        Ok(())
    }

    /// A straight piece; upright and level ones are rectangles, others have round
    /// ends so that a bent line has no notches.
    fn piece(&mut self, from: At, to: At, stroke: Stroke) -> Drawn {
        let half = 0.5 * stroke.width;
        if from.0 == to.0 || from.1 == to.1 {
            let frame = Frame::new(
                from.0.min(to.0) - half,
                from.1.min(to.1) - half,
                from.0.max(to.0) + half,
                from.1.max(to.1) + half,
            );
            return self.fill(frame, stroke.ink);
        }
        let (dx, dy) = (to.0 - from.0, to.1 - from.1);
        let length = dx.hypot(dy).max(f64::MIN_POSITIVE);
        let (nx, ny) = (-dy / length * half, dx / length * half);
        let corners = [
            (from.0 + nx, from.1 + ny),
            (to.0 + nx, to.1 + ny),
            (to.0 - nx, to.1 - ny),
            (from.0 - nx, from.1 - ny),
        ];
        self.polygon(&corners, stroke.ink)?;
        self.disc(from, half, stroke.ink)?;
        self.disc(to, half, stroke.ink)
    }

    /// A filled polygon.
    pub fn polygon(&mut self, corners: &[At], ink: Ink) -> Drawn {
        let corners: Vec<_> = corners.iter().copied().map(scaled).collect();
        self.backend
            .fill_polygon(corners, &filled(ink))
            .map_err(refused)
    }

    /// A filled disc.
    pub fn disc(&mut self, centre: At, radius: f64, ink: Ink) -> Drawn {
        let radius = (radius * SCALE).round().max(1.0) as u32;
        self.backend
            .draw_circle(scaled(centre), radius, &filled(ink), true)
            .map_err(refused)
    }

    /// A marker about `2 * radius` wide, on a rim of paper that lifts it off lines.
    pub fn marker(&mut self, (x, y): At, radius: f64, marker: Marker, ink: Ink) -> Drawn {
        for (r, ink) in [(radius + 1.5, PAPER), (radius, ink)] {
            match marker {
                Marker::Disc | Marker::Ring => self.disc((x, y), r, ink)?,
                Marker::Square | Marker::Hollow => {
                    let r = 0.9 * r;
                    self.fill(Frame::new(x - r, y - r, x + r, y + r), ink)?;
                }
                Marker::Triangle => {
                    let r = 1.15 * r;
                    let corners = [(x, y - r), (x + r, y + 0.8 * r), (x - r, y + 0.8 * r)];
                    self.polygon(&corners, ink)?;
                }
                Marker::Diamond => {
                    let r = 1.25 * r;
                    let corners = [(x, y - r), (x + r, y), (x, y + r), (x - r, y)];
                    self.polygon(&corners, ink)?;
                }
                Marker::Cross => {
                    let stroke = Stroke::solid(ink, arm(radius, ink));
                    self.line((x - radius, y - radius), (x + radius, y + radius), stroke)?;
                    self.line((x - radius, y + radius), (x + radius, y - radius), stroke)?;
                }
                Marker::Plus => {
                    let stroke = Stroke::solid(ink, arm(radius, ink));
                    self.line((x - r, y), (x + r, y), stroke)?;
                    self.line((x, y - r), (x, y + r), stroke)?;
                }
            }
        }
        if marker == Marker::Hollow {
            let r = 0.9 * radius - 2.0;
            self.fill(Frame::new(x - r, y - r, x + r, y + r), PAPER)?;
        }
        if marker == Marker::Ring {
            self.disc((x, y), (0.62 * radius).min(radius - 2.0).max(1.0), PAPER)?;
        }
        Ok(())
    }

    /// A text with its baseline at `at`.
    pub fn text(&mut self, at: At, text: &str, face: Face, align: Align) -> Drawn {
        let width = match align {
            Align::Left => 0.0,
            Align::Centre => 0.5 * face.width(text),
            Align::Right => face.width(text),
        };
        // The library sets the baseline half its size below the point.
        let (x, y) = scaled((at.0 - width, at.1));
        let below = (0.5 * face.size(SCALE)).round() as i32;
        let colour = colour(face.ink);
        let style = TextStyle::from(face.font(SCALE))
            .color(&colour)
            .pos(Pos::new(HPos::Left, VPos::Top));
        self.backend
            .draw_text(text, &style, (x, y - below))
            .map_err(refused)
    }

    /// A text on a patch of paper, for places where lines may pass.
    pub fn text_on_paper(&mut self, at: At, text: &str, face: Face, align: Align) -> Drawn {
        let width = face.width(text);
        let left = at.0
            - match align {
                Align::Left => 0.0,
                Align::Centre => 0.5 * width,
                Align::Right => width,
            };
        let patch = Frame::new(
            left - 4.0,
            at.1 - face.em,
            left + width + 4.0,
            at.1 + 0.36 * face.em,
        );
        self.fill(patch, PAPER)?;
        self.text((left, at.1), text, face, Align::Left)
    }
}

/// Width of a cross's arms; its rim is wider.
fn arm(radius: f64, ink: Ink) -> f64 {
    let width = (0.38 * radius).max(2.0);
    if ink == PAPER { width + 2.5 } else { width }
}

/// The pieces of a line through `points` that a dash leaves.
fn broken(points: &[At], dash: &[f64]) -> Vec<(At, At)> {
    let pairs = points.windows(2).map(|pair| (pair[0], pair[1]));
    let total: f64 = dash.iter().sum();
    if total < 1.0 {
        return pairs.collect();
    }
    let mut pieces = Vec::new();
    let (mut part, mut left) = (0, dash[0]);
    for (from, to) in pairs {
        let length = (to.0 - from.0).hypot(to.1 - from.1);
        let mut done = 0.0;
        while done < length {
            let step = left.min(length - done);
            let along = |s: f64| {
                let t = s / length;
                (from.0 + t * (to.0 - from.0), from.1 + t * (to.1 - from.1))
            };
            if part % 2 == 0 {
                pieces.push((along(done), along(done + step)));
            }
            done += step;
            left -= step;
            if left <= 1e-9 {
                part = (part + 1) % dash.len();
                left = dash[part];
            }
        }
    }
    pieces
}

fn scaled(at: At) -> (i32, i32) {
    // What lies far outside stays outside, without overflowing the library's sums.
    let one = |v: f64| (v * SCALE).round().clamp(-20_000.0, 200_000.0) as i32;
    (one(at.0), one(at.1))
}

fn colour(ink: Ink) -> RGBColor {
    RGBColor(ink.0, ink.1, ink.2)
}

fn filled(ink: Ink) -> ShapeStyle {
    ShapeStyle::from(&colour(ink)).filled()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_is_kept_inside_its_frame() {
        let frame = Frame::new(0.0, 0.0, 10.0, 10.0);
        assert_eq!(
            frame.clip((-5.0, 5.0), (15.0, 5.0)),
            Some(((0.0, 5.0), (10.0, 5.0)))
        );
        assert_eq!(frame.clip((-5.0, -5.0), (-1.0, 20.0)), None);
        let inside = ((1.0, 1.0), (2.0, 3.0));
        assert_eq!(frame.clip(inside.0, inside.1), Some(inside));
    }

    #[test]
    fn a_dash_runs_on_through_the_corners() {
        let pieces = broken(&[(0.0, 0.0), (5.0, 0.0), (5.0, 20.0)], &[8.0, 4.0]);
        assert_eq!(pieces[0], ((0.0, 0.0), (5.0, 0.0)));
        assert_eq!(pieces[1], ((5.0, 0.0), (5.0, 3.0)));
        assert_eq!(pieces[2], ((5.0, 7.0), (5.0, 15.0)));
    }
}
