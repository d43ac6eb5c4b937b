//! YAML with places, and strict: what a measurement block or front matter may hold.
//!
//! Values are kept as typed and never turned into numbers or truth values. Anchors, aliases, tags, merge keys and
//! second documents are refused, since they hide where a value comes from; so are keys that stand twice, and comments
//! behind a value, which would silently cut it short.

mod objection;

use super::{Entry, Node, NodeData, Segments, Text};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::intake::Place;
use objection::in_plain_words;
use saphyr_parser::{Event, Parser, ScalarStyle, ScanError, Span, StrInput};
use std::collections::HashMap;

/// Lists and mappings inside each other, at most.
const DEEPEST: usize = 64;
/// The longest block, in bytes; more is raw data and belongs in a file of its own.
const LONGEST: usize = 4 << 20;

/// Reads a block. Of a block that cannot be read the node is empty and one complaint says why.
///
/// # Errors
/// `yaml_unreadable`, `yaml_forbidden`, `duplicate_key` and `silent_comment`, all that apply.
pub fn read_yaml(source: &Segments) -> (Node, Complaints) {
    let mut reader = Reader::new(source);
    let node = match reader.check_text().and_then(|()| reader.document()) {
        Ok(node) => node,
        Err(Stop(problem, place)) => {
            reader.complaints.add_at(problem, place);
            return (Node { place: source.all(), data: NodeData::Empty }, reader.complaints);
        }
    };
    reader.check_comments();
    (node, reader.complaints)
}

/// Reading cannot go on.
struct Stop(Problem, Place);

struct Reader<'a> {
    source: &'a Segments,
    parser: Parser<'a, StrInput<'a>>,
    /// The byte offset of every character, and of the end: the parser counts characters.
    offsets: Vec<usize>,
    /// Bytes of the text that are scalars, in order: a # inside is no comment.
    scalars: Vec<(usize, usize)>,
    complaints: Complaints,
}

impl<'a> Reader<'a> {
    fn new(source: &'a Segments) -> Self {
        let text = source.text();
        let readable = if text.len() <= LONGEST { text } else { "" };
        let mut offsets: Vec<usize> = readable.char_indices().map(|(offset, _)| offset).collect();
        offsets.push(readable.len());
        let parser = Parser::new_from_str(readable);
        Self { source, parser, offsets, scalars: Vec::new(), complaints: Complaints::default() }
    }

    /// Refuses what the parser would stumble over or silently stop at.
    fn check_text(&self) -> Result<(), Stop> {
        let text = self.source.text();
        if text.len() > LONGEST {
            let problem = Problem::new(Code::YamlUnreadable, "The block is longer than 4 MiB, the most one may hold.")
                .hint("Put long columns of readings in a raw data file and name it in a raw-data block.");
            return Err(Stop(problem, self.source.place(0, 0)));
        }
        let odd = |c: char| {
            (c.is_control() && !matches!(c, '\n' | '\t')) || matches!(c, '\u{feff}' | '\u{fffe}' | '\u{ffff}')
        };
        if let Some((offset, found)) = text.char_indices().find(|(_, c)| odd(*c)) {
            let message = format!("The block contains the invisible character U+{:04X}.", u32::from(found));
            let place = self.source.place(offset, offset + found.len_utf8());
            return Err(Stop(
                Problem::new(Code::YamlUnreadable, message).hint("Delete it and type the text anew."),
                place,
            ));
        }
        Ok(())
    }

    fn document(&mut self) -> Result<Node, Stop> {
        let mut node = None;
        loop {
            match self.next()? {
                (Event::StreamEnd, _) => break,
                (Event::DocumentStart(explicit), span) if explicit || node.is_some() => {
                    let message = "A line `---` begins another document here, but a block holds only one.";
                    let place = self.place(span);
                    return Err(Stop(Problem::new(Code::YamlForbidden, message).hint("Delete the line."), place));
                }
                (Event::StreamStart | Event::DocumentStart(_) | Event::DocumentEnd | Event::Nothing, _) => {}
                (event, span) => node = Some(self.node(event, span, self.source.all(), 0)?),
            }
        }
        Ok(node.unwrap_or(Node { place: self.source.all(), data: NodeData::Empty }))
    }

    fn next(&mut self) -> Result<(Event<'a>, Span), Stop> {
        match self.parser.next_event() {
            Some(Ok(event)) => Ok(event),
            Some(Err(error)) => Err(self.unreadable(&error)),
            None => Ok((Event::StreamEnd, Span::default())),
        }
    }

