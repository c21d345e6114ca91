//! Tables of text: comma, semicolon or tab between columns, a channel a column, a sample a row.
//!
//! # What decides the dialect
//! The first MiB. The separator is the first of tab, semicolon and comma that stands as often in every row; the decimal mark
//! is the one that the numbers use (a comma only where commas do not separate). A first row with a cell that is no number is the
//! header; a row that starts with `#` is a comment. Quotation marks work as RFC 4180 says.
//!
//! # Time
//! A column called `time`, `t`, `seconds`, `timestamp` (also with a unit in brackets or after `_`: s, ms, µs), or else a first
//! column that rises by equal steps, is the time: its steps give the sampling rate; a time that leaves
//! the straight line by more than three quarters of a step is refused. A column that counts 0, 1, 2 … or 1, 2, 3 … is a count of samples and is left out. Without a time
//! column the rate is asked for.
//!
//! # Units
//! `Fz (uV)` and `Fz [uV]` in the header give the unit; without it the unit is asked for.
//!
//! # Events
//! A column called `event`, `marker`, `trigger`, `stimulus`, `status`, `annotation` or `label` (also in the plural) is no channel:
//! wherever its content changes to something other than nothing and 0, there is an event with that content for its label.
//!
//! # What is missing
//! An empty cell, `NaN`, `NA` and `n/a` are kept as no number; such a channel is listed as unusable.
mod dialect;
mod read;
mod rows;
mod time;

use super::opening::Format;

pub(super) const FORMAT: Format = Format {
    name: "a table (CSV, TSV)",
    score: dialect::score,
    begin: read::begin,
};
