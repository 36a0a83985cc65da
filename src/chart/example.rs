//! Believable and degenerate scenes for this room's tests; appliances invented.

use super::Scene;
use crate::analysis::{
    Analysis, CellResult, Distribution, Drawn, Estimate, Exponent, Figure, Inrush, Peak, Share,
    Steady,
};
use crate::judge::{Finding, Judgement, Outcome, judge};
use crate::plan::{
    Action, Cell, Guards, PLAN_FORMAT, Plan, PlannedAppliance, PlannedBay, PlannedLink,
    PlannedPlate, PlannedRole, PlannedRule, PlannedStep,
};
use crate::quantity::{
    Amps, Celsius, Hertz, Kelvins, Moment, Reading, Readings, Seconds, Volts, Watts,
};
use crate::record::{RunOutcome, Sample, Status};
use crate::spec::bench::Connection;
use crate::spec::plate;
use crate::spec::sequence::{
    ApplianceKind, Criterion, CriterionKind, CyclingRule, Decision, HeatingElement, MeasuredAt,
    ProtectionClass, RoleKind, RuleKind, RuleWeight, Span, SupplyPoint, Timed, Waiting,
};

/// How a unit of the example behaves in one cell.
#[derive(Clone, Copy)]
pub struct Behaviour {
    pub peak: f64,
    pub settled: f64,
    /// Time constant of the fall, s.
    pub fall: f64,
    /// Body over ambient, K.
    pub rise: f64,
    /// After-heat, K.
    pub after_heat: f64,
    /// On and off times of a thermostat, s.
    pub cycle: Option<(f64, f64)>,
    pub noise: f64,
}

/// Owned parts of a scene.
pub struct Staged {
    pub plan: Plan,
    pub analysis: Analysis,
    pub judgement: Judgement,
    pub samples: Vec<Sample>,
    pub unit: String,
    pub virtual_bench: bool,
}

impl Staged {
    pub fn scene(&self) -> Scene<'_> {
        Scene {
            plan: &self.plan,
            analysis: &self.analysis,
            judgement: &self.judgement,
            samples: &self.samples,
            unit: &self.unit,
            virtual_bench: self.virtual_bench,
        }
    }
}

pub fn span<T: Copy>(value: T) -> Span<T> {
    Span {
        low: value,
        high: value,
    }
}

fn role(name: &str, kind: RoleKind) -> PlannedRole {
    PlannedRole {
        name: name.to_owned(),
        kind,
        instrument: 0,
        channel: None,
        place: None,
        connection: Connection::default(),
        sensor: None,
    }
}

fn rule(kind: RuleKind, source: &str) -> PlannedRule {
    PlannedRule {
        kind,
        decision: Decision::FourOutcomes,
        weight: RuleWeight::Required,
        position: None,
        condition: None,
        source: source.to_owned(),
        process: None,
        cycling: CyclingRule::OnState,
    }
}

