//! Tables for spreadsheets: text cells that a spreadsheet would take for a formula are kept as text.
use super::written;
use crate::error::Result;

/// One cell.
pub(super) enum Cell<'a> {
    /// Text from a file or of ours.
    Text(&'a str),
    /// The same, put together for the table.
    Owned(String),
    /// A number in its shortest form that reads back to the same bits; empty where there is none.
    Number(Option<f64>),
}

/// A text that starts with = + - @, tab, carriage return or NUL gets a leading apostrophe, so that no spreadsheet runs it.
pub(super) fn safe_text(text: &str) -> String {
    let risky = text.starts_with(['=', '+', '-', '@', '\t', '\r', '\n', '\0']);
    format!("{}{}", if risky { "'" } else { "" }, text)
}

/// A number as Rust reads it back to the same bits.
pub(super) fn number(value: f64) -> String {
    if value.is_finite() {
        // Plain digits where they are few, an exponent where they would be many.
        let size = value.abs();
        if size == 0.0 || (1e-5..1e16).contains(&size) {
            format!("{value}")
        } else {
            format!("{value:e}")
        }
    } else {
        String::new()
    }
}

/// Puts a table together: UTF-8, commas, a line feed after each row.
pub(super) fn table<'a>(rows: impl IntoIterator<Item = Vec<Cell<'a>>>) -> Result<String> {
    let mut writer = csv::WriterBuilder::new().from_writer(Vec::new());
    for row in rows {
        let cells = row.into_iter().map(|cell| match cell {
            Cell::Text(text) => safe_text(text),
            Cell::Owned(text) => safe_text(&text),
            Cell::Number(value) => value.map(number).unwrap_or_default(),
        });
        writer.write_record(cells).map_err(written)?;
    }
    let bytes = writer.into_inner().map_err(written)?;
    String::from_utf8(bytes).map_err(written)
}
