//! Finding and reading the files that a verb names, the shipped ones included.

use std::collections::BTreeMap;
use std::fs;
use std::io;
use std::path::{Path, PathBuf};

use super::args::Files;
use super::exit::Exit;
use super::say::complain;
use crate::plan::{Plan, resolve};
use crate::spec::bench::Bench;
use crate::spec::driver::Driver;
use crate::spec::{self, Loaded, Problem, Weight, shipped};

/// Larger than this, a file is refused before it is read whole; `spec` says the same.
const LARGEST: u64 = 4 << 20;

/// A file's name for messages, and its bytes.
#[derive(Debug, Clone)]
pub struct Document {
    /// As the user gave it.
    pub name: String,
    /// Content.
    pub bytes: Vec<u8>,
}

/// Everything that a plan is made from, with the plan.
#[derive(Debug)]
pub struct Prepared {
    /// The plan.
    pub plan: Plan,
    /// Copies for the record: name in the record, content.
    pub copies: Vec<(String, Vec<u8>)>,
    /// Warnings, already worded.
    pub warnings: Vec<Problem>,
}

/// Reads a document from disk; where it is not there and one is shipped under the
/// same name, that one.
///
/// # Errors
/// The message is printed; the exit code is the caller's.
pub fn read(path: &Path, shipped: &[shipped::Shipped]) -> Result<Document, Exit> {
    let name = path.display().to_string();
    match read_limited(path) {
        Ok(bytes) => Ok(Document { name, bytes }),
        Err(e) if e.kind() == io::ErrorKind::NotFound => match shipped_as(path, shipped) {
            Some(found) => Ok(Document {
                name,
                bytes: found.text.as_bytes().to_vec(),
            }),
            None => {
                complain(&not_found(&name, shipped));
                Err(Exit::BadInput)
            }
        },
        Err(e) => {
            complain(&format!("error: {name}: can't be read: {e}"));
            Err(Exit::BadInput)
        }
    }
}

/// One byte more than the limit is enough for `spec` to refuse it by its size.
fn read_limited(path: &Path) -> io::Result<Vec<u8>> {
    use io::Read;
    let mut bytes = Vec::new();
    fs::File::open(path)?
        .take(LARGEST + 1)
        .read_to_end(&mut bytes)?;
    Ok(bytes)
}

fn shipped_as<'a>(path: &Path, shipped: &'a [shipped::Shipped]) -> Option<&'a shipped::Shipped> {
    let name = path.file_name()?;
    shipped
        .iter()
        .find(|known| Path::new(known.path).file_name() == Some(name))
}

fn not_found(name: &str, shipped: &[shipped::Shipped]) -> String {
    let known: Vec<&str> = shipped.iter().map(|s| s.path).collect();
    let hint = if known.is_empty() {
        String::new()
    } else {
        format!("\n  shipped with the program: {}", known.join(", "))
    };
    format!("error: {name}: there is no such file{hint}")
}

/// Loads and resolves everything, or prints every problem.
///
/// # Errors
/// [`Exit::BadInput`] after the problems were printed.
pub fn prepare(files: &Files, bench: Option<&Path>) -> Result<Prepared, Exit> {
    let sequence_file = read(&files.sequence, shipped::SEQUENCES)?;
    let bench_file = match bench {
        Some(path) => read(path, &[])?,
        None => Document {
            name: shipped::VIRTUAL_BENCH.path.to_owned(),
            bytes: shipped::VIRTUAL_BENCH.text.as_bytes().to_vec(),
        },
    };
    let mut problems = Vec::new();
    let sequence = keep(
        spec::load_sequence(&sequence_file.name, &sequence_file.bytes),
        &mut problems,
    );
    let bench = keep(
        spec::load_bench(&bench_file.name, &bench_file.bytes),
        &mut problems,
    );
    let drivers = load_drivers(&files.drivers, bench.as_ref(), &mut problems)?;
    let (Some(sequence), Some(bench)) = (sequence, bench) else {
        return Err(refuse(&problems));
    };
    let known: Vec<Driver> = drivers.values().map(|(driver, _)| driver.clone()).collect();
    let today = chrono::Utc::now().date_naive();
    let resolved = resolve(&sequence, &bench, &known, files.bay.as_deref(), Some(today));
    problems.extend(resolved.problems);
    let Some(plan) = resolved.plan.filter(|_| !has_errors(&problems)) else {
        return Err(refuse(&problems));
    };
    let copies = copies_of(&plan, sequence_file, bench_file, &drivers);
    Ok(Prepared {
        plan,
        copies,
        warnings: problems,
    })
}

