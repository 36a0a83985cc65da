//! Reading a record back, and refusing what is not whole.

use std::fs;
use std::io;
use std::path::{Path, PathBuf};

use csv::ByteRecord;

use super::columns::{EVENT_HEAD, Names, RowError, read_happening};
use super::hash::{sha256_of, sha256_of_file};
use super::types::{Event, Happening, Manifest, RECORD_FORMAT, Sample, StoredWaveform};
use super::waveform::{WAVEFORM_HEAD, WaveformColumns};
use crate::plan::{PLAN_FORMAT, Plan};

/// Why a record can't be read. Each says the file, and the line where there is one.
#[derive(Debug, thiserror::Error)]
pub enum RecordError {
    /// A file can't be read.
    #[error("{}: can't be read: {source}", file.display())]
    Read {
        /// The file.
        file: PathBuf,
        /// Why.
        source: io::Error,
    },
    /// The run was never closed.
    #[error("{}: there is no run/manifest.json: the run was cut off and never closed; it can't be judged", folder.display())]
    NotClosed {
        /// The record.
        folder: PathBuf,
    },
    /// JSON that is not what it should be.
    #[error("{}: {what}", file.display())]
    Meaning {
        /// The file.
        file: PathBuf,
        /// What is wrong.
        what: String,
    },
    /// A newer layout than this program knows.
    #[error("{}: format {found} is newer than the {known} that this program knows; use a newer rateplate", file.display())]
    Newer {
        /// The file.
        file: PathBuf,
        /// Its format.
        found: u32,
        /// Ours.
        known: u32,
    },
    /// A file that is not the one that was written.
    #[error("{}: its SHA-256 is not the one in run/manifest.json: it was changed after the run was closed", file.display())]
    Changed {
        /// The file.
        file: PathBuf,
    },
    /// A last row without its end.
    #[error("{}:{line}: the last row is torn: it has no line end", file.display())]
    Torn {
        /// The file.
        file: PathBuf,
        /// Its line.
        line: u64,
    },
    /// A row that can't be taken.
    #[error("{}:{line}: {what}", file.display())]
    Row {
        /// The file.
        file: PathBuf,
        /// Its line.
        line: u64,
        /// What is wrong.
        what: String,
    },
}

/// A closed record.
#[derive(Debug)]
pub struct Folder {
    path: PathBuf,
    /// The run's manifest.
    pub manifest: Manifest,
    /// The plan that was run.
    pub plan: Plan,
    /// Every sample, in order.
    pub samples: Vec<Sample>,
    /// Every event, in order.
    pub happenings: Vec<Happening>,
    /// Every waveform, in order.
    pub waveforms: Vec<StoredWaveform>,
}

impl Folder {
    /// Reads a closed record and holds every file of the run to its hash.
    ///
    /// # Errors
    /// [`RecordError`]: not closed, changed, torn, or not a record.
    pub fn open(path: &Path) -> Result<Self, RecordError> {
        let run = path.join("run");
        let manifest = read_manifest(path, &run)?;
        for file in &manifest.files {
            let at = run.join(safe_name(&run, &file.name)?);
            let found = sha256_of_file(&at).map_err(|e| unreadable(&at, e))?;
            if found != file.sha256 {
                return Err(RecordError::Changed { file: at });
            }
        }
        let plan = read_plan(&run.join("plan.json"))?;
        let names = Names::of(&plan);
        let head = names.head();
        let mut samples: Vec<Sample> = Vec::with_capacity(manifest.samples as usize);
        read_rows(&run.join("samples.csv"), &head, |row| {
            let sample = names.read_sample(row)?;
            let expected = samples.len() as u64 + 1;
            in_order("seq", sample.seq, expected)?;
            samples.push(sample);
            Ok(())
        })?;
        let mut happenings: Vec<Happening> = Vec::new();
        read_rows(&run.join("events.csv"), &EVENT_HEAD, |row| {
            let happening = read_happening(row)?;
            in_order("seq", happening.seq, happenings.len() as u64 + 1)?;
            happenings.push(happening);
            Ok(())
        })?;
        let waveforms = read_waveforms(&run, &manifest, &plan, &happenings)?;
        Ok(Self {
            path: path.to_owned(),
            manifest,
            plan,
            samples,
            happenings,
            waveforms,
        })
    }

    /// The record's folder.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// SHA-256 of `run/manifest.json`, which stands for the whole run.
    ///
    /// # Errors
    /// Where it can't be read.
    pub fn seal(&self) -> Result<String, RecordError> {
        let file = self.path.join("run").join("manifest.json");
        let bytes = fs::read(&file).map_err(|e| unreadable(&file, e))?;
        Ok(sha256_of(&bytes))
    }
}

