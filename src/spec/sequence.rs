//! The sequence file as typed values: what the rating plate promises and how it
//! is tested. Names are kept with their places, so that `plan` can point at them.

use serde::{Deserialize, Serialize};

use super::Located;
pub use super::rule::{CyclingRule, Decision, ProcessSpread, Rule, RuleKind, RuleWeight};
pub use super::soak::{Criterion, CriterionKind, PowerChange, Soak, Soaking};
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
    /// `reference ambient:` that the input is referred to (house default 23 °C).
    pub reference_ambient: Celsius,
    /// `supply range:` in which the appliance may be used; absent: the plate's.
    pub supply_range: Option<Located<Span<Volts>>>,
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
    /// `ambient effect:` how far the link follows the room; absent: 1 K per K.
    pub ambient_effect: Option<AmbientEffect>,
}

/// How far the link's temperature follows the room's, where it was measured.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct AmbientEffect {
    /// `value:` kelvins per kelvin.
    pub value: Ratio,
    /// `U:` its expanded uncertainty (k = 2).
    pub expanded: Ratio,
    /// `source:` who measured it.
    pub source: String,
}

/// How much hotter a link's body is than its surroundings by its own current.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct SelfHeating {
    /// `rise:` in kelvins
    pub rise: Kelvins,
    /// `at:` this current; it goes with the square (I2 Rth).
    pub at: Amps,
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
        /// `self-heating:` by the unit's own current.
        #[serde(default)]
        self_heating: Option<SelfHeating>,
    },
    /// Only the outside can be reached: the rules for the link are replaced by a house
    /// limit for that place, which says that the link was not measured.
    OutsideOnly {
        /// `outside only:` where, in words.
        place: String,
        /// `house limit:` for it.
        limit: Celsius,
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

impl HeatingElement {
    /// The interval in which d ln P / d ln V lies (house defaults, computed from the PTC
    /// model): plain resistor 1.95..2; PTC in still air 0..0.3; PTC with a fan on the
    /// mains 0..1.2. Never V squared for a PTC.
    pub fn voltage_exponent(self, fan: bool) -> (f64, f64) {
        match (self, fan) {
            (HeatingElement::Resistor, _) => (1.95, 2.0),
            (HeatingElement::Ptc, false) => (0.0, 0.3),
            (HeatingElement::Ptc, true) => (0.0, 1.2),
        }
    }
}

/// What a bay must have an instrument for.
#[derive(Debug, Clone, PartialEq)]
pub struct RoleNeed {
    /// Its name; `body` and `ambient` name the watched body and the bay's own ambient.
    pub name: Located<String>,
    /// What kind of instrument fills it.
    pub kind: RoleKind,
    /// `at:` where a temperature is measured, in words.
    pub place: Option<String>,
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
    /// `waveform: yes` of an `inrush`: a block of voltage and current is taken too.
    #[serde(default, skip_serializing_if = "std::ops::Not::not")]
    pub waveform: bool,
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
