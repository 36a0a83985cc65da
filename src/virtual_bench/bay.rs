//! The bay behind the lines: one specimen, its wiring, and the instruments that
//! look at it. Everything that happens, happens at a moment and in order.

use super::chance::Chance;
use super::dialect::{Ask, Knob};
use super::error_queue::DeviceError;
use super::instruments::{Effect, Instrument, Look, Toggle, Wiring};
use super::scope::Taken;
use super::unit::{Drive, Specimen, State};

/// The shared world of all far sides.
#[derive(Debug)]
pub struct Bay {
    pub(super) instruments: Vec<Instrument>,
    pub(super) positions: Vec<String>,
    pub(super) conditions: Vec<(String, f64)>,
    pub(super) specimen: Specimen,
    pub(super) wiring: Wiring,
    pub(super) loss_factor: f64,
    /// Chooses the phase of the mains at each switching on.
    pub(super) switching: Chance,
    pub(super) switched_on: u64,
    pub(super) offs: usize,
    /// How far the bay has been followed, microseconds.
    pub(super) now: u64,
}

impl Bay {
    /// Follows the bay to `now`; each instrument takes its looks on the way.
    pub fn advance(&mut self, now: u64) {
        if now < self.now {
            return;
        }
        // A look may lie before another instrument's: the course is followed
        // forwards only, so the earliest look is taken first.
        while let Some((at, number)) = self.next_look(now) {
            self.take_look(number, at);
        }
        self.now = now;
    }

    /// The earliest look that is due by `now`, and who takes it. Looks that
    /// nobody asked for are left out.
    fn next_look(&self, now: u64) -> Option<(u64, usize)> {
        let due = |(number, instrument): (usize, &Instrument)| {
            let tick = now / instrument.interval;
            let taken = instrument.look.is_some_and(|look| look.tick >= tick);
            (!taken).then_some((tick * instrument.interval, number))
        };
        self.instruments.iter().enumerate().filter_map(due).min()
    }

    fn take_look(&mut self, number: usize, at: u64) {
        let seconds = at as f64 * 1e-6;
        self.specimen.advance(seconds);
        let instrument = &mut self.instruments[number];
        let joules = match instrument.counts_energy() {
            true => self.specimen.joules(seconds),
            false => 0.0,
        };
        instrument.look = Some(Look {
            tick: at / instrument.interval,
            at: seconds,
            state: self.specimen.state(seconds),
            volts: if self.wiring.on {
                self.wiring.volts
            } else {
                0.0
            },
            hertz: if self.wiring.on {
                self.wiring.hertz
            } else {
                0.0
            },
            watt_hours: joules / 3600.0,
        });
    }

    /// One instrument hears a message; its reply, if any, is appended to `out`.
    pub fn hear(
        &mut self,
        number: usize,
        message: &[u8],
        now: u64,
        how: Hearing,
        out: &mut Vec<u8>,
    ) {
        self.advance(now);
        let Some(instrument) = self.instruments.get_mut(number) else {
            return;
        };
        let Some((ask, hole)) = instrument.understand(message) else {
            instrument.fail(DeviceError::UndefinedHeader);
            return;
        };
        if how.stranger && ask == Ask::Identity {
            instrument.answer_as_stranger(out);
            return;
        }
        if how.in_trouble && matches!(ask, Ask::Set(_) | Ask::On | Ask::Off) {
            instrument.fail(DeviceError::Specific);
        }
        match instrument.answer(ask, hole, (&self.wiring, now as f64 * 1e-6), out) {
            Effect::Nothing => return,
            Effect::Set(Knob::Voltage, volts) => self.wiring.volts = volts,
            Effect::Set(Knob::Frequency, hertz) => self.wiring.hertz = hertz,
            Effect::Set(Knob::Position, position) => self.wiring.position = position as usize,
            Effect::Output(Toggle::On) if !self.wiring.on => return self.switch_on(),
            Effect::Output(Toggle::On) => {}
            Effect::Output(Toggle::Off) => {
                self.wiring.on = false;
                self.offs += 1;
                let now = self.now as f64 * 1e-6;
                for instrument in &mut self.instruments {
                    instrument.scope.switched_off(now);
                }
            }
        }
        self.redrive();
    }

    /// The output goes on, at any phase of the mains; whoever is armed takes it down.
    fn switch_on(&mut self) {
        self.wiring.on = true;
        self.redrive();
        let turns = 0.5 * (1.0 + self.switching.even(self.switched_on));
        self.switched_on += 1;
        let taken = Taken {
            specimen: self.specimen.clone(),
            at: self.now as f64 * 1e-6,
            hertz: self.wiring.hertz,
            turns,
            off: None,
        };
        for instrument in &mut self.instruments {
            instrument.scope.switched_on(&taken);
        }
    }

    /// Tells the specimen what the wiring and the condition are now.
    pub fn redrive(&mut self) {
        let seconds = self.now as f64 * 1e-6;
        self.specimen.advance(seconds);
        let drive = Drive {
            volts: if self.wiring.on {
                self.wiring.volts
            } else {
                0.0
            },
            position: self.wiring.position,
            loss_factor: self.loss_factor,
        };
        self.specimen.set_drive(seconds, drive);
    }

    /// The truth at the moment to which the bay has been followed.
    pub fn state(&mut self) -> State {
        let seconds = self.now as f64 * 1e-6;
        self.specimen.advance(seconds);
        self.specimen.state(seconds)
    }
}

/// How well an instrument hears and speaks at present.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Hearing {
    /// It gives another's identity.
    pub stranger: bool,
    /// Each command leaves an error.
    pub in_trouble: bool,
}
