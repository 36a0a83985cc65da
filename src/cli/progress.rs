//! A run as lines: what happened, when, in words.

use super::say::{clock_face, complain, say};
use crate::plan::{Cell, Plan};
use crate::record::{Event, Happening, StepEnd};
use crate::run::Observer;

/// Prints a run's events as lines.
#[derive(Debug, Default)]
pub struct Lines {
    quiet: bool,
}

impl Lines {
    /// Prints everything worth following, or only what went wrong.
    pub fn new(quiet: bool) -> Self {
        Self { quiet }
    }
}

impl Observer for Lines {
    fn happened(&mut self, plan: &Plan, happening: &Happening) {
        let time = clock_face(happening.at.as_secs_f64());
        match told(plan, &happening.event) {
            Some(Told::Trouble(text)) => complain(&format!("{time}  {text}")),
            Some(Told::Course(text)) if !self.quiet => say(&format!("{time}  {text}")),
            _ => {}
        }
    }
}

enum Told {
    Course(String),
    Trouble(String),
}

fn told(plan: &Plan, event: &Event) -> Option<Told> {
    let course = |text: String| Some(Told::Course(text));
    let trouble = |text: String| Some(Told::Trouble(text));
    match event {
        Event::Identified { instrument, reply } => course(format!("{instrument} is {reply}")),
        Event::StepEnded { step, end } => step_ended(plan, *step, end).map(Told::Course),
        Event::Energised => course("ENERGISED".to_owned()),
        Event::Off {
            cause,
            confirmed: true,
        } => course(format!("OFF confirmed ({cause})")),
        Event::Off {
            cause,
            confirmed: false,
        } => trouble(format!(
            "OFF NOT CONFIRMED ({cause}): press the emergency stop or pull the plug before you touch the unit"
        )),
        Event::Answered {
            text,
            answer,
            finding,
        } => course(match finding {
            None => format!("{text} {answer}"),
            Some(class) => format!("{text} {answer} ({class:?} finding)").to_lowercase(),
        }),
        Event::PositionSet { position, by } => course(format!("position {position}, by the {by}")),
        Event::SupplySet { what } => course(format!("supply {what}")),
        Event::WaveformStored { file, samples, .. } => {
            course(format!("waveform of {samples} samples in {file}"))
        }
        Event::WaveformFailed { reason, .. } => trouble(format!("no waveform: {reason}")),
        Event::Tripped { reason } => trouble(format!("TRIP: {reason}")),
        Event::Lost { detail, .. } => trouble(detail.clone()),
        Event::Stopped => trouble("stopped by the operator".to_owned()),
        Event::Noted { text } => trouble(text.clone()),
        Event::Marked { mark, by, record } => trouble(format!(
            "record {record} left the unit marked `{mark}`: {by}"
        )),
        Event::LinkReplaced => trouble("the unit has a new thermal link".to_owned()),
        Event::Started { .. }
        | Event::CautionsAcknowledged { .. }
        | Event::StepBegan { .. }
        | Event::Prompted { .. }
        | Event::Energising
        | Event::Ended { .. } => None,
    }
}

/// Steps that last; the others are told by what they bring about.
fn step_ended(plan: &Plan, number: u32, end: &StepEnd) -> Option<String> {
    let step = plan.steps.iter().find(|step| step.number == number)?;
    let verb = step.action.verb();
    if !matches!(
        verb,
        "acclimatise" | "inrush" | "soak" | "measure" | "rest" | "run in" | "abnormal"
    ) {
        return None;
    }
    let place = step.cell.map_or(String::new(), |cell| {
        format!(", {}", cell_words(&plan.cells[cell]))
    });
    let how = match end {
        StepEnd::Done => "done",
        StepEnd::Settled => "settled",
        StepEnd::Extrapolated => "ended early: its end is extrapolated",
        StepEnd::TimeLimit => "ended by its time limit",
        StepEnd::WentOpen => "ended: the current vanished",
        StepEnd::Cut => "cut short",
    };
    Some(format!("{verb}{place}: {how}"))
}

/// A cell in words: `dry, high, 230 V 50 Hz`.
pub fn cell_words(cell: &Cell) -> String {
    let supply = crate::record::supply_words(cell);
    match &cell.condition {
        Some(condition) => format!("{condition}, {}, {supply}", cell.position),
        None => format!("{}, {supply}", cell.position),
    }
}
