//! What bad input gets: a message with file, line, what is wrong and what to do, an
//! exit code, and nothing energised.

use std::fs;
use std::path::Path;

use crate::bench_of_tests::{SHORT, printed, program};

/// Checks a sequence text; gives the exit code and what was printed.
fn check(text: &[u8]) -> (i32, String) {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join("mine.yaml"), text).unwrap();
    let output = program(folder.path(), &["check", "mine.yaml"]);
    (output.status.code().expect("no signal"), printed(&output))
}

fn changed(from: &str, to: &str) -> Vec<u8> {
    let text = SHORT.replacen(from, to, 1);
    assert_ne!(text, SHORT, "{from:?} is not in the sequence");
    text.into_bytes()
}

#[track_caller]
fn refused(text: &[u8], parts: &[&str]) {
    let (code, printed) = check(text);
    assert_eq!(code, 10, "{printed}");
    for part in parts {
        assert!(printed.contains(part), "{part:?} is missing in:\n{printed}");
    }
    assert!(!printed.contains("panicked"), "{printed}");
}

#[test]
fn the_short_sequence_itself_is_good() {
    let (code, printed) = check(SHORT.as_bytes());
    assert_eq!(code, 0, "{printed}");
}

#[test]
fn an_unknown_key_is_pointed_at_with_the_nearest_known_one() {
    refused(
        &changed("edition:", "editoin:"),
        &["mine.yaml:3", "editoin", "edition", "^"],
    );
}

#[test]
fn a_duplicate_key_is_named() {
    refused(
        &changed("edition: \"1\"", "edition: \"1\"\nedition: \"2\""),
        &["mine.yaml:4", "edition"],
    );
}

#[test]
fn a_bare_number_gets_a_hint_that_shows_the_unit() {
    refused(
        &changed("power: 9 W", "power: 9"),
        &["mine.yaml:12", "no unit", "9 W"],
    );
}

#[test]
fn a_voltage_is_not_a_power() {
    refused(
        &changed("power: 9 W", "power: 9 V"),
        &["mine.yaml:12", "a voltage", "a power"],
    );
}

#[test]
fn a_tab_is_named_as_a_tab() {
    refused(&changed("  model:", "\tmodel:"), &["mine.yaml:5", "tab"]);
}

#[test]
fn not_a_number_is_refused() {
    refused(
        &changed("power: 9 W", "power: .nan W"),
        &["mine.yaml:12", "finite"],
    );
}

#[test]
fn a_negative_soak_is_refused() {
    refused(
        &changed("at most: 45 min", "at most: -45 min"),
        &["mine.yaml", "negative"],
    );
}

#[test]
fn a_position_that_the_plate_does_not_have_is_refused() {
    refused(
        &changed(
            "      positions: [low, high]\n      supplies",
            "      positions: [low, hihg]\n      supplies",
        ),
        &["hihg", "high"],
    );
}

#[test]
fn a_role_without_an_instrument_is_refused() {
    refused(
        &changed(
            "  ambient: temperature\n",
            "  ambient: temperature\n  outlet: temperature\n",
        ),
        &["outlet"],
    );
}

#[test]
fn every_problem_of_meaning_is_told_at_once() {
    let text = SHORT
        .replacen("power: 9 W", "power: 9 V", 1)
        .replacen("editoin", "", 1);
    let text = text.replacen("power: 4.5 W", "power: 4.5", 1).replacen(
        "protection class: II",
        "protection class: IV",
        1,
    );
    refused(
        text.as_bytes(),
        &["mine.yaml:7", "mine.yaml:11", "mine.yaml:12", "3 errors"],
    );
}

#[test]
fn hostile_files_are_refused_in_bounded_time() {
    let bomb = "a: &a [x,x,x,x,x,x,x,x,x]\nb: &b [*a,*a,*a,*a,*a,*a]\nc: &c [*b,*b,*b,*b,*b,*b]\nd: [*c,*c,*c,*c]\n";
    refused(bomb.as_bytes(), &["mine.yaml:1"]);
    refused("[".repeat(20_000).as_bytes(), &["mine.yaml:1"]);
    refused(b"", &["mine.yaml", "empty"]);
    refused(
        &[0x7f, b'E', b'L', b'F', 0, 1, 2, 0xff, 0xfe],
        &["mine.yaml"],
    );
    refused(&vec![b'#'; 50_000_000], &["mine.yaml"]);
}

