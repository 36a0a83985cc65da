//! Messages of a driver's dialect: what is sent, and what a reply means. No I/O.
//!
//! SCPI-1999 and IEEE 488.2 as restatements give them: numbers are NR1, NR2 or
//! NR3; 9.9E37 is infinity, -9.9E37 minus infinity and 9.91E37 not a number;
//! booleans are answered 1 or 0; a string's inner quotes are doubled.

use super::error::Fault;
use crate::quantity::{Reading, Readings, shortest};
use crate::spec::driver::Terminator;

/// From here on a number is a sentinel: 9.9E37, with room for a device that
/// rounds it to single precision.
const SENTINEL: f64 = 9.89e37;
/// Sentinels between these two are 9.91E37, "not a number".
const NOT_A_NUMBER: std::ops::Range<f64> = 9.905e37..9.915e37;

/// A number as an instrument says it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Number {
    /// A value.
    Value(f64),
    /// Beyond the range.
    Overload,
    /// There is none.
    NoValue,
}

impl Number {
    /// The value, or the fault that the sentinel says.
    pub fn value(self) -> Result<f64, Fault> {
        match self {
            Number::Value(value) => Ok(value),
            Number::Overload => Err(Fault::Overload),
            Number::NoValue => Err(Fault::NoValue),
        }
    }
}

/// An entry of an error queue.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ErrorEntry {
    /// 0 is "no error".
    pub code: i32,
    /// In the instrument's words.
    pub text: String,
}

/// Fills a template's `{value}` and `{channel}` and ends it.
///
/// # Errors
/// [`Fault::Refused`] where the template wants what is not given.
pub fn frame(
    template: &str,
    value: Option<f64>,
    channel: Option<u32>,
    end: Terminator,
) -> Result<Vec<u8>, Fault> {
    let text = filled(template, "{value}", value.map(shortest))?;
    let text = filled(&text, "{channel}", channel.map(|c| c.to_string()))?;
    let mut bytes = text.into_bytes();
    bytes.extend_from_slice(end.bytes());
    Ok(bytes)
}

fn filled(template: &str, hole: &str, with: Option<String>) -> Result<String, Fault> {
    match with {
        Some(text) => Ok(template.replace(hole, &text)),
        None if template.contains(hole) => Err(Fault::Refused(format!(
            "`{template}` needs a {}",
            hole.trim_matches(['{', '}'])
        ))),
        None => Ok(template.to_owned()),
    }
}

/// The first whole line of `bytes`, without its end, and how many bytes it took.
/// Bytes before `from` are known to hold no line end.
pub fn split_line(bytes: &[u8], end: Terminator, from: usize) -> Option<(&[u8], usize)> {
    let last = match end {
        Terminator::Lf | Terminator::CrLf => b'\n',
        Terminator::Cr => b'\r',
    };
    let mut from = from;
    loop {
        let at = from + bytes.get(from..)?.iter().position(|b| *b == last)?;
        let line = &bytes[..at];
        match (end, line.strip_suffix(b"\r")) {
            (Terminator::CrLf, None) => from = at + 1,
            (Terminator::Cr, _) => return Some((line, at + 1)),
            (_, stripped) => return Some((stripped.unwrap_or(line), at + 1)),
        }
    }
}

/// Whether bytes say nothing: spaces, line ends, NUL.
pub fn is_blank(bytes: &[u8]) -> bool {
    bytes
        .iter()
        .all(|b| matches!(b, b' ' | b'\t' | b'\r' | b'\n' | 0))
}

/// Reads one number: NR1, NR2 or NR3, a leading `+` allowed.
///
/// # Errors
/// [`Fault::Garbled`] where it is none.
pub fn number(field: &[u8]) -> Result<Number, Fault> {
    let field = field.trim_ascii();
    let garbled = || Fault::Garbled(format!("`{}` is no number", field.escape_ascii()));
    if !is_decimal(field) {
        return Err(garbled());
    }
    let text = std::str::from_utf8(field).map_err(|_| garbled())?;
    let value: f64 = text.parse().map_err(|_| garbled())?;
    Ok(if NOT_A_NUMBER.contains(&value) {
        Number::NoValue
    } else if value.abs() >= SENTINEL {
        Number::Overload
    } else {
        Number::Value(value)
    })
}

/// `[+-] digits [. digits] [E [+-] digits]`, at least one digit before the E:
/// the standard library's parser takes `inf` and `nan` too, and no instrument may.
fn is_decimal(field: &[u8]) -> bool {
    let unsigned = |s: &'_ [u8]| -> usize { usize::from(matches!(s.first(), Some(b'+' | b'-'))) };
    let digits = |s: &[u8]| s.iter().take_while(|b| b.is_ascii_digit()).count();
    let mut rest = &field[unsigned(field)..];
    let whole = digits(rest);
    rest = &rest[whole..];
    let mut fraction = 0;
    if let Some(after) = rest.strip_prefix(b".") {
        fraction = digits(after);
        rest = &after[fraction..];
    }
    if whole + fraction == 0 {
        return false;
    }
    match rest {
        [] => true,
        [b'e' | b'E', exponent @ ..] => {
            let exponent = &exponent[unsigned(exponent)..];
            !exponent.is_empty() && digits(exponent) == exponent.len()
        }
        _ => false,
    }
}

