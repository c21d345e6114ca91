//! A small table as text: tabs, semicolons or commas between cells, with or without a row of names.
//!
//! # What bites
//! A file may begin with a mark of its encoding, end its lines with CR LF, and hold cells in quotes. Numbers have a point for decimals; where
//! cells are not parted by commas, a comma serves as well. `n/a` and nothing say nothing (BIDS).
use crate::error::{Kind, Problem, Result};
use crate::recording::budget::{Budget, size};
use crate::recording::{MEMORY_BYTES, SideFile};

/// A table larger than this is no side file.
const LARGEST_TABLE: u64 = 256 << 20;
/// What the name of a column costs beside its text.
const COLUMN_BYTES: u64 = 48;

/// The table's rows, read one after the other.
pub(super) struct Table<'a> {
    reader: csv::Reader<&'a [u8]>,
    /// Names of the columns; `column 1`, `column 2` … where the file names none.
    pub(super) columns: Vec<String>,
    /// A row that was read to see whether it names the columns.
    first: Option<csv::ByteRecord>,
    decimal_comma: bool,
    row: csv::ByteRecord,
    /// Pays for the names of the columns, and for what the reader of the rows keeps.
    pub(super) budget: Budget,
    what: &'static str,
}

/// How the first row is understood.
#[derive(Clone, Copy, PartialEq)]
pub(super) enum Header {
    /// It names the columns, with tabs between them (BIDS).
    Named,
    /// It names the columns unless a cell of it is a number.
    Maybe,
}

pub(super) fn broken(what: impl Into<String>) -> Problem {
    Problem::new(
        Kind::Damaged,
        what,
        "correct the table, or open the recording without it",
    )
}

/// The bytes after a UTF-8 byte order mark.
pub(super) fn without_mark(bytes: &[u8]) -> &[u8] {
    bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes)
}

/// Refuses what cannot be a side file: too large, or text of two bytes a letter.
pub(super) fn check(side: &SideFile, what: &str) -> Result<()> {
    if side.bytes.len() as u64 > LARGEST_TABLE {
        return Err(Problem::new(
            Kind::TooLarge,
            format!("{what} is too large"),
            "give a shorter one",
        )
        .expected_found(
            format!("at most {}", size(LARGEST_TABLE)),
            size(side.bytes.len() as u64),
        ));
    }
    if side.bytes.starts_with(b"\xff\xfe") || side.bytes.starts_with(b"\xfe\xff") {
        return Err(Problem::new(
            Kind::Unsupported,
            format!("{what} is text in UTF-16"),
            "save it as text in UTF-8",
        )
        .at("byte 0")
        .expected_found("UTF-8", "the mark of UTF-16"));
    }
    Ok(())
}

impl<'a> Table<'a> {
    /// Reads the names of the columns; `what` as in "the table of events".
    pub(super) fn open(side: &'a SideFile, header: Header, what: &'static str) -> Result<Self> {
        check(side, what)?;
        let bytes = without_mark(&side.bytes);
        let delimiter = match header {
            Header::Named => b'\t',
            Header::Maybe => delimiter(bytes),
        };
        let reader = csv::ReaderBuilder::new()
            .delimiter(delimiter)
            .has_headers(false)
            .trim(csv::Trim::All)
            .from_reader(bytes);
        let mut table = Table {
            reader,
            columns: Vec::new(),
            first: None,
            decimal_comma: delimiter != b',',
            row: csv::ByteRecord::new(),
            budget: Budget::new(side.bytes.len() as u64, MEMORY_BYTES),
            what,
        };
        table.begin(header)?;
        Ok(table)
    }

    fn begin(&mut self, header: Header) -> Result<()> {
        let mut row = csv::ByteRecord::new();
        if !self.read(&mut row)? {
            return Ok(());
        }
        let names = row.len() as u64 * COLUMN_BYTES + row.as_slice().len() as u64;
        self.budget.draw(names, self.what)?;
        let numbers = row
            .iter()
            .any(|cell| number(cell, self.decimal_comma).is_some());
        if header == Header::Maybe && numbers {
            self.columns = (1..=row.len()).map(|k| format!("column {k}")).collect();
            self.first = Some(row);
        } else {
            self.columns = row.iter().map(text).collect();
        }
        Ok(())
    }

