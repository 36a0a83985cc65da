//! The appliance: elements behind the position switch, a fan on the mains, a
//! thermostat, a thermal link, and the heat that flows between them.
//!
//! Three temperatures: the heater block, the link's body on it, the enclosure.
//! The block loses heat to the enclosure's inside and to the room; the link's
//! body lies between the block and the air that the fan moves, so it climbs after
//! OFF, when the fan stops and the block is still hot. The fan starts and stops
//! at once, and radiation is part of the constant losses: simplifications.

use super::chance::Chance;
use super::circuit::Circuit;
use super::faults::Fault;
use super::ode::{Solver, Tolerance};
use super::ptc::Law;
use crate::spec::virtual_unit::{Resistance, Thermal, Thermostat, VirtualUnit};

/// Error of a temperature per step, K, and the longest step, s.
const TOLERANCE: Tolerance = Tolerance {
    absolute: 1e-5,
    longest: 60.0,
};
/// Voltage for which a fan's figures hold, V.
const FAN_VOLTAGE: f64 = 230.0;
/// Input of a blocked fan over that of a running one (house value).
const BLOCKED_FAN: f64 = 1.6;
/// Slow wander of the room, K, and its period, s.
const WANDER: (f64, f64) = (0.05, 7200.0);
/// A link that opens by itself does so this long after the first energising, s.
const SELF_OPENING: f64 = 420.0;

/// Three-point Gauss-Legendre quadrature: the outer node, its weight, the middle one's.
const GAUSS: (f64, f64, f64) = (0.774_596_669_241_483_4, 5.0 / 9.0, 8.0 / 9.0);

const BLOCK: usize = 0;
const LINK: usize = 1;
const ENCLOSURE: usize = 2;

/// What the bench does to the unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Drive {
    /// Voltage at the plug, V; 0 while the output is off.
    pub volts: f64,
    /// Position of the unit's switch, counted from 1; 0 is off.
    pub position: usize,
    /// Factor of the condition on the block's loss.
    pub loss_factor: f64,
}

/// What is true of the unit at a moment.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct State {
    /// Heater block, degC.
    pub block: f64,
    /// Link body, degC.
    pub link: f64,
    /// Enclosure, degC.
    pub enclosure: f64,
    /// Room, degC.
    pub ambient: f64,
    /// Active power, W.
    pub watts: f64,
    /// Current, RMS with its DC part, A.
    pub amps: f64,
    /// DC part of the current, A.
    pub dc_amps: f64,
}

/// One specimen: the model with its own spread and faults, and its course.
#[derive(Debug, Clone)]
pub struct Specimen {
    elements: Vec<Law>,
    positions: Vec<Wiring>,
    fan: Option<FanAir>,
    thermostat: Option<Thermostat>,
    thermal: Thermal,
    link_opens_at: f64,
    room: Room,
    mains_open: bool,
    opens_itself: bool,

    drive: Drive,
    circuit: Circuit,
    thermostat_open: bool,
    link_open: bool,
    /// When a link that opens by itself will do so.
    opening: Option<f64>,
    /// The first event within the present step, which ends there.
    coming: Option<(f64, Event)>,
    solver: Solver<3>,
    /// Energy drawn up to the beginning of the present step, J.
    joules: f64,
}

#[derive(Debug, Clone)]
struct Wiring {
    elements: Vec<usize>,
    diode: bool,
}

#[derive(Debug, Clone, Copy)]
struct FanAir {
    watts: f64,
    cooling: f64,
    blocked: bool,
}

/// The bay's air.
#[derive(Debug, Clone, Copy)]
struct Room {
    mean: f64,
    phase: f64,
}

