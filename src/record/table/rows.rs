//! Lines of raw data cut into fields, without a copy.

use crate::diagnostic::{Code, Problem};
use std::ops::Range;

/// Goes through a file line by line.
pub struct Rows<'a> {
    bytes: &'a [u8],
    offset: usize,
    /// The number, from 1, of the line read last.
    pub line: u32,
    pub separator: u8,
}

/// A field's bytes, without blanks and quotation marks around it.
pub type Field = Range<u32>;

impl<'a> Rows<'a> {
    /// Begins before line 1, behind a byte order mark if there is one.
    pub fn new(bytes: &'a [u8]) -> Self {
        let offset = if bytes.starts_with(b"\xef\xbb\xbf") { 3 } else { 0 };
        Self { bytes, offset, line: 0, separator: b',' }
    }

    /// What is left cut into parts of about `size` bytes, each of whole lines and with lines counted from its own first.
    ///
    /// No field holds a line break, so each part can be read by itself.
    pub fn parts(&self, size: usize) -> Vec<Rows<'a>> {
        let (mut parts, mut start) = (Vec::new(), self.offset);
        while start < self.bytes.len() {
            let least = (start + size).min(self.bytes.len());
            let rest = &self.bytes[least..];
            let end = rest.iter().position(|&byte| byte == b'\n').map_or(self.bytes.len(), |at| least + at + 1);
            parts.push(Rows { bytes: &self.bytes[..end], offset: start, line: 0, separator: self.separator });
            start = end;
        }
        parts
    }

    /// The bytes of the next line without its line break.
    pub fn next_line(&mut self) -> Option<Range<usize>> {
        if self.offset >= self.bytes.len() {
            return None;
        }
        let start = self.offset;
        let end = self.bytes[start..].iter().position(|&byte| byte == b'\n').map_or(self.bytes.len(), |at| start + at);
        self.offset = end + 1;
        self.line += 1;
        let carriage_return = end > start && self.bytes[end - 1] == b'\r';
        Some(start..end - usize::from(carriage_return))
    }

    /// Cuts the next line into `fields`, whose old content goes; blank lines are passed over.
    pub fn next_fields(&mut self, fields: &mut Vec<Field>) -> Option<Result<Range<usize>, Problem>> {
        loop {
            fields.clear();
            let start = self.offset;
            if start >= self.bytes.len() {
                return None;
            }
            let cut = self.cut_plain(start, fields);
            self.line += 1;
            if let Some(end) = cut {
                self.offset = end + 1;
                if fields.len() == 1 && fields[0].is_empty() {
                    continue;
                }
                return Some(Ok(start..end));
            }
            // The line has quotation marks.
            self.line -= 1;
            fields.clear();
            let line = self.next_line()?;
            return Some(self.cut_quoted(&line, fields).map(|()| line));
        }
    }

    /// Cuts a line without quotation marks and returns where it ends; gives up at a quotation mark.
    fn cut_plain(&self, start: usize, fields: &mut Vec<Field>) -> Option<usize> {
        let separator = self.separator;
        let mut field_start = start;
        let mut offset = start;
        for &byte in &self.bytes[start..] {
            if byte == separator {
                fields.push(self.trimmed(field_start, offset));
                field_start = offset + 1;
            } else if byte == b'\n' {
                break;
            } else if byte == b'"' {
                return None;
            }
            offset += 1;
        }
        fields.push(self.trimmed(field_start, offset));
        Some(offset)
    }

    /// Cuts a line in which fields may stand in quotation marks.
    pub fn cut_quoted(&self, line: &Range<usize>, fields: &mut Vec<Field>) -> Result<(), Problem> {
        let mut start = line.start;
        loop {
            let from =
                start + self.bytes[start..line.end].iter().take_while(|&&byte| is_blank(byte, self.separator)).count();
            let quoted = self.bytes[from..line.end].first() == Some(&b'"');
            let inside_end = if quoted { self.closing_mark(from + 1, line.end)? } else { from };
            let end = self.bytes[inside_end..line.end]
                .iter()
                .position(|&byte| byte == self.separator)
                .map_or(line.end, |at| inside_end + at);
            if quoted {
                let behind = self.trimmed(inside_end + 1, end.max(inside_end + 1));
                if !behind.is_empty() {
                    let problem = Problem::new(Code::CellUnreadable, "has text behind closing quotation marks");
                    return Err(problem.range(inside_end + 1 - line.start, end - line.start));
                }
                fields.push(from as u32 + 1..inside_end as u32);
            } else {
                fields.push(self.trimmed(from, end));
            }
            if end >= line.end {
                return Ok(());
            }
            start = end + 1;
        }
    }

    /// Where the quotation marks opened before `start` close; doubled ones stand for one.
    fn closing_mark(&self, start: usize, end: usize) -> Result<usize, Problem> {
        let mut offset = start;
        while offset < end {
            match (self.bytes[offset], self.bytes[offset + 1..end].first()) {
                (b'"', Some(b'"')) => offset += 2,
                (b'"', _) => return Ok(offset),
                _ => offset += 1,
            }
        }
        let problem = Problem::new(Code::CellUnreadable, "opens quotation marks that are not closed on the same line");
        Err(problem.hint("A field of raw data cannot hold a line break."))
    }

    fn trimmed(&self, start: usize, end: usize) -> Field {
        let (mut start, mut end) = (start, end);
        while start < end && is_blank(self.bytes[start], self.separator) {
            start += 1;
        }
        while start < end && is_blank(self.bytes[end - 1], self.separator) {
            end -= 1;
        }
        start as u32..end as u32
    }
}

fn is_blank(byte: u8, separator: u8) -> bool {
    matches!(byte, b' ' | b'\t' | b'\r') && byte != separator
}
