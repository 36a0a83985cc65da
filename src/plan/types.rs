//! What a plan is: every step, limit and instrument known before anything is
//! energised. Stored in the record as `plan.json`, so it stands on its own.

use serde::{Deserialize, Serialize};

use crate::quantity::{Amps, Celsius, Hertz, Kelvins, Seconds, Volts, Watts};
use crate::sensor::Sensor;
use crate::spec::bench::{CalibrationPoint, Connection, Port, Source};
use crate::spec::driver::Driver;
use crate::spec::sequence::{
    AmbientEffect, ApplianceKind, Criterion, CyclingRule, Decision, HeatingElement, MeasuredAt,
    ProcessSpread, ProtectionClass, Question, RoleKind, RuleKind, RuleWeight, Span, SupplyPoint,
    Timed, Waiting,
};

/// Version of `plan.json`; raised when its meaning changes.
pub const PLAN_FORMAT: u32 = 1;

/// A sequence resolved against one bay of a bench.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Plan {
    /// [`PLAN_FORMAT`] of the writer.
    pub format: u32,
    /// The sequence's title.
    pub title: String,
    /// The sequence's edition.
    pub edition: String,
    /// The bench's name.
    pub bench: String,
    /// The appliance.
    pub appliance: PlannedAppliance,
    /// The bay and who fills its roles.
    pub bay: PlannedBay,
    /// Lines that the bay needs.
    pub lines: Vec<PlannedLine>,
    /// Instruments that the bay needs, with their drivers whole.
    pub instruments: Vec<PlannedInstrument>,
    /// Every cell of condition x position x supply that is run.
    pub cells: Vec<Cell>,
    /// Steps in the order in which they are run, numbered from 1.
    pub steps: Vec<PlannedStep>,
    /// Guards while energised.
    pub guards: Guards,
    /// Rules of the verdict.
    pub rules: Vec<PlannedRule>,
    /// How long it is expected to take, without the operator.
    pub expected: Seconds,
}

/// The appliance as the plan needs it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlannedAppliance {
    /// Model.
    pub model: String,
    /// Kind.
    pub kind: ApplianceKind,
    /// Protection class.
    pub protection_class: ProtectionClass,
    /// Highest ambient.
    pub highest_ambient: Celsius,
    /// Ambient that the input is referred to; absent in plans of before, which refer to none.
    #[serde(default)]
    pub reference_ambient: Option<Celsius>,
    /// Supply range in which it may be used; absent: the plate's.
    #[serde(default)]
    pub supply_range: Option<Span<Volts>>,
    /// Positions from the lowest input to the highest, off left out.
    pub positions: Vec<String>,
    /// What the plate promises.
    pub plate: Vec<PlannedPlate>,
    /// The thermal link.
    pub link: Option<PlannedLink>,
    /// How the input depends on voltage.
    pub element: HeatingElement,
    /// Whether it has a fan.
    pub fan: bool,
    /// Whether it cycles.
    pub thermostat: bool,
    /// Positions fed through a series diode.
    pub diode_in: Vec<String>,
}

/// One plate entry with its position resolved.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlannedPlate {
    /// Position.
    pub position: String,
    /// Element, where the entry rates one.
    pub element: Option<String>,
    /// Rated voltage.
    pub voltage: Span<Volts>,
    /// Rated frequency.
    pub frequency: Span<Hertz>,
    /// Rated power.
    pub power: Span<Watts>,
}

/// The thermal link with its limits.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlannedLink {
    /// Rated functioning temperature.
    pub tf: Celsius,
    /// Earliest opening, Tf - 10 K (IEC 60691).
    pub opens_from: Celsius,
    /// Holding temperature.
    pub th: Option<Celsius>,
    /// Maximum temperature limit.
    pub tm: Option<Celsius>,
    /// Where it sits.
    pub sits: String,
    /// Where it is measured.
    pub measured_at: MeasuredAt,
    /// How far it follows the room; absent: 1 K per K.
    #[serde(default)]
    pub ambient_effect: Option<AmbientEffect>,
}

/// The bay.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlannedBay {
    /// Name.
    pub name: String,
    /// Rated current of its wiring.
    pub rated_current: Amps,
    /// What feeds it; nothing is known of it in plans that were made before it was kept.
    #[serde(default)]
    pub source: Source,
    /// Roles, in the sequence's order.
    pub roles: Vec<PlannedRole>,
}

/// A role and what fills it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlannedRole {
    /// Name; `body` and `ambient` are known by it.
    pub name: String,
    /// Kind.
    pub kind: RoleKind,
    /// Index into [`Plan::instruments`].
    pub instrument: usize,
    /// Channel.
    pub channel: Option<u32>,
    /// Where a temperature is measured, in words.
    #[serde(default)]
    pub place: Option<String>,
    /// How it is connected.
    #[serde(default)]
    pub connection: Connection,
    /// What hangs on the channel; plans from before it was known have none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub sensor: Option<Sensor>,
}

/// A line.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlannedLine {
    /// Name.
    pub name: String,
    /// Port.
    pub port: Port,
}

/// An instrument.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlannedInstrument {
    /// Name.
    pub name: String,
    /// Index into [`Plan::lines`].
    pub line: usize,
    /// The start of its identity reply.
    pub identity: String,
    /// Certificate.
    pub certificate: Option<String>,
    /// Due date.
    pub due: Option<chrono::NaiveDate>,
    /// Calibration points.
    pub calibration: Vec<CalibrationPoint>,
    /// The driver, whole.
    pub driver: Driver,
}

/// One combination that results are for.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Cell {
    /// Condition; absent where the sequence names none.
    pub condition: Option<String>,
    /// Position.
    pub position: String,
    /// Supply.
    pub supply: SupplyPoint,
}

