//! What can go wrong on a line, with everything that is needed to find out why.

use std::fmt;

use crate::quantity::Seconds;

/// Bytes of a message that an error shows at most.
const SHOWN: usize = 200;

/// Why an exchange failed.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum Fault {
    /// Nothing came in time.
    #[error("no reply")]
    NoReply,
    /// Something came that is no reply; why it is none.
    #[error("garbled reply: {0}")]
    Garbled(String),
    /// The instrument says that the value is beyond its range.
    #[error("overload")]
    Overload,
    /// The instrument says that it has no value.
    #[error("no value")]
    NoValue,
    /// The port is gone, or the line has ended.
    #[error("line lost: {0}")]
    Lost(String),
    /// Another instrument answers.
    #[error("wrong identity: expected a reply that starts with `{expected}`")]
    WrongIdentity {
        /// The start that was expected.
        expected: String,
    },
    /// The instrument's error queue held an entry.
    #[error("the instrument reports error {code}, \"{text}\"")]
    Reported {
        /// Its number.
        code: i32,
        /// Its text.
        text: String,
    },
    /// Reading back found something else.
    #[error("not confirmed: wanted {wanted}, found {found}")]
    NotConfirmed {
        /// What was set.
        wanted: String,
        /// What was read back.
        found: String,
    },
    /// It was not sent at all.
    #[error("not possible: {0}")]
    Refused(String),
}

/// Where an exchange failed and what passed.
#[derive(Debug, Clone, PartialEq)]
pub struct ExchangeDetail {
    /// The line's name.
    pub line: String,
    /// Its port.
    pub port: String,
    /// The instrument's name.
    pub instrument: String,
    /// The bytes sent, escaped; empty where nothing was sent.
    pub sent: String,
    /// The bytes received since the last request, escaped and shortened.
    pub received: String,
    /// From the first request to giving up, in run time.
    pub waited: Seconds,
    /// How often it was tried.
    pub tries: u32,
    /// Why.
    pub fault: Fault,
}

/// An exchange that failed; reads as [`ExchangeDetail`].
#[derive(Debug, Clone, PartialEq)]
pub struct ExchangeError(Box<ExchangeDetail>);

impl From<ExchangeDetail> for ExchangeError {
    fn from(detail: ExchangeDetail) -> Self {
        Self(Box::new(detail))
    }
}

impl std::ops::Deref for ExchangeError {
    type Target = ExchangeDetail;
    fn deref(&self) -> &ExchangeDetail {
        &self.0
    }
}

impl fmt::Display for ExchangeError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let ExchangeDetail {
            line,
            port,
            instrument,
            sent,
            received,
            waited,
            tries,
            fault,
        } = &**self;
        write!(f, "{instrument} on line {line} ({port}): {fault}")?;
        if sent.is_empty() {
            return Ok(());
        }
        let times = if *tries == 1 { "try" } else { "tries" };
        write!(
            f,
            " (sent \"{sent}\", received \"{received}\", waited {waited}, {tries} {times})"
        )
    }
}

impl std::error::Error for ExchangeError {}

/// Bytes as printable ASCII, shortened to a readable length; `total` bytes came in all.
pub(super) fn escaped(bytes: &[u8], total: usize) -> String {
    let shown = &bytes[..bytes.len().min(SHOWN)];
    let text = shown.escape_ascii().to_string();
    if shown.len() < total {
        format!("{text}... ({total} bytes)")
    } else {
        text
    }
}

/// Why a line could not be opened.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum OpenError {
    /// There is no such port.
    #[error("line {line}: port {path} not found")]
    NotFound {
        /// The line's name.
        line: String,
        /// The port.
        path: String,
        /// Ports that are there.
        available: Vec<String>,
    },
    /// The user may not open it.
    #[error("line {line}: no permission to open port {path}")]
    Permission {
        /// The line's name.
        line: String,
        /// The port.
        path: String,
    },
    /// Somebody else holds it.
    #[error("line {line}: port {path} is busy")]
    Busy {
        /// The line's name.
        line: String,
        /// The port.
        path: String,
    },
    /// It is no serial port, or it refuses its settings.
    #[error("line {line}: port {path} cannot be used: {why}")]
    Unusable {
        /// The line's name.
        line: String,
        /// The port.
        path: String,
        /// In the system's words.
        why: String,
    },
}

impl OpenError {
    /// What to do about it.
    pub fn hint(&self) -> String {
        match self {
            OpenError::NotFound { available, .. } if available.is_empty() => {
                "no serial port is there at all: is the adapter plugged in?".to_owned()
            }
            OpenError::NotFound { available, .. } => {
                format!("ports that are there: {}", available.join(", "))
            }
            OpenError::Permission { .. } => {
                "on most systems serial ports belong to a group (often dialout or uucp) \
                 that the user must be a member of"
                    .to_owned()
            }
            OpenError::Busy { .. } => "close the other program that holds the port".to_owned(),
            OpenError::Unusable { .. } => {
                "check that the path is a serial port and that it can do the bench file's settings"
                    .to_owned()
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_error_names_everything_that_a_technician_needs() {
        let error = ExchangeError::from(ExchangeDetail {
            line: "meter".into(),
            port: "/dev/ttyUSB0".into(),
            instrument: "power meter".into(),
            sent: escaped(b"MEAS:POW?\n", 10),
            received: escaped(b"2\xff", 2),
            waited: Seconds::of(1.5),
            tries: 3,
            fault: Fault::Garbled("`2` is cut off".into()),
        });
        assert_eq!(
            error.to_string(),
            "power meter on line meter (/dev/ttyUSB0): garbled reply: `2` is cut off \
             (sent \"MEAS:POW?\\n\", received \"2\\xff\", waited 1.5 s, 3 tries)"
        );
    }

    #[test]
    fn long_replies_are_shortened() {
        let text = escaped(&[b'a'; 256], 1 << 20);
        assert!(text.ends_with("a... (1048576 bytes)"), "{text}");
        assert!(text.len() < 300);
    }

    #[test]
    fn hints_say_what_to_do() {
        let error = OpenError::NotFound {
            line: "meter".into(),
            path: "/dev/ttyUSB7".into(),
            available: vec!["/dev/ttyUSB0".into()],
        };
        assert_eq!(error.to_string(), "line meter: port /dev/ttyUSB7 not found");
        assert_eq!(error.hint(), "ports that are there: /dev/ttyUSB0");
    }
}
