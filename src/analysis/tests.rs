//! Analysis of played records with a known truth.

use super::fixture::{BODY, METER, Now, Played, Seen, good, noise, plan, play, play_until};
use super::*;
use crate::plan::{Action, Plan};
use crate::quantity::{Amps, Kelvins, Reading, Readings, Seconds, Volts};
use crate::record::Status;
use crate::spec::sequence::{CriterionKind, MeasuredAt, SelfHeating};

fn near(found: f64, wanted: f64, by: f64) {
    assert!(
        (found - wanted).abs() <= by,
        "{found} is not {wanted} ± {by}"
    );
}

fn first(played: &Played) -> CellResult {
    played.analysis().cells.into_iter().next().unwrap()
}

/// The rows of one role of a played record, changed.
fn changed(mut played: Played, role: usize, change: impl Fn(&mut crate::record::Sample)) -> Played {
    for row in played.samples.iter_mut().filter(|row| row.role == role) {
        change(row);
    }
    played
}

fn degrees(value: f64) -> Readings {
    Readings::one(Reading::Temperature, value)
}

#[test]
fn a_good_unit_is_measured_as_it_is() {
    let analysis = play(plan(&["full"]), good).analysis();
    for (cell, watts, rise) in [(0, 4.3, 40.0), (1, 8.6, 60.0)] {
        let result = &analysis.cells[cell];
        assert_eq!(result.disbelief, Vec::<String>::new());
        assert!(
            result.cold_start.known().is_some(),
            "{:?}",
            result.cold_start
        );
        let steady = result.steady.known().unwrap();
        near(steady.power_w.value, watts, 0.005);
        let expanded = steady.at_plug_w.expanded;
        assert!((0.01..0.1).contains(&expanded), "{expanded}");
        // The room, known to 1.023 K, moves a PTC's input by 0.6 to 1 share of its rise.
        let room = 0.8 * watts / rise * 1.023 / 3f64.sqrt() * 2.0;
        near(
            steady.power_w.expanded,
            libm::hypot(room, expanded),
            0.02 * room,
        );
        assert!((1.9..2.2).contains(&steady.power_w.coverage));
        assert_eq!((steady.duty, steady.samples), (1.0, 120));
        near(steady.to_s - steady.from_s, 119.0, 0.01);
        let settled = *result.settled_s.known().unwrap();
        assert!((600.0..1200.0).contains(&settled), "{settled}");
        let peak = result.body_peak.known().unwrap();
        near(peak.temperature_degc.value, 23.0 + rise, 0.8);
        // Scanner: 0.1 % of reading + 1 K, rectangular, k = 2 (computed).
        near(
            peak.temperature_degc.expanded,
            1.06 / 3f64.sqrt() * 2.0,
            0.05,
        );
        near(result.body_worst.known().unwrap().value, 35.0 + rise, 0.8);
        near(result.rises[0].1.known().unwrap().value, 0.3 * rise, 0.5);
        let drawn = result.drawn.known().unwrap();
        assert_eq!((drawn.floor_w, drawn.vanished_s), (0.005, None));
    }
}

#[test]
fn the_budget_adds_up_and_its_largest_share_comes_first() {
    let played = play(plan(&["full"]), good);
    let steady = first(&played).steady.known().unwrap().clone();
    let referred = &steady.power_w.budget[0].from;
    assert_eq!(referred, "accuracy, temperature of ambient");
    let power = steady.at_plug_w;
    let squares: f64 = power.budget.iter().map(|s| s.standard * s.standard).sum();
    near(power.coverage * squares.sqrt(), power.expanded, 1e-9);
    assert!(
        power
            .budget
            .windows(2)
            .all(|p| p[0].standard >= p[1].standard)
    );
    assert!(
        power.budget[0].from.starts_with("accuracy, power"),
        "{:?}",
        power.budget
    );
    // 0.1 % of 4.3 W + 0.1 % of the 15 W range + 5 mW, rectangular (computed).
    near(power.budget[0].standard, 0.0243 / 3f64.sqrt(), 1e-4);
}

