//! Taking a mapping apart, key by key, and noting everything that is wrong with it.
//!
//! A decoder is a function from a [`Field`] to an `Option`: nothing means that the
//! reason is already in the [`Notes`]. A struct's decoder first takes every key and
//! only then gives up, so that one run shows every problem of the file.

use std::cell::RefCell;

use super::yaml::{Entry, Node, NodeKind};
use super::{Located, Place, Problem, Weight, nearest};

/// Problems noted so far in one file.
#[derive(Default)]
pub(super) struct Notes {
    problems: RefCell<Vec<Problem>>,
}

impl Notes {
    /// Notes a problem.
    pub(super) fn add(&self, problem: Problem) {
        self.problems.borrow_mut().push(problem);
    }

    /// Notes an error with a hint; nothing, so that a decoder can end with it.
    pub(super) fn error<T>(
        &self,
        place: &Place,
        message: impl Into<String>,
        hint: impl Into<String>,
    ) -> Option<T> {
        self.add(Problem::error(place, message).hint(hint));
        None
    }

    /// All problems in the order of the file.
    pub(super) fn into_problems(self) -> Vec<Problem> {
        let mut problems = self.problems.into_inner();
        problems.sort_by_key(|p| (p.place.bytes.start, p.weight == Weight::Warning));
        problems
    }
}

/// A value, what it is called, and where to note problems.
#[derive(Clone, Copy)]
pub(super) struct Field<'a> {
    /// The value.
    pub(super) node: &'a Node,
    /// Its key, or what stands for it in a list.
    pub(super) name: &'a str,
    /// Where a missing key of it is reported: its own key.
    pub(super) key: &'a Place,
    /// Where problems are noted.
    pub(super) notes: &'a Notes,
}

impl<'a> Field<'a> {
    /// The whole file.
    pub(super) fn root(node: &'a Node, name: &'a str, notes: &'a Notes) -> Self {
        let key = match &node.kind {
            NodeKind::Map(entries) => entries.first().map_or(&node.place, |e| &e.key.place),
            _ => &node.place,
        };
        Field {
            node,
            name,
            key,
            notes,
        }
    }

    /// A value under a key of this one.
    fn under(self, entry: &'a Entry) -> Self {
        Field {
            node: &entry.value,
            name: &entry.key.value,
            key: &entry.key.place,
            notes: self.notes,
        }
    }

    /// Notes an error at the value; at its key where there is no value to point at.
    pub(super) fn wrong<T>(self, message: impl Into<String>, hint: impl Into<String>) -> Option<T> {
        self.notes.error(self.place(), message, hint)
    }

    /// The value's place; its key's where there is no value to point at.
    pub(super) fn place(self) -> &'a Place {
        if self.node.place.bytes.is_empty() {
            self.key
        } else {
            &self.node.place
        }
    }

    /// Its name for messages: a key stands in backticks, the file does not.
    pub(super) fn called(self) -> String {
        match self.name {
            whole if whole.starts_with("the ") => whole.to_owned(),
            key => format!("`{}`", shown(key)),
        }
    }

    /// The text of a scalar.
    pub(super) fn scalar(self, example: &str) -> Option<&'a str> {
        match &self.node.kind {
            NodeKind::Scalar(text) => Some(text),
            NodeKind::Nothing => self.wrong(
                format!("{} has no value", self.called()),
                format!("write for example `{example}`"),
            ),
            NodeKind::List(_) => self.wrong(
                format!("{} is a single value, not a list", self.called()),
                format!("write for example `{example}`"),
            ),
            NodeKind::Map(_) => self.wrong(
                format!("{} is a single value, not a mapping", self.called()),
                format!("write for example `{example}`"),
            ),
        }
    }

    /// The value's keys.
    pub(super) fn mapping(self) -> Option<&'a [Entry]> {
        match &self.node.kind {
            NodeKind::Map(entries) => Some(entries),
            _ => self.wrong(
                format!("{} must be a mapping", self.called()),
                "write `key: value` lines, indented below it",
            ),
        }
    }

    /// The value's keys, each to be asked for.
    pub(super) fn fields(self) -> Option<Fields<'a>> {
        Some(Fields {
            entries: self.mapping()?,
            whole: self,
            asked: RefCell::default(),
        })
    }
}

/// Text from outside for a message: no control characters, not without end.
pub(super) fn shown(text: &str) -> String {
    let mut cut: String = text.chars().take(60).flat_map(char::escape_debug).collect();
    if text.chars().count() > 60 {
        cut.push('…');
    }
    cut
}

/// The keys of one mapping. Every key is asked for once; [`Fields::finish`] reports
/// those that nobody asked for.
pub(super) struct Fields<'a> {
    entries: &'a [Entry],
    whole: Field<'a>,
    asked: RefCell<Vec<&'static str>>,
}

