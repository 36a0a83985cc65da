//! What drifts of the room and of the supply explain is not settled.

use super::*;

/// Feeds a unit with its supply's voltage too; gives the state after `until_min`.
fn feed_with_volts(
    settle: &mut Settle,
    until_min: f64,
    unit: impl Fn(f64) -> (f64, f64, f64, f64),
) -> Settling {
    let mut t = 0.0;
    while t < until_min * 60.0 {
        let (volts, power, body, ambient) = unit(t);
        let at = Moment::START + Seconds::of(t);
        settle.take(at, Watched::Voltage, volts);
        settle.take(at, Watched::Power, power);
        settle.take(at, Watched::Body, body);
        settle.take(at, Watched::Ambient, ambient);
        t += 2.0;
    }
    settle.state().clone()
}

fn of_element(rule: &Criterion, element: HeatingElement, fan: bool) -> Settle {
    let setup = soaking(rule, 10.0, 2.0);
    Settle::new(
        Soaking {
            element,
            fan,
            ..setup
        },
        Moment::START,
    )
}

fn why(state: &Settling) -> &str {
    match state {
        Settling::NotYet(why) => why,
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_room_that_drifts_2_kelvins_an_hour_explains_a_ptc_input() {
    let rule = slope(5.0, Some(0.02), None);
    let room = |per_hour: f64| move |t: f64| (230.0, 9.0, 80.0, 20.0 + per_hour * t / 3600.0);
    let ptc = |drift: f64| {
        let mut settle = of_element(&rule, HeatingElement::Ptc, false);
        feed_with_volts(&mut settle, 20.0, room(drift))
    };
    assert_eq!(
        why(&ptc(2.1)),
        "ambient drifts +2.1 K/h, which explains 2.10 %/h of the power, more than half of its \
         limit of 2 %/h (house default)"
    );
    // 1 %/h is exactly half of the limit, and allowed.
    let calm = ptc(0.99);
    assert!(
        matches!(&calm, Settling::Settled { criterion, .. } if criterion.contains("ambient +0.99 K/h"))
    );
    let mut resistor = of_element(&rule, HeatingElement::Resistor, false);
    let state = feed_with_volts(&mut resistor, 20.0, room(2.1));
    assert!(matches!(state, Settling::Settled { .. }), "{state:?}");
}

#[test]
fn a_drifting_supply_explains_by_the_element_s_exponent() {
    let rule = slope(5.0, Some(0.02), None);
    // 1 % of the voltage per hour; the power held all the same.
    let unit = |t: f64| (230.0 * (1.0 + 0.01 * t / 3600.0), 9.0, 80.0, 20.0);
    for (element, fan, refused) in [
        (HeatingElement::Resistor, false, true),
        (HeatingElement::Ptc, true, true),
        (HeatingElement::Ptc, false, false),
    ] {
        let mut settle = of_element(&rule, element, fan);
        let state = feed_with_volts(&mut settle, 20.0, unit);
        if refused {
            let why = why(&state);
            assert!(why.starts_with("the supply drifts +1.00 %/h"), "{why}");
        } else {
            assert!(matches!(state, Settling::Settled { .. }), "{state:?}");
        }
    }
}

#[test]
fn a_change_over_a_window_counts_the_drift_over_that_window() {
    let kind = CriterionKind::ChangeWithin {
        interval: minutes(10.0),
    };
    let rule = criterion(kind, None, Some(1.0));
    let unit = |per_hour: f64| {
        move |t: f64| {
            let room = 20.0 + per_hour * t / 3600.0;
            (230.0, 9.0, room + 60.0, room)
        }
    };
    // 2 K/h are a third of a kelvin in 10 min, 6 K/h are one.
    let mut settle = of_element(&rule, HeatingElement::Ptc, false);
    let state = feed_with_volts(&mut settle, 30.0, unit(2.0));
    assert!(matches!(state, Settling::Settled { .. }), "{state:?}");
    let mut settle = of_element(&rule, HeatingElement::Ptc, false);
    let state = feed_with_volts(&mut settle, 30.0, unit(6.0));
    assert!(why(&state).contains("ambient drifts +6.0 K/h"), "{state:?}");
}

#[test]
fn what_was_not_read_is_said() {
    let rule = slope(5.0, Some(0.02), None);
    let mut settle = watch(&rule, 10.0, 2.0, false);
    for second in 0..700 {
        let at = Moment::START + Seconds::of(f64::from(second));
        settle.take(at, Watched::Power, 9.0);
    }
    let Settling::Settled { criterion, .. } = settle.state() else {
        panic!("{:?}", settle.state());
    };
    let both = "drift of ambient not known, drift of the supply not known";
    assert!(criterion.contains(both), "{criterion}");
}
