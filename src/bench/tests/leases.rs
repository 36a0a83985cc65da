//! The unit is energised only while a lease lives.

use std::time::Duration;

use super::scripted::{Bench, Manners, Scripted, on_a_line};
use crate::bench::{Fault, Poll};
use crate::quantity::Seconds;

async fn wait(seconds: f64) {
    tokio::time::sleep(Duration::from_secs_f64(seconds)).await;
}

fn slow_poll() -> Vec<Poll> {
    vec![Poll {
        tag: 1,
        instrument: 0,
        query: 0,
        channel: None,
        every: Seconds::of(5.0),
    }]
}

/// The moments of ON and of the first OFF, in seconds.
fn on_and_off(bench: &Bench) -> (f64, f64) {
    let far = bench.far.lock();
    let at = |line: &str| {
        let heard = far.heard.iter().find(|(_, l)| l == line);
        heard
            .unwrap_or_else(|| panic!("{line} was not heard"))
            .0
            .as_secs_f64()
    };
    (at("OUTP ON"), at("OUTP OFF"))
}

#[test]
fn a_renewed_lease_keeps_the_output_on_and_its_close_proves_off() {
    on_a_line(Scripted::default(), |bench| async move {
        let lease = bench.line.energise(0).await.unwrap();
        for _ in 0..100 {
            wait(0.5).await;
            lease.renew();
        }
        assert!(lease.is_alive() && bench.far.lock().on);
        assert_eq!(bench.far.lock().times("OUTP OFF"), 0);
        let off = lease.close("end of step").await.unwrap();
        assert_eq!(off.at(), bench.clock.now());
        assert!(!bench.far.lock().on);
        let offs = bench.ears.offs.lock().unwrap().clone();
        assert_eq!(offs, [(off.at(), "end of step".to_owned(), true)]);
    });
}

#[test]
fn a_lease_that_is_not_renewed_is_over_after_one_second() {
    on_a_line(Scripted::default(), |bench| async move {
        let lease = bench.line.energise(0).await.unwrap();
        wait(0.9).await;
        assert!(lease.is_alive());
        wait(0.2).await;
        assert!(!lease.is_alive() && !bench.far.lock().on);
        let (on, off) = on_and_off(&bench);
        assert!((1.0..1.003).contains(&(off - on)), "{on} to {off}");
        let offs = bench.ears.offs.lock().unwrap().clone();
        assert_eq!(offs[0].1, "the lease was not renewed for 1 s");
        assert!(offs[0].2 && offs.len() == 1);
        drop(lease);
        wait(5.0).await;
        assert_eq!(bench.far.lock().times("OUTP OFF"), 1);
    });
}

#[test]
fn a_dropped_lease_switches_off_at_once_even_while_an_exchange_hangs() {
    let far = Scripted::default().with(&[Manners::Never]);
    on_a_line(far, |bench| async move {
        let lease = bench.line.energise(0).await.unwrap();
        bench.line.poll(slow_poll());
        wait(0.1).await;
        assert_eq!(bench.far.lock().times("MEAS:VOLT?;CURR?;POW?"), 1);
        let dropped = bench.clock.now();
        drop(lease);
        wait(0.001).await;
        assert!(!bench.far.lock().on);
        let offs = bench.ears.offs.lock().unwrap().clone();
        assert_eq!(offs, [(dropped, "the lease was dropped".to_owned(), true)]);
    });
}

#[test]
fn a_dropped_task_switches_off() {
    on_a_line(Scripted::default(), |bench| async move {
        let line = bench.line.clone();
        let task = tokio::spawn(async move {
            let lease = line.energise(0).await.unwrap();
            loop {
                wait(0.2).await;
                lease.renew();
            }
        });
        wait(10.0).await;
        assert!(bench.far.lock().on);
        task.abort();
        wait(0.002).await;
        assert!(!bench.far.lock().on);
    });
}

#[test]
fn a_panic_in_the_bays_task_switches_off() {
    on_a_line(Scripted::default(), |bench| async move {
        let line = bench.line.clone();
        let task = tokio::spawn(async move {
            let _lease = line.energise(0).await.unwrap();
            wait(0.5).await;
            panic!("meant by the test");
        });
        assert!(task.await.is_err());
        wait(0.002).await;
        assert!(!bench.far.lock().on);
    });
}

#[test]
fn the_last_handles_drop_switches_off_and_ends_the_line() {
    on_a_line(Scripted::default(), |bench| async move {
        let lease = bench.line.energise(0).await.unwrap();
        let second = bench.line.clone();
        drop(bench.line);
        wait(0.01).await;
        assert!(bench.far.lock().on && lease.is_alive());
        drop(second);
        wait(0.01).await;
        assert!(!bench.far.lock().on && !lease.is_alive());
        let error = lease.close("end").await.unwrap_err();
        assert_eq!(error.fault, Fault::Lost("the line has ended".into()));
    });
}

#[test]
fn closing_the_line_switches_off() {
    on_a_line(Scripted::default(), |bench| async move {
        let lease = bench.line.energise(0).await.unwrap();
        let other = bench.line.clone();
        bench.line.close().await.unwrap();
        assert!(!bench.far.lock().on && !lease.is_alive());
        assert!(matches!(
            other.prepare(0).await.unwrap_err().fault,
            Fault::Lost(_)
        ));
        other.close().await.unwrap();
    });
}

