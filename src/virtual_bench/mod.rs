//! The far side of the bench, simulated: an electro-thermal appliance behind
//! instruments that speak the drivers' dialects, with faults to order.
//!
//! A [`Staging`] says what is where; a [`VirtualBench`] gives a far side for each
//! line, the operator's hands, and the truth to measure the judging against.
//! Same staging, same messages at the same moments: the same bytes.

mod bay;
mod chance;
mod circuit;
mod dial;
mod dialect;
mod error_queue;
mod errors;
mod faults;
mod hands;
mod instruments;
mod line;
pub mod ode;
mod probe;
pub mod ptc;
mod scope;
#[cfg(unix)]
pub mod terminals;
mod unit;

#[cfg(test)]
mod demo_units;
#[cfg(test)]
mod tests;

use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use crate::bench::FarSide;
use crate::quantity::{Amps, Celsius, Moment, Watts};
use crate::sensor::Sensor;
use crate::spec::driver::Driver;
use crate::spec::sequence::RoleKind;
use crate::spec::virtual_unit::VirtualUnit;

use bay::Bay;
pub use chance::Chance;
pub use errors::{Drawn, Errors};
pub use faults::{Fault, Onset, ParseFaultError};
pub use hands::Hands;
use instruments::{Instrument, Wiring};
use line::Line;
use unit::Specimen;

/// One role of the bay and the instrument that fills it.
#[derive(Debug, Clone, PartialEq)]
pub struct Connection {
    /// The line's name.
    pub line: String,
    /// The instrument's name; connections with the same name share it.
    pub instrument: String,
    /// The start of its identity reply.
    pub identity: String,
    /// Its dialect and accuracy.
    pub driver: Driver,
    /// The role: `body` sits on the link's body, `ambient` in the room, `block` on
    /// the heater block, any other temperature on the enclosure.
    pub role: String,
    /// The role's kind.
    pub kind: RoleKind,
    /// The channel, where the instrument has channels.
    pub channel: Option<u32>,
    /// What hangs on it, where the bench file says so. This one deviates within its class.
    pub sensor: Option<Sensor>,
}

/// What stands on the virtual bench.
#[derive(Debug, Clone, PartialEq)]
pub struct Staging {
    /// The model of which one specimen is in the bay.
    pub unit: VirtualUnit,
    /// The switch's positions in the sequence's order; the first is number 1.
    pub positions: Vec<String>,
    /// Who fills which role.
    pub connections: Vec<Connection>,
    /// Chooses the specimen's spread, the instruments' errors and all noise.
    pub seed: u64,
    /// What is wrong.
    pub faults: Vec<Fault>,
    /// The room.
    pub ambient: Celsius,
    /// Run seconds to a wall second, as the identity replies tell it.
    pub speed: f64,
}

/// Why something can't be staged.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[expect(missing_docs, reason = "the messages say it")]
pub enum StagingError {
    #[error("line `{line}` serves `{first}` and `{second}`: a virtual line holds one instrument")]
    SharedLine {
        line: String,
        first: String,
        second: String,
    },
    #[error("virtual unit `{model}` has no position `{position}`; it has {}", has.join(", "))]
    NoSuchPosition {
        model: String,
        position: String,
        has: Vec<String>,
    },
    #[error(
        "position `{position}` of virtual unit `{model}` feeds `{element}`, which is no element of it"
    )]
    NoSuchElement {
        model: String,
        position: String,
        element: String,
    },
}

/// What is true at a moment, without any instrument between.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Truth {
    /// Heater block.
    pub block: Celsius,
    /// The thermal link's body.
    pub link: Celsius,
    /// Enclosure.
    pub enclosure: Celsius,
    /// Room.
    pub ambient: Celsius,
    /// Active power.
    pub power: Watts,
    /// Current, RMS with its DC part.
    pub current: Amps,
    /// Whether the thermal link has opened.
    pub link_open: bool,
}

/// A virtual bench; clones share it.
#[derive(Debug, Clone)]
pub struct VirtualBench {
    bay: Arc<Mutex<Bay>>,
    seed: u64,
    faults: Arc<[Fault]>,
}

impl VirtualBench {
    /// Stages a bench.
    ///
    /// # Errors
    /// Where two instruments share a line, or the unit lacks a position or element.
    pub fn new(staging: Staging) -> Result<Self, StagingError> {
        Self::with_errors(staging, &Errors::default())
    }

