//! The golden table: unit and sensor faults x seeds against each rule's outcome. Every
//! fault is found or not judged, never passed.

use std::collections::BTreeMap;
use std::fmt::Write;
use std::path::PathBuf;

use rateplate::analysis::{Input, analyse};
use rateplate::clock::Clock;
use rateplate::judge::{Judgement, Outcome, judge};
use rateplate::record::{Folder, FolderStore, RunOutcome};

use crate::bench_of_tests::{SHORT, Setup, bay, paused, plan_of, run_bay, virtual_bench};

/// Faults of the unit and of its sensors.
const FAULTS: [&str; 11] = [
    "none",
    "dead-unit",
    "link-opens-mid-soak",
    "wrong-element",
    "loose-clamp",
    "stuck-fan",
    "wrong-link",
    "swapped-positions",
    "sensor-fallen-off",
    "swapped-channels",
    "sensor-open",
];

/// Seeds of the table.
const SEEDS: [u64; 3] = [1, 2, 3];

fn outcome_of(fault: &str, seed: u64) -> (RunOutcome, Judgement) {
    let folder = tempfile::tempdir().unwrap();
    let plan = plan_of(SHORT);
    let faults: Vec<&str> = [fault].into_iter().filter(|f| *f != "none").collect();
    let bench = virtual_bench(&plan, seed, &faults);
    paused().block_on(async {
        let clock = Clock::simulated();
        let store = FolderStore::create(&folder.path().join("run")).unwrap();
        let (_stop, stopped) = tokio::sync::watch::channel(false);
        let setup = Setup::willing(&bench, &clock, stopped);
        run_bay(bay(&plan, &bench, Box::new(store), &clock, setup).unwrap()).await
    });
    let record = Folder::open(folder.path()).unwrap();
    let outcome = record.manifest.outcome.clone();
    let analysis = analyse(&Input {
        plan: &record.plan,
        samples: &record.samples,
        happenings: &record.happenings,
        waveforms: &record.waveforms,
        outcome: &outcome,
    });
    let judgement = judge(&record.plan, &outcome, &analysis);
    (outcome, judgement)
}

fn short_of(outcome: &RunOutcome) -> &'static str {
    match outcome {
        RunOutcome::Complete => "complete",
        RunOutcome::Tripped { .. } => "tripped",
        RunOutcome::Stopped => "stopped",
        RunOutcome::Failed { .. } => "failed",
        RunOutcome::Interrupted => "interrupted",
    }
}

/// A line per fault and seed: the run's end, the verdict, and each rule's outcome.
fn table() -> (String, BTreeMap<(String, u64), Outcome>) {
    let mut text = String::from("# fault, seed: run, verdict | rule: outcome; ...\n");
    let mut verdicts = BTreeMap::new();
    for fault in FAULTS {
        for seed in SEEDS {
            let (run, judgement) = outcome_of(fault, seed);
            verdicts.insert((fault.to_owned(), seed), judgement.verdict);
            let findings: Vec<String> = judgement
                .findings
                .iter()
                .map(|f| format!("{}: {}", f.rule, f.outcome.word()))
                .collect();
            let verdict = judgement.verdict.word();
            writeln!(
                text,
                "{fault}, {seed}: {}, {verdict} | {}",
                short_of(&run),
                findings.join("; ")
            )
            .unwrap();
        }
    }
    (text, verdicts)
}

#[test]
fn every_fault_is_found_or_not_judged_and_good_units_pass() {
    let (text, verdicts) = table();
    for ((fault, seed), verdict) in &verdicts {
        if fault == "none" {
            assert_eq!(*verdict, Outcome::Pass, "a good unit, seed {seed}:\n{text}");
        } else {
            let found = matches!(
                verdict,
                Outcome::Fail | Outcome::NotJudged | Outcome::ConditionalFail
            );
            assert!(found, "{fault}, seed {seed}: {}\n{text}", verdict.word());
        }
    }
    let file = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/data/faults-golden.txt");
    if std::env::var_os("RATEPLATE_BLESS").is_some() {
        std::fs::write(&file, &text).unwrap();
    }
    let golden = std::fs::read_to_string(&file).unwrap_or_default();
    assert_eq!(
        text, golden,
        "the table changed; look at each line, then write it with RATEPLATE_BLESS=1"
    );
}
