//! Text gathered from several stretches of one file.
//!
//! A fenced block inside a list or a quotation is not one stretch of its file: each of its lines begins behind the
//! indentation or the quotation mark. [`Segments`] joins the lines and still knows where every byte came from.

use crate::intake::{FileId, Place};

/// Joined text with the way back to its file. Line breaks are single line feeds, whatever the file has.
#[derive(Debug, Clone)]
pub struct Segments {
    file: FileId,
    text: String,
    stretches: Vec<Stretch>,
    /// Where the text stands as long as nothing was pushed.
    empty_at: usize,
}

/// A stretch of the joined text that stands unbroken in the file.
#[derive(Debug, Clone, Copy)]
struct Stretch {
    /// Where it begins in the joined text.
    text_start: usize,
    file_start: usize,
    file_end: usize,
}

impl Segments {
    /// No text yet; complaints about its absence point at byte `offset` of `file`.
    pub fn new(file: FileId, offset: usize) -> Self {
        Self { file, text: String::new(), stretches: Vec::new(), empty_at: offset }
    }

    /// One unbroken piece of text that begins at byte `offset` of `file`.
    pub fn whole(file: FileId, text: &str, offset: usize) -> Self {
        let mut segments = Self::new(file, offset);
        segments.push(text, offset, offset + text.len());
        segments
    }

    /// Appends text that stands at bytes `start..end` of the file.
    pub fn push(&mut self, text: &str, start: usize, end: usize) {
        let mut offset = start;
        for (index, line) in text.split("\r\n").enumerate() {
            if index > 0 {
                self.push_stretch("\n", offset, end);
                offset += 2;
            }
            self.push_stretch(line, offset, end);
            offset += line.len();
        }
    }

    fn push_stretch(&mut self, text: &str, start: usize, end: usize) {
        if text.is_empty() {
            return;
        }
        let file_end = (start + text.len()).min(end).max(start);
        self.stretches.push(Stretch { text_start: self.text.len(), file_start: start, file_end });
        self.text.push_str(text);
    }

    /// The joined text.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// The place in the file of bytes `start..end` of the joined text.
    pub fn place(&self, start: usize, end: usize) -> Place {
        let begin = self.offset(start);
        let finish = if end > start { self.offset(end - 1) + 1 } else { begin };
        Place::new(self.file, begin, finish.max(begin))
    }

    /// The place of all of it.
    pub fn all(&self) -> Place {
        self.place(0, self.text.len())
    }

    fn offset(&self, text_offset: usize) -> usize {
        let after = self.stretches.partition_point(|stretch| stretch.text_start <= text_offset);
        let Some(stretch) = after.checked_sub(1).and_then(|index| self.stretches.get(index)) else {
            return self.empty_at;
        };
        (stretch.file_start + (text_offset - stretch.text_start)).min(stretch.file_end)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn leads_back_to_the_file() {
        let mut segments = Segments::new(FileId(0), 7);
        assert_eq!(segments.all(), Place::new(FileId(0), 7, 7));
        segments.push("a: µ\r\n", 10, 17);
        segments.push("b: 2\n", 20, 25);
        assert_eq!(segments.text(), "a: µ\nb: 2\n");
        assert_eq!(segments.place(3, 5), Place::new(FileId(0), 13, 15));
        assert_eq!(segments.place(6, 7), Place::new(FileId(0), 20, 21));
        assert_eq!(segments.place(3, 6), Place::new(FileId(0), 13, 16));
    }
}
