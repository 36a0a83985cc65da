//! SHA-256 of files, by which a record shows that nobody edited it.

use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use sha2::{Digest, Sha256};

/// SHA-256 of `bytes` in lower-case hexadecimal.
pub fn sha256_of(bytes: &[u8]) -> String {
    hex(&Sha256::digest(bytes))
}

/// SHA-256 of a file's content in lower-case hexadecimal, read in pieces.
///
/// # Errors
/// Where the file can't be opened or read.
pub fn sha256_of_file(path: &Path) -> io::Result<String> {
    sha256_of_all(File::open(path)?)
}

/// SHA-256 of all that `file` still holds, read in pieces.
///
/// # Errors
/// Where it can't be read.
pub fn sha256_of_all(mut file: impl Read) -> io::Result<String> {
    let mut state = Sha256::new();
    let mut piece = vec![0; 64 * 1024];
    loop {
        let n = file.read(&mut piece)?;
        if n == 0 {
            return Ok(hex(&state.finalize()));
        }
        state.update(&piece[..n]);
    }
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|b| format!("{b:02x}")).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_published_test_vector_is_met() {
        // FIPS 180-4 example: SHA-256 of "abc".
        let expected = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
        assert_eq!(sha256_of(b"abc"), expected);
    }
}
