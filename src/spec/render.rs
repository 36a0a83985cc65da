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
