//! The virtual bench on pseudo-terminals, in real or scaled time, so that any
//! serial program can talk to it.
//!
//! One thread per line. Each keeps the other end of its terminal open too:
//! without that, the terminal hangs up between two clients, and bytes that arrive
//! with the hang-up could be lost.

use std::io;
use std::os::fd::OwnedFd;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::thread::JoinHandle;
use std::time::Duration;

use rustix::event::{PollFd, PollFlags, Timespec, poll};
use rustix::fs::{Mode, OFlags};
use rustix::io::Errno;
use rustix::pty::{OpenptFlags, grantpt, openpt, ptsname, unlockpt};
use rustix::termios::{OptionalActions, tcgetattr, tcsetattr};

use super::VirtualBench;
use crate::bench::FarSide;
use crate::clock::Clock;

/// Longest wait between two looks at the stop flag.
const LOOK: Duration = Duration::from_millis(20);
/// Most that waits to be written to a client that does not read.
const UNREAD: usize = 65_536;

/// Lines that stand on pseudo-terminals; stopped when dropped.
#[derive(Debug)]
pub struct Staged {
    /// Each line's name and the path of its terminal.
    pub ports: Vec<(String, String)>,
    stop: Arc<AtomicBool>,
    threads: Vec<JoinHandle<()>>,
}

/// Puts each of `lines` on a pseudo-terminal of its own, in the time of `clock`.
///
/// # Errors
/// Where the system has no pseudo-terminal or thread to give.
pub fn stage(bench: &VirtualBench, lines: &[String], clock: Clock) -> io::Result<Staged> {
    let mut staged = Staged {
        ports: Vec::new(),
        stop: Arc::new(AtomicBool::new(false)),
        threads: Vec::new(),
    };
    for line in lines {
        let terminal = Terminal::open()?;
        let path = terminal.path.clone();
        let mut pump = Pump {
            terminal,
            far: bench.far_side(line),
            clock: clock.clone(),
            output: Vec::new(),
        };
        let stop = Arc::clone(&staged.stop);
        let thread = std::thread::Builder::new()
            .name(format!("virtual {line}"))
            .spawn(move || while !stop.load(Ordering::Relaxed) && pump.turn().is_ok() {})?;
        staged.threads.push(thread);
        staged.ports.push((line.clone(), path));
    }
    Ok(staged)
}

impl Staged {
    /// Ends all lines and waits for their threads.
    pub fn stop(self) {
        drop(self);
    }
}

impl Drop for Staged {
    fn drop(&mut self) {
        self.stop.store(true, Ordering::Relaxed);
        for thread in self.threads.drain(..) {
            // A thread that panicked has ended, which is all that is asked here.
            let _ = thread.join();
        }
    }
}

/// A pseudo-terminal: our end, and the client's end held open.
struct Terminal {
    ours: OwnedFd,
    _theirs: OwnedFd,
    path: String,
}

impl Terminal {
    fn open() -> io::Result<Self> {
        let ours = openpt(OpenptFlags::RDWR | OpenptFlags::NOCTTY | OpenptFlags::CLOEXEC)?;
        grantpt(&ours)?;
        unlockpt(&ours)?;
        let path = ptsname(&ours, Vec::new())?
            .into_string()
            .map_err(|_| io::Error::other("a terminal's path is not text"))?;
        let flags = OFlags::RDWR | OFlags::NOCTTY | OFlags::CLOEXEC;
        let theirs = rustix::fs::open(path.as_str(), flags, Mode::empty())?;
        let mut settings = tcgetattr(&theirs)?;
        settings.make_raw();
        tcsetattr(&theirs, OptionalActions::Now, &settings)?;
        rustix::io::ioctl_fionbio(&ours, true)?;
        Ok(Self {
            ours,
            _theirs: theirs,
            path,
        })
    }
}

/// Carries bytes between a terminal and a far side.
struct Pump {
    terminal: Terminal,
    far: Box<dyn FarSide>,
    clock: Clock,
    output: Vec<u8>,
}

impl Pump {
    /// Waits for bytes or for a reply that is due, and carries both on.
    fn turn(&mut self) -> io::Result<()> {
        self.wait()?;
        self.hear()?;
        self.far.deliver(self.clock.now(), &mut self.output);
        self.speak()
    }

