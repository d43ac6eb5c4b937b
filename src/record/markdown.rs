//! A Markdown file taken apart: front matter, measurement blocks, prose.

use super::{Node, NodeData, Segments, Text, read_yaml};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::intake::{FileId, Place, Sources};
use pulldown_cmark::{CodeBlockKind, Event, Options, Parser, Tag, TagEnd};
use std::ops::Range;

/// One record: a Markdown file read, with nothing interpreted.
#[derive(Debug, Clone, PartialEq)]
pub struct Record {
    pub file: FileId,
    /// The front matter, a mapping, if the record begins with one.
    pub front: Option<Node>,
    /// What stands as `record:` in the front matter.
    pub id: Option<Text>,
    /// In the order of the text.
    pub blocks: Vec<MeasurementBlock>,
    /// All behind the front matter.
    pub body: Place,
    /// The body without the measurement blocks.
    pub prose: Vec<Place>,
}

/// A fenced block `yaml KIND NAME`.
#[derive(Debug, Clone, PartialEq)]
pub struct MeasurementBlock {
    pub kind: Text,
    pub name: Text,
    pub body: Node,
    /// The whole fence, from its opening to its closing line.
    pub place: Place,
    /// False where a complaint already says that the body could not be read: it is empty then, and says nothing.
    pub readable: bool,
}

/// The kinds of Markdown that records use, the same for reading and for typesetting.
pub fn markdown_options() -> Options {
    Options::ENABLE_TABLES | Options::ENABLE_FOOTNOTES | Options::ENABLE_STRIKETHROUGH | Options::ENABLE_MATH
}

/// Whether `word` can name a block: a letter followed by letters, digits and underscores, all of them ASCII.
pub fn is_name(word: &str) -> bool {
    word.starts_with(|c: char| c.is_ascii_alphabetic()) && word.chars().all(|c| c.is_ascii_alphanumeric() || c == '_')
}

/// Reads one record. Faulty parts are left out, each with its complaint; the rest stands.
///
/// # Errors
/// `record_unreadable`, `unclosed_fence`, `name_invalid`, and those of [`read_yaml`].
pub fn read_record(file: FileId, sources: &Sources) -> (Record, Complaints) {
    let mut complaints = Complaints::default();
    let bytes: &[u8] = &sources.file(file).bytes;
    let whole = Place::new(file, 0, bytes.len());
    let mut record = Record { file, front: None, id: None, blocks: Vec::new(), body: whole, prose: vec![whole] };
    let Some(text) = complaints.keep(readable_text(bytes), whole) else { return (record, complaints) };
    let text_start = if text.starts_with('\u{feff}') { '\u{feff}'.len_utf8() } else { 0 };
    let body_start = match find_front(text, text_start) {
        Front::Absent => text_start,
        Front::Unclosed => {
            let problem = Problem::new(Code::RecordUnreadable, "The front matter opened by `---` is never closed.")
                .hint("Put a line `---` behind its last field.");
            complaints.add_at(problem, Place::new(file, text_start, text_start + 3));
            return (record, complaints);
        }
        Front::Found { content, body } => {
            let source = Segments::whole(file, &text[content.clone()], content.start);
            let (front, found) = read_yaml(&source);
            complaints.extend(found);
            record.take_front(front, &mut complaints);
            body
        }
    };
    record.body = Place::new(file, body_start, bytes.len());
    Fences { file, text, base: body_start, record: &mut record, complaints: &mut complaints }.read();
    record.prose = prose_between(&record);
    (record, complaints)
}

impl Record {
    fn take_front(&mut self, front: Node, complaints: &mut Complaints) {
        match &front.data {
            NodeData::Map(_) => {
                self.id = front.get("record").and_then(Node::to_text);
                self.front = Some(front);
            }
            NodeData::Empty => {}
            _ => {
                let message =
                    format!("The front matter is {}, but fields `name: value` were expected.", front.describe());
                complaints.add_at(Problem::new(Code::RecordUnreadable, message), front.place);
            }
        }
    }
}

/// The text, if all of it is UTF-8 without NUL.
fn readable_text(bytes: &[u8]) -> Result<&str, Problem> {
    let at_line = |offset: usize| 1 + bytes[..offset].iter().filter(|&&byte| byte == b'\n').count();
    let text = std::str::from_utf8(bytes).map_err(|error| {
        let offset = error.valid_up_to();
        let message =
            format!("The record is no UTF-8 text: line {} holds a byte that is no character.", at_line(offset));
        Problem::new(Code::RecordUnreadable, message).hint("Save the record as UTF-8.").range(offset, offset + 1)
    })?;
    match text.find('\0') {
        Some(offset) => {
            let message = format!("Line {} holds a NUL character, so the record is no text.", at_line(offset));
            Err(Problem::new(Code::RecordUnreadable, message).range(offset, offset + 1))
        }
        None => Ok(text),
    }
}

