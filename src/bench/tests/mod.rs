//! Tests of whole lines against a scripted far side.

mod exchanges;
mod leases;
mod orders;
mod polls;
mod scripted;
mod shared;
#[cfg(unix)]
mod terminals;
mod waveforms;
