//! The truth that estimates are held against: the same unit, its supply exact, energised
//! until nothing changes any more, without an instrument between.
//!
//! - **Power**: active power at exactly the voltage that the cell is run at, settled, in
//!   a room at the plan's reference ambient; mean over a whole wander of the room.
//! - **Worst case**: the settled rise of the link's body over the room, and what it still
//!   climbs after OFF, at that voltage and at the highest ambient (1 K/K, which is how
//!   the rule defines it).
//! - **Highest temperature of the body**: the same in the unit's own room, at the voltage
//!   that its supply really gave: it is what was there to be seen.

use super::TruthError;
use super::setting::Setting;
use super::unit::Unit;
use crate::plan::Cell;
use crate::quantity::{Celsius, Moment, Seconds};
use crate::spec::sequence::RoleKind;
use crate::virtual_bench::{Errors, Staging, VirtualBench};

/// Until nothing changes, and then one period of the room's wander, seconds.
const SETTLED_AFTER_S: f64 = 7200.0;
const WANDER_S: f64 = 7200.0;
/// After OFF the body climbs for less than this, seconds.
const AFTER_HEAT_S: f64 = 300.0;
const STEP_S: f64 = 60.0;

/// What is true of a unit in one position.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Settled {
    /// Settled power, W.
    pub(super) power_w: f64,
    /// Highest temperature of the link's body in its own room and at its own supply,
    /// degC.
    pub(super) body_degc: f64,
    /// The same at the highest ambient and the wanted voltage, degC.
    pub(super) worst_degc: f64,
}

/// How a unit is staged, without faults where it is to be known what a good one does.
pub(super) fn staging(setting: &Setting, unit: &Unit) -> Staging {
    Staging {
        unit: unit.model.clone(),
        positions: setting.plan.appliance.positions.clone(),
        connections: setting.connections.clone(),
        seed: unit.seed,
        faults: unit.faults.clone(),
        ambient: unit.room,
        speed: 1.0,
    }
}

/// The truth of a unit in a cell.
pub(super) fn settled(setting: &Setting, unit: &Unit, cell: &Cell) -> Result<Settled, TruthError> {
    let reference = setting.plan.appliance.reference_ambient;
    let (power_w, _) = followed(setting, unit, cell, (0.0, reference.unwrap_or(unit.room)))?;
    let (_, rise_k) = followed(setting, unit, cell, (0.0, unit.room))?;
    let seen_k = match unit.supply {
        0.0 => rise_k,
        off => followed(setting, unit, cell, (off, unit.room))?.1,
    };
    let room = unit.room.get();
    let hottest = setting.plan.appliance.highest_ambient.get();
    Ok(Settled {
        power_w,
        body_degc: room + seen_k,
        worst_degc: room.max(hottest) + rise_k,
    })
}

/// Settled power in W and rise of the link's body in K, after-heat included, with the
/// supply's voltage off by a share and in a room of its own.
fn followed(
    setting: &Setting,
    unit: &Unit,
    cell: &Cell,
    (supply, room): (f64, Celsius),
) -> Result<(f64, f64), TruthError> {
    let errors = Errors {
        supply,
        ..Errors::default()
    };
    let staging = Staging {
        ambient: room,
        ..staging(setting, unit)
    };
    let bench = VirtualBench::with_errors(staging, &errors)?;
    bench.hands().turn(&cell.position, Moment::START);
    let supply = Supply::of(setting, &bench, cell)?;
    supply.say(&supply.on, Moment::START);
    let at = |s: f64| Moment::START + Seconds::of(s);
    let (mut power, mut rise, mut steps) = (0.0, 0.0, 0.0);
    let mut s = SETTLED_AFTER_S;
    while s < SETTLED_AFTER_S + WANDER_S {
        let truth = bench.truth(at(s));
        power += truth.power.get();
        rise += (truth.link - truth.ambient).get();
        steps += 1.0;
        s += STEP_S;
    }
    let last = bench.truth(at(s)).link.get();
    supply.say(&supply.off, at(s));
    let mut climbed: f64 = 0.0;
    let mut after = 1.0;
    while after < AFTER_HEAT_S {
        climbed = climbed.max(bench.truth(at(s + after)).link.get() - last);
        after += 1.0;
    }
    Ok((power / steps, rise / steps + climbed))
}

/// The supply, spoken to in its own dialect.
struct Supply {
    line: String,
    bench: VirtualBench,
    on: String,
    off: String,
}

impl Supply {
    fn of(setting: &Setting, bench: &VirtualBench, cell: &Cell) -> Result<Self, TruthError> {
        let supply = setting
            .connections
            .iter()
            .find(|c| c.kind == RoleKind::Supply);
        let supply = supply.ok_or_else(|| TruthError::Files("there is no supply".to_owned()))?;
        let settings = &supply.driver.settings;
        let set = settings.voltage.as_ref().map_or("", |v| v.set.as_str());
        let volts = set.replace("{value}", &cell.supply.voltage.get().to_string());
        let text = |command: &Option<String>| command.clone().unwrap_or_default();
        Ok(Supply {
            line: supply.line.clone(),
            bench: bench.clone(),
            on: format!("{volts}\n{}\n", text(&settings.output_on)),
            off: format!("{}\n", text(&settings.output_off)),
        })
    }

    fn say(&self, text: &str, now: Moment) {
        self.bench
            .far_side(&self.line)
            .receive(text.as_bytes(), now);
    }
}