impl Specimen {
    /// One specimen of `model` under `seed`, with the faults that are the unit's,
    /// at rest in a room of `ambient` degC. `positions` is the switch's order:
    /// indices into the model's positions.
    pub fn new(
        model: &VirtualUnit,
        positions: &[usize],
        seed: u64,
        faults: &[Fault],
        ambient: f64,
    ) -> Self {
        let chance = Chance::of(seed, "specimen");
        let spread = model.spread.get();
        let factor = |number: u64| (1.0 + spread * chance.bell(number)).max(0.2);
        let room = Room {
            mean: ambient,
            phase: std::f64::consts::PI * Chance::of(seed, "room").even(0),
        };
        let mut specimen = Self {
            elements: (0..)
                .zip(&model.elements)
                .map(|(n, e)| Law::of(e.resistance).scaled(factor(n)))
                .collect(),
            positions: positions
                .iter()
                .filter_map(|p| model.positions.get(*p))
                .map(|p| Wiring {
                    elements: element_numbers(model, p),
                    diode: p.diode,
                })
                .collect(),
            fan: model.fan.map(|fan| FanAir {
                watts: fan.power.get() * factor(1000),
                cooling: fan.cooling,
                blocked: false,
            }),
            thermostat: model.thermostat,
            thermal: model.thermal,
            link_opens_at: model.link_opens_at.get(),
            room,
            mains_open: false,
            opens_itself: false,
            drive: Drive {
                volts: 0.0,
                position: 0,
                loss_factor: 1.0,
            },
            circuit: Circuit::default(),
            thermostat_open: false,
            link_open: false,
            opening: None,
            coming: None,
            solver: Solver::new(TOLERANCE, 0.0, [room.at(0.0); 3]),
            joules: 0.0,
        };
        specimen.thermal.block_w_per_k *= factor(1001);
        for fault in faults {
            specimen.suffer(model, fault);
        }
        specimen.rewire();
        specimen
    }

    fn suffer(&mut self, model: &VirtualUnit, fault: &Fault) {
        match fault {
            Fault::DeadUnit => self.mains_open = true,
            Fault::LinkOpensMidSoak => self.opens_itself = true,
            Fault::WrongElement => {
                if let (Some(law), Some(element)) =
                    (self.elements.last_mut(), model.elements.last())
                {
                    *law = other_type(element.resistance);
                }
            }
            Fault::LooseClamp => self.thermal.block_w_per_k *= 0.4,
            Fault::StuckFan => {
                if let Some(fan) = &mut self.fan {
                    fan.blocked = true;
                }
            }
            // A link of a lower family: it opens a little below half of the way
            // from a 20 degC room to the right one's temperature.
            Fault::WrongLink => self.link_opens_at = 20.0 + 0.45 * (self.link_opens_at - 20.0),
            Fault::SwappedPositions => self.positions.reverse(),
            Fault::ShortedElement => {
                if let Some(law) = self.elements.first_mut() {
                    *law = Law::Plain(12.5);
                }
            }
            _ => {}
        }
    }

    /// Changes what the bench does, from `t` on; the state must have been advanced to `t`.
    pub fn set_drive(&mut self, t: f64, drive: Drive) {
        if drive == self.drive {
            return;
        }
        let state = self.solver.at(t);
        self.drive = drive;
        let energised = drive.volts > 0.0 && drive.position > 0;
        if self.opens_itself && energised && self.opening.is_none() {
            self.opening = Some(t + SELF_OPENING);
        }
        self.restart(t, state);
    }

    /// Whether the thermal link has opened.
    pub fn link_open(&self) -> bool {
        self.link_open
    }

    /// Follows the course up to `t`.
    pub fn advance(&mut self, t: f64) {
        loop {
            match self.coming {
                Some((at, event)) if at <= t => self.meet(at, event),
                // A step may reach beyond `t`; what happens in it later has not
                // happened yet.
                Some(_) => return,
                None if self.solver.end() >= t => return,
                None => self.step(),
            }
        }
    }

