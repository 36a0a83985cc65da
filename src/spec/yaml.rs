//! A YAML text as a tree in which everything knows its place.
//!
//! The tree keeps every scalar as it was written: a bare `010`, `1_000` or `no` is
//! the text that stands in the file, and only the field that wants a number, a
//! quantity or yes/no decides what it means. The parser stops at its first error,
//! so a file with an error of syntax has exactly one problem.

use std::fmt;
use std::ops::Range;
use std::sync::Arc;

use serde::de::{Deserialize, Deserializer, MapAccess, SeqAccess, Visitor};
use serde_yaml::options::{DuplicateKeyPolicy, MergeKeyPolicy, NonFiniteFloatPolicy};
use serde_yaml::{Options, Spanned};

use super::syntax;
use super::{Located, Place, Problem, Source};

/// Largest file that is read, in bytes.
pub(super) const LARGEST_FILE: usize = 1 << 20;

/// Deepest nesting of lists and mappings that is read.
pub(super) const DEEPEST: usize = 32;

/// A value in a YAML text.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Node {
    /// The whole value where it stands on one line, else its first key or item.
    pub(super) place: Place,
    /// What it is.
    pub(super) kind: NodeKind,
}

/// The three shapes of a value, and none.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum NodeKind {
    /// Nothing after the colon or dash, or `~`.
    Nothing,
    /// Text as written; quotes taken off and escapes resolved.
    Scalar(String),
    /// A list.
    List(Vec<Node>),
    /// Keys and values in the order of the file; no key stands twice.
    Map(Vec<Entry>),
}

/// A key and its value.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Entry {
    /// The key.
    pub(super) key: Located<String>,
    /// Its value.
    pub(super) value: Node,
}

/// Reads one YAML document.
///
/// # Errors
/// The one problem of a file that is not text, too large, empty, or not YAML as it
/// is written here (no anchors, no tags, no second document, nested at most
/// [`DEEPEST`] deep).
pub(super) fn read(name: &str, bytes: &[u8]) -> Result<Node, Problem> {
    let source = text_of(name, bytes)?;
    let raw: Spanned<Raw> = serde_yaml::from_str_with_options(&source.text, strictness())
        .map_err(|error| syntax::problem(&source, &error))?;
    let node = Planter { source: &source }.plant(raw)?;
    match node.kind {
        NodeKind::Nothing => Err(empty(&source)),
        _ => Ok(node),
    }
}

fn strictness() -> Options {
    let budget = serde_yaml::budget! {
        max_depth: DEEPEST,
        flow_nesting_limit: DEEPEST,
        max_anchors: 0,
        max_aliases: 0,
        max_documents: 1,
        max_merge_keys: 0,
        max_inclusion_depth: 0,
        max_nodes: 100_000,
    };
    serde_yaml::options! {
        budget: budget,
        duplicate_keys: DuplicateKeyPolicy::Error,
        merge_keys: MergeKeyPolicy::Error,
        non_finite_float_policy: NonFiniteFloatPolicy::PassThrough,
        strict_booleans: true,
        leading_zero_numbers_as_strings: true,
        underscored_numbers_as_strings: true,
        reject_unsupported_tags: true,
        with_snippet: false,
    }
}

/// The bytes as text, or what is wrong with them. Of a file that is refused, only
/// the beginning is kept for the message.
fn text_of(name: &str, bytes: &[u8]) -> Result<Arc<Source>, Problem> {
    let bytes = bytes.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(bytes);
    let source = |text: &str| {
        Arc::new(Source {
            name: name.to_owned(),
            text: text.to_owned(),
        })
    };
    if bytes.len() > LARGEST_FILE {
        let source = source(beginning(bytes));
        return Err(Problem::error(
            &start_of(&source),
            format!("the file is too large: {} bytes", bytes.len()),
        )
        .hint(format!(
            "at most {LARGEST_FILE} bytes are read; is this the right file?"
        )));
    }
    let text = match std::str::from_utf8(bytes) {
        Ok(text) => text,
        Err(error) => {
            let (good, _) = bytes.split_at(error.valid_up_to());
            let good = std::str::from_utf8(good).unwrap_or("");
            return Err(not_text(source(good), good.len()));
        }
    };
    if let Some(at) = text.find(is_binary) {
        return Err(not_text(source(text), at));
    }
    let source = source(text);
    if text.trim().is_empty() {
        return Err(empty(&source));
    }
    Ok(source)
}

