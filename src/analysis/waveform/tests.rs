//! Waveforms of known shape against computed values and an independent transform.

use std::f64::consts::{FRAC_1_SQRT_2, PI, SQRT_2};

use super::*;

const STEP_S: f64 = 1e-4;

/// A block of mains voltage of 325 V peak, switched on at `on` seconds at `angle`
/// degrees; `amps` gives the current by phase (turns from 0 to 1) and time since.
fn block(length_s: f64, on_s: f64, angle_deg: f64, amps: impl Fn(f64, f64) -> f64) -> Waveform {
    let n = (length_s / STEP_S).round() as usize;
    let (volts, current) = (0..n)
        .map(|k| {
            let since = k as f64 * STEP_S - on_s;
            if since < -1e-9 {
                return (0.0, 0.0);
            }
            let turns = 50.0 * since + angle_deg / 360.0;
            (325.0 * sine(turns), amps(turns - turns.floor(), since))
        })
        .unzip();
    Waveform::new(STEP_S * 1e6, volts, current).unwrap()
}

fn sine(turns: f64) -> f64 {
    libm::sin(2.0 * PI * turns)
}

fn half_sine(turns: f64) -> f64 {
    sine(turns).max(0.0)
}

fn close(found: f64, wanted: f64, within: f64) {
    assert!((found - wanted).abs() <= within, "{found}, not {wanted}");
}

#[test]
fn a_half_wave_load_has_the_computed_values() {
    // Computed, for a current peak of 1 A: DC 1/pi A, RMS 0.5 A, crest factor 2, power
    // factor 0.707107, 2nd harmonic amplitude 0.212207 A, 4th 0.0424413 A, no odd
    // harmonics above the fundamental.
    let n = 20_000;
    let (volts, amps) = (0..n)
        .map(|k| {
            let turns = 50.0 * k as f64 * 1e-5;
            (325.0 * sine(turns), half_sine(turns))
        })
        .unzip();
    let wave = Waveform::new(10.0, volts, amps).unwrap();
    let shape = shape(&wave, 50.0, 0.0).unwrap();
    let tail = &shape.tail;
    close(tail.dc_a, 1.0 / PI, 1e-6);
    close(tail.rms_a, 0.5, 1e-9);
    close(tail.crest_factor.unwrap(), 2.0, 1e-6);
    close(tail.power_factor.unwrap(), FRAC_1_SQRT_2, 5e-7);
    close(SQRT_2 * tail.harmonics_a[0], 0.5, 1e-6);
    close(SQRT_2 * tail.harmonics_a[1], 0.212207, 1e-6);
    close(SQRT_2 * tail.harmonics_a[3], 0.0424413, 1e-6);
    for odd in (3..=39).step_by(2) {
        close(tail.harmonics_a[odd - 1], 0.0, 1e-6);
    }
    close(tail.rms_by_polarity_a.0, FRAC_1_SQRT_2, 1e-6);
    close(tail.rms_by_polarity_a.1, 0.0, 1e-6);
    assert_eq!(shape.half_wave, HalfWave::Seen);
    // What a meter shows that loses the DC part (computed): 0.38559 A and 0.917.
    let lost = libm::sqrt(tail.rms_a * tail.rms_a - tail.dc_a * tail.dc_a);
    close(lost, 0.38559, 1e-5);
    close(tail.power_w / (tail.rms_v * lost), 0.917, 5e-4);
}

#[test]
fn a_half_wave_load_without_its_dc_part_is_told_from_one_with_it() {
    let of = |amps: &dyn Fn(f64) -> f64| {
        let wave = block(0.3, 0.02, 40.0, |turns, _| amps(turns));
        shape(&wave, 50.0, 0.0).unwrap().half_wave
    };
    assert_eq!(of(&|t| 4.0 * half_sine(t)), HalfWave::Seen);
    assert_eq!(of(&|t| -4.0 * half_sine(t + 0.5)), HalfWave::Seen);
    assert_eq!(of(&|t| 4.0 * (half_sine(t) - 1.0 / PI)), HalfWave::DcLost);
    // A fan on the mains beside it draws a plain sine.
    assert_eq!(of(&|t| 4.0 * half_sine(t) + 1.5 * sine(t)), HalfWave::Seen);
    let both = |t: f64| 4.0 * (half_sine(t) - 1.0 / PI) + 1.5 * sine(t);
    assert_eq!(of(&both), HalfWave::DcLost);
    assert_eq!(of(&sine), HalfWave::None);
    // An offset of the instrument alone is no half-wave load.
    assert_eq!(of(&|t| sine(t) + 0.4), HalfWave::None);
}

/// A row of the table that tests/data/oracle/waveform/oracle.py made with numpy.
fn oracle() -> Vec<(String, Vec<f64>)> {
    let table = include_str!("../../../tests/data/oracle/waveform/shapes.csv");
    let rows = table.lines().skip(1);
    rows.map(|row| {
        let (name, values) = row.split_once(',').unwrap();
        let values = values.split(',').map(|v| v.parse().unwrap()).collect();
        (name.to_owned(), values)
    })
    .collect()
}

