//! The far side of a line, as the simulated pump calls it.

use crate::quantity::Moment;

/// What is at the other end of a line's bytes.
pub trait FarSide: Send {
    /// Bytes arrive from this side.
    fn receive(&mut self, bytes: &[u8], now: Moment);
    /// Appends what has come back by `now`.
    fn deliver(&mut self, now: Moment, out: &mut Vec<u8>);
    /// When there will be something to deliver.
    fn due(&self) -> Option<Moment>;
}
