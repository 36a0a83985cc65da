//! Scatter of samples that are not independent.

use super::line::{Line, fit};

/// Mean and sample standard deviation; nothing without a value, no deviation with one.
pub fn mean_and_deviation(values: &[f64]) -> Option<(f64, f64)> {
    let n = values.len() as f64;
    if values.is_empty() {
        return None;
    }
    let mean = values.iter().sum::<f64>() / n;
    let squares: f64 = values.iter().map(|v| (v - mean).powi(2)).sum();
    let deviation = if values.len() > 1 { (squares / (n - 1.0)).sqrt() } else { 0.0 };
    Some((mean, deviation))
}

/// The effective number of independent samples,
/// n / (1 + 2 sum (1 - k/n) rho_k), after the linear trend was removed and with the
/// sum cut at the first rho_k <= 0 (with estimated rho the full sum says nothing).
/// Between 1 and n.
pub fn effective_number(points: &[(f64, f64)]) -> f64 {
    let n = points.len();
    if n < 4 {
        return n as f64;
    }
    let residuals = residuals(points, fit(points.iter().copied()));
    let power: f64 = residuals.iter().map(|r| r * r).sum();
    if power <= 0.0 {
        return n as f64;
    }
    let mut sum = 0.0;
    for k in 1..n {
        let product: f64 = residuals[k..].iter().zip(&residuals).map(|(a, b)| a * b).sum();
        let rho = product / power;
        if rho <= 0.0 {
            break;
        }
        sum += (1.0 - k as f64 / n as f64) * rho;
    }
    (n as f64 / (1.0 + 2.0 * sum)).clamp(1.0, n as f64)
}

fn residuals(points: &[(f64, f64)], line: Option<Line>) -> Vec<f64> {
    match line {
        Some(line) => points.iter().map(|(x, y)| y - line.at(*x)).collect(),
        None => {
            let mean = points.iter().map(|(_, y)| y).sum::<f64>() / points.len() as f64;
            points.iter().map(|(_, y)| y - mean).collect()
        }
    }
}

/// Effective degrees of freedom of a sum of shares (Welch-Satterthwaite, JCGM 100 G.2b):
/// pairs of standard uncertainty and its degrees of freedom, which may be infinite.
pub fn effective_degrees(shares: &[(f64, f64)]) -> f64 {
    let squared: f64 = shares.iter().map(|(u, _)| u * u).sum();
    let fourth: f64 = shares.iter().filter(|(_, nu)| nu.is_finite()).map(|(u, nu)| u.powi(4) / nu).sum();
    if fourth > 0.0 { squared * squared / fourth } else { f64::INFINITY }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_end_gauge_of_jcgm_100_has_its_degrees_of_freedom() {
        // JCGM 100 H.1: contributions 25 (18), 9.7 (25.6), 2.9 (50), 16.6 (2) nm; nu_eff 16.66.
        let alpha = 50.0e6 * 11.5e-6 * 0.029;
        let shares = [(25.0, 18.0), (9.7, 25.6), (50.0e6 * 0.1 * 0.58e-6, 50.0), (alpha, 2.0)];
        let nu = effective_degrees(&shares);
        assert!((nu - 16.66).abs() < 0.05, "{nu}");
        assert_eq!(effective_degrees(&[(1.0, f64::INFINITY)]), f64::INFINITY);
    }

    /// An AR(1) series from a fixed linear congruential generator.
    fn ar1(phi: f64, n: usize) -> Vec<(f64, f64)> {
        let mut state = 12_345_u64;
        let mut y = 0.0;
        let mut series = Vec::new();
        for k in 0..n {
            let mut normal = -6.0;
            for _ in 0..12 {
                state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                normal += (state >> 11) as f64 / (1_u64 << 53) as f64;
            }
            y = phi * y + normal;
            series.push((k as f64, y));
        }
        series
    }

    #[test]
    fn autocorrelated_samples_count_less() {
        // AR(1): n_eff tends to n (1 - phi) / (1 + phi).
        let white = effective_number(&ar1(0.0, 4000));
        assert!(white > 3000.0, "{white}");
        let correlated = effective_number(&ar1(0.9, 4000));
        assert!((100.0..420.0).contains(&correlated), "{correlated}");
    }

    #[test]
    fn short_and_constant_series_are_taken_as_they_are() {
        assert_eq!(effective_number(&[(0.0, 1.0), (1.0, 2.0)]), 2.0);
        assert_eq!(effective_number(&[(0.0, 5.0), (1.0, 5.0), (2.0, 5.0), (3.0, 5.0), (4.0, 5.0)]), 5.0);
        assert_eq!(mean_and_deviation(&[]), None);
        assert_eq!(mean_and_deviation(&[2.0]), Some((2.0, 0.0)));
    }
}
