//! For tests: an invented appliance on an invented bench, and records of it that
//! are played by a small generator the way a run would.

use crate::plan::{
    Action, Cell, Guards, PLAN_FORMAT, Plan, PlannedAppliance, PlannedBay, PlannedInstrument,
    PlannedLine, PlannedLink, PlannedPlate, PlannedRole, PlannedRule, PlannedStep,
};
use crate::quantity::{
    Amps, Celsius, Hertz, Kelvins, Moment, Ratio, Reading, Readings, Seconds, Volts, Watts,
};
use crate::record::{Event, Happening, RunOutcome, Sample, Status, StepEnd};
use crate::settle::{Settle, Settling, watched_in};
use crate::spec::bench::{CalibrationPoint, Connection, Port};
use crate::spec::driver::{
    Accuracy, Driver, Framing, IdentityQuery, ReadingQuery, Settings, Terminator,
};
use crate::spec::sequence::{
    AnswerKind, ApplianceKind, Criterion, CriterionKind, CyclingRule, Decision, FindingClass,
    HeatingElement, MeasuredAt, PowerChange, ProtectionClass, Question, QuestionFinding, RoleKind,
    RuleKind, RuleWeight, Span, SupplyPoint, Timed, Waiting,
};

use super::{Analysis, Input, analyse};

pub(crate) const METER: usize = 1;
pub(crate) const BODY: usize = 2;
pub(crate) const AMBIENT: usize = 3;
pub(crate) const ENCLOSURE: usize = 4;

fn accuracy(
    reading: Reading,
    of_reading: f64,
    floor: f64,
    resolution: f64,
    ranges: &[f64],
) -> Accuracy {
    Accuracy {
        reading,
        of_reading,
        of_range: if ranges.is_empty() { 0.0 } else { 0.001 },
        floor,
        resolution,
        ranges: ranges.to_vec(),
        of_reactive: 0.0,
        correlation: 0.0,
    }
}

fn driver(
    name: &str,
    kind: RoleKind,
    gives: &[Reading],
    update: f64,
    accuracy: Vec<Accuracy>,
) -> Driver {
    Driver {
        name: name.to_owned(),
        fills: vec![kind],
        framing: Framing {
            sends: Terminator::Lf,
            replies: Terminator::Lf,
            reply_within: Seconds::of(0.5),
            gap: Seconds::ZERO,
            tries: 3,
        },
        identity: IdentityQuery {
            ask: "*IDN?".to_owned(),
            fields: 4,
        },
        on_opening: Vec::new(),
        waveform: None,
        coupling: crate::spec::driver::Coupling::Dc,
        readings: vec![ReadingQuery {
            ask: "READ?".to_owned(),
            gives: gives.to_vec(),
        }],
        settings: Settings::default(),
        errors: None,
        accuracy,
        update_interval: Seconds::of(update),
        channels: 8,
        temperature_effect: None,
        isolation: None,
    }
}

fn instruments() -> Vec<PlannedInstrument> {
    use Reading::{Current, Power, Temperature, Voltage};
    let supply = driver("a-supply", RoleKind::Supply, &[], 0.1, Vec::new());
    let meter = vec![
        accuracy(Voltage, 0.001, 0.01, 0.01, &[150.0, 300.0]),
        accuracy(Current, 0.001, 0.000_05, 0.000_01, &[0.1, 0.5, 2.0, 10.0]),
        accuracy(Power, 0.001, 0.005, 0.001, &[15.0, 75.0, 300.0, 3000.0]),
    ];
    let meter = driver(
        "a-meter",
        RoleKind::PowerMeter,
        &[Voltage, Current, Power],
        0.1,
        meter,
    );
    let scanner = vec![accuracy(Temperature, 0.001, 1.0, 0.01, &[])];
    let scanner = driver(
        "a-scanner",
        RoleKind::Temperature,
        &[Temperature],
        0.5,
        scanner,
    );
    let calibration = |at: f64| CalibrationPoint {
        reading: Power,
        channel: None,
        at,
        correction: 0.0,
        expanded: 0.01,
        coverage: 2.0,
    };
    [("supply", supply), ("meter", meter), ("scanner", scanner)]
        .into_iter()
        .map(|(name, driver)| PlannedInstrument {
            name: name.to_owned(),
            line: 0,
            identity: name.to_owned(),
            certificate: None,
            due: None,
            calibration: if name == "meter" {
                vec![calibration(5.0), calibration(50.0)]
            } else {
                Vec::new()
            },
            driver,
        })
        .collect()
}

