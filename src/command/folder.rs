//! Which laboratory folder, which campaign of it, and which quantity the arguments mean.

use super::Stopped;
use super::disk::Disk;
use crate::block::Engine;
use crate::diagnostic::nearest;
use crate::graph::{NodeId, Origin};
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
        let given =
            path.canonicalize().map_err(|error| Stopped(format!("{} cannot be read: {error}", path.display())))?;
        let root = given.ancestors().find(|folder| folder.join("laboratory.md").is_file()).ok_or_else(|| {
            Stopped(format!(
                "{} is no laboratory folder: neither it nor a folder above it holds a laboratory.md; `libripens start FOLDER` writes one",
                path.display()
            ))
        })?;
        let names: Vec<String> = given
            .strip_prefix(root)
            .unwrap_or(Path::new(""))
            .iter()
            .map(|name| name.to_string_lossy().into_owned())
            .collect();
        let campaign = match names.as_slice() {
            [campaigns, name, ..] if campaigns == "campaigns" => Some(name.clone()),
            _ => None,
        };
        Ok(Folder { root: root.to_path_buf(), disk: Disk::new(root)?, campaign, place: names.join("/") })
    }
}

impl Folder {
    /// The folder around one report record.
    ///
    /// # Errors
    /// When `path` is no file of a laboratory folder.
    pub fn find_report(path: &Path) -> Result<Folder, Stopped> {
        let folder = Folder::find(path)?;
        if !path.is_file() {
            return Err(Stopped(format!("{} is no report record; name the record itself", path.display())));
        }
        Ok(folder)
    }
}

/// The quantity with this path. Only the block that gives it is built, with what that rests on; the whole folder is
/// built when the name alone does not say who gives it, as for the mass of a standard on the day of its use.
///
/// Nothing when the quantity could not be computed: the complaints with the engine say why.
///
/// # Errors
/// When no quantity has this path; the message names the nearest.
pub fn find_quantity(engine: &Engine, path: &str) -> Result<Option<NodeId>, Stopped> {
    let name = path.split('.').next().unwrap_or_default();
    if let Some(block) = engine.blocks().get(name) {
        engine.build(name, block.raw.name.place);
    }
    let mut found = engine.graph().find(path);
    if found.is_none() {
        engine.build_all();
        found = engine.graph().find(path);
    }
    match found {
        Some(id) => Ok(Some(id).filter(|id| engine.graph().value(*id).is_finite())),
        None if is_expected(engine, name, path) && engine.complaints().has_faults() => Ok(None),
        None => Err(unknown_quantity(engine, name, path)),
    }
}

/// Whether the kind of the block promises a result with this path.
fn is_expected(engine: &Engine, name: &str, path: &str) -> bool {
    let Some(block) = engine.blocks().get(name) else { return false };
    let rest = path.strip_prefix(name).and_then(|rest| rest.strip_prefix('.')).unwrap_or_default();
    block.kind.outputs.iter().any(|output| output.path == rest)
}

fn unknown_quantity(engine: &Engine, name: &str, path: &str) -> Stopped {
    let graph = engine.graph();
    let prefix = format!("{name}.");
    let is_result = |id: &NodeId| matches!(graph.node(*id).origin, Origin::Computed(_));
    let of_block: Vec<&str> = graph
        .names
        .iter()
        .filter(|(known, id)| known.starts_with(&prefix) && is_result(id))
        .map(|(known, _)| known.as_str())
        .collect();
    let lower = path.to_lowercase();
    let in_other_case = graph.names.keys().find(|known| known.to_lowercase() == lower).map(String::as_str);
    let longer = graph
        .names
        .keys()
        .find(|known| known.strip_prefix(path).is_some_and(|rest| rest.starts_with('.')))
        .map(String::as_str);
    let longer = longer.filter(|_| path.contains('.'));
    let near = in_other_case.or(longer).or_else(|| nearest(path, graph.names.keys().map(String::as_str)));
    let advice = match near {
        Some(near) => format!("did you mean {near}?"),
        None if !of_block.is_empty() => format!("{name} gives {}", of_block.join(", ")),
        None => match engine.blocks().get(name) {
            Some(block) => format!("{name} is of the kind {} and computes no result by itself", block.kind.name),
            None => "`libripens reduce` lists every result, with --all every quantity".into(),
        },
    };
    Stopped(format!("no quantity is called {path}; {advice}"))
}