#[test]
fn inrush_is_measured_from_the_first_current() {
    let result = first(&play(plan(&["full"]), good));
    let inrush = result.inrush.known().unwrap();
    near(inrush.peak_w, 4.3 * 4.0, 0.2);
    near(inrush.ratio.unwrap(), 4.0, 0.05);
    near(
        inrush.half_way_s.unwrap(),
        15.0 * std::f64::consts::LN_2,
        0.3,
    );
    // 3 x 4.3 W x 15 s (computed).
    near(
        inrush.above_steady_wh.unwrap(),
        3.0 * 4.3 * 15.0 / 3600.0,
        0.002,
    );
    near(inrush.t0_s, result.energised_s.known().unwrap() + 0.0, 0.2);
    assert_eq!(inrush.lower_bound, Vec::<String>::new());
    assert_eq!(inrush.supply_limited, None);
}

#[test]
fn an_overload_in_the_inrush_makes_it_a_lower_bound() {
    let mut played = play(plan(&["full"]), good);
    let row = played
        .samples
        .iter_mut()
        .find(|row| row.role == METER && row.energised)
        .unwrap();
    row.status = Status::Overload;
    row.readings = Readings::NONE;
    let bounds = first(&played).inrush.known().unwrap().lower_bound.clone();
    assert!(bounds[0].contains("overload"), "{bounds:?}");
}

#[test]
fn a_spike_shorter_than_the_meter_follows_is_a_lower_bound() {
    let spike = |now: Now| {
        let mut seen = good(now);
        if now.on.is_some_and(|on| on < 0.15) {
            seen.watts = 60.0;
        }
        seen
    };
    let bounds = first(&play(plan(&["full"]), spike))
        .inrush
        .known()
        .unwrap()
        .lower_bound
        .clone();
    assert!(bounds[0].starts_with("sampled only"), "{bounds:?}");
}

#[test]
fn after_heat_counts_and_a_body_that_is_not_followed_is_not_judged() {
    let climbs = |now: Now| {
        let mut seen = good(now);
        if let Some((_, off)) = now.off.filter(|_| now.on.is_none()) {
            seen.body += 12.0 * (off / 20.0) * libm::exp(1.0 - off / 20.0);
        }
        seen
    };
    let played = play(plan(&["full"]), climbs);
    let result = first(&played);
    let peak = result.body_peak.known().unwrap();
    assert!(
        peak.after_heat && peak.temperature_degc.value > 68.0,
        "{peak:?}"
    );
    let mut cut = played.clone();
    let off = result.off_s.known().unwrap();
    cut.samples
        .retain(|row| row.reply.as_secs_f64() < off + 60.0);
    let result = first(&cut);
    assert!(result.body_worst.reason().unwrap().contains("followed"));
    assert!(result.body_peak.known().is_some());
}

#[test]
fn off_the_links_body_without_an_allowance_there_is_no_worst_case() {
    let elsewhere = |allowance: Option<f64>, heating: Option<f64>| {
        let mut plan = plan(&["full"]);
        plan.appliance.link.as_mut().unwrap().measured_at = MeasuredAt::Elsewhere {
            place: "the lid".to_owned(),
            allowance: allowance.map(Kelvins::of),
            source: None,
            self_heating: heating.map(|rise| SelfHeating {
                rise: Kelvins::of(rise),
                at: Amps::of(0.01),
            }),
        };
        first(&play(plan, good)).body_worst
    };
    let missing = |allowance, heating| elsewhere(allowance, heating).reason().unwrap().to_owned();
    assert!(missing(None, Some(0.0)).contains("no allowance"));
    assert!(missing(Some(7.0), None).contains("self-heating is not stated"));
    let without = elsewhere(Some(7.0), Some(0.0)).known().unwrap().value;
    near(without, 82.0, 0.8);
    // 2 K at 10 mA goes with the square: 18.7 mA at 4.3 W and 230 V gives 7.0 K.
    let with = elsewhere(Some(7.0), Some(2.0)).known().unwrap().value;
    near(with - without, 2.0 * (4.3f64 / 230.0 / 0.01).powi(2), 0.05);
}

