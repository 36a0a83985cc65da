//! Every way out of a run de-energises, and the record says so.

use std::path::Path;
use std::sync::{Arc, Mutex};

use rateplate::clock::Clock;
use rateplate::plan::Plan;
use rateplate::quantity::Seconds;
use rateplate::record::{Event, Folder, FolderStore, Happening, RunOutcome};
use rateplate::run::{Answering, Ended, Observer, Operator, Prompt, Reply, Want};
use rateplate::virtual_bench::VirtualBench;

use crate::bench_of_tests::{SHORT, Setup, Willing, bay, paused, plan_of, run_bay, virtual_bench};

/// Plays the short sequence with faults; gives the end, the bench and the record.
fn play(folder: &Path, faults: &[&str]) -> (Ended, VirtualBench, Folder) {
    let plan = plan_of(SHORT);
    let bench = virtual_bench(&plan, 1, faults);
    let ended = paused().block_on(async {
        let clock = Clock::simulated();
        let store = FolderStore::create(&folder.join("run")).unwrap();
        let (_stop, stopped) = tokio::sync::watch::channel(false);
        let setup = Setup::willing(&bench, &clock, stopped);
        run_bay(bay(&plan, &bench, Box::new(store), &clock, setup).unwrap()).await
    });
    let record = Folder::open(folder).unwrap();
    (ended, bench, record)
}

fn offs(record: &Folder) -> usize {
    record
        .happenings
        .iter()
        .filter(|h| {
            matches!(
                h.event,
                Event::Off {
                    confirmed: true,
                    ..
                }
            )
        })
        .count()
}

fn energised(record: &Folder) -> usize {
    record
        .happenings
        .iter()
        .filter(|h| h.event == Event::Energised)
        .count()
}

#[test]
fn a_run_that_ends_as_planned_is_off_at_its_end() {
    let folder = tempfile::tempdir().unwrap();
    let (ended, bench, record) = play(folder.path(), &[]);
    assert_eq!(ended.outcome, RunOutcome::Complete);
    assert!(!bench.output_is_on());
    assert_eq!(energised(&record), 2);
    assert!(offs(&record) >= 2);
    assert!(ended.off_unconfirmed.is_none());
}

#[test]
fn an_instrument_that_falls_silent_or_garbles_or_hangs_up_ends_the_run_with_off() {
    for fault in ["no-reply@400s", "garbled@400s", "disconnect@400s"] {
        let folder = tempfile::tempdir().unwrap();
        let (ended, bench, record) = play(folder.path(), &[fault]);
        let RunOutcome::Failed { reason } = &ended.outcome else {
            panic!("{fault}: {:?}", ended.outcome)
        };
        assert!(!bench.output_is_on(), "{fault}");
        assert_eq!(energised(&record), 1, "{fault}: {reason}");
        assert!(offs(&record) >= 1, "{fault}");
        let last = record.happenings.iter().rev().find_map(|h| match &h.event {
            Event::Lost { instrument, detail } => Some((instrument.clone(), detail.clone())),
            _ => None,
        });
        let (instrument, detail) = last.unwrap_or_else(|| panic!("{fault}: no loss in the record"));
        assert!(detail.contains(&instrument), "{fault}: {detail}");
        assert_eq!(&detail, reason, "{fault}");
    }
}

#[test]
fn a_wrong_identity_is_found_before_anything_is_energised() {
    let folder = tempfile::tempdir().unwrap();
    let (ended, _, record) = play(folder.path(), &["wrong-identity"]);
    assert!(
        matches!(&ended.outcome, RunOutcome::Failed { reason } if reason.contains("identity")),
        "{:?}",
        ended.outcome
    );
    assert_eq!(energised(&record), 0);
}

#[test]
fn a_sensor_that_fell_off_trips_a_unit_that_draws_power() {
    let folder = tempfile::tempdir().unwrap();
    let (ended, bench, record) = play(folder.path(), &["sensor-fallen-off"]);
    let RunOutcome::Tripped { reason, .. } = &ended.outcome else {
        panic!("{:?}", ended.outcome)
    };
    assert!(reason.contains("has not risen"), "{reason}");
    assert!(!bench.output_is_on());
    assert!(offs(&record) >= 1);
}

