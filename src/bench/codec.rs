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
    text.parse().map(told).map_err(|_| garbled())
}

/// A value, or what it says as a sentinel.
pub fn told(value: f64) -> Number {
    if NOT_A_NUMBER.contains(&value) {
        Number::NoValue
    } else if value.abs() >= SENTINEL {
        Number::Overload
    } else {
        Number::Value(value)
    }
}

/// `[+-] digits [. digits] [E [+-] digits]`, at least one digit before the E:
/// the standard library's parser takes `inf` and `nan` too, and no instrument may.
fn is_decimal(field: &[u8]) -> bool {
    let sign = |s: &[u8]| usize::from(matches!(s.first(), Some(b'+' | b'-')));
    let digits = |s: &[u8]| s.iter().take_while(|b| b.is_ascii_digit()).count();
    let mut rest = &field[sign(field)..];
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
            let exponent = &exponent[sign(exponent)..];
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

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    fn reply(received: &str) -> Vec<u8> {
        let (line, took) = split_line(received.as_bytes(), Terminator::Lf, 0).unwrap();
        assert_eq!(took, received.len());
        line.to_vec()
    }

    fn entry(code: i32, text: &str) -> ErrorEntry {
        ErrorEntry {
            code,
            text: text.to_owned(),
        }
    }

    #[test]
    fn commands_are_filled_with_shortest_decimals_and_ended() {
        let sent = |template, value, channel, end| frame(template, value, channel, end).unwrap();
        assert_eq!(
            sent("SOUR:VOLT {value}", Some(230.0), None, Terminator::Lf),
            b"SOUR:VOLT 230\n"
        );
        assert_eq!(
            sent("SOUR:VOLT {value}", Some(0.1 + 0.2), None, Terminator::CrLf),
            b"SOUR:VOLT 0.30000000000000004\r\n"
        );
        assert_eq!(
            sent("MEAS:TEMP? (@{channel})", None, Some(3), Terminator::Cr),
            b"MEAS:TEMP? (@3)\r"
        );
        assert_eq!(
            frame("SOUR:VOLT {value}", None, None, Terminator::Lf),
            Err(Fault::Refused("`SOUR:VOLT {value}` needs a value".into()))
        );
        assert!(frame("MEAS:TEMP? (@{channel})", None, None, Terminator::Lf).is_err());
    }

    #[test]
    fn identities_have_four_fields() {
        // IEEE 488.2 *IDN?: checked against a device-side SCPI library.
        let text = identity(&reply("EXAMPLE,BENCH1,0001,1.0\n"), 4).unwrap();
        assert_eq!(text, "EXAMPLE,BENCH1,0001,1.0");
        // CR LF: read in a restatement.
        assert_eq!(
            identity(&reply("MA,IN,0,VER\r\n"), 4).unwrap(),
            "MA,IN,0,VER"
        );
        assert!(matches!(identity(b"230.125", 4), Err(Fault::Garbled(_))));
    }

    #[test]
    fn a_compound_reply_is_split_into_exactly_its_fields() {
        // `MEAS:VOLT?;CURR?;POW?`: checked against a device-side SCPI library.
        let gives = [Reading::Voltage, Reading::Current, Reading::Power];
        let row = readings(&reply("230.125;9.5625;2200.5\n"), &gives).unwrap();
        assert_eq!(row.get(Reading::Voltage), Some(230.125));
        assert_eq!(row.get(Reading::Current), Some(9.5625));
        assert_eq!(row.get(Reading::Power), Some(2200.5));
        assert_eq!(readings(b"230.125,9.5625,2200.5", &gives).unwrap(), row);
        for wrong in ["230.125;9.5625", "1;2;3;4", "", "1;;3"] {
            let fault = readings(wrong.as_bytes(), &gives).unwrap_err();
            assert!(matches!(fault, Fault::Garbled(_)), "{wrong}");
        }
        // A decimal comma is no number of ours.
        let fault = readings(b"230,1", &[Reading::Voltage]).unwrap_err();
        assert_eq!(fault, Fault::Garbled("1 field expected, 2 found".into()));
    }

    #[test]
    fn numbers_come_in_three_forms() {
        // NR1 273, NR2 0.273, NR3 2.73E+2, leading + allowed: SCPI-1999 as restatements give it.
        for (text, value) in [
            ("273", 273.0),
            ("0.273", 0.273),
            ("2.73E+2", 273.0),
            ("+2.73e2", 273.0),
            ("-.5", -0.5),
            (" 5. ", 5.0),
            ("1E-3", 1e-3),
            ("230.0", 230.0),
        ] {
            assert_eq!(number(text.as_bytes()), Ok(Number::Value(value)), "{text}");
        }
        for text in [
            "", "+", ".", "E5", "1E", "1E+", "1e5.5", "0x10", "1 2", "inf", "nan", "-", "1V",
        ] {
            assert!(
                matches!(number(text.as_bytes()), Err(Fault::Garbled(_))),
                "{text}"
            );
        }
    }

    #[test]
    fn sentinels_are_told_apart() {
        for (text, meant) in [
            // Checked against a device-side SCPI library.
            ("9.91E+37", Number::NoValue),
            ("9.9E+37", Number::Overload),
            // Read in a restatement.
            ("-9.9E+37", Number::Overload),
            // The same in other writings, and rounded to single precision (ours).
            ("9.90000000E37", Number::Overload),
            ("9.8999999E+37", Number::Overload),
            ("+99E36", Number::Overload),
            ("9.9100002E+37", Number::NoValue),
            ("1E999", Number::Overload),
            ("-1E999", Number::Overload),
        ] {
            assert_eq!(number(text.as_bytes()), Ok(meant), "{text}");
        }
        assert_eq!(number(b"9.8E37"), Ok(Number::Value(9.8e37)));
    }

    #[test]
    fn booleans_are_one_or_zero() {
        // `:OUTP?` answers 1: checked against a device-side SCPI library; ON and OFF: common practice.
        for (text, on) in [
            ("1", true),
            ("0", false),
            ("ON", true),
            ("off", false),
            ("+1 ", true),
        ] {
            assert_eq!(switch(text.as_bytes()), Ok(on), "{text}");
        }
        for text in ["", "2", "1.5", "ONN", "true", "9.91E37"] {
            assert!(switch(text.as_bytes()).is_err(), "{text}");
        }
    }

    #[test]
    fn error_entries_are_keyed_on_their_number() {
        for (received, expected) in [
            // Checked against a device-side SCPI library.
            (
                "-222,\"Data out of range\"\n",
                entry(-222, "Data out of range"),
            ),
            (
                "-113,\"Undefined header\"\n",
                entry(-113, "Undefined header"),
            ),
            ("0,\"No error\"\n", entry(0, "No error")),
            // Read in a restatement.
            ("+0,\"No error\"\n", entry(0, "No error")),
            ("-350,\"Too many errors\"\n", entry(-350, "Too many errors")),
            // Inner quotes are doubled: SCPI-1999 as restatements give it.
            (
                "-100,\"say \"\"on\"\", not 1\"\n",
                entry(-100, "say \"on\", not 1"),
            ),
            // Leniently (ours): without text, or without quotes.
            ("0\n", entry(0, "")),
            ("-300,Device error\n", entry(-300, "Device error")),
        ] {
            assert_eq!(error_entry(&reply(received)), Ok(expected), "{received}");
        }
        // A list of the whole queue: checked against a device-side SCPI library.
        let all = "-113,\"Undefined header\",-113,\"Undefined header\",-350,\"Queue overflow\"";
        assert_eq!(error_entry(all.as_bytes()).unwrap().code, -113);
        assert_eq!(
            error_entry(b"0,\"No error\",-350,\"x\"").unwrap().code,
            -350
        );
        for wrong in [
            "",
            "\"No error\"",
            "0.5,\"x\"",
            "-222,\"cut off",
            "9.91E37,\"x\"",
        ] {
            assert!(error_entry(wrong.as_bytes()).is_err(), "{wrong}");
        }
    }

    #[test]
    fn lines_end_as_the_driver_says() {
        let split = |bytes: &'static [u8], end| split_line(bytes, end, 0);
        assert_eq!(split(b"1\n2", Terminator::Lf), Some((&b"1"[..], 2)));
        // One trailing CR is stripped, a second is not.
        assert_eq!(split(b"1\r\n", Terminator::Lf), Some((&b"1"[..], 3)));
        assert_eq!(split(b"1\r\r\n", Terminator::Lf), Some((&b"1\r"[..], 4)));
        assert_eq!(
            split(b"1\n2\r\n", Terminator::CrLf),
            Some((&b"1\n2"[..], 5))
        );
        assert_eq!(split(b"1\r2", Terminator::Cr), Some((&b"1"[..], 2)));
        assert_eq!(split(b"1", Terminator::Lf), None);
        assert_eq!(split(b"1\n", Terminator::CrLf), None);
    }

    proptest! {
        #[test]
        fn no_bytes_panic_and_no_sentinel_is_a_reading(bytes in proptest::collection::vec(any::<u8>(), 0..80)) {
            for end in [Terminator::Lf, Terminator::CrLf, Terminator::Cr] {
                let _ = split_line(&bytes, end, 0);
            }
            let _ = (identity(&bytes, 4), error_entry(&bytes), switch(&bytes));
            if let Ok(row) = readings(&bytes, &[Reading::Voltage, Reading::Power]) {
                prop_assert!(row.iter().all(|(_, value)| value.abs() < 9.89e37));
            }
        }

        #[test]
        fn numbers_are_read_back(value in -1e30f64..1e30, exponent in 0usize..3) {
            let text = match exponent {
                0 => format!("{value}"),
                1 => format!("{value:e}"),
                _ => format!("{value:+E}"),
            };
            prop_assert_eq!(number(text.as_bytes()), Ok(Number::Value(value)));
        }

        #[test]
        fn what_looks_like_a_sentinel_is_never_a_value(mantissa in 9.89f64..99.0, minus: bool) {
            let text = format!("{}{mantissa}E37", if minus { "-" } else { "" });
            let number = number(text.as_bytes()).unwrap();
            prop_assert!(number.value().is_err());
        }
    }
}