    fn wait(&self) -> io::Result<()> {
        let until_due = self.far.due().map(|due| self.clock.wall_until(due));
        let wait = until_due.map_or(LOOK, |due| due.min(LOOK));
        let mut flags = PollFlags::IN;
        if !self.output.is_empty() {
            flags |= PollFlags::OUT;
        }
        let timeout = Timespec {
            tv_sec: 0,
            tv_nsec: wait.as_nanos() as _,
        };
        match poll(
            &mut [PollFd::new(&self.terminal.ours, flags)],
            Some(&timeout),
        ) {
            Ok(_) | Err(Errno::INTR) => Ok(()),
            Err(error) => Err(error.into()),
        }
    }

    fn hear(&mut self) -> io::Result<()> {
        let mut bytes = [0; 512];
        loop {
            match rustix::io::read(&self.terminal.ours, &mut bytes) {
                Ok(0) | Err(Errno::AGAIN) => return Ok(()),
                Ok(count) => self.far.receive(&bytes[..count], self.clock.now()),
                Err(Errno::INTR) => {}
                Err(error) => return Err(error.into()),
            }
        }
    }

    fn speak(&mut self) -> io::Result<()> {
        while !self.output.is_empty() {
            match rustix::io::write(&self.terminal.ours, &self.output) {
                Ok(count) => drop(self.output.drain(..count)),
                // Nobody reads: a line without handshake loses what is too much.
                Err(Errno::AGAIN) => {
                    self.output.truncate(UNREAD);
                    return Ok(());
                }
                Err(Errno::INTR) => {}
                Err(error) => return Err(error.into()),
            }
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use std::io::{Read, Write};
    use std::time::Instant;

    use super::super::tests::dryer;
    use super::*;

    fn staged(speed: f64) -> Staged {
        let mut staging = dryer(&[]);
        staging.speed = speed;
        let bench = VirtualBench::new(staging).unwrap();
        let lines = ["supply line", "meter line"].map(str::to_owned);
        stage(&bench, &lines, Clock::scaled(speed)).unwrap()
    }

    fn open(path: &str) -> Box<dyn serialport::SerialPort> {
        let port = serialport::new(path, 115_200).timeout(Duration::from_secs(5));
        port.open().unwrap()
    }

    fn ask(port: &mut dyn serialport::SerialPort, line: &str) -> String {
        port.write_all(line.as_bytes()).unwrap();
        let (mut reply, mut byte) = (String::new(), [0]);
        loop {
            port.read_exact(&mut byte).unwrap();
            if byte[0] == b'\n' {
                return reply;
            }
            reply.push(char::from(byte[0]));
        }
    }

    #[test]
    fn a_serial_program_can_talk_to_a_staged_line() {
        let staged = staged(1.0);
        assert_eq!(staged.ports[0].0, "supply line");
        let mut supply = open(&staged.ports[0].1);
        let mut meter = open(&staged.ports[1].1);
        let identity = ask(&mut *meter, "*IDN?\n");
        assert_eq!(identity, "RATEPLATE,VIRTUAL-METER,0001,0.1 x1");
        assert_eq!(ask(&mut *supply, "OUTP ON\nOUTP?\n"), "1");
        drop(meter);
        // The next client finds the line as the last one left it.
        let mut meter = open(&staged.ports[1].1);
        assert_eq!(ask(&mut *meter, "SYST:ERR?\n"), "0,\"No error\"");
        let before = Instant::now();
        staged.stop();
        assert!(before.elapsed() < Duration::from_secs(2));
        assert!(meter.read(&mut [0]).is_err(), "a stopped line hangs up");
    }

    #[test]
    fn bytes_that_arrive_with_a_hang_up_are_heard() {
        let staged = staged(1.0);
        let mut leaving = open(&staged.ports[0].1);
        leaving.write_all(b"OUTP ON\n").unwrap();
        drop(leaving);
        let mut supply = open(&staged.ports[0].1);
        assert_eq!(ask(&mut *supply, "OUTP?\n"), "1");
    }

    #[test]
    fn scaled_time_shows_in_the_identity_and_on_the_clock() {
        let staged = staged(50.0);
        let mut supply = open(&staged.ports[0].1);
        assert!(ask(&mut *supply, "*IDN?\n").ends_with(" x50"));
    }
}
