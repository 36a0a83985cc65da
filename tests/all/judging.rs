//! Judging from the closed folder alone: the same verdict again, and nothing that was
//! changed, torn or never closed is judged.

use std::fs;
use std::path::{Path, PathBuf};

use crate::bench_of_tests::{SHORT, only_record, printed, program};

/// A folder with one rehearsed record.
fn rehearsed() -> (tempfile::TempDir, PathBuf) {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join("short.yaml"), SHORT).unwrap();
    let output = program(folder.path(), &["rehearse", "short.yaml", "--quiet"]);
    assert_eq!(output.status.code(), Some(0), "{}", printed(&output));
    let record = only_record(folder.path());
    (folder, record)
}

fn judge(folder: &Path, record: &Path) -> (i32, String) {
    let output = program(folder, &["judge", record.to_str().unwrap()]);
    (output.status.code().expect("no signal"), printed(&output))
}

#[test]
fn a_record_is_judged_again_alike_without_any_other_file() {
    let (folder, record) = rehearsed();
    let elsewhere = tempfile::tempdir().unwrap();
    let moved = elsewhere.path().join("moved");
    fs::rename(&record, &moved).unwrap();
    drop(folder);
    let (code, text) = judge(elsewhere.path(), &moved);
    assert_eq!(code, 0, "{text}");
    assert!(text.contains("the same as the judgement before"), "{text}");
    for name in [
        "judgement.json",
        "analysis.json",
        "results.csv",
        "findings.csv",
        "summary.png",
    ] {
        let read = |n: &str| fs::read(moved.join("judgements").join(n).join(name)).unwrap();
        assert_eq!(read("0001"), read("0002"), "{name}");
    }
}

#[test]
fn a_changed_number_is_found_and_not_judged() {
    let (folder, record) = rehearsed();
    let file = record.join("run/samples.csv");
    let mut bytes = fs::read(&file).unwrap();
    let last_digit = bytes.iter().rposition(u8::is_ascii_digit).unwrap();
    bytes[last_digit] = if bytes[last_digit] == b'9' {
        b'8'
    } else {
        b'9'
    };
    fs::write(&file, bytes).unwrap();
    let (code, text) = judge(folder.path(), &record);
    assert_eq!(code, 13, "{text}");
    assert!(
        text.contains("samples.csv") && text.contains("changed"),
        "{text}"
    );
}

/// Rewrites a file of the run and the manifest's hash of it, as a forger would.
fn rewrite(record: &Path, name: &str, change: impl Fn(String) -> String) {
    let file = record.join("run").join(name);
    let text = change(fs::read_to_string(&file).unwrap());
    let manifest_file = record.join("run/manifest.json");
    let mut manifest: serde_json::Value =
        serde_json::from_slice(&fs::read(&manifest_file).unwrap()).unwrap();
    for entry in manifest["files"].as_array_mut().unwrap() {
        if entry["name"] == name {
            entry["sha256"] = rateplate::record::sha256_of(text.as_bytes()).into();
        }
    }
    fs::write(&file, text).unwrap();
    fs::write(
        &manifest_file,
        serde_json::to_vec_pretty(&manifest).unwrap(),
    )
    .unwrap();
}

#[test]
fn a_torn_last_row_is_not_taken_for_a_row() {
    let (folder, record) = rehearsed();
    rewrite(&record, "samples.csv", |text| text.trim_end().to_owned());
    let (code, text) = judge(folder.path(), &record);
    assert_eq!(code, 13, "{text}");
    assert!(
        text.contains("torn") && text.contains("samples.csv:"),
        "{text}"
    );
}

#[test]
fn rows_out_of_order_are_refused_with_their_line() {
    let (folder, record) = rehearsed();
    rewrite(&record, "samples.csv", |text| {
        let mut lines: Vec<&str> = text.lines().collect();
        lines.swap(10, 11);
        lines.join("\n") + "\n"
    });
    let (code, text) = judge(folder.path(), &record);
    assert_eq!(code, 13, "{text}");
    assert!(
        text.contains("samples.csv:11") && text.contains("seq"),
        "{text}"
    );
}

#[test]
fn numbers_that_are_none_are_refused() {
    for bad in ["NaN", "inf", "9,1", "0x10", "1e999"] {
        let (folder, record) = rehearsed();
        rewrite(&record, "samples.csv", |text| {
            let mut lines: Vec<String> = text.lines().map(str::to_owned).collect();
            let cut = lines[20].rfind(',').unwrap();
            lines[20].truncate(cut);
            lines[20] = format!("{},\"{bad}\"", lines[20]);
            lines.join("\n") + "\n"
        });
        let (code, text) = judge(folder.path(), &record);
        assert_eq!(code, 13, "{bad}: {text}");
        assert!(text.contains("samples.csv:21"), "{bad}: {text}");
    }
}

