//! Several instruments on one line, other line ends, gaps, and noise.

use std::sync::{Arc, Mutex};

use proptest::prelude::*;

use super::scripted::{Listening, Manners, Scripted, on_a_line, paused, setup};
use crate::bench::exchange::{Exchange, Next};
use crate::bench::request::{Expect, Manner, Reply, Request};
use crate::bench::{FarSide, Fault, simulated_line};
use crate::clock::Clock;
use crate::quantity::{Moment, Reading, Seconds};
use crate::spec::driver::Terminator;

/// Two instruments on one line, told apart by a prefix.
struct Shared([Scripted; 2]);

impl FarSide for Shared {
    fn receive(&mut self, bytes: &[u8], now: Moment) {
        match bytes.strip_prefix(b"B:") {
            Some(rest) => self.0[1].lock().receive(rest, now),
            None => self.0[0].lock().receive(bytes, now),
        }
    }
    fn deliver(&mut self, now: Moment, out: &mut Vec<u8>) {
        for far in &self.0 {
            far.lock().deliver(now, out);
        }
    }
    fn due(&self) -> Option<Moment> {
        self.0.iter().filter_map(FarSide::due).min()
    }
}

#[test]
fn a_late_reply_of_one_instrument_never_reaches_its_neighbour() {
    for late in [0.55, 0.6, 0.95, 1.1, 1.4, 1.6] {
        paused().block_on(async {
            let mut setup = setup();
            let mut other = setup.instruments[0].clone();
            other.name = "other".into();
            other.driver.identity.ask = "B:*IDN?".into();
            other.driver.readings[0].ask = "B:MEAS:VOLT?;CURR?;POW?".into();
            setup.instruments.push(other);
            for instrument in &mut setup.instruments {
                instrument.driver.framing.tries = 1;
            }
            let (near, far) = (Scripted::default(), Scripted::default());
            near.lock().manners = [Manners::Late(late)].into();
            // The neighbour counts from a thousand.
            far.lock().count = 1000;
            let shared = Box::new(Shared([near.clone(), far.clone()]));
            let (ears, _samples) = Listening::default().ears();
            let line = simulated_line(setup, shared, Clock::simulated(), ears);
            assert!(line.read(0, 0, None).await.result.is_err());
            let power = line.read(1, 0, None).await.result.unwrap();
            assert_eq!(power.get(Reading::Power), Some(1001.0), "{late}");
        });
    }
}

#[test]
fn a_dead_neighbour_holds_up_no_more_than_a_silence() {
    paused().block_on(async {
        let mut setup = setup();
        let mut other = setup.instruments[0].clone();
        other.driver.readings[0].ask = "B:MEAS:VOLT?;CURR?;POW?".into();
        setup.instruments.push(other);
        let near = Scripted::default();
        near.lock().deaf = true;
        let shared = Box::new(Shared([near, Scripted::default()]));
        let (ears, _samples) = Listening::default().ears();
        let clock = Clock::simulated();
        let line = simulated_line(setup, shared, clock.clone(), ears);
        assert!(line.read(0, 0, None).await.result.is_err());
        let before = clock.now();
        assert!(line.read(1, 0, None).await.result.is_ok());
        assert!(clock.now().since(before) <= Seconds::of(0.5));
    });
}

#[test]
fn a_gap_is_kept_between_a_reply_and_the_next_message() {
    paused().block_on(async {
        let mut setup = setup();
        setup.instruments[0].driver.framing.gap = Seconds::of(0.03);
        let far = Scripted::default();
        let (ears, _samples) = Listening::default().ears();
        let line = simulated_line(setup, Box::new(far.clone()), Clock::simulated(), ears);
        line.prepare(0).await.unwrap();
        line.identify(0).await.unwrap();
        let at: Vec<u64> = far.lock().heard.iter().map(|h| h.0.as_micros()).collect();
        assert_eq!(at, [0, 30_000, 60_000]);
    });
}

#[test]
fn bytes_out_of_the_blue_lead_to_synchronising() {
    on_a_line(Scripted::default(), |bench| async move {
        bench.line.identify(0).await.unwrap();
        // The far side speaks up while nothing is asked.
        bench.far.lock().say_now("9;9;9");
        tokio::time::sleep(Seconds::of(1.0).to_std()).await;
        let polled = bench.line.read(0, 0, None).await;
        assert_eq!(polled.result.unwrap().get(Reading::Power), Some(1.0));
        assert_eq!(bench.far.lock().times("*IDN?"), 2);
    });
}

fn exchange(end: Terminator) -> (Exchange, Request) {
    let mut driver = super::scripted::driver();
    driver.framing.replies = end;
    let manner = Arc::new(Manner::new(0, &driver, "EXAMPLE", 1.0));
    let gives = vec![Reading::Voltage, Reading::Power];
    let expect = Expect::Readings(gives.into());
    let request = Request::new(&manner, b"MEAS?\n".to_vec(), expect);
    (Exchange::new(), request)
}

