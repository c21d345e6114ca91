//! The numbers behind a figure.
use crate::text;
use serde::{Deserialize, Serialize};

/// A table of strings; numbers are printed so that reading them gives the same number again.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct Table {
    /// Header, with units.
    pub columns: Vec<String>,
    /// Rows, each as long as the header.
    pub rows: Vec<Vec<String>>,
}

impl Table {
    pub(crate) fn new(columns: &[&str]) -> Self {
        Table {
            columns: columns.iter().map(|c| text::clean(c)).collect(),
            rows: Vec::new(),
        }
    }
    pub(crate) fn row(&mut self, cells: impl IntoIterator<Item = String>) {
        self.rows.push(cells.into_iter().collect());
    }
    /// A column of numbers for each header; missing ones are empty.
    pub(crate) fn of(columns: &[&str], values: &[&[f64]]) -> Self {
        let mut table = Table::new(columns);
        let longest = values.iter().map(|v| v.len()).max().unwrap_or(0);
        for i in 0..longest {
            table.row(
                values
                    .iter()
                    .map(|v| v.get(i).map_or(String::new(), |x| cell(*x))),
            );
        }
        table
    }
}

/// The numbers behind a figure as a CSV file; a text that a spreadsheet would take for a formula is kept as text.
pub fn csv(figure: &crate::Figure) -> String {
    let table = crate::table(figure);
    let line = |cells: &[String]| cells.iter().map(|c| field(c)).collect::<Vec<_>>().join(",");
    let rows = table.rows.iter().map(|row| line(row));
    let mut text: String = std::iter::once(line(&table.columns))
        .chain(rows)
        .collect::<Vec<_>>()
        .join("\n");
    text.push('\n');
    text
}

/// One cell (RFC 4180); numbers stay numbers.
fn field(cell: &str) -> String {
    let risky = cell.starts_with(['=', '+', '-', '@', '\t', '\r', '\0']);
    let cell = if risky && cell.parse::<f64>().is_err() {
        format!("'{cell}")
    } else {
        cell.to_owned()
    };
    if cell.contains(['"', ',', '\n', '\r']) {
        format!("\"{}\"", cell.replace('"', "\"\""))
    } else {
        cell
    }
}

/// A number, or nothing where it is not one.
pub(crate) fn cell(value: f64) -> String {
    if value.is_finite() {
        format!("{value}")
    } else {
        String::new()
    }
}

/// A number that may be missing.
pub(crate) fn maybe(value: Option<f64>) -> String {
    value.map_or(String::new(), cell)
}