/// Characters that no text editor leaves in a YAML file.
fn is_binary(c: char) -> bool {
    c.is_control() && !matches!(c, '\n' | '\r' | '\t' | '\u{85}')
}

fn beginning(bytes: &[u8]) -> &str {
    let head = &bytes[..bytes.len().min(200)];
    match std::str::from_utf8(head) {
        Ok(text) => text,
        Err(error) => std::str::from_utf8(&head[..error.valid_up_to()]).unwrap_or(""),
    }
}

fn not_text(source: Arc<Source>, at: usize) -> Problem {
    let place = place_at(&source, at);
    Problem::error(&place, "this is not a text file in UTF-8")
        .hint("save it as plain text, encoding UTF-8")
}

fn empty(source: &Arc<Source>) -> Problem {
    Problem::error(&start_of(source), "the file is empty")
        .hint("copy a shipped file of the same kind and change it")
}

fn start_of(source: &Arc<Source>) -> Place {
    Place {
        source: source.clone(),
        bytes: 0..0,
    }
}

/// The place of the word that begins at byte `at`: at least one character long
/// where there is one, and at most 20.
pub(super) fn place_at(source: &Arc<Source>, at: usize) -> Place {
    let start = boundary_below(&source.text, at);
    let rest = &source.text[start..];
    let word: usize = rest
        .chars()
        .take(20)
        .take_while(|c| !c.is_whitespace() && !is_binary(*c))
        .map(char::len_utf8)
        .sum();
    let first = match rest.chars().next() {
        Some('\n') | None => 0,
        Some(c) => c.len_utf8(),
    };
    Place {
        source: source.clone(),
        bytes: start..start + word.max(first),
    }
}

/// The character boundary at or below byte `at`.
fn boundary_below(text: &str, at: usize) -> usize {
    let mut at = at.min(text.len());
    while !text.is_char_boundary(at) {
        at -= 1;
    }
    at
}

/// What the parser delivers, before places are worked out.
enum Raw {
    Nothing,
    /// A scalar that the parser takes for a number or a truth value: its source
    /// text counts.
    AsWritten,
    Text(String),
    List(Vec<Spanned<Raw>>),
    Map(Vec<(Spanned<String>, Spanned<Raw>)>),
}

impl<'de> Deserialize<'de> for Raw {
    fn deserialize<D: Deserializer<'de>>(input: D) -> Result<Self, D::Error> {
        input.deserialize_any(RawVisitor)
    }
}

struct RawVisitor;

impl<'de> Visitor<'de> for RawVisitor {
    type Value = Raw;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a value, a list or a mapping")
    }

    fn visit_unit<E>(self) -> Result<Raw, E> {
        Ok(Raw::Nothing)
    }

    fn visit_bool<E>(self, _: bool) -> Result<Raw, E> {
        Ok(Raw::AsWritten)
    }

    fn visit_i64<E>(self, _: i64) -> Result<Raw, E> {
        Ok(Raw::AsWritten)
    }

    fn visit_u64<E>(self, _: u64) -> Result<Raw, E> {
        Ok(Raw::AsWritten)
    }

    fn visit_f64<E>(self, _: f64) -> Result<Raw, E> {
        Ok(Raw::AsWritten)
    }

    fn visit_str<E>(self, text: &str) -> Result<Raw, E> {
        Ok(Raw::Text(text.to_owned()))
    }

    fn visit_string<E>(self, text: String) -> Result<Raw, E> {
        Ok(Raw::Text(text))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<Raw, A::Error> {
        let mut list = Vec::new();
        while let Some(item) = items.next_element()? {
            list.push(item);
        }
        Ok(Raw::List(list))
    }

    fn visit_map<A: MapAccess<'de>>(self, mut entries: A) -> Result<Raw, A::Error> {
        let mut map = Vec::new();
        while let Some(entry) = entries.next_entry()? {
            map.push(entry);
        }
        Ok(Raw::Map(map))
    }
}

