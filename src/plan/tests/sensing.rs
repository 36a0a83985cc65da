//! Which sensor may hang on which channel.

use super::*;
use crate::sensor::{Couple, CoupleClass, Sensor};

/// The demo bench with another scanner, and with a sensor on the body's and every
/// other channel.
fn bench(driver: &str, body: &str, others: &str) -> String {
    let mut text = changed(
        BENCH,
        "driver: scpi-temperature-scanner",
        &format!("driver: {driver}"),
    );
    for (channel, sensor) in [(1, body), (2, others), (3, others)] {
        if !sensor.is_empty() {
            let to = format!("channel: {channel}, sensor: {sensor}}}");
            text = changed(&text, &format!("channel: {channel}}}"), &to);
        }
    }
    text
}

const COUPLES: &str = "scpi-thermocouple-scanner";
const OHMS: &str = "scpi-resistance-scanner";
const K: &str = "{type: K, class: 1}";
const PT: &str = "{type: Pt100, class: A}";

#[test]
fn raw_scanners_with_their_sensors_pass_without_a_word() {
    for (driver, sensor) in [(COUPLES, K), (OHMS, PT)] {
        cross(dryer(), &bench(driver, sensor, sensor)).is_clean();
    }
    // Where the instrument converts, any sensor may hang on it, or an unknown one.
    let converting = "scpi-temperature-scanner";
    cross(dryer(), &bench(converting, K, PT)).is_clean();
    cross(dryer(), &bench(converting, "", PT)).is_clean();
}

#[test]
fn raw_values_without_a_sensor_are_refused_at_the_instrument() {
    for (driver, sensor, gives, hint) in [
        (
            COUPLES,
            K,
            "thermocouple voltage",
            "sensor: {type: K, class: 1}",
        ),
        (OHMS, PT, "resistance", "sensor: {type: Pt100, class: A}"),
    ] {
        let message = format!("gives {gives}, and role `body` names no sensor");
        cross(dryer(), &bench(driver, "", sensor))
            .refuses("scanner", &message, hint)
            .only();
    }
}

#[test]
fn a_sensor_that_the_readings_can_not_be_from_is_refused() {
    cross(dryer(), &bench(COUPLES, PT, K))
        .refuses(
            PT,
            "has a Pt100, but driver `scpi-thermocouple-scanner` reads thermocouple",
            "type: K",
        )
        .only();
    cross(dryer(), &bench(OHMS, K, PT))
        .refuses(
            K,
            "has a thermocouple, but driver `scpi-resistance-scanner` reads resistance",
            "Pt100",
        )
        .only();
}

#[test]
fn a_sensor_on_a_role_that_measures_no_temperature_is_refused() {
    let text = changed(
        BENCH,
        "meter: {instrument: meter}",
        "meter: {instrument: meter, sensor: {type: K, class: 1}}",
    );
    cross(dryer(), &text)
        .refuses(
            K,
            "role `meter` is a power meter: it has no sensor",
            "take `sensor` out",
        )
        .only();
}

#[test]
fn the_accuracy_of_raw_readings_is_missed_unless_that_of_the_whole_chain_is_stated() {
    let text = bench(COUPLES, K, K);
    let strip = |driver: &mut Driver| driver.accuracy.clear();
    let missing = Crossing::of(dryer(), &text)
        .driver(COUPLES, strip)
        .resolve();
    for word in ["thermocouple voltage", "terminal temperature"] {
        let told = format!("states no accuracy of {word}");
        assert!(
            missing.problems.iter().any(|p| p.message.contains(&told)),
            "{word}"
        );
    }
    let whole = |driver: &mut Driver| {
        driver.accuracy.truncate(1);
        driver.accuracy[0].reading = crate::quantity::Reading::Temperature;
    };
    Crossing::of(dryer(), &text)
        .driver(COUPLES, whole)
        .resolve()
        .is_clean();
}

#[test]
fn the_plan_knows_the_sensor_and_old_plans_still_load() {
    let plan = cross(dryer(), &bench(COUPLES, K, K)).plan.unwrap();
    let (_, body) = plan.role("body").unwrap();
    let k = Sensor::Thermocouple {
        couple: Couple::K,
        class: CoupleClass::One,
    };
    assert_eq!((body.sensor, plan.raw_sensor(body)), (Some(k), Some(k)));
    let back: Plan = serde_json::from_str(&serde_json::to_string(&plan).unwrap()).unwrap();
    assert_eq!(back, plan);
    // A plan without any sensor is written as it was before sensors were known.
    let old = planned(dryer());
    let text = serde_json::to_string(&old).unwrap();
    assert!(!text.contains("sensor"), "{text}");
    let back: Plan = serde_json::from_str(&text).unwrap();
    assert_eq!(back.role("body").unwrap().1.sensor, None);
    // A sensor behind an instrument that converts is known, but nothing is converted by it.
    let plan = cross(dryer(), &bench("scpi-temperature-scanner", K, K))
        .plan
        .unwrap();
    let (_, body) = plan.role("body").unwrap();
    assert_eq!((body.sensor, plan.raw_sensor(body)), (Some(k), None));
}