fn roles() -> Vec<PlannedRole> {
    let role = |name: &str, kind, instrument, channel| PlannedRole {
        name: name.to_owned(),
        kind,
        instrument,
        channel,
        place: None,
        connection: Connection::default(),
        sensor: None,
    };
    vec![
        role("supply", RoleKind::Supply, 0, None),
        role("meter", RoleKind::PowerMeter, 1, None),
        role("body", RoleKind::Temperature, 2, Some(1)),
        role("ambient", RoleKind::Temperature, 2, Some(2)),
        role("enclosure", RoleKind::Temperature, 2, Some(3)),
    ]
}

fn appliance() -> PlannedAppliance {
    let plate = |position: &str, watts: f64| PlannedPlate {
        position: position.to_owned(),
        element: None,
        voltage: Span {
            low: Volts::of(220.0),
            high: Volts::of(240.0),
        },
        frequency: Span {
            low: Hertz::of(50.0),
            high: Hertz::of(50.0),
        },
        power: Span {
            low: Watts::of(watts),
            high: Watts::of(watts),
        },
    };
    PlannedAppliance {
        model: "Test warmer".to_owned(),
        kind: ApplianceKind::Combined,
        protection_class: ProtectionClass::II,
        highest_ambient: Celsius::of(35.0),
        reference_ambient: Some(Celsius::of(23.0)),
        supply_range: None,
        positions: vec!["low".to_owned(), "high".to_owned()],
        plate: vec![plate("low", 4.5), plate("high", 9.0)],
        link: Some(PlannedLink {
            tf: Celsius::of(121.0),
            opens_from: Celsius::of(111.0),
            th: Some(Celsius::of(100.0)),
            tm: None,
            sits: "on the block".to_owned(),
            measured_at: MeasuredAt::LinkBody,
            ambient_effect: None,
        }),
        element: HeatingElement::Ptc,
        fan: false,
        thermostat: false,
        diode_in: Vec::new(),
    }
}

/// A plan with one cell for each condition and position at 230 V, 50 Hz.
pub(crate) fn plan(conditions: &[&str]) -> Plan {
    let appliance = appliance();
    let supply = SupplyPoint {
        voltage: Volts::of(230.0),
        frequency: Hertz::of(50.0),
    };
    let mut cells = Vec::new();
    for condition in conditions {
        for position in &appliance.positions {
            cells.push(Cell {
                condition: Some((*condition).to_owned()),
                position: position.clone(),
                supply,
            });
        }
    }
    Plan {
        format: PLAN_FORMAT,
        title: "Test".to_owned(),
        edition: "1".to_owned(),
        bench: "Test bench".to_owned(),
        steps: steps(&cells),
        guards: Guards {
            body: Some(Celsius::of(111.0)),
            current: Amps::of(10.0),
            input_after: Seconds::of(60.0),
            input: vec![Watts::of(20.0); cells.len()],
            silence: vec![Seconds::of(2.0); 5],
            least_rise: Kelvins::of(10.0),
            rise_within: Seconds::of(300.0),
        },
        cells,
        appliance,
        bay: PlannedBay {
            name: "bay 1".to_owned(),
            rated_current: Amps::of(10.0),
            source: crate::spec::bench::Source::default(),
            roles: roles(),
        },
        lines: vec![PlannedLine {
            name: "a line".to_owned(),
            port: Port::Virtual,
        }],
        instruments: instruments(),
        rules: [
            RuleKind::PlatePower,
            RuleKind::LinkHolding,
            RuleKind::LinkOpening,
            RuleKind::PositionOrder,
            RuleKind::Inrush {
                at_most: Amps::of(0.5),
            },
            RuleKind::TemperatureRise {
                role: "enclosure".to_owned(),
                at_most: Kelvins::of(50.0),
            },
        ]
        .map(rule)
        .to_vec(),
        expected: Seconds::of(3600.0),
    }
}

