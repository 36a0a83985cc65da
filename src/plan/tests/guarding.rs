//! Guards: none absent, each at its value.

use super::*;
use crate::quantity::near;

fn inputs(text: &str) -> Vec<f64> {
    let guards = cross(text, BENCH).plan.unwrap().guards;
    guards.input.iter().map(|watts| watts.get()).collect()
}

#[track_caller]
fn same(found: &[f64], expected: &[f64]) {
    assert_eq!(found.len(), expected.len());
    for (found, expected) in found.iter().zip(expected) {
        assert!(near(*found, *expected), "{found} is not {expected}");
    }
}

#[test]
fn the_body_trips_at_the_lower_of_tf_minus_ten_kelvin_and_the_sequences() {
    let body = |text: &str| cross(text, BENCH).plan.unwrap().guards.body.unwrap().get();
    assert_eq!(body(dryer()), 111.0);
    for (stated, expected) in [("111.5", 111.0), ("111", 111.0), ("90", 90.0)] {
        let text = changed(dryer(), "body: 115 °C", &format!("body: {stated} °C"));
        assert_eq!(body(&text), expected);
    }
    let text = changed(
        dryer(),
        "  body: 115 °C                  # the house default min(Tf - 10 K, this) applies\n",
        "",
    );
    assert_eq!(body(&text), 111.0);
    assert_eq!(body(FLAT), 70.0);
}

#[test]
fn the_other_guards_are_the_bays_rating_and_the_house_defaults() {
    let guards = planned(FLAT).guards;
    assert_eq!(guards.current.get(), 16.0);
    assert_eq!(guards.input_after.get(), 60.0);
    assert_eq!(guards.least_rise.get(), 10.0);
    assert_eq!(guards.rise_within.get(), 300.0);
    assert_eq!(planned(dryer()).guards.input_after.get(), 300.0);
}

#[test]
fn a_sequence_says_what_its_good_units_rise_by() {
    let stated = "body: 115 °C\n  least rise: 25 K\n  rise within: 8 min";
    let plan = planned(&changed(dryer(), "body: 115 °C", stated));
    assert_eq!(plan.guards.least_rise.get(), 25.0);
    assert_eq!(plan.guards.rise_within.get(), 480.0);
    let told = "the body rises by 25 K within 8 min (the sequence's)";
    let text = plan.lines_of_text().join("\n");
    assert!(text.contains(told), "{text}");
    let usual = "the body rises by 10 K within 5 min (house default)";
    let text = planned(dryer()).lines_of_text().join("\n");
    assert!(text.contains(usual), "{text}");
}

#[test]
fn silence_is_two_seconds_or_three_updates_of_each_roles_instrument() {
    let slow = Crossing::of(dryer(), BENCH).driver("scpi-temperature-scanner", |driver| {
        driver.update_interval = crate::quantity::Seconds::of(0.7);
    });
    let plan = slow.resolve().plan.unwrap();
    let silence: Vec<f64> = plan.guards.silence.iter().map(|s| s.get()).collect();
    // supply, meter, body, ambient, enclosure, switch: 3 x 0.1 s is less than 2 s.
    same(&silence, &[2.0, 2.0, 2.1, 2.1, 2.1, 2.0]);
}

#[test]
fn the_input_trips_at_thirteen_tenths_of_the_plates_upper_limit() {
    // IEC 60335-1 clause 10.1: up to 25 W +20 %.
    same(&inputs(dryer()), &[7.02, 14.04, 7.02, 14.04]);
    // 25 W to 200 W +10 %.
    same(&inputs(FLAT), &[1.3 * 44.0, 1.3 * 88.0]);
}

#[test]
fn a_position_without_plate_and_limit_is_guarded_by_the_highest_entry() {
    let entry = "    - {position: low, voltage: 230 V, frequency: 50 Hz, power: 40 W}\n";
    same(
        &inputs(&changed(FLAT, entry, "")),
        &[1.3 * 88.0, 1.3 * 88.0],
    );
}

#[test]
fn an_explicit_limit_guards_the_positions_and_conditions_that_it_is_for() {
    let boot = shipped_as("boot");
    same(&inputs(boot), &[1.3 * 50.0, 1.3 * 99.0]);
    let everywhere = changed(dryer(), "  - power: plate", "  - power: {at most: 8 W}");
    same(&inputs(&everywhere), &[10.4; 4]);
    let when_dry = changed(
        dryer(),
        "  - thermal link: holding",
        "  - power: {at most: 8 W}\n    condition: dry\n  - thermal link: holding",
    );
    same(&inputs(&when_dry), &[7.02, 14.04, 10.4, 10.4]);
}

#[test]
fn a_limit_that_only_informs_does_not_cut_short_what_the_plate_allows() {
    let rule = "  - power: {at most: 3 W}\n    weight: information\n  - thermal link: holding";
    let text = changed(dryer(), "  - thermal link: holding", rule);
    same(&inputs(&text), &[7.02, 14.04, 7.02, 14.04]);
    let entry = "    - {position: low, voltage: 230 V, frequency: 50 Hz, power: 40 W}\n";
    let text = changed(FLAT, entry, "");
    let rule = "  - power: {at most: 50 W}\n    position: low\n    weight: information\n";
    same(&inputs(&format!("{text}{rule}")), &[65.0, 1.3 * 88.0]);
}

#[test]
fn of_two_entries_for_one_position_the_one_near_the_supply_guards() {
    let entry = "    - {position: high, voltage: 230 V, frequency: 50 Hz, power: 80 W}\n";
    let other = "    - {position: high, voltage: 120 V, frequency: 60 Hz, power: 100 W}\n";
    let text = changed(FLAT, entry, &format!("{other}{entry}"));
    same(&inputs(&text), &[1.3 * 44.0, 1.3 * 88.0]);
}

#[test]
fn elements_that_are_rated_one_by_one_guard_together() {
    let entry = "    - {position: high, voltage: 230 V, frequency: 50 Hz, power: 80 W}\n";
    let one =
        |name| changed(entry, "high,", &format!("high, element: {name},")).replace("80", "40");
    let text = changed(FLAT, entry, &format!("{}{}", one("A"), one("B")));
    same(&inputs(&text), &[1.3 * 44.0, 1.3 * 88.0]);
}
