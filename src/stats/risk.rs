//! Probability of conformity, and the risks of a decision rule for a process.

use super::{normal_cdf, student_cdf};

/// An interval that a value should lie in; an open side is infinite.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Interval {
    /// Lower limit, or minus infinity.
    pub low: f64,
    /// Upper limit, or infinity.
    pub high: f64,
}

/// What a process and a measurement make of a decision rule.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Risks {
    /// Share of the units that conform.
    pub conforming: f64,
    /// Global consumer's risk: a unit does not conform and is accepted.
    pub consumer: f64,
    /// Global producer's risk: a unit conforms and is rejected.
    pub producer: f64,
}

/// Probability that a quantity, measured as `y` with standard uncertainty `u`
/// (normal), lies within the tolerance limits (JCGM 106:2012, 7.2 to 7.4).
///
/// Nothing where `u` is not positive, a number is none, or the limits are crossed.
pub fn conformity(y: f64, u: f64, tolerance: Interval) -> Option<f64> {
    usable(y, u, tolerance).then(|| share_of_normal(y, u, tolerance))
}

/// The same for a t-distributed quantity with `freedom` degrees of freedom, scaled
/// by `u` about `y`; infinite `freedom` is the normal distribution.
///
/// Nothing where [`conformity`] gives nothing, or `freedom` is below 1.
pub fn conformity_t(y: f64, u: f64, freedom: f64, tolerance: Interval) -> Option<f64> {
    if !usable(y, u, tolerance) {
        return None;
    }
    let (low, high) = ((tolerance.low - y) / u, (tolerance.high - y) / u);
    // From the side of the nearer tail, which keeps its digits.
    let (low, high) = if low > 0.0 {
        (-high, -low)
    } else {
        (low, high)
    };
    let between = student_cdf(high, freedom)? - student_cdf(low, freedom)?;
    Some(between.clamp(0.0, 1.0))
}

/// Risks of accepting what is measured within `acceptance`, for a normal process of
/// mean `y0` and standard deviation `u0`, and a measurement of standard uncertainty
/// `um` (normal, independent of the value): JCGM 106:2012, 9.5, integrated.
///
/// Nothing where `u0` or `um` is not positive, a number is none, limits are
/// crossed, or `um` and `u0` are more than a million times apart.
pub fn global_risks(
    y0: f64,
    u0: f64,
    um: f64,
    tolerance: Interval,
    acceptance: Interval,
) -> Option<Risks> {
    let ratio = um / u0;
    if !usable(y0, u0, tolerance) || !usable(y0, um, acceptance) || !(1e-6..=1e6).contains(&ratio) {
        return None;
    }
    // From here on in standard deviations of the process.
    let scaled = |limits: Interval| Interval {
        low: (limits.low - y0) / u0,
        high: (limits.high - y0) / u0,
    };
    let (tolerance, acceptance) = (scaled(tolerance), scaled(acceptance));
    let cuts = cuts(ratio, tolerance, acceptance);
    let (mut consumer, mut producer) = (0.0, 0.0);
    for pair in cuts.windows(2) {
        let middle = pair[0] / 2.0 + pair[1] / 2.0;
        if (tolerance.low..=tolerance.high).contains(&middle) {
            producer += integral(pair[0], pair[1], |z| {
                density(z) * share_outside(z, ratio, acceptance)
            });
        } else {
            consumer += integral(pair[0], pair[1], |z| {
                density(z) * share_of_normal(z, ratio, acceptance)
            });
        }
    }
    Some(Risks {
        conforming: share_of_normal(0.0, 1.0, tolerance),
        consumer: consumer.clamp(0.0, 1.0),
        producer: producer.clamp(0.0, 1.0),
    })
}

fn usable(y: f64, u: f64, limits: Interval) -> bool {
    y.is_finite() && u.is_finite() && u > 0.0 && limits.low < limits.high
}

fn density(z: f64) -> f64 {
    libm::exp(-0.5 * z * z) / (2.0 * std::f64::consts::PI).sqrt()
}

