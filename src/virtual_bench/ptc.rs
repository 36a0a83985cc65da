//! Resistance of a heating element against its temperature.
//!
//! A self-regulating (PTC) element follows R = R_s exp(a (T - T_s)) from its
//! switch temperature T_s up, exactly. The switch temperature is defined by
//! R = 2 R_min (manufacturers' definition, in common use), so the floor lies ln 2
//! below in the logarithm; towards cold the resistance rises slightly again, and
//! above a maximum it falls. All pieces are joined smoothly in ln R.

use std::f64::consts::LN_2;

use crate::spec::virtual_unit::Resistance;

/// Rise of ln R per kelvin towards cold (house value: about a third over 70 K).
const COLD_RISE: f64 = 0.004;
/// ln of the decades from R_s to the maximum: four, of the usual three to six.
const LN_MAXIMUM: f64 = 4.0 * std::f64::consts::LN_10;
/// Fall of ln R per kelvin above the maximum (house value).
const HOT_FALL: f64 = 0.02;
/// Width in ln R over which the maximum is rounded.
const MAXIMUM_BLEND: f64 = 1.0;

/// Resistance against temperature, ready to be evaluated often.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Law {
    /// Constant, ohm.
    Plain(f64),
    /// Self-regulating.
    Ptc {
        /// R_s, ohm.
        at_switch: f64,
        /// T_s, degC.
        switch: f64,
        /// a, per kelvin.
        steepness: f64,
    },
}

impl Law {
    /// The law of an element of a virtual unit.
    pub fn of(resistance: Resistance) -> Self {
        match resistance {
            Resistance::Plain(r) => Law::Plain(r.get()),
            Resistance::Ptc {
                r_switch,
                t_switch,
                steepness,
            } => Law::Ptc {
                at_switch: r_switch.get(),
                switch: t_switch.get(),
                steepness,
            },
        }
    }

    /// Resistance in ohm at `temperature` in degC.
    pub fn ohms(self, temperature: f64) -> f64 {
        match self {
            Law::Plain(ohms) => ohms,
            Law::Ptc {
                at_switch,
                switch,
                steepness,
            } => at_switch * libm::exp(ln_ratio(temperature - switch, steepness)),
        }
    }

    /// Every resistance multiplied by `factor`.
    #[must_use]
    pub fn scaled(self, factor: f64) -> Self {
        match self {
            Law::Plain(ohms) => Law::Plain(ohms * factor),
            Law::Ptc {
                at_switch,
                switch,
                steepness,
            } => Law::Ptc {
                at_switch: at_switch * factor,
                switch,
                steepness,
            },
        }
    }
}

/// ln(R/R_s) at `above` kelvin above the switch temperature.
fn ln_ratio(above: f64, steepness: f64) -> f64 {
    let switching = steepness * above;
    // The floor meets the switching branch only below T_s: the blend is ln 2 wide
    // and ends where the branches are ln 2 apart, which is at T_s.
    let cold = -LN_2 - COLD_RISE * above.min(0.0);
    // Far above its maximum an element is destroyed; it does not become a short here.
    let falling = (LN_MAXIMUM - HOT_FALL * (above - LN_MAXIMUM / steepness)).max(-LN_2);
    let rising = smooth_larger(switching, cold, LN_2);
    -smooth_larger(-rising, -falling, MAXIMUM_BLEND)
}

/// The larger of two, rounded where they are less than `width` apart and exact
/// elsewhere; twice continuously differentiable.
fn smooth_larger(a: f64, b: f64, width: f64) -> f64 {
    let overlap = (width - (a - b).abs()).max(0.0);
    a.max(b) + overlap * overlap * overlap / (6.0 * width * width)
}

#[cfg(test)]
mod tests {
    use super::*;

    const UNIT: Law = Law::Ptc {
        at_switch: 1500.0,
        switch: 120.0,
        steepness: 0.2,
    };
    const G: f64 = 0.04;
    const AMBIENT: f64 = 25.0;

    /// Settled temperature at `volts`: where V^2/R(T) = G (T - Ta).
    fn settled(law: Law, volts: f64) -> f64 {
        let (mut low, mut high) = (AMBIENT, 170.0);
        for _ in 0..100 {
            let t = f64::midpoint(low, high);
            if volts * volts / law.ohms(t) > G * (t - AMBIENT) {
                low = t;
            } else {
                high = t;
            }
        }
        low
    }

    fn close(found: f64, wanted: f64, relative: f64) {
        assert!(
            (found / wanted - 1.0).abs() < relative,
            "{found} instead of {wanted}"
        );
    }

    #[test]
    fn settled_values_meet_the_computed_check_values() {
        // Source: the project's own computation of the pure exponential with
        // Rs 1500 ohm, Ts 120 degC, a 0.2/K, G 0.04 W/K, Ta 25 degC.
        let t = settled(UNIT, 230.0);
        close(t, 130.61029, 1e-7);
        close(G * (t - AMBIENT), 4.2244116, 1e-7);
        close(UNIT.ohms(t), 12522.454, 1e-7);
        let t = settled(UNIT, 100.0);
        close(t, 122.67191, 1e-7);
        close(G * (t - AMBIENT), 3.9068764, 1e-7);
    }

    #[test]
    fn the_local_voltage_exponent_is_nearly_none() {
        // Source: as above; dlnP/dlnV = 2/(1 + a dT).
        let power = |v: f64| G * (settled(UNIT, v) - AMBIENT);
        let exponent = (power(230.1) / power(229.9)).ln() / (230.1_f64 / 229.9).ln();
        close(exponent, 0.090_407_5, 1e-4);
    }

    #[test]
    fn the_pure_exponential_holds_from_the_switch_temperature_up() {
        for t in [120.0, 120.5, 122.0, 130.0, 150.0, 160.0] {
            close(UNIT.ohms(t), 1500.0 * libm::exp(0.2 * (t - 120.0)), 1e-12);
        }
    }

    #[test]
    fn the_minimum_is_half_of_the_switch_resistance() {
        let least = (0..2000)
            .map(|i| UNIT.ohms(20.0 + 0.1 * f64::from(i)))
            .fold(f64::INFINITY, f64::min);
        close(least, 750.0, 0.04);
        let cold = UNIT.ohms(20.0) / least;
        assert!((1.1..2.0).contains(&cold), "cold is {cold} of the minimum");
    }

    #[test]
    fn above_a_maximum_it_falls_again() {
        let peak = 120.0 + LN_MAXIMUM / 0.2;
        assert!(UNIT.ohms(peak - 20.0) < UNIT.ohms(peak));
        assert!(UNIT.ohms(peak + 60.0) < UNIT.ohms(peak + 10.0));
    }

    #[test]
    fn slope_and_curvature_have_no_jumps() {
        let ln = |t: f64| ln_ratio(t, 0.2);
        let step = 0.01;
        let curvature = |t: f64| (ln(t + step) - 2.0 * ln(t) + ln(t - step)) / (step * step);
        let mut t = -40.0;
        while t < 80.0 {
            assert!((curvature(t + step) - curvature(t)).abs() < 2e-3, "at {t}");
            t += step;
        }
    }
}
