//! Line threads over real pseudo-terminals.

use std::io::{Read, Write};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::thread::JoinHandle;
use std::time::{Duration, Instant};

use serialport::{SerialPort, TTYPort};
use tokio::sync::mpsc::UnboundedReceiver;

use super::scripted::{Listening, Manners, Scripted, setup};
use crate::bench::{Ears, Fault, LineHandle, LineSetup, OpenError, Poll, Polled, Tap, serial_line};
use crate::clock::Clock;
use crate::quantity::{Moment, Reading, Seconds};
use crate::spec::bench::{Parity, Port, SerialSettings};

/// A scripted instrument on the far end of a pseudo-terminal.
struct Terminal {
    path: String,
    far: Scripted,
    stop: Arc<AtomicBool>,
    thread: Option<JoinHandle<()>>,
    /// Held open, so that the terminal outlives the line's own end of it.
    _near: TTYPort,
}

impl Terminal {
    fn open() -> Self {
        let (mut master, near) = TTYPort::pair().unwrap();
        master.set_timeout(Duration::from_millis(1)).unwrap();
        let path = near.name().unwrap();
        let far = Scripted::default();
        let stop = Arc::new(AtomicBool::new(false));
        let (script, stopped) = (far.clone(), stop.clone());
        let thread = std::thread::spawn(move || answer(master, &script, &stopped));
        Self {
            path,
            far,
            stop,
            thread: Some(thread),
            _near: near,
        }
    }

    /// The far side goes: an adapter that is pulled out.
    fn unplug(&mut self) {
        self.stop.store(true, Ordering::Release);
        if let Some(thread) = self.thread.take() {
            thread.join().unwrap();
        }
    }

    fn line(&self, clock: Clock, ears: Ears) -> LineHandle {
        serial_line(on_port(&self.path), clock, ears).unwrap()
    }

    /// Waits until the far side is in a state; fails the test after a second.
    fn until(&self, what: &str, state: impl Fn(&super::scripted::Script) -> bool) {
        let before = Instant::now();
        while !state(&self.far.lock()) {
            assert!(before.elapsed() < Duration::from_secs(3), "{what}");
            std::thread::sleep(Duration::from_millis(2));
        }
    }
}

impl Drop for Terminal {
    fn drop(&mut self) {
        self.unplug();
    }
}

impl Listening {
    /// Waits until the witness was told of an OFF.
    fn until_off(&self) {
        let before = Instant::now();
        while self.offs.lock().unwrap().is_empty() {
            assert!(before.elapsed() < Duration::from_secs(3));
            std::thread::sleep(Duration::from_millis(1));
        }
    }
}

fn answer(mut master: TTYPort, far: &Scripted, stop: &AtomicBool) {
    let began = Instant::now();
    let mut buffer = [0; 1024];
    let mut out = Vec::new();
    while !stop.load(Ordering::Acquire) {
        let n = master.read(&mut buffer).unwrap_or(0);
        let now = Moment::from_micros(began.elapsed().as_micros() as u64);
        far.lock().receive(&buffer[..n], now);
        far.lock().deliver(now, &mut out);
        if !out.is_empty() && master.write_all(&out).is_ok() {
            out.clear();
        }
    }
}

fn on_port(path: &str) -> LineSetup {
    LineSetup {
        port: Port::Serial(SerialSettings {
            path: path.to_owned(),
            baud: 0,
            data_bits: 8,
            parity: Parity::None,
            stop_bits: 1,
        }),
        ..setup()
    }
}

fn real() -> tokio::runtime::Runtime {
    tokio::runtime::Builder::new_current_thread()
        .enable_time()
        .build()
        .unwrap()
}

fn open(terminal: &Terminal) -> (LineHandle, Listening, UnboundedReceiver<Polled>) {
    let listening = Listening::default();
    let (ears, samples) = listening.ears();
    let line = terminal.line(Clock::real(), ears);
    (line, listening, samples)
}

fn poll(every: f64) -> Vec<Poll> {
    vec![Poll {
        tag: 1,
        instrument: 0,
        query: 0,
        channel: None,
        every: Seconds::of(every),
    }]
}

