//! What analysis says of a record. It cannot fail: what is absent carries a reason.

use serde::{Deserialize, Serialize};

use super::budget::Share;
use super::waveform::Shape;
use crate::plan::Cell;
use crate::spec::sequence::CyclingRule;

/// A value, or why there is none.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Figure<T> {
    /// It is known.
    Known(T),
    /// It is not, and this is why, in words.
    Absent(String),
}

impl<T> Figure<T> {
    /// The value, where it is known.
    pub fn known(&self) -> Option<&T> {
        match self {
            Figure::Known(value) => Some(value),
            Figure::Absent(_) => None,
        }
    }

    /// The reason, where it is not.
    pub fn reason(&self) -> Option<&str> {
        match self {
            Figure::Known(_) => None,
            Figure::Absent(reason) => Some(reason),
        }
    }
}

/// A measurement with its uncertainty, in the base unit that its field's name ends with.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Estimate {
    /// The value.
    pub value: f64,
    /// Expanded uncertainty U = k u_c.
    pub expanded: f64,
    /// Coverage factor k at 95.45 %.
    pub coverage: f64,
    /// Effective degrees of freedom; absent where they are infinite.
    pub freedom: Option<f64>,
    /// Its lines, largest first.
    pub budget: Vec<Share>,
}

/// The results of one cell.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CellResult {
    /// The cell.
    pub cell: Cell,
    /// When the output went on, seconds since the record's start.
    pub energised_s: Figure<f64>,
    /// When it went off again.
    pub off_s: Figure<f64>,
    /// Whether the body was near ambient before it; the reason says why not.
    pub cold_start: Figure<()>,
    /// Switch-on from cold.
    pub inrush: Figure<Inrush>,
    /// Highest RMS current of a switch-on that was none from cold: another quantity.
    pub switch_in_peak: Figure<Estimate>,
    /// What the waveform of the switch-on says.
    pub waveform: Figure<Wave>,
    /// Why current and power factor are not to be believed: the meter loses the DC part.
    pub dc_lost: Option<String>,
    /// What it drew, settled or not: whether it works at all.
    pub drawn: Figure<Drawn>,
    /// When the soak settled, seconds after energising.
    pub settled_s: Figure<f64>,
    /// Settled input.
    pub steady: Figure<Steady>,
    /// Highest temperature of the body, after-heat included, corrected for calibration.
    pub body_peak: Figure<Peak>,
    /// The same at the highest ambient, placement allowance included.
    pub body_worst: Figure<Estimate>,
    /// Highest rise over ambient of every other temperature role, by role's name.
    pub rises: Vec<(String, Figure<Estimate>)>,
    /// Why the temperatures of this cell are not to be believed; empty where they are.
    pub disbelief: Vec<String>,
    /// Whether it was run with a named fault: then it is no normal operation, and only
    /// what the link did is judged.
    pub abnormal: bool,
}

/// What a thermal link did in an `abnormal` step.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Opening {
    /// The step's fault.
    pub fault: String,
    /// When the link opened, seconds since the record's start; absent where it did not.
    pub opened_s: Option<f64>,
    /// The body then.
    pub at_opening_degc: Figure<Estimate>,
    /// Highest temperature of the body within 10 min from then on.
    pub peak_degc: Figure<Estimate>,
    /// When it closed again, seconds after it opened; absent where it stayed open.
    pub closed_again_s: Option<f64>,
}

/// What a unit drew while it was energised, settled or not.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Drawn {
    /// Mean power over the last minute before OFF; of a cycling load, while it is on.
    pub power_w: f64,
    /// Floor of the meter's accuracy, below which nothing is told from nothing.
    pub floor_w: f64,
    /// When the power vanished for good, seconds after energising; absent where it did not.
    pub vanished_s: Option<f64>,
}

/// Switch-on, from samples and, where there is one, from the waveform.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Inrush {
    /// First current, seconds since the record's start.
    pub t0_s: f64,
    /// Highest RMS current: over one period of the waveform, or sampled.
    pub peak_a: Estimate,
    /// Whether it comes from the waveform.
    pub from_waveform: bool,
    /// Highest power sampled.
    pub peak_w: f64,
    /// When, seconds after t0.
    pub peak_after_s: f64,
    /// Peak over settled power, where that is known.
    pub ratio: Option<f64>,
    /// Time to fall half-way to settled power, seconds after the peak.
    pub half_way_s: Option<f64>,
    /// Energy above settled power, Wh.
    pub above_steady_wh: Option<f64>,
    /// Why it is a lower bound only; empty where nothing says so.
    pub lower_bound: Vec<String>,
    /// Why the supply limited it; absent where it did not.
    pub supply_limited: Option<String>,
    /// Impedance of the source, ohm; absent where it is unknown.
    pub source_ohm: Option<f64>,
    /// Phase of the voltage at the first current, degrees; absent where it is unknown.
    pub switching_angle_deg: Option<f64>,
}

