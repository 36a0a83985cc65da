//! Samples as lines: gaps where there is no value, and per pixel column the least and
//! the greatest value, so that no peak is lost.

use super::axis::Panel;
use super::canvas::{Canvas, Point};
use super::ink::Dash;
use super::DrawError;
use crate::quantity::Reading;
use crate::record::{Sample, Status};
use plotters::style::RGBColor;

/// A reading of a role over time; an absent value breaks the line.
#[derive(Debug, Clone, Default)]
pub(super) struct Series(pub(super) Vec<(f64, Option<f64>)>);

impl Series {
    /// A role's readings in a cell, seconds since the record's start.
    pub(super) fn of(samples: &[Sample], cell: usize, role: Option<usize>, reading: Reading) -> Self {
        let Some(role) = role else { return Self::default() };
        let own = samples.iter().filter(|s| s.cell == Some(cell) && s.role == role);
        Self(own.map(|s| (s.reply.as_secs_f64(), value_of(s, reading))).collect())
    }

    /// Another time axis: (t - from) / unit.
    pub(super) fn since(&self, from: f64, unit: f64) -> Self {
        Self(self.0.iter().map(|(t, v)| ((t - from) / unit, *v)).collect())
    }

    /// The part between two times.
    pub(super) fn between(&self, from: f64, to: f64) -> Self {
        Self(self.0.iter().filter(|(t, _)| *t >= from && *t <= to).copied().collect())
    }

    /// Values that are there.
    pub(super) fn values(&self) -> impl Iterator<Item = f64> + '_ {
        self.0.iter().filter_map(|(_, v)| *v)
    }

    /// The last value.
    pub(super) fn last(&self) -> Option<f64> {
        self.0.iter().rev().find_map(|(_, v)| *v)
    }

    /// Draws the line in a panel.
    pub(super) fn draw(&self, canvas: &Canvas, panel: &Panel, colour: RGBColor, width: f64, dash: Dash) -> Result<(), DrawError> {
        for piece in self.pieces(panel) {
            if piece.len() == 1 {
                canvas.dot(piece[0], width, colour)?;
            } else {
                canvas.line(&piece, colour, width, dash)?;
            }
        }
        Ok(())
    }

    fn pieces(&self, panel: &Panel) -> Vec<Vec<Point>> {
        let mut pieces = Vec::new();
        let mut column = Column::default();
        let mut piece: Vec<Point> = Vec::new();
        for (t, value) in &self.0 {
            match value {
                Some(value) => {
                    let (x, y) = panel.at(*t, *value);
                    if !column.take(x, y) {
                        column.empty_into(&mut piece);
                        column.take(x, y);
                    }
                }
                None => {
                    column.empty_into(&mut piece);
                    if !piece.is_empty() {
                        pieces.push(std::mem::take(&mut piece));
                    }
                }
            }
        }
        column.empty_into(&mut piece);
        if !piece.is_empty() {
            pieces.push(piece);
        }
        pieces
    }
}

fn value_of(sample: &Sample, reading: Reading) -> Option<f64> {
    (sample.status == Status::Ok).then(|| sample.readings.get(reading)).flatten()
}

/// The points of half a pixel's width: first, extremes, last.
#[derive(Debug, Default)]
struct Column {
    points: Vec<Point>,
}

impl Column {
    /// Takes a point of this column; says no to one of another.
    fn take(&mut self, x: f64, y: f64) -> bool {
        let same = self.points.first().is_none_or(|(first, _)| (x * 2.0).floor() == (first * 2.0).floor());
        if same {
            self.points.push((x, y));
        }
        same
    }

    fn empty_into(&mut self, piece: &mut Vec<Point>) {
        if self.points.len() <= 3 {
            piece.append(&mut self.points);
            return;
        }
        let index = |better: fn(f64, f64) -> bool| {
            (0..self.points.len()).reduce(|best, n| if better(self.points[n].1, self.points[best].1) { n } else { best })
        };
        let mut keep = vec![0, self.points.len() - 1];
        keep.extend(index(|a, b| a < b));
        keep.extend(index(|a, b| a > b));
        keep.sort_unstable();
        keep.dedup();
        piece.extend(keep.into_iter().map(|n| self.points[n]));
        self.points.clear();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_peak_of_one_sample_in_a_hundred_thousand_is_kept() {
        let panel = Panel::new([0.0, 0.0, 500.0, 300.0], (0.0, 100_000.0), (0.0, 100.0));
        let value = |n: usize| if n == 61_803 { 99.0 } else { 10.0 };
        let series = Series((0..100_000).map(|n| (n as f64, Some(value(n)))).collect());
        let pieces = series.pieces(&panel);
        assert_eq!(pieces.len(), 1);
        assert!(pieces[0].len() < 4100, "{}", pieces[0].len());
        let top = pieces[0].iter().map(|(_, y)| *y).fold(f64::INFINITY, f64::min);
        assert!((top - 3.0).abs() < 1e-9);
    }

    #[test]
    fn an_absent_value_breaks_the_line() {
        let panel = Panel::new([0.0, 0.0, 500.0, 300.0], (0.0, 10.0), (0.0, 10.0));
        let series = Series(vec![(0.0, Some(1.0)), (1.0, Some(1.0)), (2.0, None), (3.0, Some(1.0))]);
        assert_eq!(series.pieces(&panel).len(), 2);
        assert!(Series::default().pieces(&panel).is_empty());
    }
}
