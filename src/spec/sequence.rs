//! The sequence file as typed values: what the rating plate promises and how it
//! is tested. Names are kept with their places, so that `plan` can point at them.

use serde::{Deserialize, Serialize};

use super::Located;
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
    /// `process:` what units of the appliance are known to spread by; the risks of the
    /// decision are then said beside it.
    pub process: Option<ProcessSpread>,
    /// `cycling:` which input of a cycling load a power rule compares.
    pub cycling: CyclingRule,
}

/// How a quantity spreads over the units of an appliance (a normal distribution).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct ProcessSpread {
    /// `mean:` base unit of the rule's quantity.
    pub mean: f64,
    /// `spread:` standard deviation, base unit.
    pub spread: f64,
}

/// Which input of a cycling load is judged.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum CyclingRule {
    /// `on-state`: while it is on.
    #[default]
    OnState,
    /// `representative period`: where the maximum exceeds twice the mean, the value
    /// exceeded for more than 10 % of the period; else the mean (IEC 60335-1 clause
    /// 10.1, from memory).
    RepresentativePeriod,
}

impl CyclingRule {
    /// The words in YAML.
    pub fn word(self) -> &'static str {
        match self {
            CyclingRule::OnState => "on-state",
            CyclingRule::RepresentativePeriod => "representative period",
        }
    }
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
    /// `thermal link: {below Tf}` worst body temperature against a house limit,
    /// the lower of Th and Tf less this.
    LinkHouse {
        /// Kelvins below Tf.
        below_tf: Kelvins,
    },
    /// `thermal link: after opening` body after the link opened, against Tm.
    LinkMaximum,
    /// `inrush: {at most}` highest RMS current from a cold start.
    Inrush {
        /// Upper limit.
        at_most: Amps,
    },
    /// `inrush: {momentary at most}` highest momentary current from a cold start, of a
    /// waveform.
    MomentaryInrush {
        /// Upper limit.
        at_most: Amps,
    },
    /// `harmonics: class A` of IEC 61000-3-2, of a waveform.
    HarmonicsClassA,
    /// `voltage change: {dmax, dc, time above 3.3 %}` on the reference impedance of
    /// IEC 61000-3-3, of a waveform; at least one is there.
    VoltageChange {
        /// Largest relative change.
        dmax: Option<Ratio>,
        /// Steady relative change.
        dc: Option<Ratio>,
        /// Longest time above 3.3 %.
        time_above: Option<Seconds>,
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
    /// The value alone, whatever its uncertainty: findings of the house that compare
    /// no uncertain value.
    Simple,
    /// `simple`: the value alone, where U is at most what is stated; else not judged.
    SimpleUpTo {
        /// `largest U:` base unit of the rule's quantity.
        largest: f64,
    },
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
