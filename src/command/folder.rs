//! Which laboratory folder, and which campaign of it, a path means.

use super::Stopped;
use super::disk::Disk;
use std::path::{Path, PathBuf};

/// A laboratory folder and the place in it that a command was given.
pub struct Folder {
    pub root: PathBuf,
    pub disk: Disk,
    /// The campaign the place lies in.
    pub campaign: Option<String>,
    /// The place itself seen from the root, with `/` between names; empty for the root.
    pub place: String,
}

impl Folder {
    /// Finds the laboratory folder that holds `path`: the nearest folder upwards with a `laboratory.md`.
    pub fn find(path: &Path) -> Result<Folder, Stopped> {
        let given = path.canonicalize().map_err(|error| Stopped(format!("{} cannot be read: {error}", path.display())))?;
        let root = given.ancestors().find(|folder| folder.join("laboratory.md").is_file()).ok_or_else(|| {
            Stopped(format!(
                "{} is no laboratory folder: neither it nor a folder above it holds a laboratory.md; `libripens start FOLDER` writes one",
                path.display()
            ))
        })?;
        let names: Vec<String> =
            given.strip_prefix(root).unwrap_or(Path::new("")).iter().map(|name| name.to_string_lossy().into_owned()).collect();
        let campaign = match names.as_slice() {
            [campaigns, name, ..] if campaigns == "campaigns" => Some(name.clone()),
            _ => None,
        };
        Ok(Folder { root: root.to_path_buf(), disk: Disk::new(root)?, campaign, place: names.join("/") })
    }
}
