//! Replies that are late, garbled, doubled, cut off or without end.

use super::scripted::{Manners, Scripted, on_a_line};
use crate::bench::{Fault, LineHandle};
use crate::quantity::{Reading, Seconds};

/// The number of the query that a reply belongs to.
async fn number(line: &LineHandle) -> f64 {
    let polled = line.read(0, 0, None).await;
    polled.result.unwrap().get(Reading::Power).unwrap()
}

async fn fault(line: &LineHandle) -> Fault {
    line.read(0, 0, None)
        .await
        .result
        .unwrap_err()
        .fault
        .clone()
}

#[test]
fn a_late_reply_never_reaches_the_next_asker() {
    for late in [0.6, 0.9, 1.2, 1.45, 2.0, 7.0] {
        let far = Scripted::default().with(&[Manners::Late(late)]);
        on_a_line(far, |bench| async move {
            // The far side counts its queries, and each reply carries its count.
            let mut asked = 0;
            for _ in 0..20 {
                let polled = bench.line.read(0, 0, None).await;
                let count = bench.far.lock().count;
                if let Ok(readings) = polled.result {
                    assert_eq!(readings.get(Reading::Power), Some(count as f64), "{late}");
                    asked += 1;
                }
            }
            assert!(asked >= 10, "{late}: {asked}");
        });
    }
}

#[test]
fn a_garbled_reply_is_asked_again() {
    for garbled in [
        "2x0.1;1;1\n",
        "230.125;9.5\n",
        ";;\n",
        "\u{fffd};1;1\n",
        "1;2;inf\n",
        "nan;1;2\n",
    ] {
        let far = Scripted::default().with(&[Manners::Text(garbled)]);
        on_a_line(far, |bench| async move {
            assert_eq!(number(&bench.line).await, 2.0);
        });
        let far = Scripted::default().with(&[
            Manners::Text(garbled),
            Manners::Text(garbled),
            Manners::Text(garbled),
        ]);
        on_a_line(far, |bench| async move {
            assert!(matches!(fault(&bench.line).await, Fault::Garbled(_)));
            assert_eq!(number(&bench.line).await, 4.0);
        });
    }
}

#[test]
fn a_reply_without_its_end_is_garbled_in_time() {
    let cut = Manners::Text("230.1;9.5");
    let far = Scripted::default().with(&[cut.clone(), cut.clone(), cut]);
    on_a_line(far, |bench| async move {
        let before = bench.clock.now();
        assert!(matches!(fault(&bench.line).await, Fault::Garbled(_)));
        assert!(bench.clock.now().since(before) <= Seconds::of(3.0));
        assert_eq!(number(&bench.line).await, 4.0);
    });
}

#[test]
fn a_doubled_reply_is_taken_once() {
    let far = Scripted::default().with(&[Manners::Twice, Manners::Twice]);
    on_a_line(far, |bench| async move {
        for k in 1..5 {
            assert_eq!(number(&bench.line).await, f64::from(k));
        }
    });
}

#[test]
fn an_echo_is_no_reply() {
    let far = Scripted::default().with(&[Manners::Echo]);
    on_a_line(far, |bench| async move {
        assert_eq!(number(&bench.line).await, 1.0);
        assert_eq!(number(&bench.line).await, 2.0);
        assert_eq!(bench.far.lock().times("*IDN?"), 0);
    });
}

#[test]
fn sentinels_are_never_readings() {
    // 9.9E37, -9.9E37 and 9.91E37: SCPI-1999 as restatements give it.
    for (text, expected) in [
        ("230;9.9E+37;1\n", Fault::Overload),
        ("230;-9.9E+37;1\n", Fault::Overload),
        ("230;9.91E+37;1\n", Fault::NoValue),
        ("9.91E+37;9.9E+37;1\n", Fault::NoValue),
    ] {
        let far = Scripted::default().with(&[Manners::Text(text)]);
        on_a_line(far, |bench| async move {
            assert_eq!(fault(&bench.line).await, expected, "{text}");
            // It was a proper reply: neither asked again nor synchronised after.
            assert_eq!(number(&bench.line).await, 2.0);
            assert_eq!(bench.far.lock().times("*IDN?"), 0);
        });
    }
}

#[test]
fn a_mebibyte_without_end_is_garbled_and_passes() {
    let far = Scripted::default().with(&[Manners::Flood(1 << 20)]);
    on_a_line(far, |bench| async move {
        // The flood swallows the first identity reply, the second is understood.
        assert_eq!(number(&bench.line).await, 2.0);
        assert_eq!(number(&bench.line).await, 3.0);
    });
    let flood = Manners::Flood(1 << 20);
    let far = Scripted::default().with(&[flood.clone(), flood.clone(), flood]);
    on_a_line(far, |bench| async move {
        for _ in 0..2 {
            let before = bench.clock.now();
            let error = bench.line.read(0, 0, None).await.result.unwrap_err();
            assert!(error.received.len() < 300);
            assert!(bench.clock.now().since(before) <= Seconds::of(2.0));
        }
        assert_eq!(number(&bench.line).await, 4.0);
    });
}

#[test]
fn no_reply_says_what_was_sent_and_how_long_was_waited() {
    let far = Scripted::default();
    on_a_line(far, |bench| async move {
        bench.far.lock().deaf = true;
        let error = bench.line.read(0, 0, None).await.result.unwrap_err();
        assert_eq!(
            error.to_string(),
            "example on line L1 (virtual): no reply (sent \"MEAS:VOLT?;CURR?;POW?\\n\", \
             received \"\", waited 1.5 s, 3 tries)"
        );
    });
}
