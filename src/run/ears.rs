//! What lines tell the bay beside samples: the bytes that passed and every OFF.
//! Sent through a channel, so that no line ever waits for a disk.

use tokio::sync::mpsc::{UnboundedReceiver, UnboundedSender, unbounded_channel};

use crate::bench::{Ears, Polled, Tap, Witness};
use crate::quantity::Moment;
use crate::record::Way;

/// One thing that a line told.
#[derive(Debug, Clone, PartialEq)]
pub enum Told {
    /// Bytes that passed.
    Wire {
        /// Line.
        line: String,
        /// When.
        at: Moment,
        /// Which way.
        way: Way,
        /// What.
        bytes: Vec<u8>,
    },
    /// OFF was sent.
    Off {
        /// When.
        at: Moment,
        /// Instrument.
        instrument: String,
        /// Why.
        cause: String,
        /// Whether it was read back.
        confirmed: bool,
    },
}

/// The bay's end of everything that its lines say.
#[derive(Debug)]
pub struct Heard {
    /// Samples.
    pub samples: UnboundedReceiver<Polled>,
    /// Bytes and OFFs.
    pub told: UnboundedReceiver<Told>,
}

/// The lines' end; one [`Ears`] is made for each line.
#[derive(Debug, Clone)]
pub struct Mouth {
    samples: UnboundedSender<Polled>,
    told: UnboundedSender<Told>,
}

/// Both ends of a bay's hearing.
pub fn hearing() -> (Mouth, Heard) {
    let (samples_in, samples) = unbounded_channel();
    let (told_in, told) = unbounded_channel();
    (
        Mouth {
            samples: samples_in,
            told: told_in,
        },
        Heard { samples, told },
    )
}

impl Mouth {
    /// Ears for one line.
    pub fn ears(&self) -> Ears {
        Ears {
            tap: Box::new(Teller(self.told.clone())),
            witness: Box::new(Teller(self.told.clone())),
            samples: self.samples.clone(),
        }
    }
}

/// A closed channel means that the bay is gone; the line's lease then ends by itself.
struct Teller(UnboundedSender<Told>);

impl Tap for Teller {
    fn sent(&mut self, line: &str, at: Moment, bytes: &[u8]) {
        self.wire(line, at, Way::Sent, bytes);
    }

    fn received(&mut self, line: &str, at: Moment, bytes: &[u8]) {
        self.wire(line, at, Way::Received, bytes);
    }
}

impl Teller {
    fn wire(&self, line: &str, at: Moment, way: Way, bytes: &[u8]) {
        let told = Told::Wire {
            line: line.to_owned(),
            at,
            way,
            bytes: bytes.to_vec(),
        };
        let _ = self.0.send(told);
    }
}

impl Witness for Teller {
    fn off(&mut self, at: Moment, instrument: &str, cause: &str, confirmed: bool) {
        let (instrument, cause) = (instrument.to_owned(), cause.to_owned());
        let _ = self.0.send(Told::Off {
            at,
            instrument,
            cause,
            confirmed,
        });
    }
}
