//! The register as a text: one entry a line, each holding the hash of the one before.
//!
//! Pure functions over bytes: reading, heads, adding an entry. What is wrong with a register is found in [`super::verify`].

use super::entry::{Act, Entry, NOTHING_BEFORE, Stamp, line_hash, line_leaf, written_time};
use super::tree::{Hash, Head, hex, tree_head};
use super::verify::{Damage, verify};
use crate::diagnostic::{Code, Problem};

/// Where the register stands in a laboratory folder.
pub const REGISTER: &str = "register/register.jsonl";

/// A register that holds together.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Register {
    pub entries: Vec<Entry>,
    lines: Vec<String>,
}

impl Register {
    /// Reads a register.
    ///
    /// # Errors
    /// Everything that is wrong with it.
    pub fn read(bytes: &[u8]) -> Result<Register, Vec<Damage>> {
        let damages = verify(bytes);
        if !damages.is_empty() {
            return Err(damages);
        }
        let text = String::from_utf8_lossy(bytes);
        let lines: Vec<String> = text.lines().map(String::from).collect();
        let entries = lines.iter().filter_map(|line| serde_json::from_str(line).ok()).collect();
        Ok(Register { entries, lines })
    }

    /// The register as it stands on disk.
    pub fn bytes(&self) -> Vec<u8> {
        self.lines.iter().flat_map(|line| line.bytes().chain([b'\n'])).collect()
    }

    /// The hashes of the entries in the tree.
    pub fn leaves(&self) -> Vec<Hash> {
        self.lines.iter().map(|line| line_leaf(line)).collect()
    }

    /// The head over all entries.
    pub fn head(&self) -> Head {
        self.head_of(self.lines.len())
    }

    /// The head over the first `size` entries, of all when there are fewer.
    pub fn head_of(&self, size: usize) -> Head {
        let leaves = self.leaves();
        let leaves = &leaves[..size.min(leaves.len())];
        Head { size: leaves.len() as u64, head: hex(&tree_head(leaves)) }
    }

    /// Adds an entry at the end.
    ///
    /// # Errors
    /// `clock_behind` where the clock stands before the last entry.
    pub fn add(&mut self, act: Act, who: &str, why: &str, stamp: Stamp) -> Result<&Entry, Problem> {
        let time = written_time(stamp.time);
        if let Some(last) = self.entries.last().filter(|last| last.time > time) {
            let message = format!(
                "The clock says {time}, but entry {} of the register was made at {}.",
                last.sequence, last.time
            );
            return Err(Problem::new(Code::ClockBehind, message).hint("Set the clock of this machine right."));
        }
        let entry = Entry {
            sequence: self.entries.len() as u64 + 1,
            time,
            clock: stamp.clock,
            who: who.into(),
            why: why.into(),
            program: crate::VERSION.into(),
            before: self.lines.last().map_or_else(|| NOTHING_BEFORE.into(), |line| line_hash(line)),
            act,
        };
        self.lines.push(entry.line());
        self.entries.push(entry);
        let last = self.entries.len() - 1;
        Ok(&self.entries[last])
    }
}