    /// The column of one of these names, whatever its capitals; the earlier name first.
    pub(super) fn column(&self, names: &[&str]) -> Option<usize> {
        let find = |name: &&str| {
            self.columns
                .iter()
                .position(|c| c.eq_ignore_ascii_case(name))
        };
        names.iter().find_map(find)
    }

    /// The next row; `None` at the end.
    pub(super) fn next(&mut self) -> Result<Option<Row<'_>>> {
        if let Some(first) = self.first.take() {
            self.row = first;
        } else {
            let mut row = std::mem::take(&mut self.row);
            let more = self.read(&mut row)?;
            self.row = row;
            if !more {
                return Ok(None);
            }
        }
        Ok(Some(Row {
            cells: &self.row,
            columns: &self.columns,
            decimal_comma: self.decimal_comma,
            what: self.what,
        }))
    }

    fn read(&mut self, row: &mut csv::ByteRecord) -> Result<bool> {
        let what = self.what;
        self.reader
            .read_byte_record(row)
            .map_err(|e| unreadable(&e, what))
    }
}

/// One row of a table.
pub(super) struct Row<'a> {
    cells: &'a csv::ByteRecord,
    columns: &'a [String],
    decimal_comma: bool,
    what: &'static str,
}

impl Row<'_> {
    /// The line of the file it stands on, from 1.
    pub(super) fn line(&self) -> u64 {
        self.cells.position().map_or(0, csv::Position::line)
    }

    fn said(&self, column: usize) -> Option<&[u8]> {
        self.cells
            .get(column)
            .filter(|cell| !cell.is_empty() && !cell.eq_ignore_ascii_case(b"n/a"))
    }

    /// A cell that says something.
    pub(super) fn text(&self, column: usize) -> Option<String> {
        self.said(column).map(text)
    }

    /// Every cell as it stands.
    pub(super) fn all(&self) -> Vec<String> {
        self.cells.iter().map(text).collect()
    }

    /// Whether a cell holds a number.
    pub(super) fn is_number(&self, column: usize) -> bool {
        self.said(column)
            .is_some_and(|cell| number(cell, self.decimal_comma).is_some())
    }

    /// A number of at most 1e9 in size; `None` for `n/a`.
    pub(super) fn number(&self, column: usize, expected: &str) -> Result<Option<f64>> {
        let Some(cell) = self.said(column) else {
            return Ok(None);
        };
        match number(cell, self.decimal_comma) {
            Some(value) if value.abs() <= 1e9 => Ok(Some(value)),
            _ => Err(broken(format!("a cell of {} is no number", self.what))
                .at(format!(
                    "line {}, column {}",
                    self.line(),
                    self.columns.get(column).map_or("", String::as_str)
                ))
                .expected_found(expected, format!("\"{}\"", cell.escape_ascii()))),
        }
    }
}

fn text(cell: &[u8]) -> String {
    String::from_utf8_lossy(cell).into_owned()
}

fn number(cell: &[u8], decimal_comma: bool) -> Option<f64> {
    let cell = std::str::from_utf8(cell).ok()?;
    // The words that Rust takes for numbers are none in a table.
    if !cell.starts_with(|c: char| c.is_ascii_digit() || "+-.,".contains(c)) {
        return None;
    }
    let value: Option<f64> = if decimal_comma && cell.contains(',') {
        cell.replacen(',', ".", 1).parse().ok()
    } else {
        cell.parse().ok()
    };
    value.filter(|v| v.is_finite())
}

/// What parts the cells of the first line: a tab where there is one, else a semicolon, else a comma.
fn delimiter(bytes: &[u8]) -> u8 {
    let line = bytes.split(|&b| b == b'\n').next().unwrap_or(&[]);
    *[b'\t', b';']
        .iter()
        .find(|d| line.contains(d))
        .unwrap_or(&b',')
}

fn unreadable(error: &csv::Error, what: &str) -> Problem {
    match error.kind() {
        csv::ErrorKind::UnequalLengths {
            pos,
            expected_len,
            len,
        } => broken(format!("a row of {what} has another number of columns"))
            .at(format!(
                "line {}",
                pos.as_ref().map_or(0, csv::Position::line)
            ))
            .expected_found(format!("{expected_len} columns"), format!("{len} columns")),
        _ => broken(format!("{what} cannot be read")).at(error.to_string()),
    }
}