#[test]
fn a_voltage_off_the_wanted_one_is_corrected_widened_and_then_refused() {
    let at = |volts: f64| {
        let unit = move |now: Now| {
            let mut seen = good(now);
            seen.volts *= volts / 230.0;
            seen
        };
        first(&play(plan(&["full"]), unit)).steady
    };
    let exact = at(230.0).known().unwrap().power_w.clone();
    let beside = at(228.0).known().unwrap().power_w.clone();
    let far = at(220.0).known().unwrap().power_w.clone();
    // A PTC in still air: exponent 0..0.3, never V squared.
    near(far.value / exact.value, (230.0f64 / 220.0).powf(0.15), 1e-3);
    assert!(exact.expanded < beside.expanded && beside.expanded < far.expanded);
    assert!(at(215.0).reason().unwrap().contains("not corrected"));
}

#[test]
fn more_noise_never_shrinks_the_uncertainty() {
    let with = |factor: f64| {
        let unit = move |now: Now| {
            let mut seen = good(now);
            if seen.watts > 0.0 {
                seen.watts += factor * 0.01 * noise(9, now.t);
            }
            seen
        };
        let result = first(&play(plan(&["full"]), unit));
        result.steady.known().unwrap().power_w.expanded
    };
    let all: Vec<f64> = [0.0, 1.0, 2.0, 4.0].map(with).to_vec();
    // 1 mW steps of the meter may move the last digit.
    assert!(
        all.windows(2).all(|pair| pair[1] >= pair[0] - 1e-4),
        "{all:?}"
    );
}

fn thermostat(now: Now) -> Seen {
    let mut seen = good(now);
    let Some(on) = now.on else {
        return seen;
    };
    let phase = (on - 200.0).rem_euclid(120.0);
    let heating = on < 200.0 || phase > 80.0;
    seen.watts = if heating {
        8.0 + 0.004 * noise(2, now.t)
    } else {
        0.0
    };
    let ripple = if on < 200.0 {
        0.0
    } else if heating {
        (phase - 80.0) / 40.0
    } else {
        1.0 - phase / 80.0
    };
    seen.body += 4.0 * ripple;
    seen
}

#[test]
fn a_thermostat_has_an_on_state_a_mean_and_a_duty() {
    let mut plan = plan(&["full"]);
    plan.appliance.thermostat = true;
    let result = first(&play(plan, thermostat));
    let steady = result.steady.known().unwrap();
    assert!(steady.criterion.contains("cycles"), "{}", steady.criterion);
    near(steady.power_w.value, 8.0, 0.01);
    // On 40 s of 120 s (computed).
    near(steady.duty, 1.0 / 3.0, 0.03);
    near(steady.mean_w, 8.0 / 3.0, 0.25);
    assert_eq!(result.drawn.known().unwrap().vanished_s, None);
}

#[test]
fn power_that_vanishes_is_told() {
    let opens = |now: Now| {
        let mut seen = good(now);
        if now.on.is_some_and(|on| on > 400.0) {
            seen.watts = 0.001;
        }
        seen
    };
    let result = first(&play(plan(&["full"]), opens));
    near(
        result.drawn.known().unwrap().vanished_s.unwrap(),
        401.0,
        2.5,
    );
    assert!(result.steady.reason().unwrap().contains("vanished"));
}

#[test]
fn a_soak_that_does_not_settle_leaves_no_steady_input_and_no_worst_case() {
    let drifts = |now: Now| {
        let mut seen = good(now);
        seen.body += 10.0 * now.on.unwrap_or(0.0) / 3600.0;
        seen
    };
    let result = first(&play(plan(&["full"]), drifts));
    for reason in [
        result.steady.reason(),
        result.body_worst.reason(),
        result.settled_s.reason(),
    ] {
        assert!(reason.unwrap().contains("had not settled"), "{reason:?}");
    }
    assert!(result.body_peak.known().is_some());
}

