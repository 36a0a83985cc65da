//! Published criteria against computed curves: T = T0 + 100 K (1 - exp(-t / 10 min)).

use super::*;

/// Within one grid cell of 5 s, and the value that closes it.
const CELL_MIN: f64 = 6.0 / 60.0;

fn to_come(settle: &mut Settle) -> f64 {
    let rise = settle.prediction().rise.expect("a prediction");
    assert!(rise.end_standard < 1e-6, "{rise:?}");
    rise.still_to_come
}

fn settled(state: &Settling) -> &str {
    match state {
        Settling::Settled { criterion, .. } => criterion,
        other => panic!("{other:?}"),
    }
}

// Computed: the derivative falls below 1 K/h (IEC 60598-1 12.4.1) at 63.969 min with
// 0.167 K to come, below 2 K/h (IEC 60034-1) at 57.038 min. The slope of a
// window is that of its middle.
#[test]
fn slopes_of_1_and_2_kelvins_per_hour() {
    for (limit, published, left, source) in [
        (1.0, 63.969, 0.166_667, "IEC 60598-1 12.4.1"),
        (2.0, 57.038, 0.333_333, "IEC 60034-1"),
    ] {
        let mut settle = watch(&slope(1.0, None, Some(limit)), 10.0, 1.0, false);
        let (at, state) = feed(&mut settle, 1.0, 120.0, first_order);
        let of_middle = at - 0.5;
        assert!(
            (of_middle - published).abs() <= 2.0 * CELL_MIN,
            "{limit}: {of_middle}"
        );
        assert!(settled(&state).contains(source), "{state:?}");
        let told = to_come(&mut settle);
        let truth = 100.0 * libm::exp(-settle.closed_to / 600.0);
        assert!((told - truth).abs() < 1e-3, "{told} {truth}");
        // Slope times tau: where the derivative is at its limit, that is what is left.
        assert!((100.0 * libm::exp(-published / 10.0) - left).abs() < 1e-4);
        assert!(told < left + 1e-3);
    }
}

// Computed: three readings 5 min apart within 1 K (IEC 61810-7) at 51.465 min, with
// 0.582 K to come.
#[test]
fn three_readings_five_minutes_apart_within_one_kelvin() {
    let kind = CriterionKind::ChangeWithin {
        interval: minutes(10.0),
    };
    let mut settle = watch(&criterion(kind, None, Some(1.0)), 10.0, 1.0, false);
    let (at, state) = feed(&mut settle, 1.0, 120.0, first_order);
    assert!((at - 51.465).abs() < 2.0 * CELL_MIN, "{at}");
    assert!(settled(&state).contains("IEC 61810-7"), "{state:?}");
    let told = to_come(&mut settle);
    assert!((told - 0.582).abs() < 0.01, "{told}");
}

/// A power that falls from twice `end` with 10 min.
fn falling(end: f64) -> impl Fn(f64) -> (f64, f64, f64) {
    move |t| (end * (1.0 + libm::exp(-t / 600.0)), 80.0, 20.0)
}

// Computed with the sums of a regression over the last two thirds, second by second
// (no outside source): 114.58 min for 10 W and 1 %/h, 100.33 min for 0.5 W and 10 mW/h.
#[test]
fn the_sampling_method_drops_the_first_third() {
    let rule = criterion(CriterionKind::SamplingMethod, None, None);
    for (end, expected, mean, text) in [
        (10.0, 114.58, 10.0287, "%/h within 1 %/h"),
        (0.5, 100.33, 0.502_64, "mW/h within 10 mW/h"),
    ] {
        let mut settle = watch(&rule, 15.0, 1.0, false);
        let (at, state) = feed(&mut settle, 1.0, 180.0, falling(end));
        assert!((at - expected).abs() < 2.0 * CELL_MIN, "{end} W: {at}");
        let found = settled(&state).to_owned();
        assert!(
            found.contains(text) && found.contains("IEC 62301"),
            "{found}"
        );
        let Settling::Settled { from, to, .. } = state else {
            panic!("{state:?}");
        };
        let (from, to) = (
            from.since(Moment::START).get(),
            to.since(Moment::START).get(),
        );
        assert!((from - to / 3.0).abs() < 6.0, "{from} {to}");
        let over = |t: f64| end * (t - 600.0 * libm::exp(-t / 600.0));
        let result = (over(to) - over(from)) / (to - from);
        assert!((result - mean).abs() < 2e-4 * mean, "{result}");
    }
}