/// What the waveform of a switch-on says, with uncertainty.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Wave {
    /// Everything that is computed from the block itself.
    pub shape: Shape,
    /// Length of the block, s.
    pub length_s: f64,
    /// Highest momentary current.
    pub momentary_peak_a: Estimate,
    /// Highest RMS over one period.
    pub peak_rms_a: Estimate,
    /// When that period began, seconds after the first current.
    pub peak_rms_after_s: f64,
    /// The harmonic nearest to its limit of IEC 61000-3-2 class A.
    pub harmonic: Figure<Harmonic>,
    /// The voltage change on the reference impedance of IEC 61000-3-3.
    pub change: Figure<Change>,
}

/// A harmonic and its limit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Harmonic {
    /// Its number; 1 is the fundamental.
    pub number: usize,
    /// Its RMS.
    pub rms_a: Estimate,
    /// Its limit, A.
    pub limit_a: f64,
    /// How many were compared, from the second on.
    pub compared: usize,
}

/// Relative voltage change of one switch-on: an indication.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Change {
    /// Largest, as a fraction.
    pub dmax: Estimate,
    /// When it began, seconds after the first current.
    pub dmax_after_s: f64,
    /// How long it stayed above 3.3 %, s.
    pub over_s: Estimate,
    /// Whether it still did at the block's end: the true time is longer.
    pub still_over: bool,
    /// Steady change, as a fraction.
    pub dc: Figure<Estimate>,
}

/// How an input depends on the voltage: d ln P / d ln V.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Exponent {
    /// Its value.
    pub value: f64,
    /// Its standard uncertainty.
    pub standard: f64,
    /// Of which distribution.
    pub distribution: super::budget::Distribution,
    /// Where it comes from: measured, or a house default.
    pub source: String,
}

/// Settled input.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Steady {
    /// Power referred to the cell's supply and the reference ambient; of a cycling load,
    /// while it is on.
    pub power_w: Estimate,
    /// Power as it was measured, at the plug.
    pub at_plug_w: Estimate,
    /// Voltage at the unit's plug.
    pub plug_v: Estimate,
    /// How the input depends on it.
    pub exponent: Exponent,
    /// Mean ambient in the window, where it was read.
    pub ambient_degc: Option<Estimate>,
    /// Mean temperature of the body in the window, where it was read.
    pub body_degc: Option<f64>,
    /// Mean power over the window, off times included; of a cycling load over whole
    /// cycles.
    pub mean_w: f64,
    /// What the mean rests on: an energy counter, or rows weighted by time.
    #[serde(default)]
    pub mean_from: String,
    /// Input of a representative period (IEC 60335-1 clause 10.1, from memory), as
    /// indicated, W.
    #[serde(default)]
    pub representative_w: Option<f64>,
    /// How it was found, in words.
    #[serde(default)]
    pub representative_how: Option<String>,
    /// Share of the window in which it is on; 1 where it does not cycle.
    pub duty: f64,
    /// Mean voltage.
    pub voltage_v: f64,
    /// Mean current while on.
    pub current_a: Option<f64>,
    /// Window, seconds since the record's start.
    pub from_s: f64,
    /// See `from_s`.
    pub to_s: f64,
    /// Samples in it.
    pub samples: usize,
    /// Effective number of independent samples.
    pub effective: f64,
    /// How it was called settled, in words.
    pub criterion: String,
    /// Whether the soak was ended early and the power is a predicted end.
    #[serde(default)]
    pub extrapolated: bool,
}

impl Steady {
    /// What a rule compares, as a share of the power while it is on: all of that, or that
    /// of a representative period.
    pub fn judged_share(&self, cycling: CyclingRule) -> f64 {
        match (cycling, self.representative_w) {
            (CyclingRule::RepresentativePeriod, Some(watts)) if self.at_plug_w.value > 0.0 => {
                watts / self.at_plug_w.value
            }
            _ => 1.0,
        }
    }
}

/// A highest temperature.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Peak {
    /// The temperature.
    pub temperature_degc: Estimate,
    /// When, seconds since the record's start.
    pub at_s: f64,
    /// Ambient then.
    pub ambient_degc: f64,
    /// Whether it came after the output went off.
    pub after_heat: bool,
}

/// An operator's answer that is a finding, or not.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Looked {
    /// The question.
    pub question: String,
    /// The answer.
    pub answer: String,
    /// The finding's class, where it is one.
    pub class: Option<crate::spec::sequence::FindingClass>,
}

/// What analysis says of a whole record.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Analysis {
    /// Results in the order of the plan's cells.
    pub cells: Vec<CellResult>,
    /// What thermal links did in `abnormal` steps, in the order of the plan.
    pub openings: Vec<Opening>,
    /// What the operator saw.
    pub looked: Vec<Looked>,
    /// Marks that earlier records left on the unit, in words.
    #[serde(default)]
    pub history: Vec<String>,
    /// The guard that tripped, where one did.
    pub tripped: Option<String>,
    /// Notes for the reader.
    pub notes: Vec<String>,
}
