//! Holds the room to published examples and certified values, each with its source.

use super::*;

/// Roundings to `digits` decimals agree with what is printed, by half a unit of it.
#[track_caller]
fn printed(found: f64, printed: f64, digits: i32) {
    let half = 0.5 * libm::pow(10.0, f64::from(-digits));
    assert!(
        (found - printed).abs() <= half * 1.0001,
        "{found} is not printed as {printed}"
    );
}

// JCGM 100 H.2, simultaneous resistance and reactance (observations and results read).
const VOLTS: [f64; 5] = [5.007, 4.994, 5.005, 4.990, 4.999];
const AMPERES: [f64; 5] = [19.663e-3, 19.639e-3, 19.640e-3, 19.685e-3, 19.678e-3];
const RADIANS: [f64; 5] = [1.0456, 1.0438, 1.0468, 1.0428, 1.0433];

/// Resistance, reactance and impedance, each with its sensitivities to V, I, phi.
fn impedance(v: f64, i: f64, phi: f64) -> [(f64, [f64; 3]); 3] {
    let z = v / i;
    let (r, x) = (z * libm::cos(phi), z * libm::sin(phi));
    [
        (r, [r / v, -r / i, -x]),
        (x, [x / v, -x / i, r]),
        (z, [z / v, -z / i, 0.0]),
    ]
}

fn contributions(sensitivities: [f64; 3], inputs: &PairedMeans) -> Vec<Part> {
    sensitivities
        .iter()
        .zip(&inputs.standards)
        .map(|(c, u)| Part {
            standard: c * u,
            freedom: inputs.freedom,
        })
        .collect()
}

#[test]
fn resistance_and_reactance_of_jcgm_100_h2() {
    let inputs = paired_means(&[&VOLTS, &AMPERES, &RADIANS]).unwrap();
    // Table H.2: means 4.9990 V, 19.6610 mA, 1.044 46 rad; u 0.0032 V, 0.0095 mA,
    // 0.000 75 rad; r(V,I) -0.36, r(V,phi) 0.86, r(I,phi) -0.65 (from memory).
    printed(inputs.means[0], 4.9990, 4);
    printed(inputs.means[1] * 1e3, 19.6610, 4);
    printed(inputs.means[2], 1.044_46, 5);
    printed(inputs.standards[0], 0.0032, 4);
    printed(inputs.standards[1] * 1e3, 0.0095, 4);
    printed(inputs.standards[2], 0.000_75, 5);
    for (found, r) in inputs.correlations.iter().zip([-0.36, 0.86, -0.65]) {
        printed(found.r, r, 2);
    }
    let all = impedance(inputs.means[0], inputs.means[1], inputs.means[2]);
    let expected = [(127.732, 0.071), (219.847, 0.295), (254.260, 0.236)];
    for ((value, sensitivities), (mean, u)) in all.iter().zip(expected) {
        let found = combine_correlated(
            &contributions(*sensitivities, &inputs),
            &inputs.correlations,
        );
        printed(*value, mean, 3);
        // The published 0.295 of X comes from the second approach; the first one, with
        // full digits, gives 0.2956.
        assert!((found.standard - u).abs() < 0.001, "{found:?} {u}");
        // Five paired observations leave four degrees of freedom (H.2.4, note).
        assert!((found.freedom - 4.0).abs() < 1e-9, "{found:?}");
    }
    // Negative control: without the correlations u(R) is 0.1945 (computed).
    let apart = combine(&contributions(all[0].1, &inputs));
    printed(apart.standard, 0.1945, 4);
}

// The second approach of H.2.4: each observation set gives R, X and Z of its own.
#[test]
fn second_approach_of_jcgm_100_h2() {
    let sets: Vec<[f64; 3]> = (0..5)
        .map(|i| impedance(VOLTS[i], AMPERES[i], RADIANS[i]).map(|(value, _)| value))
        .collect();
    let of = |i: usize| sets.iter().map(|set| set[i]).collect::<Vec<f64>>();
    let (r, x, z) = (of(0), of(1), of(2));
    let found = paired_means(&[&r, &x, &z]).unwrap();
    for (mean, expected) in found.means.iter().zip([127.732, 219.847, 254.260]) {
        printed(*mean, expected, 3);
    }
    for (u, expected) in found.standards.iter().zip([0.071, 0.295, 0.236]) {
        printed(*u, expected, 3);
    }
    for (found, expected) in found.correlations.iter().zip([-0.588, -0.485, 0.993]) {
        printed(found.r, expected, 3);
    }
}

