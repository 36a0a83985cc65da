//! Judgements are annexes beside the run: each in a folder of its own, with its
//! own manifest, never changed.

use std::fs;
use std::io;
use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};

use super::hash::sha256_of;
use super::store::{FolderStore, Store};
use super::types::FileHash;

/// What an annex's manifest says, written last.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct AnnexManifest {
    /// Version of the layout.
    pub format: u32,
    /// The program and its version.
    pub program: String,
    /// `VIRTUAL BENCH` where the run is.
    pub virtual_bench: Option<String>,
    /// SHA-256 of the run's manifest that was judged.
    pub run_manifest_sha256: String,
    /// Files with their SHA-256, by name.
    pub files: Vec<FileHash>,
}

/// Writes the next judgement of the record at `record` and returns its folder.
///
/// # Errors
/// Where it can't be written; a half-written annex has no manifest and is no judgement.
pub fn write_judgement(
    record: &Path,
    virtual_bench: Option<String>,
    run_manifest_sha256: String,
    files: &[(String, Vec<u8>)],
) -> io::Result<PathBuf> {
    let (path, mut store) = next_folder(&record.join("judgements"))?;
    let mut hashes = Vec::new();
    for (name, bytes) in files {
        store.put_whole(name, bytes)?;
        hashes.push(FileHash {
            name: name.clone(),
            sha256: sha256_of(bytes),
        });
    }
    hashes.sort_by(|a, b| a.name.cmp(&b.name));
    let manifest = AnnexManifest {
        format: super::types::RECORD_FORMAT,
        program: concat!("rateplate ", env!("CARGO_PKG_VERSION")).to_owned(),
        virtual_bench,
        run_manifest_sha256,
        files: hashes,
    };
    let json = serde_json::to_vec_pretty(&manifest).map_err(io::Error::other)?;
    store.put_whole("manifest.json", &json)?;
    Ok(path)
}

/// The newest whole judgement of a record: its folder, and one of its files.
///
/// # Errors
/// Where a folder or file can't be read.
pub fn newest_judgement(record: &Path, file: &str) -> io::Result<Option<(PathBuf, Vec<u8>)>> {
    let folder = record.join("judgements");
    if !folder.is_dir() {
        return Ok(None);
    }
    let mut whole: Vec<PathBuf> = fs::read_dir(&folder)?
        .filter_map(|entry| Some(entry.ok()?.path()))
        .filter(|path| path.join("manifest.json").is_file())
        .collect();
    whole.sort();
    match whole.pop() {
        Some(path) => Ok(Some((path.clone(), fs::read(path.join(file))?))),
        None => Ok(None),
    }
}

fn next_folder(parent: &Path) -> io::Result<(PathBuf, FolderStore)> {
    for number in 1..=9999 {
        let path = parent.join(format!("{number:04}"));
        match FolderStore::create(&path) {
            Ok(store) => return Ok((path, store)),
            Err(e) if e.kind() == io::ErrorKind::AlreadyExists => {}
            Err(e) => return Err(e),
        }
    }
    Err(io::Error::other("there are 9999 judgements already"))
}