/// A required four-outcome rule.
pub(crate) fn rule(kind: RuleKind) -> PlannedRule {
    PlannedRule {
        kind,
        decision: Decision::FourOutcomes,
        weight: RuleWeight::Required,
        position: None,
        condition: None,
        source: "test".to_owned(),
        process: None,
        cycling: CyclingRule::OnState,
    }
}

fn steps(cells: &[Cell]) -> Vec<PlannedStep> {
    let question = Question {
        text: "Is the plate legible?".to_owned(),
        answer: AnswerKind::YesNo,
        finding: Some(QuestionFinding {
            when: "no".to_owned(),
            class: FindingClass::Major,
        }),
    };
    let waiting = |every: f64| Waiting {
        within: Kelvins::of(3.0),
        at_most: Seconds::of(3600.0),
        every: Seconds::of(every),
    };
    let timed = |length: f64, every: f64| Timed {
        length: Seconds::of(length),
        every: Seconds::of(every),
        waveform: false,
    };
    let mut actions = vec![
        (None, Action::Ask(question)),
        (None, Action::Acclimatise(waiting(5.0))),
    ];
    for (index, cell) in cells.iter().enumerate() {
        let soak = Action::Soak {
            at_least: Seconds::of(600.0),
            at_most: Seconds::of(2700.0),
            every: Seconds::of(2.0),
            until: Criterion {
                kind: CriterionKind::Slope {
                    window: Seconds::of(300.0),
                },
                power_change: Some(PowerChange::Relative(Ratio::of(0.02))),
                temperature_change: Some(Kelvins::of(3.0)),
            },
            early_finish: false,
        };
        for action in [
            Action::SetSupply(cell.supply),
            Action::SetPosition {
                position: cell.position.clone(),
                number: 1,
                by_switch: false,
            },
            Action::Energise,
            Action::Inrush(timed(60.0, 0.1)),
            soak,
            Action::Measure(timed(120.0, 1.0)),
            Action::Deenergise,
            Action::Rest(waiting(5.0)),
        ] {
            actions.push((Some(index), action));
        }
    }
    actions
        .into_iter()
        .zip(1..)
        .map(|((cell, action), number)| PlannedStep {
            number,
            cell,
            action,
        })
        .collect()
}

/// What the instruments see at one moment.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Seen {
    pub(crate) volts: f64,
    pub(crate) watts: f64,
    pub(crate) body: f64,
    pub(crate) ambient: f64,
    pub(crate) enclosure: f64,
}

/// Where a unit is in its story.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Now<'a> {
    pub(crate) cell: Option<usize>,
    pub(crate) position: &'a str,
    /// Seconds since the start, for noise.
    pub(crate) t: f64,
    /// Seconds since the output went on, while it is on.
    pub(crate) on: Option<f64>,
    /// How long it was on and how long it is off, after it was on.
    pub(crate) off: Option<(f64, f64)>,
}

/// Noise in -0.5..0.5, a function of channel and moment.
pub(crate) fn noise(channel: u64, t: f64) -> f64 {
    let tick = (t * 1000.0).round() as u64;
    let mut x = (tick + channel * 1_000_003).wrapping_mul(0x9E37_79B9_7F4A_7C15);
    x ^= x >> 31;
    x = x.wrapping_mul(0x94D0_49BB_1331_11EB);
    x ^= x >> 29;
    (x >> 11) as f64 / (1u64 << 53) as f64 - 0.5
}

