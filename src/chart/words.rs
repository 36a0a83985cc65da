//! Text from outside, made harmless: for pictures and for file names.

/// Longest text that is measured at all; a longer one is cut first.
const LONGEST: usize = 400;

/// `text` on one line: white space becomes a space, what does not print or turns
/// the writing direction becomes a replacement mark, the overlong is cut.
pub fn clean(text: &str) -> String {
    let mut out = String::new();
    for (count, c) in text.trim().chars().enumerate() {
        if count == LONGEST {
            out.push('…');
            break;
        }
        out.push(match c {
            _ if c.is_whitespace() => ' ',
            _ if c.is_control() || is_invisible(c) => '\u{fffd}',
            _ => c,
        });
    }
    out
}

/// Marks that change how other characters are shown, or show nothing.
fn is_invisible(c: char) -> bool {
    matches!(
        c,
        '\u{ad}' | '\u{61c}' | '\u{180e}' | '\u{200b}'..='\u{200f}' | '\u{202a}'..='\u{202e}'
            | '\u{2060}'..='\u{206f}' | '\u{feff}' | '\u{fff9}'..='\u{fffb}'
            | '\u{e000}'..='\u{f8ff}' | '\u{e0000}'..='\u{e007f}'
    )
}

/// Longest part that a file name takes from outside.
const LONGEST_NAME: usize = 60;

/// `text` as a part of a file name: `[a-z0-9-]`, no hyphen at either end or twice
/// in a row; empty where nothing is left.
pub fn safe_name(text: &str) -> String {
    let mut out = String::new();
    for c in text.chars() {
        if c.is_ascii_alphanumeric() {
            out.push(c.to_ascii_lowercase());
        } else if !out.is_empty() && !out.ends_with('-') {
            out.push('-');
        }
        if out.len() == LONGEST_NAME {
            break;
        }
    }
    out.trim_end_matches('-').to_owned()
}

/// Letters and digits only, lower case: two spellings of the same words agree.
pub fn squeezed(text: &str) -> String {
    let kept = text.chars().filter(|c| c.is_alphanumeric() || *c == '.');
    kept.flat_map(char::to_lowercase).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn control_and_direction_marks_do_not_reach_the_picture() {
        assert_eq!(clean(" a\nb\tc "), "a b c");
        assert_eq!(clean("a\u{1b}[31m\u{202e}b"), "a\u{fffd}[31m\u{fffd}b");
        assert_eq!(clean(&"x".repeat(1000)).chars().count(), LONGEST + 1);
        assert!(clean(&"x".repeat(1000)).ends_with('…'));
    }

    #[test]
    fn file_names_are_made_of_letters_digits_and_single_hyphens() {
        for (text, name) in [
            ("refill full", "refill-full"),
            ("../../x", "x"),
            ("230 V 50 Hz", "230-v-50-hz"),
            ("--", ""),
            ("Ünit\u{0}7", "nit-7"),
            ("", ""),
        ] {
            assert_eq!(safe_name(text), name);
        }
        assert!(safe_name(&"ab ".repeat(500)).len() <= LONGEST_NAME);
    }

    #[test]
    fn spellings_of_a_supply_agree() {
        assert_eq!(squeezed("230 V, 50 Hz"), squeezed("230 V 50 Hz"));
        assert_ne!(squeezed("23.0 V"), squeezed("230 V"));
    }
}