enum Front {
    Absent,
    Unclosed,
    Found { content: Range<usize>, body: usize },
}

/// Front matter stands at the very start only, between two lines `---`.
fn find_front(text: &str, start: usize) -> Front {
    let mut lines = text[start..].split_inclusive('\n');
    let is_rule = |line: &str| line.trim_end() == "---";
    let Some(first) = lines.next().filter(|line| is_rule(line)) else { return Front::Absent };
    let content_start = start + first.len();
    let mut offset = content_start;
    for line in lines {
        if is_rule(line) {
            return Front::Found { content: content_start..offset, body: offset + line.len() };
        }
        offset += line.len();
    }
    Front::Unclosed
}

/// The stretches of the body between measurement blocks.
fn prose_between(record: &Record) -> Vec<Place> {
    let mut prose = Vec::new();
    let mut start = record.body.start;
    let end = record.body.end;
    for block in &record.blocks {
        prose.push(Place { start, end: block.place.start.max(start), ..record.body });
        start = block.place.end.max(start);
    }
    prose.push(Place { start, end: end.max(start), ..record.body });
    prose.retain(|place| place.end > place.start);
    prose
}

/// Finds the fenced blocks of a body.
struct Fences<'a> {
    file: FileId,
    text: &'a str,
    /// Where the body begins in the file.
    base: usize,
    record: &'a mut Record,
    complaints: &'a mut Complaints,
}

impl Fences<'_> {
    fn read(&mut self) {
        let base = self.base;
        let body = &self.text[base..];
        let mut events = Parser::new_ext(body, markdown_options()).into_offset_iter();
        while let Some((event, range)) = events.next() {
            let Event::Start(Tag::CodeBlock(kind)) = event else { continue };
            let fence = base + range.start..base + range.end;
            let mut source = Segments::new(self.file, self.first_line_end(&fence));
            let mut content_end = self.first_line_end(&fence);
            for (event, range) in events.by_ref() {
                match event {
                    Event::End(TagEnd::CodeBlock) => break,
                    Event::Text(text) => {
                        let (start, end) = (base + range.start, base + range.end);
                        let typed = self.text.get(start..end).unwrap_or_default();
                        let same = typed.replace("\r\n", "\n") == text.replace("\r\n", "\n");
                        source.push(if same { typed } else { &text }, start, end);
                        content_end = content_end.max(end);
                    }
                    _ => {}
                }
            }
            match kind {
                CodeBlockKind::Fenced(_) => self.fence(fence, content_end, &source),
                CodeBlockKind::Indented => self.indented(&fence, &source),
            }
        }
    }

    fn first_line_end(&self, fence: &Range<usize>) -> usize {
        let text = self.text.get(fence.clone()).unwrap_or_default();
        fence.start + text.find(['\r', '\n']).unwrap_or(text.len())
    }

    fn fence(&mut self, fence: Range<usize>, content_end: usize, source: &Segments) {
        let opening_end = self.first_line_end(&fence);
        let opening = self.text.get(fence.start..opening_end).unwrap_or_default();
        let words = self.words(opening, fence.start);
        if !is_closed(self.text.get(content_end..fence.end).unwrap_or_default()) {
            let problem = Problem::new(Code::UnclosedFence, "The fenced block opened here is never closed.")
                .hint("Put a line of the same marks behind its last line, indented like the first.");
            self.complaints.add_at(problem, Place::new(self.file, fence.start, opening_end));
            return;
        }
        let [first, rest @ ..] = words.as_slice() else { return };
        if first.text != "yaml" {
            return self.almost_yaml(first, rest);
        }
        let [kind, names @ ..] = rest else { return };
        let Some(name) = self.name(kind, names) else { return };
        let (body, found) = read_yaml(source);
        let readable = !found.list.iter().any(|complaint| complaint.code == Code::YamlUnreadable);
        self.complaints.extend(found);
        let place = Place::new(self.file, fence.start, fence.end);
        self.record.blocks.push(MeasurementBlock { kind: kind.clone(), name, body, place, readable });
    }

    /// The words of an opening line, behind its marks.
    fn words(&self, opening: &str, start: usize) -> Vec<Text> {
        let info = opening.trim_start().trim_start_matches(['`', '~']);
        let mut offset = start + (opening.len() - info.len());
        let mut words = Vec::new();
        for word in info.split([' ', '\t']) {
            if !word.is_empty() {
                let place = Place::new(self.file, offset, offset + word.len());
                words.push(Text { text: word.into(), place });
            }
            offset += word.len() + 1;
        }
        words
    }

    fn name(&mut self, kind: &Text, names: &[Text]) -> Option<Text> {
        let (message, place) = match names {
            [] => (format!("This {} block has no name.", kind.text), kind.place),
            [name] if is_name(&name.text) => return Some(name.clone()),
            [name] => (format!("“{}” cannot name a block.", name.text), name.place),
            [first, .., last] => {
                ("A block has one name, but several words stand here.".into(), first.place.to(last.place))
            }
        };
        let problem = Problem::new(Code::NameInvalid, message).hint(
            "A name is one word behind the kind: a letter followed by letters, digits and underscores, as in S3.",
        );
        self.complaints.add_at(problem, place);
        None
    }

    /// A fence that was surely meant as a measurement block must not become prose in silence.
    fn almost_yaml(&mut self, first: &Text, rest: &[Text]) {
        let almost = first.text.eq_ignore_ascii_case("yaml") || first.text.eq_ignore_ascii_case("yml");
        if almost && matches!(rest, [_, name] if is_name(&name.text)) {
            let message = format!("A measurement block begins with the word yaml, but “{}” stands here.", first.text);
            let problem = Problem::new(Code::NameInvalid, message).hint("Write `yaml` in lower case.");
            self.complaints.add_at(problem, first.place);
        }
    }

    /// The same for a fence that four spaces turn into text.
    fn indented(&mut self, block: &Range<usize>, source: &Segments) {
        let opening = source.text().lines().find(|line| line.starts_with("```yaml ") || line.starts_with("~~~yaml "));
        if opening.is_some_and(|line| line.split_whitespace().count() == 3) {
            let message = "The measurement block here is indented by four spaces or a tab, which makes it plain text.";
            let problem = Problem::new(Code::UnclosedFence, message).hint(
                "Move the block to the left margin, or write text that only shows a block inside a longer fence.",
            );
            self.complaints.add_at(problem, Place::new(self.file, block.start, self.first_line_end(block)));
        }
    }
}

