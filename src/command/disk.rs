//! The laboratory folder on disk, seen through the intake door; and writing a file whole or not at all.

use super::Stopped;
use crate::intake::{Intake, IntakeError};
use chrono::NaiveDate;
use std::io::Write;
use std::path::{Path, PathBuf};

/// A laboratory folder on disk.
pub struct Disk {
    root: PathBuf,
}

/// Folders deeper than this are not records.
const DEEPEST: usize = 12;

impl Disk {
    /// The folder at `root`.
    pub fn new(root: &Path) -> Result<Disk, Stopped> {
        let root = root
            .canonicalize()
            .map_err(|error| Stopped(format!("the folder {} cannot be read: {error}", root.display())))?;
        Ok(Disk { root })
    }

    fn walk(&self, folder: &Path, prefix: &str, depth: usize, found: &mut Vec<String>) -> Result<(), IntakeError> {
        let unreadable =
            |error: std::io::Error| IntakeError::Unreadable { path: prefix.to_string(), reason: error.to_string() };
        for entry in std::fs::read_dir(folder).map_err(unreadable)? {
            let entry = entry.map_err(unreadable)?;
            let Some(name) = entry.file_name().to_str().map(String::from) else { continue };
            let kind = entry.file_type().map_err(unreadable)?;
            if name.starts_with('.') || kind.is_symlink() {
                continue;
            }
            let path = if prefix.is_empty() { name } else { format!("{prefix}/{name}") };
            if kind.is_dir() && depth < DEEPEST {
                self.walk(&entry.path(), &path, depth + 1, found)?;
            } else if kind.is_file() {
                found.push(path);
            }
        }
        Ok(())
    }
}

impl Intake for Disk {
    fn list(&self) -> Result<Vec<String>, IntakeError> {
        let mut found = Vec::new();
        self.walk(&self.root, "", 0, &mut found)?;
        found.sort();
        Ok(found)
    }

    fn read(&self, path: &str) -> Result<Vec<u8>, IntakeError> {
        let full = self.root.join(path);
        let real = full.canonicalize().map_err(|_| IntakeError::Missing(path.into()))?;
        if !real.starts_with(&self.root) {
            return Err(IntakeError::Outside(path.into()));
        }
        if !real.is_file() {
            return Err(IntakeError::Missing(path.into()));
        }
        std::fs::read(&real).map_err(|error| IntakeError::Unreadable { path: path.into(), reason: error.to_string() })
    }

    fn today(&self) -> NaiveDate {
        today()
    }
}

/// Today's date where the program runs.
pub fn today() -> NaiveDate {
    chrono::Local::now().date_naive()
}

/// Writes a file whole or not at all: into a neighbour first, which then takes its name.
pub fn write_whole(path: &Path, bytes: &[u8]) -> Result<(), Stopped> {
    let stop = |error: std::io::Error| Stopped(format!("{} cannot be written: {error}", path.display()));
    let folder = path.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
    let name = path.file_name().and_then(|name| name.to_str()).unwrap_or("file");
    let neighbour = folder.join(format!(".{name}.{}.part", std::process::id()));
    let written = std::fs::File::create(&neighbour).and_then(|mut file| {
        file.write_all(bytes)?;
        file.sync_all()
    });
    let placed = written.and_then(|()| std::fs::rename(&neighbour, path));
    if placed.is_err() {
        let _ = std::fs::remove_file(&neighbour);
    }
    placed.map_err(stop)
}
