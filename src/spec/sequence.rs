//! The sequence file as typed values: what the rating plate promises and how it
//! is tested. Names are kept with their places, so that `plan` can point at them.

use serde::{Deserialize, Serialize};

use super::Located;
use crate::quantity::{Amps, Celsius, Hertz, Kelvins, Ratio, Seconds, Volts, Watts};

/// A whole sequence file.
#[derive(Debug, Clone, PartialEq)]
pub struct Sequence {
    /// `sequence:` its title.
    pub title: Located<String>,
    /// `edition:` its revision, as text.
    pub edition: Located<String>,
    /// `appliance:`
    pub appliance: Appliance,
    /// `roles:` what the bay must have an instrument for.
    pub roles: Vec<RoleNeed>,
    /// `conditions:` the axis of conditions; empty means one unnamed condition.
    pub conditions: Vec<Condition>,
    /// `guards:`
    pub guards: GuardLimits,
    /// `steps:`
    pub steps: Vec<Step>,
    /// `rules:`
    pub rules: Vec<Rule>,
}

/// The model under qualification.
#[derive(Debug, Clone, PartialEq)]
pub struct Appliance {
    /// `model:`
    pub model: Located<String>,
    /// `kind:`
    pub kind: ApplianceKind,
    /// `protection class:`
    pub protection_class: ProtectionClass,
    /// `highest ambient:` at which the appliance may be used.
    pub highest_ambient: Celsius,
    /// `positions:` of the unit's own switch, off left out, from the lowest input to the highest.
    pub positions: Vec<Located<String>>,
    /// `plate:`
    pub plate: Vec<PlateEntry>,
    /// `thermal link:`
    pub link: Option<ThermalLink>,
    /// `facts:`
    pub facts: Facts,
}

/// IEC 60335-1 kinds that clause 10.1 tells apart.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum ApplianceKind {
    /// Heating elements only.
    Heating,
    /// Heating elements and motors.
    Combined,
    /// Motors only.
    MotorOperated,
}

/// Protection against electric shock.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[expect(missing_docs, reason = "the names are the trade's")]
pub enum ProtectionClass {
    I,
    II,
    III,
}

/// Two ends that may coincide: `230 V` or `220 V to 240 V`.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Span<T> {
    /// Lower end.
    pub low: T,
    /// Upper end, not below the lower.
    pub high: T,
}

/// One entry of the rating plate.
#[derive(Debug, Clone, PartialEq)]
pub struct PlateEntry {
    /// `voltage:` rated voltage or range.
    pub voltage: Located<Span<Volts>>,
    /// `frequency:` rated frequency or range.
    pub frequency: Span<Hertz>,
    /// `power:` rated input or range (marked for both ends of the voltage range).
    pub power: Located<Span<Watts>>,
    /// `position:` that it rates; absent rates the highest position.
    pub position: Option<Located<String>>,
    /// `element:` that it rates; absent rates the whole appliance.
    pub element: Option<Located<String>>,
}

/// The one-shot thermal fuse (IEC 60691).
#[derive(Debug, Clone, PartialEq)]
pub struct ThermalLink {
    /// `Tf:` rated functioning temperature.
    pub tf: Located<Celsius>,
    /// `Th:` holding temperature, from the part's data sheet.
    pub th: Option<Celsius>,
    /// `Tm:` maximum temperature limit, from the part's data sheet.
    pub tm: Option<Celsius>,
    /// `sits:` where it sits, in words.
    pub sits: String,
    /// `measured at:` the link's own body or elsewhere.
    pub measured_at: MeasuredAt,
}

/// Where the temperature that is judged against the link is measured.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum MeasuredAt {
    /// On the link's body: nothing is allowed for placement.
    LinkBody,
    /// Elsewhere, in words; without an allowance the margins are not judged.
    Elsewhere {
        /// Where.
        place: String,
        /// `allowance:` how much hotter the link may be.
        allowance: Option<Kelvins>,
        /// `allowance source:` who says so.
        source: Option<String>,
    },
}

/// Declared facts that change how results are read.
#[derive(Debug, Clone, PartialEq)]
pub struct Facts {
    /// `heating element: ptc | resistor`
    pub element: HeatingElement,
    /// `fan: yes`
    pub fan: bool,
    /// `thermostat: yes` it cycles.
    pub thermostat: bool,
    /// `diode in position:` positions fed through a series diode.
    pub diode_in: Vec<Located<String>>,
}