/// A plan with the given cells (condition, position, rated power) at 230 V.
pub fn plan(model: &str, cells: &[(Option<&str>, &str, f64)]) -> Plan {
    let volts = Volts::of(230.0);
    let supply = SupplyPoint {
        voltage: volts,
        frequency: Hertz::of(50.0),
    };
    let mut positions: Vec<String> = Vec::new();
    let mut entries = Vec::new();
    for (_, position, watts) in cells {
        if !positions.iter().any(|p| p == position) {
            positions.push((*position).to_owned());
            entries.push(PlannedPlate {
                position: (*position).to_owned(),
                element: None,
                voltage: Span {
                    low: Volts::of(220.0),
                    high: Volts::of(240.0),
                },
                frequency: span(Hertz::of(50.0)),
                power: span(Watts::of(*watts)),
            });
        }
    }
    let cells: Vec<Cell> = cells
        .iter()
        .map(|(condition, position, _)| Cell {
            condition: condition.map(str::to_owned),
            position: (*position).to_owned(),
            supply,
        })
        .collect();
    Plan {
        format: PLAN_FORMAT,
        title: "Cupboard dryer, incoming qualification".to_owned(),
        edition: "1".to_owned(),
        bench: "Virtual demo bench".to_owned(),
        appliance: PlannedAppliance {
            model: model.to_owned(),
            kind: ApplianceKind::Combined,
            protection_class: ProtectionClass::II,
            highest_ambient: Celsius::of(35.0),
            reference_ambient: None,
            supply_range: None,
            positions,
            plate: entries,
            link: Some(PlannedLink {
                tf: Celsius::of(121.0),
                opens_from: Celsius::of(111.0),
                th: Some(Celsius::of(100.0)),
                tm: Some(Celsius::of(175.0)),
                sits: "on the heater block".to_owned(),
                measured_at: MeasuredAt::LinkBody,
                ambient_effect: None,
            }),
            element: HeatingElement::Ptc,
            fan: true,
            thermostat: false,
            diode_in: Vec::new(),
        },
        bay: PlannedBay {
            name: "bay 1".to_owned(),
            rated_current: Amps::of(10.0),
            source: crate::spec::bench::Source::default(),
            roles: vec![
                role("supply", RoleKind::Supply),
                role("meter", RoleKind::PowerMeter),
                role("body", RoleKind::Temperature),
                role("ambient", RoleKind::Temperature),
                role("enclosure", RoleKind::Temperature),
            ],
        },
        lines: Vec::new(),
        instruments: Vec::new(),
        steps: steps(cells.len()),
        guards: Guards {
            body: Some(Celsius::of(111.0)),
            current: Amps::of(10.0),
            input_after: Seconds::of(60.0),
            input: vec![Watts::of(20.0); cells.len()],
            silence: Vec::new(),
            least_rise: Kelvins::of(10.0),
            rise_within: Seconds::of(300.0),
        },
        rules: vec![
            rule(RuleKind::PlatePower, plate::SOURCE),
            rule(RuleKind::LinkHolding, "data sheet of the link"),
            rule(RuleKind::LinkOpening, "IEC 60691"),
            rule(RuleKind::PositionOrder, "house rule"),
            rule(
                RuleKind::Inrush {
                    at_most: Amps::of(0.5),
                },
                "house limit",
            ),
        ],
        cells,
        expected: Seconds::of(3600.0),
    }
}

/// Energise, inrush, soak, rest; numbered from 1, four to a cell.
fn steps(cells: usize) -> Vec<PlannedStep> {
    let actions = |_| {
        [
            Action::Energise,
            Action::Inrush(Timed {
                length: Seconds::of(60.0),
                every: Seconds::of(0.1),
                waveform: false,
            }),
            Action::Soak {
                at_least: Seconds::of(600.0),
                at_most: Seconds::of(2700.0),
                every: Seconds::of(2.0),
                until: Criterion {
                    kind: CriterionKind::ThreeReadings,
                    power_change: None,
                    temperature_change: None,
                },
                early_finish: false,
            },
            Action::Rest(Waiting {
                within: Kelvins::of(3.0),
                at_most: Seconds::of(3600.0),
                every: Seconds::of(5.0),
            }),
        ]
    };
    (0..cells)
        .flat_map(|cell| actions(cell).map(|action| (cell, action)))
        .enumerate()
        .map(|(n, (cell, action))| PlannedStep {
            number: n as u32 + 1,
            cell: Some(cell),
            action,
        })
        .collect()
}

pub const METER: usize = 1;
pub const BODY: usize = 2;

const SOAK: f64 = 1260.0;
const REST: f64 = 1500.0;
const AMBIENT: f64 = 22.5;

/// A row of the record.
pub fn sample(cell: usize, step: u32, role: usize, t: f64, value: Option<f64>) -> Sample {
    let reading = if role == METER {
        Reading::Power
    } else {
        Reading::Temperature
    };
    Sample {
        seq: 0,
        request: Moment::from_micros((t * 1e6) as u64),
        reply: Moment::from_micros((t * 1e6) as u64 + 8_000),
        step,
        cell: Some(cell),
        role,
        energised: !step.is_multiple_of(4),
        status: if value.is_some() {
            Status::Ok
        } else {
            Status::NoReply
        },
        readings: value.map_or(Readings::NONE, |v| Readings::one(reading, v)),
    }
}

