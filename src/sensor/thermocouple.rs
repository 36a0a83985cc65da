//! Thermocouples K, J and T: the reference functions of the ITS-90 and their inverses.
//!
//! Coefficients: NIST Standard Reference Database 60 (NIST Monograph 175), a work
//! of the United States government and in the public domain. Voltages are in mV
//! here, temperatures in °C, the reference junction at 0 °C.

use super::kind::Couple;
use super::solve::{polynomial, rising};
use crate::quantity::{Celsius, Volts};

const K_BELOW: [f64; 11] = [
    0.0,
    3.945_012_802_5e-2,
    2.362_237_359_8e-5,
    -3.285_890_678_4e-7,
    -4.990_482_877_7e-9,
    -6.750_905_917_3e-11,
    -5.741_032_742_8e-13,
    -3.108_887_289_4e-15,
    -1.045_160_936_5e-17,
    -1.988_926_687_8e-20,
    -1.632_269_748_6e-23,
];
const K_ABOVE: [f64; 10] = [
    -1.760_041_368_6e-2,
    3.892_120_497_5e-2,
    1.855_877_003_2e-5,
    -9.945_759_287_4e-8,
    3.184_094_571_9e-10,
    -5.607_284_488_9e-13,
    5.607_505_905_9e-16,
    -3.202_072_000_3e-19,
    9.715_114_715_2e-23,
    -1.210_472_127_5e-26,
];
const J_BELOW: [f64; 9] = [
    0.0,
    5.038_118_781_5e-2,
    3.047_583_693e-5,
    -8.568_106_572e-8,
    1.322_819_529_5e-10,
    -1.705_295_833_7e-13,
    2.094_809_069_7e-16,
    -1.253_839_533_6e-19,
    1.563_172_569_7e-23,
];
const J_ABOVE: [f64; 6] = [
    2.964_562_568_1e2,
    -1.497_612_778_6,
    3.178_710_392_4e-3,
    -3.184_768_670_1e-6,
    1.572_081_900_4e-9,
    -3.069_136_905_6e-13,
];
const T_BELOW: [f64; 15] = [
    0.0,
    3.874_810_636_4e-2,
    4.419_443_434_7e-5,
    1.184_432_310_5e-7,
    2.003_297_355_4e-8,
    9.013_801_955_9e-10,
    2.265_115_659_3e-11,
    3.607_115_420_5e-13,
    3.849_393_988_3e-15,
    2.821_352_192_5e-17,
    1.425_159_477_9e-19,
    4.876_866_228_6e-22,
    1.079_553_927e-24,
    1.394_502_706_2e-27,
    7.979_515_392_7e-31,
];
const T_ABOVE: [f64; 9] = [
    0.0,
    3.874_810_636_4e-2,
    3.329_222_788e-5,
    2.061_824_340_4e-7,
    -2.188_225_684_6e-9,
    1.099_688_092_8e-11,
    -3.081_575_877_2e-14,
    4.547_913_529e-17,
    -2.751_290_167_3e-20,
];

/// Of type K above 0 °C: a0 exp(a1 (t - a2)^2) is added to the polynomial.
const K_BELL: [f64; 3] = [1.185_976e-1, -1.183_432e-4, 1.269_686e2];

/// One stretch of a reference function.
struct Stretch {
    from: f64,
    to: f64,
    coefficients: &'static [f64],
    bell: Option<[f64; 3]>,
}

const fn stretch(from: f64, to: f64, coefficients: &'static [f64]) -> Stretch {
    Stretch {
        from,
        to,
        coefficients,
        bell: None,
    }
}

const K: [Stretch; 2] = [
    stretch(-270.0, 0.0, &K_BELOW),
    Stretch {
        from: 0.0,
        to: 1372.0,
        coefficients: &K_ABOVE,
        bell: Some(K_BELL),
    },
];
const J: [Stretch; 2] = [
    stretch(-210.0, 760.0, &J_BELOW),
    stretch(760.0, 1200.0, &J_ABOVE),
];
const T: [Stretch; 2] = [
    stretch(-270.0, 0.0, &T_BELOW),
    stretch(0.0, 400.0, &T_ABOVE),
];

impl Stretch {
    /// mV and mV/K.
    fn at(&self, t: f64) -> (f64, f64) {
        let (value, slope) = polynomial(self.coefficients, t);
        match self.bell {
            None => (value, slope),
            Some([a0, a1, a2]) => {
                let bell = a0 * libm::exp(a1 * (t - a2) * (t - a2));
                (value + bell, slope + bell * 2.0 * a1 * (t - a2))
            }
        }
    }
}

fn stretches(couple: Couple) -> &'static [Stretch; 2] {
    match couple {
        Couple::K => &K,
        Couple::J => &J,
        Couple::T => &T,
    }
}

/// mV and mV/K at `t`; nothing outside the function's range.
fn function(couple: Couple, t: f64) -> Option<(f64, f64)> {
    let [below, above] = stretches(couple);
    if !(below.from..=above.to).contains(&t) {
        return None;
    }
    // At 0 °C the lower polynomial gives exactly 0 mV.
    Some(if t <= below.to { below } else { above }.at(t))
}

/// The voltage of a couple whose terminals are at 0 °C, its junction at `at`.
/// `None` outside -270..1372 °C (K), -210..1200 °C (J), -270..400 °C (T).
pub fn voltage(couple: Couple, at: Celsius) -> Option<Volts> {
    Volts::new(function(couple, at.get())?.0 * 1e-3)
}

/// Its slope there, in V/K. `None` outside the function's range.
pub fn seebeck(couple: Couple, at: Celsius) -> Option<f64> {
    Some(function(couple, at.get())?.1 * 1e-3)
}

/// The junction's temperature, from the voltage that is read at terminals at
/// `terminals`: E(terminals) is added, and the reference function inverted, to
/// better than 1 mK. `None` outside the function's range.
pub fn temperature_at(couple: Couple, read: Volts, terminals: Celsius) -> Option<Celsius> {
    let wanted = read.get() * 1e3 + function(couple, terminals.get())?.0;
    let [below, above] = stretches(couple);
    let (lowest, highest) = (below.at(below.from).0, above.at(above.to).0);
    // Sums in another order miss the ends by some last bits: 1 pV is allowed for.
    if !(lowest - 1e-9..=highest + 1e-9).contains(&wanted) {
        return None;
    }
    let stretch = if wanted <= below.at(below.to).0 {
        below
    } else {
        above
    };
    Celsius::new(rising(|t| stretch.at(t), wanted, stretch.from, stretch.to))
}
