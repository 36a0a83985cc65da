//! The shipped instruments through real serial devices: `stage` puts the virtual bench
//! on pseudo-terminals, `run` drives it through the ordinary serial path.

use std::fs;
use std::io::{BufRead, BufReader, Write};
use std::path::Path;
use std::process::{Child, ChildStdin, Command, Stdio};
use std::time::{Duration, Instant};

use rateplate::record::{Event, Folder, RunOutcome};

use crate::bench_of_tests::{only_record, printed, program};

/// A sequence whose whole run fits a few wall seconds at speed 8.
const BRIEF: &str = include_str!("../data/brief.yaml");

/// A virtual unit with small time constants, of the same model.
const BRIEF_UNIT: &str = include_str!("../data/brief-unit.yaml");

/// The program, staging; killed when dropped.
struct Staging {
    child: Child,
    stdin: Option<ChildStdin>,
}

impl Drop for Staging {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

fn staged(folder: &Path, speed: &str, more: &[&str]) -> Staging {
    fs::write(folder.join("brief.yaml"), BRIEF).unwrap();
    fs::write(folder.join("unit.yaml"), BRIEF_UNIT).unwrap();
    let mut child = Command::new(env!("CARGO_BIN_EXE_rateplate"))
        .current_dir(folder)
        .args([
            "stage",
            "brief.yaml",
            "--virtual-unit",
            "unit.yaml",
            "--speed",
            speed,
        ])
        .args(more)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()
        .unwrap();
    let stdout = BufReader::new(child.stdout.take().unwrap());
    let stdin = child.stdin.take();
    for line in stdout.lines() {
        if line.unwrap().starts_with("here:") {
            break;
        }
    }
    Staging { child, stdin }
}

const RUN: [&str; 8] = [
    "run",
    "brief.yaml",
    "--bench",
    "staged-bench.yaml",
    "--unit",
    "PTY-1",
    "--operator",
    "test",
];

#[test]
fn from_start_to_verdict_over_pseudo_terminals() {
    let folder = tempfile::tempdir().unwrap();
    let mut staging = staged(folder.path(), "8", &[]);
    let started = Instant::now();
    let output = program(
        folder.path(),
        &[&RUN[..], &["--yes", "--speed", "8"]].concat(),
    );
    let text = printed(&output);
    assert_eq!(output.status.code(), Some(0), "{text}");
    assert!(
        text.contains("VERDICT    PASS") && text.contains("VIRTUAL BENCH"),
        "{text}"
    );
    assert!(
        started.elapsed() < Duration::from_secs(60),
        "{:?}",
        started.elapsed()
    );
    let record = Folder::open(&only_record(folder.path())).unwrap();
    assert_eq!(record.manifest.outcome, RunOutcome::Complete);
    assert!(record.manifest.virtual_bench.is_some());
    writeln!(staging.stdin.as_mut().unwrap(), "end").unwrap();
}

#[test]
fn a_wrong_speed_is_refused_before_anything_is_energised() {
    let folder = tempfile::tempdir().unwrap();
    let _staging = staged(folder.path(), "4", &[]);
    let output = program(folder.path(), &[&RUN[..], &["--yes"]].concat());
    let text = printed(&output);
    assert_eq!(output.status.code(), Some(11), "{text}");
    assert!(text.contains("--speed 4"), "{text}");
    assert!(!text.contains("ENERGISED"), "{text}");
    let output = program(
        folder.path(),
        &[&RUN[..], &["--yes", "--speed", "1000"]].concat(),
    );
    assert_eq!(output.status.code(), Some(2), "{}", printed(&output));
}

/// Starts a run with a person's end of a pipe and waits until it is energised.
fn energised_run(
    folder: &Path,
    speed: &str,
) -> (Child, ChildStdin, BufReader<std::process::ChildStdout>) {
    let mut child = Command::new(env!("CARGO_BIN_EXE_rateplate"))
        .current_dir(folder)
        .args(RUN)
        .args(["--speed", speed])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()
        .unwrap();
    let mut stdin = child.stdin.take().unwrap();
    let mut stdout = BufReader::new(child.stdout.take().unwrap());
    writeln!(stdin, "yes").unwrap();
    let mut line = String::new();
    while !line.contains("ENERGISED") {
        line.clear();
        assert!(
            stdout.read_line(&mut line).unwrap() > 0,
            "the run ended before it was energised"
        );
    }
    (child, stdin, stdout)
}

fn send_interrupt(child: &Child) {
    let pid = i32::try_from(child.id()).unwrap();
    let pid = rustix::process::Pid::from_raw(pid).unwrap();
    rustix::process::kill_process(pid, rustix::process::Signal::INT).unwrap();
}

#[test]
fn ctrl_c_once_de_energises_and_closes_the_record() {
    let folder = tempfile::tempdir().unwrap();
    let _staging = staged(folder.path(), "4", &[]);
    let (mut child, _stdin, mut stdout) = energised_run(folder.path(), "4");
    send_interrupt(&child);
    let mut rest = String::new();
    std::io::Read::read_to_string(&mut stdout, &mut rest).unwrap();
    assert_eq!(child.wait().unwrap().code(), Some(11), "{rest}");
    assert!(rest.contains("OFF confirmed"), "{rest}");
    let record = Folder::open(&only_record(folder.path())).unwrap();
    assert_eq!(record.manifest.outcome, RunOutcome::Stopped);
    assert!(record.happenings.iter().any(|h| matches!(
        &h.event,
        Event::Off {
            confirmed: true,
            ..
        }
    )));
}

#[test]
fn ctrl_c_at_a_prompt_ends_the_run_although_nobody_answers() {
    let folder = tempfile::tempdir().unwrap();
    let _staging = staged(folder.path(), "4", &[]);
    let mut child = Command::new(env!("CARGO_BIN_EXE_rateplate"))
        .current_dir(folder.path())
        .args(RUN)
        .args(["--speed", "4"])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()
        .unwrap();
    let _stdin = child.stdin.take().unwrap();
    let mut stdout = BufReader::new(child.stdout.take().unwrap());
    let mut line = String::new();
    while !line.contains("type `yes`") {
        line.clear();
        assert!(stdout.read_line(&mut line).unwrap() > 0, "no prompt came");
    }
    send_interrupt(&child);
    let mut rest = String::new();
    std::io::Read::read_to_string(&mut stdout, &mut rest).unwrap();
    assert_eq!(child.wait().unwrap().code(), Some(11), "{rest}");
    let record = Folder::open(&only_record(folder.path())).unwrap();
    assert_eq!(record.manifest.outcome, RunOutcome::Stopped);
}

#[test]
fn a_far_side_that_is_gone_is_told_and_off_is_called_unconfirmed() {
    let folder = tempfile::tempdir().unwrap();
    let staging = staged(folder.path(), "4", &[]);
    let (mut child, _stdin, mut stdout) = energised_run(folder.path(), "4");
    drop(staging);
    let mut rest = String::new();
    std::io::Read::read_to_string(&mut stdout, &mut rest).unwrap();
    assert_eq!(child.wait().unwrap().code(), Some(12), "{rest}");
    let record = Folder::open(&only_record(folder.path())).unwrap();
    assert!(matches!(record.manifest.outcome, RunOutcome::Failed { .. }));
}

#[test]
fn any_serial_program_can_talk_to_a_staged_instrument() {
    let folder = tempfile::tempdir().unwrap();
    let _staging = staged(folder.path(), "1", &[]);
    let bench = fs::read_to_string(folder.path().join("staged-bench.yaml")).unwrap();
    let port = bench
        .lines()
        .find(|l| l.contains("meter line") && l.contains("port"))
        .unwrap();
    let path = port
        .split("port: \"")
        .nth(1)
        .unwrap()
        .split('"')
        .next()
        .unwrap();
    let mut port = serialport::new(path, 0)
        .timeout(Duration::from_secs(2))
        .open()
        .unwrap();
    port.write_all(b"*IDN?\n").unwrap();
    let mut reply = String::new();
    BufReader::new(port).read_line(&mut reply).unwrap();
    assert!(
        reply.starts_with("RATEPLATE,VIRTUAL-METER") && reply.contains("x1"),
        "{reply}"
    );
    assert_eq!(
        reply.trim_end().split(',').count(),
        4,
        "IEEE 488.2: four fields"
    );
}
