//! Writing a run: rows reach the disk as they come, the manifest comes last.

use std::io::{self, Write};

use csv::ByteRecord;

use super::columns::{EVENT_HEAD, Names, write_happening};
use super::hash::sha256_of;
use super::store::{Store, StoreFile};
use super::types::{Event, FileHash, Happening, Manifest, RECORD_FORMAT, RunOutcome, Sample};
use super::waveform::write_waveform;
use crate::plan::Plan;
use crate::quantity::{Moment, Waveform};

/// What a record is of, known before its first row.
#[derive(Debug, Clone)]
pub struct Heading {
    /// The record's id.
    pub record: String,
    /// The unit's number.
    pub unit: String,
    /// The operator.
    pub operator: String,
    /// Seed of a virtual bench.
    pub seed: Option<u64>,
    /// Date and time of the start, RFC 3339.
    pub started: String,
}

/// How often rows are handed to the system.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Flushing {
    /// Row by row: real time.
    EachRow,
    /// Once per second of the run: simulated time.
    EachSecond,
}

/// A record that is being written.
pub struct Journal {
    store: Box<dyn Store>,
    heading: Heading,
    names: Names,
    samples: csv::Writer<Hashing>,
    events: csv::Writer<Hashing>,
    wire: Hashing,
    copies: Vec<FileHash>,
    row: ByteRecord,
    wire_row: Vec<u8>,
    flushing: Flushing,
    flushed_second: u64,
    sample_count: u64,
    event_count: u64,
    last: Moment,
    virtual_mark: Option<String>,
}

/// Which way bytes went on a wire.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Way {
    /// To the instrument.
    Sent,
    /// From the instrument.
    Received,
}

impl Journal {
    /// Opens a record in `store`: copies of the files that it rests on, the plan,
    /// and the heads of its tables are on disk when this returns.
    ///
    /// # Errors
    /// Where anything can't be written.
    pub fn open(
        mut store: Box<dyn Store>,
        heading: Heading,
        plan: &Plan,
        copies: &[(String, Vec<u8>)],
        flushing: Flushing,
    ) -> io::Result<Self> {
        let plan_json = serde_json::to_vec_pretty(plan).map_err(io::Error::other)?;
        let mut written = Vec::new();
        for (name, bytes) in copies {
            written.push(copy_whole(store.as_mut(), name, bytes)?);
        }
        written.push(copy_whole(store.as_mut(), "plan.json", &plan_json)?);
        let mut samples = csv::Writer::from_writer(Hashing::new(store.create("samples.csv")?));
        let names = Names::of(plan);
        samples
            .write_record(names.head())
            .map_err(io::Error::other)?;
        let mut events = csv::Writer::from_writer(Hashing::new(store.create("events.csv")?));
        events.write_record(EVENT_HEAD).map_err(io::Error::other)?;
        let wire = Hashing::new(store.create("wire.txt")?);
        let mut journal = Self {
            store,
            heading,
            names,
            samples,
            events,
            wire,
            copies: written,
            row: ByteRecord::new(),
            wire_row: Vec::new(),
            flushing,
            flushed_second: 0,
            sample_count: 0,
            event_count: 0,
            last: Moment::START,
            virtual_mark: None,
        };
        journal.flush()?;
        Ok(journal)
    }

    /// The heading.
    pub fn heading(&self) -> &Heading {
        &self.heading
    }

    /// Marks the record as made on a virtual bench, for good.
    pub fn mark_virtual(&mut self) {
        self.virtual_mark = Some("VIRTUAL BENCH".to_owned());
    }

    /// Whether any instrument was virtual.
    pub fn is_virtual(&self) -> bool {
        self.virtual_mark.is_some()
    }

    /// Writes a sample, giving it its number.
    ///
    /// # Errors
    /// Where the row can't be written.
    pub fn sample(&mut self, sample: &mut Sample) -> io::Result<()> {
        self.sample_count += 1;
        sample.seq = self.sample_count;
        self.last = self.last.max(sample.reply);
        self.names.write_sample(sample, &mut self.row);
        self.samples
            .write_byte_record(&self.row)
            .map_err(io::Error::other)?;
        self.flush_when_due(sample.reply)
    }

    /// Writes an event; it is handed to the system when this returns.
    ///
    /// # Errors
    /// Where the row can't be written.
    pub fn event(&mut self, at: Moment, event: Event) -> io::Result<Happening> {
        self.event_count += 1;
        self.last = self.last.max(at);
        let happening = Happening {
            seq: self.event_count,
            at,
            event,
        };
        let row = write_happening(&happening).map_err(io::Error::other)?;
        self.events.write_record(&row).map_err(io::Error::other)?;
        self.events.flush()?;
        Ok(happening)
    }

    /// Writes an event that announces an effect: it is on the disk when this returns.
    ///
    /// # Errors
    /// Where it can't be written or synced; the effect must not follow.
    pub fn announce(&mut self, at: Moment, event: Event) -> io::Result<Happening> {
        let happening = self.event(at, event)?;
        self.flush()?;
        self.samples.get_ref().file.sync()?;
        self.events.get_ref().file.sync()?;
        Ok(happening)
    }

    /// Writes a waveform as a file of its own, then the event that tells of it; the
    /// file is on the disk when this returns.
    ///
    /// # Errors
    /// Where it can't be written.
    pub fn waveform(&mut self, at: Moment, cell: usize, wave: &Waveform) -> io::Result<Happening> {
        let file = self.free_name(&format!("waveform-cell-{}", cell + 1));
        let bytes = write_waveform(wave).map_err(io::Error::other)?;
        let hash = copy_whole(self.store.as_mut(), &file, &bytes)?;
        self.copies.push(hash);
        let samples = wave.len() as u64;
        self.event(
            at,
            Event::WaveformStored {
                cell,
                file,
                samples,
            },
        )
    }