    fn step(&mut self) {
        self.joules = self.joules(self.solver.end());
        let ambient = self.room.at(self.solver.end());
        let (circuit, thermal) = (&self.circuit, &self.thermal);
        self.solver
            .step(|_, y| slopes(circuit, thermal, ambient, y));
        let events = [self.thermostat_event(), self.link_event()];
        let earlier = |a: &(f64, Event), b: &(f64, Event)| a.0.total_cmp(&b.0);
        self.coming = events.into_iter().flatten().min_by(earlier);
    }

    /// Everything at `t`, which lies within what was advanced last.
    pub fn state(&self, t: f64) -> State {
        let y = self.solver.at(t);
        let (watts, amps) = self.circuit.input(y[BLOCK]);
        State {
            block: y[BLOCK],
            link: y[LINK],
            enclosure: y[ENCLOSURE],
            ambient: self.room.at(t),
            watts,
            amps,
            dc_amps: self.circuit.dc(y[BLOCK]),
        }
    }

    /// Energy drawn from the beginning on, J, at `t`, which lies within what was
    /// advanced last.
    pub fn joules(&self, t: f64) -> f64 {
        let begin = self.solver.begin();
        let (middle, half) = (f64::midpoint(begin, t), 0.5 * (t - begin));
        let watts = |x: f64| {
            self.circuit
                .input(self.solver.at(middle + half * x)[BLOCK])
                .0
        };
        let outer = watts(-GAUSS.0) + watts(GAUSS.0);
        self.joules + half * (GAUSS.1 * outer + GAUSS.2 * watts(0.0))
    }

    /// Voltage in V and current in A at a moment, at a phase of the mains in turns after
    /// its rising zero; `t` lies within what was advanced last. The fan draws what it
    /// draws when it runs: its own switching on is left out.
    pub fn momentary(&self, t: f64, turns: f64) -> (f64, f64) {
        self.circuit.momentary(self.solver.at(t)[BLOCK], turns)
    }

    /// Cuts the present step at an event within it.
    fn meet(&mut self, t: f64, event: Event) {
        let state = self.solver.at(t);
        match event {
            Event::Thermostat => self.thermostat_open = !self.thermostat_open,
            Event::LinkOpens => self.link_open = true,
        }
        self.restart(t, state);
    }

    fn restart(&mut self, t: f64, state: [f64; 3]) {
        self.joules = self.joules(t);
        self.coming = None;
        self.rewire();
        self.solver.restart(t, state);
    }

    fn thermostat_event(&self) -> Option<(f64, Event)> {
        let thermostat = self.thermostat?;
        let limit = if self.thermostat_open {
            thermostat.closes_at.get()
        } else {
            thermostat.opens_at.get()
        };
        let end = self.solver.at(self.solver.end())[BLOCK];
        ((end >= limit) != self.thermostat_open)
            .then(|| (self.crossing(BLOCK, limit), Event::Thermostat))
    }

    fn link_event(&self) -> Option<(f64, Event)> {
        if self.link_open {
            return None;
        }
        let (begin, end) = (self.solver.begin(), self.solver.end());
        let by_itself = self.opening.filter(|opening| *opening <= end);
        if let Some(opening) = by_itself {
            return Some((opening.max(begin), Event::LinkOpens));
        }
        (self.solver.at(end)[LINK] >= self.link_opens_at)
            .then(|| (self.crossing(LINK, self.link_opens_at), Event::LinkOpens))
    }

    /// When a temperature passes `limit` within the present step: bisection on the
    /// continuous extension, to the side on which it has passed.
    fn crossing(&self, which: usize, limit: f64) -> f64 {
        let (mut before, mut after) = (self.solver.begin(), self.solver.end());
        let passed = self.solver.at(after)[which] >= limit;
        for _ in 0..60 {
            let middle = f64::midpoint(before, after);
            if (self.solver.at(middle)[which] >= limit) == passed {
                after = middle;
            } else {
                before = middle;
            }
        }
        after
    }

