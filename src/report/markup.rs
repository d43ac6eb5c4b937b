//! Typst source under construction, with the record places its pieces come from.

use super::literal::{typst_string, typst_text};
use crate::intake::Place;
use std::ops::Range;

/// Typst markup and, for parts of it, the place in a record that they come from.
///
/// The places stand in the order of the source and do not overlap.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Markup {
    pub source: String,
    pub spans: Vec<(Range<usize>, Place)>,
}

impl Markup {
    /// Nothing yet.
    pub fn new() -> Self {
        Self::default()
    }

    /// Typst source written by the program itself.
    pub fn code(source: impl Into<String>) -> Self {
        Self { source: source.into(), spans: Vec::new() }
    }

    /// Text that is shown as it is.
    pub fn text(text: &str) -> Self {
        Self::code(typst_text(text))
    }

    /// Adds Typst source written by the program itself.
    pub fn push_code(&mut self, source: &str) -> &mut Self {
        self.source.push_str(source);
        self
    }

    /// Adds text that is shown as it is.
    pub fn push_text(&mut self, text: &str) -> &mut Self {
        self.source.push_str(&typst_text(text));
        self
    }

    /// Adds text and remembers where it comes from.
    pub fn push_text_at(&mut self, text: &str, place: Place) -> &mut Self {
        self.push_code_at(&typst_text(text), place)
    }

    /// Adds a string literal, for use as an argument.
    pub fn push_string(&mut self, text: &str) -> &mut Self {
        self.source.push_str(&typst_string(text));
        self
    }

    /// Adds source and remembers where it comes from.
    pub fn push_code_at(&mut self, source: &str, place: Place) -> &mut Self {
        let start = self.source.len();
        self.source.push_str(source);
        if start < self.source.len() {
            self.spans.push((start..self.source.len(), place));
        }
        self
    }

    /// Adds another piece with its places.
    pub fn push(&mut self, other: &Markup) -> &mut Self {
        let offset = self.source.len();
        self.source.push_str(&other.source);
        self.spans.extend(other.spans.iter().map(|(range, place)| (range.start + offset..range.end + offset, *place)));
        self
    }

    /// Adds another piece as a content argument, in square brackets.
    pub fn push_content(&mut self, other: &Markup) -> &mut Self {
        self.source.push('[');
        self.push(other);
        self.source.push(']');
        self
    }

    /// The record place of the source around `offset`: the nearest one that begins before it, when none covers it.
    pub fn place_of(&self, offset: usize) -> Option<Place> {
        place_of(&self.spans, offset)
    }

    /// Whether there is nothing to show.
    pub fn is_empty(&self) -> bool {
        self.source.trim().is_empty()
    }
}

impl From<String> for Markup {
    fn from(source: String) -> Self {
        Self::code(source)
    }
}

/// The place whose range holds `offset`, or the last that begins before it.
pub fn place_of(spans: &[(Range<usize>, Place)], offset: usize) -> Option<Place> {
    let after = spans.partition_point(|(range, _)| range.start <= offset);
    spans.get(after.checked_sub(1)?).map(|(_, place)| *place)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::intake::FileId;

    #[test]
    fn places_follow_a_piece_into_a_larger_one() {
        let place = Place::new(FileId(0), 7, 9);
        let mut inner = Markup::new();
        inner.push_code("#f(").push_text_at("ab", place).push_code(")");
        let mut outer = Markup::code("head ");
        outer.push_content(&inner);
        assert_eq!(outer.source, "head [#f(#\"ab\";)]");
        assert_eq!(outer.spans, vec![(9..15, place)]);
        assert_eq!(outer.place_of(10), Some(place));
        assert_eq!(outer.place_of(2), None);
    }
}
