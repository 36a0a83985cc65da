//! Raw scanners end to end: the same verdict as with one that converts, and a record
//! that holds the raw readings beside the temperatures that they say.

use std::fs;
use std::path::{Path, PathBuf};

use rateplate::quantity::Reading;
use rateplate::record::{Folder, Status};
use rateplate::sensor::temperature_of;
use rateplate::spec::shipped;

use crate::bench_of_tests::{SHORT, only_record, printed, program};

/// Accuracies of a whole chain, as a manual would state them in kelvins.
const WHOLE_CHAIN: &str = "\n  temperature: {floor: 0.7 K, resolution: 0.01 K}\n";

/// Rehearses the short sequence with a scanner of `driver`, with `sensor` on its
/// channels; the exit code, what was printed, and the record.
fn rehearse(folder: &Path, driver: &str, sensor: &str, more: &[&str]) -> (i32, String, PathBuf) {
    let bench = shipped::VIRTUAL_BENCH.text;
    let bench = bench.replacen(
        "driver: scpi-temperature-scanner",
        &format!("driver: {driver}"),
        1,
    );
    let bench = [1, 2, 3].iter().fold(bench, |text, channel| {
        let to = format!("channel: {channel}, sensor: {sensor}}}");
        text.replacen(&format!("channel: {channel}}}"), &to, 1)
    });
    fs::write(folder.join("bench.yaml"), bench).unwrap();
    fs::write(folder.join("short.yaml"), SHORT).unwrap();
    fs::create_dir_all(folder.join("drivers")).unwrap();
    let file = shipped::DRIVERS
        .iter()
        .find(|d| d.path.ends_with(&format!("{driver}.yaml")))
        .unwrap();
    let mut text = file.text.trim_end().to_owned();
    if !text.contains("\n  temperature:") {
        text.push_str(WHOLE_CHAIN);
    }
    fs::write(folder.join("drivers/scanner.yaml"), text).unwrap();
    let arguments = ["rehearse", "short.yaml", "--bench", "bench.yaml"];
    let output = program(folder, &[&arguments[..], more].concat());
    let code = output.status.code().expect("no signal");
    (code, printed(&output), only_record(folder))
}

const KINDS: [(&str, &str); 3] = [
    ("scpi-temperature-scanner", "{type: K, class: 1}"),
    ("scpi-thermocouple-scanner", "{type: K, class: 1}"),
    ("scpi-resistance-scanner", "{type: Pt100, class: A}"),
];

#[test]
fn a_raw_scanner_leads_to_the_same_verdict_and_leaves_its_raw_readings() {
    for (driver, sensor) in KINDS {
        let folder = tempfile::tempdir().unwrap();
        let (code, printed, path) = rehearse(folder.path(), driver, sensor, &[]);
        assert_eq!(code, 0, "{driver}: {printed}");
        assert!(printed.contains("VERDICT    PASS"), "{driver}: {printed}");
        let record = Folder::open(&path).unwrap();
        let head = fs::read_to_string(path.join("run/samples.csv")).unwrap();
        let head = head.lines().next().unwrap();
        let wanted = match driver {
            "scpi-thermocouple-scanner" => {
                "temperature_degc,thermocouple_voltage_v,terminal_temperature_degc"
            }
            "scpi-resistance-scanner" => "temperature_degc,resistance_ohm",
            _ => "frequency_hz,temperature_degc",
        };
        assert!(head.ends_with(wanted), "{driver}: {head}");
        let mut rows = 0;
        for sample in record.samples.iter().filter(|s| s.status == Status::Ok) {
            let role = &record.plan.bay.roles[sample.role];
            let Some(sensor) = record.plan.raw_sensor(role) else {
                continue;
            };
            let stored = sample.readings.get(Reading::Temperature).unwrap();
            let again = temperature_of(sensor, &sample.readings).unwrap().get();
            assert!((stored - again).abs() <= 0.5e-4 + 1e-9, "{stored} {again}");
            rows += 1;
        }
        assert_eq!(rows > 1000, driver != "scpi-temperature-scanner", "{rows}");
    }
}

#[test]
fn a_reversed_or_open_raw_sensor_never_passes() {
    for (fault, driver, sensor) in [
        ("sensor-reversed", KINDS[1].0, KINDS[1].1),
        ("sensor-open@400s", KINDS[1].0, KINDS[1].1),
        ("sensor-wrong-type", KINDS[2].0, KINDS[2].1),
    ] {
        let folder = tempfile::tempdir().unwrap();
        let (code, printed, path) = rehearse(folder.path(), driver, sensor, &["--fault", fault]);
        assert_ne!(code, 0, "{fault}: {printed}");
        let record = Folder::open(&path).unwrap();
        let (body, _) = record.plan.role("body").unwrap();
        let of_body = record.samples.iter().filter(|s| s.role == body);
        let unread = of_body.filter(|s| s.status == Status::NoValue);
        let unread: Vec<_> = unread.collect();
        assert_eq!(unread.is_empty(), fault == "sensor-reversed", "{fault}");
        for sample in unread {
            assert_eq!(sample.readings.get(Reading::Temperature), None);
            // Ten times a Pt100's resistance is what was read, and stays in the record.
            let read = sample.readings.get(Reading::Resistance).is_some();
            assert_eq!(read, fault == "sensor-wrong-type", "{fault}");
        }
    }
}

#[test]
fn check_refuses_a_raw_scanner_without_its_sensor_with_place_and_hint() {
    let folder = tempfile::tempdir().unwrap();
    let bench = shipped::VIRTUAL_BENCH.text;
    let bench = bench.replacen("scpi-temperature-scanner", "scpi-thermocouple-scanner", 1);
    fs::write(folder.path().join("bench.yaml"), bench).unwrap();
    fs::write(folder.path().join("short.yaml"), SHORT).unwrap();
    let output = program(
        folder.path(),
        &["check", "short.yaml", "--bench", "bench.yaml"],
    );
    let printed = printed(&output);
    assert_eq!(output.status.code(), Some(10), "{printed}");
    assert!(
        printed.contains("bench.yaml:33:") && printed.contains("names no sensor"),
        "{printed}"
    );
    assert!(
        printed.contains("add `sensor: {type: K, class: 1}`"),
        "{printed}"
    );
}

#[test]
fn a_record_from_before_raw_readings_is_still_read() {
    let example = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/record-of-format-1");
    let head = fs::read_to_string(example.join("run/samples.csv")).unwrap();
    assert!(
        head.lines()
            .next()
            .unwrap()
            .ends_with("frequency_hz,temperature_degc")
    );
    let record = Folder::open(&example).unwrap();
    assert_eq!(record.samples.len() as u64, record.manifest.samples);
    let read = |kind| {
        record
            .samples
            .iter()
            .any(|s| s.readings.get(kind).is_some())
    };
    assert!(read(Reading::Temperature) && !read(Reading::Resistance));
}
