//! Predictions, and soaks that they end.

use super::*;

fn early(rule: &Criterion, element: HeatingElement) -> Settle {
    let mut setup = soaking(rule, 10.0, 2.0);
    setup.soak.early_finish = true;
    setup.element = element;
    Settle::new(setup, Moment::START)
}

/// Feeds until the soak is over; when (minutes) and how.
fn run(settle: &mut Settle, unit: impl Fn(f64) -> (f64, f64, f64)) -> (f64, Settling) {
    let mut t = 0.0;
    while t < 120.0 * 60.0 && !settle.is_over() {
        let (power, body, ambient) = unit(t);
        let at = Moment::START + Seconds::of(t);
        settle.take(at, Watched::Power, power);
        settle.take(at, Watched::Body, body);
        settle.take(at, Watched::Ambient, ambient);
        t += 2.0;
    }
    (t / 60.0, settle.state().clone())
}

/// 9 W in the end, 60 K in the end, with a fast phase of a minute and noise.
fn warming(seed: u64) -> impl Fn(f64) -> (f64, f64, f64) {
    move |t: f64| {
        let tick = (t * 10.0) as u64 + 1_000_003 * seed;
        let fast = libm::exp(-t / 25.0);
        let slow = libm::exp(-t / 420.0);
        (
            9.0 + 20.0 * fast + 1.5 * slow + 0.004 * noise(tick),
            22.0 + 60.0 * (1.0 - slow) + 0.1 * noise(tick + 500_000),
            22.0 + 0.1 * noise(tick + 700_000),
        )
    }
}

#[test]
fn a_prediction_knows_the_end_the_time_constant_and_the_time_to_go() {
    let rule = slope(5.0, Some(0.02), Some(3.0));
    let mut settle = watch(&rule, 10.0, 2.0, false);
    let unit = warming(1);
    for i in 0..600 {
        let t = 2.0 * f64::from(i);
        let (power, body, ambient) = unit(t);
        let at = Moment::START + Seconds::of(t);
        settle.take(at, Watched::Power, power);
        settle.take(at, Watched::Body, body);
        settle.take(at, Watched::Ambient, ambient);
    }
    let told = settle.prediction();
    let (power, rise) = (told.power.expect("power"), told.rise.expect("rise"));
    assert!((power.end - 9.0).abs() <= power.end_expanded, "{power:?}");
    assert!((rise.end - 60.0).abs() <= rise.end_expanded, "{rise:?}");
    assert!((rise.tau_s - 420.0).abs() < 20.0, "{rise:?}");
    let left = 60.0 * libm::exp(-settle.closed_to / 420.0);
    assert!((rise.still_to_come - left).abs() <= rise.end_expanded);
    // 60 K / 420 s exp(-t / 420 s) = 3 K/h, half a window late: 33.5 min (computed).
    let settled_at = rise.settled_at.expect("a moment").as_secs_f64();
    let computed = 420.0 * libm::log(60.0 * 3600.0 / 420.0 / 3.0) + 150.0;
    assert!(
        (settled_at - computed).abs() < 90.0,
        "{settled_at} {computed}"
    );
    let to_go = rise.to_go.expect("a time").get();
    assert!((settled_at - settle.closed_to - to_go).abs() < 31.0);
    // Asking again without new data changes nothing.
    assert_eq!(settle.prediction(), told);
}

#[test]
fn too_little_or_bent_data_predict_nothing() {
    let rule = slope(5.0, None, Some(3.0));
    let predicted = |until_min: f64, unit: &dyn Fn(f64) -> (f64, f64, f64)| {
        let mut settle = watch(&rule, 120.0, 2.0, false);
        feed(&mut settle, 2.0, until_min, unit);
        settle.prediction().rise
    };
    // Less than 1.5 of its time constants.
    let slow = |t: f64| (9.0, 20.0 + 60.0 * (1.0 - libm::exp(-t / 3600.0)), 20.0);
    assert_eq!(predicted(60.0, &slow), None);
    assert!(predicted(110.0, &slow).is_some());
    // A straight climb ends nowhere.
    let climbing = |t: f64| (9.0, 40.0 + 5.0 * t / 3600.0 + 0.05 * noise(t as u64), 20.0);
    assert_eq!(predicted(60.0, &climbing), None);
    let nothing = watch(&rule, 10.0, 2.0, false).prediction();
    assert_eq!(nothing, Predictions::default());
}

