//! Tables of events: `*_events.tsv` as BIDS describes it, or any table whose columns are told.
//!
//! # What it does to annotations
//! The table replaces the annotations of the recording itself, and a warning says how many: the two usually tell the same events
//! twice, in different words.
//!
//! # Time
//! Onsets count from the first sample (BIDS), the recording's events from the file's clock; the first sample's own onset is added.
//!
//! # Labels
//! `trial_type`, or `value` where that is missing or `n/a`. A table with neither column names every event `event`.
use super::table::{Header, Row, Table, broken};
use crate::error::{Kind, Problem, Result};
use crate::recipe::{EventColumns, TimeUnit};
use crate::recording::{Event, Recording, SideFile};
use serde::Serialize;
use std::collections::BTreeMap;

/// What an event costs beside its label.
const EVENT_BYTES: u64 = 2 * size_of::<Event>() as u64 + 16;
/// Rows looked at to guess which column is which.
const GUESS_ROWS: usize = 2000;
/// Rows and kinds of events that a preview shows.
const SHOWN: usize = 5;
const WHAT: &str = "the table of events";

/// Puts the events of a table in place of the recording's own.
pub(super) fn apply(
    recording: &mut Recording,
    table: &SideFile,
    told: Option<&EventColumns>,
) -> Result<()> {
    let (events, mut warnings) =
        read(table, told, recording.rate_hz).map_err(|p| p.in_file(table.name.as_str()))?;
    if !recording.events.is_empty() {
        warnings.push(format!(
            "The {} events of {} replace the {} annotations of the recording itself.",
            events.len(),
            table.name,
            recording.events.len()
        ));
    }
    let start_s = recording.stretches.first().map_or(0.0, |s| s.onset_s);
    let span_s = recording.span_s() - start_s;
    let late = events.iter().filter(|e| e.onset_s > span_s).count();
    if late > 0 {
        warnings.push(format!(
            "{late} of the {} events of {} lie after the end of the recording ({span_s:.1} s): check the unit of their times.",
            events.len(),
            table.name
        ));
    }
    recording.events = events;
    for event in &mut recording.events {
        event.onset_s += start_s;
    }
    recording.warnings.extend(warnings);
    recording.side_files.push(table.name.clone());
    Ok(())
}

/// Columns of the table that are used.
struct Columns {
    onset: usize,
    duration: Option<usize>,
    /// The first that says something gives the label.
    labels: Vec<usize>,
    /// Seconds of one unit of time.
    unit_s: f64,
    in_words: &'static str,
}

impl Columns {
    /// By the names of the standard.
    fn standard(table: &Table<'_>) -> Result<Columns> {
        let find = |name: &str| table.columns.iter().position(|c| c == name);
        let onset = find("onset").ok_or_else(|| {
            broken("the table of events has no column of onsets")
                .at("line 1")
                .expected_found(
                    "a column named onset, tabs between columns",
                    table.columns.join(", "),
                )
        })?;
        Ok(Columns {
            onset,
            duration: find("duration"),
            labels: ["trial_type", "value"]
                .into_iter()
                .filter_map(find)
                .collect(),
            unit_s: 1.0,
            in_words: "seconds, with a point for decimals, or n/a",
        })
    }

    /// By the names that were told.
    fn told(table: &Table<'_>, told: &EventColumns, rate_hz: f64) -> Result<Columns> {
        let find = |name: &str| {
            let at = table.columns.iter().position(|c| c == name);
            at.ok_or_else(|| {
                Problem::new(
                    Kind::Recipe,
                    format!("the table of events has no column \"{name}\""),
                    "choose one of its columns",
                )
                .at("line 1")
                .expected_found(format!("a column named {name}"), table.columns.join(", "))
            })
        };
        let optional = |name: &Option<String>| name.as_deref().map(find).transpose();
        let (unit_s, in_words) = match told.unit {
            TimeUnit::Seconds => (1.0, "a number of seconds, or n/a"),
            TimeUnit::Milliseconds => (1e-3, "a number of milliseconds, or n/a"),
            TimeUnit::Samples => (1.0 / rate_hz, "a number of samples, or n/a"),
        };
        Ok(Columns {
            onset: find(&told.onset)?,
            duration: optional(&told.duration)?,
            labels: optional(&told.label)?.into_iter().collect(),
            unit_s,
            in_words,
        })
    }

    /// The label of a row; `None` where every cell for it says nothing.
    fn label(&self, row: &Row<'_>) -> Option<String> {
        if self.labels.is_empty() {
            return Some("event".to_owned());
        }
        self.labels.iter().find_map(|column| row.text(*column))
    }

