//! Shipped data is tested like code: every sequence, driver, bench and virtual unit.

use rateplate::spec::shipped;
use rateplate::spec::{self, Weight};

use crate::bench_of_tests::{plan_of, printed, program, virtual_bench};

#[test]
fn every_shipped_sequence_passes_check_without_a_word_of_complaint() {
    let folder = tempfile::tempdir().unwrap();
    assert!(shipped::SEQUENCES.len() >= 4);
    for file in shipped::SEQUENCES {
        let output = program(folder.path(), &["check", file.path]);
        assert_eq!(output.status.code(), Some(0), "{}", printed(&output));
        assert!(output.stderr.is_empty(), "{}", printed(&output));
    }
}

#[test]
fn every_shipped_driver_and_virtual_unit_is_read_without_problems() {
    for file in shipped::DRIVERS {
        let loaded = spec::load_driver(file.path, file.text.as_bytes());
        assert!(
            loaded.problems.is_empty(),
            "{}",
            spec::render(&loaded.problems)
        );
    }
    for file in shipped::VIRTUAL_UNITS {
        let loaded = spec::load_virtual_unit(file.path, file.text.as_bytes());
        assert!(
            loaded.problems.is_empty(),
            "{}",
            spec::render(&loaded.problems)
        );
    }
    assert!(shipped::DRIVERS.len() >= 4);
}

#[test]
fn every_shipped_file_is_the_one_on_disk_and_none_is_forgotten() {
    let root = std::path::PathBuf::from(env!("CARGO_MANIFEST_DIR"));
    let mut known: Vec<&str> = shipped::SEQUENCES
        .iter()
        .chain(shipped::DRIVERS)
        .chain(shipped::VIRTUAL_UNITS)
        .map(|f| f.path)
        .collect();
    known.push(shipped::VIRTUAL_BENCH.path);
    for folder in ["sequences", "drivers", "drivers/virtual"] {
        for entry in std::fs::read_dir(root.join(folder)).unwrap() {
            let path = entry.unwrap().path();
            if path.extension().is_some_and(|e| e == "yaml") {
                let name = format!("{folder}/{}", path.file_name().unwrap().to_str().unwrap());
                assert!(known.contains(&name.as_str()), "{name} is not shipped");
            }
        }
    }
}

#[test]
fn every_shipped_sequence_has_its_virtual_unit() {
    for file in shipped::SEQUENCES {
        let plan = plan_of(file.text);
        let bench = virtual_bench(&plan, 1, &[]);
        assert!(!bench.output_is_on());
        assert!(plan.expected.get() > 0.0);
    }
}

#[test]
fn no_shipped_file_warns() {
    for file in shipped::SEQUENCES {
        let loaded = spec::load_sequence(file.path, file.text.as_bytes());
        assert!(
            !loaded.problems.iter().any(|p| p.weight == Weight::Warning),
            "{}",
            file.path
        );
    }
}
