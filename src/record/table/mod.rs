//! Raw data: columns of a CSV file.
//!
//! One header line, then one row a line, as many fields as the header has. Only the columns asked for are read, in one
//! pass over the bytes. Fields are separated by commas; by semicolons or tabs where the header shows it.

mod number;
mod rows;

use super::Text;
use crate::diagnostic::{Code, Complaint, Complaints, Problem, nearest};
use crate::intake::{FileId, Place};
use number::parse_number;
use rayon::prelude::*;
use rows::{Field, Rows};
use std::ops::Range;

/// A column a block asks for.
#[derive(Debug, Clone, PartialEq)]
pub struct WantedColumn {
    /// The head of the column in the file, with the place in the record that names it.
    pub head: Text,
    pub content: Content,
}

/// What the cells of a column hold.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Content {
    Number,
    Text,
}

/// Keeps only the rows whose cell under `head` reads `equals`.
#[derive(Debug, Clone, PartialEq)]
pub struct RowFilter {
    pub head: Text,
    pub equals: String,
}

/// What was read.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Columns {
    /// The number of the line, from 1, of each kept row.
    pub rows: Vec<u32>,
    /// In the order asked for, each as long as `rows`; an unknown column is empty.
    pub columns: Vec<ColumnData>,
}

/// The cells of one column.
#[derive(Debug, Clone, PartialEq)]
pub enum ColumnData {
    Numbers(Vec<f64>),
    Texts(Vec<String>),
}

/// Bytes of a part of a file, about; parts are read side by side.
const PART: usize = 1 << 20;

/// Complaints printed for the rows of one file, at most.
const MOST_COMPLAINTS: usize = 20;

/// Reads the wanted columns of a file whose heads stand on line `header_line` (from 1). Rows with a fault are left out.
///
/// # Errors
/// `column_unknown` at the places of the record; `cell_unreadable` and `decimal_comma` at the cells; `design_incomplete`
/// where no row is left.
pub fn read_columns(
    bytes: &[u8],
    file: FileId,
    header_line: usize,
    wanted: &[WantedColumn],
    filter: Option<&RowFilter>,
) -> (Columns, Complaints) {
    let mut table = Table::new(bytes, file, wanted);
    if u32::try_from(bytes.len()).is_err() {
        let problem = Problem::new(Code::CellUnreadable, "The file is longer than 4 GiB, the most that can be read.");
        table.complaints.add_at(problem, Place::new(file, 0, 0));
        return (table.columns, table.complaints);
    }
    let mut rows = Rows::new(bytes);
    if let Some(heads) = table.header(&mut rows, header_line, wanted, filter) {
        table.read(rows, &heads, wanted, filter);
    }
    table.finish()
}

impl ColumnData {
    fn empty(content: Content) -> Self {
        match content {
            Content::Number => Self::Numbers(Vec::new()),
            Content::Text => Self::Texts(Vec::new()),
        }
    }

    fn append(&mut self, other: Self) {
        match (self, other) {
            (Self::Numbers(numbers), Self::Numbers(more)) => numbers.extend_from_slice(&more),
            (Self::Texts(texts), Self::Texts(more)) => texts.extend(more),
            _ => {}
        }
    }

    fn reserve(&mut self, more: usize) {
        match self {
            Self::Numbers(numbers) => numbers.reserve_exact(more),
            Self::Texts(texts) => texts.reserve_exact(more),
        }
    }

    fn truncate(&mut self, length: usize) {
        match self {
            Self::Numbers(numbers) => numbers.truncate(length),
            Self::Texts(texts) => texts.truncate(length),
        }
    }
}

/// The heads of a file and where the wanted ones stand.
struct Heads {
    names: Vec<String>,
    /// For each wanted column its index in the file, if the file has it.
    indices: Vec<Option<usize>>,
    filter: Option<usize>,
}

