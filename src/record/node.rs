//! What a measurement block or front matter holds, as typed: text, lists and mappings, each with its place.

use crate::intake::Place;

/// A piece of text with its place.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Text {
    pub text: String,
    pub place: Place,
}

/// One value with its place: of a scalar the text itself (inside the quotes, if quoted), of a list or mapping all of
/// it, of an empty value the key or the dash it is missing behind.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Node {
    pub place: Place,
    pub data: NodeData,
}

/// The shapes a value can have.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum NodeData {
    /// Nothing was written.
    Empty,
    /// Text exactly as typed, or the content of quoted text.
    Scalar {
        text: String,
        quoted: bool,
    },
    List(Vec<Node>),
    /// Entries in the order of the record; a key stands once.
    Map(Vec<Entry>),
}

/// One field of a mapping.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Entry {
    pub key: Text,
    pub value: Node,
}

/// The longest text quoted whole in a message, in characters.
const LONGEST_QUOTE: usize = 40;

impl Node {
    /// The value of a field, if this is a mapping that has it.
    pub fn get(&self, key: &str) -> Option<&Node> {
        self.as_map()?.iter().find(|entry| entry.key.text == key).map(|entry| &entry.value)
    }

    /// The text, if this is one.
    pub fn as_text(&self) -> Option<&str> {
        match &self.data {
            NodeData::Scalar { text, .. } => Some(text),
            _ => None,
        }
    }

    /// The items, if this is a list.
    pub fn as_list(&self) -> Option<&[Node]> {
        match &self.data {
            NodeData::List(items) => Some(items),
            _ => None,
        }
    }

    /// The fields, if this is a mapping.
    pub fn as_map(&self) -> Option<&[Entry]> {
        match &self.data {
            NodeData::Map(entries) => Some(entries),
            _ => None,
        }
    }

    /// The text with its place, if this is one.
    pub fn to_text(&self) -> Option<Text> {
        self.as_text().map(|text| Text { text: text.into(), place: self.place })
    }

    /// Whether nothing was written.
    pub fn is_empty(&self) -> bool {
        self.data == NodeData::Empty
    }

    /// Whether this is text in quotes.
    pub fn is_quoted(&self) -> bool {
        matches!(self.data, NodeData::Scalar { quoted: true, .. })
    }

    /// The value in words, for messages: "nothing", "the text “1 kg”", "a list", "a mapping".
    pub fn describe(&self) -> String {
        match &self.data {
            NodeData::Empty => "nothing".into(),
            NodeData::Scalar { text, .. } => format!("the text “{}”", shorten(text)),
            NodeData::List(_) => "a list".into(),
            NodeData::Map(_) => "a mapping".into(),
        }
    }
}

/// The text on one line, cut with … where it is long.
fn shorten(text: &str) -> String {
    let line = text.replace(['\n', '\r', '\t'], " ");
    match line.char_indices().nth(LONGEST_QUOTE) {
        Some((cut, _)) => format!("{}…", &line[..cut]),
        None => line,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::intake::FileId;

    fn text(text: &str) -> Node {
        let data = NodeData::Scalar { text: text.into(), quoted: false };
        Node { place: Place::new(FileId(0), 0, text.len()), data }
    }

    #[test]
    fn describes_in_words() {
        assert_eq!(text("1 kg").describe(), "the text “1 kg”");
        assert_eq!(text(&"µ".repeat(50)).describe(), format!("the text “{}…”", "µ".repeat(40)));
        let list = Node { place: text("").place, data: NodeData::List(vec![text("a")]) };
        assert_eq!((list.describe().as_str(), list.as_list().map(<[Node]>::len)), ("a list", Some(1)));
    }

    #[test]
    fn finds_fields() {
        let entry = Entry { key: text("mass").to_text().unwrap(), value: text("1 kg") };
        let map = Node { place: text("").place, data: NodeData::Map(vec![entry]) };
        assert_eq!(map.get("mass").and_then(Node::as_text), Some("1 kg"));
        assert_eq!(map.get("volume"), None);
    }
}