#[test]
fn a_body_sensor_that_opens_leaves_no_unit_energised() {
    let folder = tempfile::tempdir().unwrap();
    let (ended, bench, _) = play(folder.path(), &["sensor-open"]);
    assert_ne!(ended.outcome, RunOutcome::Complete);
    assert!(!bench.output_is_on());
}

/// Panics when a step of the plan begins.
struct Panicking {
    at_step: u32,
}

impl Observer for Panicking {
    fn happened(&mut self, _: &Plan, happening: &Happening) {
        let begins = happening.event == Event::StepBegan { step: self.at_step };
        assert!(!begins, "a test's own panic");
    }
}

/// The number of the first step of a kind.
fn step_of(plan: &Plan, verb: &str) -> u32 {
    plan.steps
        .iter()
        .find(|step| step.action.verb() == verb)
        .unwrap()
        .number
}

#[test]
fn a_panic_in_the_bays_task_de_energises_and_the_record_is_closed() {
    let folder = tempfile::tempdir().unwrap();
    let plan = plan_of(SHORT);
    let bench = virtual_bench(&plan, 1, &[]);
    let ended = paused().block_on(async {
        let clock = Clock::simulated();
        let store = FolderStore::create(&folder.path().join("run")).unwrap();
        let (_stop, stopped) = tokio::sync::watch::channel(false);
        let observer = Box::new(Panicking {
            at_step: step_of(&plan, "soak"),
        });
        let setup = Setup {
            observer,
            ..Setup::willing(&bench, &clock, stopped)
        };
        run_bay(bay(&plan, &bench, Box::new(store), &clock, setup).unwrap()).await
    });
    assert!(
        matches!(&ended.outcome, RunOutcome::Failed { reason } if reason.contains("a test's own panic"))
    );
    assert!(!bench.output_is_on());
    let record = Folder::open(folder.path()).unwrap();
    assert_eq!((energised(&record), offs(&record) >= 1), (1, true));
}

#[test]
fn a_task_that_is_dropped_while_energised_leaves_the_unit_off() {
    let folder = tempfile::tempdir().unwrap();
    let plan = plan_of(SHORT);
    let bench = virtual_bench(&plan, 1, &[]);
    paused().block_on(async {
        let clock = Clock::simulated();
        let store = FolderStore::create(&folder.path().join("run")).unwrap();
        let (_stop, stopped) = tokio::sync::watch::channel(false);
        let setup = Setup::willing(&bench, &clock, stopped);
        let bay = bay(&plan, &bench, Box::new(store), &clock, setup).unwrap();
        let task = tokio::spawn(run_bay(bay));
        while !bench.output_is_on() {
            clock.sleep_until(clock.now() + Seconds::of(0.1)).await;
        }
        task.abort();
        assert!(task.await.is_err());
        clock.sleep_until(clock.now() + Seconds::of(2.0)).await;
        assert!(
            !bench.output_is_on(),
            "the lease of a task that is gone has ended"
        );
    });
    // The record was never closed and so is never judged.
    let error = Folder::open(folder.path()).unwrap_err().to_string();
    assert!(error.contains("never closed"), "{error}");
}

#[test]
fn one_stop_while_energised_is_enough() {
    let folder = tempfile::tempdir().unwrap();
    let plan = plan_of(SHORT);
    let bench = virtual_bench(&plan, 1, &[]);
    let ended = paused().block_on(async {
        let clock = Clock::simulated();
        let store = FolderStore::create(&folder.path().join("run")).unwrap();
        let (stop, stopped) = tokio::sync::watch::channel(false);
        let setup = Setup::willing(&bench, &clock, stopped);
        let bay = bay(&plan, &bench, Box::new(store), &clock, setup).unwrap();
        let task = tokio::spawn(run_bay(bay));
        while !bench.output_is_on() {
            clock.sleep_until(clock.now() + Seconds::of(0.1)).await;
        }
        clock.sleep_until(clock.now() + Seconds::of(30.0)).await;
        stop.send_replace(true);
        task.await.unwrap()
    });
    assert_eq!(ended.outcome, RunOutcome::Stopped);
    assert!(!bench.output_is_on());
    let record = Folder::open(folder.path()).unwrap();
    let events: Vec<&Event> = record.happenings.iter().map(|h| &h.event).collect();
    let off = events
        .iter()
        .rposition(|e| matches!(e, Event::Off { .. }))
        .unwrap();
    let stopped = events.iter().position(|e| **e == Event::Stopped).unwrap();
    assert!(
        off < stopped,
        "OFF is sent first and recorded after, then why"
    );
}

