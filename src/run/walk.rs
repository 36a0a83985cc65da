//! Walks a plan step by step. Whatever ends a step early ends the run, and every
//! way out leads through OFF.

use std::any::Any;
use std::io;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::task::Poll;

use super::bay::{Bay, Cut, Working, lock};
use super::goal::{Cooling, Goal};
use super::operator::{Prompt, Want, understand};
use super::preflight::{Cleared, Permissions, clear};
use super::waveform;
use crate::bench::Change;
use crate::plan::{Action, PlannedStep};
use crate::quantity::{Moment, Seconds};
use crate::record::{Event, Manifest, RunOutcome, StepEnd};
use crate::settle::Settle;
use crate::spec::sequence::{Question, RoleKind, SupplyPoint};

/// How long the first readings of a polled step may take at the most.
const FIRST_READINGS: Seconds = Seconds::whole(10);

/// Polling before energising where no later step of the cell says how fast.
const USUAL_POLLING: Seconds = Seconds::whole(1);

/// A run's end, and what could not be done about it.
#[derive(Debug)]
pub struct Ended {
    /// How it ended.
    pub outcome: RunOutcome,
    /// The manifest, where the record could be closed.
    pub manifest: Result<Manifest, io::Error>,
    /// Why OFF was not confirmed, where it was not: the operator must pull the plug.
    pub off_unconfirmed: Option<String>,
}

/// Runs a bay's plan to its end. The record is closed and the lines are ended when
/// this returns; dropping the future de-energises through the lease.
pub async fn run(bay: Bay, permissions: Permissions, cautions: &str) -> Ended {
    let journal = bay.journal.clone();
    let mut working = Working::new(bay);
    let walked = unpanicked(walk(&mut working, permissions, cautions)).await;
    switch_off(&mut working, walked.as_ref().err()).await;
    let recorded = record_cut(&mut working, &walked);
    let closing = end_lines(&mut working).await;
    let rest = working.write_rest();
    let outcome = outcome_of(walked, [recorded, rest]);
    let manifest = lock(&journal).close(working.clock.now(), outcome.clone());
    let off_unconfirmed = working.off_trouble.take().or(closing);
    Ended {
        outcome,
        manifest,
        off_unconfirmed,
    }
}

/// Turns a panic into a cut, so that the way out is the same as for every other end.
async fn unpanicked(walking: impl Future<Output = Result<(), Cut>>) -> Result<(), Cut> {
    let mut walking = std::pin::pin!(walking);
    std::future::poll_fn(|cx| {
        let polled = catch_unwind(AssertUnwindSafe(|| walking.as_mut().poll(cx)));
        polled.unwrap_or_else(|panic| Poll::Ready(Err(Cut::Failed(words_of(&*panic)))))
    })
    .await
}

fn words_of(panic: &(dyn Any + Send)) -> String {
    let text = panic.downcast_ref::<String>().map(String::as_str);
    let text = text.or_else(|| panic.downcast_ref::<&str>().copied());
    format!(
        "the program itself failed: {}",
        text.unwrap_or("no reason given")
    )
}

async fn walk(bay: &mut Working, permissions: Permissions, cautions: &str) -> Result<(), Cut> {
    let date = bay.clock.started().to_rfc3339();
    bay.note(Event::Started { date })?;
    let cleared = clear(bay, permissions, cautions).await?;
    let plan = bay.plan.clone();
    for (number, step) in plan.steps.iter().enumerate() {
        bay.step = step.number;
        bay.cell = step.cell;
        bay.note(Event::StepBegan { step: step.number })?;
        let end = take_step(bay, &cleared, step, &plan.steps[number + 1..]).await;
        let shown = end.as_ref().map_or(StepEnd::Cut, Clone::clone);
        if let Err(cut) = end {
            // OFF is sent before the step's end is recorded.
            switch_off(bay, Some(&cut)).await;
            bay.note(Event::StepEnded {
                step: step.number,
                end: shown,
            })?;
            return Err(cut);
        }
        bay.note(Event::StepEnded {
            step: step.number,
            end: shown,
        })?;
    }
    Ok(())
}

async fn take_step(
    bay: &mut Working,
    cleared: &Cleared,
    step: &PlannedStep,
    later: &[PlannedStep],
) -> Result<StepEnd, Cut> {
    match &step.action {
        Action::Instruct(text) => touch(bay, text.clone(), Want::Done).await,
        Action::SetCondition {
            condition,
            instruction,
        } => {
            let want = Want::Condition {
                name: condition.clone(),
            };
            touch(bay, instruction.clone(), want).await
        }
        Action::Ask(question) => ask(bay, question).await,
        Action::SetSupply(point) => set_supply(bay, *point).await,
        Action::SetPosition {
            position,
            number,
            by_switch,
        } => set_position(bay, position, *number, *by_switch).await,
        Action::Energise => energise(bay, cleared, later).await,
        Action::Deenergise => deenergise(bay).await,
        Action::Inrush(timed) => {
            let end = stay(bay, &step.action, timed.length, timed.every).await?;
            waveform::fetch(bay).await?;
            Ok(end)
        }
        Action::Measure(timed) | Action::RunIn(timed) => {
            stay(bay, &step.action, timed.length, timed.every).await
        }
        Action::Soak { at_most, every, .. } => soak(bay, &step.action, *at_most, *every).await,
        Action::Acclimatise(waiting) | Action::Rest(waiting) => {
            bay.poll_every(waiting.every);
            let rest = matches!(step.action, Action::Rest(_));
            let cooling = Cooling::new(waiting.within, waiting.at_most, bay.clock.now(), rest);
            bay.attend(&mut Goal::Cool(cooling)).await
        }
        Action::Abnormal {
            length,
            every,
            body,
            ..
        } => {
            bay.watchman.body_limit(*body);
            stay(bay, &step.action, *length, *every).await
        }
    }
}

