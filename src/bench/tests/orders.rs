//! What orders send, confirm and report.

use super::scripted::{Scripted, on_a_line};
use crate::bench::{Change, Fault};
use crate::quantity::{Hertz, Reading, Volts};

fn heard(far: &Scripted) -> Vec<String> {
    far.lock()
        .heard
        .iter()
        .map(|(_, line)| line.clone())
        .collect()
}

#[test]
fn an_instrument_says_who_it_is() {
    on_a_line(Scripted::default(), |bench| async move {
        let identity = bench.line.identify(0).await.unwrap();
        assert_eq!(identity.reply, "EXAMPLE,BENCH1,0001,1.0");
        assert_eq!(identity.virtual_speed, None);
    });
}

#[test]
fn preparing_clears_and_reads_the_error_queue_until_it_is_empty() {
    on_a_line(Scripted::default(), |bench| async move {
        bench.line.prepare(0).await.unwrap();
        assert_eq!(heard(&bench.far), ["*CLS", "SYST:ERR?"]);
        bench.far.lock().errors = ["-350,\"Too many errors\"", "-113,\"Undefined header\""].into();
        let error = bench.line.prepare(0).await.unwrap_err();
        assert!(matches!(error.fault, Fault::Reported { code: -350, .. }));
        assert_eq!(bench.far.lock().times("SYST:ERR?"), 4);
    });
}

#[test]
fn a_change_is_sent_checked_and_read_back() {
    on_a_line(Scripted::default(), |bench| async move {
        let change = Change::Voltage(Volts::of(230.04));
        bench.far.lock().step = 0.1;
        bench.line.change(0, change).await.unwrap();
        assert_eq!(
            heard(&bench.far),
            ["SOUR:VOLT 230.04", "SYST:ERR?", "SOUR:VOLT?"]
        );
        bench.line.change(0, Change::Position(2)).await.unwrap();
        assert_eq!(bench.far.lock().times("ROUT:POS 2"), 1);
    });
}

#[test]
fn a_change_that_is_not_taken_is_an_error() {
    on_a_line(Scripted::default(), |bench| async move {
        bench.far.lock().step = 50.0;
        let change = Change::Voltage(Volts::of(230.0));
        let error = bench.line.change(0, change).await.unwrap_err();
        let (wanted, found) = ("230".to_owned(), "250".to_owned());
        assert_eq!(error.fault, Fault::NotConfirmed { wanted, found });
        let change = Change::Frequency(Hertz::of(50.0));
        let error = bench.line.change(0, change).await.unwrap_err();
        assert_eq!(
            error.to_string(),
            "example on line L1 (virtual): not possible: driver example sets no frequency"
        );
    });
}

#[test]
fn a_channel_is_filled_in() {
    on_a_line(Scripted::default(), |bench| async move {
        let polled = bench.line.read(0, 1, Some(3)).await;
        assert_eq!(polled.result.unwrap().get(Reading::Temperature), Some(23.5));
        assert_eq!(heard(&bench.far), ["MEAS:TEMP? (@3)"]);
        let polled = bench.line.read(0, 1, None).await;
        assert!(matches!(
            polled.result.unwrap_err().fault,
            Fault::Refused(_)
        ));
        let polled = bench.line.read(0, 9, None).await;
        assert!(matches!(
            polled.result.unwrap_err().fault,
            Fault::Refused(_)
        ));
        let polled = bench.line.read(7, 0, None).await;
        assert!(matches!(
            polled.result.unwrap_err().fault,
            Fault::Refused(_)
        ));
    });
}

#[test]
fn another_instrument_is_recognised() {
    use super::scripted::{Listening, paused, setup};
    use crate::bench::simulated_line;
    use crate::clock::Clock;

    paused().block_on(async {
        let mut setup = setup();
        setup.instruments[0].identity = "EXAMPLE,BENCH2".into();
        let (ears, _samples) = Listening::default().ears();
        let far = Box::new(Scripted::default());
        let line = simulated_line(setup, far, Clock::simulated(), ears);
        let error = line.identify(0).await.unwrap_err();
        assert_eq!(
            error.to_string(),
            "example on line L1 (virtual): wrong identity: expected a reply that starts with \
             `EXAMPLE,BENCH2` (sent \"*IDN?\\n\", received \"EXAMPLE,BENCH1,0001,1.0\", \
             waited 0 s, 1 try)"
        );
    });
}