// JCGM 100 H.3, calibration of a thermometer: readings and corrections, degrees
// Celsius (from memory; that all five printed results come out holds the table).
const THERMOMETER: [(f64, f64); 11] = [
    (21.521, -0.171),
    (22.012, -0.169),
    (22.512, -0.166),
    (23.003, -0.159),
    (23.507, -0.164),
    (23.999, -0.165),
    (24.513, -0.156),
    (25.002, -0.157),
    (25.503, -0.159),
    (26.010, -0.161),
    (26.511, -0.160),
];

#[test]
fn thermometer_of_jcgm_100_h3() {
    let line = line_through(THERMOMETER.map(|(t, b)| (t - 20.0, b))).unwrap();
    printed(line.at(0.0), -0.1712, 4);
    printed(line.slope, 0.002_18, 5);
    printed(line.slope_error(), 0.000_67, 5);
    printed(line.residual_sd(), 0.0035, 4);
    let at_20 = line.error_at(0.0);
    printed(at_20, 0.0029, 4);
    // r(y1, y2) = -0.930, and b(30) = -0.1494 with u 0.0041: through the correlation
    // and directly.
    let r = -line.mean_x * line.slope_error() / at_20;
    printed(r, -0.930, 3);
    printed(line.at(10.0), -0.1494, 4);
    let parts = [at_20, 10.0 * line.slope_error()].map(|standard| Part {
        standard,
        freedom: 9.0,
    });
    let joined = [Correlation { a: 0, b: 1, r }];
    let u = combine_correlated(&parts, &joined).standard;
    printed(u, 0.0041, 4);
    assert!((u - line.error_at(10.0)).abs() < 1e-12);
}

// NIST Technical Note 1297, table B.1: t for 68.27, 90, 95, 95.45, 99 and 99.73 %
// (the 95.45 % column and parts of others read, the rest from memory).
const TN_1297: [(f64, [f64; 6]); 26] = [
    (1.0, [1.84, 6.31, 12.71, 13.97, 63.66, 235.80]),
    (2.0, [1.32, 2.92, 4.30, 4.53, 9.92, 19.21]),
    (3.0, [1.20, 2.35, 3.18, 3.31, 5.84, 9.22]),
    (4.0, [1.14, 2.13, 2.78, 2.87, 4.60, 6.62]),
    (5.0, [1.11, 2.02, 2.57, 2.65, 4.03, 5.51]),
    (6.0, [1.09, 1.94, 2.45, 2.52, 3.71, 4.90]),
    (7.0, [1.08, 1.89, 2.36, 2.43, 3.50, 4.53]),
    (8.0, [1.07, 1.86, 2.31, 2.37, 3.36, 4.28]),
    (9.0, [1.06, 1.83, 2.26, 2.32, 3.25, 4.09]),
    (10.0, [1.05, 1.81, 2.23, 2.28, 3.17, 3.96]),
    (11.0, [1.05, 1.80, 2.20, 2.25, 3.11, 3.85]),
    (12.0, [1.04, 1.78, 2.18, 2.23, 3.05, 3.76]),
    (13.0, [1.04, 1.77, 2.16, 2.21, 3.01, 3.69]),
    (14.0, [1.04, 1.76, 2.14, 2.20, 2.98, 3.64]),
    (15.0, [1.03, 1.75, 2.13, 2.18, 2.95, 3.59]),
    (16.0, [1.03, 1.75, 2.12, 2.17, 2.92, 3.54]),
    (17.0, [1.03, 1.74, 2.11, 2.16, 2.90, 3.51]),
    (18.0, [1.03, 1.73, 2.10, 2.15, 2.88, 3.48]),
    (19.0, [1.03, 1.73, 2.09, 2.14, 2.86, 3.45]),
    (20.0, [1.03, 1.72, 2.09, 2.13, 2.85, 3.42]),
    (25.0, [1.02, 1.71, 2.06, 2.11, 2.79, 3.33]),
    (30.0, [1.02, 1.70, 2.04, 2.09, 2.75, 3.27]),
    // Printed 1.70 at 90 % (from memory); it is 1.6896.
    (35.0, [1.01, 1.69, 2.03, 2.07, 2.72, 3.23]),
    (40.0, [1.01, 1.68, 2.02, 2.06, 2.70, 3.20]),
    (45.0, [1.01, 1.68, 2.01, 2.06, 2.69, 3.18]),
    (50.0, [1.01, 1.68, 2.01, 2.05, 2.68, 3.16]),
];

