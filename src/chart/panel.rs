//! A panel: a frame with two scales, its grid and its labels.

use super::DrawError;
use super::axis::Scale;
use super::fonts::{Face, HEAD, SMALL, TEXT};
use super::ink::{GRID, INK, Ink, SOFT, Stroke, WINDOW};
use super::sheet::{Align, At, Frame, Sheet};

/// A frame with two scales.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Panel {
    /// The frame.
    pub frame: Frame,
    /// Level scale.
    pub x: Scale,
    /// Upright scale.
    pub y: Scale,
}

impl Panel {
    /// A panel whose scales span its frame.
    pub fn new(frame: Frame, x: (f64, f64), y: (f64, f64)) -> Self {
        let scale = |(low, high), from, to| Scale {
            low,
            high,
            from,
            to,
        };
        Self {
            frame,
            x: scale(x, frame.left, frame.right),
            y: scale(y, frame.bottom, frame.top),
        }
    }

    /// The pixel of a pair of values.
    pub fn at(&self, x: f64, y: f64) -> At {
        (self.x.at(x), self.y.at(y))
    }

    /// Fills what lies between two values of the upright scale; an absent one is open.
    ///
    /// # Errors
    /// Those of the sheet.
    pub fn band(
        &self,
        sheet: &mut Sheet,
        (low, high): (Option<f64>, Option<f64>),
        ink: Ink,
    ) -> Result<(), DrawError> {
        let Frame { top, bottom, .. } = self.frame;
        let y = |v: f64| self.y.at(v).clamp(top, bottom);
        let frame = Frame {
            top: high.map_or(top, y),
            bottom: low.map_or(bottom, y),
            ..self.frame
        };
        sheet.fill(frame, ink)
    }

    /// Hatches the stretch from `from` to `to` and names it at the upper edge.
    ///
    /// # Errors
    /// Those of the sheet.
    pub fn window(
        &self,
        sheet: &mut Sheet,
        (from, to): (f64, f64),
        name: &str,
    ) -> Result<(), DrawError> {
        let Frame {
            left,
            right,
            top,
            bottom,
        } = self.frame;
        let x0 = self.x.at(from).clamp(left, right);
        let x1 = self.x.at(to).clamp(left, right);
        if x1 - x0 < 1.0 {
            return Ok(());
        }
        let stretch = Frame::new(x0, top, x1, bottom);
        let height = stretch.height();
        let mut foot = x0 - height;
        while foot < x1 {
            let stroke = Stroke::solid(WINDOW, 0.8);
            let slanted = [(foot, bottom), (foot + height, top)];
            sheet.path(&slanted, stroke, Some(stretch))?;
            foot += 13.0;
        }
        for x in [x0, x1] {
            sheet.line((x, top), (x, bottom), Stroke::solid(WINDOW, 1.5))?;
        }
        // Beside a window that is narrower than its name.
        let width = TEXT.width(name) + 12.0;
        let (x, align) = if width < x1 - x0 {
            (0.5 * (x0 + x1), Align::Centre)
        } else if x0 - width > left {
            (x0 - 8.0, Align::Right)
        } else {
            (x1 + 8.0, Align::Left)
        };
        sheet.text_on_paper((x, top + 20.0), name, TEXT, align)
    }

    /// Grid lines; drawn above bands and below data.
    ///
    /// # Errors
    /// Those of the sheet.
    pub fn grid(&self, sheet: &mut Sheet) -> Result<(), DrawError> {
        let stroke = Stroke::solid(GRID, 1.0);
        for (value, _) in self.x.ticks(self.most_x()) {
            let x = self.x.at(value);
            sheet.line((x, self.frame.top), (x, self.frame.bottom), stroke)?;
        }
        for (value, _) in self.y.ticks(self.most_y()) {
            let y = self.y.at(value);
            sheet.line((self.frame.left, y), (self.frame.right, y), stroke)?;
        }
        Ok(())
    }

    /// Outline, ticks, their labels, the head above and the name of x below; drawn last.
    ///
    /// # Errors
    /// Those of the sheet.
    pub fn rim(&self, sheet: &mut Sheet, head: &str, below: &str) -> Result<(), DrawError> {
        let frame = self.frame;
        let face = TEXT.in_ink(SOFT);
        sheet.outline(frame, Stroke::solid(INK, 1.0))?;
        let tick = Stroke::solid(INK, 1.0);
        for (value, label) in self.x.ticks(self.most_x()) {
            let x = self.x.at(value);
            sheet.line((x, frame.bottom), (x, frame.bottom + 5.0), tick)?;
            sheet.text((x, frame.bottom + 23.0), &label, face, Align::Centre)?;
        }
        for (value, label) in self.y.ticks(self.most_y()) {
            let y = self.y.at(value);
            sheet.line((frame.left - 5.0, y), (frame.left, y), tick)?;
            sheet.text((frame.left - 10.0, y + 5.5), &label, face, Align::Right)?;
        }
        sheet.text((frame.left, frame.top - 12.0), head, HEAD, Align::Left)?;
        let middle = 0.5 * (frame.left + frame.right);
        sheet.text((middle, frame.bottom + 46.0), below, TEXT, Align::Centre)
    }

    /// Names a point: `text` above it, or farther above where a line at one of
    /// `levels` would run through it, or else below.
    ///
    /// # Errors
    /// Those of the sheet.
    pub fn name(
        &self,
        sheet: &mut Sheet,
        (x, y): At,
        text: &str,
        face: Face,
        levels: &[f64],
    ) -> Result<(), DrawError> {
        let frame = self.frame;
        let half = 0.5 * face.width(text) + 8.0;
        let x = x.min(frame.right - half).max(frame.left + half);
        let is_free = |baseline: &f64| {
            let (top, bottom) = (baseline - face.em, baseline + 5.0);
            let crossed = |level: &f64| (top..=bottom).contains(&self.y.at(*level));
            top > frame.top && bottom < frame.bottom && !levels.iter().any(crossed)
        };
        let wanted = [14.0, 24.0, 34.0, 44.0, 54.0, 64.0, -28.0, -40.0];
        let mut baselines = wanted.into_iter().map(|up| y - up);
        let baseline = baselines.find(is_free).unwrap_or(y - 14.0);
        sheet.text_on_paper((x, baseline), text, face, Align::Centre)
    }

    /// A text in the panel's middle, where there is nothing to draw.
    ///
    /// # Errors
    /// Those of the sheet.
    pub fn nothing(&self, sheet: &mut Sheet, why: &str) -> Result<(), DrawError> {
        let room = (self.frame.width() - 40.0).max(0.0);
        let lines = TEXT.wrap(why, room, 4);
        let (x, y) = (
            0.5 * (self.frame.left + self.frame.right),
            0.5 * (self.frame.top + self.frame.bottom),
        );
        let mut baseline = y - 0.5 * (lines.len() as f64 - 1.0) * TEXT.leading();
        for line in &lines {
            sheet.text_on_paper((x, baseline), line, TEXT, Align::Centre)?;
            baseline += TEXT.leading();
        }
        Ok(())
    }

    fn most_x(&self) -> usize {
        (self.frame.width() / 70.0) as usize
    }

    fn most_y(&self) -> usize {
        (self.frame.height() / (4.0 * SMALL.em)) as usize
    }
}