/// How the input depends on the voltage.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum HeatingElement {
    /// Self-regulating.
    Ptc,
    /// A plain resistor.
    Resistor,
}

/// What a bay must have an instrument for.
#[derive(Debug, Clone, PartialEq)]
pub struct RoleNeed {
    /// Its name; `body` and `ambient` name the watched body and the bay's own ambient.
    pub name: Located<String>,
    /// What kind of instrument fills it.
    pub kind: RoleKind,
}

/// Kinds of instrument that a role needs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum RoleKind {
    /// Feeds the unit; the energy path.
    Supply,
    /// Reads voltage, current and power.
    PowerMeter,
    /// Reads one temperature.
    Temperature,
    /// Turns the unit's switch.
    PositionSwitch,
}

impl RoleKind {
    /// The words in YAML.
    pub fn word(self) -> &'static str {
        match self {
            RoleKind::Supply => "supply",
            RoleKind::PowerMeter => "power meter",
            RoleKind::Temperature => "temperature",
            RoleKind::PositionSwitch => "position switch",
        }
    }
}

/// How the unit is loaded or set up.
#[derive(Debug, Clone, PartialEq)]
pub struct Condition {
    /// Its name, as in results.
    pub name: Located<String>,
    /// What the operator does to bring it about.
    pub instruction: String,
}

/// Limits of the guards that the sequence states; house defaults fill the rest.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct GuardLimits {
    /// `body:` trip temperature of the body.
    pub body: Option<Located<Celsius>>,
    /// `input after:` from when on after energising the input is guarded.
    pub input_after: Option<Seconds>,
    /// `least rise:` of a body that is believed; what good units show finds a sensor of
    /// another type, which reads a part of the rise.
    pub least_rise: Option<Kelvins>,
    /// `rise within:` this time after energising.
    pub rise_within: Option<Seconds>,
}

/// Voltage and frequency to supply.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct SupplyPoint {
    /// Voltage at the unit's plug.
    pub voltage: Volts,
    /// Frequency.
    pub frequency: Hertz,
}

/// One instruction of the sequence.
#[derive(Debug, Clone, PartialEq)]
pub struct Step {
    /// The step's verb, for messages.
    pub verb: Located<String>,
    /// What it does.
    pub action: StepAction,
}

/// What a step does.
#[derive(Debug, Clone, PartialEq)]
pub enum StepAction {
    /// `instruct:` the operator does something; with OFF confirmed.
    Instruct(String),
    /// `ask:` a question to the operator.
    Ask(Question),
    /// `acclimatise:` wait, not energised, until the body is near ambient.
    Acclimatise(Waiting),
    /// `supply:` set voltage and frequency.
    Supply(Located<SupplyPoint>),
    /// `position:` set it, or ask the operator to.
    Position(Located<String>),
    /// `condition:` bring it about.
    Condition(Located<String>),
    /// `energise`
    Energise,
    /// `de-energise`
    Deenergise,
    /// `inrush:` fast polling right from energising.
    Inrush(Timed),
    /// `soak:` until settled.
    Soak(Soak),
    /// `measure:` over a window.
    Measure(Timed),
    /// `rest:` de-energise and wait until cool.
    Rest(Waiting),
    /// `run in:` stay energised for a time, nothing judged.
    RunIn(Timed),
    /// `abnormal:` run with a named fault, attended.
    Abnormal(Abnormal),
    /// `each:` the same steps in every cell of condition x position x supply.
    Each(Each),
}

/// A question and what an answer can mean.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Question {
    /// The text.
    pub text: String,
    /// What can be answered.
    pub answer: AnswerKind,
    /// The finding, where an answer can be one.
    pub finding: Option<QuestionFinding>,
}

/// What can be answered.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum AnswerKind {
    /// Yes or no.
    YesNo,
    /// A number in a unit, within limits.
    Number {
        /// Unit, as the operator reads it.
        unit: String,
        /// Lowest that is not a finding.
        at_least: Option<f64>,
        /// Highest that is not a finding.
        at_most: Option<f64>,
    },
    /// One of several.
    Choice(Vec<String>),
}

/// When an answer is a finding, and how grave.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct QuestionFinding {
    /// `if:` the answer (`yes`, `no`, a choice, or `outside` for a number) that is one.
    pub when: String,
    /// `class:`
    pub class: FindingClass,
}

/// How grave an operator's finding is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
#[expect(missing_docs, reason = "the names are the trade's")]
pub enum FindingClass {
    Minor,
    Major,
    Critical,
}

