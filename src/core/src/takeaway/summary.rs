//! Many recordings in one table: a row each, what leads at either end, and what went wrong.
use super::cells::{Cell, table};
use super::weights::fitted;
use crate::error::{Problem, Result};
use crate::recipe::Measure;
use crate::sheet::{Component, Sheet};
use serde::{Deserialize, Serialize};

/// One recording's row.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct SummaryRow {
    /// File name of the recording.
    pub recording: String,
    /// Folder that holds its files.
    pub folder: String,
    /// What went wrong, in one line without advice; the rest is empty then.
    pub problem: Option<String>,
    /// Channels analysed.
    pub channels: Option<usize>,
    /// Sampling rate after the preparation.
    pub rate_hz: Option<f64>,
    /// Signal windows used.
    pub signal_windows: Option<usize>,
    /// Reference windows used.
    pub reference_windows: Option<usize>,
    /// C.
    pub kept: Option<usize>,
    /// Measure that orders and tests.
    pub measure: Option<Measure>,
    /// Components at p ≤ 0.05.
    pub stronger_passing: Option<usize>,
    /// Components at p ≤ 0.05.
    pub weaker_passing: Option<usize>,
    /// The first stronger component.
    pub stronger_1: Option<Leader>,
    /// The first weaker component.
    pub weaker_1: Option<Leader>,
    /// What a careful reader should know of it, each a sentence.
    pub warnings: Vec<String>,
}

/// The first component of an end.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Leader {
    /// Fitted ratio in the measure.
    pub fitted: Option<f64>,
    /// Held-out typical ratio.
    pub typical_held_out: Option<f64>,
    /// Its 95 % interval.
    pub typical_low: Option<f64>,
    /// See `typical_low`.
    pub typical_high: Option<f64>,
    /// Held-out total ratio.
    pub total_held_out: Option<f64>,
    /// Family-wise p.
    pub p: Option<f64>,
    /// Frequency at which its spectra differ most.
    pub peak_hz: Option<f64>,
    /// Channel where its pattern is largest.
    pub largest_at: String,
    /// |cosine| between its pattern and the mean pattern of the other recordings, over the channels that all share.
    pub likeness: Option<f64>,
}

impl SummaryRow {
    /// The row of a recording that was analysed.
    pub fn of(sheet: &Sheet, folder: &str) -> Self {
        let passing = |components: &[Component]| {
            let tested = components.first()?.p.is_some();
            tested.then(|| {
                components
                    .iter()
                    .filter(|c| super::readings::passes(c))
                    .count()
            })
        };
        let leader = |components: &[Component]| {
            components.first().map(|c| Leader {
                fitted: Some(fitted(c, sheet.recipe.measure)).filter(|x| x.is_finite()),
                typical_held_out: c.typical.held_out,
                typical_low: c.typical.interval.map(|i| i[0]),
                typical_high: c.typical.interval.map(|i| i[1]),
                total_held_out: c.total.held_out,
                p: c.p,
                peak_hz: c.peak_hz,
                largest_at: c.largest_at.clone(),
                likeness: None,
            })
        };
        SummaryRow {
            recording: sheet.recording.name.clone(),
            folder: folder.into(),
            problem: None,
            channels: sheet.preparation.as_ref().map(|p| p.channels.len()),
            rate_hz: sheet.preparation.as_ref().map(|p| p.rate_hz),
            signal_windows: sheet.windows.as_ref().map(|w| w.signal.used),
            reference_windows: sheet.windows.as_ref().map(|w| w.reference.used),
            kept: sheet.compression.as_ref().map(|c| c.kept),
            measure: Some(sheet.recipe.measure),
            stronger_passing: passing(&sheet.stronger),
            weaker_passing: passing(&sheet.weaker),
            stronger_1: leader(&sheet.stronger),
            weaker_1: leader(&sheet.weaker),
            warnings: sheet.warnings.clone(),
        }
    }

    /// The row of a recording that could not be analysed.
    pub fn failed(recording: &str, folder: &str, problem: &Problem) -> Self {
        // What to do now depends on where one stands, page or terminal; what is wrong does not.
        let told = Problem {
            advice: String::new(),
            ..problem.clone()
        };
        let told = told.to_string().trim_end_matches("; ").to_owned();
        SummaryRow {
            recording: recording.into(),
            folder: folder.into(),
            problem: Some(told),
            ..SummaryRow::default()
        }
    }
}

const LEADER: [&str; 9] = [
    "fitted",
    "typical_held_out",
    "typical_low",
    "typical_high",
    "total_held_out",
    "p",
    "peak_hz",
    "largest_at",
    "likeness",
];

/// `table.csv`: one row a recording.
pub(super) fn summary_csv(rows: &[SummaryRow]) -> Result<String> {
    let leaders: Vec<String> = ["stronger_1", "weaker_1"]
        .iter()
        .flat_map(|end| LEADER.iter().map(move |part| format!("{end}_{part}")))
        .collect();
    let header = [
        "recording",
        "folder",
        "problem",
        "channels",
        "rate_hz",
        "signal_windows",
        "reference_windows",
        "kept",
        "measure",
        "stronger_passing",
        "weaker_passing",
    ]
    .into_iter()
    .chain(leaders.iter().map(String::as_str))
    .chain(["warnings"])
    .map(Cell::Text)
    .collect();
    table(std::iter::once(header).chain(rows.iter().map(cells)))
}

fn cells(row: &SummaryRow) -> Vec<Cell<'_>> {
    let whole = |n: Option<usize>| Cell::Number(n.map(|n| n as f64));
    let mut cells = vec![
        Cell::Text(&row.recording),
        Cell::Text(&row.folder),
        Cell::Text(row.problem.as_deref().unwrap_or("")),
        whole(row.channels),
        Cell::Number(row.rate_hz),
        whole(row.signal_windows),
        whole(row.reference_windows),
        whole(row.kept),
        Cell::Text(match row.measure {
            Some(Measure::Typical) => "typical",
            Some(Measure::Total) => "total",
            None => "",
        }),
        whole(row.stronger_passing),
        whole(row.weaker_passing),
    ];
    for leader in [&row.stronger_1, &row.weaker_1] {
        let number = |f: fn(&Leader) -> Option<f64>| Cell::Number(leader.as_ref().and_then(f));
        cells.extend([
            number(|l| l.fitted),
            number(|l| l.typical_held_out),
            number(|l| l.typical_low),
            number(|l| l.typical_high),
            number(|l| l.total_held_out),
            number(|l| l.p),
            number(|l| l.peak_hz),
            Cell::Text(leader.as_ref().map_or("", |l| l.largest_at.as_str())),
            number(|l| l.likeness),
        ]);
    }
    cells.push(Cell::Owned(row.warnings.join(" | ")));
    cells
}