    /// The node that `event` begins; `owner` is the key or dash before it, `depth` how deep it lies.
    fn node(&mut self, event: Event<'a>, span: Span, owner: Place, depth: usize) -> Result<Node, Stop> {
        if depth > DEEPEST {
            let message = format!("Lists and mappings lie more than {DEEPEST} deep in each other here.");
            return Err(Stop(Problem::new(Code::YamlUnreadable, message), self.place(span)));
        }
        self.forbid(&event, span);
        match event {
            Event::Scalar(text, style, ..) => Ok(self.scalar(text.into_owned(), style, span, owner)),
            Event::SequenceStart(..) => self.list(span, depth),
            Event::MappingStart(..) => self.map(span, depth),
            _ => Ok(Node { place: self.place(span), data: NodeData::Empty }),
        }
    }

    fn scalar(&mut self, text: String, style: ScalarStyle, span: Span, owner: Place) -> Node {
        let (start, end) = self.range(span);
        let quoted = style != ScalarStyle::Plain;
        if !quoted && text.is_empty() {
            return Node { place: owner, data: NodeData::Empty };
        }
        let mark = match style {
            ScalarStyle::SingleQuoted => '\'',
            ScalarStyle::DoubleQuoted => '"',
            _ => {
                self.scalars.push((start, end));
                self.check_cut(&text, start, end);
                let place = self.source.place(start, end);
                return Node { place, data: NodeData::Scalar { text, quoted } };
            }
        };
        // The parser's span may run on over a comment, so the closing mark is looked for.
        let inside = self.source.text().get(start + 1..end).map_or(0, |rest| quoted_length(rest, mark));
        let (start, end) = (start + 1, start + 1 + inside);
        self.scalars.push((start - 1, end + 1));
        Node { place: self.source.place(start, end), data: NodeData::Scalar { text, quoted } }
    }

    /// Complains of a value that a comma inside its round brackets cut in two, as in `{mass: 1 kg ± 1 mg (k = 2, ν = 9)}`.
    fn check_cut(&mut self, text: &str, start: usize, end: usize) {
        let next = self.source.text().get(end..).unwrap_or_default().trim_start();
        if next.starts_with(',') && text.matches('(').count() > text.matches(')').count() {
            let message = "The comma inside the round brackets ends this value, since it stands in a `{…}` or `[…]`.";
            let problem = Problem::new(Code::YamlUnreadable, message).hint("Put the whole value in double quotes.");
            self.complaints.add_at(problem, self.source.place(start, end));
        }
    }

    fn list(&mut self, span: Span, depth: usize) -> Result<Node, Stop> {
        let mut place = self.place(span);
        let mut items: Vec<Node> = Vec::new();
        loop {
            let (event, span) = self.next()?;
            if event == Event::SequenceEnd {
                let place = self.closed(place, span, ']');
                return Ok(Node { place, data: NodeData::List(items) });
            }
            let owner = self.place(span);
            let item = self.node(event, span, owner, depth + 1)?;
            place = place.to(item.place);
            items.push(item);
        }
    }

    fn map(&mut self, span: Span, depth: usize) -> Result<Node, Stop> {
        let mut place = self.place(span);
        let mut entries: Vec<Entry> = Vec::new();
        let mut seen: HashMap<String, Place> = HashMap::new();
        loop {
            let (event, span) = self.next()?;
            if event == Event::MappingEnd {
                let place = self.closed(place, span, '}');
                return Ok(Node { place, data: NodeData::Map(entries) });
            }
            let key = self.key(event, span)?;
            let (event, span) = self.next()?;
            let value = self.node(event, span, key.place, depth + 1)?;
            place = place.to(key.place).to(value.place);
            match seen.get(&key.text) {
                Some(first) => self.duplicate(&key, *first),
                None => {
                    seen.insert(key.text.clone(), key.place);
                    entries.push(Entry { key, value });
                }
            }
        }
    }

    fn key(&mut self, event: Event<'a>, span: Span) -> Result<Text, Stop> {
        self.forbid(&event, span);
        let place = self.place(span);
        let Event::Scalar(text, style, ..) = event else {
            let message = "The name of a field is a list or mapping here, but it must be a word.";
            return Err(Stop(Problem::new(Code::YamlUnreadable, message), place));
        };
        if text == "<<" && style == ScalarStyle::Plain {
            let message = "A merge key `<<` stands here, but a block states its own values only.";
            self.complaints.add_at(Problem::new(Code::YamlForbidden, message).hint("Write the fields out."), place);
        } else if text.is_empty() {
            return Err(Stop(
                Problem::new(Code::YamlUnreadable, "The colon stands without the name of a field."),
                place,
            ));
        }
        match self.scalar(text.into_owned(), style, span, place) {
            Node { place, data: NodeData::Scalar { text, .. } } => Ok(Text { text, place }),
            node => Ok(Text { text: String::new(), place: node.place }),
        }
    }