/// One step of the plan.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlannedStep {
    /// From 1.
    pub number: u32,
    /// Index into [`Plan::cells`]; absent outside a cell.
    pub cell: Option<usize>,
    /// What it does.
    pub action: Action,
}

/// What a planned step does. Steps that touch the unit come only while de-energised.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Action {
    /// The operator does something.
    Instruct(String),
    /// The operator brings a condition about.
    SetCondition {
        /// Its name.
        condition: String,
        /// What to do.
        instruction: String,
    },
    /// The operator answers.
    Ask(Question),
    /// Wait until the body is near ambient.
    Acclimatise(Waiting),
    /// Set voltage and frequency, output off.
    SetSupply(SupplyPoint),
    /// Set the unit's switch.
    SetPosition {
        /// Position's name.
        position: String,
        /// Position's number from 1 in the appliance's order.
        number: u32,
        /// By the role `position switch`, else by the operator.
        by_switch: bool,
    },
    /// Output on.
    Energise,
    /// Output off.
    Deenergise,
    /// Fast polling from energising on.
    Inrush(Timed),
    /// Until settled.
    Soak {
        /// Least time.
        at_least: Seconds,
        /// Time limit.
        at_most: Seconds,
        /// Polling interval.
        every: Seconds,
        /// Criterion.
        until: Criterion,
        /// Whether two predictions that agree may end it.
        #[serde(default)]
        early_finish: bool,
    },
    /// Over a window.
    Measure(Timed),
    /// Output off (already), wait until cool; after-heat is logged.
    Rest(Waiting),
    /// Energised for a time.
    RunIn(Timed),
    /// With a named fault.
    Abnormal {
        /// The fault.
        fault: String,
        /// Length.
        length: Seconds,
        /// Polling interval.
        every: Seconds,
        /// Trip temperature of the body in this step.
        body: Celsius,
    },
}

impl Action {
    /// The step's verb, as in sequences.
    pub fn verb(&self) -> &'static str {
        match self {
            Action::Instruct(_) => "instruct",
            Action::SetCondition { .. } => "condition",
            Action::Ask(_) => "ask",
            Action::Acclimatise(_) => "acclimatise",
            Action::SetSupply(_) => "supply",
            Action::SetPosition { .. } => "position",
            Action::Energise => "energise",
            Action::Deenergise => "de-energise",
            Action::Inrush(_) => "inrush",
            Action::Soak { .. } => "soak",
            Action::Measure(_) => "measure",
            Action::Rest(_) => "rest",
            Action::RunIn(_) => "run in",
            Action::Abnormal { .. } => "abnormal",
        }
    }
}

/// Limits that trip. None may be absent.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Guards {
    /// Body: min(Tf - 10 K, the sequence's); absent only where there is neither a
    /// link nor a body role.
    pub body: Option<Celsius>,
    /// Current: the bay's rating.
    pub current: Amps,
    /// Time after energising from when on the input is guarded.
    pub input_after: Seconds,
    /// Input limit by cell, in the order of [`Plan::cells`]: 1.3 times the upper limit.
    pub input: Vec<Watts>,
    /// Silence of an instrument by role, in the order of the bay's roles, beyond the
    /// polling interval: the larger of 2 s and three update intervals.
    pub silence: Vec<Seconds>,
    /// A body that has not risen by this much within `rise_within` of energising is
    /// not believed (house default 10 K within 5 min).
    pub least_rise: Kelvins,
    /// See `least_rise`.
    pub rise_within: Seconds,
}

/// One rule with its names resolved.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlannedRule {
    /// What it compares.
    pub kind: RuleKind,
    /// Decision rule.
    pub decision: Decision,
    /// Required or information.
    pub weight: RuleWeight,
    /// Position that it is for.
    pub position: Option<String>,
    /// Condition that it is for; absent judges the worst.
    pub condition: Option<String>,
    /// Where its limits come from, printed beside them.
    pub source: String,
    /// How the quantity spreads over units, where it is stated.
    #[serde(default)]
    pub process: Option<ProcessSpread>,
    /// Which input of a cycling load a power rule compares.
    #[serde(default)]
    pub cycling: CyclingRule,
}

impl Cell {
    /// For people: condition, position and supply in one line.
    pub fn words(&self) -> String {
        let condition = match &self.condition {
            Some(condition) => format!("{condition}, "),
            None => String::new(),
        };
        let supply = &self.supply;
        let position = &self.position;
        format!(
            "{condition}{position}, {}, {}",
            supply.voltage, supply.frequency
        )
    }
}

impl PlannedRule {
    /// Whether it is for a cell's position and condition.
    pub fn is_for(&self, cell: &Cell) -> bool {
        let position = self.position.as_ref();
        let condition = self.condition.as_ref();
        position.is_none_or(|position| *position == cell.position)
            && condition.is_none_or(|condition| Some(condition) == cell.condition.as_ref())
    }
}

impl Plan {
    /// The role called `name`, with its index.
    pub fn role(&self, name: &str) -> Option<(usize, &PlannedRole)> {
        self.bay
            .roles
            .iter()
            .enumerate()
            .find(|(_, role)| role.name == name)
    }

    /// The role of a kind that a bay has once (supply, power meter, position switch).
    pub fn role_of_kind(&self, kind: RoleKind) -> Option<(usize, &PlannedRole)> {
        self.bay
            .roles
            .iter()
            .enumerate()
            .find(|(_, role)| role.kind == kind)
    }

    /// The instrument that fills a role.
    pub fn instrument_of(&self, role: &PlannedRole) -> &PlannedInstrument {
        &self.instruments[role.instrument]
    }
}