    /// A cell that is energised twice leaves two waveforms.
    fn free_name(&self, stem: &str) -> String {
        let taken = |name: &String| self.copies.iter().any(|copy| copy.name == *name);
        let again = (2..).map(|n| format!("{stem}-{n}.csv"));
        std::iter::once(format!("{stem}.csv"))
            .chain(again)
            .find(|name| !taken(name))
            .unwrap_or_default()
    }

    /// Writes bytes that passed on a wire.
    ///
    /// # Errors
    /// Where the row can't be written.
    pub fn wire(&mut self, line: &str, at: Moment, way: Way, bytes: &[u8]) -> io::Result<()> {
        self.wire_row.clear();
        let arrow = if way == Way::Sent { '>' } else { '<' };
        let _ = write!(self.wire_row, "{}\t", at.as_micros());
        escape_into(line.as_bytes(), &mut self.wire_row);
        let _ = write!(self.wire_row, "\t{arrow}\t");
        escape_into(bytes, &mut self.wire_row);
        self.wire_row.push(b'\n');
        self.wire.write_all(&self.wire_row)
    }

    /// Closes the run: every row synced, then the manifest, last and whole.
    ///
    /// # Errors
    /// Where something can't be written; the record then stays open and says so.
    pub fn close(&mut self, at: Moment, outcome: RunOutcome) -> io::Result<Manifest> {
        self.event(
            at,
            Event::Ended {
                outcome: outcome.clone(),
            },
        )?;
        self.flush()?;
        let mut files = self.copies.clone();
        for (name, file) in [
            ("samples.csv", self.samples.get_ref()),
            ("events.csv", self.events.get_ref()),
            ("wire.txt", &self.wire),
        ] {
            file.file.sync()?;
            files.push(FileHash {
                name: name.to_owned(),
                sha256: file.digest(),
            });
        }
        files.sort_by(|a, b| a.name.cmp(&b.name));
        let manifest = self.manifest(outcome, files);
        let json = serde_json::to_vec_pretty(&manifest).map_err(io::Error::other)?;
        self.store.put_whole("manifest.json", &json)?;
        Ok(manifest)
    }

    fn manifest(&self, outcome: RunOutcome, files: Vec<FileHash>) -> Manifest {
        Manifest {
            format: RECORD_FORMAT,
            program: concat!("rateplate ", env!("CARGO_PKG_VERSION")).to_owned(),
            record: self.heading.record.clone(),
            unit: self.heading.unit.clone(),
            operator: self.heading.operator.clone(),
            virtual_bench: self.virtual_mark.clone(),
            seed: self.heading.seed,
            started: self.heading.started.clone(),
            length_us: self.last.as_micros(),
            outcome,
            samples: self.sample_count,
            files,
        }
    }

    fn flush_when_due(&mut self, at: Moment) -> io::Result<()> {
        let second = at.as_micros() / 1_000_000;
        if self.flushing == Flushing::EachRow || second > self.flushed_second {
            self.flushed_second = second;
            self.samples.flush()?;
        }
        Ok(())
    }

    /// Hands everything to the system.
    ///
    /// # Errors
    /// Where it is not taken.
    pub fn flush(&mut self) -> io::Result<()> {
        self.samples.flush()?;
        self.events.flush()?;
        self.wire.flush()
    }
}

fn copy_whole(store: &mut dyn Store, name: &str, bytes: &[u8]) -> io::Result<FileHash> {
    store.put_whole(name, bytes)?;
    Ok(FileHash {
        name: name.to_owned(),
        sha256: sha256_of(bytes),
    })
}

/// Printable ASCII as it is, the rest as `\n`, `\r`, `\t`, `\\` or `\xNN`.
fn escape_into(bytes: &[u8], out: &mut Vec<u8>) {
    for &b in bytes {
        match b {
            b'\n' => out.extend_from_slice(b"\\n"),
            b'\r' => out.extend_from_slice(b"\\r"),
            b'\t' => out.extend_from_slice(b"\\t"),
            b'\\' => out.extend_from_slice(b"\\\\"),
            0x20..=0x7e => out.push(b),
            _ => {
                let _ = write!(out, "\\x{b:02x}");
            }
        }
    }
}

/// A buffered file that hashes what passes, so that closing reads nothing again.
struct Hashing {
    file: Box<dyn StoreFile>,
    buffer: Vec<u8>,
    state: sha2::Sha256,
}

impl Hashing {
    /// Bytes kept before they are handed on without being asked.
    const ENOUGH: usize = 32 * 1024;

    fn new(file: Box<dyn StoreFile>) -> Self {
        Self {
            file,
            buffer: Vec::with_capacity(Self::ENOUGH),
            state: sha2::Digest::new(),
        }
    }

    fn digest(&self) -> String {
        use sha2::Digest;
        self.state
            .clone()
            .finalize()
            .iter()
            .map(|b| format!("{b:02x}"))
            .collect()
    }
}

impl Write for Hashing {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        if self.buffer.len() + bytes.len() > Self::ENOUGH {
            self.flush()?;
        }
        self.buffer.extend_from_slice(bytes);
        Ok(bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        if self.buffer.is_empty() {
            return Ok(());
        }
        self.file.write_all(&self.buffer)?;
        sha2::Digest::update(&mut self.state, &self.buffer);
        self.buffer.clear();
        self.file.flush()
    }
}
