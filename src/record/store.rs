//! Where a record's files go: a folder, or a stand-in for tests that fills up.

use std::fs::{self, File, OpenOptions};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// A file that can be forced to the disk.
pub trait StoreFile: Write + Send {
    /// Waits until what was written is on the disk.
    ///
    /// # Errors
    /// Where the system can't.
    fn sync(&self) -> io::Result<()>;
}

/// Takes a record's files.
pub trait Store: Send {
    /// Makes a new file to append to.
    ///
    /// # Errors
    /// Where it can't be made, or is there already.
    fn create(&mut self, name: &str) -> io::Result<Box<dyn StoreFile>>;

    /// Writes a whole file at once: it is there whole, or not at all.
    ///
    /// # Errors
    /// Where it can't be written.
    fn put_whole(&mut self, name: &str, bytes: &[u8]) -> io::Result<()>;
}

impl StoreFile for File {
    fn sync(&self) -> io::Result<()> {
        match self.sync_data() {
            // Some file systems and devices have nothing to sync; their writes still count.
            Err(e)
                if matches!(
                    e.kind(),
                    io::ErrorKind::InvalidInput | io::ErrorKind::Unsupported
                ) =>
            {
                Ok(())
            }
            other => other,
        }
    }
}

/// A folder on disk.
#[derive(Debug)]
pub struct FolderStore {
    path: PathBuf,
}

impl FolderStore {
    /// Makes the folder, which must not be there yet.
    ///
    /// # Errors
    /// Where it is there, or can't be made.
    pub fn create(path: &Path) -> io::Result<Self> {
        if let Some(parent) = path.parent() {
            fs::create_dir_all(parent)?;
        }
        fs::create_dir(path)?;
        Ok(Self {
            path: path.to_owned(),
        })
    }
}

impl Store for FolderStore {
    fn create(&mut self, name: &str) -> io::Result<Box<dyn StoreFile>> {
        let path = self.path.join(name);
        Ok(Box::new(
            OpenOptions::new()
                .create_new(true)
                .append(true)
                .open(path)?,
        ))
    }

    fn put_whole(&mut self, name: &str, bytes: &[u8]) -> io::Result<()> {
        put_whole(&self.path.join(name), bytes)
    }
}

/// Writes a whole file beside its place and moves it there, so that a reader sees
/// all of it or nothing.
///
/// # Errors
/// Where it can't be written or moved.
pub fn put_whole(path: &Path, bytes: &[u8]) -> io::Result<()> {
    let mut part = path.as_os_str().to_owned();
    part.push(".part");
    let part = PathBuf::from(part);
    let mut file = File::create(&part)?;
    file.write_all(bytes)?;
    StoreFile::sync(&file)?;
    drop(file);
    fs::rename(&part, path)?;
    sync_folder_of(path)
}

#[cfg(unix)]
fn sync_folder_of(path: &Path) -> io::Result<()> {
    let folder = path
        .parent()
        .filter(|folder| !folder.as_os_str().is_empty());
    StoreFile::sync(&File::open(folder.unwrap_or(Path::new(".")))?)
}

/// A folder can't be synced on this system; the rename alone must do.
#[cfg(not(unix))]
fn sync_folder_of(_: &Path) -> io::Result<()> {
    Ok(())
}
