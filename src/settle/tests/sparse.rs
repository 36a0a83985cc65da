//! Rows that come seldom, late, or not at all.

use super::*;

/// Readings by hand: one every 5 min, up to half a minute early or late.
fn by_hand(rule: &Criterion, unit: impl Fn(f64) -> (f64, f64, f64), hours: f64) -> (f64, Settling) {
    let mut settle = watch(rule, 10.0, 300.0, false);
    let mut round = 0;
    loop {
        let nominal = f64::from(round) * 300.0 + 60.0;
        let t = nominal + 60.0 * noise(u64::from(round as u32));
        let (power, body, ambient) = unit(t);
        let at = Moment::START + Seconds::of(t);
        settle.take(at, Watched::Power, power);
        settle.take(at + Seconds::of(8.0), Watched::Body, body);
        settle.take(at + Seconds::of(15.0), Watched::Ambient, ambient);
        let over = matches!(
            settle.state(),
            Settling::Settled { .. } | Settling::WentOpen
        );
        if over || t > hours * 3600.0 {
            return (t / 60.0, settle.state().clone());
        }
        round += 1;
    }
}

// Computed: readings 5 min apart are within 1 K from 51.465 min on; at one every 5 min,
// each up to half a minute off, that is the reading at 51 or 56 min, and the next one
// closes its cell. From 50 min on a tenth of the elapsed time is more than 5 min, so
// that three readings lie 10 min apart: within 1 K from 64.59 min on.
#[test]
fn readings_by_hand_settle_by_three_readings_and_by_change_within() {
    let change = CriterionKind::ChangeWithin {
        interval: minutes(10.0),
    };
    for (kind, from) in [(change, 51.465), (CriterionKind::ThreeReadings, 64.59)] {
        let rule = criterion(kind, None, Some(1.0));
        let (at, state) = by_hand(&rule, first_order, 3.0);
        assert!(matches!(state, Settling::Settled { .. }), "{state:?}");
        assert!((from + 4.0..from + 11.0).contains(&at), "{kind:?}: {at}");
        let climbing = |t: f64| (9.0, 40.0 + 8.0 * t / 3600.0, 20.0);
        let (_, state) = by_hand(&rule, climbing, 3.0);
        assert!(matches!(state, Settling::NotYet(_)), "{kind:?}: {state:?}");
    }
}

// Late in the soak the spacing is longer than the rows' own: the next older row counts.
#[test]
fn sparse_readings_are_never_closer_than_a_tenth_of_the_elapsed_time() {
    let rule = criterion(CriterionKind::ThreeReadings, None, Some(1.0));
    let slow = |t: f64| (9.0, 20.0 + 100.0 * (1.0 - libm::exp(-t / 1800.0)), 20.0);
    let (at, state) = by_hand(&rule, slow, 6.0);
    let Settling::Settled { from, to, .. } = state else {
        panic!("{state:?}");
    };
    assert!(to.since(from).get() >= 2.0 * 0.1 * 60.0 * (at - 10.0));
}

#[test]
fn a_slope_that_can_never_have_rows_enough_says_so() {
    let rule = slope(5.0, Some(0.02), None);
    let (_, state) = by_hand(&rule, |_| (9.0, 80.0, 20.0), 2.0);
    assert_eq!(
        state,
        Settling::NotYet(
            "it can never settle: a window of 5 min holds 1 readings at one every 5 min, and a \
             slope needs 6"
                .to_owned()
        )
    );
    let (_, state) = by_hand(&slope(40.0, Some(0.02), None), |_| (9.0, 80.0, 20.0), 2.0);
    assert!(matches!(state, Settling::Settled { .. }), "{state:?}");
}

#[test]
fn a_current_that_vanishes_between_sparse_rows_is_no_settled_unit() {
    let rule = criterion(CriterionKind::ThreeReadings, None, Some(50.0));
    for left in [0.0, 0.05] {
        let opens = move |t: f64| (if t < 700.0 { 9.0 } else { left }, 80.0, 20.0);
        let (_, state) = by_hand(&rule, opens, 2.0);
        assert_eq!(state, Settling::WentOpen);
    }
    // It vanishes with the reading that completes the third: not settled before the
    // next one confirms it.
    let mut settle = watch(&rule, 10.0, 300.0, false);
    for (round, power) in [(0, 9.0), (1, 9.0), (2, 0.0), (3, 0.0)] {
        let at = Moment::START + Seconds::of(300.0 * f64::from(round));
        settle.take(at, Watched::Body, 80.0);
        assert!(!matches!(settle.state(), Settling::Settled { .. }));
        settle.take(at, Watched::Power, power);
        settle.take(at, Watched::Ambient, 20.0);
    }
    assert_eq!(*settle.state(), Settling::WentOpen);
}

#[test]
fn a_gap_in_the_data_is_no_window() {
    let change = CriterionKind::ChangeWithin {
        interval: minutes(5.0),
    };
    for kind in [
        CriterionKind::Slope {
            window: minutes(5.0),
        },
        change,
    ] {
        let rule = criterion(kind, Some(0.02), None);
        let mut settle = watch(&rule, 10.0, 2.0, false);
        // Nothing from 6 to 10 min: the window at 10 min is filled at its ends only.
        for second in (0..360).chain(600..760) {
            let at = Moment::START + Seconds::of(f64::from(second));
            settle.take(at, Watched::Power, 9.0);
            if second > 610 {
                let Settling::NotYet(why) = settle.state() else {
                    panic!("{:?} at {second}", settle.state());
                };
                assert!(
                    why.contains("readings are missing") || why.contains("is full in"),
                    "{why}"
                );
            }
        }
    }
}
