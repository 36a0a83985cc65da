//! Waveforms that the meter can't deliver, or not while it is watched.

use super::*;

/// The boot warmer fetches one after each switching on.
fn boots() -> &'static str {
    shipped_as("boot-warmer")
}

#[test]
fn a_waveform_needs_a_meter_that_fetches_one() {
    cross(boots(), BENCH).is_clean();
    let crossing = Crossing::of(boots(), BENCH);
    crossing
        .driver("scpi-power-meter", |driver| driver.waveform = None)
        .resolve()
        .refuses("inrush", "fetches no waveform", "`waveform:`")
        .only();
}

#[test]
fn a_block_must_be_through_before_the_meter_counts_as_silent() {
    let slow = BENCH.replacen(
        "meter line: {port: virtual}",
        "meter line: {port: /dev/ttyUSB3, baud: 19200}",
        1,
    );
    // 1500 pairs of 8 bytes at 10 bits and 19200 Bd take 6.25 s (computed).
    let resolved = cross(boots(), &slow);
    resolved.refuses("inrush", "12000 bytes takes 6.2 s", "baud rate");
    let quick = slow.replace("19200", "115200");
    assert!(cross(boots(), &quick).plan.is_some());
    let crossing = Crossing::of(boots(), BENCH);
    crossing
        .driver("scpi-power-meter", |driver| {
            driver.waveform.as_mut().unwrap().points = 5000;
        })
        .resolve()
        .refuses("inrush", "silent", "fewer `points:`")
        .only();
}

#[test]
fn meter_and_supply_on_one_line_fetch_no_waveform() {
    let shared = changed(BENCH, "line: meter line", "line: supply line");
    let resolved = cross(boots(), &shared);
    resolved.refuses("inrush", "share a line", "line of its own");
}

#[test]
fn a_rule_that_needs_a_waveform_is_fed_by_one() {
    for (rule, text) in [
        ("harmonics: class A", "harmonics"),
        ("voltage change: {dmax: 4 %}", "voltage change"),
        ("inrush: {momentary at most: 3 A}", "inrush"),
    ] {
        let with = format!("{}  - {rule}\n", boots());
        cross(&with, BENCH).is_clean();
        let without = with.replace(", waveform: yes", "");
        let resolved = cross(&without, BENCH);
        let found = resolved.problems.iter().find(|p| p.place.text() == text);
        let found = found.unwrap_or_else(|| panic!("{rule}: {:?}", resolved.problems));
        assert!(found.message.contains("no step takes a waveform"));
    }
}

#[test]
fn rules_on_a_waveform_only_inform_unless_told() {
    use crate::spec::sequence::RuleWeight;
    let text = format!(
        "{}  - harmonics: class A\n  - voltage change: {{dc: 3.3 %}}\n    weight: required\n",
        boots()
    );
    let plan = planned(&text);
    let weights: Vec<RuleWeight> = plan.rules.iter().rev().take(2).map(|r| r.weight).collect();
    assert_eq!(weights, [RuleWeight::Required, RuleWeight::Information]);
    assert!(
        plan.rules
            .iter()
            .rev()
            .take(2)
            .all(|r| r.source.contains("an indication"))
    );
}