/// Keeps every prompt and answers until its patience ends.
struct Impatient {
    willing: Willing,
    prompts: Arc<Mutex<Vec<(Prompt, bool)>>>,
    bench: VirtualBench,
    answers: usize,
}

impl Operator for Impatient {
    fn name(&self) -> String {
        "test".to_owned()
    }

    fn ask<'a>(&'a mut self, prompt: &'a Prompt) -> Answering<'a> {
        self.prompts
            .lock()
            .unwrap()
            .push((prompt.clone(), self.bench.output_is_on()));
        match self.answers.checked_sub(1) {
            Some(left) => {
                self.answers = left;
                self.willing.ask(prompt)
            }
            // End of input.
            None => Box::pin(std::future::ready(Reply::Stop)),
        }
    }
}

/// The short sequence, with the switch turned by hand and a condition to set.
fn by_hand() -> String {
    SHORT
        .replace("  switch: position switch\n", "")
        .replace(
            "guards:",
            "conditions:\n  dry: Take the refill out.\nguards:",
        )
        .replace(
            "      positions: [low, high]\n      supplies",
            "      conditions: [dry]\n      positions: [low, high]\n      supplies",
        )
}

fn prompts_with(answers: usize) -> (Ended, Vec<(Prompt, bool)>) {
    let folder = tempfile::tempdir().unwrap();
    let plan = plan_of(&by_hand());
    let bench = virtual_bench(&plan, 1, &[]);
    let prompts = Arc::new(Mutex::new(Vec::new()));
    let ended = paused().block_on(async {
        let clock = Clock::simulated();
        let store = FolderStore::create(&folder.path().join("run")).unwrap();
        let (_stop, stopped) = tokio::sync::watch::channel(false);
        let operator = Impatient {
            willing: Willing(bench.hands(), clock.clone()),
            prompts: prompts.clone(),
            bench: bench.clone(),
            answers,
        };
        let setup = Setup {
            operator: Box::new(operator),
            ..Setup::willing(&bench, &clock, stopped)
        };
        run_bay(bay(&plan, &bench, Box::new(store), &clock, setup).unwrap()).await
    });
    let prompts = prompts.lock().unwrap().clone();
    (ended, prompts)
}

#[test]
fn prompts_name_bay_and_unit_and_touching_ones_come_only_with_the_output_off() {
    let (ended, prompts) = prompts_with(usize::MAX);
    assert_eq!(ended.outcome, RunOutcome::Complete);
    assert!(
        prompts
            .iter()
            .all(|(p, _)| p.bay == "bay 1" && p.unit == "T-1")
    );
    let touching = |p: &Prompt| {
        matches!(
            p.want,
            Want::Done | Want::Condition { .. } | Want::Position { .. }
        )
    };
    assert!(
        prompts.iter().filter(|(p, _)| touching(p)).count() >= 3,
        "{prompts:?}"
    );
    assert!(
        prompts
            .iter()
            .filter(|(p, _)| touching(p))
            .all(|(_, on)| !on)
    );
}

#[test]
fn the_end_of_input_is_a_stop_at_every_prompt_and_never_a_yes() {
    let (_, all) = prompts_with(usize::MAX);
    for answers in 0..all.len() {
        let (ended, prompts) = prompts_with(answers);
        assert_eq!(
            ended.outcome,
            RunOutcome::Stopped,
            "after {answers} answers"
        );
        assert_eq!(prompts.len(), answers + 1);
    }
}