fn noise(n: u64) -> f64 {
    let mut x = n.wrapping_add(1).wrapping_mul(0x9e37_79b9_7f4a_7c15);
    x ^= x >> 29;
    x = x.wrapping_mul(0xbf58_476d_1ce4_e5b9);
    x ^= x >> 32;
    (x >> 11) as f64 / (1u64 << 53) as f64 - 0.5
}

impl Behaviour {
    fn power(&self, t: f64) -> f64 {
        let off = self
            .cycle
            .is_some_and(|(on, off)| t > 240.0 && (t - 240.0) % (on + off) > on);
        if off {
            return 0.4;
        }
        let rising = 1.0 - (-t / 0.4f64).exp();
        let falling = (self.peak - self.settled) * (-t / self.fall).exp();
        self.settled * (1.0 + 0.03 * (-t / 300.0).exp()) + rising * falling
    }

    fn body(&self, t: f64) -> f64 {
        let heated = |t: f64| self.rise * (1.0 - (-t / 190.0f64).exp());
        if t <= SOAK {
            return AMBIENT + heated(t);
        }
        let after = t - SOAK;
        let bump = self.after_heat * 2.7 * (after / 60.0) * (-after / 60.0f64).exp();
        AMBIENT + heated(SOAK) * (-(after - 40.0).max(0.0) / 420.0f64).exp() + bump
    }
}

/// Every sample of one cell that begins at `start` seconds.
pub fn samples(cell: usize, start: f64, unit: Behaviour) -> Vec<Sample> {
    let mut rows = Vec::new();
    let step = |n: u32| 4 * cell as u32 + n;
    let mut t = 0.3;
    while t < SOAK + REST {
        let (number, every) = match t {
            _ if t < 60.0 => (2, 0.1),
            _ if t < SOAK => (3, 2.0),
            _ => (4, 5.0),
        };
        let at = start + t;
        let n = (t * 1000.0) as u64 + 1_000_000 * cell as u64;
        if number != 4 {
            let watts = unit.power(t) + unit.noise * noise(n);
            rows.push(sample(cell, step(number), METER, at, Some(watts)));
        } else {
            rows.push(sample(cell, step(4), METER, at, Some(0.0)));
        }
        let body = unit.body(t) + 0.2 * noise(n + 7);
        let slow = AMBIENT + 0.4 * (unit.body(t) - AMBIENT) + 0.2 * noise(n + 9);
        let ambient = AMBIENT + 0.8 * t / 2700.0 + 0.1 * noise(n + 8);
        for (role, value) in [(BODY, body), (BODY + 1, ambient), (BODY + 2, slow)] {
            let value = Some((value * 10.0).round() / 10.0);
            rows.push(sample(cell, step(number), role, at + 0.01, value));
        }
        t += every;
    }
    rows
}

pub fn estimate(value: f64, expanded: f64) -> Estimate {
    Estimate::combined(value, vec![Share::normal("stated", 0.5 * expanded, "")])
}

