//! An instrument's error queue: first in, first out, ten places; when it runs
//! over, the newest place says so (SCPI-1999 21.8).

use std::collections::VecDeque;
use std::io::Write;

/// Places in the queue.
const PLACES: usize = 10;

/// Errors of a message (SCPI-1999 21.8).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum DeviceError {
    /// The parameter is not of the right kind.
    DataType,
    /// No such message.
    UndefinedHeader,
    /// The parameter is outside of what the instrument can do.
    OutOfRange,
    /// The instrument's own trouble.
    Specific,
    /// Errors were lost.
    QueueOverflow,
    /// More bytes than the input holds, without an end.
    InputOverrun,
}

impl DeviceError {
    /// Number and text.
    pub fn parts(self) -> (i32, &'static str) {
        match self {
            DeviceError::DataType => (-104, "Data type error"),
            DeviceError::UndefinedHeader => (-113, "Undefined header"),
            DeviceError::OutOfRange => (-222, "Data out of range"),
            DeviceError::Specific => (-300, "Device-specific error"),
            DeviceError::QueueOverflow => (-350, "Queue overflow"),
            DeviceError::InputOverrun => (-363, "Input buffer overrun"),
        }
    }
}

/// The queue.
#[derive(Debug, Clone, Default)]
pub struct ErrorQueue {
    errors: VecDeque<DeviceError>,
}

impl ErrorQueue {
    /// Puts an error in.
    pub fn push(&mut self, error: DeviceError) {
        if self.errors.len() < PLACES {
            self.errors.push_back(error);
        } else if let Some(newest) = self.errors.back_mut() {
            *newest = DeviceError::QueueOverflow;
        }
    }

    /// Empties it.
    pub fn clear(&mut self) {
        self.errors.clear();
    }

    /// Takes the oldest out and writes it, `0,"No error"` where there is none.
    pub fn answer(&mut self, out: &mut Vec<u8>) {
        let (code, text) = match self.errors.pop_front() {
            Some(error) => error.parts(),
            None => (0, "No error"),
        };
        // Writing to memory does not fail.
        let _ = write!(out, "{code},\"{text}\"");
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn next(queue: &mut ErrorQueue) -> String {
        let mut out = Vec::new();
        queue.answer(&mut out);
        String::from_utf8(out).unwrap()
    }

    #[test]
    fn errors_leave_in_the_order_in_which_they_came() {
        let mut queue = ErrorQueue::default();
        queue.push(DeviceError::UndefinedHeader);
        queue.push(DeviceError::OutOfRange);
        assert_eq!(next(&mut queue), "-113,\"Undefined header\"");
        assert_eq!(next(&mut queue), "-222,\"Data out of range\"");
        assert_eq!(next(&mut queue), "0,\"No error\"");
    }

    #[test]
    fn the_last_place_tells_of_an_overflow() {
        let mut queue = ErrorQueue::default();
        for _ in 0..12 {
            queue.push(DeviceError::UndefinedHeader);
        }
        let all: Vec<String> = (0..11).map(|_| next(&mut queue)).collect();
        assert_eq!(all[8], "-113,\"Undefined header\"");
        assert_eq!(all[9], "-350,\"Queue overflow\"");
        assert_eq!(all[10], "0,\"No error\"");
    }
}