fn share_of_normal(y: f64, u: f64, limits: Interval) -> f64 {
    let (low, high) = ((limits.low - y) / u, (limits.high - y) / u);
    if low > 0.0 {
        normal_cdf(-low) - normal_cdf(-high)
    } else {
        normal_cdf(high) - normal_cdf(low)
    }
}

fn share_outside(y: f64, u: f64, limits: Interval) -> f64 {
    normal_cdf((limits.low - y) / u) + normal_cdf((y - limits.high) / u)
}

/// Where the integrand bends: the tolerance limits, the width of the process, and
/// the width of the measurement about each acceptance limit.
fn cuts(ratio: f64, tolerance: Interval, acceptance: Interval) -> Vec<f64> {
    const FAR: f64 = 9.0;
    let process = (-9..=9).map(f64::from);
    let about = [acceptance.low, acceptance.high]
        .into_iter()
        .flat_map(|limit| (-9..=9).map(move |i| limit + f64::from(i) * ratio));
    let mut cuts: Vec<f64> = process
        .chain(about)
        .chain([tolerance.low, tolerance.high])
        .filter(|z| z.abs() <= FAR)
        .collect();
    cuts.sort_by(f64::total_cmp);
    cuts.dedup();
    cuts
}

/// Gauss and Legendre's rule with ten nodes (Abramowitz and Stegun 25.4.30).
fn integral(from: f64, to: f64, f: impl Fn(f64) -> f64) -> f64 {
    const NODES: [(f64, f64); 5] = [
        (0.148_874_338_981_631_2, 0.295_524_224_714_752_87),
        (0.433_395_394_129_247_2, 0.269_266_719_309_996_35),
        (0.679_409_568_299_024_4, 0.219_086_362_515_982_04),
        (0.865_063_366_688_984_5, 0.149_451_349_150_580_6),
        (0.973_906_528_517_171_7, 0.066_671_344_308_688_14),
    ];
    let (middle, half) = (from / 2.0 + to / 2.0, to / 2.0 - from / 2.0);
    let sum: f64 = NODES
        .iter()
        .map(|(x, weight)| weight * (f(middle - half * x) + f(middle + half * x)))
        .sum();
    half * sum
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const OPEN: f64 = f64::INFINITY;

    fn limits(low: f64, high: f64) -> Interval {
        Interval { low, high }
    }

    // JCGM 106:2012, 9.5: resistors (inputs and results read).
    #[test]
    fn resistors_of_jcgm_106() {
        let risks = global_risks(
            1500.0,
            0.12,
            0.04,
            limits(1499.8, 1500.2),
            limits(1499.82, 1500.18),
        )
        .unwrap();
        assert!((risks.conforming - 0.9044).abs() < 5e-5, "{risks:?}");
        assert!((risks.consumer - 0.0099).abs() < 5e-5, "{risks:?}");
        assert!((risks.producer - 0.0690).abs() < 5e-5, "{risks:?}");
    }

    // JCGM 106:2012, 7.3: y -5.47 V, u 0.05 V, upper limit -5.40 V (inputs from
    // memory): 0.92, computed 0.9192433.
    #[test]
    fn breakdown_voltage_of_jcgm_106() {
        let p = conformity(-5.47, 0.05, limits(-OPEN, -5.40)).unwrap();
        assert!((p - 0.919_243_3).abs() < 1e-7);
    }

    // JCGM 106:2012, table of 7.3 (from memory): the distance to the limit, in u, for
    // a probability of conformity.
    #[test]
    fn distances_of_jcgm_106() {
        for (p, distance) in [
            (0.80, 0.84),
            (0.90, 1.28),
            (0.95, 1.64),
            (0.99, 2.33),
            (0.999, 3.09),
        ] {
            let found = conformity(0.0, 1.0, limits(-OPEN, distance)).unwrap();
            assert!((found - p).abs() < 0.0015, "{p}: {found}");
        }
    }

    // ILAC-G8:09/2019, 4.2 (rule read, figures computed): limit 24.0 W, U 0.4 W.
    #[test]
    fn four_outcomes_of_ilac_g8() {
        for (y, p) in [
            (23.5, 0.993_79),
            (23.6, 0.977_25),
            (23.7, 0.933_19),
            (24.0, 0.5),
            (24.2, 0.158_66),
            (24.5, 0.006_21),
        ] {
            let found = conformity(y, 0.2, limits(-OPEN, 24.0)).unwrap();
            assert!((found - p).abs() < 5e-6, "{y}: {found}");
        }
        // Guard bands: w = U leaves 2.275 % at the acceptance limit, 0.83 U below 5 %.
        let at = |w: f64| 1.0 - conformity(24.0 - w, 0.2, limits(-OPEN, 24.0)).unwrap();
        assert!((at(0.4) - 0.022_75).abs() < 1e-5);
        assert!((0.045..0.05).contains(&at(0.83 * 0.4)));
    }

    #[test]
    fn few_degrees_of_freedom_make_a_verdict_less_sure() {
        let upper = limits(-OPEN, 2.0);
        let normal = conformity_t(0.0, 1.0, OPEN, upper).unwrap();
        assert_eq!(Some(normal), conformity(0.0, 1.0, upper));
        let few = conformity_t(0.0, 1.0, 3.0, upper).unwrap();
        assert!(few < normal && few > 0.9);
        // One degree of freedom: 1/2 + atan(2) / pi.
        let one = conformity_t(0.0, 1.0, 1.0, upper).unwrap();
        assert!((one - 0.5 - libm::atan(2.0) / std::f64::consts::PI).abs() < 1e-14);
        // Far outside, both signs alike.
        let (a, b) = (limits(40.0, 50.0), limits(-50.0, -40.0));
        let far = conformity_t(0.0, 1.0, 5.0, a).unwrap();
        assert!((conformity_t(0.0, 1.0, 5.0, b).unwrap() - far).abs() < 1e-18 && far > 1e-9);
    }

    #[test]
    fn a_perfect_measurement_has_no_risk_and_a_useless_one_decides_by_chance() {
        let good = limits(-1.0, 1.0);
        let sharp = global_risks(0.0, 1.0, 1e-6, good, good).unwrap();
        assert!(sharp.consumer < 1e-6 && sharp.producer < 1e-6);
        let blind = global_risks(0.0, 1.0, 1e5, good, limits(-OPEN, 0.0)).unwrap();
        assert!((blind.producer - 0.5 * blind.conforming).abs() < 1e-4);
        assert!((blind.consumer - 0.5 * (1.0 - blind.conforming)).abs() < 1e-4);
    }

    #[test]
    fn what_cannot_be_said_is_not_said() {
        let good = limits(-1.0, 1.0);
        assert_eq!(conformity(0.0, 0.0, good), None);
        assert_eq!(conformity(f64::NAN, 1.0, good), None);
        assert_eq!(conformity(0.0, 1.0, limits(1.0, -1.0)), None);
        assert_eq!(conformity(0.0, 1.0, limits(f64::NAN, 1.0)), None);
        assert_eq!(conformity_t(0.0, 1.0, 0.5, good), None);
        assert_eq!(global_risks(0.0, 1.0, 1e-7, good, good), None);
        assert_eq!(global_risks(0.0, -1.0, 1.0, good, good), None);
    }

    proptest! {
        #[test]
        fn shares_add_up_and_a_guard_band_moves_risk_to_the_producer(
            y0 in -2.0..2.0f64, um in 0.01..3.0f64, guard in 0.0..0.9f64,
        ) {
            let good = limits(-1.0, 1.0);
            let plain = global_risks(y0, 1.0, um, good, good).unwrap();
            let guarded =
                global_risks(y0, 1.0, um, good, limits(-1.0 + guard, 1.0 - guard)).unwrap();
            prop_assert!(guarded.consumer <= plain.consumer + 1e-12);
            prop_assert!(guarded.producer >= plain.producer - 1e-12);
            // Accepted in all: conforming - producer + consumer, known in closed form.
            let spread = (1.0 + um * um).sqrt();
            let accepted = conformity(y0, spread, good).unwrap();
            let sum = plain.conforming - plain.producer + plain.consumer;
            prop_assert!((sum - accepted).abs() < 1e-10, "{} {}", sum, accepted);
        }
    }
}