/// What analysis would say of such a cell.
pub fn result(cell: &Cell, start: f64, unit: Behaviour) -> CellResult {
    let hottest = unit.rise + unit.after_heat + AMBIENT;
    CellResult {
        cell: cell.clone(),
        energised_s: Figure::Known(start),
        off_s: Figure::Known(start + SOAK),
        cold_start: Figure::Known(()),
        inrush: Figure::Known(Inrush {
            t0_s: start + 0.3,
            peak_a: estimate(unit.peak / 230.0, 0.002),
            peak_w: unit.peak,
            peak_after_s: 1.2,
            ratio: Some(unit.peak / unit.settled),
            half_way_s: Some(8.3),
            above_steady_wh: Some(0.05),
            lower_bound: vec!["the meter updates every 100 ms".to_owned()],
            supply_limited: None,
            from_waveform: false,
            source_ohm: None,
            switching_angle_deg: None,
        }),
        switch_in_peak: Figure::Absent("it was a cold start".to_owned()),
        waveform: Figure::Absent("no waveform was taken".to_owned()),
        dc_lost: None,
        drawn: Figure::Known(Drawn {
            power_w: unit.settled,
            floor_w: 0.002,
            vanished_s: None,
        }),
        settled_s: Figure::Known(960.0),
        steady: Figure::Known(Steady {
            power_w: estimate(unit.settled * 1.002, 0.004 * unit.settled + 0.02),
            at_plug_w: estimate(unit.settled * 1.002, 0.004 * unit.settled + 0.02),
            plug_v: estimate(230.04, 0.4),
            exponent: Exponent {
                value: 0.15,
                standard: 0.09,
                distribution: Distribution::Rectangular,
                source: "house default".to_owned(),
            },
            ambient_degc: Some(estimate(AMBIENT, 1.0)),
            body_degc: Some(AMBIENT + unit.rise),
            mean_w: match unit.cycle {
                Some((on, off)) => unit.settled * on / (on + off),
                None => unit.settled * 1.002,
            },
            mean_from: "rows weighted by time".to_owned(),
            representative_w: None,
            representative_how: None,
            duty: unit.cycle.map_or(1.0, |(on, off)| on / (on + off)),
            voltage_v: 230.04,
            current_a: Some(unit.settled / 230.0),
            from_s: start + 960.0,
            to_s: start + SOAK,
            samples: 151,
            effective: 42.3,
            criterion: "slope over 5 min within 2 %/h and 3 K/h".to_owned(),
            extrapolated: false,
        }),
        body_peak: Figure::Known(Peak {
            temperature_degc: estimate(hottest, 1.6),
            at_s: start + SOAK + 60.0,
            ambient_degc: AMBIENT,
            after_heat: true,
        }),
        body_worst: Figure::Known(estimate(hottest + 12.5, 1.9)),
        rises: vec![("enclosure".to_owned(), Figure::Known(estimate(31.0, 1.5)))],
        disbelief: Vec::new(),
        abnormal: false,
    }
}

pub fn finding(rule: &str, cell: Option<&Cell>, outcome: Outcome) -> Finding {
    Finding {
        rule: rule.to_owned(),
        condition: cell.and_then(|cell| cell.condition.clone()),
        position: cell.map(|cell| cell.position.clone()),
        supply: cell.map(|_| "230 V, 50 Hz".to_owned()),
        weight: RuleWeight::Required,
        decision: None,
        outcome,
        value: None,
        expanded: None,
        coverage: None,
        budget: Vec::new(),
        unit: String::new(),
        at_least: None,
        at_most: None,
        margin: None,
        probability: None,
        risks: None,
        source: String::new(),
        reason: String::new(),
    }
}

/// A whole scene: every cell with its behaviour.
pub fn stage(model: &str, cells: &[(Option<&str>, &str, f64, Behaviour)]) -> Staged {
    let planned: Vec<_> = cells.iter().map(|c| (c.0, c.1, c.2)).collect();
    let plan = plan(model, &planned);
    let mut rows = Vec::new();
    let mut results = Vec::new();
    for (i, (_, _, _, unit)) in cells.iter().enumerate() {
        let start = 412.0 + 2800.0 * i as f64;
        rows.extend(samples(i, start, *unit));
        results.push(result(&plan.cells[i], start, *unit));
    }
    for (n, row) in rows.iter_mut().enumerate() {
        row.seq = n as u64 + 1;
    }
    let analysis = Analysis {
        cells: results,
        openings: Vec::new(),
        looked: Vec::new(),
        history: Vec::new(),
        tripped: None,
        notes: Vec::new(),
    };
    Staged {
        judgement: judge(&plan, &RunOutcome::Complete, &analysis),
        plan,
        analysis,
        samples: rows,
        unit: "CD9-000417".to_owned(),
        virtual_bench: true,
    }
}

/// The cupboard dryer in one position.
pub const DRYER: Behaviour = Behaviour {
    peak: 25.0,
    settled: 9.0,
    fall: 12.0,
    rise: 58.0,
    after_heat: 6.0,
    cycle: None,
    noise: 0.12,
};
