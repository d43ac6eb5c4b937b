//! Text to records: front matter, prose, measurement blocks with their places, raw data.
//!
//! [`read_record`] is the entry: one Markdown file in, one [`Record`] out, nothing interpreted yet. Every value keeps
//! the bytes of the file it stands on, so that any later stage can point at them. [`read_columns`] does the same for
//! raw data files.

mod expression;
mod markdown;
mod node;
mod segments;
mod table;
mod time;
mod yaml;

pub use expression::{Expression, Piece, blank_expressions, split_placeholders};
pub use markdown::{MeasurementBlock, Record, is_name, markdown_options, read_record};
pub use node::{Entry, Node, NodeData, Text};
pub use segments::Segments;
pub use table::{ColumnData, Columns, Content, RowFilter, WantedColumn, read_columns};
pub use time::{parse_date, parse_instant, parse_timestamps, seconds_since};
pub use yaml::read_yaml;
