//! Problems as text for people: file, line, column, the line itself with a caret
//! under the place, and the hint.

use annotate_snippets::{AnnotationKind, Group, Level, Origin, Renderer, Snippet};

use super::{Place, Problem, Weight};

/// How many problems are shown; what follows is counted.
const SHOWN: usize = 50;

/// How many characters of the line are shown before and after the place's start.
const BEFORE: usize = 60;
const AFTER: usize = 80;

/// The problems one below the other, without colour. Text from the files is
/// escaped, and of a long line only the part around the place is shown.
pub fn render(problems: &[Problem]) -> String {
    let renderer = Renderer::plain();
    let mut text = String::new();
    for problem in problems.iter().take(SHOWN) {
        text.push_str(&one(&renderer, problem));
        text.push_str("\n\n");
    }
    if let Some(more) = problems.len().checked_sub(SHOWN).filter(|more| *more > 0) {
        text.push_str(&format!("... and {more} more problems\n"));
    }
    text
}

fn one(renderer: &Renderer, problem: &Problem) -> String {
    let level = match problem.weight {
        Weight::Error => Level::ERROR,
        Weight::Warning => Level::WARNING,
    };
    let (line, column) = problem.place.line_column();
    let excerpt = Excerpt::of(&problem.place);
    let (name, message) = (
        printable(&problem.place.source.name),
        printable(&problem.message),
    );
    let mut group = Group::with_title(level.primary_title(&message));
    // The library works the column out from the excerpt, which is right where
    // nothing before the caret was cut or escaped.
    let true_to_column = excerpt.column() == column;
    if !true_to_column || excerpt.text.is_empty() {
        group = group.element(Origin::path(&name).line(line).char_column(column));
    }
    if !excerpt.text.is_empty() {
        let snippet = Snippet::source(&excerpt.text)
            .line_start(line)
            .fold(false)
            .annotation(AnnotationKind::Primary.span(excerpt.caret.clone()));
        group = group.element(match true_to_column {
            true => snippet.path(&name),
            false => snippet,
        });
    }
    let hint = problem.hint.as_deref().map(printable);
    if let Some(hint) = &hint {
        group = group.element(Level::HELP.message(hint.as_str()));
    }
    let report: [Group<'_>; 1] = [group];
    renderer.render(&report)
}

/// Control characters spelt out, so that nothing in a file steers the terminal.
fn printable(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        push_printable(c, &mut out);
    }
    out
}

fn push_printable(c: char, out: &mut String) {
    let turns = matches!(c, '\u{200B}'..='\u{200F}' | '\u{2028}'..='\u{202E}' | '\u{2060}'..='\u{206F}' | '\u{FEFF}');
    match c {
        // A tab keeps its column, as the caret below it does.
        '\t' => out.push(' '),
        c if c.is_control() || turns => out.extend(c.escape_default()),
        c => out.push(c),
    }
}

/// The part of a line around a place.
struct Excerpt {
    text: String,
    /// Bytes of `text` to be underlined.
    caret: std::ops::Range<usize>,
}

impl Excerpt {
    /// The caret's column within the excerpt, from 1.
    fn column(&self) -> usize {
        self.text[..self.caret.start].chars().count() + 1
    }

    fn of(place: &Place) -> Self {
        let text = &place.source.text;
        let start = place.bytes.start.min(text.len());
        let (Some(before), Some(after)) = (text.get(..start), text.get(start..)) else {
            return Self {
                text: String::new(),
                caret: 0..0,
            };
        };
        let before = before.rsplit('\n').next().unwrap_or("");
        let line_end = after.find('\n').unwrap_or(after.len());
        let after = after[..line_end].trim_end_matches('\r');
        let marked = place.bytes.end.saturating_sub(start).min(after.len());
        let mut excerpt = Self::left(before);
        let caret = excerpt.len();
        let mut end = caret;
        for (at, c) in after.char_indices().take(AFTER) {
            push_printable(c, &mut excerpt);
            if at < marked {
                end = excerpt.len();
            }
        }
        if after.chars().nth(AFTER).is_some() {
            excerpt.push_str(" ...");
        }
        Self {
            text: excerpt,
            caret: caret..end,
        }
    }

