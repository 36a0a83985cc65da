//! Polls keep their schedule.

use super::scripted::{Listening, Manners, Scripted, on_a_line, paused, setup};
use crate::bench::{Ears, FarSide, Fault, Poll, Polled, Tap, simulated_line};
use crate::clock::Clock;
use crate::quantity::{Moment, Reading, Seconds};

fn poll(tag: u32, every: f64) -> Poll {
    Poll {
        tag,
        instrument: 0,
        query: 0,
        channel: None,
        every: Seconds::of(every),
    }
}

fn requests(samples: &[Polled]) -> Vec<u64> {
    samples
        .iter()
        .map(|s| s.request.as_micros() / 1000)
        .collect()
}

#[test]
fn a_schedule_does_not_drift() {
    on_a_line(Scripted::default(), |mut bench| async move {
        bench.far.lock().latency_us = 7_300;
        bench.line.poll(vec![poll(1, 0.1)]);
        for k in 0..10_000u64 {
            let sample = bench.samples.recv().await.unwrap();
            assert_eq!(sample.request, Moment::from_micros(k * 100_000));
            assert_eq!(sample.tag, 1);
            let readings = sample.result.unwrap();
            assert_eq!(readings.get(Reading::Power), Some((k + 1) as f64));
        }
    });
}

#[test]
fn missed_ticks_are_skipped_and_not_bunched() {
    let far = Scripted::default().with(&[Manners::Good, Manners::Late(0.35)]);
    on_a_line(far, |mut bench| async move {
        bench.line.poll(vec![poll(1, 0.1)]);
        let mut samples = Vec::new();
        for _ in 0..5 {
            samples.push(bench.samples.recv().await.unwrap());
        }
        // The second reply comes at 450: the tick of 400 is taken late, 200 and 300 never.
        assert_eq!(requests(&samples), [0, 100, 450, 500, 600]);
    });
}

#[test]
fn orders_go_in_front_and_polls_are_replaced() {
    on_a_line(Scripted::default(), |mut bench| async move {
        bench.far.lock().latency_us = 20_000;
        bench.line.poll(vec![poll(1, 0.1), poll(2, 0.1)]);
        let asked = bench.line.read(0, 0, None).await;
        assert_eq!(asked.request.as_micros(), 0);
        let first = bench.samples.recv().await.unwrap();
        let second = bench.samples.recv().await.unwrap();
        assert_eq!((first.tag, second.tag), (1, 2));
        assert_eq!(requests(&[first, second]), [20, 40]);
        bench.line.poll(vec![poll(3, 1.0)]);
        for k in 0..3 {
            let sample = bench.samples.recv().await.unwrap();
            assert_eq!(
                (sample.tag, sample.request.as_micros()),
                (3, 60_000 + k * 1_000_000)
            );
        }
        bench.line.poll(Vec::new());
        let none = tokio::time::timeout(Seconds::of(60.0).to_std(), bench.samples.recv());
        assert!(none.await.is_err());
    });
}

#[test]
fn a_silent_instrument_gives_errors_and_polling_goes_on() {
    let far = Scripted::default();
    on_a_line(far, |mut bench| async move {
        bench.far.lock().deaf = true;
        bench.line.poll(vec![poll(1, 0.1)]);
        for _ in 0..3 {
            let sample = bench.samples.recv().await.unwrap();
            let error = sample.result.unwrap_err();
            assert_eq!((&error.fault, error.tries), (&Fault::NoReply, 3));
            assert_eq!(error.waited, Seconds::of(1.5));
        }
        bench.far.lock().deaf = false;
        let back = loop {
            let sample = bench.samples.recv().await.unwrap();
            if let Ok(readings) = sample.result {
                break readings;
            }
        };
        assert_eq!(back.get(Reading::Voltage), Some(230.125));
    });
}

#[test]
fn polls_that_cannot_be_are_refused_once() {
    on_a_line(Scripted::default(), |mut bench| async move {
        let wrong = Poll {
            query: 5,
            ..poll(9, 0.1)
        };
        bench.line.poll(vec![wrong]);
        let sample = bench.samples.recv().await.unwrap();
        assert!(matches!(
            sample.result.unwrap_err().fault,
            Fault::Refused(_)
        ));
        let none = tokio::time::timeout(Seconds::of(60.0).to_std(), bench.samples.recv());
        assert!(none.await.is_err());
    });
}

/// Answers at once or after a while, without thinking.
struct Quick {
    due: Option<Moment>,
    latency_us: u64,
}

impl FarSide for Quick {
    fn receive(&mut self, _: &[u8], now: Moment) {
        self.due = Some(now.plus_micros(self.latency_us));
    }
    fn deliver(&mut self, now: Moment, out: &mut Vec<u8>) {
        if self.due.take_if(|due| *due <= now).is_some() {
            out.extend_from_slice(b"230.125;9.5625;2200.5\n");
        }
    }
    fn due(&self) -> Option<Moment> {
        self.due
    }
}

struct Deaf;

impl Tap for Deaf {
    fn sent(&mut self, _: &str, _: Moment, _: &[u8]) {}
    fn received(&mut self, _: &str, _: Moment, _: &[u8]) {}
}

/// Three lines at 10 Hz, with and without latency: tens of thousands of simulated
/// seconds to a wall second on an idle machine, here far below what that gives.
#[test]
fn three_lines_at_ten_hertz_run_a_thousand_times_faster_than_the_wall() {
    for latency_us in [0, 5_000] {
        paused().block_on(async {
            let began = std::time::Instant::now();
            let clock = Clock::simulated();
            let (ears, mut samples) = Listening::default().ears();
            let mut lines = Vec::new();
            for _ in 0..3 {
                let far = Quick {
                    due: None,
                    latency_us,
                };
                let ears = Ears {
                    tap: Box::new(Deaf),
                    witness: Box::new(Listening::default()),
                    samples: ears.samples.clone(),
                };
                let line = simulated_line(setup(), Box::new(far), clock.clone(), ears);
                line.poll(vec![poll(1, 0.1)]);
                lines.push(line);
            }
            for _ in 0..90_000 {
                assert!(samples.recv().await.unwrap().result.is_ok());
            }
            let rate = clock.now().as_secs_f64() / began.elapsed().as_secs_f64();
            assert!(rate > 1000.0, "{rate}");
        });
    }
}