/// The operator touches the unit: only with OFF confirmed, and with nothing polled.
async fn touch(bay: &mut Working, text: String, want: Want) -> Result<StepEnd, Cut> {
    bay.poll_nothing();
    let Some(off) = bay.off.take() else {
        return Err(Cut::Failed(
            "a unit may be touched only after OFF was confirmed".to_owned(),
        ));
    };
    let prompt = Prompt::touching(&off, &bay.plan.bay.name, &bay.unit, text, want);
    bay.off = Some(off);
    bay.ask(&prompt).await?;
    Ok(StepEnd::Done)
}

async fn ask(bay: &mut Working, question: &Question) -> Result<StepEnd, Cut> {
    if bay.lease.is_none() {
        bay.poll_nothing();
    }
    let want = Want::Answer(question.clone());
    let prompt = Prompt::looking(&bay.plan.bay.name, &bay.unit, question.text.clone(), want);
    loop {
        let said = bay.ask(&prompt).await?;
        if let Some((answer, finding)) = understand(question, &said) {
            bay.note(Event::Answered {
                text: question.text.clone(),
                answer,
                finding,
            })?;
            return Ok(StepEnd::Done);
        }
        bay.note(Event::Noted {
            text: format!("not an answer to this question: {said:?}"),
        })?;
    }
}

async fn set_supply(bay: &mut Working, point: SupplyPoint) -> Result<StepEnd, Cut> {
    let plan = bay.plan.clone();
    let Some((_, role)) = plan.role_of_kind(RoleKind::Supply) else {
        return Err(Cut::Failed("the plan has no supply".to_owned()));
    };
    let driver = &plan.instrument_of(role).driver;
    let (line, index) = bay.instrument_of(role);
    let what = format!("{} {}", point.voltage, point.frequency);
    bay.note(Event::SupplySet { what })?;
    line.change(index, Change::Voltage(point.voltage)).await?;
    if driver.settings.frequency.is_some() {
        line.change(index, Change::Frequency(point.frequency))
            .await?;
    }
    Ok(StepEnd::Done)
}

async fn set_position(
    bay: &mut Working,
    position: &str,
    number: u32,
    by_switch: bool,
) -> Result<StepEnd, Cut> {
    let by = if by_switch { "switch" } else { "operator" };
    if by_switch {
        bay.note(Event::PositionSet {
            position: position.to_owned(),
            by: by.to_owned(),
        })?;
        let plan = bay.plan.clone();
        let Some((_, role)) = plan.role_of_kind(RoleKind::PositionSwitch) else {
            return Err(Cut::Failed("the plan has no position switch".to_owned()));
        };
        let (line, index) = bay.instrument_of(role);
        line.change(index, Change::Position(number)).await?;
    } else {
        let text = format!("Set the unit's switch to `{position}`.");
        touch(
            bay,
            text,
            Want::Position {
                name: position.to_owned(),
            },
        )
        .await?;
        bay.note(Event::PositionSet {
            position: position.to_owned(),
            by: by.to_owned(),
        })?;
    }
    Ok(StepEnd::Done)
}

/// Takes the proof of the pre-flight check; every sensor has answered before.
async fn energise(
    bay: &mut Working,
    _cleared: &Cleared,
    later: &[PlannedStep],
) -> Result<StepEnd, Cut> {
    bay.poll_every(next_interval(later));
    let missing = bay.polled_roles();
    let limit = bay.clock.now() + FIRST_READINGS;
    if bay.attend(&mut Goal::Heard { missing, limit }).await? == StepEnd::TimeLimit {
        return Err(Cut::Failed(format!(
            "not every sensor gave a reading within {FIRST_READINGS}: the unit is not energised"
        )));
    }
    if matches!(later.first(), Some(step) if waveform::is_wanted(&step.action)) {
        waveform::arm(bay).await?;
    }
    let plan = bay.plan.clone();
    let Some((_, role)) = plan.role_of_kind(RoleKind::Supply) else {
        return Err(Cut::Failed("the plan has no supply".to_owned()));
    };
    let (line, index) = bay.instrument_of(role);
    let announced = bay.announce(Event::Energising)?;
    bay.off = None;
    bay.energised_at = Some(announced);
    bay.watchman.energised(announced, bay.cell);
    bay.lease = Some(line.energise(index).await?);
    bay.note(Event::Energised)?;
    Ok(StepEnd::Done)
}

