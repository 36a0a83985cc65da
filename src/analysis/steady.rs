//! Settled input.

use super::types::{Figure, Steady};
use super::uncertain::Budget;
use super::view::{Timed, View, value_at};
use crate::plan::Action;
use crate::quantity::{Moment, Reading};
use crate::settle::{Settle, Settling, Watched};
use crate::spec::sequence::HeatingElement;
use crate::stats::{effective_number, mean_and_deviation};

/// Beyond this deviation of the voltage nothing is corrected (house default).
const CORRECTABLE: f64 = 0.06;

/// A cycling load is on above this share of its highest power.
const ON: f64 = 0.5;

/// Fewer samples than this in a window carry no scatter.
const FEWEST: usize = 5;

/// Asks the soak's criterion of the recorded samples, as the run did.
pub(super) fn settling(view: &View) -> Option<Settling> {
    let (Some(on), Some(Action::Soak { at_least, every, until, .. })) = (view.on, view.soak()) else {
        return None;
    };
    let mut settle = Settle::new(until, *at_least, *every, view.plan.appliance.thermostat, on);
    let steps = view.steps("soak");
    let watched = [
        (view.meter(), Reading::Power, Watched::Power),
        (view.body(), Reading::Temperature, Watched::Body),
        (view.ambient(), Reading::Temperature, Watched::Ambient),
    ];
    for sample in view.samples.iter().filter(|s| steps.contains(&s.step)) {
        for (role, reading, what) in watched {
            let value = sample.readings.get(reading).filter(|_| role == Some(sample.role));
            if let Some(value) = value {
                settle.take(sample.reply, what, value);
            }
        }
    }
    Some(settle.state().clone())
}

/// The highest power in the last half of the energised time, settled or not.
pub(super) fn drawn(view: &View) -> Figure<f64> {
    let power = view.meter().map_or_else(Vec::new, |meter| view.while_on(meter, Reading::Power));
    let (Some(on), Some((last, _))) = (view.on, power.last()) else {
        return Figure::Absent("no reading of the power while energised".to_owned());
    };
    let half = on.plus_micros(last.micros_since(on) / 2);
    let late = power.iter().filter(|(at, _)| *at >= half).map(|(_, w)| *w);
    Figure::Known(late.fold(0.0, f64::max))
}

/// When it settled, seconds after energising.
pub(super) fn settled_after(view: &View, settling: Option<&Settling>) -> Figure<f64> {
    match (settling, view.on) {
        (Some(Settling::Settled { to, .. }), Some(on)) => Figure::Known(to.since(on).get()),
        (state, _) => Figure::Absent(not_settled(state)),
    }
}

fn not_settled(state: Option<&Settling>) -> String {
    match state {
        None => "not soaked".to_owned(),
        Some(Settling::Settled { .. }) => String::new(),
        Some(Settling::TooEarly) => "the soak ended before its shortest time".to_owned(),
        Some(Settling::NotYet(why)) => format!("not settled: {why}"),
        Some(Settling::WentOpen) => "the current vanished while energised".to_owned(),
    }
}

/// The settled input, referred to the plate's voltage.
pub(super) fn steady(view: &View, settling: Option<&Settling>) -> Figure<Steady> {
    let Some(Settling::Settled { from, to, criterion }) = settling else {
        return Figure::Absent(not_settled(settling));
    };
    let Some(meter) = view.meter() else { return Figure::Absent("no power meter".to_owned()) };
    let window = Window::of(view, meter, (*from, *to));
    if window.power.len() < FEWEST {
        return Figure::Absent(format!("only {} good readings in the window", window.power.len()));
    }
    let Some(on) = on_state(view, &window.power) else {
        return Figure::Absent("the load was never seen both on and off in the window".to_owned());
    };
    let role = &view.plan.bay.roles[meter];
    let points: Vec<(f64, f64)> = on.iter().map(|(at, w)| (at.as_secs_f64(), *w)).collect();
    let values: Vec<f64> = on.iter().map(|(_, w)| *w).collect();
    let Some((mean, deviation)) = mean_and_deviation(&values) else {
        return Figure::Absent("no reading while it was on".to_owned());
    };
    let effective = effective_number(&points);
    let mut budget = Budget::reading(view.plan, role, Reading::Power, mean);
    budget.add("scatter in the window", deviation / effective.sqrt(), effective - 1.0);
    let voltage = mean_of(&window.voltage).unwrap_or_else(|| view.plan.cells[view.cell].supply.voltage.get());
    if let Err(reason) = refer_to_plate(view, &mut budget, voltage) {
        return Figure::Absent(reason);
    }
    let all: Vec<f64> = window.power.iter().map(|(_, w)| *w).collect();
    Figure::Known(Steady {
        power_w: budget.estimate(),
        mean_w: mean_and_deviation(&all).map_or(mean, |(m, _)| m),
        duty: on.len() as f64 / window.power.len() as f64,
        voltage_v: voltage,
        current_a: current_while_on(&window.current, &on),
        from_s: window.from.as_secs_f64(),
        to_s: window.to.as_secs_f64(),
        samples: on.len(),
        effective,
        criterion: criterion.clone(),
    })
}

