//! Event tables beside a recording: `*_events.tsv` as BIDS describes it.
//!
//! # What it does to annotations
//! The table replaces the annotations of the recording itself, and a warning says how many: the two usually tell the same events
//! twice, in different words.
//!
//! # Time
//! BIDS counts onsets from the first sample, the recording's events from the file's clock; the first sample's own onset is added.
//!
//! # Labels
//! `trial_type`, or `value` where that is missing or `n/a`. A table with neither column names every event `event`.
use super::budget::{Budget, size};
use super::{Event, MEMORY_BYTES, Recording, SideFile};
use crate::error::{Kind, Problem, Result};

/// A table larger than this is no side file.
const LARGEST_TABLE: u64 = 256 << 20;
/// What an event costs beside its label.
const EVENT_BYTES: u64 = 2 * size_of::<Event>() as u64 + 16;

/// Uses the event table among the side files, and says which side files were not used.
pub(super) fn apply(recording: &mut Recording, sides: &[SideFile]) -> Result<()> {
    let (tables, rest): (Vec<_>, Vec<_>) = sides.iter().partition(|s| is_event_table(s));
    for side in rest {
        recording.warnings.push(format!(
            "{} was not used: beside a recording only a table of events (*_events.tsv) is read.",
            side.name
        ));
    }
    let Some(table) = the_one(&tables, &recording.name)? else {
        return Ok(());
    };
    let (events, mut warnings) = read(table).map_err(|p| p.in_file(table.name.as_str()))?;
    if !recording.events.is_empty() {
        warnings.push(format!(
            "The {} events of {} replace the {} annotations of the recording itself.",
            events.len(),
            table.name,
            recording.events.len()
        ));
    }
    let start_s = recording.stretches.first().map_or(0.0, |s| s.onset_s);
    recording.events = events;
    for event in &mut recording.events {
        event.onset_s += start_s;
    }
    recording.warnings.extend(warnings);
    recording.side_files.push(table.name.clone());
    Ok(())
}

/// A `.tsv` whose name ends as BIDS says, or whose first line has an `onset`.
fn is_event_table(side: &SideFile) -> bool {
    let name = side.name.to_lowercase();
    let first_line = side.bytes.split(|&b| b == b'\n').next().unwrap_or(&[]);
    name.ends_with("events.tsv")
        || (name.ends_with(".tsv")
            && without_mark(first_line)
                .split(|&b| b == b'\t')
                .any(|cell| cell.trim_ascii() == b"onset"))
}

/// Of several tables the one that shares the recording's name up to its last `_`.
fn the_one<'a>(tables: &[&'a SideFile], recording: &str) -> Result<Option<&'a SideFile>> {
    let stem = recording
        .rsplit_once('_')
        .map_or(recording, |(stem, _)| stem);
    match tables {
        [] => Ok(None),
        [table] => Ok(Some(table)),
        _ => match tables
            .iter()
            .filter(|t| t.name == format!("{stem}_events.tsv"))
            .collect::<Vec<_>>()[..]
        {
            [table] => Ok(Some(table)),
            _ => Err(Problem::new(
                Kind::Unsupported,
                "several tables of events were given for one recording",
                "give only the one that belongs to it",
            )
            .in_file(tables[1].name.as_str())
            .expected_found("one table", tables.len())),
        },
    }
}

/// The bytes after a UTF-8 byte order mark.
fn without_mark(bytes: &[u8]) -> &[u8] {
    bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes)
}

fn broken(what: &str) -> Problem {
    Problem::new(
        Kind::Damaged,
        what,
        "correct the table, or open the recording without it",
    )
}

/// Columns of the table that are used.
struct Columns {
    onset: usize,
    duration: Option<usize>,
    trial_type: Option<usize>,
    value: Option<usize>,
}

impl Columns {
    fn find(header: &csv::ByteRecord) -> Result<Columns> {
        let find = |name: &str| header.iter().position(|cell| cell == name.as_bytes());
        let names = header.iter().map(|c| c.escape_ascii().to_string());
        let onset = find("onset").ok_or_else(|| {
            broken("the table of events has no column of onsets")
                .at("line 1")
                .expected_found(
                    "a column named onset, tabs between columns",
                    names.collect::<Vec<_>>().join(", "),
                )
        })?;
        Ok(Columns {
            onset,
            duration: find("duration"),
            trial_type: find("trial_type"),
            value: find("value"),
        })
    }

