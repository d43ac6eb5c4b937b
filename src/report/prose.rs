//! Markdown prose to Typst markup.
//!
//! The same Markdown as records are read with; raw HTML is refused. Every piece of text enters as a literal
//! ([`Markup::push_text_at`]) with the place it comes from; results enter where their expressions stand.

use super::markup::Markup;
use super::math::formula;
use crate::diagnostic::{Code, Complaints, Problem};
use crate::intake::Place;
use crate::record::{Expression, Piece, markdown_options, split_placeholders};
use pulldown_cmark::{Alignment, CodeBlockKind, CowStr, Event, HeadingLevel, LinkType, Parser, Tag, TagEnd};
use std::collections::BTreeMap;
use std::ops::Range;

/// The prose of one record.
#[derive(Debug, Clone, Copy)]
pub struct Prose<'a> {
    /// The body with its expressions blanked.
    pub blanked: &'a str,
    /// The expressions, in the order of their placeholders.
    pub expressions: &'a [Expression],
    /// Where the body stands.
    pub body: Place,
    /// Fenced blocks that are not shown.
    pub leave_out: &'a [Place],
    /// The level in the report of the highest heading, from 1.
    pub top_level: usize,
}

/// What stands in place of an expression.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Inserted {
    pub markup: Markup,
    /// A table, chart or other thing that stands by itself instead of running along in a line.
    pub block: bool,
}

/// What the prose asks of the rest of the report.
pub trait Insert {
    /// What the expression with this index shows. Asked once for each.
    fn expression(&mut self, index: usize) -> Inserted;
    /// The file, among those of the Typst document, that holds the image with this path as the record writes it.
    fn image(&mut self, path: &str) -> Result<String, Problem>;
}

/// The path in the laboratory folder of a file that a record in `folder` names by a relative path.
///
/// # Errors
/// `path_outside` when the path is absolute, no plain path, or leaves the laboratory folder.
pub fn path_in_folder(folder: &str, path: &str) -> Result<String, Problem> {
    let outside = || {
        Problem::new(Code::PathOutside, format!("The path {path} leaves the laboratory folder or is no relative path."))
            .hint("Give the path from the folder of the record, with / between the names.")
    };
    if path.is_empty() || path.starts_with('/') || path.contains(['\\', ':', '\0']) {
        return Err(outside());
    }
    let mut names: Vec<&str> = folder.split('/').filter(|name| !name.is_empty()).collect();
    for name in path.split('/') {
        match name {
            "" | "." => {}
            ".." => drop(names.pop().ok_or_else(outside)?),
            name => names.push(name),
        }
    }
    Ok(names.join("/"))
}

/// Turns prose into Typst markup. What cannot be shown is left out, each with its complaint.
///
/// # Errors
/// `prose_unreadable` and what [`Insert::image`] finds wrong.
pub fn typeset_prose(prose: &Prose, insert: &mut dyn Insert, complaints: &mut Complaints) -> Markup {
    let events: Vec<_> = Parser::new_ext(prose.blanked, markdown_options()).into_offset_iter().collect();
    let footnotes = footnote_starts(&events);
    let mut writer = Writer {
        prose,
        events: &events,
        footnotes,
        open_footnotes: Vec::new(),
        insert,
        complaints,
        at: 0,
        depth: 0,
        last_level: prose.top_level.saturating_sub(1),
        highest: highest_heading(&events),
    };
    writer.blocks()
}

type Located<'a> = (Event<'a>, Range<usize>);

fn footnote_starts(events: &[Located]) -> BTreeMap<String, usize> {
    let definitions = events.iter().enumerate().filter_map(|(index, (event, _))| match event {
        Event::Start(Tag::FootnoteDefinition(label)) => Some((label.to_string(), index)),
        _ => None,
    });
    definitions.collect()
}

fn highest_heading(events: &[Located]) -> usize {
    let levels = events.iter().filter_map(|(event, _)| match event {
        Event::Start(Tag::Heading { level, .. }) => Some(*level as usize),
        _ => None,
    });
    levels.min().unwrap_or(HeadingLevel::H1 as usize)
}

/// How deep lists, quotations and emphasis may nest.
const DEEPEST: usize = 16;

