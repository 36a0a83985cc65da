//! Exit codes: what a script may rely on.

use std::process::ExitCode;

use crate::judge::Outcome;

/// How the program ends.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Exit {
    /// The verb did what it was asked for; where a unit was judged, it passed.
    Good,
    /// Conditional pass.
    ConditionalPass,
    /// Arguments that are not understood.
    Usage,
    /// Conditional fail.
    ConditionalFail,
    /// Fail.
    Fail,
    /// Not judged.
    NotJudged,
    /// A file that can't be used.
    BadInput,
    /// A bench or an instrument failed, or the run was cut short, and no verdict says fail.
    CutShort,
    /// OFF was not confirmed: pull the plug.
    OffUnconfirmed,
    /// The record can't be written or read.
    Record,
}

impl Exit {
    /// Every code, with what it means, as `--help` and the README print them.
    pub const TABLE: [(Exit, &'static str); 10] = [
        (Exit::Good, "done; where a unit was judged: pass"),
        (Exit::ConditionalPass, "conditional pass"),
        (Exit::Usage, "arguments not understood"),
        (Exit::ConditionalFail, "conditional fail"),
        (Exit::Fail, "fail"),
        (Exit::NotJudged, "not judged"),
        (Exit::BadInput, "a file can't be used"),
        (
            Exit::CutShort,
            "the run was cut short: trip, stop, or a lost instrument",
        ),
        (Exit::OffUnconfirmed, "OFF was not confirmed: pull the plug"),
        (Exit::Record, "the record can't be written or read"),
    ];

    /// The number.
    pub fn code(self) -> u8 {
        match self {
            Exit::Good => 0,
            Exit::ConditionalPass => 1,
            Exit::Usage => 2,
            Exit::ConditionalFail => 3,
            Exit::Fail => 4,
            Exit::NotJudged => 5,
            Exit::BadInput => 10,
            Exit::CutShort => 11,
            Exit::OffUnconfirmed => 12,
            Exit::Record => 13,
        }
    }

    /// The code of a verdict.
    pub fn of(verdict: Outcome) -> Self {
        match verdict {
            Outcome::Pass => Exit::Good,
            Outcome::ConditionalPass => Exit::ConditionalPass,
            Outcome::ConditionalFail => Exit::ConditionalFail,
            Outcome::Fail => Exit::Fail,
            Outcome::NotJudged => Exit::NotJudged,
        }
    }
}

impl From<Exit> for ExitCode {
    fn from(exit: Exit) -> Self {
        ExitCode::from(exit.code())
    }
}