#[test]
fn sensors_that_lie_are_not_believed() {
    let check = |played: &Played, word: &str| {
        let all = first(played).disbelief.join("; ");
        assert!(all.contains(word), "{word}: {all}");
    };
    let good_run = play(plan(&["full"]), good);
    check(
        &play(plan(&["full"]), |now| Seen {
            body: 23.0 + 0.06 * noise(3, now.t),
            ..good(now)
        }),
        "rose by",
    );
    check(
        &play(plan(&["full"]), |now| {
            let seen = good(now);
            Seen {
                body: seen.ambient,
                ambient: seen.body,
                ..seen
            }
        }),
        "swapped",
    );
    check(
        &play(plan(&["full"]), |now| Seen {
            body: good(now).body - 9.0,
            ..good(now)
        }),
        "differed from ambient",
    );
    check(
        &play(plan(&["full"]), |now| {
            let fallen = now.on.is_some_and(|on| on > 500.0);
            let seen = good(now);
            Seen {
                body: if fallen {
                    30.0 + 0.06 * noise(3, now.t)
                } else {
                    seen.body
                },
                ..seen
            }
        }),
        "fell by",
    );
    check(
        &changed(good_run.clone(), BODY, |row| {
            if row.energised && row.reply.as_secs_f64() > 300.0 {
                row.readings = degrees(55.5);
            }
        }),
        "to the last digit",
    );
    check(
        &changed(good_run, BODY, |row| {
            if row.energised {
                row.status = Status::NoValue;
                row.readings = Readings::NONE;
            }
        }),
        "hold no value",
    );
}

#[test]
fn a_dead_unit_says_nothing_against_its_sensors() {
    let dead = |now: Now| Seen {
        watts: 0.0,
        body: 23.0 + 0.06 * noise(3, now.t),
        enclosure: 23.0,
        ..good(now)
    };
    let result = first(&play(plan(&["full"]), dead));
    assert_eq!(result.disbelief, Vec::<String>::new());
    assert_eq!(result.drawn.known().unwrap().power_w, 0.0);
}

#[test]
fn a_warm_start_is_no_cold_start() {
    let warm = |now: Now| {
        let mut seen = good(now);
        if now.cell.is_none() {
            seen.body += 6.0;
        }
        seen
    };
    let result = first(&play(plan(&["full"]), warm));
    assert!(
        result.cold_start.reason().unwrap().contains("6"),
        "{:?}",
        result.cold_start
    );
}

#[test]
fn cells_that_were_not_run_say_why() {
    let stopped = play_until(plan(&["full"]), good, |step, _| {
        (step.cell == Some(0) && matches!(step.action, Action::Measure(_)))
            .then_some(RunOutcome::Stopped)
    });
    let analysis = stopped.analysis();
    // The soak had settled: its own window stands.
    let steady = analysis.cells[0].steady.known().unwrap();
    near(steady.to_s - steady.from_s, 298.0, 3.0);
    let second = &analysis.cells[1];
    assert_eq!(
        second.energised_s.reason(),
        Some("not run: the operator stopped the run before")
    );
    for reason in [
        second.off_s.reason(),
        second.cold_start.reason(),
        second.inrush.reason(),
        second.drawn.reason(),
        second.settled_s.reason(),
        second.steady.reason(),
        second.body_peak.reason(),
        second.body_worst.reason(),
        second.rises[0].1.reason(),
    ] {
        assert!(!reason.unwrap().is_empty());
    }
}

#[test]
fn an_empty_record_is_analysed_without_a_panic() {
    let plan = plan(&["full"]);
    let analysis = analyse(&Input {
        plan: &plan,
        samples: &[],
        happenings: &[],
        waveforms: &[],
        outcome: &RunOutcome::Interrupted,
    });
    assert_eq!(analysis.cells.len(), 2);
    assert!(
        analysis
            .cells
            .iter()
            .all(|cell| cell.steady.reason().is_some())
    );
}

#[test]
fn calibration_is_interpolated_and_applied_once() {
    let mut plan = plan(&["full"]);
    let points = &mut plan.instruments[1].calibration;
    // 5 W -> +0.1 W, 50 W -> +1 W; at 8.6 W: 0.1 + 0.9 x 3.6/45 (computed).
    (points[0].correction, points[1].correction) = (0.1, 1.0);
    let result = play(plan, good).analysis().cells.swap_remove(1);
    near(
        result.steady.known().unwrap().power_w.value,
        8.6 + 0.172,
        0.005,
    );
}

