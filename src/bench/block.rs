//! Blocks of voltage and current: IEEE 488.2 definite blocks, or a line of decimals. No I/O.
//!
//! A definite block is `#`, one digit d, d digits of byte count, the bytes, and the
//! line's end. The bytes may look like anything, so they are counted, never searched.

use std::ops::Range;

use super::codec::{self, Number};
use super::error::Fault;
use crate::quantity::Reading;
use crate::spec::driver::{BlockFormat, Terminator, WaveformQuery};

/// A block of more bytes than this is garbled.
pub const BLOCK_LIMIT: usize = 8 * 1024 * 1024;

/// What a block's bytes mean.
#[derive(Debug, Clone, PartialEq)]
pub struct BlockForm {
    gives: Vec<Reading>,
    format: BlockFormat,
    scale: (f64, f64),
}

/// Voltages and currents of a block.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Pairs {
    /// V.
    pub volts: Vec<f64>,
    /// A.
    pub amps: Vec<f64>,
}

/// A block in what was received so far.
#[derive(Debug, PartialEq, Eq)]
pub enum Found {
    /// More bytes must come; why it would be nothing if none came.
    Part(String),
    /// Where its bytes lie, and how many bytes the whole message took.
    Whole(Range<usize>, usize),
    /// It does not begin like a block.
    NoBlock,
}

/// Looks for a block at the beginning of `bytes`; blanks before it are passed over.
///
/// # Errors
/// [`Fault::Garbled`] where what begins like a block is none, or one without an end.
pub fn find(bytes: &[u8], end: Terminator) -> Result<Found, Fault> {
    let blanks = bytes.iter().take_while(|b| codec::is_blank(&[**b])).count();
    let rest = &bytes[blanks..];
    let garbled = |why: String| Err(Fault::Garbled(why));
    let digits = match rest {
        [] => return Ok(Found::Part("no block began".to_owned())),
        [b'#'] => return Ok(Found::Part("the block broke off in its head".to_owned())),
        [b'#', b'0', ..] => {
            return garbled("a block of indefinite length, which has no end on a line".to_owned());
        }
        [b'#', digit @ b'1'..=b'9', ..] => usize::from(digit - b'0'),
        [b'#', other, ..] => {
            let shown = other.escape_ascii();
            return garbled(format!("`#{shown}` begins no block"));
        }
        _ => return Ok(Found::NoBlock),
    };
    let Some(count) = rest.get(2..2 + digits) else {
        let come = &rest[2..];
        if !come.iter().all(u8::is_ascii_digit) {
            return garbled(format!(
                "`#{digits}{}` begins no block",
                come.escape_ascii()
            ));
        }
        return Ok(Found::Part("the block broke off in its head".to_owned()));
    };
    let text = std::str::from_utf8(count).unwrap_or_default();
    let length: usize = match text.parse() {
        Ok(length) if count.iter().all(u8::is_ascii_digit) => length,
        _ => {
            let shown = count.escape_ascii();
            return garbled(format!("`#{digits}{shown}` begins no block"));
        }
    };
    if length > BLOCK_LIMIT {
        return garbled(format!("a block of {length} bytes, at most {BLOCK_LIMIT}"));
    }
    let from = blanks + 2 + digits;
    let to = from + length;
    if bytes.len() < to {
        let come = bytes.len() - from;
        return Ok(Found::Part(format!(
            "the block broke off: {come} of {length} bytes"
        )));
    }
    ended(&bytes[to..], end).map(|took| match took {
        Some(took) => Found::Whole(from..to, to + took),
        None => Found::Part("the block has no line end".to_owned()),
    })
}

/// How many bytes the line's end behind a block takes; nothing where it has not come whole.
fn ended(after: &[u8], end: Terminator) -> Result<Option<usize>, Fault> {
    let last = *end.bytes().last().unwrap_or(&b'\n');
    for (n, byte) in after.iter().enumerate() {
        match *byte {
            byte if byte == last => return Ok(Some(n + 1)),
            b'\r' | b' ' => {}
            _ => {
                return Err(Fault::Garbled(
                    "more bytes than the block's length says".to_owned(),
                ));
            }
        }
    }
    Ok(None)
}

impl BlockForm {
    /// The form that a driver states.
    pub fn of(query: &WaveformQuery) -> Self {
        Self {
            gives: query.gives.clone(),
            format: query.format,
            scale: query.scale.unwrap_or((1.0, 1.0)),
        }
    }

    /// Whether a line of decimals is a reply too.
    pub fn is_text(&self) -> bool {
        self.format == BlockFormat::Text
    }

