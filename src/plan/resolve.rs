//! Crossing the files into a plan.

use chrono::NaiveDate;

use super::duration::expected;
use super::expand::expand;
use super::guards::guards;
use super::intervals::intervals;
use super::meter::meter_fits;
use super::notes::Notes;
use super::ratings::ratings;
use super::roles::must_have;
use super::rules::{every_rating_is_run, rules};
use super::types::{PLAN_FORMAT, Plan, PlannedAppliance, PlannedLink, PlannedPlate};
use super::waveform::waveforms;
use super::wiring::{Files, choose_bay, wire};
use crate::quantity::Celsius;
use crate::spec::bench::{Bay, Bench};
use crate::spec::driver::Driver;
use crate::spec::sequence::{Appliance, Sequence, Step, StepAction, ThermalLink};
use crate::spec::{Located, Problem};

/// A link may open this much below its Tf (IEC 60691, read in restatements).
const OPENS_EARLY_K: f64 = 10.0;

/// What crossing the files gave.
#[derive(Debug)]
pub struct Resolved {
    /// The plan, where no problem is an error.
    pub plan: Option<Plan>,
    /// Every problem of meaning: the sequence's first, in the order of their places,
    /// then the bench's.
    pub problems: Vec<Problem>,
}

/// Crosses a sequence with a bay of a bench (`bay` by name, else the first) and the
/// drivers that are known; `today` is for due dates.
pub fn resolve(
    sequence: &Sequence,
    bench: &Bench,
    drivers: &[Driver],
    bay: Option<&str>,
    today: Option<NaiveDate>,
) -> Resolved {
    let mut notes = Notes::default();
    let files = Files {
        sequence,
        bench,
        drivers,
        today,
    };
    let plan = choose_bay(files, bay, &mut notes).map(|bay| cross(files, bay, &mut notes));
    Resolved {
        plan: plan.filter(|_| !notes.has_errors()),
        problems: notes.into_problems(&sequence.title.place),
    }
}

fn cross(files: Files, bay: &Bay, notes: &mut Notes) -> Plan {
    let sequence = files.sequence;
    must_have(sequence, notes);
    let wired = wire(files, bay, notes);
    let appliance = appliance(&sequence.appliance, notes);
    let expanded = expand(sequence, notes);
    let rules = rules(sequence, &appliance, &expanded, notes);
    every_rating_is_run(sequence, &appliance, &expanded, notes);
    intervals(sequence, &wired, notes);
    meter_fits(sequence, &appliance, &rules, &wired, notes);
    ratings(sequence, &appliance, bay, &wired, notes);
    let guards = guards(
        &sequence.guards,
        &appliance,
        &wired.bay,
        &wired.instruments,
        &expanded.cells,
        &rules,
    );
    waveforms(sequence, &wired, &guards.silence, notes);
    Plan {
        format: PLAN_FORMAT,
        title: sequence.title.value.clone(),
        edition: sequence.edition.value.clone(),
        bench: files.bench.name.value.clone(),
        expected: expected(&expanded.steps),
        appliance,
        bay: wired.bay,
        lines: wired.lines,
        instruments: wired.instruments,
        cells: expanded.cells,
        steps: expanded.steps,
        guards,
        rules,
    }
}

/// Every step as it is written, those of `each` blocks included, the blocks left out.
pub(super) fn written_steps(sequence: &Sequence) -> impl Iterator<Item = &Step> {
    sequence.steps.iter().flat_map(|step| match &step.action {
        StepAction::Each(each) => each.steps.iter(),
        _ => std::slice::from_ref(step).iter(),
    })
}

fn appliance(written: &Appliance, notes: &mut Notes) -> PlannedAppliance {
    let positions: Vec<String> = written.positions.iter().map(|p| p.value.clone()).collect();
    let known: Vec<&str> = positions.iter().map(String::as_str).collect();
    let mut must_be_known = |position: &Located<String>| {
        if !known.contains(&position.value.as_str()) {
            notes.unknown(&position.place, "position", &position.value, &known);
        }
    };
    written.facts.diode_in.iter().for_each(&mut must_be_known);
    written
        .plate
        .iter()
        .filter_map(|entry| entry.position.as_ref())
        .for_each(&mut must_be_known);
    let highest = positions.last().cloned().unwrap_or_default();
    let plate = written.plate.iter().map(|entry| PlannedPlate {
        // An entry without a position rates the highest one.
        position: entry
            .position
            .as_ref()
            .map_or_else(|| highest.clone(), |p| p.value.clone()),
        element: entry.element.as_ref().map(|e| e.value.clone()),
        voltage: entry.voltage.value,
        frequency: entry.frequency,
        power: entry.power.value,
    });
    PlannedAppliance {
        model: written.model.value.clone(),
        kind: written.kind,
        protection_class: written.protection_class,
        highest_ambient: written.highest_ambient,
        reference_ambient: Some(written.reference_ambient),
        supply_range: written.supply_range.as_ref().map(|range| range.value),
        plate: plate.collect(),
        link: written.link.as_ref().map(link),
        element: written.facts.element,
        fan: written.facts.fan,
        thermostat: written.facts.thermostat,
        diode_in: written
            .facts
            .diode_in
            .iter()
            .map(|p| p.value.clone())
            .collect(),
        positions,
    }
}

fn link(written: &ThermalLink) -> PlannedLink {
    PlannedLink {
        tf: written.tf.value,
        opens_from: Celsius::of(written.tf.value.get() - OPENS_EARLY_K),
        th: written.th,
        tm: written.tm,
        sits: written.sits.clone(),
        measured_at: written.measured_at.clone(),
        ambient_effect: written.ambient_effect.clone(),
    }
}