#[test]
fn a_driver_without_accuracy_leaves_nothing_to_judge() {
    let mut plan = plan(&["full"]);
    plan.instruments[1].driver.accuracy.clear();
    let result = first(&play(plan, good));
    for reason in [result.steady.reason(), result.inrush.reason()] {
        assert!(reason.unwrap().contains("no accuracy"), "{reason:?}");
    }
}

fn diode_plan() -> Plan {
    let mut plan = plan(&["full"]);
    plan.appliance.element = crate::spec::sequence::HeatingElement::Resistor;
    plan.appliance.diode_in = vec!["low".to_owned()];
    plan
}

// Half-wave resistive load, current peak A: RMS A/2, factor 1/sqrt(2); a meter that
// loses the DC part reads 0.38559 A instead of 0.5 A and shows 0.917 (computed).
#[test]
fn a_meter_that_loses_the_dc_part_is_noted() {
    let with = |amps_for_full: f64| {
        let played = play(diode_plan(), good);
        let volts_rms = 230.0;
        // P = V I / sqrt(2) with the true RMS current of the half wave.
        changed(played, METER, |row| {
            let watts = row.readings.get(Reading::Power);
            if let (Some(0), Some(watts)) = (row.cell, watts) {
                let true_amps = watts * std::f64::consts::SQRT_2 / volts_rms;
                row.readings
                    .set(Reading::Current, true_amps * amps_for_full / 0.5);
            }
        })
        .analysis()
        .notes
    };
    assert_eq!(with(0.5), Vec::<String>::new());
    let notes = with(0.385_59);
    assert_eq!(notes.len(), 1);
    assert!(notes[0].contains("0.917"), "{}", notes[0]);
}

#[test]
fn a_meter_that_loses_the_dc_part_leaves_no_current() {
    let mut plan = diode_plan();
    plan.instruments[1].driver.coupling = crate::spec::driver::Coupling::Ac;
    let cells = play(plan, good).analysis().cells;
    let why = cells[0].dc_lost.as_deref().unwrap();
    assert!(why.contains("says that it is AC-coupled"), "{why}");
    let steady = cells[0].steady.known().unwrap();
    assert_eq!(steady.current_a, None);
    near(steady.power_w.value, 4.3, 0.05);
    // The other position is fed whole.
    assert_eq!(cells[1].dc_lost, None);
    assert!(cells[1].steady.known().unwrap().current_a.is_some());
}

/// The good unit with half of the power in `low`, as a diode makes it of the same
/// resistor, and the current that a meter shows of it as a share of the whole one.
fn half_power(current_share: f64) -> Analysis {
    let played = play(diode_plan(), good);
    changed(played, METER, |row| {
        let low = row.cell == Some(0);
        if let (true, Some(watts)) = (low, row.readings.get(Reading::Power)) {
            let whole = 2.0 * watts / 230.0;
            row.readings.set(Reading::Current, current_share * whole);
        }
    })
    .analysis()
}

#[test]
fn a_current_of_0_545_of_the_full_wave_one_has_lost_its_dc_part() {
    // 0.70711 with and 0.38559 / 0.70711 without the DC part (computed).
    let share = std::f64::consts::FRAC_1_SQRT_2;
    assert_eq!(half_power(share).cells[0].dc_lost, None);
    let why = half_power(0.545).cells[0].dc_lost.clone().unwrap();
    assert!(
        why.contains("0.545 of the current of position high"),
        "{why}"
    );
    assert!(why.contains("a power factor of 0.917"), "{why}");
    // Another resistor, which takes a third of the power, says nothing by its current.
    let played = play(diode_plan(), good);
    let other = changed(played, METER, |row| {
        if row.cell == Some(0) && row.energised {
            for (reading, share) in [(Reading::Power, 0.66), (Reading::Current, 0.66)] {
                if let Some(value) = row.readings.get(reading) {
                    row.readings.set(reading, share * value);
                }
            }
        }
    });
    let why = other.analysis().cells[0].dc_lost.clone().unwrap();
    assert!(!why.contains("of the current of"), "{why}");
}