struct Table<'a> {
    bytes: &'a [u8],
    file: FileId,
    columns: Columns,
    complaints: Complaints,
    /// Complaints beyond the most printed: how many, the first of them.
    left_out: Option<(usize, Complaint)>,
}

impl<'a> Table<'a> {
    fn new(bytes: &'a [u8], file: FileId, wanted: &[WantedColumn]) -> Table<'a> {
        let columns = wanted.iter().map(|column| ColumnData::empty(column.content)).collect();
        let columns = Columns { rows: Vec::new(), columns };
        Table { bytes, file, columns, complaints: Complaints::default(), left_out: None }
    }

    /// Reads the header line and chooses the separator that finds most of the wanted heads.
    fn header(
        &mut self,
        rows: &mut Rows<'_>,
        header_line: usize,
        wanted: &[WantedColumn],
        filter: Option<&RowFilter>,
    ) -> Option<Heads> {
        let mut line = rows.next_line();
        while line.is_some() && (rows.line as usize) < header_line {
            line = rows.next_line();
        }
        let Some(line) = line else {
            let message = format!(
                "Line {header_line} should hold the heads of the columns, but the file has {} lines.",
                rows.line
            );
            let end = self.bytes.len();
            self.complaints.add_at(Problem::new(Code::ColumnUnknown, message), Place::new(self.file, end, end));
            return None;
        };
        let asked: Vec<&Text> = wanted.iter().map(|column| &column.head).chain(filter.map(|rule| &rule.head)).collect();
        let names = self.names(rows, &line, &asked);
        let mut found = asked.iter().map(|head| self.find(head, &names, rows.separator)).collect::<Vec<_>>();
        let filter_index = if filter.is_some() { found.pop().flatten() } else { None };
        // Without its filter a file would give rows nobody asked for.
        (filter.is_none() || filter_index.is_some()).then_some(Heads { names, indices: found, filter: filter_index })
    }

    fn names(&mut self, rows: &mut Rows<'_>, line: &Range<usize>, asked: &[&Text]) -> Vec<String> {
        let mut best: Option<(usize, u8, Vec<String>)> = None;
        for separator in [b',', b';', b'\t'] {
            rows.separator = separator;
            let mut fields = Vec::new();
            // A header that cannot be cut with this separator finds no heads.
            let _ = rows.cut_quoted(line, &mut fields);
            let names: Vec<String> = fields.iter().map(|field| self.text(field)).collect();
            let hits = asked.iter().filter(|head| names.contains(&head.text)).count();
            let better = match &best {
                None => true,
                // With no head found, the separator that cuts at all is the likelier one.
                Some((most, _, chosen)) => hits > *most || (hits == *most && hits == 0 && names.len() > chosen.len()),
            };
            if better {
                best = Some((hits, separator, names));
            }
        }
        let (_, separator, names) = best.unwrap_or_default();
        rows.separator = separator;
        names
    }

    /// The index of a head that the file has once.
    fn find(&mut self, head: &Text, names: &[String], separator: u8) -> Option<usize> {
        let mut found = names.iter().enumerate().filter(|(_, name)| **name == head.text).map(|(index, _)| index);
        let problem = match (found.next(), found.count()) {
            (Some(index), 0) => return Some(index),
            (Some(_), more) => {
                let message =
                    format!("The raw data file has {} columns “{}”, but one was expected.", more + 1, head.text);
                Problem::new(Code::ColumnUnknown, message).hint("Give each column of the file a head of its own.")
            }
            (None, _) => {
                let message = format!("The raw data file has no column “{}”.", head.text);
                let problem = Problem::new(Code::ColumnUnknown, message);
                // A head of one letter is near to every other one.
                let near = nearest(&head.text, names.iter().map(String::as_str)).filter(|_| head.text.len() > 1);
                match near {
                    Some(near) => problem.hint(format!("Perhaps “{near}” is meant.")),
                    None => problem.hint(format!(
                        "Its columns, separated by {}, are: {}.",
                        separator_name(separator),
                        list(names)
                    )),
                }
            }
        };
        self.complaints.add_at(problem, head.place);
        None
    }

    fn read(&mut self, mut rows: Rows<'_>, heads: &Heads, wanted: &[WantedColumn], filter: Option<&RowFilter>) {
        if !self.read_parts(&rows, heads, wanted, filter) {
            self.read_rows(&mut rows, heads, filter);
        }
        let any_known = wanted.is_empty() || heads.indices.iter().any(Option::is_some);
        if self.columns.rows.is_empty() && any_known && !self.complaints.has_faults() {
            self.nothing_left(filter);
        }
    }

    /// Reads a long file part by part, side by side, and joins the parts in order. A file with a fault is not read this
    /// way, so that complaints come out as they do line by line.
    fn read_parts(
        &mut self,
        rows: &Rows<'_>,
        heads: &Heads,
        wanted: &[WantedColumn],
        filter: Option<&RowFilter>,
    ) -> bool {
        let parts = rows.parts(PART);
        if parts.len() < 2 {
            return false;
        }
        let (bytes, file) = (self.bytes, self.file);
        let read = |mut part: Rows<'_>| {
            let mut table = Table::new(bytes, file, wanted);
            table.read_rows(&mut part, heads, filter);
            table.complaints.list.is_empty().then_some((table.columns, part.line))
        };
        let Some(read) = parts.into_par_iter().map(read).collect::<Option<Vec<(Columns, u32)>>>() else {
            return false;
        };
        let mut above = rows.line;
        let mut pieces: Vec<Vec<ColumnData>> = wanted.iter().map(|_| Vec::with_capacity(read.len())).collect();
        for (part, lines) in read {
            self.columns.rows.extend(part.rows.iter().map(|line| above + line));
            pieces.iter_mut().zip(part.columns).for_each(|(pieces, column)| pieces.push(column));
            above += lines;
        }
        let count = self.columns.rows.len();
        self.columns.columns.par_iter_mut().zip(pieces).for_each(|(column, pieces)| {
            column.reserve(count);
            pieces.into_iter().for_each(|piece| column.append(piece));
        });
        true
    }

