//! What a single value can be: a name, a text, a choice, a number, a quantity.

use crate::quantity::{
    Celsius, Dimension, ParseQuantityError, Quantity, Ratio, Seconds, parse_written,
};

use super::fields::{Field, shown};
use super::sequence::Span;
use super::{Located, Place, nearest};

/// Longest time that a file can ask for: a month of 31 days.
const LONGEST: f64 = 31.0 * 86_400.0;

/// Shortest time between two readings: the program's timers are whole milliseconds.
const SHORTEST_INTERVAL: f64 = 1e-3;

/// No value on a bench is larger, in any unit; products of such values stay finite.
const LARGEST: f64 = 1e9;

/// Longest name and longest text, in characters.
const LONGEST_NAME: usize = 80;
const LONGEST_TEXT: usize = 2_000;

/// What values are allowed, in the base unit.
#[derive(Clone, Copy)]
pub(super) enum Allowed {
    /// Every finite value.
    Any,
    /// Zero and above.
    NotNegative,
    /// Above zero.
    Positive,
    /// From the first to the second, both included.
    Within(f64, f64),
}

/// A text for people; several lines are allowed.
pub(super) fn text(field: Field<'_>) -> Option<String> {
    let text = field.scalar("some words")?.trim();
    if text.is_empty() {
        return field.wrong(
            format!("`{}` is empty", shown(field.name)),
            "write some words",
        );
    }
    if text.chars().count() > LONGEST_TEXT {
        return field.wrong(
            format!(
                "`{}` is longer than {LONGEST_TEXT} characters",
                shown(field.name)
            ),
            "shorten it",
        );
    }
    if text.chars().any(|c| c != '\n' && is_unprintable(c)) {
        return field.wrong(
            format!("`{}` holds an unprintable character", shown(field.name)),
            "write it without",
        );
    }
    Some(text.to_owned())
}

/// Control characters, and those that turn the direction of text around them.
fn is_unprintable(c: char) -> bool {
    c.is_control()
        || matches!(c, '\u{200B}'..='\u{200F}' | '\u{2028}'..='\u{202E}' | '\u{2060}'..='\u{206F}' | '\u{FEFF}')
}

/// A name: one short line.
pub(super) fn name(field: Field<'_>) -> Option<String> {
    let name = field.scalar("a name")?;
    checked_name(name, field.place(), field)?;
    Some(name.to_owned())
}

/// Whether a text can be a name.
pub(super) fn checked_name(name: &str, place: &Place, field: Field<'_>) -> Option<()> {
    let wrong = if name.trim().is_empty() {
        "a name is empty"
    } else if name.trim() != name {
        "a name begins or ends with a blank"
    } else if name.chars().count() > LONGEST_NAME {
        "a name is longer than 80 characters"
    } else if name.chars().any(is_unprintable) {
        "a name holds an unprintable character"
    } else {
        return Some(());
    };
    field
        .notes
        .error(place, wrong, "write one short line of printable characters")
}

/// A command or query on the wire: printable ASCII, and just these placeholders.
pub(super) fn command<'a>(
    placeholders: &'static [&'static str],
) -> impl Fn(Field<'a>) -> Option<String> {
    move |field| {
        let command = field.scalar("*IDN?")?;
        if command.is_empty() || command.len() > 255 {
            return field.wrong(
                format!("`{}` must hold 1 to 255 characters", shown(field.name)),
                "write one command, without its line end",
            );
        }
        if let Some(c) = command.chars().find(|c| !matches!(c, ' '..='~')) {
            return field.wrong(
                format!("`{}` can't be sent within a command", c.escape_default()),
                "commands are printable ASCII; `framing` adds the line end",
            );
        }
        let found = placeholders_in(command);
        if let Some(unknown) = found.iter().find(|p| !placeholders.contains(p)) {
            return field.wrong(
                format!("`{{{}}}` has no meaning here", shown(unknown)),
                match placeholders {
                    [] => "write the command out".to_owned(),
                    [known, ..] => format!("`{{{known}}}` is put in here"),
                },
            );
        }
        if let Some(wanted) = placeholders.iter().find(|p| !found.contains(p)) {
            return field.wrong(
                format!("`{}` lacks `{{{wanted}}}`", shown(field.name)),
                format!("put `{{{wanted}}}` where the {wanted} goes"),
            );
        }
        Some(command.to_owned())
    }
}

