//! The unit's circuit as it is switched in: elements, series diode, fan.

use super::ptc::Law;

/// Reactive to active current of a small shaded-pole fan (power factor 0.6; house value).
const FAN_REACTIVE: f64 = 4.0 / 3.0;

/// What is switched in at present, worked out once per event.
#[derive(Debug, Clone, Default)]
pub struct Circuit {
    pub(super) elements: Vec<Law>,
    /// Mean square of the voltage at the elements, V^2.
    pub(super) square: f64,
    pub(super) diode: bool,
    pub(super) volts: f64,
    pub(super) fan_watts: f64,
    /// Block loss with condition and fan, W/K.
    pub(super) loss: f64,
    /// Share of the block's rise that the link's body tends to.
    pub(super) link_share: f64,
}

impl Circuit {
    /// Conductance of the elements at a block temperature, S.
    pub(super) fn conductance(&self, block: f64) -> f64 {
        self.elements.iter().map(|law| 1.0 / law.ohms(block)).sum()
    }

    /// Active power in W and RMS current in A.
    ///
    /// Behind a diode a resistance takes half of the power, and half of the mean
    /// square of the current; what the fan draws in phase adds to the current of
    /// both half-waves, what it draws out of phase in squares.
    pub(super) fn input(&self, block: f64) -> (f64, f64) {
        if self.volts <= 0.0 {
            return (0.0, 0.0);
        }
        let conductance = self.conductance(block);
        let full = self.volts * conductance;
        let fan = self.fan_watts / self.volts;
        let conducting = (full + fan) * (full + fan);
        let in_phase = if self.diode {
            0.5 * (conducting + fan * fan)
        } else {
            conducting
        };
        let reactive = FAN_REACTIVE * fan;
        let amps = libm::sqrt(in_phase + reactive * reactive);
        (self.square * conductance + self.fan_watts, amps)
    }

    /// DC part of the current, A: behind a diode the peak over pi (computed).
    pub(super) fn dc(&self, block: f64) -> f64 {
        if !self.diode || self.volts <= 0.0 {
            return 0.0;
        }
        std::f64::consts::SQRT_2 * self.volts * self.conductance(block) / std::f64::consts::PI
    }

    /// Voltage and current at a phase of the mains, in turns.
    pub(super) fn momentary(&self, block: f64, turns: f64) -> (f64, f64) {
        if self.volts <= 0.0 {
            return (0.0, 0.0);
        }
        let angle = std::f64::consts::TAU * turns;
        let (sine, cosine) = (libm::sin(angle), libm::cos(angle));
        let volts = std::f64::consts::SQRT_2 * self.volts * sine;
        let fed = if self.diode { volts.max(0.0) } else { volts };
        let fan = std::f64::consts::SQRT_2 * self.fan_watts / self.volts;
        let amps = fed * self.conductance(block) + fan * (sine - FAN_REACTIVE * cosine);
        (volts, amps)
    }
}
