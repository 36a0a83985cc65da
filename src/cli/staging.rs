//! The virtual bench behind a plan's lines: which unit it holds, with which faults.

use super::args::Virtually;
use super::exit::Exit;
use super::files::{Prepared, read, refuse};
use super::say::complain;
use crate::plan::Plan;
use crate::quantity::Celsius;
use crate::spec::bench::Port;
use crate::spec::virtual_unit::VirtualUnit;
use crate::spec::{self, shipped};
use crate::virtual_bench::{Connection, Fault, Staging, VirtualBench};

/// Makes the virtual bench for a plan.
///
/// # Errors
/// [`Exit::BadInput`] after the reason was printed.
pub fn virtual_bench(
    prepared: &Prepared,
    args: &Virtually,
    speed: f64,
) -> Result<VirtualBench, Exit> {
    all_lines_virtual(&prepared.plan)?;
    let unit = virtual_unit(&prepared.plan, args)?;
    let faults = args
        .faults
        .iter()
        .map(|name| fault(name))
        .collect::<Result<_, _>>()?;
    let ambient = args.ambient.parse::<Celsius>().map_err(|e| {
        complain(&format!("error: --ambient: {e}; write it as `23 °C`"));
        Exit::Usage
    })?;
    let staging = Staging {
        unit,
        positions: prepared.plan.appliance.positions.clone(),
        connections: connections(&prepared.plan),
        seed: args.seed,
        faults,
        ambient,
        speed,
    };
    VirtualBench::new(staging).map_err(|e| {
        complain(&format!("error: the virtual bench can't be set up: {e}"));
        Exit::BadInput
    })
}

fn all_lines_virtual(plan: &Plan) -> Result<(), Exit> {
    match plan.lines.iter().find(|line| line.port != Port::Virtual) {
        None => Ok(()),
        Some(line) => {
            complain(&format!(
                "error: line `{}` is not virtual: a rehearsal drives no real instrument; use `run` for that",
                line.name
            ));
            Err(Exit::BadInput)
        }
    }
}

fn fault(name: &str) -> Result<Fault, Exit> {
    name.parse().map_err(|_| {
        complain(&format!(
            "error: --fault: `{name}` is not a fault that is known; these are: {}",
            Fault::ALL.join(", ")
        ));
        Exit::Usage
    })
}

fn virtual_unit(plan: &Plan, args: &Virtually) -> Result<VirtualUnit, Exit> {
    if let Some(path) = &args.virtual_unit {
        let file = read(path, shipped::VIRTUAL_UNITS)?;
        let loaded = spec::load_virtual_unit(&file.name, &file.bytes);
        return loaded.value.ok_or_else(|| refuse(&loaded.problems));
    }
    let model = &plan.appliance.model;
    let known = shipped::VIRTUAL_UNITS
        .iter()
        .filter_map(|file| spec::load_virtual_unit(file.path, file.text.as_bytes()).value);
    let mut known = known.collect::<Vec<_>>();
    match known.iter().position(|unit| unit.model.value == *model) {
        Some(found) => Ok(known.swap_remove(found)),
        None => {
            let models: Vec<&str> = known.iter().map(|unit| unit.model.value.as_str()).collect();
            complain(&format!(
                "error: no virtual unit is shipped for the model `{model}`\n  write one and name it with --virtual-unit; shipped are: {}",
                models.join(", ")
            ));
            Err(Exit::BadInput)
        }
    }
}

fn connections(plan: &Plan) -> Vec<Connection> {
    let connect = |role: &crate::plan::PlannedRole| {
        let instrument = plan.instrument_of(role);
        Connection {
            line: plan.lines[instrument.line].name.clone(),
            instrument: instrument.name.clone(),
            identity: instrument.identity.clone(),
            driver: instrument.driver.clone(),
            role: role.name.clone(),
            kind: role.kind,
            channel: role.channel,
            sensor: role.sensor,
        }
    };
    plan.bay.roles.iter().map(connect).collect()
}