    /// Reads line by line.
    fn read_rows(&mut self, rows: &mut Rows<'_>, heads: &Heads, filter: Option<&RowFilter>) {
        let mut fields: Vec<Field> = Vec::with_capacity(heads.names.len());
        while let Some(row) = rows.next_fields(&mut fields) {
            let line = rows.line;
            match row {
                Ok(_) if fields.len() == heads.names.len() => {
                    let cell = heads.filter.and_then(|index| fields.get(index));
                    let kept = filter.is_none_or(|rule| cell.is_some_and(|cell| self.reads(cell, &rule.equals)));
                    if kept {
                        self.row(line, &fields, heads);
                    }
                }
                Ok(range) => self.field_count(line, range, fields.len(), heads.names.len(), rows.separator),
                Err(problem) => self.quotation(line, problem),
            }
        }
    }

    /// Appends the wanted cells of a row, or complains and leaves the row out.
    fn row(&mut self, line: u32, fields: &[Field], heads: &Heads) {
        let kept = self.columns.rows.len();
        let mut whole = true;
        for (wanted, index) in heads.indices.iter().enumerate() {
            let Some(index) = *index else { continue };
            let (Some(field), Some(column)) = (fields.get(index), self.columns.columns.get_mut(wanted)) else {
                continue;
            };
            let cell = &self.bytes[field.start as usize..field.end as usize];
            let problem = match column {
                ColumnData::Numbers(numbers) => parse_number(cell).map(|number| numbers.push(number)),
                ColumnData::Texts(texts) => parse_text(cell).map(|text| texts.push(text)),
            };
            if let Err(problem) = problem {
                whole = false;
                self.cell(line, field, heads.names.get(index).map_or("", String::as_str), problem);
            }
        }
        if whole {
            self.columns.rows.push(line);
        } else {
            self.columns.columns.iter_mut().for_each(|column| column.truncate(kept));
        }
    }

