//! Printing: a closed pipe is no reason to panic, and text from outside can't
//! steer a terminal.

use std::io::{self, Write};

/// Prints a text and a line end to standard output.
pub fn say(text: &str) {
    write_to(&mut io::stdout().lock(), text);
}

/// Prints a text and a line end to standard error.
pub fn complain(text: &str) {
    write_to(&mut io::stderr().lock(), text);
}

fn write_to(out: &mut impl Write, text: &str) {
    let _ = writeln!(out, "{}", tame(text));
    let _ = out.flush();
}

/// Control characters other than line ends become their picture.
fn tame(text: &str) -> String {
    let picture = |c: char| match c {
        '\n' => '\n',
        '\u{0}'..='\u{1f}' => char::from_u32(0x2400 + c as u32).unwrap_or('?'),
        '\u{7f}'..='\u{9f}' => '?',
        // Marks that turn the direction of text can hide what a line says.
        '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' => '?',
        other => other,
    };
    text.chars().map(picture).collect()
}

/// A run's time as `h:mm:ss`.
pub fn clock_face(seconds: f64) -> String {
    let s = seconds.max(0.0) as u64;
    format!("{}:{:02}:{:02}", s / 3600, s / 60 % 60, s % 60)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_escape_sequence_is_shown_not_obeyed() {
        assert_eq!(tame("a\u{1b}[2Jb\nc"), "a␛[2Jb\nc");
        assert_eq!(tame("x\u{202e}y"), "x?y");
    }

    #[test]
    fn a_long_run_is_told_in_hours() {
        assert_eq!(clock_face(3661.9), "1:01:01");
    }
}
