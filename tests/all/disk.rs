//! A disk that fills up: de-energised first, nothing on disk changed, never judged as pass.

use std::io::{self, Write};
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};

use rateplate::clock::Clock;
use rateplate::record::{Folder, FolderStore, RunOutcome, Store, StoreFile};

use crate::bench_of_tests::{SHORT, Setup, bay, paused, plan_of, run_bay, virtual_bench};

/// A folder with room for so many bytes in all.
struct Filling {
    inner: FolderStore,
    room: Arc<AtomicUsize>,
}

struct FillingFile {
    inner: Box<dyn StoreFile>,
    room: Arc<AtomicUsize>,
}

fn take(room: &AtomicUsize, wanted: usize) -> io::Result<()> {
    let taken = room.fetch_update(Ordering::Relaxed, Ordering::Relaxed, |left| {
        left.checked_sub(wanted)
    });
    taken
        .map(|_| ())
        .map_err(|_| io::Error::new(io::ErrorKind::StorageFull, "no space left"))
}

impl Write for FillingFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        take(&self.room, bytes.len())?;
        self.inner.write(bytes)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.inner.flush()
    }
}

impl StoreFile for FillingFile {
    fn sync(&self) -> io::Result<()> {
        self.inner.sync()
    }
}

impl Store for Filling {
    fn create(&mut self, name: &str) -> io::Result<Box<dyn StoreFile>> {
        Ok(Box::new(FillingFile {
            inner: self.inner.create(name)?,
            room: self.room.clone(),
        }))
    }

    fn put_whole(&mut self, name: &str, bytes: &[u8]) -> io::Result<()> {
        take(&self.room, bytes.len())?;
        self.inner.put_whole(name, bytes)
    }
}

/// Runs into a full disk after `room` bytes; the outcome, and whether the unit is on.
fn run_with_room(folder: &Path, room: usize) -> Option<(RunOutcome, bool, bool)> {
    let plan = plan_of(SHORT);
    let bench = virtual_bench(&plan, 1, &[]);
    let ended = paused().block_on(async {
        let clock = Clock::simulated();
        let inner = FolderStore::create(&folder.join("run")).unwrap();
        let store = Filling {
            inner,
            room: Arc::new(AtomicUsize::new(room)),
        };
        let (_stop, stopped) = tokio::sync::watch::channel(false);
        let setup = Setup::willing(&bench, &clock, stopped);
        let bay = bay(&plan, &bench, Box::new(store), &clock, setup).ok()?;
        Some(run_bay(bay).await)
    })?;
    Some((ended.outcome, bench.output_is_on(), ended.manifest.is_ok()))
}

#[test]
fn a_disk_that_fills_up_at_any_time_leaves_the_unit_off_and_the_record_open() {
    let mut energised_once = 0;
    for room in [0, 5_000, 40_000, 60_000, 90_000, 120_000] {
        let folder = tempfile::tempdir().unwrap();
        let Some((outcome, on, closed)) = run_with_room(folder.path(), room) else {
            continue;
        };
        energised_once += 1;
        let RunOutcome::Failed { reason } = &outcome else {
            panic!("{room}: {outcome:?}")
        };
        assert!(
            reason.contains("record can't be written"),
            "{room}: {reason}"
        );
        assert!(!on, "{room}");
        assert!(
            !closed,
            "{room}: a record that is not whole has no manifest"
        );
        assert!(
            Folder::open(folder.path()).is_err(),
            "{room}: it is never judged"
        );
    }
    assert!(
        energised_once >= 2,
        "some of the disks are large enough to start on"
    );
}

/// Rows of samples go to a device that is always full; everything else to a folder.
#[cfg(target_os = "linux")]
struct DevFull(FolderStore);

#[cfg(target_os = "linux")]
impl Store for DevFull {
    fn create(&mut self, name: &str) -> io::Result<Box<dyn StoreFile>> {
        if name == "samples.csv" {
            return Ok(Box::new(
                std::fs::OpenOptions::new().write(true).open("/dev/full")?,
            ));
        }
        self.0.create(name)
    }

    fn put_whole(&mut self, name: &str, bytes: &[u8]) -> io::Result<()> {
        self.0.put_whole(name, bytes)
    }
}

#[cfg(target_os = "linux")]
#[test]
fn the_systems_own_full_device_stops_a_run_before_it_starts() {
    let folder = tempfile::tempdir().unwrap();
    let plan = plan_of(SHORT);
    let bench = virtual_bench(&plan, 1, &[]);
    paused().block_on(async {
        let clock = Clock::simulated();
        let store = DevFull(FolderStore::create(&folder.path().join("run")).unwrap());
        let (_stop, stopped) = tokio::sync::watch::channel(false);
        let setup = Setup::willing(&bench, &clock, stopped);
        let error = bay(&plan, &bench, Box::new(store), &clock, setup)
            .err()
            .expect("it can't be opened");
        assert_eq!(error.kind(), io::ErrorKind::StorageFull);
    });
    assert!(!bench.output_is_on());
}
