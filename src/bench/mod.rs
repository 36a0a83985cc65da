//! The bench: SCPI codec, exchanges and poller without I/O; line threads and the
//! simulated pump that drive them; the lease that keeps a unit energised.

mod far_side;

pub use far_side::FarSide;