fn copies_of(
    plan: &Plan,
    sequence: Document,
    bench: Document,
    drivers: &BTreeMap<String, (Driver, Vec<u8>)>,
) -> Vec<(String, Vec<u8>)> {
    let mut copies = vec![
        ("sequence.yaml".to_owned(), sequence.bytes),
        ("bench.yaml".to_owned(), bench.bytes),
    ];
    for (name, (_, bytes)) in drivers {
        if plan.instruments.iter().any(|i| i.driver.name == *name) {
            copies.push((format!("driver-{}.yaml", file_name_of(name)), bytes.clone()));
        }
    }
    copies
}

/// A name as part of a file's name: letters and digits stay, the rest becomes `-`.
pub fn file_name_of(name: &str) -> String {
    let dashed: String = name
        .chars()
        .map(|c| {
            if c.is_ascii_alphanumeric() {
                c.to_ascii_lowercase()
            } else {
                '-'
            }
        })
        .collect();
    let parts: Vec<&str> = dashed.split('-').filter(|part| !part.is_empty()).collect();
    let joined: String = parts.join("-").chars().take(60).collect();
    if joined.is_empty() {
        "unnamed".to_owned()
    } else {
        joined
    }
}

/// The shipped drivers, then the folder's, which come first where names agree. A
/// broken driver file stops a run only where the bench names its driver, or names
/// one that is nowhere else.
fn load_drivers(
    folder: &Path,
    bench: Option<&Bench>,
    problems: &mut Vec<Problem>,
) -> Result<BTreeMap<String, (Driver, Vec<u8>)>, Exit> {
    let mut drivers = BTreeMap::new();
    for known in shipped::DRIVERS {
        if let Some(driver) = keep(
            spec::load_driver(known.path, known.text.as_bytes()),
            problems,
        ) {
            drivers.insert(
                driver.name.clone(),
                (driver, known.text.as_bytes().to_vec()),
            );
        }
    }
    let mut broken = Vec::new();
    for path in yaml_files_in(folder)? {
        let file = read(&path, &[])?;
        let loaded = spec::load_driver(&file.name, &file.bytes);
        match loaded.value {
            Some(driver) => {
                drivers.insert(driver.name.clone(), (driver, file.bytes));
            }
            None => broken.extend(loaded.problems),
        }
    }
    let missing = |bench: &Bench| {
        bench
            .instruments
            .iter()
            .any(|i| !drivers.contains_key(&i.driver.value))
    };
    if bench.is_none_or(missing) {
        problems.extend(broken);
    }
    Ok(drivers)
}

/// In order of their names, whatever the system's order is.
fn yaml_files_in(folder: &Path) -> Result<Vec<PathBuf>, Exit> {
    if !folder.is_dir() {
        return Ok(Vec::new());
    }
    let entries = fs::read_dir(folder).map_err(|e| {
        complain(&format!("error: {}: can't be read: {e}", folder.display()));
        Exit::BadInput
    })?;
    let mut files: Vec<PathBuf> = entries
        .filter_map(|entry| Some(entry.ok()?.path()))
        .filter(|path| path.is_file() && path.extension().is_some_and(|e| e == "yaml"))
        .collect();
    files.sort();
    Ok(files)
}

fn keep<T>(loaded: Loaded<T>, problems: &mut Vec<Problem>) -> Option<T> {
    problems.extend(loaded.problems);
    loaded.value
}

fn has_errors(problems: &[Problem]) -> bool {
    problems
        .iter()
        .any(|problem| problem.weight == Weight::Error)
}

/// Prints problems, and says that nothing was started.
pub fn refuse(problems: &[Problem]) -> Exit {
    complain(spec::render(problems).trim_end());
    let errors = problems
        .iter()
        .filter(|p| p.weight == Weight::Error)
        .count();
    let word = if errors == 1 { "error" } else { "errors" };
    complain(&format!("\n{errors} {word}; nothing was energised"));
    Exit::BadInput
}
