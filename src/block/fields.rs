//! Reading the fields of a block whose shapes have been checked.

use super::field::number;
use super::given::{Given, read_given};
use crate::intake::Place;
use crate::quantity::Kind;
use crate::record::{Node, Text, parse_date, parse_instant};
use chrono::{DateTime, FixedOffset, NaiveDate};

/// A checked mapping. What is absent or was already complained of reads as `None`.
#[derive(Clone, Copy)]
pub struct Fields<'n> {
    pub node: &'n Node,
}

impl<'n> Fields<'n> {
    /// The place of the whole mapping.
    pub fn place(self) -> Place {
        self.node.place
    }

    /// The node of a field.
    pub fn get(self, name: &str) -> Option<&'n Node> {
        self.node.get(name)
    }

    /// The place of a field, else of the whole mapping.
    pub fn place_of(self, name: &str) -> Place {
        self.get(name).map_or(self.node.place, |node| node.place)
    }

    /// A text field with its place.
    pub fn text(self, name: &str) -> Option<Text> {
        self.get(name)?.to_text()
    }

    /// A text field, or nothing but its absence as empty text.
    pub fn words(self, name: &str) -> String {
        self.text(name).map(|text| text.text).unwrap_or_default()
    }

    /// One name or text, or a list of them.
    pub fn texts(self, name: &str) -> Vec<Text> {
        match self.get(name) {
            Some(node) => match node.as_list() {
                Some(items) => items.iter().filter_map(Node::to_text).collect(),
                None => node.to_text().into_iter().collect(),
            },
            None => Vec::new(),
        }
    }

    /// A value of a kind of quantity.
    pub fn given(self, name: &str, kind: Kind) -> Option<Given> {
        read_given(self.get(name)?, kind, name).ok()
    }

    /// A number without unit.
    pub fn number(self, name: &str) -> Option<f64> {
        number(self.get(name)?.as_text()?).ok()
    }

    /// A date.
    pub fn date(self, name: &str) -> Option<NaiveDate> {
        parse_date(self.get(name)?.as_text()?).ok()
    }

    /// A time with its zone.
    pub fn instant(self, name: &str) -> Option<DateTime<FixedOffset>> {
        parse_instant(self.get(name)?.as_text()?).ok()
    }

    /// A mapping field.
    pub fn mapping(self, name: &str) -> Option<Fields<'n>> {
        let node = self.get(name)?;
        node.as_map().map(|_| Fields { node })
    }

    /// A list of mappings.
    pub fn mappings(self, name: &str) -> Vec<Fields<'n>> {
        let items = self.get(name).and_then(Node::as_list).unwrap_or_default();
        items.iter().map(|node| Fields { node }).collect()
    }
}