#[test]
fn a_switch_on_that_is_none_from_cold_is_another_quantity() {
    let played = play(plan(&["full"]), |now| {
        let mut seen = good(now);
        if now.cell.is_none() {
            seen.body += 8.0;
        }
        seen
    });
    let warm = first(&played);
    assert!(warm.inrush.reason().unwrap().contains("no cold start"));
    // 4 x 4.3 W at 230 V (computed).
    near(
        warm.switch_in_peak.known().unwrap().value,
        4.0 * 4.3 / 230.0,
        0.002,
    );
    let cold = first(&play(plan(&["full"]), good));
    assert!(cold.inrush.known().is_some());
    assert_eq!(cold.switch_in_peak.reason(), Some("it was a cold start"));
}

#[test]
fn a_current_at_the_sources_limit_is_supply_limited() {
    let mut plan = plan(&["full"]);
    plan.bay.source.current_limit = Some(crate::quantity::Amps::of(0.075));
    plan.bay.source.impedance = Some(crate::quantity::Ohms::of(0.4));
    let inrush = first(&play(plan, good)).inrush.known().cloned().unwrap();
    let why = inrush.supply_limited.unwrap();
    assert!(why.contains("the source gives at most"), "{why}");
    assert_eq!(inrush.source_ohm, Some(0.4));
    assert_eq!(inrush.switching_angle_deg, None);
}

/// A waveform of a resistor under 230 V, switched on at a rising zero after 10 ms, in
/// the first cell.
fn with_wave(played: &Played, amps: impl Fn(f64) -> f64) -> CellResult {
    let (volts, amps) = (0..1500)
        .map(|n| {
            let since = f64::from(n) * 2e-4 - 0.01;
            let sine = libm::sin(std::f64::consts::TAU * 50.0 * since);
            let root2 = std::f64::consts::SQRT_2;
            let on = since >= 0.0;
            let pair = (230.0 * root2 * sine, amps(since) * root2 * sine);
            if on { pair } else { (0.0, 0.0) }
        })
        .unzip();
    let wave = crate::quantity::Waveform::new(200.0, volts, amps).unwrap();
    let analysis = analyse(&Input {
        plan: &played.plan,
        samples: &played.samples,
        happenings: &played.happenings,
        waveforms: &[crate::record::StoredWaveform { cell: 0, wave }],
        outcome: &played.outcome,
    });
    analysis.cells.into_iter().next().unwrap()
}

#[test]
fn a_waveform_gives_the_peak_that_rows_are_too_slow_for() {
    // A spike of 30 ms that one row meets half-way: by rows alone a lower bound.
    let played = play(plan(&["full"]), |now| {
        let mut seen = good(now);
        if now.on.is_some_and(|on| on < 0.15) {
            seen.watts = 60.0;
        }
        seen
    });
    let rows = first(&played).inrush.known().cloned().unwrap();
    assert!(!rows.lower_bound.is_empty() && !rows.from_waveform);
    let cell = with_wave(&played, |since| if since < 0.03 { 0.9 } else { 0.08 });
    let inrush = cell.inrush.known().unwrap();
    assert!(inrush.from_waveform);
    assert_eq!(inrush.lower_bound, Vec::<String>::new());
    near(inrush.peak_a.value, 0.9, 0.01);
    assert!(inrush.peak_a.expanded > 0.0 && inrush.peak_a.expanded < 0.02);
    let wave = cell.waveform.known().unwrap();
    near(
        wave.momentary_peak_a.value,
        0.9 * std::f64::consts::SQRT_2,
        0.005,
    );
    near(inrush.switching_angle_deg.unwrap(), 0.0, 5.0);
    let change = wave.change.known().unwrap();
    near(change.dmax.value, 0.9 * 0.4 / 230.0, 1e-5);
    // The settled 4.3 W at 230 V (computed).
    near(
        change.dc.known().unwrap().value,
        4.3 / 230.0 * 0.4 / 230.0,
        1e-6,
    );
}