#[test]
fn a_runtime_that_goes_still_says_off() {
    let far = Scripted::default();
    on_a_line(far.clone(), |bench| async move {
        let lease = bench.line.energise(0).await.unwrap();
        std::mem::forget((lease, bench.line));
    });
    assert!(!far.lock().on);
}

#[test]
fn an_output_that_stays_on_is_not_confirmed() {
    on_a_line(Scripted::default(), |bench| async move {
        let lease = bench.line.energise(0).await.unwrap();
        bench.far.lock().stuck = true;
        let error = lease.close("end").await.unwrap_err();
        let wanted = Fault::NotConfirmed {
            wanted: "off".into(),
            found: "on".into(),
        };
        assert_eq!(error.fault, wanted);
        assert_eq!(bench.far.lock().times("OUTP OFF"), 3);
        assert!(!bench.ears.offs.lock().unwrap()[0].2);
        assert!(bench.line.clone().close().await.is_err());
        // Afterwards, too.
        assert!(bench.line.close().await.is_err());
    });
}

#[test]
fn a_hung_supply_is_told_off_three_times_within_two_seconds() {
    on_a_line(Scripted::default(), |bench| async move {
        let lease = bench.line.energise(0).await.unwrap();
        bench.far.lock().mute = true;
        let before = bench.clock.now();
        let error = lease.close("end").await.unwrap_err();
        assert_eq!(error.fault, Fault::NoReply);
        assert!(bench.clock.now().since(before) <= Seconds::of(2.0));
        let far = bench.far.lock();
        assert_eq!(far.times("OUTP OFF"), 3);
        assert!(!far.on);
    });
}

#[test]
fn energising_that_fails_switches_off_before_it_says_so() {
    on_a_line(Scripted::default(), |bench| async move {
        bench.far.lock().errors = ["-200,\"Execution error\"", "-113,\"Undefined header\""].into();
        let error = bench.line.energise(0).await.unwrap_err();
        let reported = Fault::Reported {
            code: -200,
            text: "Execution error".into(),
        };
        assert_eq!(error.fault, reported);
        assert!(!bench.far.lock().on);
        assert_eq!(bench.far.lock().times("OUTP OFF"), 1);
        // The queue was emptied: the next time works.
        let lease = bench.line.energise(0).await.unwrap();
        assert!(lease.is_alive());
    });
}

#[test]
fn energising_is_refused_while_a_lease_lives() {
    on_a_line(Scripted::default(), |bench| async move {
        let (first, second) = tokio::join!(bench.line.energise(0), bench.line.energise(0));
        assert!(first.unwrap().is_alive());
        assert!(matches!(second.unwrap_err().fault, Fault::Refused(_)));
    });
}

#[test]
fn an_output_that_does_not_come_on_is_an_error_and_off() {
    on_a_line(Scripted::default(), |bench| async move {
        bench.far.lock().dead = true;
        let error = bench.line.energise(0).await.unwrap_err();
        assert!(matches!(error.fault, Fault::NotConfirmed { .. }));
        assert_eq!(bench.far.lock().times("OUTP OFF"), 1);
    });
}

#[test]
fn off_cuts_in_on_energising() {
    on_a_line(Scripted::default(), |bench| async move {
        bench.far.lock().latency_us = 50_000;
        let (energised, off) = tokio::join!(bench.line.energise(0), async {
            wait(0.02).await;
            bench.line.ensure_off(0, "stop").await
        });
        assert!(matches!(energised.unwrap_err().fault, Fault::Refused(_)));
        off.unwrap();
        assert!(!bench.far.lock().on);
        assert_eq!(bench.far.lock().times("OUTP ON"), 1);
    });
}

#[test]
fn nobody_waiting_for_the_lease_any_more_means_off() {
    on_a_line(Scripted::default(), |bench| async move {
        bench.far.lock().latency_us = 50_000;
        let energising = tokio::time::timeout(Duration::from_millis(20), bench.line.energise(0));
        assert!(energising.await.is_err());
        wait(0.3).await;
        assert!(!bench.far.lock().on);
        assert_eq!(bench.far.lock().times("OUTP ON"), 1);
        assert!(bench.far.lock().times("OUTP OFF") >= 1);
    });
}

#[test]
fn a_panic_in_the_pump_switches_off_and_ends_the_line() {
    use crate::bench::{Ears, Tap, simulated_line};
    use crate::clock::Clock;
    use crate::quantity::Moment;

    struct Torn(u32);
    impl Tap for Torn {
        fn sent(&mut self, _: &str, _: Moment, _: &[u8]) {
            self.0 += 1;
            assert!(self.0 < 5, "meant by the test");
        }
        fn received(&mut self, _: &str, _: Moment, _: &[u8]) {}
    }

    super::scripted::paused().block_on(async {
        let (far, ears) = (Scripted::default(), super::scripted::Listening::default());
        let (heard, _samples) = ears.ears();
        let heard = Ears {
            tap: Box::new(Torn(0)),
            ..heard
        };
        let clock = Clock::simulated();
        let setup = super::scripted::setup();
        let line = simulated_line(setup, Box::new(far.clone()), clock, heard);
        let lease = line.energise(0).await.unwrap();
        assert!(far.lock().on);
        for _ in 0..3 {
            let _ = line.read(0, 0, None).await;
        }
        assert!(!far.lock().on && !lease.is_alive());
        assert!(ears.offs.lock().unwrap()[0].2);
        line.close().await.unwrap();
    });
}