fn placeholders_in(command: &str) -> Vec<&str> {
    command
        .split('{')
        .skip(1)
        .filter_map(|rest| rest.split_once('}').map(|(inner, _)| inner))
        .collect()
}

/// One of several words.
pub(super) fn choice<'a, T: Clone + 'a>(
    choices: &'a [(&'static str, T)],
) -> impl Fn(Field<'a>) -> Option<T> {
    move |field| {
        let word = field.scalar(choices.first().map_or("", |(w, _)| *w))?;
        if let Some((_, value)) = choices.iter().find(|(known, _)| *known == word) {
            return Some(value.clone());
        }
        let known: Vec<&str> = choices.iter().map(|(known, _)| *known).collect();
        field.wrong(
            format!("`{}` can't be `{}`", shown(field.name), shown(word)),
            match nearest(word, known.iter().copied()) {
                Some(meant) => format!("did you mean `{meant}`?"),
                None => format!("one of: {}", known.join(", ")),
            },
        )
    }
}

/// `yes` or `no`, also `true` or `false`.
pub(super) fn yes_no(field: Field<'_>) -> Option<bool> {
    match field.scalar("yes")? {
        "yes" | "true" => Some(true),
        "no" | "false" => Some(false),
        other => field.wrong(
            format!("`{}` is neither yes nor no", shown(other)),
            "write `yes` or `no`",
        ),
    }
}

/// A whole number in plain digits.
pub(super) fn whole<'a>(low: u32, high: u32) -> impl Fn(Field<'a>) -> Option<u32> {
    move |field| {
        let text = field.scalar("1")?;
        let plain = !text.is_empty()
            && text.bytes().all(|b| b.is_ascii_digit())
            && (text == "0" || !text.starts_with('0'));
        match text.parse::<u32>() {
            Ok(value) if plain && low <= value && value <= high => Some(value),
            _ => field.wrong(
                format!(
                    "`{}` must be a whole number from {low} to {high}, not `{}`",
                    shown(field.name),
                    shown(text)
                ),
                "write plain digits, without a unit",
            ),
        }
    }
}

/// A plain number without a unit.
pub(super) fn number<'a>(allowed: Allowed) -> impl Fn(Field<'a>) -> Option<f64> {
    move |field| {
        let text = field.scalar("2")?;
        let plain = text
            .bytes()
            .all(|b| b.is_ascii_digit() || matches!(b, b'.' | b'-' | b'+' | b'e' | b'E'));
        let value = text.parse::<f64>().ok().filter(|_| plain);
        match value {
            Some(value) if !padded_with_zeros(text) => within(field, text, value, allowed),
            _ => field.wrong(
                format!(
                    "`{}` must be a plain number, not `{}`",
                    shown(field.name),
                    shown(text)
                ),
                "write digits and a decimal point, without a unit",
            ),
        }
    }
}

/// A number in front of a fixed unit that is no quantity of its own: `30 J/K`.
pub(super) fn with_unit<'a>(
    units: &'static [&'static str],
    allowed: Allowed,
) -> impl Fn(Field<'a>) -> Option<f64> {
    move |field| {
        let unit = units[0];
        let text = field.scalar(&format!("1 {unit}"))?.trim();
        let number = units
            .iter()
            .find_map(|unit| text.strip_suffix(unit))
            .map(str::trim)
            .filter(|number| !number.is_empty() && !number.starts_with(char::is_alphabetic));
        match number.and_then(|number| number.parse::<f64>().ok()) {
            Some(value) => within(field, text, value, allowed),
            None => field.wrong(
                format!("`{}` must be a number in {unit}", shown(field.name)),
                format!("write for example `1 {unit}`"),
            ),
        }
    }
}