#[test]
fn a_current_that_rises_on_after_the_waveform_is_taken_from_rows() {
    let played = play(plan(&["full"]), |now| {
        let mut seen = good(now);
        if let Some(on) = now.on {
            seen.watts = 4.3 + 40.0 * (on / 3.0) * libm::exp(1.0 - on / 3.0);
        }
        seen
    });
    let cell = with_wave(&played, |_| 0.04);
    let inrush = cell.inrush.known().unwrap();
    assert!(!inrush.from_waveform);
    near(inrush.peak_a.value, 44.3 / 230.0, 0.002);
    assert_eq!(inrush.lower_bound, Vec::<String>::new());
    let change = cell
        .waveform
        .known()
        .unwrap()
        .change
        .known()
        .cloned()
        .unwrap();
    near(change.dmax.value, 44.3 / 230.0 * 0.4 / 230.0, 2e-6);
    near(change.dmax_after_s, 3.0, 0.5);
}

#[test]
fn the_plate_voltage_that_a_cell_is_for() {
    let mut plan = plan(&["full"]);
    let point = plate_point(&plan, &plan.cells[0]).unwrap();
    assert_eq!(
        (point.voltage, point.rated.low.get()),
        (Volts::of(230.0), 4.5)
    );
    let mut cell = plan.cells[0].clone();
    cell.supply.voltage = Volts::of(253.0);
    assert_eq!(plate_point(&plan, &cell), None);
    cell = plan.cells[0].clone();
    cell.supply.frequency = crate::quantity::Hertz::of(60.0);
    assert_eq!(plate_point(&plan, &cell), None);
    plan.appliance.plate[0].element = Some("A".to_owned());
    assert_eq!(plate_point(&plan, &plan.cells[0]), None);
    assert!(plate_points(&plan, "low").is_empty());
    assert!(Seconds::new(1.0).is_some());
}

// The overshoot of the first cycle is the highest temperature, whatever the settled
// cycles reach.
#[test]
fn the_first_cycle_s_overshoot_counts_for_temperatures() {
    let overshoots = |now: Now| {
        let mut seen = thermostat(now);
        if let Some(on) = now.on {
            seen.body += 30.0 * libm::exp(-(on - 180.0).powi(2) / 1800.0);
        }
        seen
    };
    let mut plan = plan(&["full"]);
    plan.appliance.thermostat = true;
    let plain = first(&play(plan.clone(), thermostat));
    let result = first(&play(plan, overshoots));
    let peak = result.body_peak.known().unwrap();
    let energised = *result.energised_s.known().unwrap();
    near(peak.at_s - energised, 180.0, 25.0);
    let without = plain.body_peak.known().unwrap().temperature_degc.value;
    assert!(peak.temperature_degc.value > without + 3.0);
    let worst = |result: &CellResult| result.body_worst.known().unwrap().value;
    near(
        worst(&result) - worst(&plain),
        peak.temperature_degc.value - without,
        0.5,
    );
}

/// A slow unit: 8.6 W in the end, 60 K in the end, with 10 min.
fn slow(now: Now) -> Seen {
    let mut seen = good(now);
    if let Some(on) = now.on {
        let left = libm::exp(-on / 600.0);
        seen.watts += 0.2 * left;
        seen.body = 23.0 + 60.0 * (1.0 - left) + 0.06 * noise(3, now.t);
    }
    seen
}

