//! Crossing the files into a plan.

use chrono::NaiveDate;

use super::expand::{Expanded, expand};
use super::guards::guards;
use super::notes::Notes;
use super::rules::{rules, warn_early};
use super::types::{Action, PLAN_FORMAT, Plan, PlannedAppliance, PlannedLink, PlannedPlate};
use super::wiring::{Files, choose_bay, wire};
use crate::quantity::{Celsius, Seconds};
use crate::spec::bench::{Bay, Bench};
use crate::spec::driver::Driver;
use crate::spec::sequence::{Appliance, RoleKind, Sequence, StepAction, SupplyPoint, ThermalLink};
use crate::spec::{Located, Problem};

/// A link may open this much below its Tf (IEC 60691, read in restatements).
const OPENS_EARLY_K: f64 = 10.0;

/// A supply further than this from the plate's range is warned of.
const FAR_FROM_PLATE: f64 = 0.1;

/// What crossing the files gave.
#[derive(Debug)]
pub struct Resolved {
    /// The plan, where no problem is an error.
    pub plan: Option<Plan>,
    /// Every problem of meaning.
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
        problems: notes.0,
    }
}

fn cross(files: Files, bay: &Bay, notes: &mut Notes) -> Plan {
    let sequence = files.sequence;
    let wired = wire(files, bay, notes);
    let appliance = appliance(&sequence.appliance, notes);
    let expanded = expand(sequence, notes);
    let rules = rules(sequence, &expanded, notes);
    let meter = wired
        .bay
        .roles
        .iter()
        .find(|role| role.kind == RoleKind::PowerMeter);
    let meter = meter.map(|role| &wired.instruments[role.instrument].driver);
    warn_early(sequence, &appliance, &expanded, meter, notes);
    supplies_fit(sequence, bay, notes);
    let guards = guards(
        &sequence.guards,
        &appliance,
        &wired.bay,
        &wired.instruments,
        &expanded.cells,
        &rules,
    );
    Plan {
        format: PLAN_FORMAT,
        title: sequence.title.value.clone(),
        edition: sequence.edition.value.clone(),
        bench: files.bench.name.value.clone(),
        expected: duration(&expanded, |least, most| least + (most - least) / 4.0),
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
    }
}

/// Supplies against the plate and against the bay's wiring.
fn supplies_fit(sequence: &Sequence, bay: &Bay, notes: &mut Notes) {
    let mut supplies: Vec<&Located<SupplyPoint>> = Vec::new();
    for step in &sequence.steps {
        match &step.action {
            StepAction::Supply(point) => supplies.push(point),
            StepAction::Each(each) => {
                for (n, point) in each.supplies.iter().enumerate() {
                    if each.supplies[..n]
                        .iter()
                        .any(|before| before.value == point.value)
                    {
                        notes.error(&point.place, "this supply is listed twice", "take one out");
                    }
                    supplies.push(point);
                }
            }
            _ => {}
        }
    }
    let plate = &sequence.appliance.plate;
    for point in supplies {
        let volts = point.value.voltage.get();
        let near = plate.iter().any(|entry| {
            let span = entry.voltage.value;
            volts >= span.low.get() * (1.0 - FAR_FROM_PLATE)
                && volts <= span.high.get() * (1.0 + FAR_FROM_PLATE)
        });
        if !plate.is_empty() && !near {
            notes.warning(
                &point.place,
                format!(
                    "{} is more than 10 % away from every voltage of the plate",
                    point.value.voltage
                ),
                "results at this supply can't be referred to the plate",
            );
        }
    }
    for entry in plate {
        let amps = entry.power.value.high.get() / entry.voltage.value.low.get();
        if amps > bay.rated_current.get() {
            notes.error(
                &entry.power.place,
                format!(
                    "the plate's {:.1} A is above the rated current of bay `{}`, {}",
                    amps, bay.name.value, bay.rated_current
                ),
                "use a bay that is rated for it",
            );
        }
    }
}

/// Sum of the steps, each between its least and its longest time in seconds.
fn duration(expanded: &Expanded, of_step: impl Fn(f64, f64) -> f64) -> Seconds {
    let total: f64 = expanded
        .steps
        .iter()
        .map(|step| {
            let (least, most) = span_of(&step.action);
            of_step(least, most)
        })
        .sum();
    Seconds::new(total.round()).unwrap_or_default()
}

/// Least and longest time of a step in seconds, the operator's own left out.
fn span_of(action: &Action) -> (f64, f64) {
    match action {
        Action::Inrush(timed) | Action::Measure(timed) | Action::RunIn(timed) => {
            (timed.length.get(), timed.length.get())
        }
        Action::Abnormal { length, .. } => (length.get(), length.get()),
        Action::Soak {
            at_least, at_most, ..
        } => (at_least.get(), at_most.get()),
        Action::Rest(waiting) | Action::Acclimatise(waiting) => (0.0, waiting.at_most.get()),
        _ => (0.0, 0.0),
    }
}

impl Plan {
    /// The longest that it can take, without the operator.
    pub fn longest(&self) -> Seconds {
        let total: f64 = self.steps.iter().map(|step| span_of(&step.action).1).sum();
        Seconds::new(total.round()).unwrap_or_default()
    }
}
