//! Tables of a report, and how symbols and numbers stand in them.

use super::literal::typst_string;
use super::markup::Markup;

/// Tables with no more rows than this stay on one page.
const LONGEST_WHOLE: usize = 12;

/// One cell.
#[derive(Debug, Clone, PartialEq)]
pub enum Cell {
    Text(String),
    /// A number whose marker lines up with the others of its column.
    Decimal(String),
    Markup(Markup),
}

impl From<&str> for Cell {
    fn from(text: &str) -> Cell {
        Cell::Text(text.into())
    }
}

impl From<String> for Cell {
    fn from(text: String) -> Cell {
        Cell::Text(text)
    }
}

impl Cell {
    fn write(&self, into: &mut Markup) {
        match self {
            Cell::Text(text) => {
                into.push_string(text);
            }
            Cell::Decimal(text) => {
                into.push_code("dec(").push_string(text).push_code(")");
            }
            Cell::Markup(markup) => {
                into.push_content(markup);
            }
        }
    }
}

/// A table that may run over pages.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Table {
    pub caption: String,
    /// Widths in Typst's notation, one a column; empty for automatic ones.
    pub columns: Vec<&'static str>,
    /// `left`, `center` or `right`, one a column; empty for automatic ones.
    pub align: Vec<&'static str>,
    pub header: Vec<Cell>,
    pub rows: Vec<Vec<Cell>>,
    /// Rows under a closing rule.
    pub closing: Vec<Vec<Cell>>,
    /// The helper of the template that sets it.
    pub helper: &'static str,
}

impl Table {
    /// An empty table with a caption and heads.
    pub fn new(caption: impl Into<String>, header: Vec<Cell>) -> Table {
        Table { caption: caption.into(), header, helper: "data-table", ..Table::default() }
    }

    /// The table as a numbered block.
    pub fn markup(&self) -> Markup {
        let mut made = Markup::code(format!("#table-block({}(", self.helper));
        if !self.columns.is_empty() {
            made.push_code(&format!(
                "columns: ({}), ",
                self.columns.iter().map(|width| format!("{width}, ")).collect::<String>()
            ));
        }
        if !self.align.is_empty() {
            made.push_code(&format!(
                "align: ({}), ",
                self.align.iter().map(|side| format!("{side}, ")).collect::<String>()
            ));
        }
        made.push_code("header: ");
        write_row(&self.header, &mut made);
        made.push_code(", rows: (");
        for row in &self.rows {
            write_row(row, &mut made);
            made.push_code(", ");
        }
        made.push_code("), closing: (");
        for row in &self.closing {
            write_row(row, &mut made);
            made.push_code(", ");
        }
        let breakable = self.rows.len() > LONGEST_WHOLE;
        made.push_code(&format!(")), caption: {}, breakable: {breakable});\n\n", typst_string(&self.caption)));
        made
    }
}

fn write_row(cells: &[Cell], into: &mut Markup) {
    into.push_code("(");
    for cell in cells {
        cell.write(into);
        into.push_code(", ");
    }
    into.push_code(")");
}

/// A symbol: what stands before the underscore in italics, what follows as an upright subscript.
pub fn symbol(text: &str) -> Markup {
    let (base, subscript) = text.split_once('_').map_or((text, None), |(base, subscript)| (base, Some(subscript)));
    let mut made = Markup::new();
    // A unit-like or digit part stays upright: only letters are symbols.
    made.push_code("#emph(").push_string(base).push_code(");");
    if let Some(subscript) = subscript {
        made.push_code("#sub(size: 0.72em, ").push_string(subscript).push_code(");");
    }
    made
}

/// A head of the form quantity/unit with a symbol: *m*/kg.
pub fn head(symbol_text: &str, unit: &str) -> Cell {
    let mut made = symbol(symbol_text);
    if !unit.is_empty() {
        // Only one solidus, and a product in brackets behind it.
        made.push_text(&if unit.contains([' ', '\u{a0}']) { format!("/({unit})") } else { format!("/{unit}") });
    }
    Cell::Markup(made)
}