    fn seconds(&self, row: &Row<'_>, column: usize) -> Result<Option<f64>> {
        let value = row.number(column, self.in_words)?;
        // Divided where that is exact: 1/1000 has no binary fraction.
        Ok(value.map(|v| {
            if self.unit_s == 1e-3 {
                v / 1e3
            } else {
                v * self.unit_s
            }
        }))
    }
}

fn read(
    side: &SideFile,
    told: Option<&EventColumns>,
    rate_hz: f64,
) -> Result<(Vec<Event>, Vec<String>)> {
    let header = match told {
        Some(_) => Header::Maybe,
        None => Header::Named,
    };
    let mut table = Table::open(side, header, WHAT)?;
    let columns = match told {
        Some(told) => Columns::told(&table, told, rate_hz)?,
        None => Columns::standard(&table)?,
    };
    let mut events = Vec::new();
    let (mut untimed, mut unnamed) = (0, 0);
    while let Some(row) = table.next()? {
        let Some(onset_s) = columns.seconds(&row, columns.onset)? else {
            untimed += 1;
            continue;
        };
        let Some(label) = columns.label(&row) else {
            unnamed += 1;
            continue;
        };
        let duration_s = match columns.duration {
            Some(column) => columns.seconds(&row, column)?.unwrap_or(0.0).max(0.0),
            None => 0.0,
        };
        table
            .budget
            .draw(EVENT_BYTES + label.len() as u64, "its table of events")?;
        events.push(Event {
            onset_s,
            duration_s,
            label,
        });
    }
    let mut warnings = Vec::new();
    let mut warn = |rows: usize, lack: &str| {
        if rows > 0 {
            warnings.push(format!(
                "{rows} rows of {} have no {lack} and were left out.",
                side.name
            ));
        }
    };
    warn(untimed, "onset");
    let labelled = match told {
        Some(_) => "label",
        None => "trial_type or value",
    };
    warn(unnamed, labelled);
    Ok((events, warnings))
}

/// What a table of events would give, before it is used.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct EventsPreview {
    /// Names of all columns, in order.
    pub columns: Vec<String>,
    /// The first five rows as they stand.
    pub rows: Vec<Vec<String>>,
    /// Rows below the names of the columns.
    pub count: usize,
    /// The columns in force: what was told, or what is likeliest.
    pub mapping: EventColumns,
    /// The most frequent labels that would result, at most five, with their counts.
    pub labels: Vec<(String, usize)>,
    /// Labels beside those.
    pub more_labels: usize,
    /// First and last onset that would result, in seconds from the first sample.
    pub span_s: Option<[f64; 2]>,
    /// Events that would lie after the end of the recording.
    pub late: usize,
    /// What stands against the columns in force.
    pub problem: Option<Problem>,
}

/// Looks at a table of events. `told` is what is to be tried; without it the likeliest columns are. The recording has `rate_hz` and lasts
/// `span_s` seconds.
///
/// # Errors
/// Where the table cannot be read at all. Columns that do not serve are the preview's own `problem`.
pub fn events_preview(
    side: &SideFile,
    told: Option<&EventColumns>,
    rate_hz: f64,
    span_s: f64,
) -> Result<EventsPreview> {
    let named = |p: Problem| p.in_file(side.name.as_str());
    let seen = Seen::look(side).map_err(named)?;
    let mapping = match told {
        Some(told) => told.clone(),
        None => seen.guess(rate_hz, span_s),
    };
    let mut preview = EventsPreview {
        count: seen.count,
        columns: seen.columns,
        rows: seen.rows,
        mapping,
        labels: Vec::new(),
        more_labels: 0,
        span_s: None,
        late: 0,
        problem: None,
    };
    match read(side, Some(&preview.mapping), rate_hz) {
        Ok((events, _)) => preview.count_events(&events, span_s),
        Err(problem) => preview.problem = Some(named(problem)),
    }
    Ok(preview)
}

impl EventsPreview {
    fn count_events(&mut self, events: &[Event], span_s: f64) {
        let mut counts: BTreeMap<&str, usize> = BTreeMap::new();
        for event in events {
            *counts.entry(&event.label).or_default() += 1;
        }
        let mut labels: Vec<(String, usize)> =
            counts.into_iter().map(|(l, n)| (l.to_owned(), n)).collect();
        labels.sort_by(|a, b| b.1.cmp(&a.1).then(a.0.cmp(&b.0)));
        self.more_labels = labels.len().saturating_sub(SHOWN);
        labels.truncate(SHOWN);
        self.labels = labels;
        self.late = events.iter().filter(|e| e.onset_s > span_s).count();
        let onsets = events.iter().map(|e| e.onset_s);
        self.span_s = (!events.is_empty()).then(|| {
            [
                onsets.clone().fold(f64::INFINITY, f64::min),
                onsets.fold(f64::NEG_INFINITY, f64::max),
            ]
        });
    }
}

