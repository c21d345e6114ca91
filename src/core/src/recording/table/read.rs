//! From the rows of a table to a recording.
use super::dialect::{self, Dialect, HEAD_BYTES, Role, is_missing, number};
use super::rows::{Found, Rows};
use super::time::Clock;
use crate::error::{Kind, Problem, Result, Salvage};
use crate::recipe::Axes;
use crate::recording::budget::Budget;
use crate::recording::given::Asking;
use crate::recording::names::{counted, name_apart, opened_before};
use crate::recording::opening::{OpenOptions, Reader};
use crate::recording::units::Unit;
use crate::recording::{Channel, Event, Layout, OtherChannel, Recording, Source, Stretch};

/// Bytes read at once.
const SLICE_BYTES: u64 = 8 << 20;
/// Bytes parsed in one step: a few milliseconds.
const STEP_BYTES: usize = 1 << 20;
/// A growing vector takes at most twice what is in it.
const GROWING: u64 = 2;

pub(super) fn damaged(what: &str) -> Problem {
    Problem::new(
        Kind::Damaged,
        what,
        "correct the table there, or write it anew with the program that made it",
    )
}

/// One column of samples.
struct Column {
    index: usize,
    factor: f64,
    samples: Vec<f32>,
    /// Cells without a number, and the line of the first.
    missing: (u64, u64),
}

/// One column of marks.
struct Marks {
    index: usize,
    name: String,
    last: String,
}

struct TableReader {
    dialect: Dialect,
    salvage: bool,
    rows: Rows,
    /// Bytes of the file, and read.
    bytes: u64,
    at: u64,
    slice: Vec<u8>,
    /// Bytes of the slice already parsed.
    parsed: usize,
    headed: bool,
    done: bool,
    samples: u64,
    rate_hz: Option<f64>,
    clock: Option<(usize, Clock)>,
    columns: Vec<Column>,
    marks: Vec<Marks>,
    /// Sample and label of each mark.
    events: Vec<(u64, String)>,
    channels: Vec<Channel>,
    others: Vec<OtherChannel>,
    warnings: Vec<String>,
}

pub(super) fn begin(
    source: &mut dyn Source,
    options: &OpenOptions,
    budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    let mut head = vec![0; source.len().min(HEAD_BYTES) as usize];
    source.read_at(0, &mut head)?;
    let dialect = dialect::decide(&head, source.len() <= HEAD_BYTES)?;
    if let Some(axes) = options.given.axes.filter(|a| *a != Axes::SamplesChannels) {
        return Err(Problem::new(
            Kind::Unsupported,
            "a table is read with a row for each sample",
            "exchange its rows and columns",
        )
        .expected_found(Axes::SamplesChannels.name(), axes.name()));
    }
    let mut asking = Asking::new(&options.given);
    let is_timed = dialect
        .columns
        .iter()
        .any(|role| matches!(role, Role::Time(_)));
    let rate_hz = match is_timed {
        true => None,
        false => asking.rate("samples"),
    };
    let all_have_units = dialect
        .columns
        .iter()
        .all(|role| !matches!(role, Role::Channel { unit: None, .. }));
    let told = match all_have_units {
        true => None,
        false => asking.unit(Some("uV")),
    };
    asking.settle("a table")?;

    let columns_bytes =
        dialect.columns.len() as u64 * (size_of::<Column>() + size_of::<Channel>() + 64) as u64;
    budget.draw(GROWING * columns_bytes, "its columns")?;
    let rows = Rows::new(dialect.separator, dialect.columns.len(), budget)?;
    let mut reader = TableReader {
        salvage: options.salvage,
        rows,
        bytes: source.len(),
        at: dialect.skip,
        slice: budget.vec(source.len().min(SLICE_BYTES), "a slice of it")?,
        parsed: 0,
        headed: !dialect.has_header,
        done: false,
        samples: 0,
        rate_hz,
        clock: None,
        columns: Vec::new(),
        marks: Vec::new(),
        events: Vec::new(),
        channels: Vec::new(),
        others: Vec::new(),
        warnings: dialect.warnings.clone(),
        dialect,
    };
    reader.lay_out(told.as_ref());
    Ok(Box::new(reader))
}