/// A quantity with its unit.
pub(super) fn quantity<'a, Q: Quantity>(allowed: Allowed) -> impl Fn(Field<'a>) -> Option<Q> {
    move |field| {
        let text = field.scalar(Q::DIMENSION.example())?;
        of_text(field, text, allowed)
    }
}

/// A quantity of a dimension that is known only here, in its base unit.
pub(super) fn value_of<'a>(
    dimension: Dimension,
    allowed: Allowed,
) -> impl Fn(Field<'a>) -> Option<f64> {
    move |field| {
        let text = field.scalar(dimension.example())?;
        base_value(field, text, dimension, allowed)
    }
}

/// `230 V`, or `220 V to 240 V`.
pub(super) fn span<'a, Q: Quantity + Copy + PartialOrd>(
    allowed: Allowed,
) -> impl Fn(Field<'a>) -> Option<Span<Q>> {
    move |field| {
        let text = field.scalar(Q::DIMENSION.example())?;
        if let Some((low, high)) = text.split_once(" to ") {
            let (low, high) = (
                of_text::<Q>(field, low, allowed),
                of_text::<Q>(field, high, allowed),
            );
            let (low, high) = (low?, high?);
            if low > high {
                return field.wrong(
                    format!("`{}` begins above its end", shown(text)),
                    format!("write `{high} to {low}`"),
                );
            }
            return Some(Span { low, high });
        }
        if let Some(both_ends) = dashed(text) {
            return field.wrong(
                format!("`{}` can't be read as a range", shown(text)),
                format!("write `{}`", shown(&both_ends)),
            );
        }
        let value = of_text(field, text, allowed)?;
        Some(Span {
            low: value,
            high: value,
        })
    }
}

/// `220-240 V` as it should be written.
fn dashed(text: &str) -> Option<String> {
    let (low, high) = text.split_once(['-', '–'])?;
    let unit = high.trim_start_matches(|c: char| c.is_ascii_digit() || c == '.');
    let low = low.trim().trim_end_matches(unit.trim()).trim();
    let (low, high) = (format!("{low} {}", unit.trim()), high.trim());
    let both = parse_written(&low).is_ok() && parse_written(high).is_ok();
    both.then(|| format!("{low} to {high}"))
}

/// A duration: above zero and below a month.
pub(super) fn duration(field: Field<'_>) -> Option<Seconds> {
    let length: Seconds = quantity(Allowed::NotNegative)(field)?;
    if length.as_micros() == 0 {
        return field.wrong(
            format!("`{}` must be longer than nothing", shown(field.name)),
            "write for example `20 min`",
        );
    }
    not_endless(field, length)
}

/// A duration that may be zero.
pub(super) fn pause(field: Field<'_>) -> Option<Seconds> {
    not_endless(field, quantity(Allowed::NotNegative)(field)?)
}

/// A polling interval.
pub(super) fn interval(field: Field<'_>) -> Option<Seconds> {
    let every: Seconds = quantity(Allowed::NotNegative)(field)?;
    if every.get() < SHORTEST_INTERVAL {
        return field.wrong(
            format!("`{}` must be at least 1 ms", shown(field.name)),
            "write for example `2 s`",
        );
    }
    not_endless(field, every)
}

fn not_endless(field: Field<'_>, length: Seconds) -> Option<Seconds> {
    if length.get() > LONGEST {
        return field.wrong(
            format!("`{}` is longer than 31 days", shown(field.name)),
            "write for example `20 min`",
        );
    }
    Some(length)
}

/// A temperature that matter on a bench can have.
pub(super) fn temperature(field: Field<'_>) -> Option<Celsius> {
    quantity(Allowed::Within(-100.0, 2_000.0))(field)
}

/// A share from 0 % to 100 %.
pub(super) fn share(field: Field<'_>) -> Option<Ratio> {
    quantity(Allowed::Within(0.0, 1.0))(field)
}

/// A name and its place.
pub(super) fn located_name(field: Field<'_>) -> Option<Located<String>> {
    super::fields::located(name)(field)
}