#[test]
fn a_round_trip_over_a_terminal() {
    let terminal = Terminal::open();
    let (line, ears, mut samples) = open(&terminal);
    real().block_on(async {
        line.identify(0).await.unwrap();
        line.prepare(0).await.unwrap();
        let lease = line.energise(0).await.unwrap();
        assert!(terminal.far.lock().on);
        line.poll(poll(0.01));
        let mut last = None;
        for _ in 0..50 {
            let sample = samples.recv().await.unwrap();
            assert_eq!(sample.result.unwrap().get(Reading::Voltage), Some(230.125));
            assert!(last.is_none_or(|last| sample.request > last));
            last = Some(sample.request);
            lease.renew();
        }
        lease.close("end").await.unwrap();
        assert!(!terminal.far.lock().on);
        line.close().await.unwrap();
    });
    let wire = String::from_utf8(ears.wire.lock().unwrap().clone()).unwrap();
    assert!(
        wire.starts_with("*IDN?\nEXAMPLE,BENCH1,0001,1.0\n*CLS\n"),
        "{wire}"
    );
}

#[test]
fn a_schedule_on_the_wall_clock_does_not_drift() {
    let terminal = Terminal::open();
    let (ears, mut samples) = Listening::default().ears();
    let clock = Clock::real();
    let line = terminal.line(clock.clone(), ears);
    real().block_on(async {
        let origin = clock.now();
        line.poll(poll(0.02));
        let mut late = Vec::new();
        for _ in 0..60 {
            let request = samples.recv().await.unwrap().request;
            late.push(request.micros_since(origin) % 20_000);
        }
        // Some ticks come late on a busy machine, but the grid stands to the end.
        let mut last = late.split_off(30);
        last.sort_unstable();
        assert!(last[10] < 8_000, "{last:?}");
        line.close().await.unwrap();
    });
}

#[test]
fn an_unplugged_adapter_is_a_lost_line() {
    let mut terminal = Terminal::open();
    let (line, ears, mut samples) = open(&terminal);
    real().block_on(async {
        let lease = line.energise(0).await.unwrap();
        line.poll(poll(0.05));
        assert!(samples.recv().await.unwrap().result.is_ok());
        terminal.unplug();
        let error = loop {
            lease.renew();
            if let Err(error) = samples.recv().await.unwrap().result {
                break error;
            }
        };
        assert!(matches!(error.fault, Fault::Lost(_)), "{error}");
        assert!(!lease.is_alive());
        let offs = ears.offs.lock().unwrap().clone();
        assert!(!offs[0].2 && offs[0].1 == "the line was lost");
        let again = line.identify(0).await.unwrap_err();
        assert!(matches!(again.fault, Fault::Lost(_)), "{again}");
        assert!(line.close().await.is_err());
    });
}

#[test]
fn an_idle_supply_that_is_unplugged_ends_its_lease() {
    let mut terminal = Terminal::open();
    let (line, _ears, _samples) = open(&terminal);
    real().block_on(async {
        let lease = line.energise(0).await.unwrap();
        terminal.unplug();
        let before = Instant::now();
        while lease.is_alive() {
            assert!(before.elapsed() < Duration::from_secs(1));
            lease.renew();
            tokio::time::sleep(Duration::from_millis(5)).await;
        }
    });
}

#[test]
fn a_dropped_lease_is_off_within_a_moment_though_the_meter_hangs() {
    let terminal = Terminal::open();
    terminal.far.lock().manners = [Manners::Never].into();
    let (line, ears, _samples) = open(&terminal);
    let lease = real().block_on(line.energise(0)).unwrap();
    line.poll(poll(10.0));
    terminal.until("asked", |far| far.count == 1);
    let before = Instant::now();
    drop(lease);
    terminal.until("off", |far| !far.on);
    assert!(before.elapsed() < Duration::from_millis(400));
    real().block_on(line.close()).unwrap();
    assert!(ears.offs.lock().unwrap()[0].2);
}

#[test]
fn a_lease_that_is_not_renewed_ends_on_the_wall_clock_too() {
    let terminal = Terminal::open();
    let (line, _ears, _samples) = open(&terminal);
    let lease = real().block_on(line.energise(0)).unwrap();
    let before = Instant::now();
    terminal.until("off", |far| !far.on);
    assert!((0.9..2.0).contains(&before.elapsed().as_secs_f64()));
    assert!(!lease.is_alive());
}

