//! What a record holds: samples, events, the manifest.

use serde::{Deserialize, Serialize};

use crate::quantity::{Moment, Readings, Waveform};
use crate::spec::sequence::FindingClass;

/// Version of the record's layout; raised when its meaning changes.
pub const RECORD_FORMAT: u32 = 1;

/// One exchange with its request and reply times and its readings.
#[derive(Debug, Clone, PartialEq)]
pub struct Sample {
    /// From 1, without gaps.
    pub seq: u64,
    /// When the request's first byte was written.
    pub request: Moment,
    /// When the reply was complete, or was given up.
    pub reply: Moment,
    /// The step's number.
    pub step: u32,
    /// Index into the plan's cells.
    pub cell: Option<usize>,
    /// Index into the bay's roles.
    pub role: usize,
    /// Whether the output was on when the request was sent.
    pub energised: bool,
    /// Whether there is a value.
    pub status: Status,
    /// The values.
    pub readings: Readings,
}

/// The voltage and current that were fetched as one block while a cell was switched on.
#[derive(Debug, Clone, PartialEq)]
pub struct StoredWaveform {
    /// Index into the plan's cells.
    pub cell: usize,
    /// The block.
    pub wave: Waveform,
}

/// What became of an exchange.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
#[expect(missing_docs, reason = "the names say it")]
pub enum Status {
    Ok,
    Overload,
    NoValue,
    Garbled,
    NoReply,
}

impl Status {
    /// Every status.
    pub const ALL: [Status; 5] = [
        Status::Ok,
        Status::Overload,
        Status::NoValue,
        Status::Garbled,
        Status::NoReply,
    ];

    /// The word in `samples.csv`.
    pub fn word(self) -> &'static str {
        match self {
            Status::Ok => "ok",
            Status::Overload => "overload",
            Status::NoValue => "no-value",
            Status::Garbled => "garbled",
            Status::NoReply => "no-reply",
        }
    }
}

/// Something that happened, recorded before its effect.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(tag = "event", rename_all = "kebab-case")]
pub enum Event {
    /// The run began.
    Started {
        /// Wall date and time, RFC 3339.
        date: String,
    },
    /// The cautions were shown and acknowledged.
    CautionsAcknowledged {
        /// By whom.
        by: String,
    },
    /// An instrument said who it is.
    Identified {
        /// Instrument's name.
        instrument: String,
        /// Its reply.
        reply: String,
    },
    /// A step began.
    StepBegan {
        /// Its number.
        step: u32,
    },
    /// A step ended.
    StepEnded {
        /// Its number.
        step: u32,
        /// How.
        end: StepEnd,
    },
    /// The operator was asked.
    Prompted {
        /// The text.
        text: String,
    },
    /// The operator answered.
    Answered {
        /// The question.
        text: String,
        /// The answer.
        answer: String,
        /// The finding that it is, where it is one.
        finding: Option<FindingClass>,
    },
    /// The supply was set and read back.
    SupplySet {
        /// In words.
        what: String,
    },
    /// The unit's switch was set.
    PositionSet {
        /// Position's name.
        position: String,
        /// `switch` or `operator`.
        by: String,
    },
    /// The output is about to be switched on.
    Energising,
    /// The output was read back as on.
    Energised,
    /// OFF was sent.
    Off {
        /// Why.
        cause: String,
        /// Whether it was read back.
        confirmed: bool,
    },
    /// A waveform was fetched and stored.
    WaveformStored {
        /// Index into the plan's cells.
        cell: usize,
        /// The file in `run/`.
        file: String,
        /// Its samples.
        samples: u64,
    },
    /// A waveform was wanted and is not there.
    WaveformFailed {
        /// Index into the plan's cells.
        cell: usize,
        /// Why.
        reason: String,
    },
    /// A guard tripped.
    Tripped {
        /// Which, in words, with value and limit.
        reason: String,
    },
    /// An exchange failed and was given up.
    Lost {
        /// Instrument.
        instrument: String,
        /// What was sent, received, and how long was waited.
        detail: String,
    },
    /// An earlier record left a mark on the unit.
    Marked {
        /// The mark, in words.
        mark: String,
        /// By what.
        by: String,
        /// Which record.
        record: String,
    },
    /// The operator says that the unit has a new thermal link.
    LinkReplaced,
    /// The operator stopped the run.
    Stopped,
    /// Something worth knowing.
    Noted {
        /// What.
        text: String,
    },
    /// The run's end.
    Ended {
        /// How.
        outcome: RunOutcome,
    },
}

/// How a step ended.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum StepEnd {
    /// As planned.
    Done,
    /// A soak was settled.
    Settled,
    /// A soak was ended early by predictions that agree, as the sequence allows.
    Extrapolated,
    /// Its time limit came first.
    TimeLimit,
    /// The current vanished while energised.
    WentOpen,
    /// It was cut short.
    Cut,
}

/// How a run ended.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(tag = "outcome", rename_all = "kebab-case")]
pub enum RunOutcome {
    /// Every step was walked.
    Complete,
    /// A guard tripped.
    Tripped {
        /// Which.
        reason: String,
        /// Whether it speaks about the unit (temperature, input, current) or about
        /// the bench (silence, a sensor that can't be believed).
        speaks_of: TripOf,
    },
    /// The operator stopped it.
    Stopped,
    /// Something failed.
    Failed {
        /// What.
        reason: String,
    },
    /// It was found open and was closed afterwards.
    Interrupted,
}

/// What a trip is evidence of.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum TripOf {
    /// The unit: it was too hot, or drew too much.
    Unit,
    /// The bench: an instrument was silent, or a sensor can't be believed.
    Bench,
}

/// An event and when.
#[derive(Debug, Clone, PartialEq)]
pub struct Happening {
    /// From 1, without gaps.
    pub seq: u64,
    /// When.
    pub at: Moment,
    /// What.
    pub event: Event,
}

/// What the run's manifest says, written last.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Manifest {
    /// [`RECORD_FORMAT`] of the writer.
    pub format: u32,
    /// The program and its version.
    pub program: String,
    /// The record's id.
    pub record: String,
    /// The unit's number.
    pub unit: String,
    /// The operator's name.
    pub operator: String,
    /// `VIRTUAL BENCH` where any instrument was virtual; absent on a real one.
    pub virtual_bench: Option<String>,
    /// Seed of a virtual bench.
    pub seed: Option<u64>,
    /// Date and time of the start, RFC 3339.
    pub started: String,
    /// The run's length in whole microseconds.
    pub length_us: u64,
    /// How it ended.
    pub outcome: RunOutcome,
    /// Rows of `samples.csv`.
    pub samples: u64,
    /// Files of `run/` with their SHA-256, by name.
    pub files: Vec<FileHash>,
}

/// One file and its hash.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct FileHash {
    /// Name within the folder.
    pub name: String,
    /// SHA-256 in hexadecimal.
    pub sha256: String,
}
