//! Labels beside a panel at the ends of its lines, pushed apart where lines are
//! near, each tied to its line.

use super::DrawError;
use super::fonts::Face;
use super::ink::{Marker, Stroke};
use super::sheet::{Align, Frame, Sheet};

/// A label at the right-hand end of a line.
#[derive(Debug, Clone, PartialEq)]
pub struct Label {
    /// Where its line ends, in pixels from the top.
    pub y: f64,
    /// Its lines of text.
    pub lines: Vec<(String, Face)>,
    /// The line's looks, repeated beside the text.
    pub stroke: Stroke,
    /// The line's marker.
    pub marker: Option<Marker>,
}

/// Room between two labels, in pixels.
const APART: f64 = 5.0;
/// From the panel to the sample of the line, to its end, to the text.
const LEADER: f64 = 16.0;
const KEY: f64 = 34.0;
const GAP: f64 = 7.0;

impl Label {
    fn height(&self) -> f64 {
        self.lines.iter().map(|(_, face)| face.leading()).sum()
    }
}

/// Room that a label's text has in a column `width` pixels wide.
pub fn text_room(width: f64) -> f64 {
    width - LEADER - KEY - GAP
}

/// Draws `labels` in `column`, whose left side is the panel's right side.
///
/// # Errors
/// Those of the sheet.
pub fn draw(sheet: &mut Sheet, column: Frame, labels: &[Label]) -> Result<(), DrawError> {
    let wanted: Vec<(f64, f64)> = labels
        .iter()
        .map(|label| (label.y.clamp(column.top, column.bottom), label.height()))
        .collect();
    let centres = spread(&wanted, column.top, column.bottom);
    let room = text_room(column.width());
    for (label, centre) in labels.iter().zip(centres) {
        let y = label.y.clamp(column.top, column.bottom);
        let bend = column.left + LEADER;
        let thin = Stroke::solid(label.stroke.ink, 1.0);
        sheet.line((column.left, y), (bend, centre), thin)?;
        sheet.line((bend, centre), (bend + KEY, centre), label.stroke)?;
        if let Some(marker) = label.marker {
            let at = (bend + 0.5 * KEY, centre);
            sheet.marker(at, 4.5, marker, label.stroke.ink)?;
        }
        let mut top = centre - 0.5 * label.height();
        for (text, face) in &label.lines {
            let baseline = top + 0.5 * face.leading() + 0.36 * face.em;
            let text = face.fit(text, room);
            sheet.text((bend + KEY + GAP, baseline), &text, *face, Align::Left)?;
            top += face.leading();
        }
    }
    Ok(())
}

/// Centres for boxes (wanted centre, height) that do not overlap between `top` and
/// `bottom`, each as near as may be to what it wants: boxes that touch form a group
/// that stands at the mean of its wishes. Where there is not room enough for all,
/// they are squeezed alike.
pub fn spread(wanted: &[(f64, f64)], top: f64, bottom: f64) -> Vec<f64> {
    let mut order: Vec<usize> = (0..wanted.len()).collect();
    order.sort_by(|a, b| wanted[*a].0.total_cmp(&wanted[*b].0).then(a.cmp(b)));
    let total: f64 = wanted.iter().map(|(_, height)| height + APART).sum();
    let squeeze = ((bottom - top) / total.max(1e-9)).min(1.0);
    let height = |i: usize| squeeze * (wanted[i].1 + APART);

    let mut groups: Vec<Group> = Vec::new();
    for i in order {
        let mut group = Group::of(i, wanted[i].0, height(i));
        while let Some(above) =
            groups.pop_if(|above| above.bottom(top, bottom) > group.top(top, bottom))
        {
            group = above.joined(group);
        }
        groups.push(group);
    }
    let mut centres = vec![0.0; wanted.len()];
    for group in &groups {
        let mut y = group.top(top, bottom);
        for &i in &group.members {
            centres[i] = y + 0.5 * height(i);
            y += height(i);
        }
    }
    centres
}

/// Boxes that touch.
struct Group {
    members: Vec<usize>,
    height: f64,
    /// Sum over the members of the top that each would give the group.
    wishes: f64,
}

impl Group {
    fn of(member: usize, centre: f64, height: f64) -> Self {
        Self {
            members: vec![member],
            height,
            wishes: centre - 0.5 * height,
        }
    }

    fn top(&self, top: f64, bottom: f64) -> f64 {
        let wish = self.wishes / self.members.len() as f64;
        wish.min(bottom - self.height).max(top)
    }

    fn bottom(&self, top: f64, bottom: f64) -> f64 {
        self.top(top, bottom) + self.height
    }

    fn joined(mut self, below: Group) -> Self {
        self.wishes += below.wishes - below.members.len() as f64 * self.height;
        self.height += below.height;
        self.members.extend(below.members);
        self
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn near_labels_are_pushed_apart_and_far_ones_stay() {
        let found = spread(&[(100.0, 20.0), (104.0, 20.0), (300.0, 20.0)], 0.0, 400.0);
        assert_eq!(found[2], 300.0);
        assert!(found[1] - found[0] >= 20.0 && found[1] - found[0] < 30.0);
        assert!((0.5 * (found[0] + found[1]) - 102.0).abs() < 1e-9);
    }

    #[test]
    fn labels_stay_in_the_column_however_many_there_are() {
        for n in [0, 1, 5, 40] {
            let wanted = vec![(399.0, 20.0); n];
            let found = spread(&wanted, 0.0, 400.0);
            assert_eq!(found.len(), n);
            assert!(found.iter().all(|y| (0.0..=400.0).contains(y)));
            assert!(found.windows(2).all(|pair| pair[0] < pair[1]));
        }
    }
}
