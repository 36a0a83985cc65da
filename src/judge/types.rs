//! Findings and the verdict.

use serde::{Deserialize, Serialize};

use crate::analysis::Share;
use crate::spec::sequence::RuleWeight;

/// The outcomes of a guard-banded non-binary decision (terms of ILAC-G8:09/2019),
/// and "the data cannot carry a decision".
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
#[expect(missing_docs, reason = "the names say it")]
pub enum Outcome {
    Pass,
    ConditionalPass,
    ConditionalFail,
    Fail,
    NotJudged,
}

impl Outcome {
    /// In words.
    pub fn word(self) -> &'static str {
        match self {
            Outcome::Pass => "pass",
            Outcome::ConditionalPass => "conditional pass",
            Outcome::ConditionalFail => "conditional fail",
            Outcome::Fail => "fail",
            Outcome::NotJudged => "not judged",
        }
    }

    /// How much it weighs in a verdict: 0 for a pass up to 4 for a fail. What is not
    /// judged outweighs a conditional fail, because it could be a fail.
    pub fn rank(self) -> u8 {
        match self {
            Outcome::Pass => 0,
            Outcome::ConditionalPass => 1,
            Outcome::ConditionalFail => 2,
            Outcome::NotJudged => 3,
            Outcome::Fail => 4,
        }
    }
}

/// One rule's outcome.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Finding {
    /// The rule, in words: `power, position high`.
    pub rule: String,
    /// Condition that it was judged in, where there is one.
    pub condition: Option<String>,
    /// Position, where it is of one.
    pub position: Option<String>,
    /// Supply, in words, where it is of one.
    pub supply: Option<String>,
    /// Required or information.
    pub weight: RuleWeight,
    /// How it was decided, in words, where an uncertain value was compared.
    #[serde(default)]
    pub decision: Option<String>,
    /// The outcome.
    pub outcome: Outcome,
    /// The value compared, base unit.
    pub value: Option<f64>,
    /// Its expanded uncertainty.
    pub expanded: Option<f64>,
    /// The coverage factor of U.
    #[serde(default)]
    pub coverage: Option<f64>,
    /// The lines of the value's budget, largest first.
    #[serde(default)]
    pub budget: Vec<Share>,
    /// Unit of value, U, limits and margin, for people.
    pub unit: String,
    /// Lower limit.
    pub at_least: Option<f64>,
    /// Upper limit.
    pub at_most: Option<f64>,
    /// Distance to the nearer limit, positive is good.
    pub margin: Option<f64>,
    /// Probability that the true value conforms, where it can be said.
    pub probability: Option<f64>,
    /// What the decision risks for a stated process, where one is stated.
    #[serde(default)]
    pub risks: Option<ProcessRisks>,
    /// Where the limits come from.
    pub source: String,
    /// Why, in one sentence: the reason for `not judged`, or what a fail means.
    pub reason: String,
}

/// What a decision rule risks over many units of a process that spreads normally
/// (JCGM 106:2012, 9.3 to 9.5).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ProcessRisks {
    /// Share of units that conform.
    pub conforming: f64,
    /// Share of units that do not conform and are accepted.
    pub consumer: f64,
    /// Share of units that conform and are not accepted.
    pub producer: f64,
}

impl Finding {
    /// The unit of a difference: a margin of temperatures is in kelvins.
    pub fn margin_unit(&self) -> &str {
        if self.unit == "°C" { "K" } else { &self.unit }
    }
}

/// The whole unit's outcome.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Judgement {
    /// The unit's verdict.
    pub verdict: Outcome,
    /// The one reason that decided it.
    pub because: String,
    /// Every finding.
    pub findings: Vec<Finding>,
    /// To which side a value on its limit belongs.
    #[serde(default)]
    pub convention: String,
    /// Whose rules these are, where they are not those that were fixed before the run.
    #[serde(default)]
    pub other_rules: Option<String>,
    /// What stays with the unit on every later record.
    #[serde(default)]
    pub marks: Vec<Mark>,
}

/// What stays with a unit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(tag = "mark", rename_all = "kebab-case")]
pub enum Mark {
    /// Its thermal link was hotter than its holding temperature: it may open early ever
    /// after. Gone when the link is replaced.
    LinkStressed {
        /// By what, in words.
        by: String,
    },
    /// It was run with a fault until its link opened: not to be used any more.
    Destroyed {
        /// By what, in words.
        by: String,
    },
}

impl Mark {
    /// The word.
    pub fn word(&self) -> &'static str {
        match self {
            Mark::LinkStressed { .. } => "link stressed",
            Mark::Destroyed { .. } => "destroyed",
        }
    }

    /// By what, in words.
    pub fn by(&self) -> &str {
        match self {
            Mark::LinkStressed { by } | Mark::Destroyed { by } => by,
        }
    }
}
