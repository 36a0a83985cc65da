//! Colours and line styles: told apart without colour vision and in grey, because
//! every line has its own dash and its own label.

use plotters::style::RGBColor;

use super::canvas::Point;

/// Text and frames.
pub(super) const INK: RGBColor = RGBColor(32, 36, 42);
/// Secondary text.
pub(super) const SOFT: RGBColor = RGBColor(96, 102, 110);
/// Grid.
pub(super) const GRID: RGBColor = RGBColor(226, 229, 233);
/// The words across a virtual picture.
pub(super) const WATERMARK: RGBColor = RGBColor(234, 234, 238);
/// Power, and the body.
pub(super) const MAIN: RGBColor = RGBColor(0, 76, 138);
/// Limits.
pub(super) const LIMIT: RGBColor = RGBColor(176, 58, 0);
/// The allowed band.
pub(super) const BAND: RGBColor = RGBColor(120, 170, 215);
/// The settled window.
pub(super) const WINDOW: RGBColor = RGBColor(232, 196, 80);
/// Other temperature roles, one after the other.
pub(super) const OTHERS: [RGBColor; 3] = [RGBColor(0, 120, 96), RGBColor(140, 70, 130), RGBColor(110, 100, 20)];
/// Ambient.
pub(super) const AMBIENT: RGBColor = RGBColor(110, 116, 124);

/// How a line is broken.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Dash {
    Solid,
    Long,
    Short,
    Dotted,
}

impl Dash {
    /// Lengths of stroke and gap in pixels.
    fn lengths(self) -> Option<(f64, f64)> {
        match self {
            Dash::Solid => None,
            Dash::Long => Some((16.0, 6.0)),
            Dash::Short => Some((7.0, 5.0)),
            Dash::Dotted => Some((2.0, 4.0)),
        }
    }

    /// A line cut into its strokes.
    pub(super) fn cut(self, points: &[Point]) -> Vec<Vec<Point>> {
        let Some((stroke, gap)) = self.lengths() else { return vec![points.to_vec()] };
        let mut pieces = Vec::new();
        let mut piece: Vec<Point> = points.first().copied().into_iter().collect();
        let (mut drawing, mut left) = (true, stroke);
        for pair in points.windows(2) {
            let (mut from, to) = (pair[0], pair[1]);
            let mut length = (to.0 - from.0).hypot(to.1 - from.1);
            while length > left {
                let share = left / length;
                from = (from.0 + share * (to.0 - from.0), from.1 + share * (to.1 - from.1));
                length -= left;
                if drawing {
                    piece.push(from);
                    pieces.push(std::mem::take(&mut piece));
                } else {
                    piece = vec![from];
                }
                drawing = !drawing;
                left = if drawing { stroke } else { gap };
            }
            left -= length;
            if drawing {
                piece.push(to);
            }
        }
        if drawing && piece.len() > 1 {
            pieces.push(piece);
        }
        pieces
    }
}