struct Writer<'a, 'b> {
    prose: &'b Prose<'b>,
    events: &'a [Located<'a>],
    footnotes: BTreeMap<String, usize>,
    open_footnotes: Vec<String>,
    insert: &'b mut dyn Insert,
    complaints: &'b mut Complaints,
    at: usize,
    depth: usize,
    /// The level of the heading before.
    last_level: usize,
    /// The highest level the prose uses.
    highest: usize,
}

/// A stretch of a line, or a thing that wants to stand by itself.
struct Stretch {
    markup: Markup,
    block: Option<Place>,
}

impl<'a> Writer<'a, '_> {
    fn place(&self, range: &Range<usize>) -> Place {
        Place::new(
            self.prose.body.file,
            self.prose.body.start as usize + range.start,
            self.prose.body.start as usize + range.end,
        )
    }

    fn refuse(&mut self, message: impl Into<String>, hint: &str, place: Place) {
        let problem = Problem::new(Code::ProseUnreadable, message);
        self.complaints.add_at(if hint.is_empty() { problem } else { problem.hint(hint) }, place);
    }

    fn next(&mut self) -> Option<&'a Located<'a>> {
        let event = self.events.get(self.at)?;
        self.at += 1;
        Some(event)
    }

    /// Leaves the element whose start was just taken.
    fn skip(&mut self) {
        let mut open = 1;
        while open > 0 {
            match self.next() {
                Some((Event::Start(_), _)) => open += 1,
                Some((Event::End(_), _)) => open -= 1,
                Some(_) => {}
                None => return,
            }
        }
    }

    /// Blocks up to the end of the element that holds them, which is taken.
    fn blocks(&mut self) -> Markup {
        let mut markup = Markup::new();
        self.depth += 1;
        while let Some((event, range)) = self.events.get(self.at) {
            match event {
                Event::End(_) => {
                    self.at += 1;
                    break;
                }
                Event::Start(tag) if is_block(tag) => {
                    self.at += 1;
                    if self.depth > DEEPEST {
                        self.refuse("Lists and quotations nest too deep to be set.", "", self.place(range));
                        self.skip();
                    } else {
                        let block = self.block(tag, range);
                        markup.push(&block).push_code("\n\n");
                    }
                }
                Event::Rule => {
                    self.at += 1;
                    markup.push_code("#line(length: 100%, stroke: 0.4pt);\n\n");
                }
                Event::Html(_) => {
                    self.at += 1;
                }
                _ => {
                    let run = self.run();
                    let run = self.settle(run);
                    markup.push(&run).push_code("\n\n");
                }
            }
        }
        self.depth -= 1;
        markup
    }

    fn block(&mut self, tag: &Tag<'a>, range: &Range<usize>) -> Markup {
        match tag {
            Tag::Paragraph => {
                let run = self.run();
                self.at += 1;
                self.settle(run)
            }
            Tag::Heading { level, .. } => self.heading(*level as usize),
            Tag::BlockQuote(_) => {
                let inner = self.blocks();
                wrapped("#quote(block: true)", &inner)
            }
            Tag::CodeBlock(kind) => self.code_block(kind, range),
            Tag::HtmlBlock => self.html_block(range),
            Tag::List(start) => self.list(*start),
            Tag::Table(alignments) => self.table(alignments),
            Tag::FootnoteDefinition(_) => {
                self.skip();
                Markup::new()
            }
            _ => self.blocks(),
        }
    }

    /// A heading one level below the one before at most, so that the levels have no gaps.
    fn heading(&mut self, level: usize) -> Markup {
        let wanted = self.prose.top_level.max(1) + level.saturating_sub(self.highest);
        let level = wanted.min(self.last_level + 1).max(1);
        self.last_level = level;
        let inner = self.line();
        wrapped(&format!("#heading(level: {level})"), &inner)
    }

    fn code_block(&mut self, kind: &CodeBlockKind, range: &Range<usize>) -> Markup {
        let place = self.place(range);
        let mut code = String::new();
        while let Some((event, _)) = self.next() {
            match event {
                Event::End(_) => break,
                Event::Text(text) => code.push_str(text),
                _ => {}
            }
        }
        if self.prose.leave_out.iter().any(|block| block.start <= place.start && place.start < block.end) {
            return Markup::new();
        }
        let _ = kind;
        let mut markup = Markup::code("#raw(block: true, ");
        let literal = super::literal::typst_string(code.replace("\r\n", "\n").trim_end_matches('\n'));
        markup.push_code_at(&literal, place).push_code(");");
        markup
    }

    fn html_block(&mut self, range: &Range<usize>) -> Markup {
        let mut html = String::new();
        while let Some((event, _)) = self.next() {
            match event {
                Event::End(TagEnd::HtmlBlock) => break,
                Event::Html(text) | Event::Text(text) => html.push_str(text),
                _ => {}
            }
        }
        if !only_comments(&html) {
            self.refuse_html(self.place(range));
        }
        Markup::new()
    }

    fn refuse_html(&mut self, place: Place) {
        let hint = "Write it in Markdown; a < that is to be printed is written \\<.";
        self.refuse("The prose holds raw HTML, which a report cannot typeset.", hint, place);
    }

    fn list(&mut self, start: Option<u64>) -> Markup {
        let mut items = Vec::new();
        let mut tight = true;
        while let Some((event, _)) = self.next() {
            match event {
                Event::Start(Tag::Item) => {
                    tight &= !matches!(self.events.get(self.at), Some((Event::Start(Tag::Paragraph), _)));
                    items.push(self.blocks());
                }
                Event::End(_) => break,
                _ => {}
            }
        }
        let opening = match start {
            Some(number) => format!("#enum(tight: {tight}, start: {number}"),
            None => format!("#list(tight: {tight}"),
        };
        let mut markup = Markup::code(opening);
        for item in &items {
            markup.push_code(", ").push_content(item);
        }
        markup.push_code(");");
        markup
    }

    fn table(&mut self, alignments: &[Alignment]) -> Markup {
        let sides = alignments.iter().map(|side| match side {
            Alignment::None | Alignment::Left => "left, ",
            Alignment::Center => "center, ",
            Alignment::Right => "right, ",
        });
        let mut markup = Markup::code("#data-table(align: (");
        markup.push_code(&sides.collect::<String>()).push_code("), header: (");
        let mut in_rows = false;
        while let Some((event, _)) = self.next() {
            match event {
                Event::Start(Tag::TableCell) => {
                    let cell = self.line();
                    markup.push_content(&cell).push_code(", ");
                }
                Event::Start(Tag::TableRow) => {
                    markup.push_code("(");
                }
                Event::End(TagEnd::TableHead) => {
                    in_rows = true;
                    markup.push_code("), rows: (");
                }
                Event::End(TagEnd::TableRow) => {
                    markup.push_code("), ");
                }
                Event::End(_) => break,
                _ => {}
            }
        }
        markup.push_code(if in_rows { "));" } else { "), rows: ());" });
        markup
    }

    /// The inside of an element that holds one line of text, whose end is taken.
    fn line(&mut self) -> Markup {
        let run = self.run();
        self.at += 1;
        self.join(run)
    }

    /// Stretches up to the end of what holds them or to the next block; neither is taken.
    fn run(&mut self) -> Vec<Stretch> {
        let mut stretches = Vec::new();
        self.depth += 1;
        while let Some((event, range)) = self.events.get(self.at) {
            match event {
                Event::End(_) | Event::Rule => break,
                Event::Start(tag) if is_block(tag) => break,
                _ => {
                    self.at += 1;
                    self.inline(event, range, &mut stretches);
                }
            }
        }
        self.depth -= 1;
        stretches
    }

    /// A run as a paragraph, or the things in it that stand by themselves.
    fn settle(&mut self, run: Vec<Stretch>) -> Markup {
        let alone = run.iter().any(|stretch| stretch.block.is_some())
            && run.iter().all(|stretch| stretch.block.is_some() || stretch.markup.is_empty());
        if !alone {
            return self.join(run);
        }
        let mut markup = Markup::new();
        for stretch in run.iter().filter(|stretch| stretch.block.is_some()) {
            markup.push(&stretch.markup).push_code("\n\n");
        }
        markup
    }

    /// A run as one line; things that would have to stand by themselves are refused.
    fn join(&mut self, run: Vec<Stretch>) -> Markup {
        let mut markup = Markup::new();
        for stretch in run {
            match stretch.block {
                Some(place) => {
                    let hint = "Put it in a paragraph of its own, with an empty line before and after.";
                    self.refuse("A table or chart cannot stand inside a line of text.", hint, place);
                }
                None => {
                    markup.push(&stretch.markup);
                }
            }
        }
        markup
    }

    fn inline(&mut self, event: &Event<'a>, range: &Range<usize>, stretches: &mut Vec<Stretch>) {
        let place = self.place(range);
        let mut plain = |markup: Markup| stretches.push(Stretch { markup, block: None });
        match event {
            Event::Text(text) => self.text(text, range, stretches),
            Event::Code(code) => {
                let mut markup = Markup::code("#raw(");
                markup.push_code_at(&super::literal::typst_string(code), place).push_code(");");
                plain(markup);
            }
            Event::SoftBreak => plain(Markup::code(" ")),
            Event::HardBreak => plain(Markup::code("#linebreak();")),
            Event::InlineMath(latex) => plain(self.math(latex, false, range)),
            Event::DisplayMath(latex) => plain(self.math(latex, true, range)),
            Event::FootnoteReference(label) => plain(self.footnote(label, place)),
            Event::InlineHtml(html) | Event::Html(html) if !only_comments(html) => self.refuse_html(place),
            Event::Start(tag) => {
                let markup = self.span(tag, place);
                plain(markup);
            }
            _ => {}
        }
    }

    fn text(&mut self, text: &str, range: &Range<usize>, stretches: &mut Vec<Stretch>) {
        // Where text and source differ in length (an entity), its pieces share the place of the whole.
        let exact = text.len() == range.len();
        let mut offset = range.start;
        for piece in split_placeholders(text, self.prose.expressions) {
            match piece {
                Piece::Text(text) => {
                    let place = if exact { self.place(&(offset..offset + text.len())) } else { self.place(range) };
                    let mut markup = Markup::new();
                    // A blank alone is a blank of the line, not a text of its own.
                    if text.trim().is_empty() {
                        markup.push_code(" ")
                    } else {
                        markup.push_text_at(text, place)
                    };
                    stretches.push(Stretch { markup, block: None });
                    offset += text.len();
                }
                Piece::Expression(index) => {
                    let standing = self.prose.expressions.get(index).map_or(range.clone(), |found| found.range.clone());
                    stretches.push(self.expression(index, self.place(&standing)));
                    offset += standing.len();
                }
            }
        }
    }

    fn expression(&mut self, index: usize, place: Place) -> Stretch {
        let inserted = self.insert.expression(index);
        let mut markup = inserted.markup;
        if markup.spans.is_empty() && !markup.source.is_empty() {
            markup.spans.push((0..markup.source.len(), place));
        }
        Stretch { markup, block: inserted.block.then_some(place) }
    }

    fn math(&mut self, latex: &str, display: bool, range: &Range<usize>) -> Markup {
        let place = self.place(range);
        let dollars = if display { 2 } else { 1 };
        match formula(latex, display) {
            Ok(formula) => {
                let mut markup = Markup::new();
                markup.push_code_at(&formula.source, place);
                markup
            }
            Err(mut problem) => {
                let exact = latex.len() + 2 * dollars == range.len();
                problem.range = problem.range.filter(|_| exact).map(|(start, end)| (start + dollars, end + dollars));
                self.complaints.add_at(problem, place);
                Markup::new()
            }
        }
    }

    fn footnote(&mut self, label: &CowStr, place: Place) -> Markup {
        let Some(&start) = self.footnotes.get(label.as_ref()) else { return Markup::new() };
        if self.open_footnotes.iter().any(|open| open.as_str() == label.as_ref()) || self.open_footnotes.len() > 2 {
            self.refuse(format!("The footnote {label} refers to itself."), "", place);
            return Markup::new();
        }
        self.open_footnotes.push(label.to_string());
        let back = std::mem::replace(&mut self.at, start + 1);
        let inner = self.blocks();
        self.at = back;
        self.open_footnotes.pop();
        wrapped("#footnote", &inner)
    }

    /// Emphasis, a link or an image, whose start was taken; takes its end.
    fn span(&mut self, tag: &Tag<'a>, place: Place) -> Markup {
        if self.depth > 2 * DEEPEST {
            self.refuse("Emphasis nests too deep to be set.", "", place);
            self.skip();
            return Markup::new();
        }
        match tag {
            Tag::Emphasis => self.wrapped_line("#emph"),
            Tag::Strong => self.wrapped_line("#strong"),
            Tag::Strikethrough => self.wrapped_line("#strike"),
            Tag::Link { link_type, dest_url, .. } => self.link(*link_type, dest_url, place),
            Tag::Image { dest_url, title, .. } => self.image(dest_url, title, place),
            _ => self.line(),
        }
    }

    fn wrapped_line(&mut self, function: &str) -> Markup {
        let inner = self.line();
        wrapped(function, &inner)
    }

    fn link(&mut self, kind: LinkType, target: &str, place: Place) -> Markup {
        let inner = self.line();
        let target = if kind == LinkType::Email { format!("mailto:{target}") } else { target.to_string() };
        let plain = target.chars().all(|c| c.is_ascii_graphic()) || !target.contains(char::is_whitespace);
        let known = ["http://", "https://", "mailto:"].iter().any(|scheme| target.to_lowercase().starts_with(scheme));
        if !known || !plain || self.holds_expression(&target) {
            let hint = "Links lead to http, https or mailto addresses; write other references as text.";
            self.refuse("A link leads to something that a report cannot follow.", hint, place);
            return inner;
        }
        let mut markup = Markup::code("#link(");
        markup
            .push_code_at(&super::literal::typst_string(&target), place)
            .push_code(")")
            .push_content(&inner)
            .push_code(";");
        markup
    }

    fn holds_expression(&self, text: &str) -> bool {
        split_placeholders(text, self.prose.expressions).iter().any(|piece| matches!(piece, Piece::Expression(_)))
    }

    fn image(&mut self, path: &str, caption: &str, place: Place) -> Markup {
        let mut alternative = String::new();
        let mut open = 1;
        while let Some((event, _)) = self.next() {
            match event {
                Event::Start(_) => open += 1,
                Event::End(_) if open == 1 => break,
                Event::End(_) => open -= 1,
                Event::Text(text) | Event::Code(text) => alternative.push_str(text),
                Event::SoftBreak | Event::HardBreak => alternative.push(' '),
                _ => {}
            }
        }
        if alternative.trim().is_empty() || self.holds_expression(&alternative) || self.holds_expression(caption) {
            let hint = "Write it in the square brackets: ![a weight on the pan](pan.jpg).";
            self.refuse("An image needs a plain text that says what it shows.", hint, place);
            return Markup::new();
        }
        match self.insert.image(path) {
            Ok(file) => picture(&file, alternative.trim(), caption, place),
            Err(problem) => {
                self.complaints.add_at(Problem { range: None, ..problem }, place);
                Markup::new()
            }
        }
    }
}

