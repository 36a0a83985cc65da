//! The cautions of `safety.md`, compiled into the program.

use std::sync::LazyLock;

use super::exit::Exit;
use super::say::say;

/// The whole text.
const SAFETY: &str = include_str!("../../safety.md");

/// Marks the end of the short form in `safety.md`.
const SHORT_ENDS: &str = "<!-- end of the short form -->";

/// The short form, which is shown and acknowledged before a run.
pub fn short() -> &'static str {
    static SHORT: LazyLock<String> = LazyLock::new(|| {
        SAFETY
            .split(SHORT_ENDS)
            .next()
            .unwrap_or(SAFETY)
            .trim()
            .to_owned()
    });
    &SHORT
}

/// `cautions`: the whole text.
pub fn show() -> Exit {
    say(SAFETY.replace(&format!("{SHORT_ENDS}\n"), "").trim());
    Exit::Good
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_short_form_is_a_part_and_says_what_matters() {
        assert!(short().len() < SAFETY.len());
        for word in ["emergency stop", "licensed", "not a safety certificate"] {
            assert!(short().contains(word), "{word}");
        }
    }
}
