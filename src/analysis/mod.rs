//! Inrush, steady state, temperatures and their uncertainty, from the closed
//! record alone. Cannot fail: absent values carry a reason.

mod types;

pub use types::{
    Analysis, CellResult, Drawn, Estimate, Figure, Inrush, Looked, Peak, Share, Steady,
};