#[test]
fn an_early_finish_carries_the_extrapolation_and_the_rise_to_come() {
    let mut early = plan(&["full"]);
    for step in &mut early.steps {
        if let Action::Soak {
            early_finish,
            until,
            ..
        } = &mut step.action
        {
            *early_finish = true;
            // Within reach of no slope in the time at hand.
            until.temperature_change = Some(Kelvins::of(1.0));
        }
    }
    let played = play(early, slow);
    let analysis = played.analysis();
    let result = &analysis.cells[1];
    let steady = result.steady.known().unwrap();
    assert!(steady.extrapolated, "{}", steady.criterion);
    assert!(
        steady
            .criterion
            .contains("extrapolated by first-order fits")
    );
    assert!((steady.power_w.value - 8.6).abs() <= steady.power_w.expanded);
    let on = *result.energised_s.known().unwrap();
    let after = *result.off_s.known().unwrap() - on;
    let left = 60.0 * libm::exp(-after / 600.0);
    let peak = result.body_peak.known().unwrap();
    let worst = result.body_worst.known().unwrap();
    // 12 K to the highest ambient of 35 degrees, and what the soak left to come.
    near(worst.value, peak.temperature_degc.value + 12.0 + left, 1.0);
    assert!(worst.value + worst.expanded >= 95.0, "{worst:?}");
    assert!(
        worst
            .budget
            .iter()
            .any(|share| share.from.starts_with("rise still to come"))
    );
    let (_, enclosure) = &result.rises[0];
    assert!(enclosure.reason().unwrap().contains("ended early"));
    // Without leave it runs on, and is no extrapolation.
    let whole = first(&play(plan(&["full"]), slow));
    assert!(
        whole
            .steady
            .known()
            .is_none_or(|steady| !steady.extrapolated)
    );
}

#[test]
fn what_is_still_to_come_is_stated_beside_a_settled_criterion() {
    let result = first(&play(plan(&["full"]), slow));
    if let Some(steady) = result.steady.known() {
        assert!(steady.criterion.contains("still to come (slope x tau)"));
    }
    let mut long = plan(&["full"]);
    for step in &mut long.steps {
        if let Action::Soak { at_most, .. } = &mut step.action {
            *at_most = Seconds::of(7200.0);
        }
    }
    let result = first(&play(long, slow));
    let criterion = &result.steady.known().unwrap().criterion;
    assert!(
        criterion.contains("K of rise") && criterion.contains("house default"),
        "{criterion}"
    );
}

#[test]
fn the_sampling_method_s_result_is_the_mean_of_its_own_window() {
    let mut sampled = plan(&["full"]);
    for step in &mut sampled.steps {
        if let Action::Soak {
            until,
            every,
            at_least,
            ..
        } = &mut step.action
        {
            until.kind = CriterionKind::SamplingMethod;
            until.power_change = None;
            until.temperature_change = None;
            *every = Seconds::of(1.0);
            *at_least = Seconds::of(900.0);
        }
    }
    let steady = first(&play(sampled, good)).steady.known().unwrap().clone();
    assert!(
        steady.criterion.contains("IEC 62301"),
        "{}",
        steady.criterion
    );
    assert!(steady.to_s - steady.from_s > 500.0 && steady.samples > 500);
    near(steady.power_w.value, 4.3, 0.01);
}

#[test]
fn a_low_power_factor_and_a_room_away_from_the_stated_one_enter_the_budget() {
    use crate::spec::driver::TemperatureEffect;
    let with = |reactive: f64, effect: Option<TemperatureEffect>| {
        let mut plan = plan(&["full"]);
        let driver = &mut plan.instruments[1].driver;
        driver.temperature_effect = effect;
        let power = driver.accuracy.iter_mut();
        for accuracy in power.filter(|a| a.reading == Reading::Power) {
            accuracy.of_reactive = reactive;
        }
        first(&play(plan, good))
            .steady
            .known()
            .unwrap()
            .at_plug_w
            .clone()
    };
    let effect = |within: f64| {
        Some(TemperatureEffect {
            per_kelvin: 0.001,
            reference: crate::quantity::Celsius::of(13.0),
            within: Kelvins::of(within),
        })
    };
    let plain = with(0.0, None);
    // The fixture's unit draws no reactive power: its share adds next to nothing.
    assert!(with(0.01, None).expanded >= plain.expanded);
    // 23 °C is 5 K beyond 13 °C within 5 K: 0.5 % of 4.3 W, rectangular (computed).
    let warm = with(0.0, effect(5.0));
    let line = warm
        .budget
        .iter()
        .find(|l| l.from.starts_with("temperature effect"));
    near(line.unwrap().standard, 0.005 * 4.3 / 3f64.sqrt(), 2e-4);
    assert_eq!(with(0.0, effect(12.0)).expanded, plain.expanded);
}
