//! A unit that is run with a fault until its thermal link opens, from start to verdict.

use std::fs;

use crate::bench_of_tests::{SHORT, only_record, printed, program};

/// The short look's appliance with Tm, run with a fault and nothing else.
fn sequence(tm: &str) -> String {
    let head = &SHORT[..SHORT.find("steps:").expect("steps")];
    let head = head
        .replace("    Th: 100 °C\n", &format!("    Th: 100 °C\n{tm}"))
        .replace("positions: [low, high]", "positions: [high]");
    let head: String = head
        .lines()
        .filter(|line| !line.contains("position: low"))
        .map(|line| format!("{line}\n"))
        .collect();
    format!(
        "{head}steps:
  - acclimatise: {{at most: 10 min, every: 5 s}}
  - supply: {{voltage: 230 V, frequency: 50 Hz}}
  - position: high
  - energise
  - abnormal: {{fault: fan held, for: 25 min, every: 1 s, body: 170 °C}}
  - rest: {{within: 3 K, at most: 60 min, every: 5 s}}
rules:
  - thermal link: after opening
"
    )
}

fn rehearsed(sequence: &str, more: &[&str]) -> (Option<i32>, String, tempfile::TempDir) {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join("opening.yaml"), sequence).unwrap();
    let mut arguments = vec!["rehearse", "opening.yaml", "--quiet"];
    arguments.extend(more);
    let output = program(folder.path(), &arguments);
    (output.status.code(), printed(&output), folder)
}

#[test]
fn an_opened_link_is_held_against_tm_and_its_unit_is_destroyed() {
    let opens = ["--fault", "link-opens-mid-soak"];
    let (code, text, folder) = rehearsed(&sequence("    Tm: 175 °C\n"), &opens);
    assert_eq!(code, Some(0), "{text}");
    assert!(
        text.contains("thermal link, after opening, fan held"),
        "{text}"
    );
    assert!(
        text.contains("DESTROYED: its thermal link opened at"),
        "{text}"
    );
    let annex = only_record(folder.path()).join("judgements/0001");
    let judgement = fs::read_to_string(annex.join("judgement.json")).unwrap();
    assert!(judgement.contains("\"mark\": \"destroyed\""), "{judgement}");
}

#[test]
fn a_link_that_did_not_open_says_nothing_of_tm() {
    let (code, text, _folder) = rehearsed(&sequence("    Tm: 175 °C\n"), &[]);
    assert_eq!(code, Some(5), "{text}");
    assert!(text.contains("the link did not open"), "{text}");
    assert!(!text.contains("DESTROYED"), "{text}");
}

#[test]
fn without_tm_the_rule_is_refused_before_anything_is_energised() {
    let (code, text, _folder) = rehearsed(&sequence(""), &[]);
    assert_eq!(code, Some(10), "{text}");
    assert!(text.contains("states no Tm"), "{text}");
}