    /// What the bytes of a block, or the text of a line, mean.
    ///
    /// # Errors
    /// [`Fault::Garbled`] where they are no whole pairs, or none at all;
    /// [`Fault::Overload`] or [`Fault::NoValue`] where any of them says so.
    pub fn read(&self, bytes: &[u8]) -> Result<Pairs, Fault> {
        let numbers = self.numbers(bytes)?;
        if numbers.is_empty() {
            return Err(Fault::Garbled("the block holds no samples".to_owned()));
        }
        if !numbers.len().is_multiple_of(2) {
            return Err(Fault::Garbled(format!(
                "the block holds {} numbers: pairs of voltage and current were expected",
                numbers.len()
            )));
        }
        let voltage_first = self.gives.first() == Some(&Reading::Voltage);
        let mut pairs = Pairs::default();
        for pair in numbers.chunks_exact(2) {
            let (volts, amps) = if voltage_first {
                (pair[0], pair[1])
            } else {
                (pair[1], pair[0])
            };
            pairs.volts.push(volts * self.scale.0);
            pairs.amps.push(amps * self.scale.1);
        }
        Ok(pairs)
    }

    fn numbers(&self, bytes: &[u8]) -> Result<Vec<f64>, Fault> {
        if self.is_text() {
            if codec::is_blank(bytes) {
                return Ok(Vec::new());
            }
            return bytes
                .split(|b| *b == b',')
                .map(|field| codec::number(field).and_then(Number::value))
                .collect();
        }
        let width = self.format.width();
        if !bytes.len().is_multiple_of(width) {
            return Err(Fault::Garbled(format!(
                "the block holds {} bytes, no whole numbers of {width}",
                bytes.len()
            )));
        }
        bytes
            .chunks_exact(width)
            .map(|chunk| value(self.format, chunk))
            .collect()
    }
}

/// One number of a block; counts at either end of their range are beyond the range.
fn value(format: BlockFormat, chunk: &[u8]) -> Result<f64, Fault> {
    let wrong = |_| Fault::Garbled("a number of another width".to_owned());
    let four = || <[u8; 4]>::try_from(chunk).map_err(wrong);
    let eight = || <[u8; 8]>::try_from(chunk).map_err(wrong);
    let two = || <[u8; 2]>::try_from(chunk).map_err(wrong);
    let count = |count: i16| match count {
        i16::MIN | i16::MAX => Err(Fault::Overload),
        count => Ok(f64::from(count)),
    };
    match format {
        BlockFormat::Float32Little => real(f64::from(f32::from_le_bytes(four()?))),
        BlockFormat::Float32Big => real(f64::from(f32::from_be_bytes(four()?))),
        BlockFormat::Float64Little => real(f64::from_le_bytes(eight()?)),
        BlockFormat::Float64Big => real(f64::from_be_bytes(eight()?)),
        BlockFormat::Int16Little => count(i16::from_le_bytes(two()?)),
        BlockFormat::Int16Big => count(i16::from_be_bytes(two()?)),
        BlockFormat::Text => Err(Fault::Garbled("a text among numbers".to_owned())),
    }
}

