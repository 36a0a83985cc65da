//! What a line is told at its opening: its instruments, and who listens.

use tokio::sync::mpsc::UnboundedSender;

use super::order::Polled;
use crate::quantity::Moment;
use crate::spec::bench::Port;
use crate::spec::driver::Driver;

/// One instrument on a line.
#[derive(Debug, Clone)]
pub struct InstrumentSetup {
    /// Its name in the bench file.
    pub name: String,
    /// The start of its identity reply.
    pub identity: String,
    /// Its dialect.
    pub driver: Driver,
}

/// A line and what is on it.
#[derive(Debug, Clone)]
pub struct LineSetup {
    /// Its name in the bench file.
    pub name: String,
    /// What is behind it.
    pub port: Port,
    /// The instruments that share it, in the order in which they are numbered.
    pub instruments: Vec<InstrumentSetup>,
}

impl LineSetup {
    /// The port as messages name it.
    pub(super) fn port_name(&self) -> &str {
        match &self.port {
            Port::Virtual => "virtual",
            Port::Serial(settings) => &settings.path,
        }
    }
}

/// Hears every byte that passes; called by the pump, so it must be quick.
pub trait Tap: Send {
    /// Bytes were written to the line.
    fn sent(&mut self, line: &str, at: Moment, bytes: &[u8]);
    /// Bytes came from the line.
    fn received(&mut self, line: &str, at: Moment, bytes: &[u8]);
}

/// Is told of every OFF, after it was sent.
pub trait Witness: Send {
    /// OFF was sent to `instrument` at `at` because of `cause`; `confirmed` where
    /// the output was read back as off.
    fn off(&mut self, at: Moment, instrument: &str, cause: &str, confirmed: bool);
}

/// Everybody who listens to a line.
pub struct Ears {
    /// Hears the bytes.
    pub tap: Box<dyn Tap>,
    /// Is told of each OFF.
    pub witness: Box<dyn Witness>,
    /// Takes the polled samples.
    pub samples: UnboundedSender<Polled>,
}
