//! Walks a plan: one task per bay, guards, prompts, stop. Every way out de-energises.

mod bay;
mod convert;
mod ears;
mod goal;
mod guard;
mod operator;
mod preflight;
mod walk;
mod waveform;

pub use bay::{Bay, Observer, SharedJournal, lock};
pub use ears::{Heard, Mouth, Told, hearing};
pub use guard::{Trip, Watchman};
pub use operator::{Answering, Operator, Prompt, Reply, Want, understand};
pub use preflight::Permissions;
pub use walk::{Ended, run};

use crate::bench::{InstrumentSetup, LineSetup};
use crate::plan::Plan;

/// The lines of a plan as `bench` opens them, in the plan's order.
pub fn line_setups(plan: &Plan) -> Vec<LineSetup> {
    let of_line = |number: usize| {
        let on_it = plan.instruments.iter().filter(move |i| i.line == number);
        let setup = |i: &crate::plan::PlannedInstrument| InstrumentSetup {
            name: i.name.clone(),
            identity: i.identity.clone(),
            driver: i.driver.clone(),
        };
        on_it.map(setup).collect()
    };
    plan.lines
        .iter()
        .enumerate()
        .map(|(number, line)| LineSetup {
            name: line.name.clone(),
            port: line.port.clone(),
            instruments: of_line(number),
        })
        .collect()
}
