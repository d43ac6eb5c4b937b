//! Places in text: which file, and which bytes of it.

use std::sync::{Arc, OnceLock};

/// One file among the [`Sources`] of a run.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct FileId(pub u32);

/// A range of bytes in a file, as the file stands on disk.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Place {
    pub file: FileId,
    pub start: u32,
    pub end: u32,
}

impl Place {
    /// The place of the bytes `start..end` of `file`.
    pub fn new(file: FileId, start: usize, end: usize) -> Self {
        Self { file, start: start as u32, end: end as u32 }
    }

    /// The range `start..end` counted from the beginning of this place.
    pub fn within(self, start: usize, end: usize) -> Self {
        Self { file: self.file, start: self.start + start as u32, end: self.start + end as u32 }
    }

    /// The place from the beginning of this one to the end of `other`.
    pub fn to(self, other: Place) -> Self {
        Self { file: self.file, start: self.start, end: other.end.max(self.start) }
    }
}

/// One file as read: its path in the laboratory folder and its bytes, unchanged.
#[derive(Debug, Clone)]
pub struct SourceFile {
    pub path: String,
    pub bytes: Arc<[u8]>,
    /// Found when first asked for: only complaints and listings ask.
    line_starts: OnceLock<Vec<u32>>,
}

impl SourceFile {
    fn new(path: &str, bytes: Arc<[u8]>) -> SourceFile {
        SourceFile { path: path.into(), bytes, line_starts: OnceLock::new() }
    }

    fn line_starts(&self) -> &[u32] {
        self.line_starts.get_or_init(|| std::iter::once(0).chain(memchr_lines(&self.bytes)).collect())
    }

    /// The number of the line, from 1, that holds the byte at `offset`.
    pub fn line_of(&self, offset: u32) -> usize {
        self.line_starts().partition_point(|&start| start <= offset)
    }

    /// The bytes of line `number` (from 1), without its line break.
    pub fn line(&self, number: usize) -> &[u8] {
        let Some(&start) = number.checked_sub(1).and_then(|index| self.line_starts().get(index)) else { return &[] };
        let end = self.line_starts().get(number).map_or(self.bytes.len(), |&next| next as usize);
        let line = &self.bytes[start as usize..end];
        let line = line.strip_suffix(b"\n").unwrap_or(line);
        line.strip_suffix(b"\r").unwrap_or(line)
    }

    /// Where line `number` (from 1) begins and ends, without its line break.
    pub fn line_range(&self, number: usize) -> (usize, usize) {
        let start =
            number.checked_sub(1).and_then(|index| self.line_starts().get(index)).map_or(0, |&start| start as usize);
        (start, start + self.line(number).len())
    }
}

/// All files read in a run. A file enters once and keeps its [`FileId`].
#[derive(Debug, Clone, Default)]
pub struct Sources {
    files: Vec<SourceFile>,
}

impl Sources {
    /// Takes in a file; the same path twice gives the same id.
    pub fn add(&mut self, path: &str, bytes: impl Into<Arc<[u8]>>) -> FileId {
        if let Some(known) = self.find(path) {
            return known;
        }
        self.files.push(SourceFile::new(path, bytes.into()));
        FileId(self.files.len() as u32 - 1)
    }

    /// Puts other bytes in place of those of a file already taken in.
    pub fn replace(&mut self, id: FileId, bytes: impl Into<Arc<[u8]>>) {
        let file = &mut self.files[id.0 as usize];
        *file = SourceFile::new(&file.path, bytes.into());
    }

    /// The id of a file already taken in.
    pub fn find(&self, path: &str) -> Option<FileId> {
        self.files.iter().position(|file| file.path == path).map(|index| FileId(index as u32))
    }

    /// The file behind an id.
    pub fn file(&self, id: FileId) -> &SourceFile {
        &self.files[id.0 as usize]
    }

    /// Path, line and column (both from 1, the column in characters) where a place begins.
    pub fn locate(&self, place: Place) -> (&str, usize, usize) {
        let file = self.file(place.file);
        let line = file.line_of(place.start);
        let (start, _) = file.line_range(line);
        let before = &file.bytes[start..(place.start as usize).min(file.bytes.len()).max(start)];
        let before = before.strip_prefix("\u{feff}".as_bytes()).unwrap_or(before);
        (&file.path, line, String::from_utf8_lossy(before).chars().count() + 1)
    }

    /// The text of a place; bytes that are no UTF-8 show as replacement characters.
    pub fn text(&self, place: Place) -> std::borrow::Cow<'_, str> {
        let bytes = &self.file(place.file).bytes;
        let end = (place.end as usize).min(bytes.len());
        String::from_utf8_lossy(&bytes[(place.start as usize).min(end)..end])
    }
}

fn memchr_lines(bytes: &[u8]) -> impl Iterator<Item = u32> + '_ {
    bytes.iter().enumerate().filter(|(_, byte)| **byte == b'\n').map(|(index, _)| index as u32 + 1)
}
