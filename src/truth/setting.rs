//! What stands on the bench of the known truth: two appliances, their sequences, and
//! the instruments, from files that the program carries within itself.

use std::sync::Arc;

use super::TruthError;
use crate::plan::{Plan, PlannedRole, resolve};
use crate::spec::driver::Driver;
use crate::spec::shipped::{DRIVERS, Shipped};
use crate::spec::virtual_unit::VirtualUnit;
use crate::spec::{Loaded, load_bench, load_driver, load_sequence, load_virtual_unit, render};
use crate::virtual_bench::{Connection, Errors};

macro_rules! carried {
    ($name:literal) => {
        Shipped {
            path: $name,
            text: include_str!(concat!("files/", $name)),
        }
    };
}

const BENCH: Shipped = carried!("bench.yaml");

/// The line of a sequence that allows an early finish, as it is found and as it is
/// used.
const EARLY: (&str, &str) = ("# early finish: yes", "early finish: yes");

/// Which appliance.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Kind {
    /// A plain resistor, one position.
    Plain,
    /// Self-regulating elements with a fan, two positions.
    Fan,
}

impl Kind {
    /// Both.
    pub const ALL: [Kind; 2] = [Kind::Plain, Kind::Fan];

    /// In words.
    pub fn words(self) -> &'static str {
        match self {
            Kind::Plain => "plain resistor",
            Kind::Fan => "self-regulating, fan",
        }
    }

    /// The position whose values count: one for each unit, because the values of one
    /// unit share its instruments' errors.
    pub fn position(self) -> &'static str {
        match self {
            Kind::Plain => "on",
            Kind::Fan => "high",
        }
    }

    fn files(self) -> (Shipped, Shipped) {
        match self {
            Kind::Plain => (carried!("plain.yaml"), carried!("plain-unit.yaml")),
            Kind::Fan => (carried!("fan.yaml"), carried!("fan-unit.yaml")),
        }
    }
}

/// One appliance with everything that a run of it needs.
#[derive(Debug, Clone)]
pub(super) struct Setting {
    pub(super) kind: Kind,
    pub(super) plan: Arc<Plan>,
    pub(super) model: VirtualUnit,
    pub(super) connections: Vec<Connection>,
}

/// How a setting differs from the usual one.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Variant {
    /// Whether the soak may finish early.
    pub(super) early_finish: bool,
    /// The accuracy that the drivers state, as a share of the true one.
    pub(super) claimed: f64,
}

impl Setting {
    pub(super) fn new(kind: Kind, variant: Variant) -> Result<Self, TruthError> {
        let (sequence, unit) = kind.files();
        let text = if variant.early_finish {
            sequence.text.replace(EARLY.0, EARLY.1)
        } else {
            sequence.text.to_owned()
        };
        let sequence = whole(load_sequence(sequence.path, text.as_bytes()))?;
        let bench = whole(load_bench(BENCH.path, BENCH.text.as_bytes()))?;
        let model = whole(load_virtual_unit(unit.path, unit.text.as_bytes()))?;
        let drivers = DRIVERS
            .iter()
            .map(|file| whole(load_driver(file.path, file.text.as_bytes())))
            .collect::<Result<Vec<Driver>, _>>()?;
        let claiming: Vec<Driver> = drivers
            .iter()
            .map(|driver| claims(driver, variant.claimed))
            .collect();
        let resolved = resolve(&sequence, &bench, &claiming, None, None);
        let Some(plan) = resolved.plan else {
            return Err(TruthError::Files(render(&resolved.problems)));
        };
        let connections = plan
            .bay
            .roles
            .iter()
            .map(|role| connection(&plan, role, &drivers))
            .collect();
        Ok(Setting {
            kind,
            plan: Arc::new(plan),
            model,
            connections,
        })
    }

    /// What the instruments' errors are drawn from, calibration included.
    pub(super) fn errors(&self, drawn: crate::virtual_bench::Drawn, supply: f64) -> Errors {
        let points = self.plan.instruments.iter().flat_map(|instrument| {
            let named = |point: &crate::spec::bench::CalibrationPoint| {
                (instrument.name.clone(), point.clone())
            };
            instrument.calibration.iter().map(named)
        });
        Errors {
            drawn,
            calibration: points.collect(),
            supply,
        }
    }
}

fn whole<T>(loaded: Loaded<T>) -> Result<T, TruthError> {
    let problems = render(&loaded.problems);
    loaded.value.ok_or(TruthError::Files(problems))
}

/// A driver that states `share` of its true accuracy.
fn claims(driver: &Driver, share: f64) -> Driver {
    let mut driver = driver.clone();
    for accuracy in &mut driver.accuracy {
        accuracy.of_reading *= share;
        accuracy.of_range *= share;
        accuracy.floor *= share;
    }
    driver
}

/// A role as the virtual bench is told of it, its instrument with its true accuracy.
fn connection(plan: &Plan, role: &PlannedRole, drivers: &[Driver]) -> Connection {
    let instrument = plan.instrument_of(role);
    let known = drivers.iter().find(|d| d.name == instrument.driver.name);
    Connection {
        line: plan.lines[instrument.line].name.clone(),
        instrument: instrument.name.clone(),
        identity: instrument.identity.clone(),
        driver: known.unwrap_or(&instrument.driver).clone(),
        role: role.name.clone(),
        kind: role.kind,
        channel: role.channel,
        sensor: role.sensor,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::Reading;

    const USUAL: Variant = Variant {
        early_finish: false,
        claimed: 1.0,
    };

    #[test]
    fn both_settings_load_without_a_problem() {
        for kind in Kind::ALL {
            let setting = Setting::new(kind, USUAL).unwrap();
            assert!(
                setting
                    .plan
                    .cells
                    .iter()
                    .any(|c| c.position == kind.position())
            );
            assert_eq!(setting.connections.len(), setting.plan.bay.roles.len());
        }
    }

    #[test]
    fn a_claim_changes_the_plan_and_not_the_bench() {
        let half = Setting::new(
            Kind::Plain,
            Variant {
                claimed: 0.5,
                ..USUAL
            },
        )
        .unwrap();
        let floor = |driver: &Driver| driver.accuracy_of(Reading::Temperature).map(|a| a.floor);
        let planned = half.plan.instruments.iter().find_map(|i| floor(&i.driver));
        let true_one = half.connections.iter().find_map(|c| floor(&c.driver));
        assert_eq!((planned, true_one), (Some(0.5), Some(1.0)));
    }
}