/// The readings that the input is taken from.
struct Window {
    power: Vec<Timed>,
    voltage: Vec<Timed>,
    current: Vec<Timed>,
    from: Moment,
    to: Moment,
}

impl Window {
    /// The `measure` step after the soak, else the window that showed it settled.
    fn of(view: &View, meter: usize, settled: (Moment, Moment)) -> Self {
        let measured = view.in_step("measure", meter, Reading::Power);
        let (from, to) = match (measured.first(), measured.last()) {
            (Some(first), Some(last)) => (first.0, last.0),
            _ => settled,
        };
        let within = |reading| {
            let all = view.since_on(meter, reading);
            all.into_iter().filter(|(at, _)| *at >= from && *at <= to).collect::<Vec<_>>()
        };
        let voltage = within(Reading::Voltage);
        Self { power: within(Reading::Power), voltage, current: within(Reading::Current), from, to }
    }
}

/// Readings while the load is on: all of them, where it does not cycle.
fn on_state(view: &View, power: &[Timed]) -> Option<Vec<Timed>> {
    if !view.plan.appliance.thermostat {
        return Some(power.to_vec());
    }
    let highest = power.iter().map(|(_, w)| *w).fold(0.0, f64::max);
    let on: Vec<Timed> = power.iter().copied().filter(|(_, w)| *w > ON * highest).collect();
    (!on.is_empty() && on.len() < power.len()).then_some(on)
}

fn current_while_on(current: &[Timed], on: &[Timed]) -> Option<f64> {
    let values: Vec<f64> = on.iter().filter_map(|(at, _)| value_at(current, *at)).collect();
    mean_and_deviation(&values).map(|(mean, _)| mean)
}

fn mean_of(series: &[Timed]) -> Option<f64> {
    let values: Vec<f64> = series.iter().map(|(_, v)| *v).collect();
    mean_and_deviation(&values).map(|(mean, _)| mean)
}

/// Corrects the input to the plate's voltage with an exponent interval, whose width
/// enters U. A PTC is never corrected by V squared.
fn refer_to_plate(view: &View, budget: &mut Budget, voltage: f64) -> Result<(), String> {
    let cell = &view.plan.cells[view.cell];
    let wanted = view.plan.rated_in(cell).map_or(cell.supply.voltage, |rated| rated.voltage).get();
    let deviation = voltage / wanted - 1.0;
    if deviation.abs() > CORRECTABLE {
        return Err(format!(
            "the voltage of {voltage:.1} V is {:.1} % away from {wanted} V; up to {:.0} % can be corrected (house default)",
            deviation * 100.0,
            CORRECTABLE * 100.0
        ));
    }
    let (low, high) = exponents(view);
    budget.scale((wanted / voltage).powf((low + high) / 2.0));
    let value = budget.value();
    budget.rectangular("correction to the plate's voltage", value * deviation * (high - low) / 2.0);
    if let Some(meter) = view.meter() {
        let role = &view.plan.bay.roles[meter];
        let volts = Budget::reading(view.plan, role, Reading::Voltage, voltage);
        budget.include("voltage: ", &volts, value * high / voltage);
    }
    Ok(())
}

/// d ln P / d ln V: plain resistor 1.95 to 2, PTC in still air 0 to 0.3, PTC with a
/// fan on the mains 0 to 1.2 (house default).
fn exponents(view: &View) -> (f64, f64) {
    match (view.plan.appliance.element, view.plan.appliance.fan) {
        (HeatingElement::Resistor, _) => (1.95, 2.0),
        (HeatingElement::Ptc, false) => (0.0, 0.3),
        (HeatingElement::Ptc, true) => (0.0, 1.2),
    }
}