    /// The label of a row; `None` where every cell for it is `n/a`.
    fn label(&self, row: &csv::ByteRecord) -> Option<String> {
        let cells = [self.trial_type, self.value];
        if cells == [None, None] {
            return Some("event".to_owned());
        }
        let mut cells = cells.into_iter().flatten();
        cells.find_map(|column| cell(row, column).map(|c| String::from_utf8_lossy(c).into_owned()))
    }
}

/// A cell that says something.
fn cell(row: &csv::ByteRecord, column: usize) -> Option<&[u8]> {
    row.get(column)
        .filter(|cell| !cell.is_empty() && !cell.eq_ignore_ascii_case(b"n/a"))
}

/// A number in seconds; `None` for `n/a`.
fn seconds(row: &csv::ByteRecord, column: usize, name: &str) -> Result<Option<f64>> {
    let Some(cell) = cell(row, column) else {
        return Ok(None);
    };
    let number = std::str::from_utf8(cell).ok().and_then(|c| c.parse().ok());
    match number {
        Some(seconds) if f64::abs(seconds) <= 1e9 => Ok(Some(seconds)),
        _ => Err(broken("a time in the table of events is no number")
            .at(format!("line {}, column {name}", line(row)))
            .expected_found(
                "seconds, with a point for decimals, or n/a",
                format!("\"{}\"", cell.escape_ascii()),
            )),
    }
}

fn line(row: &csv::ByteRecord) -> u64 {
    row.position().map_or(0, csv::Position::line)
}

fn read(table: &SideFile) -> Result<(Vec<Event>, Vec<String>)> {
    if table.bytes.len() as u64 > LARGEST_TABLE {
        return Err(Problem::new(
            Kind::TooLarge,
            "the table of events is too large",
            "give a shorter table",
        )
        .expected_found(
            format!("at most {}", size(LARGEST_TABLE)),
            size(table.bytes.len() as u64),
        ));
    }
    let mut budget = Budget::new(table.bytes.len() as u64, MEMORY_BYTES);
    let mut reader = csv::ReaderBuilder::new()
        .delimiter(b'\t')
        .trim(csv::Trim::All)
        .from_reader(without_mark(&table.bytes));
    let columns = Columns::find(reader.byte_headers().map_err(|e| unreadable(&e))?)?;
    let (mut events, mut row) = (Vec::new(), csv::ByteRecord::new());
    let (mut untimed, mut unnamed) = (0, 0);
    while reader
        .read_byte_record(&mut row)
        .map_err(|e| unreadable(&e))?
    {
        let Some(onset_s) = seconds(&row, columns.onset, "onset")? else {
            untimed += 1;
            continue;
        };
        let Some(label) = columns.label(&row) else {
            unnamed += 1;
            continue;
        };
        let duration = columns.duration.map(|c| seconds(&row, c, "duration"));
        budget.draw(EVENT_BYTES + label.len() as u64, "its table of events")?;
        events.push(Event {
            onset_s,
            duration_s: duration.transpose()?.flatten().unwrap_or(0.0).max(0.0),
            label,
        });
    }
    let mut warnings = Vec::new();
    let mut warn = |rows: usize, lack: &str| {
        if rows > 0 {
            warnings.push(format!(
                "{rows} rows of {} have no {lack} and were left out.",
                table.name
            ));
        }
    };
    warn(untimed, "onset");
    warn(unnamed, "trial_type or value");
    Ok((events, warnings))
}

fn unreadable(error: &csv::Error) -> Problem {
    match error.kind() {
        csv::ErrorKind::UnequalLengths {
            pos,
            expected_len,
            len,
        } => broken("a row of the table of events has another number of columns")
            .at(format!(
                "line {}",
                pos.as_ref().map_or(0, csv::Position::line)
            ))
            .expected_found(
                format!("{expected_len} columns, tabs between them"),
                format!("{len} columns"),
            ),
        _ => broken("the table of events cannot be read").at(error.to_string()),
    }
}