fn next_interval(later: &[PlannedStep]) -> Seconds {
    let every = later.iter().find_map(|step| match &step.action {
        Action::Inrush(timed) | Action::Measure(timed) | Action::RunIn(timed) => Some(timed.every),
        Action::Soak { every, .. } | Action::Abnormal { every, .. } => Some(*every),
        _ => None,
    });
    every.unwrap_or(USUAL_POLLING)
}

async fn deenergise(bay: &mut Working) -> Result<StepEnd, Cut> {
    if let Some(lease) = bay.lease.take() {
        let off = lease.close("as planned").await;
        bay.watchman.off();
        bay.energised_at = None;
        bay.off = Some(off?);
        bay.write_told()?;
    }
    Ok(StepEnd::Done)
}

/// Energised for a time; the inrush counts from the moment of energising.
async fn stay(
    bay: &mut Working,
    action: &Action,
    length: Seconds,
    every: Seconds,
) -> Result<StepEnd, Cut> {
    bay.poll_every(every);
    let from = match (action, bay.energised_at) {
        (Action::Inrush(_), Some(on)) => on,
        _ => bay.clock.now(),
    };
    bay.attend(&mut Goal::Until(from + length)).await
}

async fn soak(
    bay: &mut Working,
    action: &Action,
    at_most: Seconds,
    every: Seconds,
) -> Result<StepEnd, Cut> {
    bay.poll_every(every);
    let on = bay.energised_at.unwrap_or(Moment::START);
    let Some(soaking) = bay.plan.soaking(action) else {
        return Err(Cut::Failed("the plan's soak is none".to_owned()));
    };
    let settle = Box::new(Settle::new(soaking, on));
    bay.attend(&mut Goal::Settled {
        settle,
        limit: on + at_most,
    })
    .await
}

/// Sends OFF and waits for its confirmation, whatever ended the walk.
async fn switch_off(bay: &mut Working, cut: Option<&Cut>) {
    let Some(lease) = bay.lease.take() else {
        return;
    };
    let closed = lease.close(&cause_of(cut)).await;
    bay.watchman.off();
    bay.energised_at = None;
    match closed {
        Ok(off) => bay.off = Some(off),
        Err(error) => bay.off_trouble = Some(error.to_string()),
    }
}

fn cause_of(cut: Option<&Cut>) -> String {
    match cut {
        None => "the end of the run".to_owned(),
        Some(Cut::Tripped(trip)) => format!("trip: {}", trip.reason),
        Some(Cut::Stopped) => "stopped by the operator".to_owned(),
        Some(Cut::Lost { instrument, .. }) => format!("lost `{instrument}`"),
        Some(Cut::Failed(reason)) => reason.clone(),
        Some(Cut::Record(error)) => format!("the record can't be written: {error}"),
    }
}

fn record_cut(bay: &mut Working, walked: &Result<(), Cut>) -> Result<(), Cut> {
    bay.poll_nothing();
    let event = match walked {
        Ok(()) | Err(Cut::Record(_)) => return Ok(()),
        Err(Cut::Tripped(trip)) => Event::Tripped {
            reason: trip.reason.clone(),
        },
        Err(Cut::Stopped) => Event::Stopped,
        Err(Cut::Lost { instrument, detail }) => Event::Lost {
            instrument: instrument.clone(),
            detail: detail.clone(),
        },
        Err(Cut::Failed(reason)) => Event::Noted {
            text: reason.clone(),
        },
    };
    bay.write_told().and(bay.note(event))
}

async fn end_lines(bay: &mut Working) -> Option<String> {
    let mut trouble = None;
    for line in std::mem::take(&mut bay.lines) {
        if let Err(error) = line.close().await {
            trouble.get_or_insert(error.to_string());
        }
    }
    trouble
}

/// A failure to write the record outweighs what ended the walk: the record is not whole.
fn outcome_of(walked: Result<(), Cut>, written: [Result<(), Cut>; 2]) -> RunOutcome {
    let unwritten = written
        .into_iter()
        .filter_map(Result::err)
        .find(|cut| matches!(cut, Cut::Record(_)));
    match unwritten.map_or(walked, Err) {
        Ok(()) => RunOutcome::Complete,
        Err(Cut::Tripped(trip)) => RunOutcome::Tripped {
            reason: trip.reason,
            speaks_of: trip.speaks_of,
        },
        Err(Cut::Stopped) => RunOutcome::Stopped,
        Err(Cut::Lost { detail, .. }) => RunOutcome::Failed { reason: detail },
        Err(Cut::Failed(reason)) => RunOutcome::Failed { reason },
        Err(Cut::Record(error)) => RunOutcome::Failed {
            reason: format!("the record can't be written: {error}"),
        },
    }
}