/// Whether a column holds words in most of its rows.
pub(super) fn holds_words(side: &SideFile) -> bool {
    Seen::look(side).is_ok_and(|seen| seen.cells.iter().any(|(numbers, words, _)| words > numbers))
}

/// The first rows of a table and what its columns hold.
struct Seen {
    columns: Vec<String>,
    rows: Vec<Vec<String>>,
    count: usize,
    /// For each column: cells that are numbers, cells that are none, and the largest number.
    cells: Vec<(usize, usize, f64)>,
    /// Whether every number of the column is whole.
    whole: Vec<bool>,
}

impl Seen {
    fn look(side: &SideFile) -> Result<Seen> {
        let mut table = Table::open(side, Header::Maybe, WHAT)?;
        let columns = table.columns.clone();
        if columns.len() < 2 && columns.iter().all(String::is_empty) {
            return Err(broken("the table of events is empty"));
        }
        table
            .budget
            .draw(64 * columns.len() as u64, "its table of events")?;
        let mut seen = Seen {
            rows: Vec::new(),
            count: 0,
            cells: vec![(0, 0, 0.0); columns.len()],
            whole: vec![true; columns.len()],
            columns,
        };
        while let Some(row) = table.next()? {
            if seen.rows.len() < SHOWN {
                seen.rows.push(row.all());
            }
            if seen.count < GUESS_ROWS {
                seen.weigh(&row);
            }
            seen.count += 1;
        }
        Ok(seen)
    }

    fn weigh(&mut self, row: &Row<'_>) {
        for (k, (numbers, words, most)) in self.cells.iter_mut().enumerate() {
            if row.is_number(k) {
                *numbers += 1;
                let value = row.number(k, "").ok().flatten().unwrap_or(0.0);
                *most = value.max(*most);
                self.whole[k] &= value.fract() == 0.0;
            } else if row.text(k).is_some() {
                *words += 1;
            }
        }
    }

    /// The first column whose name begins with one of these words (the earlier word first) and whose cells are numbers, or need not be.
    fn named(&self, words: &[&str], of_numbers: bool) -> Option<usize> {
        let fits = |k: &usize| !of_numbers || (self.cells[*k].0 > 0 && self.cells[*k].1 == 0);
        words.iter().find_map(|word| {
            (0..self.columns.len())
                .filter(fits)
                .find(|k| self.columns[*k].to_lowercase().starts_with(word))
        })
    }

    /// By names first, then by what the columns hold.
    fn guess(&self, rate_hz: f64, span_s: f64) -> EventColumns {
        let numbers = |k: &usize| self.cells[*k].0 > 0 && self.cells[*k].1 == 0;
        let onset = self
            .named(
                &[
                    "onset", "time", "start", "latency", "begin", "t", "sample", "ms",
                ],
                true,
            )
            .or_else(|| (0..self.columns.len()).find(numbers))
            .unwrap_or(0);
        let duration = self.named(&["dur", "length"], true).filter(|k| *k != onset);
        let label = self
            .named(
                &[
                    "trial_type",
                    "label",
                    "type",
                    "event",
                    "name",
                    "condition",
                    "code",
                    "value",
                    "descr",
                    "stim",
                ],
                false,
            )
            .filter(|k| *k != onset && Some(*k) != duration)
            .or_else(|| (0..self.columns.len()).find(|k| self.cells[*k].1 > 0))
            .or_else(|| {
                (0..self.columns.len())
                    .find(|k| *k != onset && Some(*k) != duration && self.whole[*k])
            });
        let name = |k: usize| self.columns.get(k).cloned().unwrap_or_default();
        EventColumns {
            onset: name(onset),
            unit: self.unit(onset, rate_hz, span_s),
            label: label.filter(|k| *k != onset).map(name),
            duration: duration.map(name),
        }
    }

    /// By the column's name; else the first unit in which the latest onset lies within the recording.
    fn unit(&self, onset: usize, rate_hz: f64, span_s: f64) -> TimeUnit {
        let name = self
            .columns
            .get(onset)
            .map_or(String::new(), |c| c.to_lowercase());
        if name.contains("ms") || name.contains("milli") {
            return TimeUnit::Milliseconds;
        }
        if name.contains("sample") {
            return TimeUnit::Samples;
        }
        let (most, whole) = self
            .cells
            .get(onset)
            .map_or((0.0, false), |c| (c.2, self.whole[onset]));
        if most <= span_s {
            TimeUnit::Seconds
        } else if whole && most <= span_s * rate_hz && rate_hz <= 1000.0 {
            TimeUnit::Samples
        } else if most <= span_s * 1e3 {
            TimeUnit::Milliseconds
        } else {
            TimeUnit::Samples
        }
    }
}