    fn rewire(&mut self) {
        let fed = !self.mains_open && !self.link_open && self.drive.volts > 0.0;
        let wiring = match self.drive.position {
            0 => None,
            position => self.positions.get(position - 1),
        };
        let wiring = wiring.filter(|_| fed);
        let volts = if wiring.is_some() {
            self.drive.volts
        } else {
            0.0
        };
        let circuit = &mut self.circuit;
        circuit.volts = volts;
        circuit.diode = wiring.is_some_and(|w| w.diode);
        circuit.square = volts * volts * if circuit.diode { 0.5 } else { 1.0 };
        circuit.elements.clear();
        if let Some(wiring) = wiring.filter(|_| !self.thermostat_open) {
            let laws = wiring.elements.iter().map(|e| self.elements[*e]);
            circuit.elements.extend(laws);
        }
        let relative = volts / FAN_VOLTAGE;
        let mut moved = 1.0;
        circuit.fan_watts = 0.0;
        if let Some(fan) = self.fan {
            circuit.fan_watts = fan.watts * relative * relative;
            if fan.blocked {
                circuit.fan_watts *= BLOCKED_FAN;
            } else {
                // The air that a small fan moves grows about as its voltage.
                moved += (fan.cooling - 1.0) * relative.min(1.5);
            }
        }
        circuit.loss = self.thermal.block_w_per_k * self.drive.loss_factor * moved;
        circuit.link_share = blown_share(self.thermal.link_share.get(), moved);
    }
}

#[derive(Debug, Clone, Copy)]
enum Event {
    Thermostat,
    LinkOpens,
}

/// Indices of a position's elements.
fn element_numbers(
    model: &VirtualUnit,
    position: &crate::spec::virtual_unit::PositionWiring,
) -> Vec<usize> {
    let number = |name: &str| model.elements.iter().position(|e| *e.name == name);
    position
        .elements
        .iter()
        .filter_map(|name| number(name))
        .collect()
}

/// The element that someone fitted by mistake.
fn other_type(resistance: Resistance) -> Law {
    match Law::of(resistance).scaled(0.7) {
        Law::Ptc {
            at_switch,
            switch,
            steepness,
        } => Law::Ptc {
            at_switch,
            switch: switch + 40.0,
            steepness,
        },
        plain => plain,
    }
}

/// A body that reaches `share` of the block's rise in still air lies between the
/// block and the air as conductances share : 1 - share; the fan multiplies the second.
fn blown_share(share: f64, moved: f64) -> f64 {
    share / (share + moved * (1.0 - share))
}

/// K/s of block, link body and enclosure.
fn slopes(circuit: &Circuit, thermal: &Thermal, ambient: f64, y: &[f64; 3]) -> [f64; 3] {
    let rise = y[BLOCK] - ambient;
    let inside = thermal.enclosure_share.get();
    let to_enclosure = circuit.loss * inside * (y[BLOCK] - y[ENCLOSURE]);
    let to_room = circuit.loss * (1.0 - inside) * rise;
    let heat = circuit.square * circuit.conductance(y[BLOCK]);
    let from_enclosure = thermal.enclosure_w_per_k * (y[ENCLOSURE] - ambient);
    [
        (heat - to_enclosure - to_room) / thermal.block_j_per_k,
        (ambient + circuit.link_share * rise - y[LINK]) / thermal.link_lag.get(),
        (to_enclosure - from_enclosure) / thermal.enclosure_j_per_k,
    ]
}

