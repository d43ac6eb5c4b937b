//! The laboratory folder opened for writing by one process alone.

use super::Stopped;
use super::disk::write_whole;
use crate::register::entry::{Clock, Stamp};
use crate::register::store::{Store, StoreError};
use chrono::{DateTime, Utc};
use std::fs::File;
use std::path::{Path, PathBuf};

/// The folder of the register, held alone for as long as this lives. A process that ends, however it ends, lets it go.
pub struct Vault {
    root: PathBuf,
    now: Option<DateTime<Utc>>,
    _lock: File,
}

/// Sets the clock of the register, for demonstrations and tests; every entry then says so.
const CLOCK: &str = "LIBRIPENS_CLOCK";

impl Vault {
    /// Waits until nobody else writes, and holds the folder.
    pub fn open(root: &Path) -> Result<Vault, Stopped> {
        let folder = root.join("register");
        let stop = |error: std::io::Error| Stopped(format!("{} cannot be used: {error}", folder.display()));
        std::fs::create_dir_all(&folder).map_err(stop)?;
        let lock = File::options().create(true).append(true).open(folder.join("lock")).map_err(stop)?;
        lock.lock().map_err(stop)?;
        sweep(&folder);
        Ok(Vault { root: root.to_path_buf(), now: set_clock()?, _lock: lock })
    }
}

/// Removes halves of files that a process left when it was ended while writing; nobody else writes now.
fn sweep(folder: &Path) {
    for folder in [folder.to_path_buf(), folder.join("reports"), folder.join("originals")] {
        let entries = std::fs::read_dir(folder).into_iter().flatten().flatten();
        for entry in entries {
            let name = entry.file_name().to_string_lossy().into_owned();
            if name.starts_with('.') && name.ends_with(".part") {
                let _ = std::fs::remove_file(entry.path());
            }
        }
    }
}

/// The time that `LIBRIPENS_CLOCK` sets.
fn set_clock() -> Result<Option<DateTime<Utc>>, Stopped> {
    let Ok(text) = std::env::var(CLOCK) else { return Ok(None) };
    let time =
        crate::record::parse_instant(&text).map_err(|problem| Stopped(format!("{CLOCK}: {}", problem.message)))?;
    Ok(Some(time.to_utc()))
}

/// The time now, from the machine or as set.
pub fn now() -> Result<Stamp, Stopped> {
    Ok(stamp(set_clock()?))
}

fn stamp(set: Option<DateTime<Utc>>) -> Stamp {
    match set {
        Some(time) => Stamp { time, clock: Clock::Set },
        None => Stamp { time: Utc::now(), clock: Clock::System },
    }
}

fn failed(path: &str, done: &'static str) -> impl Fn(std::io::Error) -> StoreError {
    move |error| StoreError { path: path.into(), done, reason: error.to_string() }
}

/// Makes a new name in a folder outlast a loss of power, where the system can.
fn sync_folder(path: &Path) {
    if let Some(folder) = path.parent().and_then(|folder| File::open(folder).ok()) {
        let _ = folder.sync_all();
    }
}

impl Store for Vault {
    fn read(&self, path: &str) -> Result<Option<Vec<u8>>, StoreError> {
        match std::fs::read(self.root.join(path)) {
            Ok(bytes) => Ok(Some(bytes)),
            Err(error) if error.kind() == std::io::ErrorKind::NotFound => Ok(None),
            Err(error) => Err(failed(path, "read")(error)),
        }
    }

    fn write(&self, path: &str, bytes: &[u8]) -> Result<(), StoreError> {
        let target = self.root.join(path);
        if let Some(folder) = target.parent() {
            std::fs::create_dir_all(folder).map_err(failed(path, "written"))?;
        }
        let reason = |Stopped(reason): Stopped| StoreError { path: path.into(), done: "written", reason };
        write_whole(&target, bytes).map_err(reason)?;
        sync_folder(&target);
        Ok(())
    }

    fn rename(&self, from: &str, to: &str) -> Result<(), StoreError> {
        std::fs::rename(self.root.join(from), self.root.join(to)).map_err(failed(from, "renamed"))?;
        sync_folder(&self.root.join(to));
        Ok(())
    }

    fn now(&self) -> Stamp {
        stamp(self.now)
    }
}