/// Works out places: the parser gives the exact range of a scalar, but only the
/// start of a list or mapping.
struct Planter<'a> {
    source: &'a Arc<Source>,
}

impl Planter<'_> {
    fn plant(&self, raw: Spanned<Raw>) -> Result<Node, Problem> {
        let range = self.range(&raw);
        self.refuse_tag(&range)?;
        let place = self.place(range.clone());
        Ok(match raw.value {
            Raw::Nothing => Node {
                place,
                kind: NodeKind::Nothing,
            },
            Raw::AsWritten => Node {
                kind: NodeKind::Scalar(place.text().trim().to_owned()),
                place,
            },
            Raw::Text(text) => Node {
                place,
                kind: NodeKind::Scalar(text),
            },
            Raw::List(items) => {
                let mut list = Vec::with_capacity(items.len());
                for item in items {
                    list.push(self.plant(item)?);
                }
                let first = list.first().map(|n| n.place.bytes.clone());
                let last = list.last().map(|n| n.place.bytes.end);
                Node {
                    place: self.extent(range.start, first, last),
                    kind: NodeKind::List(list),
                }
            }
            Raw::Map(entries) => {
                let mut map = Vec::with_capacity(entries.len());
                for (key, value) in entries {
                    let at = self.range(&key);
                    self.refuse_tag(&at)?;
                    let key = Located {
                        place: self.place(at),
                        value: key.value,
                    };
                    map.push(Entry {
                        key,
                        value: self.plant(value)?,
                    });
                }
                let first = map.first().map(|e: &Entry| e.key.place.bytes.clone());
                let last = map
                    .last()
                    .map(|e: &Entry| e.key.place.bytes.end.max(e.value.place.bytes.end));
                Node {
                    place: self.extent(range.start, first, last),
                    kind: NodeKind::Map(map),
                }
            }
        })
    }

    fn place(&self, bytes: Range<usize>) -> Place {
        Place {
            source: self.source.clone(),
            bytes,
        }
    }

    fn range<T>(&self, spanned: &Spanned<T>) -> Range<usize> {
        let at = syntax::byte_range(&self.source.text, spanned.referenced);
        let start = boundary_below(&self.source.text, at.start);
        let end = boundary_below(&self.source.text, at.end).max(start);
        // A block scalar's range reaches over its trailing line ends.
        let kept = self.source.text[start..end].trim_end().len();
        start..start + kept
    }

    /// From `start` to the closing bracket where all that is on one line, else the
    /// first thing within.
    fn extent(&self, start: usize, first: Option<Range<usize>>, last: Option<usize>) -> Place {
        let text = &self.source.text;
        let open = text[start..].chars().next();
        let mut end = last.unwrap_or(start).max(start);
        if let Some(open @ ('{' | '[')) = open {
            end = end.max(start + open.len_utf8());
            let rest = &text[end..];
            let close = rest.trim_start_matches([' ', ',', '\t']);
            if close.starts_with(['}', ']']) {
                end += rest.len() - close.len() + 1;
            }
        }
        let whole = start..end;
        match first {
            Some(first) if text[whole.clone()].contains('\n') => self.place(first),
            _ => self.place(whole),
        }
    }

    /// Tags (`!!int "5"`) change what a value is: there are none here. The parser
    /// gives a tagged value's own range, so the word before it is looked at; a tag
    /// longer than [`LONGEST_TAG`] is found by the parser itself.
    fn refuse_tag(&self, range: &Range<usize>) -> Result<(), Problem> {
        let text = &self.source.text;
        if text[range.start..].starts_with('!') {
            return Err(syntax::tag(&place_at(self.source, range.start)));
        }
        let before = text[..range.start].trim_end_matches([' ', '\t']);
        let near = &before[boundary_below(before, before.len().saturating_sub(LONGEST_TAG))..];
        let word = near.rsplit(is_gap).next().unwrap_or("");
        if word.starts_with('!') {
            return Err(syntax::tag(&place_at(
                self.source,
                before.len() - word.len(),
            )));
        }
        Ok(())
    }
}

