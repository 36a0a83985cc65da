//! From bytes to typed values, with every problem on the way.

use super::bench::Bench;
use super::driver::Driver;
use super::fields::{Field, Notes};
use super::sequence::Sequence;
use super::virtual_unit::VirtualUnit;
use super::{Problem, Weight, decode, yaml};

/// What came of reading a file.
#[derive(Debug, Clone, PartialEq)]
pub struct Loaded<T> {
    /// The value; there if and only if no problem is an error.
    pub value: Option<T>,
    /// One error of syntax, or every problem of meaning in the order of the file.
    pub problems: Vec<Problem>,
}

/// Reads a sequence file; `name` is what messages call it.
pub fn load_sequence(name: &str, bytes: &[u8]) -> Loaded<Sequence> {
    load(name, bytes, "the sequence", decode::sequence)
}

/// Reads a bench file; `name` is what messages call it.
pub fn load_bench(name: &str, bytes: &[u8]) -> Loaded<Bench> {
    load(name, bytes, "the bench", decode::bench)
}

/// Reads a driver file; `name` is what messages call it.
pub fn load_driver(name: &str, bytes: &[u8]) -> Loaded<Driver> {
    load(name, bytes, "the driver", decode::driver)
}

/// Reads a virtual unit's file; `name` is what messages call it.
pub fn load_virtual_unit(name: &str, bytes: &[u8]) -> Loaded<VirtualUnit> {
    load(name, bytes, "the virtual unit", decode::virtual_unit)
}

fn load<T>(
    name: &str,
    bytes: &[u8],
    what: &str,
    decode: impl FnOnce(Field<'_>) -> Option<T>,
) -> Loaded<T> {
    let root = match yaml::read(name, bytes) {
        Ok(root) => root,
        Err(problem) => {
            return Loaded {
                value: None,
                problems: vec![problem],
            };
        }
    };
    let notes = Notes::default();
    let value = decode(Field::root(&root, what, &notes));
    let mut problems = notes.into_problems();
    let failed = problems.iter().any(|p| p.weight == Weight::Error);
    if value.is_none() && !failed {
        // Holds the promise of `value` against a decoder that gives up silently.
        problems.push(Problem::error(&root.place, format!("{what} can't be read")));
    }
    Loaded {
        value: value.filter(|_| !failed),
        problems,
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use crate::spec::shipped::{DRIVERS, SEQUENCES, Shipped, VIRTUAL_BENCH, VIRTUAL_UNITS};
    use crate::spec::wrong_files::Kind;
    use crate::spec::{Problem, Weight, render};

    /// What holds of every outcome, whatever the bytes.
    fn sound(bytes: &[u8]) {
        for kind in [
            Kind::Sequence,
            Kind::Bench,
            Kind::Driver("power-meter"),
            Kind::VirtualUnit,
        ] {
            let (value, problems) = kind.load(bytes);
            let failed = problems.iter().any(|p| p.weight == Weight::Error);
            assert_eq!(value, !failed, "{problems:?}");
            problems.iter().for_each(in_place);
            render(&problems);
        }
    }

    fn in_place(problem: &Problem) {
        let (text, bytes) = (&problem.place.source.text, &problem.place.bytes);
        assert!(text.get(bytes.clone()).is_some(), "{problem:?}");
        assert!(!problem.message.contains(char::is_control), "{problem:?}");
        assert!(problem.hint.is_some(), "{problem:?}");
    }

    fn all_shipped() -> Vec<Shipped> {
        let mut all = vec![VIRTUAL_BENCH];
        for some in [SEQUENCES, DRIVERS, VIRTUAL_UNITS] {
            all.extend_from_slice(some);
        }
        all
    }

    /// Pieces that mean something in YAML or to the decoders.
    const PIECES: &[&str] = &[
        "\t",
        "\n",
        "\n\n",
        " ",
        "  ",
        ":",
        ": ",
        "- ",
        "-",
        "{",
        "}",
        "[",
        "]",
        ",",
        "\"",
        "'",
        "#",
        " #",
        "&a ",
        "*a",
        "!",
        "!!str ",
        "|",
        ">",
        "---\n",
        "...\n",
        "%",
        "@",
        "~",
        "null",
        "?",
        "? ",
        "<<: ",
        "0",
        "-",
        ".nan",
        ".inf",
        "1e999",
        " to ",
        " V",
        " W",
        " °C",
        "%",
        "ü",
        "\u{FEFF}",
        "\u{0}",
        "\u{1b}",
        "\r\n",
        "{value}",
        "{channel}",
        "each: ",
        "\u{2028}",
    ];

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(192))]

        #[test]
        fn random_bytes_never_panic(bytes in proptest::collection::vec(any::<u8>(), 0..400)) {
            sound(&bytes);
        }

        #[test]
        fn random_pieces_never_panic(picks in proptest::collection::vec(0..PIECES.len(), 0..60)) {
            let text: String = picks.into_iter().map(|i| PIECES[i]).collect();
            sound(text.as_bytes());
        }

        #[test]
        fn random_changes_of_shipped_files_never_panic(
            file in 0..13_usize,
            changes in proptest::collection::vec((any::<u16>(), 0..12_usize, 0..PIECES.len()), 1..6),
        ) {
            let files = all_shipped();
            let mut bytes = files[file % files.len()].text.as_bytes().to_vec();
            for (at, removed, piece) in changes {
                let start = usize::from(at) % (bytes.len() + 1);
                let end = (start + removed).min(bytes.len());
                bytes.splice(start..end, PIECES[piece].bytes());
            }
            sound(&bytes);
        }

        #[test]
        fn a_shipped_file_cut_anywhere_never_panics(file in 0..13_usize, at in any::<u16>()) {
            let files = all_shipped();
            let bytes = files[file % files.len()].text.as_bytes();
            sound(&bytes[..usize::from(at) % (bytes.len() + 1)]);
        }
    }
}
