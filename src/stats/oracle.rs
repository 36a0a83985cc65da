//! Holds the room to the tables that `tests/data/oracle/make.py` writes with
//! general-purpose libraries (versions in `requirements.txt` beside it) and with
//! exact arithmetic. Each test states its tolerance.

use super::*;

/// The cells of a table without its header.
fn table(text: &'static str) -> Vec<Vec<&'static str>> {
    let rows: Vec<Vec<&str>> = text
        .lines()
        .skip(1)
        .map(|line| line.split(',').collect())
        .collect();
    assert!(!rows.is_empty());
    rows
}

fn number(cell: &str) -> f64 {
    cell.parse().unwrap()
}

fn numbers(row: &[&str]) -> Vec<f64> {
    row.iter().map(|cell| number(cell)).collect()
}

fn spaced(cell: &str) -> Vec<f64> {
    cell.split_whitespace().map(number).collect()
}

/// Pairs of one case of a table of points.
fn points(text: &'static str, case: &str) -> Vec<(f64, f64)> {
    table(text)
        .iter()
        .filter(|row| row[0] == case)
        .map(|row| (number(row[1]), number(row[2])))
        .collect()
}

#[track_caller]
fn near(found: f64, expected: f64, relative: f64, absolute: f64) {
    let off = (found - expected).abs();
    assert!(
        off <= relative * expected.abs() + absolute,
        "{found} is not {expected}: off by {off:e}"
    );
}

// Relative 1e-12, down to probabilities of 1e-300.
#[test]
fn normal() {
    for row in table(include_str!("../../tests/data/oracle/normal.csv")) {
        let (x, value) = (number(row[1]), number(row[2]));
        match row[0] {
            "cdf" => near(normal_cdf(x), value, 1e-12, 0.0),
            _ => near(normal_quantile(x).unwrap(), value, 1e-12, 1e-16),
        }
    }
}

// Distribution: relative 1e-12 below 1/2 and 1e-14 absolute. Quantile: relative 1e-9,
// which is what p itself carries at 1 - 1e-6; 1e-12 for p below 1/2 and nu up to
// 2000, where the table was polished in 40 digits.
#[test]
fn student() {
    for row in table(include_str!("../../tests/data/oracle/student.csv")) {
        let (x, nu, value) = (number(row[1]), number(row[2]), number(row[3]));
        match row[0] {
            "cdf" => near(student_cdf(x, nu).unwrap(), value, 1e-12, 1e-15),
            _ => {
                let relative = if x < 0.5 && nu <= 2000.0 { 1e-12 } else { 1e-9 };
                near(student_quantile(x, nu).unwrap(), value, relative, 1e-16);
            }
        }
    }
}

// Relative 1e-11 for the distribution, 1e-9 for the quantile.
#[test]
fn chi_square() {
    for row in table(include_str!("../../tests/data/oracle/chi-square.csv")) {
        let (x, nu, value) = (number(row[1]), number(row[2]), number(row[3]));
        match row[0] {
            "cdf" => near(chi_square_cdf(x, nu).unwrap(), value, 1e-11, 0.0),
            _ => near(chi_square_quantile(x, nu).unwrap(), value, 1e-9, 0.0),
        }
    }
}

// Relative 1e-10, up to ten million trials.
#[test]
fn binomial() {
    for row in table(include_str!("../../tests/data/oracle/binomial.csv")) {
        let (k, n) = (row[0].parse().unwrap(), row[1].parse().unwrap());
        let found = binomial_cdf(k, n, number(row[2])).unwrap();
        near(found, number(row[3]), 1e-10, 0.0);
    }
}

// Relative 1e-10.
#[test]
fn intervals_of_clopper_and_pearson() {
    for row in table(include_str!("../../tests/data/oracle/clopper-pearson.csv")) {
        let (k, n) = (row[0].parse().unwrap(), row[1].parse().unwrap());
        let (low, high) = clopper_pearson(k, n, number(row[2])).unwrap();
        near(low, number(row[3]), 1e-10, 0.0);
        near(high, number(row[4]), 1e-10, 0.0);
    }
}

// Absolute 1e-13 and relative 1e-9, delta from -3 to 60; the quantile leads back to
// its point within 1e-9.
#[test]
fn noncentral_t() {
    for row in table(include_str!("../../tests/data/oracle/noncentral-t.csv")) {
        let [t, nu, delta, value] = numbers(&row)[..] else {
            panic!("four columns")
        };
        let found = noncentral_t_cdf(t, nu, delta).unwrap();
        near(found, value, 1e-9, 1e-13);
        if (1e-5..1.0 - 1e-5).contains(&value) {
            let back = noncentral_t_quantile(value, nu, delta).unwrap();
            near(back, t, 1e-9, 1e-9);
        }
    }
}

// Relative 1e-8 (the two-sided table itself is solved to about 1e-9).
#[test]
fn tolerance_factors() {
    for row in table(include_str!("../../tests/data/oracle/tolerance.csv")) {
        let n = row[0].parse().unwrap();
        let (share, confidence) = (number(row[1]), number(row[2]));
        let one = tolerance_factor(n, share, confidence).unwrap();
        let two = tolerance_factor_two_sided(n, share, confidence).unwrap();
        near(one, number(row[3]), 1e-8, 0.0);
        near(two, number(row[4]), 1e-8, 0.0);
    }
}

// Slope within 1e-6 of its own standard error, the error within relative 1e-6: with
// offsets of 1e9 on either axis, where sums of squares about 0 keep no digit.
#[test]
fn lines() {
    let text = include_str!("../../tests/data/oracle/line-points.csv");
    for row in table(include_str!("../../tests/data/oracle/line.csv")) {
        let (slope, error, sd) = (number(row[1]), number(row[2]), number(row[3]));
        let line = line_through(points(text, row[0])).unwrap();
        near(line.slope, slope, 0.0, 1e-6 * error);
        near(line.slope_error(), error, 1e-6, 0.0);
        near(line.residual_sd(), sd, 1e-6, 0.0);
    }
}

// Relative 1e-9.
#[test]
fn effective_numbers() {
    let values = table(include_str!("../../tests/data/oracle/effective-values.csv"));
    for row in table(include_str!("../../tests/data/oracle/effective.csv")) {
        let series: Vec<f64> = values
            .iter()
            .filter(|value| value[0] == row[0])
            .map(|value| number(value[1]))
            .collect();
        let found = effective_of(&series).unwrap();
        near(found.effective, number(row[1]), 1e-9, 0.0);
        near(found.by_cut, number(row[2]), 1e-9, 0.0);
        assert_eq!(found.lags.to_string(), row[3]);
    }
}

// Relative 1e-7: the package finds u through the eigenvectors of the covariances.
// Degrees of freedom: relative 1e-9.
#[test]
fn budgets_with_correlated_inputs() {
    for row in table(include_str!("../../tests/data/oracle/budget.csv")) {
        let parts: Vec<Part> = spaced(row[1])
            .into_iter()
            .zip(spaced(row[2]))
            .map(|(standard, freedom)| Part { standard, freedom })
            .collect();
        let correlations: Vec<Correlation> = row[3]
            .split_whitespace()
            .map(|text| {
                let cells: Vec<&str> = text.split(':').collect();
                Correlation {
                    a: cells[0].parse().unwrap(),
                    b: cells[1].parse().unwrap(),
                    r: number(cells[2]),
                }
            })
            .collect();
        let found = combine_correlated(&parts, &correlations);
        near(found.standard, number(row[4]), 1e-7, 0.0);
        let freedom = number(row[5]);
        if freedom.is_finite() {
            near(found.freedom, freedom, 1e-9, 0.0);
        } else {
            assert_eq!(found.freedom, freedom);
        }
    }
}

// Parameters within 1e-4 of their standard errors, standard errors (before they are
// widened) within relative 1e-5.
#[test]
fn first_order_approaches() {
    let text = include_str!("../../tests/data/oracle/first-order-points.csv");
    for row in table(include_str!("../../tests/data/oracle/first-order.csv")) {
        let [_, end, amplitude, tau, end_error, tau_error, sd] = numbers(&row)[..] else {
            panic!("seven columns")
        };
        let fit = first_order(&points(text, row[0])).unwrap();
        near(fit.end, end, 0.0, 1e-4 * end_error);
        near(fit.tau, tau, 0.0, 1e-4 * tau_error);
        near(fit.amplitude, amplitude, 0.0, 1e-4 * end_error);
        near(fit.residual_sd, sd, 1e-7, 0.0);
        let widened = ((fit.n as f64 - 3.0) / (fit.effective - 3.0).max(1.0)).sqrt();
        near(fit.end_error, end_error * widened, 1e-5, 0.0);
        near(fit.tau_error, tau_error * widened, 1e-5, 0.0);
        assert!(fit.trend_free, "{fit:?}");
    }
}

// Absolute 1e-12 and relative 1e-9.
#[test]
fn risks_of_a_process() {
    for row in table(include_str!("../../tests/data/oracle/risks.csv")) {
        let [y0, u0, um, tl, th, al, ah, conforming, consumer, producer] = numbers(&row)[..] else {
            panic!("ten columns")
        };
        let tolerance = Interval { low: tl, high: th };
        let acceptance = Interval { low: al, high: ah };
        let found = global_risks(y0, u0, um, tolerance, acceptance).unwrap();
        near(found.conforming, conforming, 1e-9, 1e-12);
        near(found.consumer, consumer, 1e-9, 1e-12);
        near(found.producer, producer, 1e-9, 1e-12);
    }
}