impl Room {
    fn at(self, t: f64) -> f64 {
        let turn = std::f64::consts::TAU * t / WANDER.1;
        self.mean + WANDER.0 * libm::sin(turn + self.phase)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spec::load_virtual_unit;

    /// A model from its elements, its position and further lines.
    fn model(element: &str, diode: &str, more: &str) -> VirtualUnit {
        let text = format!(
            "virtual unit: Test\nelements:\n  A: {element}\npositions:\n  on: {{elements: [A]{diode}}}\n\
             {more}link opens at: 400 °C\nthermal:\n  block capacity: 50 J/K\n  block loss: 0.04 W/K\n  \
             link follows: 20 s\n  link share: 90 %\n  enclosure capacity: 100 J/K\n  enclosure loss: 1 W/K\n  \
             enclosure share: 0 %\nconditions:\n  bare: {{loss factor: 1}}\nspread: 0 %\n"
        );
        let loaded = load_virtual_unit("test", text.as_bytes());
        loaded
            .value
            .unwrap_or_else(|| panic!("{:?}", loaded.problems))
    }

    fn on(model: &VirtualUnit, volts: f64, faults: &[Fault]) -> Specimen {
        let mut specimen = Specimen::new(model, &[0], 1, faults, 25.0);
        specimen.set_drive(
            0.0,
            Drive {
                volts,
                position: 1,
                loss_factor: 1.0,
            },
        );
        specimen
    }

    fn settled(mut specimen: Specimen) -> State {
        let end = 20.0 * 7200.0;
        specimen.advance(end);
        specimen.state(end)
    }

    const PTC: &str =
        "{ptc: {R at switch: 1500 ohm, switch temperature: 120 °C, steepness: 0.2 per K}}";

    fn close(found: f64, wanted: f64, relative: f64) {
        assert!(
            (found / wanted - 1.0).abs() < relative,
            "{found} instead of {wanted}"
        );
    }

    #[test]
    fn a_settled_ptc_meets_the_computed_check_values() {
        // Source: the project's own computation, Rs 1500 ohm, Ts 120 degC, a 0.2/K,
        // G 0.04 W/K, Ta 25 degC; per kelvin of ambient T moves 1/(1 + a dT) = 0.045 K.
        let state = settled(on(&model(PTC, "", ""), 230.0, &[]));
        let off = state.ambient - 25.0;
        close(state.block, 130.61029 + 0.0452 * off, 1e-6);
        close(state.watts, 4.2244116 - 0.0382 * off, 2e-5);
        close(state.amps, state.watts / 230.0, 1e-12);
        let lower = settled(on(&model(PTC, "", ""), 100.0, &[]));
        close(lower.block, 122.67191 + 0.0487 * off, 1e-6);
    }

    #[test]
    fn a_diode_halves_a_plain_resistor_and_hardly_changes_a_ptc() {
        // Source: computed; half-wave resistive load: P/2, RMS current A/2 of the peak
        // (A/sqrt2 full-wave), power factor 1/sqrt2.
        let plain = "{plain: 529 ohm}";
        let full = on(&model(plain, "", ""), 230.0, &[]).state(0.0);
        let half = on(&model(plain, ", diode: yes", ""), 230.0, &[]).state(0.0);
        close(full.watts, 100.0, 1e-12);
        close(half.watts, 50.0, 1e-12);
        close(
            half.amps / full.amps,
            std::f64::consts::FRAC_1_SQRT_2,
            1e-12,
        );
        close(
            half.watts / (230.0 * half.amps),
            std::f64::consts::FRAC_1_SQRT_2,
            1e-12,
        );
        let ptc = settled(on(&model(PTC, "", ""), 230.0, &[]));
        let ptc_half = settled(on(&model(PTC, ", diode: yes", ""), 230.0, &[]));
        assert!((0.95..0.99).contains(&(ptc_half.watts / ptc.watts)));
    }

    #[test]
    fn a_fan_on_the_mains_raises_the_voltage_exponent_towards_the_computed_one() {
        // Source: computed, "with a fan on the mains the voltage exponent rises towards 0.85".
        let fan = "fan: {power: 0.1 W, cooling factor: 6}\n";
        let power = |volts| settled(on(&model(PTC, "", fan), volts, &[])).watts;
        let exponent = (power(232.0) / power(228.0)).ln() / (232.0_f64 / 228.0).ln();
        assert!((0.8..0.95).contains(&exponent), "{exponent}");
    }

    #[test]
    fn the_links_body_climbs_after_off_because_the_fan_stops() {
        let fan = "fan: {power: 2 W, cooling factor: 8}\n";
        let unit = model("{plain: 4 kohm}", "", fan);
        let mut specimen = on(&unit, 230.0, &[]);
        specimen.advance(3000.0);
        let hot = specimen.state(3000.0);
        specimen.set_drive(
            3000.0,
            Drive {
                volts: 0.0,
                position: 1,
                loss_factor: 1.0,
            },
        );
        specimen.advance(3060.0);
        let after = specimen.state(3060.0);
        assert!(after.link > hot.link + 3.0, "{hot:?} {after:?}");
        assert!(after.block < hot.block && after.watts == 0.0);
        // With a blocked fan there is no such climb.
        let mut stuck = on(&unit, 230.0, &[Fault::StuckFan]);
        stuck.advance(3000.0);
        assert!(stuck.state(3000.0).block > hot.block + 100.0);
    }

    #[test]
    fn a_thermostat_switches_exactly_at_its_temperatures() {
        let thermostat = "thermostat: {opens at: 70 °C, closes at: 60 °C}\n";
        let mut specimen = on(&model("{plain: 500 ohm}", "", thermostat), 230.0, &[]);
        let (mut lowest, mut highest) = (f64::INFINITY, 0.0_f64);
        for i in 0..40_000 {
            let t = f64::from(i) * 0.1;
            specimen.advance(t);
            let state = specimen.state(t);
            highest = highest.max(state.block);
            if t > 1500.0 {
                lowest = lowest.min(state.block);
            }
        }
        close(highest, 70.0, 1e-3);
        close(lowest, 60.0, 1e-3);
    }

    // The sum of the power over small steps, and what the room and the block took up.
    #[test]
    fn the_energy_is_the_integral_of_the_power() {
        let thermostat = "thermostat: {opens at: 70 °C, closes at: 60 °C}\n";
        for (element, more) in [(PTC, ""), ("{plain: 500 ohm}", thermostat)] {
            let mut specimen = on(&model(element, "", more), 230.0, &[]);
            let mut sum = 0.0;
            for i in 0..200_000 {
                let t = 0.01 * (f64::from(i) + 0.5);
                specimen.advance(t);
                sum += 0.01 * specimen.state(t).watts;
            }
            specimen.advance(2000.0);
            let joules = specimen.joules(2000.0);
            close(joules, sum, 1e-4 * sum);
        }
    }

    #[test]
    fn what_happens_later_has_not_happened_yet() {
        let unit = model("{plain: 4 kohm}", "", "");
        let mut specimen = on(&unit, 230.0, &[Fault::LinkOpensMidSoak]);
        for i in 0..4300 {
            let t = f64::from(i) * 0.1;
            specimen.advance(t);
            let open = t >= 420.0;
            assert_eq!(specimen.link_open(), open, "at {t}");
            assert_eq!(specimen.state(t).watts == 0.0, open, "at {t}");
        }
    }

    #[test]
    fn an_opened_link_stays_open() {
        let unit = model("{plain: 100 ohm}", "", "");
        let mut specimen = on(&unit, 230.0, &[]);
        specimen.advance(600.0);
        assert!(specimen.link_open());
        specimen.advance(40_000.0);
        let state = specimen.state(40_000.0);
        assert!(state.watts == 0.0 && state.amps == 0.0 && state.link < 30.0);
    }

    #[test]
    fn the_course_does_not_depend_on_who_looks() {
        let unit = model(PTC, "", "");
        let mut seldom = on(&unit, 230.0, &[]);
        let mut often = on(&unit, 230.0, &[]);
        for i in 0..5000 {
            often.advance(f64::from(i) * 0.1);
        }
        seldom.advance(499.9);
        assert_eq!(often.state(499.9), seldom.state(499.9));
    }
}