/// An image with its words; a title in the Markdown becomes its caption.
fn picture(file: &str, alternative: &str, caption: &str, place: Place) -> Markup {
    let path = format!("/{}", file.trim_start_matches('/'));
    let mut image = Markup::code("image(");
    image.push_string(&path).push_code(", alt: ").push_string(alternative).push_code(")");
    let mut source = Markup::new();
    if caption.is_empty() {
        source.push_code("#box(").push(&image).push_code(");");
    } else {
        source.push_code("#figure-block(").push(&image).push_code(", caption: ").push_string(caption);
        source.push_code(", alt: ").push_string(alternative).push_code(");");
    }
    let mut markup = Markup::new();
    markup.push_code_at(&source.source, place);
    markup
}

fn wrapped(function: &str, inner: &Markup) -> Markup {
    let mut markup = Markup::code(function);
    markup.push_content(inner).push_code(";");
    markup
}

fn is_block(tag: &Tag) -> bool {
    !matches!(
        tag,
        Tag::Emphasis
            | Tag::Strong
            | Tag::Strikethrough
            | Tag::Superscript
            | Tag::Subscript
            | Tag::Link { .. }
            | Tag::Image { .. }
    )
}

/// Whether HTML consists of comments and blanks.
fn only_comments(html: &str) -> bool {
    let mut rest = html.trim();
    while let Some(inner) = rest.strip_prefix("<!--") {
        let Some(end) = inner.find("-->") else { return false };
        rest = inner.get(end + 3..).unwrap_or("").trim_start();
    }
    rest.is_empty()
}

#[cfg(test)]
mod tests;
