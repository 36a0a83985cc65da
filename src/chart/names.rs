//! Text from outside in a picture and in a file's name.

use crate::plan::Cell;

/// A text as it may stand in a picture: no control characters, at most `most` characters.
pub(super) fn shown(text: &str, most: usize) -> String {
    let clean = text.chars().map(|c| if c.is_control() { ' ' } else { c });
    let clean: String = clean.filter(|c| !is_turning(*c)).collect();
    if clean.chars().count() <= most {
        return clean;
    }
    let mut cut: String = clean.chars().take(most.saturating_sub(1)).collect();
    cut.push('…');
    cut
}

/// Marks that turn the direction of text could hide what a label says.
fn is_turning(c: char) -> bool {
    matches!(c, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}')
}

/// A text in lines of at most `most` characters.
pub(super) fn wrapped(text: &str, most: usize) -> Vec<String> {
    let mut lines = vec![String::new()];
    for word in shown(text, 600).split_whitespace() {
        let line = lines.last().map_or(0, |l| l.chars().count());
        if line > 0 && line + 1 + word.chars().count() > most {
            lines.push(String::new());
        }
        if let Some(last) = lines.last_mut() {
            if !last.is_empty() {
                last.push(' ');
            }
            last.push_str(&shown(word, most));
        }
    }
    lines
}

/// A cell in words.
pub(super) fn cell_title(cell: &Cell) -> String {
    let supply = format!("{} {}", cell.supply.voltage, cell.supply.frequency);
    match &cell.condition {
        Some(condition) => format!("{}, {}, {supply}", shown(condition, 40), shown(&cell.position, 24)),
        None => format!("{}, {supply}", shown(&cell.position, 24)),
    }
}

/// A file's name for the picture of a cell: only a-z, 0-9 and dashes, led by the
/// cell's number so that no two are alike.
pub(super) fn file_name(number: usize, cell: &Cell) -> String {
    let words = cell_title(cell).to_lowercase();
    let dashed: String = words.chars().map(|c| if c.is_ascii_alphanumeric() { c } else { '-' }).collect();
    let parts: Vec<&str> = dashed.split('-').filter(|part| !part.is_empty()).collect();
    let joined: String = parts.join("-").chars().take(60).collect();
    format!("cell-{:02}-{}.png", number + 1, joined.trim_end_matches('-'))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_from_outside_can_not_steer_anything() {
        assert_eq!(shown("a\u{1b}[2J\u{202e}b", 20), "a [2Jb");
        assert_eq!(shown("overlong", 5), "over…");
    }

    #[test]
    fn long_reasons_are_wrapped_whole() {
        let lines = wrapped(&"reason ".repeat(30), 40);
        assert!(lines.len() > 4 && lines.iter().all(|l| l.chars().count() <= 40));
    }
}
