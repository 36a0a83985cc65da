//! Blocks that come in pieces, broken off, too long, or not at all.

use super::scripted::{Scripted, on_a_line};
use crate::bench::{ExchangeError, Fault, Poll};
use crate::quantity::{Reading, Seconds, Waveform};

/// Pairs whose bytes hold line ends, `;`, `,` and `#`: 0x0a 0x3b 0x2c 0x23.
fn pairs() -> (Vec<f64>, Vec<f64>) {
    let odd = f32::from_le_bytes([0x0a, 0x0d, 0x0a, 0x41]);
    let other = f32::from_le_bytes([0x23, 0x3b, 0x2c, 0x40]);
    let volts = (0..200).map(|n| f64::from(if n % 2 == 0 { odd } else { 325.0 }));
    let amps = (0..200).map(|n| f64::from(if n % 3 == 0 { other } else { -0.5 }));
    (volts.collect(), amps.collect())
}

/// A good block with its head and end.
fn block() -> Vec<u8> {
    let (volts, amps) = pairs();
    let mut bytes = b"#41600".to_vec();
    for (v, i) in volts.iter().zip(&amps) {
        bytes.extend_from_slice(&(*v as f32).to_le_bytes());
        bytes.extend_from_slice(&(*i as f32).to_le_bytes());
    }
    bytes.push(b'\n');
    bytes
}

/// The block cut into pieces of `size`, `apart` seconds from each other.
fn cut(bytes: &[u8], size: usize, apart: f64) -> Vec<(f64, Vec<u8>)> {
    let pieces = bytes.chunks(size).enumerate();
    pieces
        .map(|(n, piece)| (n as f64 * apart, piece.to_vec()))
        .collect()
}

/// What fetching gives, and what the next five readings of the same line give.
fn fetched(far: Scripted) -> Result<Waveform, ExchangeError> {
    let (sender, result) = std::sync::mpsc::channel();
    on_a_line(far, |bench| async move {
        let wave = bench.line.waveform(0, Seconds::of(60.0)).await;
        for _ in 0..5 {
            let polled = bench.line.read(0, 0, None).await;
            let count = bench.far.lock().count as f64;
            let power = polled.result.unwrap().get(Reading::Power);
            assert_eq!(power, Some(count), "the line is out of step");
        }
        sender.send(wave).unwrap();
    });
    result.recv().unwrap()
}

fn of_pieces(pieces: Vec<(f64, Vec<u8>)>) -> Result<Waveform, ExchangeError> {
    let far = Scripted::default();
    far.lock().pieces = pieces;
    fetched(far)
}

