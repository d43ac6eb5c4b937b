//! The writing door: where the register, the kept originals and the archived reports are put.

use super::entry::Stamp;
use crate::diagnostic::{Code, Problem};
use std::cell::RefCell;
use std::collections::BTreeMap;

/// Why something could not be read or written.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{path} cannot be {done}: {reason}")]
pub struct StoreError {
    pub path: String,
    /// `read`, `written`, `renamed`.
    pub done: &'static str,
    pub reason: String,
}

impl From<StoreError> for Problem {
    fn from(error: StoreError) -> Problem {
        Problem::new(Code::RegisterUnwritable, error.to_string())
            .hint("See to the space, the rights and the medium of the laboratory folder; nothing was entered.")
    }
}

/// The writing door. Whoever holds it is alone: no other process enters anything meanwhile.
///
/// Paths are relative to the laboratory folder, with `/` between names.
pub trait Store {
    /// The bytes of a file; nothing when there is none.
    fn read(&self, path: &str) -> Result<Option<Vec<u8>>, StoreError>;
    /// Writes a file whole or not at all, and so that it outlasts a loss of power.
    fn write(&self, path: &str, bytes: &[u8]) -> Result<(), StoreError>;
    /// Gives a file another name, over one that has it.
    fn rename(&self, from: &str, to: &str) -> Result<(), StoreError>;
    /// The time now.
    fn now(&self) -> Stamp;
}

/// A laboratory folder in memory, for tests.
#[derive(Debug)]
pub struct MemoryStore {
    pub files: RefCell<BTreeMap<String, Vec<u8>>>,
    pub now: RefCell<Stamp>,
}

impl MemoryStore {
    /// An empty folder at a time.
    pub fn at(now: Stamp) -> MemoryStore {
        MemoryStore { files: RefCell::default(), now: RefCell::new(now) }
    }
}

impl Store for MemoryStore {
    fn read(&self, path: &str) -> Result<Option<Vec<u8>>, StoreError> {
        Ok(self.files.borrow().get(path).cloned())
    }

    fn write(&self, path: &str, bytes: &[u8]) -> Result<(), StoreError> {
        self.files.borrow_mut().insert(path.into(), bytes.to_vec());
        Ok(())
    }

    fn rename(&self, from: &str, to: &str) -> Result<(), StoreError> {
        let bytes = self.files.borrow_mut().remove(from).ok_or_else(|| StoreError {
            path: from.into(),
            done: "renamed",
            reason: "there is no such file".into(),
        })?;
        self.files.borrow_mut().insert(to.into(), bytes);
        Ok(())
    }

    fn now(&self) -> Stamp {
        *self.now.borrow()
    }
}
