//! Whether the waveform that an inrush step asks for can be taken and fetched.

use super::notes::Notes;
use super::resolve::written_steps;
use super::wiring::Wired;
use crate::quantity::Seconds;
use crate::spec::bench::{Parity, Port};
use crate::spec::driver::{Driver, WaveformQuery};
use crate::spec::sequence::{RoleKind, Sequence, StepAction};

/// Speed of a virtual line and of one whose speed is left alone, bits per second.
const USUAL_BAUD: u32 = 115_200;

/// Notes every waveform that the meter can't deliver, or not while it is watched.
pub(super) fn waveforms(
    sequence: &Sequence,
    wired: &Wired,
    silence: &[Seconds],
    notes: &mut Notes,
) {
    let roles = &wired.bay.roles;
    let Some(role) = roles.iter().position(|r| r.kind == RoleKind::PowerMeter) else {
        return;
    };
    let meter = &wired.instruments[roles[role].instrument];
    let shares = roles.iter().any(|other| {
        other.kind == RoleKind::Supply && wired.instruments[other.instrument].line == meter.line
    });
    for step in written_steps(sequence) {
        let StepAction::Inrush(timed) = &step.action else {
            continue;
        };
        if !timed.waveform {
            continue;
        }
        let place = &step.verb.place;
        let Some(waveform) = &meter.driver.waveform else {
            notes.error(
                place,
                format!("driver `{}` fetches no waveform", meter.driver.name),
                "add `waveform:` to the driver from the instrument's manual, or take `waveform: yes` out",
            );
            continue;
        };
        let takes = transfer(waveform, &wired.lines[meter.line].port);
        let limit = time_for_block(silence[role], &meter.driver).get();
        if takes >= limit {
            notes.error(
                place,
                format!(
                    "a waveform of {} bytes takes {takes:.1} s on the meter's line: more than {limit:.1} s and the guard counts the meter as silent",
                    waveform.bytes()
                ),
                "set a higher baud rate, or fewer `points:` in the driver and the instrument",
            );
        }
        if shares {
            notes.error(
                place,
                "meter and supply share a line: while the waveform is fetched OFF can't be confirmed",
                "put the supply on a line of its own, or take `waveform: yes` out",
            );
        }
    }
}

/// How long a block may take, so that a reading comes before the guard counts the
/// meter as silent: the silence limit less one reply time and a tenth of a second.
pub fn time_for_block(silence: Seconds, driver: &Driver) -> Seconds {
    let left = silence.get() - driver.framing.reply_within.get() - 0.1;
    Seconds::of(left.max(0.1))
}

/// Seconds that the longest block takes on a line.
fn transfer(waveform: &WaveformQuery, port: &Port) -> f64 {
    let (baud, bits) = match port {
        Port::Serial(s) => {
            let parity = u32::from(s.parity != Parity::None);
            let bits = 1 + u32::from(s.data_bits) + parity + u32::from(s.stop_bits);
            (if s.baud == 0 { USUAL_BAUD } else { s.baud }, bits)
        }
        Port::Virtual => (USUAL_BAUD, 10),
    };
    waveform.bytes() as f64 * f64::from(bits) / f64::from(baud)
}