/// A good unit: 4.3 W and 8.6 W after an inrush that decays over 15 s, a body that
/// rises by 40 K or 60 K.
pub(crate) fn good(now: Now) -> Seen {
    let (watts, rise) = match now.position {
        "low" => (4.3, 40.0),
        _ => (8.6, 60.0),
    };
    let warm = |t: f64| rise * (1.0 - libm::exp(-t / 150.0));
    let (watts, rise) = match (now.on, now.off) {
        (Some(on), _) => (watts * (1.0 + 3.0 * libm::exp(-on / 15.0)), warm(on)),
        (None, Some((on, off))) => {
            let after = 1.5 * (off / 20.0) * libm::exp(1.0 - off / 20.0);
            (0.0, warm(on) * libm::exp(-off / 200.0) + after)
        }
        (None, None) => (0.0, 0.0),
    };
    let on = now.on.is_some();
    Seen {
        volts: if on {
            230.0 + 0.05 * noise(1, now.t)
        } else {
            0.0
        },
        watts: if on {
            watts + 0.004 * noise(2, now.t)
        } else {
            0.0
        },
        body: 23.0 + rise + 0.06 * noise(3, now.t),
        ambient: 23.0 + 0.06 * noise(4, now.t),
        enclosure: 23.0 + 0.3 * rise + 0.06 * noise(5, now.t),
    }
}

/// A played record.
#[derive(Debug, Clone)]
pub(crate) struct Played {
    pub(crate) plan: Plan,
    pub(crate) samples: Vec<Sample>,
    pub(crate) happenings: Vec<Happening>,
    pub(crate) outcome: RunOutcome,
}

impl Played {
    pub(crate) fn analysis(&self) -> Analysis {
        analyse(&Input {
            plan: &self.plan,
            samples: &self.samples,
            happenings: &self.happenings,
            waveforms: &[],
            outcome: &self.outcome,
        })
    }
}

/// Plays a whole run of `unit`.
pub(crate) fn play(plan: Plan, unit: impl Fn(Now) -> Seen) -> Played {
    play_until(plan, unit, |_, _| None)
}

/// Plays a run until `ends` says how it ended, asked with the step in progress and
/// the moment (seconds since the start) of every polled round.
pub(crate) fn play_until(
    plan: Plan,
    unit: impl Fn(Now) -> Seen,
    ends: impl Fn(&PlannedStep, f64) -> Option<RunOutcome>,
) -> Played {
    let mut player = Player {
        unit,
        ends,
        t: 1.0,
        on_since: None,
        off_since: None,
        samples: Vec::new(),
        happenings: Vec::new(),
    };
    let mut outcome = RunOutcome::Complete;
    for step in &plan.steps {
        if let Some(ended) = player.step(&plan, step) {
            outcome = ended;
            break;
        }
    }
    if player.on_since.is_some() {
        player.off("the run ended");
    }
    player.tell(Event::Ended {
        outcome: outcome.clone(),
    });
    Played {
        samples: player.samples,
        happenings: player.happenings,
        plan,
        outcome,
    }
}

struct Player<U, E> {
    unit: U,
    ends: E,
    t: f64,
    on_since: Option<f64>,
    off_since: Option<(f64, f64)>,
    samples: Vec<Sample>,
    happenings: Vec<Happening>,
}

impl<U: Fn(Now) -> Seen, E: Fn(&PlannedStep, f64) -> Option<RunOutcome>> Player<U, E> {
    fn now(&self) -> Moment {
        Moment::START + Seconds::of(self.t)
    }

    fn tell(&mut self, event: Event) {
        self.happenings.push(Happening {
            seq: self.happenings.len() as u64 + 1,
            at: self.now(),
            event,
        });
    }

    fn off(&mut self, cause: &str) {
        if let Some(since) = self.on_since.take() {
            self.off_since = Some((self.t - since, self.t));
        }
        self.tell(Event::Off {
            cause: cause.to_owned(),
            confirmed: true,
        });
    }

