//! Every integration test, one module per subject.

#![forbid(unsafe_code)]

mod bad_input;
mod bench_of_tests;
mod disk;
mod faults;
mod judging;
mod opening;
mod raw_sensors;
mod readme;
mod rehearsal;
#[cfg(unix)]
mod serial;
mod settling;
mod shipped;
mod tidy;
mod waveforms;
mod ways_out;