    /// What stands before the place, cut from the left where it is long.
    fn left(before: &str) -> String {
        let mut text = String::new();
        match before.char_indices().rev().nth(BEFORE) {
            Some((at, c)) => {
                text.push_str("... ");
                text.extend(
                    before[at + c.len_utf8()..].chars().map(
                        |c| {
                            if c.is_control() { ' ' } else { c }
                        },
                    ),
                );
            }
            None => before.chars().for_each(|c| push_printable(c, &mut text)),
        }
        text
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spec::wrong_files::Kind;
    use crate::spec::{load_driver, load_sequence};

    #[test]
    fn file_line_column_caret_and_hint_are_there() {
        let text = Kind::Sequence.changed(&[("power: 9 W", "power: 9 V")]);
        let problems = load_sequence("a/dryer.yaml", text.as_bytes()).problems;
        // The left edge is cut, for the place stands far to the right.
        let wanted = [
            "error: `9 V` is a voltage, not a power",
            "  --> a/dryer.yaml:13:74",
            "   |",
            "  ::: ",
            "13 | ... on: high, voltage: 220 V to 240 V, frequency: 50 Hz, power: 9 V}",
            "   |                                                                 ^^^",
            "   |",
            "   = help: write for example `9 W`",
        ];
        let shown = render(&problems);
        let lines: Vec<&str> = shown.trim_end().lines().collect();
        assert_eq!(lines, wanted);
    }

    /// The text above the carets.
    fn caret_text(shown: &str) -> String {
        let lines: Vec<&str> = shown.lines().collect();
        let at = lines.iter().position(|l| l.contains('^')).expect("a caret");
        let carets = lines[at];
        let start = carets.chars().position(|c| c == '^').expect("a caret");
        let count = carets.matches('^').count();
        lines[at - 1].chars().skip(start).take(count).collect()
    }

    #[test]
    fn errors_and_warnings_stand_one_below_the_other() {
        let text = Kind::Driver("power-meter").changed(&[
            ("gives: [voltage,", "gives: [voltage, frequency,"),
            ("tries: 3", "tries: 99"),
        ]);
        let shown = render(&load_driver("meter.yaml", text.as_bytes()).problems);
        assert!(
            shown.contains("warning: the accuracy of `frequency`"),
            "{shown}"
        );
        assert!(shown.contains("error: `tries` must be"), "{shown}");
        assert!(shown.contains("meter.yaml:4:84"), "{shown}");
    }

    #[test]
    fn wide_and_foreign_characters_keep_the_caret_in_place() {
        let text =
            Kind::Sequence.changed(&[("4.5 W}", "4.5 W, position: \"größe °C\", elemnt: x}")]);
        let shown = render(&load_sequence("file", text.as_bytes()).problems);
        assert!(shown.contains("stands twice"), "{shown}");
        let text = Kind::Sequence.changed(&[("{position: low, ", "{position: größe, elemnt: x, ")]);
        let shown = render(&load_sequence("file", text.as_bytes()).problems);
        assert_eq!(caret_text(&shown), "elemnt", "{shown}");
    }

    #[test]
    fn a_megabyte_on_one_line_is_cut_to_a_window() {
        let text = format!("{{{}}}", "k: 1, ".repeat(170_000));
        let shown = render(&load_sequence("file", text.as_bytes()).problems);
        assert!(shown.len() < 2_000, "{}", shown.len());

        let keys: String = (0..10_000).map(|i| format!("k{i}: 1, ")).collect();
        let before = std::time::Instant::now();
        let problems = load_sequence("file", format!("{{{keys}}}").as_bytes()).problems;
        let shown = render(&problems);
        assert!(problems.len() > 10_000);
        assert!(
            shown.contains("more problems"),
            "{}",
            &shown[shown.len() - 200..]
        );
        assert!(shown.lines().all(|line| line.chars().count() < 240));
        assert!(before.elapsed().as_secs() < 5);
    }

    #[test]
    fn nothing_in_a_file_steers_the_terminal() {
        let name = "a\u{1b}[2Jb\n.yaml";
        for text in [
            "sequence: \"x\u{9b}31m\"\n\u{202E}edition: 1\n",
            "a\u{1b}[31m: 1\n",
            "se\u{200B}quence: \u{7}\n",
            "sequence: [\"\\e[31m\"]\nkind: \"\\a\"\n",
        ] {
            let shown = render(&load_sequence(name, text.as_bytes()).problems);
            let steers = |c: char| (c.is_control() && c != '\n') || c == '\u{202E}';
            assert!(!shown.contains(steers), "{shown:?}");
            assert!(shown.contains("a\\u{1b}[2Jb"), "{shown}");
        }
    }

    #[test]
    fn an_empty_file_has_no_line_to_show() {
        let shown = render(&load_sequence("empty.yaml", b"").problems);
        assert!(shown.contains("empty.yaml:1:1"), "{shown}");
    }
}