fn real(value: f64) -> Result<f64, Fault> {
    if value.is_nan() {
        return Err(Fault::NoValue);
    }
    codec::told(value).value()
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    const LF: Terminator = Terminator::Lf;

    fn form(format: BlockFormat) -> BlockForm {
        BlockForm {
            gives: vec![Reading::Voltage, Reading::Current],
            format,
            scale: (1.0, 1.0),
        }
    }

    fn why(bytes: &[u8]) -> String {
        match find(bytes, LF) {
            Err(Fault::Garbled(why)) => why,
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn a_block_is_counted_not_searched() {
        // Read in a restatement of IEEE 488.2: the bytes may hold NL, `;`, `,` and `"`.
        assert_eq!(find(b"#15a\n;,\"\n", LF), Ok(Found::Whole(3..8, 9)));
        assert_eq!(find(b"#210##########\r\n", LF), Ok(Found::Whole(4..14, 16)));
        assert_eq!(find(b"\n #10\n", LF), Ok(Found::Whole(5..5, 6)));
        assert_eq!(
            find(b"#9000000001x\nmore", LF),
            Ok(Found::Whole(11..12, 13))
        );
        assert_eq!(find(b"#11\r\r", Terminator::Cr), Ok(Found::Whole(3..4, 5)));
        assert_eq!(find(b"230.1\n", LF), Ok(Found::NoBlock));
    }

    #[test]
    fn whatever_has_come_of_a_block_is_waited_for() {
        let whole = b"#214\n#0\r\n;12345\n56\r\n";
        for cut in 0..whole.len() {
            assert!(
                matches!(find(&whole[..cut], LF), Ok(Found::Part(_))),
                "{cut}"
            );
        }
        assert_eq!(find(whole, LF), Ok(Found::Whole(4..18, 20)));
        assert_eq!(
            find(b"#15abc", LF),
            Ok(Found::Part("the block broke off: 3 of 5 bytes".to_owned()))
        );
    }

    #[test]
    fn what_is_no_definite_block_is_garbled() {
        assert!(why(b"#0abc\n").contains("indefinite"));
        assert!(why(b"#A1\n").contains("begins no block"));
        assert!(why(b"#2x1ab\n").contains("begins no block"));
        assert!(why(b"#2+1ab\n").contains("begins no block"));
        assert!(why(b"#3 1").contains("begins no block"));
        assert!(why(b"#13abcd\n").contains("more bytes than"));
        assert!(why(b"#9999999999").contains("at most 8388608"));
        assert!(why(b"#78388609").contains("at most 8388608"));
        assert!(matches!(find(b"#78388608", LF), Ok(Found::Part(_))));
    }

    #[test]
    fn numbers_come_in_every_format() {
        let le: Vec<u8> = [325.0_f32, -1.5]
            .iter()
            .flat_map(|v| v.to_le_bytes())
            .collect();
        let be: Vec<u8> = [325.0_f32, -1.5]
            .iter()
            .flat_map(|v| v.to_be_bytes())
            .collect();
        let le8: Vec<u8> = [325.0_f64, -1.5]
            .iter()
            .flat_map(|v| v.to_le_bytes())
            .collect();
        let be8: Vec<u8> = [325.0_f64, -1.5]
            .iter()
            .flat_map(|v| v.to_be_bytes())
            .collect();
        let wanted = Pairs {
            volts: vec![325.0],
            amps: vec![-1.5],
        };
        for (format, bytes) in [
            (BlockFormat::Float32Little, le.as_slice()),
            (BlockFormat::Float32Big, &be),
            (BlockFormat::Float64Little, &le8),
            (BlockFormat::Float64Big, &be8),
            (BlockFormat::Text, b" 3.25E2, -1.5"),
        ] {
            assert_eq!(form(format).read(bytes), Ok(wanted.clone()), "{format:?}");
        }
        let counts = BlockForm {
            gives: vec![Reading::Current, Reading::Voltage],
            format: BlockFormat::Int16Big,
            scale: (0.01, 0.001),
        };
        let pairs = counts.read(&[0xff, 0x38, 0x7e, 0xf4]).unwrap();
        assert_eq!((pairs.volts[0], pairs.amps[0]), (325.0, -0.2));
    }

    #[test]
    fn what_holds_no_pairs_is_garbled_and_sentinels_are_told() {
        let little = form(BlockFormat::Float32Little);
        let fault = |bytes: &[u8]| little.read(bytes).unwrap_err();
        assert!(matches!(fault(b""), Fault::Garbled(why) if why.contains("no samples")));
        assert!(matches!(fault(b"1234567"), Fault::Garbled(why) if why.contains("no whole")));
        assert!(matches!(fault(b"1234"), Fault::Garbled(why) if why.contains("pairs")));
        let of = |a: f32| [a.to_le_bytes(), 1.0_f32.to_le_bytes()].concat();
        // SCPI-1999 as restatements give it: 9.9E37 and 9.91E37, in single precision.
        assert_eq!(fault(&of(9.9e37)), Fault::Overload);
        assert_eq!(fault(&of(9.91e37)), Fault::NoValue);
        assert_eq!(fault(&of(f32::NAN)), Fault::NoValue);
        assert_eq!(fault(&of(f32::INFINITY)), Fault::Overload);
        let counts = form(BlockFormat::Int16Little);
        assert_eq!(counts.read(&[0xff, 0x7f, 0, 0]), Err(Fault::Overload));
        assert_eq!(counts.read(&[0x00, 0x80, 0, 0]), Err(Fault::Overload));
        let text = form(BlockFormat::Text);
        assert!(matches!(text.read(b"1,x"), Err(Fault::Garbled(_))));
        assert_eq!(text.read(b"1,9.9E37"), Err(Fault::Overload));
        assert!(matches!(text.read(b" \r"), Err(Fault::Garbled(_))));
    }

    proptest! {
        #[test]
        fn any_bytes_are_framed_or_refused(bytes in prop::collection::vec(any::<u8>(), 0..60)) {
            if let Ok(Found::Whole(at, took)) = find(&bytes, LF) {
                prop_assert!(at.end <= bytes.len() && took <= bytes.len() && at.end < took);
            }
            for format in [BlockFormat::Float32Big, BlockFormat::Int16Big, BlockFormat::Text] {
                if let Ok(pairs) = form(format).read(&bytes) {
                    prop_assert!(pairs.volts.iter().chain(&pairs.amps).all(|v| v.is_finite()));
                }
            }
        }
    }
}
