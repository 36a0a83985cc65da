//! A new record: its id, its folder, its heading.

use std::io;
use std::path::{Path, PathBuf};

use super::exit::Exit;
use super::files::{Prepared, file_name_of};
use super::say::complain;
use crate::clock::Clock;
use crate::quantity::Moment;
use crate::record::{Event, Flushing, FolderStore, Heading, Journal, UnitNumber, sha256_of};

/// What tells one record from another.
pub struct Identity<'a> {
    /// The unit's number.
    pub unit: &'a UnitNumber,
    /// The operator.
    pub operator: &'a str,
    /// Seed of a virtual bench in memory.
    pub seed: Option<u64>,
}

/// Opens a record below `reports`.
///
/// # Errors
/// [`Exit::Record`] after the reason was printed: nothing was energised.
pub fn open(
    reports: &Path,
    prepared: &Prepared,
    identity: &Identity,
    clock: &Clock,
) -> Result<(PathBuf, Journal), Exit> {
    let started = clock.started().to_rfc3339();
    let id = record_id(prepared, identity, &started);
    let unwritable = |path: &Path, error: io::Error| {
        complain(&format!(
            "error: {}: the record can't be made: {error}\n  name another folder with --reports; nothing was energised",
            path.display()
        ));
        Exit::Record
    };
    let name = folder_name(prepared, identity, clock, &id);
    let (path, store) = free_folder(reports, &name).map_err(|e| unwritable(reports, e))?;
    let heading = Heading {
        record: id,
        unit: identity.unit.to_string(),
        operator: identity.operator.to_owned(),
        seed: identity.seed,
        started,
    };
    let flushing = if clock.is_simulated() {
        Flushing::EachSecond
    } else {
        Flushing::EachRow
    };
    let journal = Journal::open(
        Box::new(store),
        heading,
        &prepared.plan,
        &prepared.copies,
        flushing,
    )
    .map_err(|e| unwritable(&path, e))?;
    Ok((path, journal))
}

/// Writes what is known of the unit before its run begins.
///
/// # Errors
/// [`Exit::Record`] after the reason was printed: nothing was energised.
pub fn tell(path: &Path, journal: &mut Journal, events: Vec<Event>) -> Result<(), Exit> {
    for event in events {
        if let Event::Marked { mark, by, record } = &event {
            complain(&format!(
                "warning: record {record} left this unit marked `{mark}`: {by}\n  it is not judged as good; after replacing the link say --link-replaced"
            ));
        }
        journal.event(Moment::START, event).map_err(|error| {
            complain(&format!(
                "error: {}: the record can't be written: {error}; nothing was energised",
                path.display()
            ));
            Exit::Record
        })?;
    }
    Ok(())
}

/// From plan, unit, seed and start: the same for the same rehearsal, on every machine.
fn record_id(prepared: &Prepared, identity: &Identity, started: &str) -> String {
    let plan = serde_json::to_string(&prepared.plan).unwrap_or_default();
    let seed = identity
        .seed
        .map_or_else(String::new, |seed| seed.to_string());
    let all = [plan.as_str(), identity.unit.as_str(), &seed, started].join("\u{0}");
    sha256_of(all.as_bytes())[..12].to_owned()
}

fn folder_name(prepared: &Prepared, identity: &Identity, clock: &Clock, id: &str) -> String {
    let model = file_name_of(&prepared.plan.appliance.model);
    if clock.is_simulated() {
        return format!("virtual-{model}-{}-{id}", identity.unit);
    }
    let date = clock.started().format("%Y%m%dT%H%M%SZ");
    format!("{date}-{model}-{}-{id}", identity.unit)
}

/// The record folder with its `run` inside; a name that is taken gets a number, so
/// that nothing is ever overwritten.
fn free_folder(reports: &Path, name: &str) -> io::Result<(PathBuf, FolderStore)> {
    std::fs::create_dir_all(reports)?;
    for number in 1..=9999 {
        let path = match number {
            1 => reports.join(name),
            _ => reports.join(format!("{name}-{number}")),
        };
        match std::fs::create_dir(&path) {
            Ok(()) => return Ok((path.clone(), FolderStore::create(&path.join("run"))?)),
            Err(e) if e.kind() == io::ErrorKind::AlreadyExists => {}
            Err(e) => return Err(e),
        }
    }
    Err(io::Error::other(
        "9999 records of this name are there already",
    ))
}
