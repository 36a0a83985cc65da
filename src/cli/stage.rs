//! `stage`: the virtual bench's instruments on pseudo-terminals, for `run` or for
//! any serial program.

use std::fmt::Write;
use std::io::BufRead;

use super::args::Stage;
use super::exit::Exit;
use super::files::prepare;
use super::say::{complain, say};
use super::staging::virtual_bench;
use crate::clock::Clock;
use crate::plan::Plan;
use crate::record::put_whole;
use crate::virtual_bench::{Hands, terminals};

/// Puts the instruments on pseudo-terminals, writes the matching bench file, and
/// serves them until standard input ends or Ctrl-C.
pub fn stage(args: &Stage) -> Exit {
    if !(args.speed.is_finite() && args.speed > 0.0) {
        complain("error: --speed: give a positive number; 1 is real time");
        return Exit::Usage;
    }
    let prepared = match prepare(&args.files, args.bench.as_deref()) {
        Ok(prepared) => prepared,
        Err(exit) => return exit,
    };
    let bench = match virtual_bench(&prepared, &args.virtually, args.speed) {
        Ok(bench) => bench,
        Err(exit) => return exit,
    };
    let clock = Clock::scaled(args.speed);
    let names: Vec<String> = prepared
        .plan
        .lines
        .iter()
        .map(|line| line.name.clone())
        .collect();
    let staged = match terminals::stage(&bench, &names, clock.clone()) {
        Ok(staged) => staged,
        Err(error) => {
            complain(&format!(
                "error: the pseudo-terminals can't be opened: {error}"
            ));
            return Exit::CutShort;
        }
    };
    let file = bench_file(&prepared.plan, &staged.ports);
    if let Err(error) = put_whole(&args.write, file.as_bytes()) {
        complain(&format!(
            "error: {}: can't be written: {error}",
            args.write.display()
        ));
        return Exit::Record;
    }
    for (line, port) in &staged.ports {
        say(&format!("VIRTUAL {line}: {port}"));
    }
    say(&format!(
        "bench file {}; in another terminal:\n  rateplate run {} --bench {} --unit VIRTUAL-1 --operator NAME --speed {}",
        args.write.display(),
        args.files.sequence.display(),
        args.write.display(),
        args.speed
    ));
    say("here: `position NAME` and `condition NAME` do what a hand would; `end` ends it");
    serve_hands(&bench.hands(), &prepared.plan, &clock);
    staged.stop();
    Exit::Good
}

fn serve_hands(hands: &Hands, plan: &Plan, clock: &Clock) {
    for line in std::io::stdin().lock().lines() {
        let Ok(line) = line else { return };
        let done = match line.trim().split_once(' ') {
            Some(("position", name)) => hands.turn(name.trim(), clock.now()),
            Some(("condition", name)) => hands.set_condition(name.trim(), clock.now()),
            _ if line.trim() == "end" => return,
            _ => false,
        };
        if !done {
            say(&format!(
                "not known here; positions are: {}",
                plan.appliance.positions.join(", ")
            ));
        }
    }
    // Standard input is closed: serve until a signal ends the process.
    loop {
        std::thread::park();
    }
}

/// The plan's bench with pseudo-terminals for ports. Names are quoted as JSON
/// strings, which YAML reads alike.
fn bench_file(plan: &Plan, ports: &[(String, String)]) -> String {
    let q = |text: &str| serde_json::Value::from(text).to_string();
    let mut out = format!(
        "# written by `rateplate stage`\nbench: {}\nlines:\n",
        q(&format!("{} (staged)", plan.bench))
    );
    for (line, port) in ports {
        let _ = writeln!(out, "  {}: {{port: {}, baud: 0}}", q(line), q(port));
    }
    out.push_str("instruments:\n");
    for i in &plan.instruments {
        let line = &plan.lines[i.line].name;
        let _ = writeln!(
            out,
            "  {}: {{line: {}, driver: {}, identity: {}}}",
            q(&i.name),
            q(line),
            q(&i.driver.name),
            q(&i.identity)
        );
    }
    let _ = writeln!(
        out,
        "bays:\n  {}:\n    rated current: {}\n    roles:",
        q(&plan.bay.name),
        plan.bay.rated_current
    );
    for role in &plan.bay.roles {
        let instrument = q(&plan.instrument_of(role).name);
        let channel = role
            .channel
            .map_or_else(String::new, |c| format!(", channel: {c}"));
        let _ = writeln!(
            out,
            "      {}: {{instrument: {instrument}{channel}}}",
            q(&role.name)
        );
    }
    out
}