fn current_of(name: &str, turns: f64) -> f64 {
    let s = sine(turns);
    match name {
        "resistor" => 3.0 * s,
        "half-wave" => 2.0 * s.max(0.0),
        "half-wave negative" => 2.0 * s.min(0.0),
        "phase-cut" if turns % 0.5 >= 0.5 / 3.0 => 4.0 * s,
        "phase-cut" => 0.0,
        "square" if turns < 0.5 => 1.5,
        "square" => -1.5,
        "offset" => s + 0.25,
        "lagging" => 8.0 * SQRT_2 * sine(turns - libm::acos(0.6) / (2.0 * PI)),
        "third and second" => {
            2.0 * s + 0.5 * libm::sin(6.0 * PI * turns + 0.4) + 0.2 * libm::cos(4.0 * PI * turns)
        }
        other => panic!("{other} is no shape of these tests"),
    }
}

#[test]
fn every_shape_agrees_with_an_independent_transform() {
    // Source: tests/data/oracle/waveform/shapes.csv, made by numpy's rfft.
    let rows = oracle();
    assert_eq!(rows.len(), 8);
    for (name, wanted) in rows {
        // A longer block, so that the tail begins elsewhere; a quarter of a step off the grid.
        let (volts, amps) = (0..2750)
            .map(|k| {
                let turns = 50.0 * (f64::from(k) + 0.25) * STEP_S;
                let turns = turns - turns.floor();
                (325.0 * sine(turns), current_of(&name, turns))
            })
            .unzip();
        let wave = Waveform::new(100.0, volts, amps).unwrap();
        let tail = shape(&wave, 50.0, 0.0).unwrap().tail;
        assert_eq!(tail.periods, 10, "{name}");
        let mut found = vec![
            tail.rms_a,
            tail.dc_a,
            tail.crest_factor.unwrap(),
            tail.power_w,
            tail.apparent_va,
            tail.power_factor.unwrap(),
        ];
        found.extend(&tail.harmonics_a);
        assert_eq!(found.len(), wanted.len(), "{name}");
        for (n, (found, wanted)) in found.iter().zip(&wanted).enumerate() {
            // The frequency is measured, not known: 1e-6 is far below any instrument.
            let within = 2e-6 * wanted.abs().max(1.0);
            assert!(
                (found - wanted).abs() < within,
                "{name}, {n}: {found}, not {wanted}"
            );
        }
    }
}

#[test]
fn the_first_current_gives_the_switching_angle_and_the_peak_its_time() {
    for angle in [5.0, 60.0, 135.0, 200.0, 300.0] {
        let decay = |since: f64| 1.0 + 3.0 * libm::exp(-since / 0.05);
        let wave = block(0.4, 0.0302, angle, |turns, since| {
            2.0 * decay(since) * sine(turns)
        });
        let shape = shape(&wave, 50.0, 0.001).unwrap();
        close(shape.t0_s, 0.0302, 1.5 * STEP_S);
        let found = *shape.switching_angle_deg.known().unwrap();
        close(found, angle, 2.0);
        assert!(!shape.begins_late);
        // By hand: the highest of |2 (1 + 3 exp(-t/0.05)) sin| on a fine grid.
        let (mut top, mut at) = (0.0, 0.0);
        for k in 0..200_000 {
            let since = f64::from(k) * 1e-6;
            let size = (2.0 * decay(since) * sine(50.0 * since + angle / 360.0)).abs();
            if size > top {
                (top, at) = (size, since);
            }
        }
        close(shape.peak_a, top, 0.005 * top);
        close(shape.peak_after_s, at, 2.0 * STEP_S);
    }
}

#[test]
fn i2t_of_a_steady_sine_is_half_its_peak_squared_times_the_time() {
    // 10 A peak for 0.3 s: 50 A2 x 0.3 s = 15 A2 s (computed).
    let wave = block(0.3301, 0.03, 0.0, |turns, _| 10.0 * sine(turns));
    let shape = shape(&wave, 50.0, 0.0).unwrap();
    close(shape.i2t_a2s, 15.0, 0.01);
}

#[test]
fn half_periods_are_told_by_their_polarity() {
    let wave = block(0.2, 0.0301, 90.0, |turns, since| {
        let amps = if since < 0.05 { 8.0 } else { 4.0 };
        amps * SQRT_2 * half_sine(turns)
    });
    let shape = shape(&wave, 50.0, 0.0).unwrap();
    for half in &shape.half_periods[1..] {
        let amps = match (
            half.positive,
            half.from_s + 0.011 < 0.08,
            half.from_s < 0.08,
        ) {
            (false, ..) => 0.0,
            (true, true, _) => 8.0,
            (true, false, false) => 4.0,
            // The step lies within it.
            _ => continue,
        };
        close(half.rms_a, amps, 0.01);
        close(half.rms_v, 325.0 / SQRT_2, 0.1);
    }
    // The first one began before the switch did: it counts with its whole time.
    let first = shape.half_periods[0];
    assert!(
        first.positive && first.rms_a < 6.0 && first.rms_v < 200.0,
        "{first:?}"
    );
    close(shape.tail.rms_by_polarity_a.1, 0.0, 1e-3);
}