/// Reads a boolean: 1, 0, ON, OFF in any case.
///
/// # Errors
/// [`Fault::Garbled`] where it is none.
pub fn switch(field: &[u8]) -> Result<bool, Fault> {
    let field = field.trim_ascii();
    match field {
        b"1" | b"+1" => Ok(true),
        b"0" | b"+0" => Ok(false),
        _ if field.eq_ignore_ascii_case(b"ON") => Ok(true),
        _ if field.eq_ignore_ascii_case(b"OFF") => Ok(false),
        _ => Err(Fault::Garbled(format!(
            "`{}` is neither 1, 0, ON nor OFF",
            field.escape_ascii()
        ))),
    }
}

/// Reads a reply of exactly one number per reading, set apart by `;` or `,`.
///
/// # Errors
/// [`Fault::Garbled`] on a wrong number of fields or a field that is no number,
/// else [`Fault::Overload`] or [`Fault::NoValue`] where any field says so.
pub fn readings(line: &[u8], gives: &[Reading]) -> Result<Readings, Fault> {
    let found = fields(line).count();
    if found != gives.len() {
        return Err(Fault::Garbled(format!(
            "{} expected, {found} found",
            counted(gives.len())
        )));
    }
    let mut all = Readings::NONE;
    let mut sentinel = None;
    for (field, reading) in fields(line).zip(gives) {
        match number(field)?.value() {
            Ok(value) => all.set(*reading, value),
            Err(fault) => sentinel = sentinel.or(Some(fault)),
        }
    }
    sentinel.map_or(Ok(all), Err)
}

fn fields(line: &[u8]) -> impl Iterator<Item = &[u8]> {
    line.split(|b| matches!(b, b';' | b','))
}

fn counted(n: usize) -> String {
    match n {
        1 => "1 field".to_owned(),
        n => format!("{n} fields"),
    }
}

/// Reads an identity reply of `fields` comma fields.
///
/// # Errors
/// [`Fault::Garbled`] on another number of fields.
pub fn identity(line: &[u8], expected: usize) -> Result<String, Fault> {
    let found = line.split(|b| *b == b',').count();
    if found != expected {
        return Err(Fault::Garbled(format!(
            "an identity of {} expected, {found} found",
            counted(expected)
        )));
    }
    Ok(String::from_utf8_lossy(line).trim().to_owned())
}

/// Reads an error queue's reply, `-222,"Data out of range"`: keyed on the number,
/// since texts differ between makers and editions. Where a reply lists several
/// entries the first that is not 0 counts.
///
/// # Errors
/// [`Fault::Garbled`] where no number leads.
pub fn error_entry(line: &[u8]) -> Result<ErrorEntry, Fault> {
    let mut rest = line.trim_ascii();
    loop {
        let end = rest.iter().position(|b| *b == b',').unwrap_or(rest.len());
        let code = error_code(&rest[..end])?;
        let after = rest.get(end + 1..).unwrap_or(&[]).trim_ascii_start();
        let (text, left) = match after.strip_prefix(b"\"") {
            Some(quoted) => string(quoted)?,
            None => (after.to_vec(), &after[after.len()..]),
        };
        match left.trim_ascii().strip_prefix(b",") {
            Some(more) if code == 0 => rest = more,
            _ => {
                let text = String::from_utf8_lossy(&text).into_owned();
                return Ok(ErrorEntry { code, text });
            }
        }
    }
}

fn error_code(field: &[u8]) -> Result<i32, Fault> {
    match number(field)? {
        Number::Value(code) if code.fract() == 0.0 && code.abs() <= f64::from(i32::MAX) => {
            Ok(code as i32)
        }
        _ => Err(Fault::Garbled(format!(
            "`{}` is no error number",
            field.escape_ascii()
        ))),
    }
}

/// The string after an opening quote, inner quotes undoubled, and what follows it.
fn string(quoted: &[u8]) -> Result<(Vec<u8>, &[u8]), Fault> {
    let mut text = Vec::new();
    let mut at = 0;
    while let Some(byte) = quoted.get(at) {
        at += 1;
        if *byte != b'"' {
            text.push(*byte);
        } else if quoted.get(at) == Some(&b'"') {
            text.push(b'"');
            at += 1;
        } else {
            return Ok((text, &quoted[at..]));
        }
    }
    Err(Fault::Garbled(
        "a string without its closing quote".to_owned(),
    ))
}