    fn duplicate(&mut self, key: &Text, first: Place) {
        let problem =
            Problem::new(Code::DuplicateKey, format!("The field `{}` stands twice in one mapping.", key.text));
        self.complaints.add(problem.at(key.place).hint_at("It stands first here; keep one of the two.", first));
    }

    /// Files a complaint about an anchor, an alias or a tag.
    fn forbid(&mut self, event: &Event<'_>, span: Span) {
        let (anchor, tag) = match event {
            Event::Scalar(_, _, anchor, tag) => (*anchor, tag.is_some()),
            Event::SequenceStart(anchor, tag) | Event::MappingStart(anchor, tag) => (*anchor, tag.is_some()),
            Event::Alias(_) => {
                let message = "An alias `*…` stands here, but a block states its own values only.";
                let problem = Problem::new(Code::YamlForbidden, message);
                let hint = "Write the value out, or refer to a named value with `from NAME.field`.";
                return self.complaints.add_at(problem.hint(hint), self.place(span));
            }
            _ => return,
        };
        for (found, what, sign) in [(anchor > 0, "An anchor", '&'), (tag, "A tag", '!')] {
            if found {
                let message = format!("{what} `{sign}…` stands before this value, but blocks have none.");
                let problem = Problem::new(Code::YamlForbidden, message);
                let hint = format!("Delete it; if the text itself begins with `{sign}`, put it in double quotes.");
                self.complaints.add_at(problem.hint(hint), self.place(span));
            }
        }
    }

    /// A collection's place, reaching to its closing bracket if it has one.
    fn closed(&self, place: Place, end: Span, bracket: char) -> Place {
        let (start, finish) = self.range(end);
        match self.source.text().get(start..finish) {
            Some(text) if text.ends_with(bracket) => place.to(self.source.place(start, finish)),
            _ => place,
        }
    }

    fn place(&self, span: Span) -> Place {
        let (start, end) = self.range(span);
        self.source.place(start, end)
    }

    /// The bytes of a span, without the blanks behind it.
    fn range(&self, span: Span) -> (usize, usize) {
        let last = self.offsets.last().copied().unwrap_or(0);
        let offset = |index: usize| self.offsets.get(index).copied().unwrap_or(last);
        let (start, end) = (offset(span.start.index()), offset(span.end.index()));
        let text = self.source.text().get(start..end).unwrap_or_default();
        (start, start + text.trim_end_matches([' ', '\t', '\n']).len())
    }

    /// Files a complaint about every comment behind a value.
    fn check_comments(&mut self) {
        let text = self.source.text();
        self.scalars.sort_unstable();
        let mut scalars = std::mem::take(&mut self.scalars);
        scalars.push((text.len(), text.len()));
        let mut free_from = 0;
        for (start, end) in scalars {
            let mut at = free_from;
            while let Some(found) = text.get(at..start).and_then(|gap| gap.find('#')) {
                let hash = at + found;
                let line_end = text[hash..].find('\n').map_or(text.len(), |length| hash + length);
                if !is_open_comment(text, hash, free_from) {
                    self.silent_comment(hash, line_end);
                }
                at = line_end;
            }
            free_from = free_from.max(end.min(text.len()));
        }
    }

    fn silent_comment(&mut self, start: usize, end: usize) {
        let message = "The # after this value would silently turn the rest of the line into a comment.";
        let problem = Problem::new(Code::SilentComment, message)
            .hint("Put the value in double quotes if the # belongs to it, or the comment on a line of its own.");
        self.complaints.add_at(problem, self.source.place(start, end));
    }

    /// The parser's objection in plain words.
    fn unreadable(&self, error: &ScanError) -> Stop {
        let text = self.source.text();
        let start = self.offsets.get(error.marker().index()).copied().unwrap_or(text.len()).min(text.trim_end().len());
        let end = start + text[start..].chars().next().map_or(0, char::len_utf8);
        Stop(in_plain_words(error.info()), self.source.place(start, end))
    }
}