#[test]
fn a_file_that_is_not_there_is_told_with_what_is_shipped() {
    let folder = tempfile::tempdir().unwrap();
    let output = program(folder.path(), &["check", "nowhere.yaml"]);
    assert_eq!(output.status.code(), Some(10));
    assert!(printed(&output).contains("cupboard-dryer.yaml"));
}

#[test]
fn a_unit_number_can_leave_no_folder() {
    let folder = tempfile::tempdir().unwrap();
    for number in ["../../x", "a/b", "..", "nul", ""] {
        let unit = format!("--unit={number}");
        let output = program(
            folder.path(),
            &["rehearse", "sequences/cupboard-dryer.yaml", &unit],
        );
        assert_eq!(output.status.code(), Some(10), "{number}");
        assert!(
            printed(&output).contains("unit number"),
            "{}",
            printed(&output)
        );
    }
    assert!(
        fs::read_dir(folder.path()).unwrap().next().is_none(),
        "nothing was made"
    );
}

#[test]
fn a_record_folder_that_can_not_be_made_stops_before_anything() {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join("taken"), "a file").unwrap();
    let output = program(
        folder.path(),
        &[
            "rehearse",
            "sequences/cupboard-dryer.yaml",
            "--reports",
            "taken",
        ],
    );
    assert_eq!(output.status.code(), Some(13), "{}", printed(&output));
    assert!(printed(&output).contains("nothing was energised"));
}

#[test]
fn an_unknown_fault_is_told_with_the_known_ones() {
    let folder = tempfile::tempdir().unwrap();
    let output = program(
        folder.path(),
        &[
            "rehearse",
            "sequences/cupboard-dryer.yaml",
            "--fault",
            "gremlins",
        ],
    );
    assert_eq!(output.status.code(), Some(2));
    assert!(printed(&output).contains("dead-unit"));
}

#[test]
fn a_port_that_is_not_there_is_told_with_its_name() {
    let folder = tempfile::tempdir().unwrap();
    write_real_bench(folder.path(), "/dev/no-such-port");
    let output = program(
        folder.path(),
        &[
            "run",
            "sequences/cupboard-dryer.yaml",
            "--bench",
            "bench.yaml",
            "--unit",
            "1",
            "--operator",
            "test",
        ],
    );
    assert_eq!(output.status.code(), Some(11), "{}", printed(&output));
    assert!(
        printed(&output).contains("/dev/no-such-port"),
        "{}",
        printed(&output)
    );
    assert!(printed(&output).contains("nothing was energised"));
}

#[test]
fn a_rehearsal_refuses_real_ports_and_a_run_refuses_virtual_ones() {
    let folder = tempfile::tempdir().unwrap();
    write_real_bench(folder.path(), "/dev/ttyUSB0");
    let output = program(
        folder.path(),
        &[
            "rehearse",
            "sequences/cupboard-dryer.yaml",
            "--bench",
            "bench.yaml",
        ],
    );
    assert_eq!(output.status.code(), Some(10), "{}", printed(&output));
    fs::write(
        folder.path().join("virtual.yaml"),
        rateplate::spec::shipped::VIRTUAL_BENCH.text,
    )
    .unwrap();
    let output = program(
        folder.path(),
        &[
            "run",
            "sequences/cupboard-dryer.yaml",
            "--bench",
            "virtual.yaml",
            "--unit",
            "1",
            "--operator",
            "test",
        ],
    );
    assert_eq!(output.status.code(), Some(10), "{}", printed(&output));
}

fn write_real_bench(folder: &Path, port: &str) {
    let bench = rateplate::spec::shipped::VIRTUAL_BENCH
        .text
        .replace("port: virtual", &format!("port: {port}"));
    fs::write(folder.join("bench.yaml"), bench).unwrap();
}
