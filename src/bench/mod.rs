//! The bench: SCPI codec, exchanges and lines without I/O; the line threads and
//! the simulated pump that drive them; the lease that keeps a unit energised.
//!
//! ```text
//! LineHandle ──orders──► Line ──requests──► Exchange ──bytes──► codec
//!    Lease ····guards····► │                                       (no I/O up to here)
//!                          └── driven by a line thread (serial port)
//!                              or the simulated pump (a FarSide in memory)
//! ```
//!
//! The room knows no record: what passes on the wire goes to a [`Tap`], each OFF
//! to a [`Witness`], each polled sample into a channel ([`Ears`]).

mod block;
mod codec;
mod error;
mod exchange;
mod handle;
mod lease;
mod line;
mod order;
mod request;
mod serial;
mod setup;
mod simulated;
mod thread;
mod work;

pub use error::{ExchangeDetail, ExchangeError, Fault, OpenError};
pub use handle::LineHandle;
pub use lease::{Lease, OffConfirmed};
pub use order::{Change, Identity, Poll, Polled};
pub use setup::{Ears, InstrumentSetup, LineSetup, Tap, Witness};
pub use simulated::{FarSide, simulated_line};
pub use thread::serial_line;

#[cfg(test)]
mod tests;