fn garbled(pieces: Vec<(f64, Vec<u8>)>) -> String {
    match of_pieces(pieces).unwrap_err().fault.clone() {
        Fault::Garbled(why) => why,
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_block_comes_whole_in_any_pieces() {
    let wanted = Waveform::new(200.0, pairs().0, pairs().1).unwrap();
    for (size, apart) in [(1, 0.001), (7, 0.01), (500, 1.0), (10_000, 0.0)] {
        let wave = of_pieces(cut(&block(), size, apart)).unwrap();
        assert_eq!(wave, wanted, "pieces of {size}");
    }
    // What an adapter echoes in front of it is no part of it.
    let echoed = [b"WAV:DATA?\n".as_slice(), &block()].concat();
    assert_eq!(of_pieces(cut(&echoed, 13, 0.01)).unwrap(), wanted);
}

#[test]
fn a_block_that_breaks_off_is_garbled_and_the_line_goes_on() {
    let whole = block();
    for size in [1, 3, 6, 100, whole.len() - 1] {
        let why = garbled(cut(&whole[..size], 4000, 0.0));
        let told = why.contains("broke off") || why.contains("no line end");
        assert!(told, "{size}: {why}");
    }
    // The rest comes when nobody waits for it any more.
    let late = vec![(0.0, whole[..300].to_vec()), (5.2, whole[300..].to_vec())];
    assert!(garbled(late).contains("294 of 1600 bytes"));
}

#[test]
fn a_block_of_another_length_than_it_says_is_garbled() {
    let mut longer = block();
    longer.pop();
    longer.extend_from_slice(b"0123\n");
    assert!(garbled(cut(&longer, 4000, 0.0)).contains("more bytes than"));
    assert!(garbled(vec![(0.0, b"#10\n".to_vec())]).contains("no samples"));
    assert!(garbled(vec![(0.0, b"#14abcd\n".to_vec())]).contains("pairs"));
    assert!(garbled(vec![(0.0, b"#0abcdefg\n".to_vec())]).contains("indefinite"));
    assert!(garbled(vec![(0.0, b"#899999999".to_vec())]).contains("at most 8388608"));
    assert!(
        garbled(vec![(0.0, b"\x80\x81\x82\x83\x84\x85\x86\x87\n".to_vec())]).contains("no number")
    );
    assert!(garbled(vec![(0.0, b"12\n".to_vec())]).contains("block was asked for"));
}

#[test]
fn silence_and_sentinels_are_told() {
    let fault = |pieces| of_pieces(pieces).unwrap_err().fault.clone();
    assert_eq!(fault(Vec::new()), Fault::NoReply);
    assert_eq!(fault(vec![(0.0, b"9.91E37\n".to_vec())]), Fault::NoValue);
    let far = Scripted::default();
    far.lock().pieces = cut(&block(), 4000, 0.0);
    far.lock().interval = "0";
    assert!(matches!(
        fetched(far).unwrap_err().fault.clone(),
        Fault::Garbled(why) if why.contains("no positive time")
    ));
}

#[test]
fn an_acquisition_is_waited_for_and_given_up() {
    let far = Scripted::default();
    far.lock().pieces = cut(&block(), 4000, 0.0);
    far.lock().ready = ["0", "0"].into();
    assert!(fetched(far).is_ok());
    let far = Scripted::default();
    far.lock().pieces = cut(&block(), 4000, 0.0);
    far.lock().ready = ["0", "0", "0", "0"].into();
    let fault = fetched(far).unwrap_err().fault.clone();
    assert!(matches!(fault, Fault::NotConfirmed { .. }), "{fault:?}");
}

#[test]
fn a_block_takes_no_more_time_than_the_guard_leaves() {
    let far = Scripted::default();
    far.lock().pieces = vec![(0.0, block()[..20].to_vec())];
    on_a_line(far, |bench| async move {
        let before = bench.clock.now();
        let at_most = Seconds::of(1.4);
        assert!(bench.line.waveform(0, at_most).await.is_err());
        assert!(bench.clock.now().since(before).get() < 1.45);
    });
}

#[test]
fn arming_reports_what_the_instrument_says_of_it() {
    on_a_line(Scripted::default(), |bench| async move {
        bench.line.arm(0).await.unwrap();
        assert_eq!(bench.far.lock().times("WAV:ARM"), 1);
        bench
            .far
            .lock()
            .errors
            .push_back("-221,\"Settings conflict\"");
        let fault = bench.line.arm(0).await.unwrap_err().fault.clone();
        assert!(matches!(fault, Fault::Reported { code: -221, .. }));
    });
}

#[test]
fn off_is_sent_into_the_midst_of_a_block() {
    let far = Scripted::default();
    far.lock().pieces = cut(&block(), 16, 0.045);
    on_a_line(far, |mut bench| async move {
        let lease = bench.line.energise(0).await.unwrap();
        bench.line.poll(vec![Poll {
            tag: 1,
            instrument: 0,
            query: 0,
            channel: None,
            every: Seconds::of(0.5),
        }]);
        let line = bench.line.clone();
        let fetching = tokio::spawn(async move { line.waveform(0, Seconds::of(60.0)).await });
        tokio::time::sleep(std::time::Duration::from_millis(900)).await;
        lease.renew();
        let before = bench.clock.now();
        // The rest of the block stands before the read-back: `check` refuses such a line.
        let _ = lease.close("as planned").await;
        let heard = bench.far.lock().heard.clone();
        let off = heard.iter().find(|(_, line)| line == "OUTP OFF").unwrap();
        assert!(off.0.since(before).get() < 0.05, "{:?}", off.0);
        assert!(fetching.await.unwrap().is_err());
        while bench.samples.try_recv().is_ok() {}
    });
}