    fn cell(&mut self, line: u32, field: &Field, head: &str, mut problem: Problem) {
        problem.message = format!("The cell in line {line} under “{head}” {}.", problem.message);
        self.complain(problem.at(Place { file: self.file, start: field.start, end: field.end }));
    }

    fn quotation(&mut self, line: u32, mut problem: Problem) {
        problem.message = format!("Line {line} {}.", problem.message);
        let (mut start, mut number) = (0, 1);
        for (offset, _) in self.bytes.iter().enumerate().filter(|(_, byte)| **byte == b'\n') {
            if number == line {
                break;
            }
            (start, number) = (offset + 1, number + 1);
        }
        let length = self.bytes[start..].iter().take_while(|byte| **byte != b'\n').count();
        self.complain(problem.at(Place::new(self.file, start, start + length)));
    }

    fn field_count(&mut self, line: u32, row: Range<usize>, found: usize, expected: usize, separator: u8) {
        let message = format!("Line {line} has {found} fields, but the header has {expected}.");
        let mut problem = Problem::new(Code::CellUnreadable, message);
        if found > expected && separator == b',' {
            problem = problem.hint("A decimal comma splits a number in two: write decimal points.");
        }
        self.complain(problem.at(Place::new(self.file, row.start, row.end)));
    }

    fn nothing_left(&mut self, filter: Option<&RowFilter>) {
        let (message, place) = match filter {
            Some(rule) => {
                let message = format!("No row of the raw data file has “{}” under “{}”.", rule.equals, rule.head.text);
                (message, rule.head.place)
            }
            None => ("The raw data file has no rows below its header.".into(), Place::new(self.file, 0, 0)),
        };
        let problem = Problem::new(Code::DesignIncomplete, message).hint("Check the file and the text under `rows:`.");
        self.complaints.add_at(problem, place);
    }

    fn complain(&mut self, mut complaint: Complaint) {
        if complaint.hints.is_empty() {
            let text = "Correct it from the instrument's own log; a reading that does not exist is left out with rule and reason.";
            complaint.hints.push(crate::diagnostic::Hint { text: text.into(), place: None });
        }
        if self.complaints.list.len() < MOST_COMPLAINTS {
            return self.complaints.add(complaint);
        }
        match &mut self.left_out {
            Some((count, _)) => *count += 1,
            None => self.left_out = Some((1, complaint)),
        }
    }

    fn finish(mut self) -> (Columns, Complaints) {
        match self.left_out.take() {
            Some((1, complaint)) => self.complaints.add(complaint),
            Some((count, mut complaint)) => {
                complaint.message = format!("{} The file has {} more such faults.", complaint.message, count - 1);
                self.complaints.add(complaint);
            }
            None => {}
        }
        (self.columns, self.complaints)
    }

    fn reads(&self, field: &Field, expected: &str) -> bool {
        let cell = &self.bytes[field.start as usize..field.end as usize];
        cell == expected.as_bytes() || (cell.contains(&b'"') && self.text(field) == expected)
    }

    fn text(&self, field: &Field) -> String {
        let cell = &self.bytes[field.start as usize..field.end as usize];
        String::from_utf8_lossy(cell).replace("\"\"", "\"")
    }
}

fn parse_text(cell: &[u8]) -> Result<String, Problem> {
    match std::str::from_utf8(cell) {
        Ok("") => Err(Problem::new(Code::CellUnreadable, "is empty, but a text was expected")),
        Ok(text) if text.contains('"') => Ok(text.replace("\"\"", "\"")),
        Ok(text) => Ok(text.into()),
        Err(_) => Err(Problem::new(Code::CellUnreadable, "holds bytes that are no UTF-8 text")),
    }
}

