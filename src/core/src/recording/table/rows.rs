//! Rows of a table, one after the other, from slices that end anywhere.
use super::read::damaged;
use crate::error::Result;
use crate::recording::budget::{Budget, size};

/// Bytes of one row, beyond which a quotation mark must have been left open.
const LONGEST_ROW: usize = 16 << 20;

/// Cuts bytes into rows of cells.
pub(super) struct Rows {
    reader: csv_core::Reader,
    cells: Vec<u8>,
    ends: Vec<usize>,
    used: usize,
    count: usize,
    line: u64,
}

/// What [`Rows::next`] found.
pub(super) enum Found {
    /// A whole row.
    Row,
    /// The slice ended first.
    SliceEnd,
    /// The table ended.
    End,
}

impl Rows {
    pub(super) fn new(separator: u8, columns: usize, budget: &mut Budget) -> Result<Rows> {
        let mut rows = Rows {
            reader: csv_core::ReaderBuilder::new()
                .delimiter(separator)
                .comment(Some(b'#'))
                .build(),
            cells: budget.vec(16 * columns as u64 + 64, "a row of it")?,
            ends: budget.vec(columns as u64 + 1, "a row of it")?,
            used: 0,
            count: 0,
            line: 0,
        };
        rows.cells.resize(16 * columns + 64, 0);
        rows.ends.resize(columns + 1, 0);
        Ok(rows)
    }

    /// Takes bytes from the front of `slice` up to the end of a row; an empty slice is the end of the table.
    pub(super) fn next(&mut self, slice: &mut &[u8], budget: &mut Budget) -> Result<Found> {
        loop {
            let (result, taken, cells, ends) = self.reader.read_record(
                slice,
                &mut self.cells[self.used..],
                &mut self.ends[self.count..],
            );
            // A row that ends in a line feed leaves the parser on the line below.
            let below = u64::from(slice[..taken].ends_with(b"\n"));
            *slice = &slice[taken..];
            self.used += cells;
            self.count += ends;
            match result {
                csv_core::ReadRecordResult::InputEmpty => return Ok(Found::SliceEnd),
                csv_core::ReadRecordResult::End => return Ok(Found::End),
                csv_core::ReadRecordResult::Record => {
                    self.line = self.reader.line() - below;
                    return Ok(Found::Row);
                }
                csv_core::ReadRecordResult::OutputFull => {
                    let more = self.cells.len();
                    if more > LONGEST_ROW {
                        return Err(damaged("a row of the table does not end")
                            .at(format!("line {}", self.reader.line()))
                            .expected_found(
                                format!(
                                    "a line end within {}, quotation marks in pairs",
                                    size(LONGEST_ROW as u64)
                                ),
                                "none",
                            ));
                    }
                    budget.draw(more as u64, "a row of it")?;
                    self.cells.resize(2 * more, 0);
                }
                csv_core::ReadRecordResult::OutputEndsFull => {
                    let more = self.ends.len();
                    budget.draw((more * size_of::<usize>()) as u64, "a row of it")?;
                    self.ends.resize(2 * more, 0);
                }
            }
        }
    }

    /// Line on which the row ends.
    pub(super) fn line(&self) -> u64 {
        self.line
    }

    /// Cells of the row that was found.
    pub(super) fn count(&self) -> usize {
        self.count
    }

    /// One cell, without spaces around it.
    pub(super) fn cell(&self, index: usize) -> &[u8] {
        let from = match index {
            0 => 0,
            _ => self.ends[index - 1],
        };
        self.cells[from..self.ends[index]].trim_ascii()
    }

    /// Makes room for the next row.
    pub(super) fn clear(&mut self) {
        self.used = 0;
        self.count = 0;
    }
}
