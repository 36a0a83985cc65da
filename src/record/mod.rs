//! The record folder: what a run leaves, and reading it back.
//!
//! ```text
//! <record>/run/          sequence.yaml, bench.yaml, driver copies, plan.json,
//!                        samples.csv, events.csv, wire.txt, waveform-cell-1.csv and so on,
//!                        manifest.json (last)
//! <record>/judgements/0001/   results.csv, findings.csv, judgement.json, charts,
//!                        manifest.json (last)
//! ```

mod annex;
mod columns;
mod folder;
mod hash;
mod journal;
mod store;
mod types;
mod unit_number;
mod waveform;

pub use annex::{AnnexManifest, newest_judgement, write_judgement};
pub use columns::{RowError, defused, supply_words};
pub use folder::{Folder, RecordError};
pub use hash::{sha256_of, sha256_of_file};
pub use journal::{Flushing, Heading, Journal, Way};
pub use store::{FolderStore, Store, StoreFile, put_whole};
pub use types::{
    Event, FileHash, Happening, Manifest, RECORD_FORMAT, RunOutcome, Sample, Status, StepEnd,
    StoredWaveform, TripOf,
};
pub use unit_number::{UnitNumber, UnitNumberError};
