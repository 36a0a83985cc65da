//! A serial port as a line thread uses it: every call is bounded, and what means
//! that the port is gone is told apart from what means "not yet".
//!
//! Traps that were measured: a write is bounded by the port's time-out only in small
//! pieces; a vanished adapter shows as an empty read, a broken pipe or an I/O error;
//! flushing is unbounded; a clone's drop unlocks the port. So: pieces of 64 bytes
//! with a deadline of our own, no flush, no clone.

use std::io::{ErrorKind, Read, Write};
use std::time::Duration;

use crate::clock::Deadline;

use serialport::{ClearBuffer, DataBits, SerialPort, StopBits};

use super::error::OpenError;
use crate::spec::bench::{Parity, SerialSettings};

/// Longest wait of a single call, and so how often urgent things are looked at.
pub(super) const CALL: Duration = Duration::from_millis(20);
/// Largest piece of a write.
const PIECE: usize = 64;

/// The port is gone; in the system's words.
#[derive(Debug)]
pub(super) struct Gone(pub String);

/// An open port.
pub(super) struct Wire {
    port: Box<dyn SerialPort>,
}

/// Opens a port; a speed of 0 leaves it as it is, as pseudo-terminals want it.
pub(super) fn open(line: &str, settings: &SerialSettings) -> Result<Wire, OpenError> {
    let parity = match settings.parity {
        Parity::None => serialport::Parity::None,
        Parity::Odd => serialport::Parity::Odd,
        Parity::Even => serialport::Parity::Even,
    };
    let data_bits = match settings.data_bits {
        7 => DataBits::Seven,
        _ => DataBits::Eight,
    };
    let stop_bits = match settings.stop_bits {
        2 => StopBits::Two,
        _ => StopBits::One,
    };
    let port = serialport::new(&settings.path, settings.baud)
        .data_bits(data_bits)
        .parity(parity)
        .stop_bits(stop_bits)
        .timeout(CALL)
        .open()
        .map_err(|error| open_error(line, &settings.path, &error))?;
    // What came before is no reply to anything; a port that cannot clear is read empty.
    let _ = port.clear(ClearBuffer::Input);
    Ok(Wire { port })
}

fn open_error(line: &str, path: &str, error: &serialport::Error) -> OpenError {
    let (line, path) = (line.to_owned(), path.to_owned());
    match error.kind {
        serialport::ErrorKind::Io(ErrorKind::NotFound) => OpenError::NotFound {
            line,
            path,
            available: available(),
        },
        serialport::ErrorKind::Io(ErrorKind::PermissionDenied) => {
            OpenError::Permission { line, path }
        }
        // Held by somebody, or (on some systems) not there: then it is not listed either.
        serialport::ErrorKind::NoDevice if std::path::Path::new(&path).exists() => {
            OpenError::Busy { line, path }
        }
        serialport::ErrorKind::NoDevice => OpenError::NotFound {
            line,
            path,
            available: available(),
        },
        _ => OpenError::Unusable {
            line,
            path,
            why: error.description.clone(),
        },
    }
}

fn available() -> Vec<String> {
    let ports = serialport::available_ports().unwrap_or_default();
    let mut names: Vec<String> = ports.into_iter().map(|port| port.port_name).collect();
    names.sort();
    names
}

impl Wire {
    /// Writes all of `bytes` within `within`; false where the port took only a part.
    pub(super) fn write(&mut self, bytes: &[u8], within: Duration) -> Result<bool, Gone> {
        let deadline = Deadline::within(within);
        let mut left = bytes;
        while !left.is_empty() {
            let piece = &left[..left.len().min(PIECE)];
            match self.port.write(piece) {
                Ok(n) => left = &left[n.min(left.len())..],
                Err(error) => not_yet(&error)?,
            }
            if !left.is_empty() && deadline.has_passed() {
                return Ok(false);
            }
        }
        Ok(true)
    }

    /// Reads what is there, waiting for at most one [`CALL`]; 0 where nothing came.
    pub(super) fn read(&mut self, buffer: &mut [u8]) -> Result<usize, Gone> {
        match self.port.read(buffer) {
            // A port that is readable and empty is one that was unplugged.
            Ok(0) => Err(Gone("the port reads as ended".to_owned())),
            Ok(n) => Ok(n),
            Err(error) => not_yet(&error).map(|()| 0),
        }
    }

    /// Whether bytes wait to be read.
    pub(super) fn has_bytes(&self) -> Result<bool, Gone> {
        match self.port.bytes_to_read() {
            Ok(n) => Ok(n > 0),
            Err(error) => Err(Gone(error.description)),
        }
    }
}

fn not_yet(error: &std::io::Error) -> Result<(), Gone> {
    match error.kind() {
        ErrorKind::TimedOut | ErrorKind::Interrupted | ErrorKind::WouldBlock => Ok(()),
        _ => Err(Gone(error.to_string())),
    }
}
