//! The population: each unit is a draw around the appliance's file.

use super::setting::{Kind, Setting};
use crate::quantity::{Celsius, Ohms};
use crate::spec::virtual_unit::{Resistance, VirtualUnit};
use crate::virtual_bench::{Chance, Fault};

/// The room, degC: even between these.
const ROOM: (f64, f64) = (22.0, 24.0);
/// The supply's true voltage lies off by up to this share, evenly.
const SUPPLY: f64 = 0.005;

/// How the units of a population are spread.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Spread {
    /// As a production around its plate: power with a standard deviation of 2 %,
    /// the link's body of 0.6 K, both normal.
    Production,
    /// Evenly across the limits: power to beyond both ends of its band, the link's
    /// body up to 8 K above what the file says, which is 4 K below Th.
    Limits,
}

/// One unit on its own bench.
#[derive(Debug, Clone)]
pub(super) struct Unit {
    /// Its number, for the record.
    pub(super) number: u64,
    /// Draws its bench's errors and its noise.
    pub(super) seed: u64,
    pub(super) model: VirtualUnit,
    pub(super) room: Celsius,
    /// How far the supply's voltage lies off, as a share.
    pub(super) supply: f64,
    pub(super) faults: Vec<Fault>,
}

impl Unit {
    /// Unit `number` of a population called `name`.
    pub(super) fn draw(
        setting: &Setting,
        seed: u64,
        name: &str,
        number: u64,
        spread: Spread,
    ) -> Self {
        let chance = Chance::of(seed, &format!("{name}, {}, {number}", setting.kind.words()));
        let (power, warmth) = match spread {
            Spread::Production => (0.02 * chance.normal(0), 0.6 * chance.normal(1)),
            Spread::Limits => (chance.even(0), 4.0 + 4.0 * chance.even(1)),
        };
        let power = match (spread, setting.kind) {
            (Spread::Production, _) => power,
            (Spread::Limits, Kind::Plain) => 0.14 * power,
            (Spread::Limits, Kind::Fan) => 0.25 * power,
        };
        let middle = f64::midpoint(ROOM.0, ROOM.1);
        let room = middle + 0.5 * (ROOM.1 - ROOM.0) * chance.even(2);
        Unit {
            number,
            seed: chance.bits(3),
            model: shifted(setting.kind, &setting.model, 1.0 + power, warmth),
            room: Celsius::of(room),
            supply: SUPPLY * chance.even(4),
            faults: Vec::new(),
        }
    }
}

/// The model with its power times a factor, and its link's body so much warmer, both
/// about: the truth is never taken from here.
fn shifted(kind: Kind, model: &VirtualUnit, power: f64, warmth: f64) -> VirtualUnit {
    let mut model = model.clone();
    let loss = &mut model.thermal.block_w_per_k;
    match kind {
        // The power is the element's; what it heats up to is the loss's. The file's
        // body rises by about 61 K.
        Kind::Plain => *loss *= power / (1.0 + warmth / 61.0),
        // The elements hold their temperature; the power is what is lost from it.
        Kind::Fan => *loss *= power,
    }
    for element in &mut model.elements {
        element.resistance = match element.resistance {
            Resistance::Plain(ohms) => Resistance::Plain(Ohms::of(ohms.get() / power)),
            Resistance::Ptc {
                r_switch,
                t_switch,
                steepness,
            } => Resistance::Ptc {
                r_switch,
                t_switch: Celsius::of(t_switch.get() + warmth),
                steepness,
            },
        };
    }
    model
}
