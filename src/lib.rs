//! `rateplate` takes a plug-in appliance from the carton to a defensible verdict.
//!
//! Data flows one way:
//!
//! ```text
//! sequences/*.yaml ┐
//! bench.yaml       ├─► spec ─► plan ─► run ─► record ═╪═► analysis ─► judge ─► chart
//! drivers/*.yaml   ┘                    │▲            ║
//!                                       ▼│            ║ the wall: right of it, only what
//!                                      bench          ║ the record folder holds
//!                                       │▲
//!                                       ▼│
//!                 instruments on serial lines, or virtual_bench
//! ```

#![forbid(unsafe_code)]

pub mod quantity;

pub mod clock;
pub mod sensor;
pub mod stats;

pub mod settle;
pub mod spec;

pub mod plan;

pub mod bench;
pub mod virtual_bench;

pub mod record;

pub mod run;

pub mod analysis;

pub mod judge;

pub mod chart;

pub mod cli;
