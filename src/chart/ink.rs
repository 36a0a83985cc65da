//! Colours and strokes. Colours differ in lightness as well as in hue, and no
//! meaning hangs on a colour alone: dash, marker or word says it too.

/// A colour.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Ink(pub u8, pub u8, pub u8);

/// Paper.
pub const PAPER: Ink = Ink(255, 255, 255);
/// Text and frames.
pub const INK: Ink = Ink(28, 32, 38);
/// Lesser text.
pub const SOFT: Ink = Ink(86, 92, 102);
/// Grid.
pub const GRID: Ink = Ink(212, 215, 219);
/// Ruled lines between parts.
pub const RULE: Ink = Ink(176, 180, 188);
/// The allowed band.
pub const BAND: Ink = Ink(222, 237, 227);
/// The settled window.
pub const WINDOW: Ink = Ink(196, 176, 128);
/// Measured power.
pub const POWER: Ink = Ink(20, 66, 132);
/// Settled level.
pub const LEVEL: Ink = Ink(150, 56, 0);
/// Limits.
pub const LIMIT: Ink = Ink(120, 16, 40);
/// Means that no rule judges.
pub const MEAN: Ink = Ink(92, 60, 112);
/// The plate's own value.
pub const PLATE: Ink = Ink(30, 96, 62);

/// How a line is broken, in pixels: on, off, on, off ...; empty is unbroken.
pub type Dash = &'static [f64];

/// Unbroken.
pub const SOLID: Dash = &[];
/// Limits.
pub const DASHED: Dash = &[11.0, 6.0];
/// The plate's own value.
pub const DOTTED: Dash = &[2.5, 5.0];
/// Earliest opening of a link.
pub const DASH_DOT: Dash = &[14.0, 5.0, 2.5, 5.0];
/// Values worked out rather than sampled.
pub const SHORT: Dash = &[6.0, 4.0];

/// A line's looks.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stroke {
    /// Colour.
    pub ink: Ink,
    /// Width in pixels.
    pub width: f64,
    /// Dash.
    pub dash: Dash,
}

impl Stroke {
    /// An unbroken line.
    pub const fn solid(ink: Ink, width: f64) -> Self {
        Self::broken(ink, width, SOLID)
    }

    /// A broken line.
    pub const fn broken(ink: Ink, width: f64, dash: Dash) -> Self {
        Self { ink, width, dash }
    }
}

/// A shape that stands on a line or for an outcome.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Marker {
    Disc,
    Ring,
    Square,
    Triangle,
    Diamond,
    Cross,
    Hollow,
    Plus,
}

/// Looks of one temperature's line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TraceInk {
    /// The line.
    pub stroke: Stroke,
    /// Stands along the line.
    pub marker: Marker,
}

/// The body's temperature.
pub const BODY: TraceInk = TraceInk {
    stroke: Stroke::solid(Ink(156, 36, 20), 2.5),
    marker: Marker::Disc,
};

/// The bay's own ambient.
pub const AMBIENT: TraceInk = TraceInk {
    stroke: Stroke::broken(Ink(48, 100, 156), 2.0, &[9.0, 5.0]),
    marker: Marker::Ring,
};

/// Every other role, in turn.
pub const OTHERS: [TraceInk; 6] = [
    TraceInk {
        stroke: Stroke::broken(Ink(0, 84, 84), 2.0, &[16.0, 4.0, 4.0, 4.0]),
        marker: Marker::Square,
    },
    TraceInk {
        stroke: Stroke::broken(Ink(112, 60, 140), 2.0, &[4.0, 4.0]),
        marker: Marker::Triangle,
    },
    TraceInk {
        stroke: Stroke::broken(Ink(134, 104, 0), 2.0, &[20.0, 5.0]),
        marker: Marker::Diamond,
    },
    TraceInk {
        stroke: Stroke::broken(Ink(70, 74, 84), 2.0, &[12.0, 3.0, 3.0, 3.0, 3.0, 3.0]),
        marker: Marker::Cross,
    },
    TraceInk {
        stroke: Stroke::broken(Ink(24, 44, 96), 2.0, &[6.0, 2.5]),
        marker: Marker::Hollow,
    },
    TraceInk {
        stroke: Stroke::broken(Ink(176, 84, 60), 2.0, &[2.5, 4.0]),
        marker: Marker::Plus,
    },
];

#[cfg(test)]
mod tests {
    use super::*;

    /// Relative luminance, and contrast of two colours, as WCAG 2 defines them (from
    /// memory).
    fn luminance(ink: Ink) -> f64 {
        let part = |value: u8| {
            let v = f64::from(value) / 255.0;
            if v <= 0.040_45 {
                v / 12.92
            } else {
                ((v + 0.055) / 1.055).powf(2.4)
            }
        };
        0.2126 * part(ink.0) + 0.7152 * part(ink.1) + 0.0722 * part(ink.2)
    }

    fn contrast(a: Ink, b: Ink) -> f64 {
        let (a, b) = (luminance(a) + 0.05, luminance(b) + 0.05);
        a.max(b) / a.min(b)
    }

    #[test]
    fn whatever_is_written_is_legible_on_paper_and_on_the_band() {
        let lines = OTHERS.iter().chain([&BODY, &AMBIENT]);
        let inks = lines.map(|line| line.stroke.ink);
        for ink in inks.chain([INK, SOFT, POWER, LEVEL, LIMIT, MEAN, PLATE]) {
            assert!(contrast(ink, PAPER) >= 4.5, "{ink:?}");
            assert!(contrast(ink, BAND) >= 3.9, "{ink:?}");
        }
        assert!((contrast(Ink(0, 0, 0), PAPER) - 21.0).abs() < 1e-9);
    }

    #[test]
    fn no_two_temperatures_share_their_dash_or_their_marker() {
        let all: Vec<TraceInk> = OTHERS.into_iter().chain([BODY, AMBIENT]).collect();
        for (n, a) in all.iter().enumerate() {
            for b in &all[n + 1..] {
                assert!(a.marker != b.marker && a.stroke.dash != b.stroke.dash);
            }
        }
    }
}