#[test]
fn a_record_without_a_manifest_was_never_closed() {
    let (folder, record) = rehearsed();
    fs::remove_file(record.join("run/manifest.json")).unwrap();
    let (code, text) = judge(folder.path(), &record);
    assert_eq!(code, 13);
    assert!(text.contains("never closed"), "{text}");
}

#[test]
fn a_newer_layout_and_a_hostile_manifest_are_refused() {
    let (folder, record) = rehearsed();
    let file = record.join("run/manifest.json");
    let good = fs::read_to_string(&file).unwrap();
    fs::write(&file, good.replacen("\"format\": 1", "\"format\": 99", 1)).unwrap();
    let (code, text) = judge(folder.path(), &record);
    assert!(code == 13 && text.contains("newer"), "{text}");
    fs::write(
        &file,
        good.replacen("\"name\": \"", "\"name\": \"../../", 1),
    )
    .unwrap();
    let (code, text) = judge(folder.path(), &record);
    assert!(code == 13 && text.contains("plain name"), "{text}");
    fs::write(&file, "{").unwrap();
    let (code, text) = judge(folder.path(), &record);
    assert!(code == 13 && text.contains("manifest"), "{text}");
}

#[test]
fn something_that_is_no_record_is_told() {
    let folder = tempfile::tempdir().unwrap();
    let (code, text) = judge(folder.path(), &folder.path().join("nowhere"));
    assert_eq!(code, 13, "{text}");
    assert!(text.contains("nowhere"), "{text}");
}

/// Judging by other rules is told on the screen, in the findings and in the judgement.
#[test]
fn other_rules_than_those_of_the_run_are_told_everywhere() {
    let (folder, record) = rehearsed();
    let stricter = SHORT.replace("edition: \"1\"", "edition: \"2\"");
    let from = stricter.find("rules:").unwrap();
    let rules = "rules:\n  - power: {at most: 5 W}\n    position: high\n";
    fs::write(
        folder.path().join("other.yaml"),
        format!("{}{rules}", &stricter[..from]),
    )
    .unwrap();
    let judge_by = |file: &str| {
        let record = record.to_str().unwrap();
        let output = program(folder.path(), &["judge", record, "--rules", file]);
        (output.status.code(), printed(&output))
    };
    let (code, text) = judge_by("other.yaml");
    assert_eq!(code, Some(4), "{text}");
    let flat = text.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(
        flat.contains("not those fixed before the run (edition 1)"),
        "{text}"
    );
    let read = |name: &str| {
        let file = record.join("judgements/0002").join(name);
        fs::read_to_string(file).unwrap()
    };
    for name in ["judgement.json", "findings.csv"] {
        assert!(
            read(name).contains("not those fixed before the run"),
            "{name}"
        );
    }
    let before = fs::read_to_string(record.join("judgements/0001/findings.csv")).unwrap();
    assert!(before.contains("fixed before the run") && !before.contains("not those"));
    // Names that the record does not know are refused, with their place.
    let unknown = stricter.replace("position: high", "position: turbo");
    assert_ne!(unknown, stricter);
    fs::write(folder.path().join("unknown.yaml"), unknown).unwrap();
    let (code, text) = judge_by("unknown.yaml");
    assert_eq!(code, Some(10), "{text}");
    assert!(
        text.contains("unknown.yaml:") && text.contains("turbo"),
        "{text}"
    );
}

/// A record that an earlier program of the same format closed is judged by the plan that
/// it holds: no reference ambient was stated then, so none is referred to.
#[test]
fn a_record_of_an_earlier_program_is_still_judged() {
    let folder = tempfile::tempdir().unwrap();
    let run = folder.path().join("old").join("run");
    fs::create_dir_all(&run).unwrap();
    let old = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/record-of-format-1/run");
    for file in fs::read_dir(old).unwrap() {
        let file = file.unwrap().path();
        fs::copy(&file, run.join(file.file_name().unwrap())).unwrap();
    }
    let (code, text) = judge(folder.path(), &folder.path().join("old"));
    // Its unit has a fan and a plate of 220 V to 240 V, and was run at 230 V only.
    assert_eq!(code, 5, "{text}");
    let flat = text.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(flat.contains("both ends of its supply range"), "{text}");
    let budgets = folder.path().join("old/judgements/0001/budgets.txt");
    let budgets = fs::read_to_string(budgets).unwrap();
    assert!(!budgets.contains("of ambient, effect"), "{budgets}");
}

/// Every judgement holds the budgets of its results, the largest line first.
#[test]
fn a_judgement_holds_its_budgets() {
    let (_folder, record) = rehearsed();
    let text = fs::read_to_string(record.join("judgements/0001/budgets.txt")).unwrap();
    assert!(text.contains("degrees of freedom"), "{text}");
    assert!(
        text.contains("contact of the sensor, reads up to 1 %"),
        "{text}"
    );
    let csv = fs::read_to_string(record.join("judgements/0001/budgets.csv")).unwrap();
    assert!(csv.lines().count() > 20);
}
