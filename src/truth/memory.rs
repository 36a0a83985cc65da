//! A record that touches no disk: a store to write a run to, and its files for the
//! same reader that reads folders.

use std::collections::BTreeMap;
use std::io::{self, Read, Write};
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use crate::record::{RunFiles, Store, StoreFile};

type Bytes = Arc<Mutex<Vec<u8>>>;
type Shelf = Arc<Mutex<BTreeMap<String, Bytes>>>;

/// Takes a run's files into memory; clones share them.
#[derive(Debug, Clone, Default)]
pub(super) struct MemoryStore(Shelf);

/// One file of it.
struct MemoryFile(Bytes);

/// A run's files.
#[derive(Debug)]
pub(super) struct MemoryRun(BTreeMap<String, Vec<u8>>);

fn locked<T>(shared: &Mutex<T>) -> MutexGuard<'_, T> {
    shared.lock().unwrap_or_else(PoisonError::into_inner)
}

impl MemoryStore {
    /// Everything that was written; the store is empty afterwards.
    pub(super) fn take(&self) -> MemoryRun {
        let files = std::mem::take(&mut *locked(&self.0));
        let taken = |(name, bytes): (String, Bytes)| (name, std::mem::take(&mut *locked(&bytes)));
        MemoryRun(files.into_iter().map(taken).collect())
    }
}

impl Store for MemoryStore {
    fn create(&mut self, name: &str) -> io::Result<Box<dyn StoreFile>> {
        let mut files = locked(&self.0);
        if files.contains_key(name) {
            return Err(io::ErrorKind::AlreadyExists.into());
        }
        let bytes = Bytes::default();
        files.insert(name.to_owned(), bytes.clone());
        Ok(Box::new(MemoryFile(bytes)))
    }

    fn put_whole(&mut self, name: &str, bytes: &[u8]) -> io::Result<()> {
        let bytes = Arc::new(Mutex::new(bytes.to_vec()));
        locked(&self.0).insert(name.to_owned(), bytes);
        Ok(())
    }
}

impl Write for MemoryFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        locked(&self.0).extend_from_slice(bytes);
        Ok(bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

impl StoreFile for MemoryFile {
    fn sync(&self) -> io::Result<()> {
        Ok(())
    }
}

impl RunFiles for MemoryRun {
    fn open(&self, name: &str) -> io::Result<Box<dyn Read + '_>> {
        let bytes = self.0.get(name).ok_or(io::ErrorKind::NotFound)?;
        Ok(Box::new(bytes.as_slice()))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_was_written_is_read_and_nothing_is_made_twice() {
        let store = MemoryStore::default();
        let mut writing: Box<dyn Store> = Box::new(store.clone());
        let mut file = writing.create("a.csv").unwrap();
        file.write_all(b"one\n").unwrap();
        file.write_all(b"two\n").unwrap();
        let again = writing.create("a.csv").err().unwrap();
        assert_eq!(again.kind(), io::ErrorKind::AlreadyExists);
        writing.put_whole("b.json", b"{}").unwrap();
        let run = store.take();
        let mut text = String::new();
        run.open("a.csv")
            .unwrap()
            .read_to_string(&mut text)
            .unwrap();
        assert_eq!(text, "one\ntwo\n");
        assert_eq!(run.open("c").err().unwrap().kind(), io::ErrorKind::NotFound);
        assert!(store.take().open("a.csv").is_err());
    }
}