/// How far back a tag is looked for; without a bound, one long line costs its
/// length times its number of values.
const LONGEST_TAG: usize = 60;

/// What stands between a tag and what comes before it.
fn is_gap(c: char) -> bool {
    c.is_whitespace() || matches!(c, '[' | '{' | ',')
}

#[cfg(test)]
mod tests {
    use super::*;

    fn root(text: &str) -> Node {
        read("file", text.as_bytes()).unwrap_or_else(|problem| panic!("{problem:?}"))
    }

    fn value(text: &str) -> String {
        match &root(&format!("key: {text}\n")).kind {
            NodeKind::Map(entries) => match &entries[0].value.kind {
                NodeKind::Scalar(scalar) => scalar.clone(),
                other => panic!("{other:?}"),
            },
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn scalars_stay_as_they_were_written() {
        for text in [
            "010",
            "1_000",
            "0x1F",
            "0o17",
            "1e3",
            "1.10",
            "no",
            "yes",
            "true",
            "on",
            "null x",
            ".nan",
            "-.inf",
            "1e999",
            "230 V",
            "12:30:45",
            "2030-12-31",
            "+5",
            "-0",
        ] {
            assert_eq!(value(text), text);
        }
        assert_eq!(value("\"1.10\""), "1.10");
        assert_eq!(value("'it''s'"), "it's");
        assert_eq!(value("\"a\\u00B0C\" # remark"), "a°C");
        assert_eq!(value("5   # remark"), "5");
        assert_eq!(value("|\n  one\n  two"), "one\ntwo\n");
    }

    #[test]
    fn places_are_exact_after_other_alphabets_and_a_byte_order_mark() {
        let text = "\u{FEFF}größe: {a: 5 °C, b: [x, ü]}\nnext:\n  - c: 1\n    d: 2\n";
        let node = root(text);
        let NodeKind::Map(entries) = &node.kind else {
            panic!("{node:?}");
        };
        assert_eq!(entries[0].key.place.text(), "größe");
        assert_eq!(entries[0].value.place.text(), "{a: 5 °C, b: [x, ü]}");
        let NodeKind::Map(inner) = &entries[0].value.kind else {
            panic!("{node:?}");
        };
        assert_eq!(inner[0].value.place.text(), "5 °C");
        assert_eq!(inner[1].value.place.text(), "[x, ü]");
        assert_eq!(inner[1].key.place.line_column(), (1, 18));
        let NodeKind::List(items) = &entries[1].value.kind else {
            panic!("{node:?}");
        };
        assert_eq!(items[0].place.text(), "c");
        assert_eq!(items[0].place.line_column(), (3, 5));
    }

    /// Text, `line:column`, part of the message, part of the hint.
    const BROKEN: &[(&str, &str, &str, &str)] = &[
        ("", "1:1", "empty", "copy"),
        (" \n\n", "1:1", "empty", "copy"),
        ("# only a remark\n", "1:1", "empty", "copy"),
        ("~\n", "1:1", "empty", "copy"),
        ("a:\n\tb: 1\n", "2:1", "tab", "blanks"),
        ("a:\n  b: 1\n \tc: 2\n", "3:2", "tab", "blanks"),
        (
            "a: 1\nb: 2\na: 3\n",
            "3:1",
            "`a` stands twice",
            "one of the two",
        ),
        (
            "x: {k: 1, k: 2}\n",
            "1:11",
            "`k` stands twice",
            "one of the two",
        ),
        ("a: &x 1\n", "1:7", "anchors", "write the value out"),
        ("a: *x\n", "1:4", "anchors", "write the value out"),
        (
            "a: {b: 1}\n<<: {c: 1}\n",
            "2:1",
            "merge key",
            "write the keys out",
        ),
        ("a: !!int \"5\"\n", "1:4", "tag", "quotes"),
        ("a: !!str 5\n", "1:4", "tag", "quotes"),
        ("a: [!!str 5]\n", "1:5", "tag", "quotes"),
        ("!!str a: 5\n", "1:1", "tag", "quotes"),
        (
            "a: 1\n---\nb: 2\n",
            "2:1",
            "second document",
            "leave `---` out",
        ),
        ("a: \"open\nb: 1\n", "1:4", "never closed", "close it"),
        ("a: [1, 2}\n", "1:4", "does not close", "`]`"),
        ("a: {b: 1\n", "1:4", "never closed", "`}`"),
        ("a: ]\n", "1:4", "closing bracket", "leave it out"),
        ("a: b: c\n", "1:5", "colon", "quotes"),
        ("a: @b\n", "1:4", "begin with `@`", "quotes"),
        ("a: \"b\" c\n", "1:8", "follows a closing quote", "one pair"),
        ("a: \"\\q\"\n", "1:4", "backslash", "single quotes"),
        ("[a, b]: c\n", "1:1", "plain word", "key: value"),
        ("a: b\nc\n", "2:1", "without its colon", "key: value"),
    ];

    #[test]
    fn an_error_of_syntax_is_one_problem_with_place_and_hint() {
        let mut missed = Vec::new();
        for (text, at, says, hint) in BROKEN {
            let problem = read("file", text.as_bytes()).expect_err(text);
            let (line, column) = problem.place.line_column();
            let good = format!("{line}:{column}") == *at
                && problem.message.contains(says)
                && problem.hint.as_deref().unwrap_or("").contains(hint);
            if !good {
                missed.push((text, problem));
            }
        }
        assert!(missed.is_empty(), "{missed:#?}");
    }

    #[test]
    fn bombs_are_refused_at_once() {
        let aliases: String = (1..=9).fold("a0: &a0 [x, x]\n".to_owned(), |text, i| {
            let before = i - 1;
            text + &format!("a{i}: &a{i} [*a{before}, *a{before}]\n")
        });
        let blocks: String = (0..1_000).map(|i| " ".repeat(i) + "a:\n").collect();
        for (text, says) in [
            (aliases, "anchors"),
            ("[".repeat(20_000), "nested more than 32 deep"),
            ("{a: ".repeat(20_000), "nested more than 32 deep"),
            ("- ".repeat(20_000) + "a", "nested more than 32 deep"),
            (blocks, "nested more than 32 deep"),
            (format!("[{}]", "a,".repeat(200_000)), "too many values"),
        ] {
            let before = std::time::Instant::now();
            let problem = read("file", text.as_bytes()).expect_err("a bomb");
            assert!(problem.message.contains(says), "{problem:?}");
            assert!(problem.hint.is_some(), "{problem:?}");
            assert!(before.elapsed().as_secs() < 5, "{says}");
        }
    }

    #[test]
    fn what_is_no_text_or_too_large_is_refused_before_it_is_parsed() {
        let large = vec![b'a'; 50_000_000];
        let problem = read("file", &large).expect_err("too large");
        assert!(problem.message.contains("50000000 bytes"), "{problem:?}");
        assert!(problem.place.source.text.len() <= 200);
        let just_fits = format!("a: {}", "b".repeat(LARGEST_FILE - 3));
        assert!(read("file", just_fits.as_bytes()).is_ok());
        let one_more = just_fits + "b";
        assert!(read("file", one_more.as_bytes()).is_err());

        for (bytes, at) in [
            (&b"a: \xFF\n"[..], (1, 4)),
            (&b"a: 1\nb: \x00\n"[..], (2, 4)),
            (&b"\xFF\xFEa\x00"[..], (1, 1)),
            (&b"\x7FELF\x02\x01"[..], (1, 1)),
        ] {
            let problem = read("file", bytes).expect_err("binary");
            assert!(problem.message.contains("not a text file"), "{problem:?}");
            assert_eq!(problem.place.line_column(), at, "{bytes:?}");
        }
    }
}