#[test]
fn the_sampling_method_logs_for_15_min_at_1_s_and_gives_up_after_3_h() {
    let rule = criterion(CriterionKind::SamplingMethod, None, None);
    let steady = |_| (9.0, 80.0, 20.0);
    let (at, _) = feed(&mut watch(&rule, 10.0, 1.0, false), 1.0, 60.0, steady);
    assert!((15.0..15.2).contains(&at), "{at}");
    let (_, slow) = feed(&mut watch(&rule, 10.0, 2.0, false), 2.0, 60.0, steady);
    assert!(matches!(&slow, Settling::NotYet(why) if why.contains("each second")));
    let drifting = |t: f64| (9.0 * (1.0 + 0.02 * t / 3600.0), 80.0, 20.0);
    let (_, state) = feed(&mut watch(&rule, 15.0, 1.0, false), 1.0, 179.0, drifting);
    assert!(matches!(&state, Settling::NotYet(why) if why.contains("%/h, not within 1 %/h")));
    let (_, state) = feed(&mut watch(&rule, 15.0, 1.0, false), 1.0, 182.0, drifting);
    assert!(matches!(&state, Settling::NotYet(why) if why.contains("within 3 h")));
}

#[test]
fn an_absolute_power_limit_is_in_watts() {
    let rule = |watts: f64| Criterion {
        power_change: Some(PowerChange::Absolute(Watts::of(watts))),
        ..slope(5.0, None, None)
    };
    let drifting = |t: f64| (9.0 + 0.06 * t / 3600.0, 80.0, 20.0);
    let (_, state) = feed(
        &mut watch(&rule(0.05), 10.0, 2.0, false),
        2.0,
        30.0,
        drifting,
    );
    let Settling::NotYet(why) = state else {
        panic!("{state:?}");
    };
    assert_eq!(why, "power +60.00 mW/h, not within 50 mW/h");
    let (at, state) = feed(
        &mut watch(&rule(0.07), 10.0, 2.0, false),
        2.0,
        30.0,
        drifting,
    );
    assert!(at < 10.2 && settled(&state).contains("within 70 mW/h"));
}

// Two readings of a coarse instrument may differ by one step without any change.
#[test]
fn without_change_is_no_finer_than_the_resolution() {
    let rule = criterion(CriterionKind::ThreeReadings, None, Some(0.1));
    let steps = |t: f64| (9.0, if t < 850.0 { 80.0 } else { 81.0 }, 20.0);
    let settles_at = |resolution: f64| {
        let mut setup = soaking(&rule, 10.0, 2.0);
        setup.temperature_resolution = Kelvins::of(resolution);
        let (at, state) = feed(
            &mut Settle::new(setup, Moment::START),
            2.0,
            60.0,
            |t| match t {
                t if t < 300.0 => (9.0, 60.0 + t / 15.0, 20.0),
                t => steps(t),
            },
        );
        (at, settled(&state).to_owned())
    };
    let (at, found) = settles_at(1.0);
    assert!((14.9..15.3).contains(&at), "{at}");
    assert!(found.contains("within 1 K, the resolution"), "{found}");
    let (at, found) = settles_at(0.1);
    assert!((24.2..24.5).contains(&at), "{at}");
    assert!(found.ends_with("within 0.1 K"), "{found}");
}

#[test]
fn a_dead_unit_never_settles_by_its_temperature_alone() {
    let rule = slope(5.0, None, Some(1.0));
    let dead = |_| (0.0, 20.0, 20.0);
    let (_, state) = feed(&mut watch(&rule, 10.0, 2.0, false), 2.0, 30.0, dead);
    assert_eq!(state, Settling::NotYet("no power is drawn".to_owned()));
}