impl TableReader {
    /// Gives every column its place.
    fn lay_out(&mut self, told: Option<&Unit>) {
        for (index, role) in self.dialect.columns.iter().enumerate() {
            match role {
                Role::Channel { name, unit } => {
                    let unit = match (unit, told) {
                        (Some(written), _) => Unit::of(written),
                        (None, Some(told)) => told.clone(),
                        (None, None) => Unit::of(""),
                    };
                    self.channels.push(Channel {
                        name: name.clone(),
                        unit: unit.name,
                        position: None,
                    });
                    self.columns.push(Column {
                        index,
                        factor: unit.factor,
                        samples: Vec::new(),
                        missing: (0, 0),
                    });
                }
                Role::Time(clock) => self.clock = Some((index, clock.clone())),
                Role::Events { name } => self.marks.push(Marks {
                    index,
                    name: name.clone(),
                    last: String::new(),
                }),
                Role::Other { name, reason } => self.others.push(OtherChannel {
                    name: name.clone(),
                    unit: String::new(),
                    rate_hz: 0.0,
                    reason: (*reason).to_owned(),
                }),
            }
        }
        name_apart(&mut self.channels, &mut self.warnings);
    }

    /// The rate, as far as it is known before the end.
    fn about_hz(&self) -> f64 {
        let clock = self.clock.as_ref().map(|(_, clock)| 1.0 / clock.step_s());
        self.rate_hz.or(clock).unwrap_or(f64::NAN)
    }

    /// Fills the slice where it is used up.
    fn fill(&mut self, source: &mut dyn Source) -> Result<()> {
        if self.parsed < self.slice.len() || self.at >= self.bytes {
            return Ok(());
        }
        let count = (self.bytes - self.at).min(SLICE_BYTES) as usize;
        self.slice.resize(count, 0);
        source.read_at(self.at, &mut self.slice)?;
        self.at += count as u64;
        self.parsed = 0;
        Ok(())
    }

    /// Parses up to [`STEP_BYTES`] of the slice.
    fn parse(&mut self, budget: &mut Budget) -> Result<()> {
        let slice = std::mem::take(&mut self.slice);
        let end = slice.len().min(self.parsed + STEP_BYTES);
        let mut rest = &slice[self.parsed..end];
        let is_last = self.at >= self.bytes && end == slice.len();
        let parsed = self.parse_rows(&mut rest, is_last, budget);
        self.parsed = end - rest.len();
        self.slice = slice;
        parsed
    }

    fn parse_rows(&mut self, rest: &mut &[u8], is_last: bool, budget: &mut Budget) -> Result<()> {
        loop {
            // No bytes at all would mean the end of the table.
            if rest.is_empty() && !is_last {
                return Ok(());
            }
            match self.rows.next(rest, budget)? {
                Found::Row if self.headed => {
                    self.row(budget)?;
                    self.rows.clear();
                }
                Found::Row => {
                    self.headed = true;
                    self.rows.clear();
                }
                Found::SliceEnd if !is_last => return Ok(()),
                Found::SliceEnd => {}
                Found::End => {
                    self.done = true;
                    return Ok(());
                }
            }
        }
    }

    /// One sample of every channel.
    fn row(&mut self, budget: &mut Budget) -> Result<()> {
        let line = self.rows.line();
        let wanted = self.dialect.columns.len();
        if self.rows.count() != wanted {
            return Err(damaged("a row has another number of columns")
                .at(format!("line {line}"))
                .expected_found(
                    counted(wanted as u64, "column"),
                    counted(self.rows.count() as u64, "column"),
                ));
        }
        let mut values = GROWING * 4 * self.columns.len() as u64;
        if self.clock.is_some() {
            values += GROWING * 8;
        }
        budget.draw(values, "its samples")?;
        let comma = self.dialect.decimal_comma;
        if let Some((index, clock)) = &mut self.clock {
            let cell = self.rows.cell(*index);
            let Some(time) = number(cell, comma) else {
                return Err(no_number(cell, line, &clock.name, comma));
            };
            clock.tick(time, line)?;
        }
        for (column, channel) in self.columns.iter_mut().zip(&self.channels) {
            let cell = self.rows.cell(column.index);
            let value = match number(cell, comma) {
                Some(value) => (value * column.factor) as f32,
                None if is_missing(cell) => {
                    if column.missing.0 == 0 {
                        column.missing.1 = line;
                    }
                    column.missing.0 += 1;
                    f32::NAN
                }
                None => return Err(no_number(cell, line, &channel.name, comma)),
            };
            if value.is_infinite() {
                return Err(damaged("a number is too large")
                    .at(format!("line {line}, column \"{}\"", channel.name))
                    .expected_found("a number of 32 bits", quoted(cell)));
            }
            column.samples.push(value);
        }
        self.mark(budget)?;
        self.samples += 1;
        Ok(())
    }

