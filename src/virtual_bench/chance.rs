//! Chance that can be asked again: every draw is a function of the seed, a name
//! and a number, so that a run's noise depends on no order of calls.

/// A stream of independent draws, one for each number it is asked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Chance {
    key: u64,
}

impl Chance {
    /// The stream of one named thing under one seed.
    pub fn of(seed: u64, name: &str) -> Self {
        // FNV-1a over the name (constants from memory); `scatter` then parts the
        // keys of neighbouring seeds and of names that differ in one letter.
        let hash = name.bytes().fold(0xcbf2_9ce4_8422_2325_u64, |hash, byte| {
            (hash ^ u64::from(byte)).wrapping_mul(0x0000_0100_0000_01b3)
        });
        Self {
            key: scatter(scatter(seed) ^ hash),
        }
    }

    /// Draw `number`, 64 bits.
    pub fn bits(self, number: u64) -> u64 {
        scatter(self.key ^ number.wrapping_mul(0x9e37_79b9_7f4a_7c15))
    }

    /// Draw `number`, even in -1 (included) to 1 (not included).
    pub fn even(self, number: u64) -> f64 {
        let unit = (self.bits(number) >> 11) as f64 / (1_u64 << 53) as f64;
        2.0 * unit - 1.0
    }

    /// Draw `number`, normal with mean 0 and standard deviation 1 (Box and Muller's way).
    pub fn normal(self, number: u64) -> f64 {
        let unit = |bits: u64| ((bits >> 11) as f64 + 0.5) / (1_u64 << 53) as f64;
        let first = self.bits(number);
        let radius = libm::sqrt(-2.0 * libm::log(unit(first)));
        radius * libm::cos(std::f64::consts::TAU * unit(scatter(first ^ self.key)))
    }

    /// Draw `number`, bell-shaped with mean 0 and standard deviation 1.
    ///
    /// The sum of four even draws: close to normal, cheap, and never beyond 3.47,
    /// so that no single noise value looks like a fault.
    pub fn bell(self, number: u64) -> f64 {
        let bits = self.bits(number);
        let sum =
            (bits & 0xffff) + ((bits >> 16) & 0xffff) + ((bits >> 32) & 0xffff) + (bits >> 48);
        // Four values in 0..=65535, each of variance (2^32 - 1) / 12.
        (sum as f64 - 131_070.0) / 37_837.226_816_7
    }
}

/// Mixes 64 bits so that each output bit depends on each input bit: two rounds of
/// multiply and shift, as in common finalisers (constants from memory).
fn scatter(mut bits: u64) -> u64 {
    bits = bits.wrapping_add(0x9e37_79b9_7f4a_7c15);
    bits = (bits ^ (bits >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    bits = (bits ^ (bits >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    bits ^ (bits >> 31)
}

#[cfg(test)]
mod tests {
    use super::*;

    const N: u64 = 40_000;

    fn moments(draw: impl Fn(u64) -> f64) -> (f64, f64, f64, f64) {
        let n = N as f64;
        let values: Vec<f64> = (0..N).map(draw).collect();
        let mean = values.iter().sum::<f64>() / n;
        let variance = values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / n;
        let lag = values
            .windows(2)
            .map(|w| (w[0] - mean) * (w[1] - mean))
            .sum::<f64>()
            / n
            / variance;
        let largest = values.iter().fold(0.0_f64, |a, v| a.max(v.abs()));
        (mean, variance, lag, largest)
    }

    #[test]
    fn bell_draws_have_mean_0_deviation_1_and_no_memory() {
        // Four standard errors at 40,000 draws.
        let (mean, variance, lag, largest) = moments(|n| Chance::of(7, "meter power").bell(n));
        assert!(mean.abs() < 0.02, "{mean}");
        assert!((variance - 1.0).abs() < 0.03, "{variance}");
        assert!(lag.abs() < 0.02, "{lag}");
        assert!(largest < 3.47, "{largest}");
    }

    #[test]
    fn normal_draws_have_the_tails_that_bell_draws_lack() {
        let chance = Chance::of(7, "gain");
        let (mean, variance, lag, largest) = moments(|n| chance.normal(n));
        assert!(mean.abs() < 0.02 && (variance - 1.0).abs() < 0.03 && lag.abs() < 0.02);
        assert!(largest > 3.6, "{largest}");
        let beyond = |z: f64| (0..N).filter(|n| chance.normal(*n).abs() > z).count();
        // 4.55 and 0.27 % of 40,000, four standard errors.
        assert!((1653..=1987).contains(&beyond(2.0)), "{}", beyond(2.0));
        assert!((66..=150).contains(&beyond(3.0)), "{}", beyond(3.0));
    }

    #[test]
    fn even_draws_fill_their_interval() {
        let (mean, variance, lag, largest) = moments(|n| Chance::of(7, "gain").even(n));
        assert!(mean.abs() < 0.012, "{mean}");
        assert!((variance - 1.0 / 3.0).abs() < 0.006, "{variance}");
        assert!(lag.abs() < 0.02 && largest <= 1.0);
    }

    #[test]
    fn seeds_and_names_part_the_streams() {
        let [a, b, c] = [(1, "meter"), (2, "meter"), (1, "meteR")].map(|(s, n)| Chance::of(s, n));
        let same = |x: Chance, y: Chance| {
            let product = (0..N).map(|n| x.bell(n) * y.bell(n)).sum::<f64>();
            product / N as f64
        };
        assert!(same(a, b).abs() < 0.02 && same(a, c).abs() < 0.02);
        assert_eq!(a, Chance::of(1, "meter"));
    }
}