#[test]
fn every_line_end_is_understood_byte_by_byte() {
    for (end, bytes) in [
        (Terminator::Lf, &b"1;2\r\n"[..]),
        (Terminator::Lf, b"1;2\n"),
        (Terminator::CrLf, b"1;2\r\n"),
        (Terminator::Cr, b"1;2\r"),
    ] {
        let (mut exchange, request) = exchange(end);
        let now = Moment::START;
        assert!(matches!(exchange.begin(request, now), Next::Write));
        assert_eq!(exchange.outbox(), b"MEAS?\n");
        assert!(matches!(exchange.written(true, now), Next::Wait));
        assert_eq!(exchange.wake_at(), Some(now + Seconds::of(0.5)));
        let (last, first) = bytes.split_last().unwrap();
        for byte in first {
            assert!(matches!(exchange.feed(&[*byte], now), Next::Wait));
        }
        let Next::Over(outcome) = exchange.feed(&[*last], now) else {
            panic!("{end:?}");
        };
        assert!(matches!(outcome.result, Ok(Reply::Readings(_))));
    }
}

#[test]
fn a_message_that_was_cut_off_is_ended_before_the_next() {
    let (mut exchange, request) = exchange(Terminator::Lf);
    let now = Moment::START;
    assert!(matches!(exchange.begin(request, now), Next::Write));
    assert!(matches!(exchange.written(false, now), Next::Write));
    assert_eq!(exchange.outbox(), b"\n*IDN?\n");
}

/// Noise with a taste for what matters.
fn piece() -> impl Strategy<Value = Vec<u8>> {
    prop_oneof![
        proptest::collection::vec(any::<u8>(), 0..12),
        prop_oneof![
            Just("1;2\n"),
            Just("9.9E37;1\n"),
            Just("-9.9E+37"),
            Just(";9.91E37\n"),
            Just("EXAMPLE,A,B,C\n"),
            Just("MEAS?\n"),
            Just("\r\n"),
            Just(";"),
        ]
        .prop_map(|text| text.as_bytes().to_vec()),
    ]
}

proptest! {
    #[test]
    fn noise_never_panics_never_hangs_and_makes_no_reading_of_a_sentinel(
        pieces in proptest::collection::vec((piece(), 0u64..700_000), 0..40)
    ) {
        let (mut exchange, request) = exchange(Terminator::Lf);
        let mut now = Moment::START;
        let mut next = exchange.begin(request.clone(), now);
        let mut exchanges = 1;
        let mut noise = pieces.into_iter();
        for _ in 0..300 {
            next = match next {
                Next::Write => exchange.written(true, now),
                Next::Over(outcome) => {
                    if let Ok(Reply::Readings(row)) = outcome.result {
                        prop_assert!(row.iter().all(|(_, value)| value.abs() < 9.89e37));
                    }
                    exchanges += 1;
                    exchange.begin(request.clone(), now)
                }
                Next::Wait => match noise.next() {
                    Some((bytes, later)) => {
                        now = now.plus_micros(later);
                        exchange.feed(&bytes, now)
                    }
                    None => {
                        now = exchange.wake_at().expect("a waiting exchange wakes").max(now);
                        exchange.expire(now)
                    }
                },
            };
        }
        // In silence each exchange ends after its tries.
        prop_assert!(exchanges > 5);
    }

    #[test]
    fn noise_on_a_line_never_panics(
        pieces in proptest::collection::vec((piece(), 0u64..300_000), 0..40)
    ) {
        struct Noise(Mutex<Vec<(Moment, Vec<u8>)>>);
        impl FarSide for Noise {
            fn receive(&mut self, _: &[u8], _: Moment) {}
            fn deliver(&mut self, now: Moment, out: &mut Vec<u8>) {
                let mut waiting = self.0.lock().unwrap();
                while waiting.last().is_some_and(|(at, _)| *at <= now) {
                    out.extend(waiting.pop().unwrap().1);
                }
            }
            fn due(&self) -> Option<Moment> {
                self.0.lock().unwrap().last().map(|(at, _)| *at)
            }
        }
        let mut at = Moment::START;
        let mut timed: Vec<_> = pieces
            .into_iter()
            .map(|(bytes, later)| {
                at = at.plus_micros(later);
                (at, bytes)
            })
            .collect();
        timed.reverse();
        paused().block_on(async {
            let (ears, _samples) = Listening::default().ears();
            let far = Box::new(Noise(Mutex::new(timed)));
            let line = simulated_line(setup(), far, Clock::simulated(), ears);
            let _ = line.identify(0).await;
            let _ = line.prepare(0).await;
            let _ = line.read(0, 0, None).await;
            let _ = line.energise(0).await;
            let _ = line.ensure_off(0, "end").await;
            let _ = line.close().await;
        });
    }
}

#[test]
fn the_fault_of_a_write_that_is_not_taken_says_so() {
    let (mut exchange, request) = exchange(Terminator::Lf);
    let now = Moment::START;
    let mut next = exchange.begin(request.once(), now);
    if matches!(next, Next::Write) {
        next = exchange.written(false, now);
    }
    let Next::Over(outcome) = next else {
        panic!("it is over after one try");
    };
    let fault = outcome.result.unwrap_err().fault;
    assert_eq!(fault, Fault::Lost("the port takes no bytes".into()));
}