fn of_text<Q: Quantity>(field: Field<'_>, text: &str, allowed: Allowed) -> Option<Q> {
    let value = base_value(field, text, Q::DIMENSION, allowed)?;
    match Q::from_base(value) {
        Some(quantity) => Some(quantity),
        None => field.wrong(
            format!("`{}` is negative", shown(text)),
            format!("write for example `{}`", Q::DIMENSION.example()),
        ),
    }
}

fn base_value(field: Field<'_>, text: &str, dimension: Dimension, allowed: Allowed) -> Option<f64> {
    let example = dimension.example();
    let text = text.trim();
    if padded_with_zeros(text) {
        return field.wrong(
            format!("`{}` begins with a zero too many", shown(text)),
            format!("write for example `{example}`"),
        );
    }
    let written = match parse_written(text) {
        Ok(written) => written,
        Err(error) => {
            let hint = hint_of(&error, text, dimension);
            return field.wrong(shortened(&error, text), hint);
        }
    };
    if written.dimension != dimension {
        let error = ParseQuantityError::WrongDimension {
            text: shown(text),
            found: written.dimension.name(),
            wanted: dimension.name(),
        };
        return field.wrong(error.to_string(), format!("write for example `{example}`"));
    }
    within(field, text, written.value, allowed)
}

/// The parser's message, with the text from outside cut and escaped.
fn shortened(error: &ParseQuantityError, text: &str) -> String {
    let text = shown(text);
    match error {
        ParseQuantityError::NoNumber { .. } => ParseQuantityError::NoNumber { text },
        ParseQuantityError::NoUnit { .. } => ParseQuantityError::NoUnit { text },
        ParseQuantityError::UnknownUnit { unit } => {
            ParseQuantityError::UnknownUnit { unit: shown(unit) }
        }
        ParseQuantityError::NotFinite { .. } => ParseQuantityError::NotFinite { text },
        other => other.clone(),
    }
    .to_string()
}

fn hint_of(error: &ParseQuantityError, text: &str, dimension: Dimension) -> String {
    let example = dimension.example();
    let unit = example.split_once(' ').map_or("", |(_, unit)| unit);
    match error {
        ParseQuantityError::NoUnit { .. } if dimension == Dimension::Time => {
            let text = shown(text);
            format!("write `{text} ms`, `{text} s` or `{text} min`")
        }
        ParseQuantityError::NoUnit { .. } => format!("write `{} {unit}`", shown(text)),
        _ => format!("write for example `{example}`"),
    }
}

/// `010`: an octal eight to some and a ten to others.
fn padded_with_zeros(text: &str) -> bool {
    let digits = text.trim_start_matches(['+', '-']).as_bytes();
    matches!(digits, [b'0', b'0'..=b'9', ..])
}

fn within(field: Field<'_>, text: &str, value: f64, allowed: Allowed) -> Option<f64> {
    let text = shown(text);
    let good = match allowed {
        Allowed::Any => true,
        Allowed::NotNegative => value >= 0.0,
        Allowed::Positive => value > 0.0,
        Allowed::Within(low, high) => low <= value && value <= high,
    };
    if value.is_finite() && value.abs() <= LARGEST && good {
        return Some(value);
    }
    let message = if !value.is_finite() {
        format!("`{text}` is not a finite number")
    } else if value.abs() > LARGEST {
        format!("`{text}` is beyond anything on a bench")
    } else {
        match allowed {
            Allowed::NotNegative if value < 0.0 => format!("`{text}` is negative"),
            Allowed::Positive if value < 0.0 => format!("`{text}` is negative"),
            Allowed::Positive => format!("`{}` must be above zero", shown(field.name)),
            _ => format!("`{text}` is out of range"),
        }
    };
    let hint = match allowed {
        Allowed::Within(0.0, 1.0) => "write a value from 0 % to 100 %".to_owned(),
        Allowed::Within(..) => "is it in the right unit?".to_owned(),
        _ => "check the number and its unit".to_owned(),
    };
    field.wrong(message, hint)
}
