//! The embedded font: pictures look alike on every machine, with or without fonts.

use std::sync::OnceLock;

use plotters::style::{FontDesc, FontFamily, FontStyle, register_font};

use super::DrawError;
use super::ink::{INK, Ink, SOFT};

const FAMILY: &str = "rateplate embedded";

/// The drawing library's size is ascent plus descent; this font's is 1.164 em.
const SIZE_PER_EM: f64 = 1.164;

/// Registers both faces once per process.
///
/// # Errors
/// Where a face cannot be parsed, which no input can bring about.
pub fn register() -> Result<(), DrawError> {
    static DONE: OnceLock<Result<(), &'static str>> = OnceLock::new();
    DONE.get_or_init(|| {
        for (style, bytes, name) in [
            (FontStyle::Normal, dejavu::sans::regular(), "DejaVu Sans"),
            (FontStyle::Bold, dejavu::sans::bold(), "DejaVu Sans Bold"),
        ] {
            register_font(FAMILY, style, bytes).map_err(|_| name)?;
        }
        Ok(())
    })
    .map_err(DrawError::Font)
}

/// Size, weight and colour of a text.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Face {
    /// Size of the em in pixels.
    pub em: f64,
    /// Whether it is bold.
    pub bold: bool,
    /// Colour.
    pub ink: Ink,
}

/// The picture's title.
pub const TITLE: Face = Face::bold(28.0, INK);
/// Heads of panels.
pub const HEAD: Face = Face::bold(18.0, INK);
/// Figures that are to be found first.
pub const FIGURE: Face = Face::bold(20.0, INK);
/// Ordinary text.
pub const TEXT: Face = Face::plain(16.0, INK);
/// Lesser text; the smallest size there is.
pub const SMALL: Face = Face::plain(14.5, SOFT);

impl Face {
    /// A regular face.
    pub const fn plain(em: f64, ink: Ink) -> Self {
        Self {
            em,
            bold: false,
            ink,
        }
    }

    /// A bold face.
    pub const fn bold(em: f64, ink: Ink) -> Self {
        Self {
            em,
            bold: true,
            ink,
        }
    }

    /// The same in another colour.
    pub const fn in_ink(self, ink: Ink) -> Self {
        Self { ink, ..self }
    }

    /// From one line's baseline to the next, in pixels.
    pub fn leading(self) -> f64 {
        (self.em * 1.3).round()
    }

    /// The library's size at `scale` pixels to a pixel.
    pub fn size(self, scale: f64) -> f64 {
        self.em * SIZE_PER_EM * scale
    }

    /// The library's font at `scale` pixels to a pixel.
    pub fn font(self, scale: f64) -> FontDesc<'static> {
        let style = if self.bold {
            FontStyle::Bold
        } else {
            FontStyle::Normal
        };
        FontDesc::new(FontFamily::Name(FAMILY), self.size(scale), style)
    }

    /// Width of `text` in pixels.
    pub fn width(self, text: &str) -> f64 {
        match self.font(4.0).layout_box(text) {
            Ok((_, (width, _))) => f64::from(width) / 4.0,
            Err(_) => 0.6 * self.em * text.chars().count() as f64,
        }
    }

    /// `text`, cut with an ellipsis where it is wider than `width`.
    pub fn fit(self, text: &str, width: f64) -> String {
        if self.width(text) <= width {
            return text.to_owned();
        }
        let chars: Vec<char> = text.chars().collect();
        let cut = |n: usize| {
            let kept: String = chars[..n].iter().collect();
            format!("{}…", kept.trim_end())
        };
        // Widths rise with the number of characters, so halving finds the cut.
        let (mut fits, mut too_wide) = (0, chars.len());
        while too_wide - fits > 1 {
            let middle = (fits + too_wide) / 2;
            if self.width(&cut(middle)) <= width {
                fits = middle;
            } else {
                too_wide = middle;
            }
        }
        cut(fits)
    }

    /// `text` in at most `lines` lines no wider than `width`; the last is cut with
    /// an ellipsis where there is more.
    pub fn wrap(self, text: &str, width: f64, lines: usize) -> Vec<String> {
        let mut out: Vec<String> = Vec::new();
        let mut words = together(text).into_iter();
        while let Some(word) = words.next() {
            let full = out.len() == lines;
            let Some(line) = out.last_mut() else {
                out.push(word);
                continue;
            };
            let longer = format!("{line} {word}");
            if self.width(&longer) <= width {
                *line = longer;
            } else if full {
                let rest: Vec<String> = words.by_ref().collect();
                *line = format!("{longer} {}", rest.join(" "));
            } else {
                out.push(word);
            }
        }
        out.iter().map(|line| self.fit(line, width)).collect()
    }
}

/// The words of a text; a number and its unit are one word.
fn together(text: &str) -> Vec<String> {
    const UNITS: [&str; 12] = [
        "W", "V", "A", "Hz", "K", "°C", "s", "min", "h", "%", "ms", "mK",
    ];
    let mut words: Vec<String> = Vec::new();
    for word in text.split_whitespace() {
        let bare = word.trim_end_matches([',', ';', '.', ':', ')']);
        let is_unit = bare
            .split('/')
            .next()
            .is_some_and(|unit| UNITS.contains(&unit));
        match words.last_mut() {
            Some(last) if is_unit && last.ends_with(|c: char| c.is_ascii_digit()) => {
                last.push(' ');
                last.push_str(word);
            }
            _ => words.push(word.to_owned()),
        }
    }
    words
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn text_is_cut_to_its_room() {
        register().unwrap();
        let text = "a rather long reason that does not fit into the room that it is given";
        let cut = TEXT.fit(text, 200.0);
        assert!(cut.ends_with('…') && TEXT.width(&cut) <= 200.0);
        assert_eq!(TEXT.fit("short", 200.0), "short");
        assert_eq!(TEXT.fit("xyz", 0.0), "…");
    }

    #[test]
    fn lines_are_broken_at_words_and_the_last_one_is_cut() {
        register().unwrap();
        let lines = TEXT.wrap(&"word ".repeat(100), 150.0, 3);
        assert_eq!(lines.len(), 3);
        assert!(lines[2].ends_with('…') && !lines[0].ends_with('…'));
        assert!(lines.iter().all(|line| TEXT.width(line) <= 150.0));
        assert_eq!(TEXT.wrap("one", 150.0, 3), ["one"]);
        assert!(TEXT.wrap("", 150.0, 3).is_empty());
        assert_eq!(
            together("up to 2.9 K/h, not"),
            ["up", "to", "2.9 K/h,", "not"]
        );
        let one_word = TEXT.wrap(&"x".repeat(300), 150.0, 3);
        assert!(one_word.len() == 1 && one_word[0].ends_with('…'));
    }
}