/// Every waveform that the events tell of.
fn read_waveforms(
    run: &Path,
    manifest: &Manifest,
    plan: &Plan,
    happenings: &[Happening],
) -> Result<Vec<StoredWaveform>, RecordError> {
    let mut waveforms = Vec::new();
    for happening in happenings {
        let Event::WaveformStored {
            cell,
            file,
            samples,
        } = &happening.event
        else {
            continue;
        };
        let meaning = |what: &str| RecordError::Meaning {
            file: run.join("events.csv"),
            what: format!("event {}: {what}", happening.seq),
        };
        if *cell >= plan.cells.len() {
            return Err(meaning("the plan has no such cell"));
        }
        // Only what stands in the manifest was held to its hash.
        if !manifest.files.iter().any(|known| known.name == *file) {
            return Err(meaning("its waveform is no file of the manifest"));
        }
        let at = run.join(safe_name(run, file)?);
        let mut columns = WaveformColumns::default();
        read_rows(&at, &WAVEFORM_HEAD, |row| columns.take(row))?;
        let wave = columns
            .finish(*samples)
            .map_err(|what| RecordError::Meaning {
                file: at.clone(),
                what,
            })?;
        waveforms.push(StoredWaveform { cell: *cell, wave });
    }
    Ok(waveforms)
}

fn read_manifest(path: &Path, run: &Path) -> Result<Manifest, RecordError> {
    let file = run.join("manifest.json");
    let bytes = match fs::read(&file) {
        Ok(bytes) => bytes,
        Err(e) if e.kind() == io::ErrorKind::NotFound && run.is_dir() => {
            return Err(RecordError::NotClosed {
                folder: path.to_owned(),
            });
        }
        Err(e) => return Err(unreadable(&file, e)),
    };
    let manifest: Manifest = serde_json::from_slice(&bytes).map_err(|e| RecordError::Meaning {
        file: file.clone(),
        what: format!("not a manifest: {e}"),
    })?;
    match manifest.format {
        RECORD_FORMAT => Ok(manifest),
        found => Err(RecordError::Newer {
            file,
            found,
            known: RECORD_FORMAT,
        }),
    }
}

fn read_plan(file: &Path) -> Result<Plan, RecordError> {
    let bytes = fs::read(file).map_err(|e| unreadable(file, e))?;
    let plan: Plan = serde_json::from_slice(&bytes).map_err(|e| RecordError::Meaning {
        file: file.to_owned(),
        what: format!("not a plan: {e}"),
    })?;
    match plan.format {
        PLAN_FORMAT => Ok(plan),
        found => Err(RecordError::Newer {
            file: file.to_owned(),
            found,
            known: PLAN_FORMAT,
        }),
    }
}

/// A manifest is text from outside: its file names must stay within the folder.
fn safe_name<'a>(run: &Path, name: &'a str) -> Result<&'a str, RecordError> {
    let plain = !name.is_empty()
        && !name.starts_with('.')
        && name
            .chars()
            .all(|c| c.is_alphanumeric() || matches!(c, '-' | '_' | '.'));
    if plain {
        return Ok(name);
    }
    Err(RecordError::Meaning {
        file: run.join("manifest.json"),
        what: format!("names the file {name:?}, which is not a plain name"),
    })
}

fn read_rows(
    file: &Path,
    head: &[&str],
    mut take: impl FnMut(&ByteRecord) -> Result<(), RowError>,
) -> Result<(), RecordError> {
    let bytes = fs::read(file).map_err(|e| unreadable(file, e))?;
    let lines = bytes.iter().filter(|b| **b == b'\n').count() as u64;
    if bytes.last().is_some_and(|b| *b != b'\n') {
        return Err(RecordError::Torn {
            file: file.to_owned(),
            line: lines + 1,
        });
    }
    let mut reader = csv::Reader::from_reader(bytes.as_slice());
    let bad = |line, what: String| RecordError::Row {
        file: file.to_owned(),
        line,
        what,
    };
    let found = reader.headers().map_err(|e| bad(1, e.to_string()))?;
    if !found.iter().eq(head.iter().copied()) {
        return Err(bad(1, format!("the columns should be {}", head.join(","))));
    }
    let mut row = ByteRecord::new();
    loop {
        let more = reader.read_byte_record(&mut row);
        let line = row.position().map_or(0, csv::Position::line);
        match more {
            Ok(true) => take(&row).map_err(|e| bad(line, e.to_string()))?,
            Ok(false) => return Ok(()),
            Err(e) => return Err(bad(line, e.to_string())),
        }
    }
}

fn in_order(column: &str, found: u64, expected: u64) -> Result<(), RowError> {
    if found == expected {
        return Ok(());
    }
    Err(RowError {
        column: column.to_owned(),
        found: found.to_string(),
        wanted: "the next number in order",
    })
}

fn unreadable(file: &Path, source: io::Error) -> RecordError {
    RecordError::Read {
        file: file.to_owned(),
        source,
    }
}