/// Waiting while not energised.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Waiting {
    /// `within:` body minus ambient, below which it is over (house default 3 K).
    pub within: Kelvins,
    /// `at most:`
    pub at_most: Seconds,
    /// `every:` polling interval.
    pub every: Seconds,
}

/// A stretch of known length.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Timed {
    /// `for:`
    pub length: Seconds,
    /// `every:` polling interval.
    pub every: Seconds,
}

/// Staying energised until settled.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Soak {
    /// `at least:` (house default 10 min).
    pub at_least: Seconds,
    /// `at most:`
    pub at_most: Seconds,
    /// `every:` polling interval.
    pub every: Seconds,
    /// `until:`
    pub until: Criterion,
}

/// When a soak counts as settled: every stated change is within its limit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Criterion {
    /// `criterion:`
    pub kind: CriterionKind,
    /// `power change:` of the mean power; per hour where the criterion is a slope.
    pub power_change: Option<Ratio>,
    /// `temperature change:` of the body's rise over ambient; per hour where the criterion is a slope.
    pub temperature_change: Option<Kelvins>,
}

/// Published ways to call a quantity steady.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub enum CriterionKind {
    /// `slope`: regression over a trailing window, its confidence bound within the limit.
    Slope {
        /// `window:`
        window: Seconds,
    },
    /// `three readings`: 10 % of the elapsed time apart, at least 5 min, without change
    /// (UL 1278 39.1.8 in a restatement).
    ThreeReadings,
    /// `change within`: largest change within an interval.
    ChangeWithin {
        /// `interval:`
        interval: Seconds,
    },
}

/// Running with a named fault.
#[derive(Debug, Clone, PartialEq)]
pub struct Abnormal {
    /// `fault:` in words.
    pub fault: String,
    /// `for:` at most.
    pub length: Seconds,
    /// `every:` polling interval.
    pub every: Seconds,
    /// `body:` its own trip temperature.
    pub body: Celsius,
}

/// The same steps in every cell.
#[derive(Debug, Clone, PartialEq)]
pub struct Each {
    /// `conditions:`; empty: the axis has a single unnamed value.
    pub conditions: Vec<Located<String>>,
    /// `positions:`
    pub positions: Vec<Located<String>>,
    /// `supplies:`
    pub supplies: Vec<Located<SupplyPoint>>,
    /// `steps:`
    pub steps: Vec<Step>,
}

/// One rule of the verdict.
#[derive(Debug, Clone, PartialEq)]
pub struct Rule {
    /// What it compares.
    pub kind: Located<RuleKind>,
    /// `decision:` (house default: four outcomes).
    pub decision: Decision,
    /// `weight:` (default: required).
    pub weight: RuleWeight,
    /// `position:` that it is for; absent: every position it can be for.
    pub position: Option<Located<String>>,
    /// `condition:` that it is for; absent: the worst.
    pub condition: Option<Located<String>>,
    /// `source:` of its limits; absent: the standard that the rule names, or `house limit`.
    pub source: Option<String>,
}

/// What a rule compares.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum RuleKind {
    /// `power: plate` bands of IEC 60335-1 clause 10.1.
    PlatePower,
    /// `power: {at least, at most}` explicit limits.
    PowerLimits {
        /// Lower limit.
        at_least: Option<Watts>,
        /// Upper limit.
        at_most: Option<Watts>,
    },
    /// `thermal link: holding` worst body temperature against Th.
    LinkHolding,
    /// `thermal link: earliest opening` worst body temperature against Tf - 10 K.
    LinkOpening,
    /// `inrush: {at most}` peak current from a cold start.
    Inrush {
        /// Upper limit.
        at_most: Amps,
    },
    /// `order of positions: rising` the input rises in the declared order.
    PositionOrder,
    /// `temperature: {role, rise at most}` another temperature as a rise over ambient.
    TemperatureRise {
        /// The role.
        role: String,
        /// Upper limit.
        at_most: Kelvins,
    },
}

/// How a value near a limit is decided.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub enum Decision {
    /// `simple`: the value alone.
    Simple,
    /// `guarded`: guard band of `ratio` times U.
    Guarded {
        /// `guard:` r of r U.
        ratio: f64,
    },
    /// `four outcomes`: guard band U on both sides of the limit.
    FourOutcomes,
}

/// Whether a rule decides or only informs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum RuleWeight {
    /// It takes part in the unit's verdict.
    Required,
    /// It is printed and decides nothing.
    Information,
}
