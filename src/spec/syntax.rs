//! What the YAML parser objects to, in our own words.

use std::ops::Range;
use std::sync::Arc;

use serde_yaml::budget::BudgetBreach;
use serde_yaml::granit_parser::ErrorKind;
use serde_yaml::{Error, ExternalMessageSource, Location};

use super::yaml::{DEEPEST, place_at};
use super::{Place, Problem, Source};

/// The problem that a parser's error stands for.
pub(super) fn problem(source: &Arc<Source>, error: &Error) -> Problem {
    let error = error.without_snippet();
    let at = error
        .location()
        .map_or(0, |at| byte_range(&source.text, at).start);
    let (message, hint) = words(error);
    let at = if message == TAB.0 {
        tab_from(&source.text, at)
    } else {
        at
    };
    let place = place_at(source, at);
    Problem::error(&place, message).hint(hint)
}

/// The first tab from the line of byte `at` on, one in an indentation before
/// others: the parser points at what stands before the tab, or behind it.
fn tab_from(text: &str, at: usize) -> usize {
    let before = text.get(..at).unwrap_or("");
    let at = before.rfind('\n').map_or(0, |end| end + 1);
    let rest = text.get(at..).unwrap_or("");
    let in_indentation = rest.split_inclusive('\n').scan(at, |start, line| {
        let blank = line.len() - line.trim_start_matches([' ', '\t']).len();
        let tab = line[..blank].find('\t').map(|tab| *start + tab);
        *start += line.len();
        Some(tab)
    });
    let anywhere = || rest.find('\t').map(|tab| at + tab);
    in_indentation
        .flatten()
        .next()
        .or_else(anywhere)
        .unwrap_or(at)
}

/// A tag, wherever it stands.
pub(super) fn tag(place: &Place) -> Problem {
    let (message, hint) = TAG;
    Problem::error(place, message).hint(hint)
}

/// The bytes of a location, from its span or else from its line and column.
pub(super) fn byte_range(text: &str, at: Location) -> Range<usize> {
    let span = at.span();
    if let (Some(start), Some(len)) = (span.byte_offset(), span.byte_len()) {
        let start = usize::try_from(start).unwrap_or(usize::MAX);
        let len = usize::try_from(len).unwrap_or(usize::MAX);
        return start.min(text.len())..start.saturating_add(len).min(text.len());
    }
    let (line, column) = (at.line() as usize, at.column() as usize);
    let start: usize = text
        .split_inclusive('\n')
        .take(line.saturating_sub(1))
        .map(str::len)
        .sum();
    let within: usize = text[start..]
        .chars()
        .take(column.saturating_sub(1))
        .map(char::len_utf8)
        .sum();
    start + within..start + within
}

type Words = (String, String);

const TAG: (&str, &str) = (
    "a word that begins with `!` is a tag, and tags are not read here",
    "leave it out, or put the text into quotes",
);

const ALIAS: (&str, &str) = (
    "anchors and aliases (`&name`, `*name`) are not read here",
    "write the value out where it is wanted, or put the text into quotes",
);

const TAB: (&str, &str) = (
    "a tab where only blanks can stand",
    "use blanks for indentation, two to a level",
);

const DOCUMENTS: (&str, &str) = (
    "a second document begins here",
    "one file holds one document: leave `---` out",
);

const QUOTES: (&str, &str) = (
    "a colon where none can stand",
    "put text that holds `: ` into quotes; check the indentation here and the brackets above",
);

fn owned((message, hint): (&str, &str)) -> Words {
    (message.to_owned(), hint.to_owned())
}

fn words(error: &Error) -> Words {
    match error {
        Error::Budget { breach, .. } => owned_breach(breach),
        Error::DuplicateMappingKey { key, .. } => (
            match key {
                Some(key) => format!("the key `{}` stands twice", key.escape_debug()),
                None => "a key stands twice".to_owned(),
            },
            "keep one of the two".to_owned(),
        ),
        Error::ExternalMessage { source, .. } => match source.as_ref() {
            ExternalMessageSource::Parser(error) => scan_words(error.kind()),
            _ => unreadable(),
        },
        Error::UnsupportedTag { .. }
        | Error::TaggedScalarCannotDeserializeIntoString { .. }
        | Error::InvalidBinaryBase64 { .. }
        | Error::BinaryNotUtf8 { .. }
        | Error::InvalidScalar { .. } => owned(TAG),
        Error::UnknownAnchor { .. } => owned(ALIAS),
        Error::MergeKeyNotAllowed { .. } => (
            "the merge key `<<` is not read here".to_owned(),
            "write the keys out".to_owned(),
        ),
        Error::MultipleDocuments { .. } => owned(DOCUMENTS),
        Error::Eof { .. } => (
            "the file is empty".to_owned(),
            "copy a shipped file of the same kind and change it".to_owned(),
        ),
        Error::NullIntoString { .. } | Error::Unexpected { .. } => (
            "a key must be a plain word".to_owned(),
            "write `key: value`; a list of values stands after the colon".to_owned(),
        ),
        _ => unreadable(),
    }
}

