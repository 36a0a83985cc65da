//! The line thread: one per serial port. It sleeps on an absolute schedule of its
//! own, is woken by orders, and looks every 20 ms at whether a lease was dropped.

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::mpsc::{Receiver, RecvTimeoutError, TryRecvError, channel};
use std::sync::{Arc, Mutex};
use std::time::Duration;

use super::error::OpenError;
use super::handle::{Door, Facts, LineHandle};
use super::line::Line;
use super::order::Message;
use super::serial::{CALL, Gone, Wire, open};
use super::setup::{Ears, LineSetup, Tap};
use crate::clock::Clock;
use crate::spec::bench::Port;

/// How long a message may take to be written, in wall time.
const WRITE_WITHIN: Duration = Duration::from_millis(250);
/// The same for the last OFF of a thread that panicked.
const LAST_WRITE_WITHIN: Duration = Duration::from_millis(100);
/// Reads before a request at most: an instrument that never stops must not hold OFF up.
const STALE_READS: usize = 4;
/// Longest sleep of a line that keeps nothing energised.
const REST: Duration = Duration::from_millis(500);

/// Opens a serial line, driven by a thread of its own.
///
/// # Errors
/// Where the port is not there, not permitted, busy or not usable; a virtual line is
/// not usable here.
pub fn serial_line(setup: LineSetup, clock: Clock, ears: Ears) -> Result<LineHandle, OpenError> {
    let settings = match &setup.port {
        Port::Serial(settings) => settings.clone(),
        Port::Virtual => return Err(unusable(&setup, "the line is a virtual one")),
    };
    let wire = open(&setup.name, &settings)?;
    let (messages, inbox) = channel();
    let door = Arc::new(Door::Thread {
        messages,
        thread: Mutex::new(None),
    });
    let facts = Facts::of(&setup);
    // A thread's name holds no NUL, and a bench file may.
    let name = format!("line {}", setup.name.replace('\0', " "));
    let trouble = unusable(&setup, "its thread could not be started");
    let line = Line::new(
        setup,
        facts.clone(),
        clock.clone(),
        Arc::downgrade(&door),
        ears.witness,
        ears.samples,
    );
    let pump = Pump {
        line,
        wire,
        clock: clock.clone(),
        tap: Some(ears.tap),
        messages: inbox,
    };
    let thread = std::thread::Builder::new()
        .name(name)
        .spawn(move || pump.run())
        .map_err(|_| trouble)?;
    if let Door::Thread { thread: slot, .. } = &*door
        && let Ok(mut slot) = slot.lock()
    {
        *slot = Some(thread);
    }
    Ok(LineHandle::new(door, facts, clock))
}

fn unusable(setup: &LineSetup, why: &str) -> OpenError {
    OpenError::Unusable {
        line: setup.name.clone(),
        path: setup.port_name().to_owned(),
        why: why.to_owned(),
    }
}

struct Pump {
    line: Line,
    wire: Wire,
    clock: Clock,
    /// Absent after a panic: it may have been its cause.
    tap: Option<Box<dyn Tap>>,
    messages: Receiver<Message>,
}

impl Pump {
    fn run(mut self) {
        tracing::debug!(line = self.line.name(), "line opened");
        if catch_unwind(AssertUnwindSafe(|| self.until_ended())).is_err() {
            self.after_panic();
        }
        tracing::debug!(line = self.line.name(), "line ended");
        self.line.say_ended();
    }

    /// OFF at once and without anything that may have caused the panic; then once
    /// more with reading back.
    fn after_panic(&mut self) {
        tracing::error!(line = self.line.name(), "the line's thread panicked");
        for off in self.line.last_words() {
            let _ = self.wire.write(&off, LAST_WRITE_WITHIN);
        }
        self.tap = None;
        let _ = catch_unwind(AssertUnwindSafe(|| {
            let now = self.clock.now();
            self.line.abandon("the line's thread panicked", now);
            self.until_ended();
        }));
    }

    fn until_ended(&mut self) {
        while !self.line.is_ended() {
            if let Err(Gone(why)) = self.turn() {
                tracing::debug!(line = self.line.name(), why, "line lost");
                self.line.lose(&why, self.clock.now());
            }
        }
    }

    /// One round: messages, what has to be written, and then either reading or rest.
    fn turn(&mut self) -> Result<(), Gone> {
        self.take_messages();
        while self.line.step(self.clock.now()) {
            self.read_stale()?;
            // What was read may have changed what has to be sent.
            if self.line.step(self.clock.now()) {
                self.write()?;
            }
        }
        if self.line.is_ended() {
            return Ok(());
        }
        if self.line.is_listening() {
            return self.listen();
        }
        self.rest()
    }

    fn take_messages(&mut self) {
        loop {
            match self.messages.try_recv() {
                Ok(message) => self.line.take(message, self.clock.now()),
                Err(TryRecvError::Empty) => return,
                Err(TryRecvError::Disconnected) => return self.close(),
            }
        }
    }

    fn close(&mut self) {
        let now = self.clock.now();
        self.line.close("the line's handle was dropped", now);
    }

    fn write(&mut self) -> Result<(), Gone> {
        let at = self.clock.now();
        if let Some(tap) = &mut self.tap {
            tap.sent(self.line.name(), at, self.line.outbox());
        }
        let whole = self.wire.write(self.line.outbox(), WRITE_WITHIN)?;
        self.line.written(whole, self.clock.now());
        Ok(())
    }

    /// Bytes that came while nothing was asked are no reply to what is asked next.
    fn read_stale(&mut self) -> Result<(), Gone> {
        for _ in 0..STALE_READS {
            if !self.wire.has_bytes()? || self.read()? == 0 {
                break;
            }
        }
        Ok(())
    }

    /// Waits for a reply, but no longer than until the next thing that is due.
    fn listen(&mut self) -> Result<(), Gone> {
        let due = self.line.wake_at().map(|at| self.clock.wall_until(at));
        if due.is_some_and(|wait| wait < CALL) && !self.wire.has_bytes()? {
            // The port's own wait has one length: sleep in front of a shorter one.
            let wait = due.unwrap_or(CALL).min(Duration::from_millis(1));
            std::thread::sleep(wait);
            return Ok(());
        }
        self.read().map(drop)
    }

    fn read(&mut self) -> Result<usize, Gone> {
        let mut buffer = [0; 4096];
        let n = self.wire.read(&mut buffer)?;
        if n > 0 {
            let now = self.clock.now();
            if let Some(tap) = &mut self.tap {
                tap.received(self.line.name(), now, &buffer[..n]);
            }
            self.line.feed(&buffer[..n], now);
        }
        Ok(n)
    }

    /// Nothing is asked: sleeps until the next poll, a message, or the next look at the leases.
    fn rest(&mut self) -> Result<(), Gone> {
        let energised = self.line.is_energised();
        let longest = if energised { CALL } else { REST };
        let due = self.line.wake_at().map(|at| self.clock.wall_until(at));
        match self
            .messages
            .recv_timeout(due.unwrap_or(longest).min(longest))
        {
            Ok(message) => self.line.take(message, self.clock.now()),
            Err(RecvTimeoutError::Timeout) => {}
            Err(RecvTimeoutError::Disconnected) => self.close(),
        }
        // An unplugged supply is to be known at once, not at the next order.
        if energised && self.wire.has_bytes()? {
            self.read()?;
        }
        Ok(())
    }
}