    fn step(&mut self, plan: &Plan, step: &PlannedStep) -> Option<RunOutcome> {
        self.tell(Event::StepBegan { step: step.number });
        let polled =
            |length: Seconds, every: Seconds| (length.get() / every.get()).round() as usize;
        let (mut end, mut ended) = (StepEnd::Done, None);
        match &step.action {
            Action::Ask(question) => self.tell(Event::Answered {
                text: question.text.clone(),
                answer: "yes".to_owned(),
                finding: None,
            }),
            Action::Energise => {
                self.tell(Event::Energising);
                self.on_since = Some(self.t);
                self.t += 0.01;
                self.tell(Event::Energised);
            }
            Action::Deenergise => self.off("planned"),
            Action::Acclimatise(waiting) => {
                ended = self.poll(plan, step, 10, waiting.every, |_, _| false);
            }
            Action::Rest(waiting) => {
                let within = waiting.within.get();
                ended = self.poll(plan, step, 720, waiting.every, |seen, _| {
                    seen.body - seen.ambient < within
                });
            }
            Action::Inrush(timed) | Action::Measure(timed) | Action::RunIn(timed) => {
                let rounds = polled(timed.length, timed.every);
                ended = self.poll(plan, step, rounds, timed.every, |_, _| false);
            }
            Action::Soak { at_most, every, .. } => {
                let rounds = polled(*at_most, *every);
                let soaking = plan.soaking(&step.action).expect("a soak");
                let mut settle = Settle::new(soaking, self.energised());
                end = StepEnd::TimeLimit;
                ended = self.poll(plan, step, rounds, *every, |_, rows| {
                    for row in rows {
                        let role = &plan.bay.roles[row.role];
                        for (watched, value) in watched_in(role.kind, &role.name, &row.readings) {
                            settle.take(row.reply, watched, value);
                        }
                    }
                    end = match settle.state() {
                        Settling::Settled { .. } => StepEnd::Settled,
                        Settling::Extrapolated { .. } => StepEnd::Extrapolated,
                        Settling::WentOpen => StepEnd::WentOpen,
                        Settling::TooEarly | Settling::NotYet(_) => StepEnd::TimeLimit,
                    };
                    end != StepEnd::TimeLimit
                });
            }
            _ => {}
        }
        if ended.is_some() {
            end = StepEnd::Cut;
        }
        self.tell(Event::StepEnded {
            step: step.number,
            end,
        });
        ended
    }

    fn energised(&self) -> Moment {
        let happened = self.happenings.iter().rev();
        let mut energised = happened.filter(|h| h.event == Event::Energising);
        energised.next().map_or(Moment::START, |h| h.at)
    }

    fn poll(
        &mut self,
        plan: &Plan,
        step: &PlannedStep,
        rounds: usize,
        every: Seconds,
        mut done: impl FnMut(Seen, &[Sample]) -> bool,
    ) -> Option<RunOutcome> {
        for _ in 0..rounds {
            if let Some(outcome) = (self.ends)(step, self.t) {
                return Some(outcome);
            }
            let position = step
                .cell
                .map_or("", |cell| plan.cells[cell].position.as_str());
            let seen = (self.unit)(Now {
                cell: step.cell,
                position,
                t: self.t,
                on: self.on_since.map(|since| self.t - since),
                off: self.off_since.map(|(on, since)| (on, self.t - since)),
            });
            let first = self.samples.len();
            self.rows(step, seen);
            let over = done(seen, &self.samples[first..]);
            self.t += every.get();
            if over {
                break;
            }
        }
        None
    }

    fn rows(&mut self, step: &PlannedStep, seen: Seen) {
        let round = |value: f64, digits: f64| (value * digits).round() / digits;
        let mut meter = Readings::NONE;
        meter.set(Reading::Voltage, round(seen.volts, 100.0));
        meter.set(Reading::Power, round(seen.watts, 1000.0));
        let amps = if seen.volts > 0.0 {
            seen.watts / seen.volts
        } else {
            0.0
        };
        meter.set(Reading::Current, round(amps, 1e5));
        let degrees = |value: f64| Readings::one(Reading::Temperature, round(value, 100.0));
        let rows = [
            (METER, meter),
            (BODY, degrees(seen.body)),
            (AMBIENT, degrees(seen.ambient)),
            (ENCLOSURE, degrees(seen.enclosure)),
        ];
        for (role, readings) in rows {
            self.samples.push(Sample {
                seq: self.samples.len() as u64 + 1,
                request: self.now(),
                reply: self.now().plus_micros(1000 * role as u64),
                step: step.number,
                cell: step.cell,
                role,
                energised: self.on_since.is_some(),
                status: Status::Ok,
                readings,
            });
        }
    }
}