fn owned_breach(breach: &BudgetBreach) -> Words {
    match breach {
        BudgetBreach::Depth { .. } => nested(),
        BudgetBreach::Documents { .. } => owned(DOCUMENTS),
        BudgetBreach::Nodes { .. }
        | BudgetBreach::Events { .. }
        | BudgetBreach::ScalarBytes { .. }
        | BudgetBreach::InputBytes { .. } => (
            "the file holds too many values".to_owned(),
            "is this the right file?".to_owned(),
        ),
        BudgetBreach::MergeKeys { .. } => (
            "the merge key `<<` is not read here".to_owned(),
            "write the keys out".to_owned(),
        ),
        _ => owned(ALIAS),
    }
}

fn nested() -> Words {
    (
        format!("nested more than {DEEPEST} deep"),
        "is a bracket left open?".to_owned(),
    )
}

fn unreadable() -> Words {
    (
        "this is not YAML as it is read here".to_owned(),
        "check the indentation and the quotes of this line and the one before".to_owned(),
    )
}

fn scan_words(kind: &ErrorKind) -> Words {
    use ErrorKind as K;
    match kind {
        K::TabNotAllowed
        | K::TabInBlockIndentation
        | K::TabInIndentation
        | K::TabAtBlockScalarStart
        | K::TabInPlainScalar
        | K::InvalidBlockEntryWhitespace
        | K::InvalidMappingValueWhitespace => owned(TAB),
        K::RecursionLimitExceeded => nested(),
        K::UnknownAnchor | K::MissingAnchorOrAliasName => owned(ALIAS),
        K::UnclosedFlowCollection { open } => (
            format!("the bracket `{open}` is never closed"),
            format!("close it with `{}`", closing(*open)),
        ),
        K::MismatchedFlowCollectionEnd { open, close } => (
            format!("`{close}` does not close `{open}`"),
            format!("close it with `{}`", closing(*open)),
        ),
        K::MisplacedFlowCollectionEnd => (
            "a closing bracket without an opening one".to_owned(),
            "leave it out, or put the text into quotes".to_owned(),
        ),
        K::UnexpectedEofFlowSequence
        | K::UnexpectedEofFlowMapping
        | K::UnexpectedEofImplicitFlowMapping
        | K::ExpectedFlowSequenceSeparator
        | K::ExpectedFlowMappingSeparator => (
            "a list or mapping in brackets breaks off here".to_owned(),
            "check commas and the closing bracket".to_owned(),
        ),
        K::UnclosedQuotedScalar | K::DocumentIndicatorInQuotedScalar => (
            "a quote is opened here and never closed".to_owned(),
            "close it, or take it off".to_owned(),
        ),
        K::InvalidTrailingSingleQuotedScalar | K::InvalidTrailingDoubleQuotedScalar => (
            "something follows a closing quote".to_owned(),
            "put the whole value into one pair of quotes".to_owned(),
        ),
        K::UnknownQuotedScalarEscape | K::InvalidQuotedScalarHexEscape => (
            "a backslash sequence that is not known".to_owned(),
            "write `\\\\` for a backslash, or use single quotes".to_owned(),
        ),
        K::MappingValueNotAllowed | K::InvalidColonPlacement | K::MappingKeyNotAllowed => {
            owned(QUOTES)
        }
        K::SimpleKeyExpected | K::InvalidSimpleKey => (
            "a key without its colon".to_owned(),
            "write `key: value`, the value on the same line".to_owned(),
        ),
        K::UnexpectedCharacter { character } => (
            format!("a value can't begin with `{}`", character.escape_debug()),
            "put it into quotes".to_owned(),
        ),
        K::InvalidIndentation
        | K::ExpectedBlockMappingKey
        | K::ExpectedBlockSequenceEntry
        | K::BlockSequenceEntryNotAllowed => (
            "the indentation does not fit the lines above".to_owned(),
            "keys of one mapping begin in one column, and so do dashes of one list".to_owned(),
        ),
        K::UndeclaredTagHandle
        | K::MissingTagUri
        | K::InvalidTagTerminator
        | K::ExpectedTagBang => owned(TAG),
        K::MultipleDocumentsUnsupported | K::ExpectedDocumentStart => owned(DOCUMENTS),
        _ => unreadable(),
    }
}

fn closing(open: char) -> char {
    match open {
        '{' => '}',
        _ => ']',
    }
}