// The last two rows carry three decimals.
const TN_1297_LONG: [(f64, [f64; 6]); 2] = [
    (100.0, [1.005, 1.660, 1.984, 2.025, 2.626, 3.077]),
    (f64::INFINITY, [1.000, 1.645, 1.960, 2.000, 2.576, 3.000]),
];

#[test]
fn whole_t_table_of_nist_tn_1297() {
    // 68.27, 95.45 and 99.73 stand for one, two and three standard deviations.
    let sigma = |k: f64| libm::erf(k / std::f64::consts::SQRT_2);
    let levels = [sigma(1.0), 0.90, 0.95, sigma(2.0), 0.99, sigma(3.0)];
    let check = |nu: f64, row: [f64; 6], digits| {
        for (level, t) in levels.iter().zip(row) {
            printed(student_quantile(0.5 + 0.5 * level, nu).unwrap(), t, digits);
        }
    };
    for (nu, row) in TN_1297 {
        check(nu, row, 2);
    }
    for (nu, row) in TN_1297_LONG {
        check(nu, row, 3);
    }
}

// NIST StRD, univariate summary statistics: certified mean and standard deviation.
#[test]
fn univariate_sets_of_nist_strd() {
    let text = include_str!("../../tests/data/oracle/strd-univariate.csv");
    for (set, mean, sd) in [
        ("Lew", -177.435, 277.332_168_044_316),
        ("Lottery", 518.958_715_596_330, 291.699_727_470_969),
        ("Mavro", 2.001_856, 0.000_429_123_454_003_053),
        ("Michelso", 299.8524, 0.079_010_547_819_051_8),
    ] {
        let values: Vec<f64> = text
            .lines()
            .filter_map(|line| line.strip_prefix(set)?.strip_prefix(','))
            .map(|value| value.parse().unwrap())
            .collect();
        // Decimals of the data limit Mavro to about 12 digits.
        summary(&values, mean, sd, 1e-11);
    }
}

// NIST StRD NumAcc1 to 4: 1e7 + 1, 3, 2; then 1001 values that step by 0.2 about an
// ever larger mean. The binary values themselves limit the digits of the last two.
#[test]
fn numerical_accuracy_sets_of_nist_strd() {
    summary(
        &[10_000_001.0, 10_000_003.0, 10_000_002.0],
        10_000_002.0,
        1.0,
        1e-15,
    );
    for (mean, low, high, relative) in [
        (1.2, 1.1, 1.3, 1e-13),
        (1_000_000.2, 1_000_000.1, 1_000_000.3, 1e-8),
        (10_000_000.2, 10_000_000.1, 10_000_000.3, 1e-7),
    ] {
        let steps = (0..500).flat_map(|_| [low, high]);
        let values: Vec<f64> = std::iter::once(mean).chain(steps).collect();
        summary(&values, mean, 0.1, relative);
    }
}

#[track_caller]
fn summary(values: &[f64], mean: f64, sd: f64, relative: f64) {
    let found = paired_means(&[values]).unwrap();
    assert!((found.means[0] / mean - 1.0).abs() < 1e-14, "{found:?}");
    let found = found.standards[0] * (values.len() as f64).sqrt();
    assert!((found / sd - 1.0).abs() < relative, "{found} is not {sd}");
}

// Factors of one-sided and two-sided normal tolerance intervals, as tables of
// ISO 16269-6 print them (from memory, a few well-known ones).
#[test]
fn tolerance_factors_of_iso_16269_6() {
    printed(tolerance_factor(10, 0.95, 0.95).unwrap(), 2.911, 3);
    printed(tolerance_factor(20, 0.95, 0.95).unwrap(), 2.396, 3);
    printed(tolerance_factor(5, 0.99, 0.95).unwrap(), 5.741, 3);
    printed(
        tolerance_factor_two_sided(10, 0.95, 0.95).unwrap(),
        3.393,
        3,
    );
    printed(tolerance_factor_two_sided(3, 0.90, 0.95).unwrap(), 8.306, 3);
    printed(
        tolerance_factor_two_sided(5, 0.99, 0.99).unwrap(),
        10.220,
        3,
    );
}

// Success-run: 22 units without a failure show 90 % with 90 % confidence, 59 show
// 95 % with 95 % (common practice, ln(1 - C) / ln R rounded up; computed).
#[test]
fn success_runs() {
    for (n, share, confidence) in [(22, 0.90, 0.90), (59, 0.95, 0.95)] {
        let shown = |n| 1.0 - clopper_pearson(0, n, 2.0 * confidence - 1.0).unwrap().1;
        assert!(shown(n) >= share && shown(n - 1) < share);
    }
}