    /// Stages a bench whose instruments err as `errors` says.
    ///
    /// # Errors
    /// As [`VirtualBench::new`].
    pub fn with_errors(staging: Staging, errors: &Errors) -> Result<Self, StagingError> {
        check_elements(&staging.unit)?;
        let positions = switch_order(&staging)?;
        let instruments = instruments(&staging, errors)?;
        let ambient = staging.ambient.get();
        let specimen = Specimen::new(
            &staging.unit,
            &positions,
            staging.seed,
            &staging.faults,
            ambient,
        );
        let has_output = |i: &Instrument| i.driver.settings.output_on.is_some();
        // Without a supply that can be switched the bay hangs on the mains.
        let on = !instruments.iter().any(has_output);
        let mut bay = Bay {
            wiring: Wiring {
                volts: if on { 230.0 } else { 0.0 },
                hertz: 50.0,
                on,
                position: 0,
                positions: positions.len(),
            },
            conditions: staging
                .unit
                .conditions
                .iter()
                .map(|c| (c.name.value.clone(), c.loss_factor))
                .collect(),
            positions: staging.positions,
            instruments,
            specimen,
            loss_factor: 1.0,
            switching: Chance::of(staging.seed, "switching"),
            switched_on: 0,
            supply_gain: 1.0 + errors.supply,
            offs: 0,
            now: 0,
        };
        bay.redrive();
        Ok(Self {
            bay: Arc::new(Mutex::new(bay)),
            seed: staging.seed,
            faults: staging.faults.into(),
        })
    }

    /// The far side of a line; behind a line that the staging does not name
    /// nobody answers.
    pub fn far_side(&self, line: &str) -> Box<dyn FarSide> {
        let bay = Arc::clone(&self.bay);
        Box::new(Line::new(bay, line, self.seed, &self.faults))
    }

    /// The operator's hands.
    pub fn hands(&self) -> Hands {
        Hands::at(Arc::clone(&self.bay))
    }

    /// Whether the supply's output is on.
    pub fn output_is_on(&self) -> bool {
        self.bay().wiring.on
    }

    /// How many OFF commands the supply has been sent.
    pub fn offs_seen(&self) -> usize {
        self.bay().offs
    }

    /// What is true at `now`, or at the latest moment at which anything happened,
    /// whichever is later.
    pub fn truth(&self, now: Moment) -> Truth {
        let mut bay = self.bay();
        bay.advance(now.as_micros());
        let state = bay.state();
        let celsius = |t: f64| Celsius::new(t).unwrap_or_default();
        Truth {
            block: celsius(state.block),
            link: celsius(state.link),
            enclosure: celsius(state.enclosure),
            ambient: celsius(state.ambient),
            power: Watts::new(state.watts).unwrap_or_default(),
            current: Amps::new(state.amps).unwrap_or_default(),
            link_open: bay.specimen.link_open(),
        }
    }

    fn bay(&self) -> MutexGuard<'_, Bay> {
        self.bay.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

/// The instruments of the connections, in the order in which they come.
fn instruments(staging: &Staging, errors: &Errors) -> Result<Vec<Instrument>, StagingError> {
    let all = &staging.connections;
    let mut instruments: Vec<Instrument> = Vec::new();
    for first in all {
        if instruments.iter().any(|i| i.name == first.instrument) {
            continue;
        }
        if let Some(other) = instruments.iter().find(|i| i.line == first.line) {
            return Err(StagingError::SharedLine {
                line: first.line.clone(),
                first: other.name.clone(),
                second: first.instrument.clone(),
            });
        }
        let of_it: Vec<&Connection> = all
            .iter()
            .filter(|c| c.instrument == first.instrument)
            .collect();
        instruments.push(Instrument::new(first, &of_it, staging, errors));
    }
    Ok(instruments)
}

/// The unit's positions in the sequence's order.
fn switch_order(staging: &Staging) -> Result<Vec<usize>, StagingError> {
    let has = &staging.unit.positions;
    let number = |position: &String| {
        has.iter()
            .position(|p| *p.name == *position)
            .ok_or_else(|| StagingError::NoSuchPosition {
                model: staging.unit.model.value.clone(),
                position: position.clone(),
                has: has.iter().map(|p| p.name.value.clone()).collect(),
            })
    };
    staging.positions.iter().map(number).collect()
}

fn check_elements(unit: &VirtualUnit) -> Result<(), StagingError> {
    for position in &unit.positions {
        for element in &position.elements {
            if !unit.elements.iter().any(|e| e.name.value == element.value) {
                return Err(StagingError::NoSuchElement {
                    model: unit.model.value.clone(),
                    position: position.name.value.clone(),
                    element: element.value.clone(),
                });
            }
        }
    }
    Ok(())
}