#[test]
fn on_a_fast_clock_a_lease_lasts_a_quarter_of_a_second_of_wall_time() {
    let terminal = Terminal::open();
    let listening = Listening::default();
    let (ears, _samples) = listening.ears();
    let line = terminal.line(Clock::scaled(100.0), ears);
    let lease = real().block_on(line.energise(0)).unwrap();
    let before = Instant::now();
    terminal.until("off", |far| !far.on);
    assert!((0.2..0.9).contains(&before.elapsed().as_secs_f64()));
    listening.until_off();
    drop(lease);
    // Replies are waited for in wall time.
    terminal.far.lock().deaf = true;
    let before = Instant::now();
    let polled = real().block_on(line.read(0, 0, None));
    let took = before.elapsed().as_secs_f64();
    assert_eq!(polled.result.unwrap_err().fault, Fault::NoReply);
    assert!((1.4..4.0).contains(&took), "{took}");
}

#[test]
fn the_last_handles_drop_is_off() {
    let terminal = Terminal::open();
    let (line, ears, _samples) = open(&terminal);
    let lease = real().block_on(line.energise(0)).unwrap();
    drop(line);
    terminal.until("off", |far| !far.on);
    ears.until_off();
    assert!(!lease.is_alive());
    let offs = ears.offs.lock().unwrap().clone();
    assert_eq!(offs[0].1, "the line's handle was dropped");
}

/// Panics at its nth message.
struct Torn(u32);

impl Tap for Torn {
    fn sent(&mut self, _: &str, _: Moment, _: &[u8]) {
        self.0 -= 1;
        assert!(self.0 > 0, "meant by the test");
    }
    fn received(&mut self, _: &str, _: Moment, _: &[u8]) {}
}

#[test]
fn a_panic_in_the_thread_is_off_and_a_lost_line() {
    let terminal = Terminal::open();
    let listening = Listening::default();
    let (ears, _samples) = listening.ears();
    let ears = Ears {
        tap: Box::new(Torn(6)),
        ..ears
    };
    let line = terminal.line(Clock::real(), ears);
    real().block_on(async {
        let lease = line.energise(0).await.unwrap();
        assert!(terminal.far.lock().on);
        let mut lost = None;
        for _ in 0..4 {
            if let Err(error) = line.read(0, 0, None).await.result {
                lost = Some(error);
            }
        }
        assert!(matches!(lost.unwrap().fault, Fault::Lost(_)));
        terminal.until("off", |far| !far.on);
        line.close().await.unwrap();
        assert!(!lease.is_alive());
        let offs = listening.offs.lock().unwrap().clone();
        assert_eq!(offs[0].1, "the line's thread panicked");
        assert!(offs[0].2);
    });
}

#[test]
fn a_far_side_that_never_reads_holds_nothing_up() {
    // No thread reads the master: the terminal's buffer fills up.
    let (master, near) = TTYPort::pair().unwrap();
    let mut setup = on_port(&near.name().unwrap());
    let driver = &mut setup.instruments[0].driver;
    driver.framing.reply_within = Seconds::of(0.02);
    driver.framing.tries = 1;
    driver.on_opening = vec!["X".repeat(20_000)];
    let (ears, _samples) = Listening::default().ears();
    let line = serial_line(setup, Clock::real(), ears).unwrap();
    real().block_on(async {
        let before = Instant::now();
        for _ in 0..2 {
            let error = line.prepare(0).await.unwrap_err();
            assert!(matches!(error.fault, Fault::Lost(_)), "{error}");
        }
        let error = line.ensure_off(0, "stop").await.unwrap_err();
        assert!(matches!(error.fault, Fault::Lost(_)), "{error}");
        assert!(
            before.elapsed() < Duration::from_secs(3),
            "{:?}",
            before.elapsed()
        );
        assert!(line.close().await.is_err());
    });
    drop(master);
}

#[test]
fn ports_that_cannot_be_opened_come_with_a_hint() {
    let try_open = |path: &str| {
        let (ears, _samples) = Listening::default().ears();
        serial_line(on_port(path), Clock::real(), ears).unwrap_err()
    };
    let missing = try_open("/dev/rateplate-no-such-port");
    assert!(matches!(missing, OpenError::NotFound { .. }), "{missing}");
    assert!(matches!(try_open("/dev/null"), OpenError::Unusable { .. }));
    assert!(matches!(try_open("/dev"), OpenError::Unusable { .. }));
    assert!(matches!(
        try_open("with\0nul"),
        OpenError::Unusable { .. } | OpenError::NotFound { .. }
    ));

    let terminal = Terminal::open();
    let (_line, _ears, _samples) = open(&terminal);
    let busy = try_open(&terminal.path);
    assert!(matches!(busy, OpenError::Busy { .. }), "{busy}");
}