    /// Events where a column of marks changes.
    fn mark(&mut self, budget: &mut Budget) -> Result<()> {
        for marks in &mut self.marks {
            let cell = self.rows.cell(marks.index);
            if cell == marks.last.as_bytes() {
                continue;
            }
            marks.last = String::from_utf8_lossy(cell).into_owned();
            let is_zero = number(cell, self.dialect.decimal_comma) == Some(0.0);
            if is_missing(cell) || is_zero {
                continue;
            }
            budget.draw(
                GROWING * (size_of::<(u64, String, Event)>() + cell.len()) as u64,
                "its events",
            )?;
            let label: String = marks.last.chars().filter(|c| !c.is_control()).collect();
            self.events.push((self.samples, label));
        }
        Ok(())
    }

    /// Rows before a problem can be opened alone.
    fn salvageable(&self, mut problem: Problem) -> Problem {
        let is_of_rows = matches!(problem.kind, Kind::Damaged);
        if is_of_rows && self.samples > 1 {
            problem.salvage = Some(Salvage {
                records: self.samples,
                seconds: self.samples as f64 / self.about_hz(),
            });
        }
        problem
    }
}

fn quoted(cell: &[u8]) -> String {
    format!("\"{}\"", cell[..cell.len().min(40)].escape_ascii())
}

fn no_number(cell: &[u8], line: u64, column: &str, comma: bool) -> Problem {
    let mark = if comma { "comma" } else { "point" };
    let what = match cell.contains(&b',') || (comma && cell.contains(&b'.')) {
        true => "the table mixes decimal marks, or groups its digits",
        false => "a cell is no number",
    };
    damaged(what)
        .at(format!("line {line}, column \"{column}\""))
        .expected_found(format!("a number with a decimal {mark}"), quoted(cell))
}

impl Reader for TableReader {
    fn step(&mut self, source: &mut dyn Source, budget: &mut Budget) -> Result<(u64, u64)> {
        self.fill(source)?;
        if let Err(problem) = self.parse(budget) {
            let problem = self.salvageable(problem);
            if !(self.salvage && problem.salvage.is_some()) {
                return Err(problem);
            }
            self.warnings
                .push(opened_before(&problem, self.samples, "whole row"));
            self.done = true;
        }
        match self.done {
            true => Ok((self.bytes, self.bytes)),
            false => Ok((
                (self.at - (self.slice.len() - self.parsed) as u64).min(self.bytes - 1),
                self.bytes,
            )),
        }
    }

    fn finish(mut self: Box<Self>) -> Result<Recording> {
        if self.samples == 0 {
            return Err(Problem::new(
                Kind::Empty,
                "the table has no row of samples",
                "check whether it was saved whole",
            )
            .expected_found("rows of numbers", "none"));
        }
        let (onset_s, rate_hz) = match (&self.clock, self.rate_hz) {
            (Some((_, clock)), _) => clock.settle()?,
            (None, rate_hz) => (0.0, rate_hz.unwrap_or(f64::NAN)),
        };
        if let Some((_, clock)) = &self.clock {
            self.warnings.push(format!(
                "The column \"{}\" gives a sampling rate of {rate_hz} Hz.",
                clock.name
            ));
        }
        for other in &mut self.others {
            other.rate_hz = rate_hz;
        }
        for (column, channel) in self.columns.iter().zip(&self.channels) {
            if column.missing.0 > 0 {
                self.warnings.push(format!(
                    "Channel \"{}\" lacks {}, the first in line {}.",
                    channel.name,
                    counted(column.missing.0, "number"),
                    column.missing.1
                ));
            }
        }
        for marks in &self.marks {
            self.warnings.push(format!(
                "The column \"{}\" was taken for events: one wherever it changes to something.",
                marks.name
            ));
        }
        let count = self.samples as usize;
        Ok(Recording {
            name: String::new(),
            format: match self.dialect.separator {
                b'\t' => "TSV".to_owned(),
                _ => "CSV".to_owned(),
            },
            rate_hz,
            channels: self.channels,
            others: self.others,
            samples: self.columns.into_iter().map(|c| c.samples).collect(),
            layout: Layout::Head,
            stretches: vec![Stretch {
                first: 0,
                count,
                onset_s,
            }],
            events: self
                .events
                .into_iter()
                .map(|(sample, label)| Event {
                    onset_s: onset_s + sample as f64 / rate_hz,
                    duration_s: 0.0,
                    label,
                })
                .collect(),
            about: crate::recording::About::default(),
            side_files: Vec::new(),
            warnings: self.warnings,
        })
    }
}