fn separator_name(separator: u8) -> &'static str {
    match separator {
        b';' => "semicolons",
        b'\t' => "tabs",
        _ => "commas",
    }
}

fn list(names: &[String]) -> String {
    names.iter().map(|name| format!("“{name}”")).collect::<Vec<_>>().join(", ")
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const FILE: FileId = FileId(1);

    fn head(text: &str) -> Text {
        Text { text: text.into(), place: Place::new(FileId(0), 0, text.len()) }
    }

    fn wanted(columns: &[(&str, Content)]) -> Vec<WantedColumn> {
        columns.iter().map(|(name, content)| WantedColumn { head: head(name), content: *content }).collect()
    }

    fn read(text: &str) -> (Columns, Complaints) {
        read_columns(text.as_bytes(), FILE, 1, &wanted(&[("m", Content::Number), ("which", Content::Text)]), None)
    }

    fn expected(rows: &[u32], numbers: &[f64], texts: &[&str]) -> Columns {
        let texts = texts.iter().map(|text| text.to_string()).collect();
        Columns { rows: rows.into(), columns: vec![ColumnData::Numbers(numbers.into()), ColumnData::Texts(texts)] }
    }

    #[test]
    fn reads_columns_in_any_dress() {
        let all = expected(&[2, 3], &[1.5, -2.0], &["A", "B"]);
        for text in [
            "t,which,m\n0,A,1.5\n9,B,-2\n",
            "\u{feff}t,which,m\r\n0,A,1.5\r\n9,B,-2",
            "t;which;m\n0;A;1.5\n9;B;-2\n\n",
            "t\twhich\tm\n\tA\t+1.5\n\tB\t−2\n",
            "m , \"which\"\n\"1.5\",\"A\"\n -2.0 , B \n",
        ] {
            assert_eq!(read(text), (all.clone(), Complaints::default()), "{text}");
        }
        assert_eq!(read("m,which\n1,\"a \"\"b\"\", c\"\n").0, expected(&[2], &[1.0], &["a \"b\", c"]));
    }

    #[test]
    fn filters_rows_and_skips_to_the_header() {
        let filter = RowFilter { head: head("pair"), equals: "SS2-SS1".into() };
        let text = "made by the bench\n\npair,m\nSS2-SS1,1\nSS3-SS1,x\nSS2-SS1,3\n";
        let (columns, complaints) =
            read_columns(text.as_bytes(), FILE, 3, &wanted(&[("m", Content::Number)]), Some(&filter));
        assert_eq!((complaints.list.len(), columns.rows), (0, vec![4, 6]));
        let none = RowFilter { equals: "SS9".into(), ..filter };
        let (_, complaints) = read_columns(text.as_bytes(), FILE, 3, &wanted(&[("m", Content::Number)]), Some(&none));
        assert_eq!(complaints.list[0].code, Code::DesignIncomplete);
    }

    /// Parts read side by side give what one pass gives, lines and complaints included.
    #[test]
    fn a_long_file_is_read_part_by_part() {
        let rows = 150_000u32;
        let mut text = String::from("which,m\n");
        for row in 0..rows {
            let blank = if row % 1000 == 7 { "\n" } else { "" };
            text.push_str(&format!("\"A {row}\",{}.25\n{blank}", row * 7));
        }
        assert!(Rows::new(text.as_bytes()).parts(PART).len() > 2);
        let (columns, complaints) = read(&text);
        assert_eq!(complaints, Complaints::default());
        let lines: Vec<u32> = (0..rows).map(|row| row + 2 + (row + 992) / 1000).collect();
        let numbers: Vec<f64> = (0..rows).map(|row| f64::from(row * 7) + 0.25).collect();
        let texts: Vec<String> = (0..rows).map(|row| format!("A {row}")).collect();
        assert_eq!(columns.rows, lines);
        assert_eq!(columns.columns, [ColumnData::Numbers(numbers), ColumnData::Texts(texts)]);
        text.push_str("B,1,5\n");
        let (columns, complaints) = read(&text);
        let last = lines[lines.len() - 1] + 1;
        assert_eq!(columns.rows, lines);
        assert_eq!(complaints.list.len(), 1);
        assert!(
            complaints.list[0].message.starts_with(&format!("Line {last} has 3 fields")),
            "{}",
            complaints.list[0].message
        );
    }

    fn complaints(text: &str) -> Vec<(Code, String)> {
        let list = read(text).1.list;
        let shown = |place: Place| match place.file {
            FILE => text[place.start as usize..place.end as usize].to_string(),
            _ => "record".into(),
        };
        list.into_iter().map(|complaint| (complaint.code, complaint.place.map_or(String::new(), shown))).collect()
    }

    #[test]
    fn complains_at_the_cell() {
        assert_eq!(
            complaints("m,which\nNaN,A\n,A\n1,\n1;5,A\n"),
            [
                (Code::CellUnreadable, "NaN".into()),
                (Code::CellUnreadable, "".into()),
                (Code::CellUnreadable, "".into()),
                (Code::CellUnreadable, "1;5".into()),
            ]
        );
        assert_eq!(complaints("m;which\n1,5;A\n"), [(Code::DecimalComma, "1,5".into())]);
        assert_eq!(
            complaints("m,which\n1,5,A\n7\n"),
            [(Code::CellUnreadable, "1,5,A".into()), (Code::CellUnreadable, "7".into())]
        );
        assert_eq!(complaints("m,which\n1,\"A\n2,B\n"), [(Code::CellUnreadable, "1,\"A".into())]);
        assert_eq!(complaints("m,which\n1,\"A\"x\n2,B\n"), [(Code::CellUnreadable, "x".into())]);
        let message = &read("m,which\n1,A\nx,B\n").1.list[0].message;
        assert_eq!(message, "The cell in line 3 under “m” holds “x”, but a number was expected.");
        assert_eq!(read("m,which\nx,A\n1,B\n").0, expected(&[3], &[1.0], &["B"]));
    }

    #[test]
    fn complains_of_columns_at_the_record() {
        let record = (Code::ColumnUnknown, String::from("record"));
        assert_eq!(complaints("m,wich\n1,A\n"), std::slice::from_ref(&record));
        assert!(read("m,wich\n1,A\n").1.list[0].hints[0].text.contains("“wich”"));
        assert_eq!(complaints("m,m,which\n1,1,A\n"), std::slice::from_ref(&record));
        assert!(read("a;b\n1;2\n").1.list[0].hints[0].text.contains("separated by semicolons, are: “a”, “b”"));
        assert_eq!(complaints(""), [(Code::ColumnUnknown, "".into())]);
        assert_eq!(complaints("m,which\n"), [(Code::DesignIncomplete, "".into())]);
    }

    #[test]
    fn stops_listing_after_twenty() {
        let (_, complaints) = read(&format!("m,which\n{}", "x,A\n".repeat(100)));
        assert_eq!(complaints.list.len(), 21);
        assert!(complaints.list[20].message.ends_with("The file has 79 more such faults."));
    }

    proptest! {
        #[test]
        fn survives_any_bytes(bytes in proptest::collection::vec(proptest::sample::select(b"m,w\"\n\r; \t1.\xff\xef\xbb\xbf".to_vec()), 0..80), line in 0usize..4) {
            let filter = RowFilter { head: head("w"), equals: "1".into() };
            for filter in [None, Some(&filter)] {
                let (columns, _) = read_columns(&bytes, FILE, line, &wanted(&[("m", Content::Number), ("w", Content::Text)]), filter);
                for column in &columns.columns {
                    let length = match column { ColumnData::Numbers(numbers) => numbers.len(), ColumnData::Texts(texts) => texts.len() };
                    prop_assert!(length == columns.rows.len() || length == 0);
                }
            }
        }
    }
}
