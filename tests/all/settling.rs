//! A soak is asked the same question while it runs and from its closed record.

use std::fs;
use std::path::Path;

use crate::bench_of_tests::{SHORT, only_record, printed, program};
use rateplate::analysis::{self, Input};
use rateplate::plan::Action;
use rateplate::record::{Event, Folder, StepEnd};

fn rehearsed(sequence: &str, more: &[&str]) -> (tempfile::TempDir, Folder) {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join("short.yaml"), sequence).unwrap();
    let arguments = [&["rehearse", "short.yaml", "--quiet"], more].concat();
    let output = program(folder.path(), &arguments);
    assert!(
        folder.path().join("reports").is_dir(),
        "{}",
        printed(&output)
    );
    let opened = Folder::open(&only_record(folder.path())).expect("a whole record");
    (folder, opened)
}

fn with(from: &str, to: &str) -> String {
    assert!(SHORT.contains(from));
    SHORT.replace(from, to)
}

/// How each soak ended, and what the record alone says of it.
fn soaks(folder: &Folder) -> Vec<(StepEnd, bool, Option<f64>, f64)> {
    let found = analysis::analyse(&Input {
        plan: &folder.plan,
        samples: &folder.samples,
        waveforms: &folder.waveforms,
        happenings: &folder.happenings,
        outcome: &folder.manifest.outcome,
    });
    let soaks = folder
        .plan
        .steps
        .iter()
        .filter(|step| matches!(step.action, Action::Soak { .. }));
    soaks
        .filter_map(|soak| {
            let (end, at) = folder.happenings.iter().find_map(|h| match &h.event {
                Event::StepEnded { step, end } if *step == soak.number => {
                    Some((end.clone(), h.at.as_secs_f64()))
                }
                _ => None,
            })?;
            let cell = &found.cells[soak.cell.unwrap()];
            let steady = cell.steady.known();
            let early = steady.is_some_and(|steady| steady.extrapolated);
            let energised = cell.energised_s.known().copied().unwrap_or(0.0);
            Some((end, early, cell.settled_s.known().copied(), at - energised))
        })
        .collect()
}

/// Settled in both ways, and at the same moment: the run ends within the poll after the
/// cell that the record names.
fn agrees(wanted: StepEnd, soaks: &[(StepEnd, bool, Option<f64>, f64)]) {
    assert!(!soaks.is_empty());
    for (end, early, settled, ended) in soaks {
        assert_eq!(*end, wanted);
        assert_eq!(*early, wanted == StepEnd::Extrapolated);
        let settled = settled.expect("settled from the record too");
        assert!(
            (settled..settled + 6.0).contains(ended),
            "{settled} {ended}"
        );
    }
}

#[test]
fn the_record_says_what_the_run_said() {
    let slope = "criterion: slope, window: 5 min, power change: 4 %, temperature change: 6 K";
    for until in [
        slope,
        "criterion: three readings, power change: 4 %, temperature change: 1 K",
        "criterion: change within, interval: 10 min, power change: 100 mW, temperature change: 1 K",
    ] {
        let (_keep, folder) = rehearsed(&with(slope, until), &[]);
        agrees(StepEnd::Settled, &soaks(&folder));
    }
    let sampled = with(slope, "criterion: sampling method").replace(
        "at least: 10 min\n            at most: 45 min\n            every: 5 s",
        "at least: 15 min\n            at most: 3 h\n            every: 1 s",
    );
    let (_keep, folder) = rehearsed(&sampled, &[]);
    agrees(StepEnd::Settled, &soaks(&folder));
}

#[test]
fn an_early_finish_says_extrapolated_wherever_it_is_printed() {
    let sequence = with(
        "            every: 5 s\n            until: {criterion: slope, window: 5 min, power change: 4 %, temperature change: 6 K}",
        "            every: 5 s\n            early finish: yes\n            until: {criterion: slope, window: 5 min, power change: 1 %, temperature change: 1 K}",
    );
    let (keep, folder) = rehearsed(&sequence, &[]);
    let found = soaks(&folder);
    assert!(
        found.iter().any(|soak| soak.0 == StepEnd::Extrapolated),
        "{found:?}"
    );
    for soak in found {
        agrees(soak.0.clone(), &[soak]);
    }
    let record = only_record(keep.path());
    let printed = printed(&program(keep.path(), &["judge", record.to_str().unwrap()]));
    assert!(
        printed.contains("extrapolated by first-order fits"),
        "{printed}"
    );
    let results = fs::read_to_string(annex(&record).join("results.csv")).unwrap();
    let column = results
        .lines()
        .next()
        .unwrap()
        .split(',')
        .position(|c| c == "extrapolated");
    assert!(
        results
            .lines()
            .skip(1)
            .any(|row| row.split(',').nth(column.unwrap()) == Some("1"))
    );
    let judgement = fs::read_to_string(annex(&record).join("judgement.json")).unwrap();
    assert!(judgement.contains("extrapolated: the soak was ended early"));
}

fn annex(record: &Path) -> std::path::PathBuf {
    record.join("judgements").join("0001")
}

#[test]
fn a_unit_that_goes_open_in_its_soak_is_so_in_both_ways() {
    let (_keep, folder) = rehearsed(SHORT, &["--fault", "link-opens-mid-soak"]);
    let found = soaks(&folder);
    assert_eq!(found[0].0, StepEnd::WentOpen, "{found:?}");
    assert_eq!(found[0].2, None);
}