impl<'a> Fields<'a> {
    /// The field of a key, where it is there.
    pub(super) fn find(&self, key: &'static str) -> Option<Field<'a>> {
        self.asked.borrow_mut().push(key);
        let entry = self.entries.iter().find(|e| e.key.value == key)?;
        Some(self.whole.under(entry))
    }

    /// A key that must be there.
    pub(super) fn required<T>(
        &self,
        key: &'static str,
        decode: impl FnOnce(Field<'a>) -> Option<T>,
    ) -> Option<T> {
        match self.find(key) {
            Some(field) => decode(field),
            None => self.missing(key),
        }
    }

    /// A key that may be left out; outer nothing where it is there and wrong.
    pub(super) fn optional<T>(
        &self,
        key: &'static str,
        decode: impl FnOnce(Field<'a>) -> Option<T>,
    ) -> Option<Option<T>> {
        match self.find(key) {
            Some(field) => decode(field).map(Some),
            None => Some(None),
        }
    }

    /// A key with a default.
    pub(super) fn or<T>(
        &self,
        key: &'static str,
        default: T,
        decode: impl FnOnce(Field<'a>) -> Option<T>,
    ) -> Option<T> {
        self.optional(key, decode).map(|x| x.unwrap_or(default))
    }

    /// Notes that a key is missing.
    pub(super) fn missing<T>(&self, key: &'static str) -> Option<T> {
        // A misspelt key is reported once, as the unknown one that it is.
        if self.misspelt(key).is_some() {
            return None;
        }
        self.whole.notes.error(
            self.whole.key,
            format!("{} lacks `{key}`", self.whole.called()),
            format!("add `{key}: ...` to it"),
        )
    }

    /// An unknown key that was probably meant to be this one.
    pub(super) fn misspelt(&self, key: &str) -> Option<&'a Entry> {
        self.entries.iter().find(|entry| {
            entry.key.value != key && nearest(&entry.key.value, [key]).is_some() && {
                let asked = self.asked.borrow();
                !asked.iter().any(|a| *a == entry.key.value)
            }
        })
    }

    /// Notes something wrong with two keys together, at the first one's value.
    pub(super) fn wrong<T>(
        &self,
        key: &str,
        message: impl Into<String>,
        hint: impl Into<String>,
    ) -> Option<T> {
        let place = self
            .entries
            .iter()
            .find(|e| e.key.value == key)
            .map_or(self.whole.key, |e| self.whole.under(e).place());
        self.whole.notes.error(place, message, hint)
    }

    /// Reports every key that nobody asked for. Nothing where there is one, so that
    /// a decoder can end early; its problems are noted either way.
    pub(super) fn finish(self) -> Option<()> {
        let asked = self.asked.borrow();
        let left: Vec<&str> = asked.iter().copied().filter(|k| !self.has(k)).collect();
        let mut all_known = Some(());
        for entry in self.entries {
            if asked.iter().any(|known| *known == entry.key.value) {
                continue;
            }
            let hint = match nearest(&entry.key.value, left.iter().copied()) {
                Some(meant) => format!("did you mean `{meant}`?"),
                None => format!("known here: {}", asked.join(", ")),
            };
            all_known = self.whole.notes.error(
                &entry.key.place,
                format!("unknown key `{}`", shown(&entry.key.value)),
                hint,
            );
        }
        all_known
    }

    fn has(&self, key: &str) -> bool {
        self.entries.iter().any(|e| e.key.value == key)
    }
}

/// Every item of a list. Nothing where one is wrong; all are looked at.
pub(super) fn list<'a, T>(
    decode: impl Fn(Field<'a>) -> Option<T>,
) -> impl Fn(Field<'a>) -> Option<Vec<T>> {
    move |field| {
        let NodeKind::List(items) = &field.node.kind else {
            return field.wrong(
                format!("`{}` must be a list", shown(field.name)),
                match &field.node.kind {
                    NodeKind::Scalar(text) => format!("write `[{}]`", shown(text)),
                    _ => "write `[a, b]`, or a line with a dash for each".to_owned(),
                },
            );
        };
        let decoded: Vec<Option<T>> = items
            .iter()
            .map(|node| {
                let item = Field { node, ..field };
                decode(Field {
                    key: item_key(node, field.key),
                    ..item
                })
            })
            .collect();
        decoded.into_iter().collect()
    }
}

/// What a missing key of a list's item is reported at: its first key.
fn item_key<'a>(node: &'a Node, list_key: &'a Place) -> &'a Place {
    match &node.kind {
        NodeKind::Map(entries) => entries.first().map_or(&node.place, |e| &e.key.place),
        _ if node.place.bytes.is_empty() => list_key,
        _ => &node.place,
    }
}

/// A list with at least one item.
pub(super) fn some<'a, T>(
    decode: impl Fn(Field<'a>) -> Option<T>,
) -> impl Fn(Field<'a>) -> Option<Vec<T>> {
    let decode = list(decode);
    move |field| {
        let items = decode(field)?;
        if items.is_empty() {
            return field.wrong(
                format!("`{}` is empty", shown(field.name)),
                "it needs at least one entry",
            );
        }
        Some(items)
    }
}

/// Every entry of a mapping whose keys are names; in the order of the file.
pub(super) fn named<'a, T>(
    decode: impl Fn(Located<String>, Field<'a>) -> Option<T>,
) -> impl Fn(Field<'a>) -> Option<Vec<T>> {
    move |field| {
        let entries = field.mapping()?;
        if entries.is_empty() {
            return field.wrong(
                format!("`{}` is empty", shown(field.name)),
                "it needs at least one entry",
            );
        }
        let decoded: Vec<Option<T>> = entries
            .iter()
            .map(|entry| {
                let under = field.under(entry);
                let key = super::scalars::checked_name(&entry.key.value, &entry.key.place, under);
                let value = decode(entry.key.clone(), under);
                key.and(value)
            })
            .collect();
        decoded.into_iter().collect()
    }
}

/// A value with its place.
pub(super) fn located<'a, T>(
    decode: impl Fn(Field<'a>) -> Option<T>,
) -> impl Fn(Field<'a>) -> Option<Located<T>> {
    move |field| {
        Some(Located {
            value: decode(field)?,
            place: field.place().clone(),
        })
    }
}

/// Refuses a name that stands twice in a list.
pub(super) fn all_different(names: &[Located<String>], notes: &Notes) -> Option<()> {
    let mut seen = std::collections::BTreeSet::new();
    let mut different = Some(());
    for name in names {
        if !seen.insert(name.value.as_str()) {
            different = notes.error(
                &name.place,
                format!("`{}` stands twice", shown(name)),
                "keep one of the two",
            );
        }
    }
    different
}