#[test]
fn an_early_finish_saves_time_and_its_u_holds_the_end() {
    let rule = slope(5.0, Some(0.02), Some(3.0));
    let (mut held, mut ended) = (0, 0);
    for seed in 0..12 {
        let (whole, _) = run(&mut watch(&rule, 10.0, 2.0, false), warming(seed));
        let (at, state) = run(&mut early(&rule, HeatingElement::Ptc), warming(seed));
        let Settling::Extrapolated {
            from,
            to,
            power,
            rise,
            criterion,
        } = state
        else {
            panic!("{seed}: {state:?}");
        };
        assert!(at < 0.75 * whole, "{seed}: {at} of {whole} min");
        assert!(at >= 10.0 && to.since(from).get() >= 0.1 * 60.0 * at - 40.0);
        assert!(criterion.starts_with("extrapolated") && criterion.contains("house default"));
        let within = |p: Option<Prediction>, truth: f64| {
            p.is_none_or(|p| (p.end - truth).abs() <= p.end_expanded)
        };
        held += i32::from(within(power, 9.0)) + i32::from(within(rise, 60.0));
        ended += 2;
    }
    assert!(
        f64::from(held) >= 0.93 * f64::from(ended),
        "{held} of {ended}"
    );
}

#[test]
fn without_leave_no_soak_is_ended_early() {
    let rule = slope(5.0, Some(0.02), Some(3.0));
    let (_, state) = run(&mut watch(&rule, 10.0, 2.0, false), warming(3));
    assert!(matches!(state, Settling::Settled { .. }), "{state:?}");
}

// A second time constant of 40 min moves the end by 4 K: no prediction before it shows,
// or one whose U holds the true end.
#[test]
fn a_slow_second_time_constant_does_not_fool_the_prediction() {
    let rule = slope(5.0, None, Some(3.0));
    let (mut held, mut ended) = (0, 0);
    for seed in 0..6 {
        for (share, tau) in [(4.0, 2400.0), (8.0, 1800.0), (2.0, 1500.0)] {
            let unit = move |t: f64| {
                let (power, body, ambient) = warming(seed)(t);
                (power, body + share * (1.0 - libm::exp(-t / tau)), ambient)
            };
            let (_, state) = run(&mut early(&rule, HeatingElement::Ptc), unit);
            if let Settling::Extrapolated {
                rise: Some(rise), ..
            } = state
            {
                ended += 1;
                held += i32::from((rise.end - 60.0 - share).abs() <= rise.end_expanded);
            }
        }
    }
    assert!(held * 100 >= ended * 90, "{held} of {ended}");
}

#[test]
fn a_plain_resistor_s_constant_input_needs_no_prediction() {
    let rule = slope(5.0, Some(0.02), Some(3.0));
    let unit = |t: f64| {
        let (_, body, ambient) = warming(5)(t);
        (400.0 + 0.1 * noise((t * 10.0) as u64), body, ambient)
    };
    let (at, state) = run(&mut early(&rule, HeatingElement::Resistor), unit);
    let Settling::Extrapolated {
        power,
        rise,
        criterion,
        ..
    } = state
    else {
        panic!("{state:?}");
    };
    assert!(power.is_none() && rise.is_some() && at < 25.0, "{at}");
    assert!(criterion.contains("power meets the criterion"));
}

#[test]
fn a_drifting_room_is_no_time_to_extrapolate() {
    let rule = slope(5.0, Some(0.02), None);
    let unit = |t: f64| {
        let (power, body, ambient) = warming(6)(t);
        (power, body, ambient + 3.0 * t / 3600.0)
    };
    let (_, state) = run(&mut early(&rule, HeatingElement::Ptc), unit);
    assert!(matches!(state, Settling::NotYet(_)), "{state:?}");
}

#[test]
fn a_unit_that_goes_open_is_never_extrapolated() {
    let rule = slope(5.0, None, Some(3.0));
    let unit = |t: f64| {
        let (power, body, ambient) = warming(7)(t);
        (if t < 590.0 { power } else { 0.0 }, body, ambient)
    };
    let (_, state) = run(&mut early(&rule, HeatingElement::Ptc), unit);
    assert_eq!(state, Settling::WentOpen);
}