#[test]
fn the_voltage_change_of_a_block_is_the_computed_one() {
    let reference = Reference::at(230.0).unwrap();
    for (amps, factor, percent) in super::change::COMPUTED {
        let lag = libm::acos(factor) / (2.0 * PI);
        let wave = block(1.6, 0.04, 0.0, |turns, _| amps * SQRT_2 * sine(turns - lag));
        let shape = shape(&wave, 50.0, 0.0).unwrap();
        let change = shape.voltage_change(reference).unwrap();
        close(100.0 * change.dmax, percent, 2e-3);
        close(100.0 * change.dc.known().unwrap(), percent, 2e-4);
    }
}

#[test]
fn the_time_above_three_point_three_percent_is_counted() {
    let reference = Reference::at(230.0).unwrap();
    let of = |high_s: f64, length_s: f64| {
        let wave = block(length_s, 0.02, 0.0, |turns, since| {
            let amps = if since < high_s { 25.0 } else { 5.0 };
            amps * SQRT_2 * sine(turns)
        });
        let shape = shape(&wave, 50.0, 0.0).unwrap();
        shape.voltage_change(reference).unwrap()
    };
    let short = of(0.2, 0.5);
    close(short.over_s, 0.2, 0.0101);
    close(short.dmax, 25.0 * 0.4 / 230.0, 1e-4);
    assert!(!short.still_over && short.dc.known().is_none());
    assert!(of(9.0, 0.5).still_over);
    close(of(0.6, 2.0).over_s, 0.6, 0.0101);
    close(*of(0.6, 2.0).dc.known().unwrap(), 5.0 * 0.4 / 230.0, 1e-4);
}

#[test]
fn class_a_is_for_more_than_75_w() {
    let of = |amps: f64| {
        let wave = block(0.3, 0.02, 0.0, |turns, _| amps * half_sine(turns));
        shape(&wave, 50.0, 0.0).unwrap().class_a()
    };
    assert!(of(0.5).unwrap_err().contains("no limits up to 75 W"));
    // Second harmonic of a half-wave load: 0.212207 A / sqrt2 RMS per ampere of peak
    // against 1.08 A: kept up to 7.197 A (computed).
    let kept = of(7.1).unwrap();
    assert!(kept.kept() && kept.harmonic == 2, "{kept:?}");
    close(kept.rms_a, 7.1 * 0.212207 / SQRT_2, 1e-3);
    let broken = of(7.3).unwrap();
    assert!(!broken.kept() && broken.compared == 39, "{broken:?}");
}

#[test]
fn a_block_that_says_nothing_says_why() {
    let told = |wave: &Waveform, floor| shape(wave, 50.0, floor).unwrap_err();
    let dead = block(0.3, 0.02, 0.0, |_, _| 0.0);
    assert!(told(&dead, 0.0).contains("no current"));
    let small = block(0.3, 0.02, 0.0, |turns, _| 0.001 * sine(turns));
    assert!(told(&small, 0.01).contains("no current"));
    let short = block(0.035, 0.0195, 0.0, |turns, _| sine(turns));
    assert!(told(&short, 0.0).contains("one period after the first current"));
    // Begun with the current flowing.
    let late = block(0.3, 0.0, 90.0, |turns, _| sine(turns));
    let late = shape(&late, 50.0, 0.0).unwrap();
    assert!(late.begins_late && late.switching_angle_deg.known().is_none());
}

mod any_input {
    use proptest::prelude::*;

    use super::*;

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(64))]
        #[test]
        fn nothing_panics_and_nothing_is_not_a_number(
            pairs in prop::collection::vec((-400.0..400.0_f64, -20.0..20.0_f64), 1..900),
            interval in 1.0..5000.0_f64,
        ) {
            let (volts, amps) = pairs.into_iter().unzip();
            let wave = Waveform::new(interval, volts, amps).unwrap();
            if let Ok(shape) = shape(&wave, 50.0, 0.0) {
                prop_assert!(shape.i2t_a2s.is_finite() && shape.tail.rms_a.is_finite());
                prop_assert!(shape.half_periods.iter().all(|h| h.rms_v.is_finite()));
                let reference = Reference::at(230.0).unwrap();
                if let Ok(change) = shape.voltage_change(reference) {
                    prop_assert!(change.dmax.is_finite());
                }
            }
        }
    }
}