/// Whether what follows the content of a fence is its closing line.
fn is_closed(rest: &str) -> bool {
    rest.contains("```") || rest.contains("~~~")
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const RECORD: &str = "---\nrecord: 2041-K17\ndate: 2041-03-12\nperformed_by: duty metrologist\n---\n# Weighing\n\nProse µ.\n
```yaml mass-standard K17\nlabel: \"K-17\"\nnominal: 1 kg\nexpansion: 45(2)e-6 /K\n```\n\n- In a list:\n
  ```yaml ambient A1\n  thermometer: T4\n  readings:\n    - {time: 2041-03-12T09:10:00Z, temperature: 20.134 °C}\n  ```\n
> ~~~yaml person P1\n> role: duty metrologist\n> activities: [review]\n> ~~~\n\n```text\nnot a block\n```\n";

    fn read(bytes: &[u8]) -> (Record, Complaints, Sources) {
        let mut sources = Sources::default();
        let file = sources.add("r.md", bytes);
        let (record, complaints) = read_record(file, &sources);
        (record, complaints, sources)
    }

    fn check_places(node: &Node, sources: &Sources) {
        match &node.data {
            NodeData::Empty => {}
            NodeData::Scalar { text, .. } => assert_eq!(&sources.text(node.place), text),
            NodeData::List(items) => items.iter().for_each(|item| check_places(item, sources)),
            NodeData::Map(entries) => entries.iter().for_each(|entry| {
                assert_eq!(sources.text(entry.key.place), entry.key.text);
                check_places(&entry.value, sources);
            }),
        }
    }

    fn check(text: &str) {
        let (record, complaints, sources) = read(text.as_bytes());
        assert_eq!(complaints.list, []);
        assert_eq!(record.id.as_ref().map(|id| id.text.as_str()), Some("2041-K17"));
        let names: Vec<_> =
            record.blocks.iter().map(|block| (block.kind.text.as_str(), block.name.text.as_str())).collect();
        assert_eq!(names, [("mass-standard", "K17"), ("ambient", "A1"), ("person", "P1")]);
        check_places(record.front.as_ref().unwrap(), &sources);
        for block in &record.blocks {
            check_places(&block.body, &sources);
            assert_eq!(sources.text(block.name.place), block.name.text);
            assert!(sources.text(block.place).trim_end().ends_with(['`', '~']));
        }
        let time = record.blocks[1].body.get("readings").and_then(|list| list.as_list()?[0].get("time")).unwrap();
        let temperature =
            record.blocks[1].body.get("readings").and_then(|list| list.as_list()?[0].get("temperature")).unwrap();
        assert_eq!(sources.locate(time.place), ("r.md", 21, 14));
        assert_eq!(sources.text(temperature.place), "20.134 °C");
        let prose: String = record.prose.iter().map(|place| sources.text(*place)).collect();
        assert!(prose.starts_with("# Weighing") && prose.contains("not a block") && !prose.contains("thermometer"));
    }

    #[test]
    fn reads_blocks_wherever_they_stand() {
        check(RECORD);
    }

    #[test]
    fn reads_files_with_byte_order_mark_and_carriage_returns() {
        check(&RECORD.replace('\n', "\r\n"));
        check(&format!("\u{feff}{RECORD}"));
        check(&format!("\u{feff}{}", RECORD.replace('\n', "\r\n")));
    }

    fn complaint(text: impl AsRef<[u8]>) -> (Code, usize, String) {
        let (_, complaints, sources) = read(text.as_ref());
        assert_eq!(complaints.list.len(), 1, "{complaints:?}");
        let place = complaints.list[0].place.unwrap();
        (complaints.list[0].code, sources.locate(place).1, sources.text(place).into_owned())
    }

    #[test]
    fn complains_of_what_cannot_be_taken_apart() {
        assert_eq!(
            complaint("a\nb\n\n```yaml item S1\nlabel: x\n"),
            (Code::UnclosedFence, 4, "```yaml item S1".into())
        );
        assert_eq!(complaint("```yaml item S1"), (Code::UnclosedFence, 1, "```yaml item S1".into()));
        assert_eq!(complaint("- ~~~text\n  x\n\nend ```\n"), (Code::UnclosedFence, 1, "~~~text".into()));
        assert_eq!(complaint("```yaml item\n```\n"), (Code::NameInvalid, 1, "item".into()));
        assert_eq!(complaint("```yaml item 3S\n```\n"), (Code::NameInvalid, 1, "3S".into()));
        assert_eq!(complaint("```yaml item S 3\n```\n"), (Code::NameInvalid, 1, "S 3".into()));
        assert_eq!(complaint("```yml item S3\n```\n"), (Code::NameInvalid, 1, "yml".into()));
        assert_eq!(complaint("---\nrecord: x\n").0, Code::RecordUnreadable);
        assert_eq!(complaint("---\n- x\n---\n").0, Code::RecordUnreadable);
        assert_eq!(complaint(b"a\nb\xffc").0, Code::RecordUnreadable);
        assert_eq!(complaint(b"a\nb\xffc").1, 2);
        assert_eq!(complaint("a\n\n    ```yaml item S1\n    label: x\n    ```\n").0, Code::UnclosedFence);
    }

    #[test]
    fn leaves_other_fences_and_late_rules_to_prose() {
        for text in [
            "```yaml\na: 1\n```\n",
            "```\na: [\n```\n",
            "a\n\n---\nrecord: x\n---\n",
            "",
            "---x\n",
            "````\n```yaml item S1\n````\n",
        ] {
            let (record, complaints, _) = read(text.as_bytes());
            assert_eq!((complaints.list.len(), record.blocks.len(), record.front), (0, 0, None), "{text}");
        }
        let (record, complaints, _) = read(b"```yaml item S1\n```");
        assert_eq!((complaints.list.len(), record.blocks.len()), (0, 1));
    }

    #[test]
    fn keeps_an_unreadable_block_by_name() {
        let (record, complaints, sources) =
            read("> ```yaml item S1\r\n> label: [µ, x\r\n> b: 1\r\n> ```\r\n".as_bytes());
        assert_eq!((record.blocks.len(), record.blocks[0].readable), (1, false));
        assert_eq!(sources.locate(complaints.list[0].place.unwrap()).1, 3);
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(1500))]

        #[test]
        fn survives_any_bytes(bytes in proptest::collection::vec(any::<u8>(), 0..200)) {
            read(&bytes);
        }

        #[test]
        fn survives_damaged_records(cut in 0usize..600, length in 0usize..40, put in "[-{}:#>`~ \r\n\tµ]{0,6}", windows: bool) {
            let text = if windows { RECORD.replace('\n', "\r\n") } else { RECORD.into() };
            let (start, end) = (text.floor_char_boundary(cut), text.floor_char_boundary(cut + length));
            let text = format!("{}{put}{}", &text[..start], &text[end..]);
            let (record, complaints, sources) = read(text.as_bytes());
            crate::diagnostic::print_complaints(&complaints, &sources, crate::diagnostic::Look::Plain);
            prop_assert!(record.blocks.iter().all(|block| block.place.end as usize <= text.len()));
            crate::record::blank_expressions(&text);
        }
    }
}