/// The bytes up to the closing quotation mark.
fn quoted_length(rest: &str, mark: char) -> usize {
    let mut signs = rest.char_indices().peekable();
    while let Some((offset, c)) = signs.next() {
        match c {
            '\\' if mark == '"' => _ = signs.next(),
            c if c != mark => {}
            // A single quotation mark is doubled where it is meant.
            '\'' if signs.peek().is_some_and(|(_, next)| *next == '\'') => _ = signs.next(),
            _ => return offset,
        }
    }
    rest.len()
}

/// Whether the comment at `hash` stands alone on its line, behind a bare key or dash, or behind a closing bracket;
/// bytes from `free_from` up to it are no scalar.
fn is_open_comment(text: &str, hash: usize, free_from: usize) -> bool {
    let line_start = text[..hash].rfind('\n').map_or(0, |line_break| line_break + 1);
    let before = text[line_start..hash].trim_end();
    before.is_empty() || (line_start + before.len() > free_from && before.ends_with([':', '-', ']', '}']))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::intake::FileId;
    use proptest::prelude::*;

    fn read(text: &str) -> (Node, Vec<(Code, String)>) {
        let (node, complaints) = read_yaml(&Segments::whole(FileId(0), text, 0));
        let shown = |place: Place| text[place.start as usize..place.end as usize].to_string();
        let list =
            complaints.list.iter().map(|complaint| (complaint.code, complaint.place.map_or(String::new(), shown)));
        (node, list.collect())
    }

    /// Every text in order, after checking that its place holds just that text.
    fn texts(node: &Node, source: &str, found: &mut Vec<String>) {
        match &node.data {
            NodeData::Empty => {}
            NodeData::Scalar { text, .. } => {
                assert_eq!(&source[node.place.start as usize..node.place.end as usize], text);
                found.push(text.clone());
            }
            NodeData::List(items) => items.iter().for_each(|item| texts(item, source, found)),
            NodeData::Map(entries) => entries.iter().for_each(|entry| {
                assert_eq!(&source[entry.key.place.start as usize..entry.key.place.end as usize], entry.key.text);
                texts(&entry.value, source, found);
            }),
        }
    }

    fn clean(source: &str) -> Vec<String> {
        let (node, complaints) = read(source);
        assert_eq!(complaints, [], "{source}");
        let mut found = Vec::new();
        texts(&node, source, &mut found);
        found
    }

    const STANDARD: &str = r#"label: "K-17"
nominal: 1 kg
volume: {value: 124.8537(6) cm3, at: 20 °C, origin: measured}
expansion: 45(2)e-6 /K
mass_centre_height: 38.1(5) mm
calibrations:
  - {certificate: C-38-091, date: 2038-10-30, mass: 1 kg + 0.119 mg ± 0.026 mg (k = 2), basis: consensus_2}
  - {certificate: C-40-118, date: 2040-11-02, due: 2042-11-02, mass: 1 kg + 0.123(12) mg, basis: consensus_3}
drift_since_calibration: ± 0.006 mg rectangular
"#;
    const INSTRUMENT: &str = "measures: temperature
calibrations:
  - {certificate: C-40-071, date: 2040-09-01, due: 2041-09-01, correction: -0.012(3) K}
resolution: 0.001 K
drift_since_calibration: ± 0.005 K rectangular
";
    const AMBIENT: &str = "thermometer: T4
barometer: B2
hygrometer: H1
carbon_dioxide: 420(15) µmol/mol
readings:
  - {time: 2041-03-12T09:10:00Z, temperature: 20.134 °C, pressure: 1003.21 hPa, humidity: 45.3 %}
  - {time: 2041-03-12T09:40:00Z, temperature: 20.139 °C, pressure: 1003.17 hPa, humidity: 45.4 %}
";
    const COMPARISON: &str = "cycle: ABBA
a: K17
b: S3
result: b minus a
comparator: M1
ambient: A1
type_a: pooled
unit: mg
series:
  - start: 2041-03-12T09:12:00Z
    interval: 90 s
    indications:
      - [0.1234, 0.2345, 0.2351, 0.1239]
      - [0.1237, 0.2349, 0.2350, 0.1240]
    excluded:
      - {cycle: 2, rule: R2, reason: door contact logged open during b}
";
    const RAW_DATA: &str = "file: raw/det1_moving.csv
zero_time: 2041-05-04T00:00:00Z
columns:
  time:     {head: t_s, unit: s}
  position: {head: z_mm, unit: mm}
  fringes:  {head: fringes, unit: 1}
";

    #[test]
    fn keeps_values_as_typed() {
        let found = clean(STANDARD);
        for value in ["K-17", "124.8537(6) cm3", "20 °C", "45(2)e-6 /K", "1 kg + 0.119 mg ± 0.026 mg (k = 2)"] {
            assert!(found.iter().any(|text| text == value), "{value}");
        }
        assert_eq!(found.last().map(String::as_str), Some("± 0.006 mg rectangular"));
        let found = clean(INSTRUMENT);
        assert_eq!(found[1..5], ["C-40-071", "2040-09-01", "2041-09-01", "-0.012(3) K"]);
        let found = clean(AMBIENT);
        assert_eq!(found[3..8], ["420(15) µmol/mol", "2041-03-12T09:10:00Z", "20.134 °C", "1003.21 hPa", "45.3 %"]);
        let found = clean(COMPARISON);
        assert_eq!(found[8..14], ["2041-03-12T09:12:00Z", "90 s", "0.1234", "0.2345", "0.2351", "0.1239"]);
        assert_eq!(found.last().map(String::as_str), Some("door contact logged open during b"));
        assert_eq!(clean(RAW_DATA)[..4], ["raw/det1_moving.csv", "2041-05-04T00:00:00Z", "t_s", "s"]);
    }

    #[test]
    fn complains_of_values_cut_by_their_comma() {
        let cut = [(Code::YamlUnreadable, "1 hPa ± 1 Pa (k = 2".to_string())];
        assert_eq!(read("v: {mass: 1 hPa ± 1 Pa (k = 2, ν = 20), at: 5 %}").1, cut);
        assert_eq!(read("v: [1 hPa ± 1 Pa (k = 2, ν = 20)]").1, cut);
        assert_eq!(clean("v: {mass: \"1 hPa ± 1 Pa (k = 2, ν = 20)\"}"), ["1 hPa ± 1 Pa (k = 2, ν = 20)"]);
        assert_eq!(clean("v: 1 hPa ± 1 Pa (k = 2, ν = 20)"), ["1 hPa ± 1 Pa (k = 2, ν = 20)"]);
    }

    #[test]
    fn keeps_signs_inside_values() {
        for value in
            ["a#b", "-0.012(3) K", "47.312° N", "1003.21 hPa ± 0.10 hPa (k = 2.13, ν = 20)", "no", "0x10", "1e5"]
        {
            assert_eq!(clean(&format!("v: {value}\n")), [value]);
        }
        assert_eq!(clean("v: \"a: b # c\"\n"), ["a: b # c"]);
        assert_eq!(clean("v: 'a: b # c'\n"), ["a: b # c"]);
        assert_eq!(clean("v: {a: \"\"  , b: 'x y' }\n"), ["", "x y"]);
        assert_eq!(clean("v: {mass: 1 kg ± 2 mg (k = 2), at: 5 %}"), ["1 kg ± 2 mg (k = 2)", "5 %"]);
    }

    #[test]
    fn folds_texts_of_several_lines() {
        let (node, complaints) = read("text: the door\n  was open\nnext: 1\n");
        assert_eq!(complaints, []);
        assert_eq!(node.get("text").and_then(Node::as_text), Some("the door was open"));
        let (node, complaints) = read("text: |\n  the # door\n  was open\nnext: 1\n");
        assert_eq!(complaints, []);
        assert_eq!(node.get("text").and_then(Node::as_text), Some("the # door\nwas open\n"));
    }

    #[test]
    fn places_collections_and_gaps() {
        let source = "a:\nb: [1, {c: 2}]\nd:\n  - x\n  -\n";
        let (node, complaints) = read(source);
        assert_eq!(complaints, []);
        let shown = |node: &Node| source[node.place.start as usize..node.place.end as usize].to_string();
        let field = |key: &str| node.get(key).unwrap();
        assert_eq!((field("a").is_empty(), shown(field("a"))), (true, "a".into()));
        assert_eq!(shown(field("b")), "[1, {c: 2}]");
        assert!(shown(field("d")).starts_with("- x"), "{}", shown(field("d")));
        assert_eq!(shown(&node), source[..source.len() - 1]);
    }

    #[test]
    fn complains_of_comments_behind_values() {
        let comment = |source| read(source).1;
        assert_eq!(comment("a: 1 kg # new\nb: 2\n"), [(Code::SilentComment, "# new".into())]);
        assert_eq!(comment("a: 'it''s' # x"), [(Code::SilentComment, "# x".into())]);
        assert_eq!(comment("a: \"1\" # x"), [(Code::SilentComment, "# x".into())]);
        assert_eq!(comment("a: [1, 2, # x\n 3]\n"), [(Code::SilentComment, "# x".into())]);
        for allowed in
            ["# a\na: 1\n  # b\nb: 2\n", "a: # x\n  - 1\n", "a: [1, 2] # x\n", "a: {b: 1} # x\n", "- # x\n  a: 1\n"]
        {
            assert_eq!(comment(allowed), [], "{allowed}");
        }
        assert_eq!(comment("a: b] # x"), [(Code::SilentComment, "# x".into())]);
    }

    #[test]
    fn refuses_what_hides_values() {
        for source in [
            "a: &x 1",
            "a: *x",
            "a: !!str 1",
            "<<: {a: 1}",
            "a: 1\n---\nb: 1",
            "---\na: 1",
            "a: &x 1\nb: *x",
            "%YAML 1.2\n---\na: 1",
        ] {
            let found = read(source).1;
            assert!(
                !found.is_empty() && found.iter().all(|(code, _)| *code == Code::YamlForbidden),
                "{source}: {found:?}"
            );
        }
    }

    #[test]
    fn complains_of_a_key_that_stands_twice() {
        let source = "mass: 1\nat: 2\nmass: 3\n";
        let (node, complaints) = read_yaml(&Segments::whole(FileId(0), source, 0));
        assert_eq!(complaints.list.len(), 1);
        assert_eq!(complaints.list[0].code, Code::DuplicateKey);
        assert_eq!(complaints.list[0].place, Some(Place::new(FileId(0), 14, 18)));
        assert_eq!(complaints.list[0].hints[0].place, Some(Place::new(FileId(0), 0, 4)));
        assert_eq!(node.get("mass").and_then(Node::as_text), Some("1"));
    }

    #[test]
    fn says_in_plain_words_what_is_unreadable() {
        let sources = [
            "a: b: c",
            "a: [1, 2",
            "a: {b: 1",
            "a: \"x",
            "a: 1\n b: 2",
            "a\nb: 1",
            "a: @x",
            "a: ]",
            "a:\n\t- 1",
            "? [a]\n: 1",
            "a: \u{1}",
            ": 1",
        ];
        for source in sources {
            let (node, complaints) = read_yaml(&Segments::whole(FileId(0), source, 0));
            assert_eq!(complaints.list.len(), 1, "{source:?}: {complaints:?}");
            assert_eq!(complaints.list[0].code, Code::YamlUnreadable, "{source:?}");
            assert_ne!(complaints.list[0].message, in_plain_words("").message, "{source:?}");
            assert!(node.is_empty());
        }
    }

    #[test]
    fn bounds_depth_and_size() {
        let found = read(&format!("{}{}", "[".repeat(70), "]".repeat(70))).1;
        assert_eq!(found[0].0, Code::YamlUnreadable);
        assert_eq!(read(&"- ".repeat(100_000)).1[0].0, Code::YamlUnreadable);
        assert_eq!(read(&"[".repeat(100_000)).1[0].0, Code::YamlUnreadable);
        assert_eq!(read(&" ".repeat(LONGEST + 1)).1[0].0, Code::YamlUnreadable);
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(2000))]

        #[test]
        fn survives_any_text(text in "[-a{}\\[\\]:#&*!|>'\"%@`,? \n\t°µ\u{1}\u{f0000}]{0,60}") {
            let (node, complaints) = read_yaml(&Segments::whole(FileId(0), &text, 0));
            let all = text.len() as u32;
            prop_assert!(node.place.end <= all && complaints.list.iter().all(|c| c.place.is_some_and(|p| p.start <= p.end && p.end <= all)));
        }

        #[test]
        fn survives_damaged_blocks(cut in 0usize..600, length in 0usize..40, put in "[-{}\\[\\]:#&*!|>'\",? \n\t]{0,6}") {
            for block in [STANDARD, INSTRUMENT, AMBIENT, COMPARISON, RAW_DATA] {
                let (start, end) = (block.floor_char_boundary(cut), block.floor_char_boundary(cut + length));
                let text = format!("{}{put}{}", &block[..start], &block[end..]);
                let (node, _) = read_yaml(&Segments::whole(FileId(0), &text, 0));
                prop_assert!(node.place.end as usize <= text.len());
            }
        }
    }
}
