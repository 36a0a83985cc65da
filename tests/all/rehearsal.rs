//! The main job as a user runs it: the record, its determinism, the exit codes.

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

use rateplate::record::{Folder, RunOutcome};

use crate::bench_of_tests::{SHORT, only_record, printed, program};

/// Rehearses the short sequence in a folder.
fn rehearse(folder: &Path, more: &[&str]) -> (i32, String) {
    fs::write(folder.join("short.yaml"), SHORT).unwrap();
    let output = program(folder, &[&["rehearse", "short.yaml"], more].concat());
    (output.status.code().expect("no signal"), printed(&output))
}

/// Every file below a folder, by its path in it.
fn files_below(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    let mut all = BTreeMap::new();
    let mut folders = vec![folder.to_owned()];
    while let Some(next) = folders.pop() {
        for entry in fs::read_dir(next).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() {
                folders.push(path);
            } else {
                let name = path.strip_prefix(folder).unwrap().display().to_string();
                all.insert(name, fs::read(&path).unwrap());
            }
        }
    }
    all
}

#[test]
fn a_good_unit_passes_and_leaves_a_whole_record() {
    let folder = tempfile::tempdir().unwrap();
    let (code, printed) = rehearse(folder.path(), &[]);
    assert_eq!(code, 0, "{printed}");
    assert!(
        printed.contains("VERDICT    PASS") && printed.contains("VIRTUAL BENCH"),
        "{printed}"
    );
    let record = only_record(folder.path());
    let files: Vec<String> = files_below(&record).into_keys().collect();
    for name in [
        "run/sequence.yaml",
        "run/bench.yaml",
        "run/driver-scpi-power-meter.yaml",
        "run/plan.json",
        "run/samples.csv",
        "run/events.csv",
        "run/wire.txt",
        "run/manifest.json",
        "judgements/0001/results.csv",
        "judgements/0001/findings.csv",
        "judgements/0001/judgement.json",
        "judgements/0001/summary.png",
        "judgements/0001/manifest.json",
    ] {
        assert!(
            files.iter().any(|f| f == name),
            "{name} is not among {files:?}"
        );
    }
    let read = Folder::open(&record).unwrap();
    assert_eq!(read.manifest.outcome, RunOutcome::Complete);
    assert_eq!(
        read.manifest.virtual_bench.as_deref(),
        Some("VIRTUAL BENCH")
    );
    assert_eq!(read.manifest.samples, read.samples.len() as u64);
    assert!(
        read.samples
            .windows(2)
            .all(|pair| pair[0].seq + 1 == pair[1].seq)
    );
}

#[test]
fn the_same_plan_and_seed_leave_the_same_record_byte_for_byte() {
    let folders = [tempfile::tempdir().unwrap(), tempfile::tempdir().unwrap()];
    let [first, second] = folders.map(|folder| {
        rehearse(folder.path(), &["--seed", "7"]);
        files_below(&folder.path().join("reports"))
    });
    assert_eq!(
        first.keys().collect::<Vec<_>>(),
        second.keys().collect::<Vec<_>>()
    );
    for (name, bytes) in &first {
        assert_eq!(bytes, &second[name], "{name} differs");
    }
}

#[test]
fn another_seed_leaves_another_record() {
    let folder = tempfile::tempdir().unwrap();
    rehearse(folder.path(), &["--seed", "1"]);
    rehearse(folder.path(), &["--seed", "2"]);
    let records: Vec<_> = fs::read_dir(folder.path().join("reports"))
        .unwrap()
        .map(|e| e.unwrap().path())
        .collect();
    assert_eq!(records.len(), 2);
    let samples = |n: usize| fs::read(records[n].join("run/samples.csv")).unwrap();
    assert_ne!(samples(0), samples(1));
}

#[test]
fn a_second_rehearsal_overwrites_nothing() {
    let folder = tempfile::tempdir().unwrap();
    rehearse(folder.path(), &[]);
    let first = only_record(folder.path());
    let before = files_below(&first);
    rehearse(folder.path(), &[]);
    assert_eq!(files_below(&first), before);
    assert_eq!(
        fs::read_dir(folder.path().join("reports")).unwrap().count(),
        2
    );
}

#[test]
fn the_exit_code_says_the_outcome() {
    for (fault, expected) in [
        ("dead-unit", 4),
        ("swapped-positions", 4),
        ("no-reply@400s", 11),
    ] {
        let folder = tempfile::tempdir().unwrap();
        let (code, printed) = rehearse(folder.path(), &["--fault", fault]);
        assert_eq!(code, expected, "{fault}: {printed}");
    }
}

#[test]
fn no_compared_file_names_the_machine() {
    let folder = tempfile::tempdir().unwrap();
    rehearse(folder.path(), &[]);
    let here = folder.path().display().to_string();
    for (name, bytes) in files_below(&folder.path().join("reports")) {
        let text = String::from_utf8_lossy(&bytes);
        assert!(!text.contains(&here), "{name} holds an absolute path");
    }
}
