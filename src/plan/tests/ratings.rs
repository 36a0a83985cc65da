//! Voltages, currents and accuracies that do not fit.

use super::*;
use crate::quantity::{Reading, Volts};

#[test]
fn a_supply_more_than_ten_per_cent_from_the_plate_is_warned_of() {
    let at = |volts: &str| {
        let text = changed(
            dryer(),
            "voltage: 230 V, frequency: 50 Hz}\n      steps",
            &format!("voltage: {volts}, frequency: 50 Hz}}\n      steps"),
        );
        let resolved = cross(&text, BENCH);
        resolved.problems.iter().any(|p| {
            p.weight == Weight::Warning
                && p.message.contains("more than 10 % away")
                && p.place.text() == format!("{{voltage: {volts}, frequency: 50 Hz}}")
        })
    };
    // The plate's 220 V to 240 V.
    assert!(!at("198 V") && !at("264 V"));
    assert!(at("197.9 V") && at("264.1 V"));
}

#[test]
fn a_plate_above_the_bays_rating_is_refused_and_at_it_is_not() {
    let heater = shipped_as("fan-heater");
    let bench = changed(BENCH, "rated current: 16 A", "rated current: 6 A");
    let resolved = cross(heater, &bench);
    resolved.refuses(
        "1.5 kW",
        "the plate's 6.52 A is above the rated current of bay `bay 1`, 6 A",
        "rated for it",
    );
    assert!(resolved.problems.iter().all(|p| p.place.text() != "750 W"));
    // 1.38 kW / 230 V is 6 A.
    let just = changed(heater, "power: 1.5 kW", "power: 1.38 kW");
    assert!(cross(&just, &bench).plan.is_some());
}

#[test]
fn an_inrush_limit_above_the_bays_rating_is_warned_of_and_at_it_is_not() {
    let limit = |amps: &str| {
        changed(
            dryer(),
            "inrush: {at most: 0.5 A}",
            &format!("inrush: {{at most: {amps}}}"),
        )
    };
    cross(&limit("16.1 A"), BENCH)
        .warns(
            "inrush",
            "16.1 A is above the rated current of bay `bay 1`, 16 A",
            "lower limit",
        )
        .only();
    cross(&limit("16 A"), BENCH).is_clean();
}

#[test]
fn a_body_sensor_without_isolation_is_warned_of() {
    let with = |isolation| {
        Crossing::of(dryer(), BENCH)
            .driver("scpi-temperature-scanner", |driver| {
                driver.isolation = isolation
            })
            .resolve()
    };
    with(None)
        .warns(
            "scanner",
            "states no isolation of its sensor inputs",
            "insulated sensors rated for 230 V",
        )
        .only();
    with(Some(Volts::of(60.0)))
        .warns("scanner", "up to 60 V only", "`isolation:`")
        .only();
    with(Some(Volts::of(230.0))).is_clean();
}

#[test]
fn a_supply_that_can_not_set_a_frequency_feeds_only_one() {
    let line = "        - {voltage: 230 V, frequency: 50 Hz}\n";
    let two = format!("{line}        - {{voltage: 230 V, frequency: 60 Hz}}\n");
    let fixed = |text: &str| {
        Crossing::of(text, BENCH)
            .driver("scpi-ac-supply", |driver| driver.settings.frequency = None)
            .resolve()
    };
    fixed(dryer()).is_clean();
    fixed(&changed(dryer(), line, &two))
        .refuses(
            "{voltage: 230 V, frequency: 60 Hz}",
            "can't change its frequency from 50 Hz to 60 Hz",
            "`settings:`",
        )
        .only();
}

/// The dryer and the heat mat with a power meter of a given floor.
fn floor(text: &str, watts: f64) -> Resolved {
    let crossing = Crossing::of(text, BENCH).driver("scpi-power-meter", |driver| {
        let power = driver
            .accuracy
            .iter_mut()
            .find(|a| a.reading == Reading::Power);
        let power = power.unwrap();
        (
            power.of_reading,
            power.of_range,
            power.floor,
            power.resolution,
        ) = (0.0, 0.0, watts, 0.0);
    });
    let mut crossing = crossing;
    // Without the certificate's share the limit is in round numbers.
    let from = crossing.bench.find("    calibration:\n").unwrap();
    let to = crossing.bench.find("  scanner:\n").unwrap();
    crossing.bench.replace_range(from..to, "");
    crossing.resolve()
}

#[test]
fn a_meter_whose_u_exceeds_half_of_the_tolerance_is_warned_of() {
    // 40 W +-10 %: the limits leave 4 W; U = 2 a / sqrt 3 (JCGM 100, 4.3.7).
    let just = 4.0 * 3f64.sqrt() / 2.0;
    floor(FLAT, just).is_clean();
    floor(FLAT, just * 1.001)
        .warns(
            "40 W",
            "at 40 W the meter's U is 4 W, the limits leave 4 W: the power will be not judged",
            "more accurate",
        )
        .only();
}

#[test]
fn under_an_upper_limit_alone_the_room_is_from_the_rated_input_to_it() {
    // 4.5 W + 20 %: 0.9 W.
    let just = 0.9 * 3f64.sqrt() / 2.0;
    floor(dryer(), just * 0.999).is_clean();
    floor(dryer(), just * 1.01)
        .warns("4.5 W", "the power will be not judged", "range that fits")
        .only();
}

#[test]
fn a_simple_decision_needs_its_largest_u_and_a_guarded_one_its_share() {
    let decided = |decision: &str, watts: f64| {
        let rule = format!("  - power: plate\n    decision: {decision}\n");
        floor(&changed(FLAT, "  - power: plate\n", &rule), watts)
            .problems
            .len()
    };
    let just = 4.0 * 3f64.sqrt() / 2.0;
    assert!(decided("{simple: {largest U: 50 W}}", 10.0 * just) > 0);
    // Both positions, 40 W and 80 W.
    assert_eq!(decided("{simple: {largest U: 3 W}}", 0.9 * just), 2);
    assert_eq!(decided("{simple: {largest U: 3 W}}", 0.7 * just), 0);
    assert_eq!(decided("{guarded: 0.5}", 0.99 * just), 0);
    assert_eq!(decided("{guarded: 0.5}", 1.01 * just), 1);
    assert_eq!(decided("{guarded: 2}", 0.51 * just), 1);
}

#[test]
fn explicit_limits_leave_room_or_are_warned_of_at_the_rule() {
    let rule = "  - power: {at least: 75 W, at most: 85 W}\n    position: high\n";
    let text = changed(FLAT, "  - power: plate\n", rule);
    let just = 5.0 * 3f64.sqrt() / 2.0;
    floor(&text, just * 0.999).is_clean();
    floor(&text, just * 1.01)
        .warns("power", "at 80 W", "more accurate")
        .only();
}

#[test]
fn a_plate_above_the_meters_largest_range_is_warned_of() {
    let with = |largest: f64| {
        Crossing::of(FLAT, BENCH)
            .driver("scpi-power-meter", |driver| {
                let power = driver
                    .accuracy
                    .iter_mut()
                    .find(|a| a.reading == Reading::Power);
                power.unwrap().ranges = vec![50.0, largest];
            })
            .resolve()
    };
    with(80.0).is_clean();
    with(79.0)
        .warns(
            "80 W",
            "above the largest range of `meter`, 79 W",
            "larger range",
        )
        .only();
}
