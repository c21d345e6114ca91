//! `weights.json` and `weights.csv`: filters for the raw channels, to carry to the next recording.
//!
//! # Order
//! Filters and patterns: stronger components first, then weaker ones; channels as in the recording, those that no filter
//! and no pattern uses left out.
//!
//! # Units
//! A filter takes samples in the channels' units to the component, whose variance is 1 in reference windows; a pattern is
//! in channel units per unit of component, and null at a channel that is used but was not analysed itself.
use super::cells::{Cell, table};
use super::results::{ChannelPart, MADE, Made};
use super::series::matrix_npy;
use super::strict::{self, Shape};
use crate::error::{Kind, Problem, Result};
use crate::recipe::{Channels, Filter, Measure, Movie};
use crate::sheet::{Component, Sheet};
use serde::{Deserialize, Serialize};

/// What `weights.json` holds.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct Weights {
    /// Version of the schema: 1.
    pub teasel_weights: u32,
    /// Channels, in the order of the rows' entries.
    pub channels: Vec<WeightChannel>,
    /// Sampling rate of the recording they were fitted to.
    pub rate_hz: f64,
    /// Preparation, as in the recipe; its channel part is already contained in `filters`.
    pub preparation: Preparation,
    /// `stronger 1`, …, `weaker 1`, ….
    #[serde(default)]
    pub names: Vec<String>,
    /// `components × channels`, for the raw channels.
    pub filters: Vec<Vec<f64>>,
    /// `components × channels`.
    pub patterns: Vec<Vec<Option<f64>>>,
    /// Fitted ratio of each component in `measure`.
    pub ratios: Vec<f64>,
    /// Held-out ratio of each component in `measure`, where there is one.
    #[serde(default)]
    pub held_out: Vec<Option<f64>>,
    /// The measure of `ratios`.
    #[serde(default)]
    pub measure: Measure,
    /// Program and version that wrote it.
    pub made: MadeBy,
}

/// A channel of [`Weights`].
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct WeightChannel {
    /// Label.
    pub name: String,
    /// Unit.
    pub unit: String,
}

/// The preparation part of [`Weights`].
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct Preparation {
    /// As in the recipe.
    #[serde(default)]
    pub channels: Channels,
    /// As in the recipe.
    #[serde(default)]
    pub filter: Filter,
    /// As in the recipe: how a movie's pixels became the channels of the filters.
    #[serde(default)]
    pub movie: Movie,
}

/// Who wrote [`Weights`].
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct MadeBy {
    /// Program.
    pub program: String,
    /// Version.
    pub version: String,
}

const NUMBERS: Shape = Shape::List(&Shape::Number);

const WEIGHTS: Shape = Shape::Object(&[
    ("teasel_weights", true, Shape::Whole),
    (
        "channels",
        true,
        Shape::List(&Shape::Object(&[
            ("name", true, Shape::Text),
            ("unit", true, Shape::Text),
        ])),
    ),
    ("rate_hz", true, Shape::Number),
    (
        "preparation",
        true,
        Shape::Object(&[
            ("channels", false, super::recipe_file::CHANNELS),
            ("filter", false, super::recipe_file::FILTER),
            ("movie", false, super::recipe_file::MOVIE),
        ]),
    ),
    ("names", false, Shape::List(&Shape::Text)),
    ("filters", true, Shape::List(&NUMBERS)),
    (
        "patterns",
        true,
        Shape::List(&Shape::List(&Shape::Maybe(&Shape::Number))),
    ),
    ("ratios", true, NUMBERS),
    (
        "held_out",
        false,
        Shape::List(&Shape::Maybe(&Shape::Number)),
    ),
    ("measure", false, Shape::Word(&["typical", "total"])),
    (
        "made",
        true,
        Shape::Object(&[
            ("program", true, Shape::Text),
            ("version", true, Shape::Text),
        ]),
    ),
]);

impl Weights {
    /// Reads `weights.json`, as strictly as a recipe: unknown keys, wrong types and rows of unequal length are refused.
    pub fn from_json(text: &str) -> Result<Weights> {
        strict::check(text, &WEIGHTS, "the weights file", strict::WEIGHTS_BYTES)?;
        let weights: Weights =
            serde_json::from_str(text).map_err(|e| broken("").expected_found("weights", e))?;
        weights.check().map_err(|mut problem| {
            problem.place = problem.place.map(|path| strict::place_of(text, &path));
            problem
        })?;
        Ok(weights)
    }

    fn check(&self) -> Result<()> {
        if self.teasel_weights != 1 {
            return Err(Problem::new(
                Kind::Recipe,
                "these weights are of another version of the schema",
                "use the version of Teasel that wrote them",
            )
            .at("teasel_weights")
            .expected_found(1, self.teasel_weights));
        }
        if self.rate_hz <= 0.0 {
            return Err(broken("rate_hz").expected_found("a number of Hz above 0", self.rate_hz));
        }
        let components = self.filters.len();
        if components == 0 {
            return Err(broken("filters").expected_found("at least one filter", "none"));
        }
        let lengths = [
            ("patterns", self.patterns.len(), true),
            ("ratios", self.ratios.len(), true),
            ("names", self.names.len(), !self.names.is_empty()),
            ("held_out", self.held_out.len(), !self.held_out.is_empty()),
        ];
        for (key, length, needed) in lengths {
            if needed && length != components {
                return Err(broken(key).expected_found(
                    format!("one entry for each of {components} filters"),
                    length,
                ));
            }
        }
        let rows = self
            .filters
            .iter()
            .map(|r| ("filters", r.len()))
            .chain(self.patterns.iter().map(|r| ("patterns", r.len())));
        for (key, length) in rows {
            if length != self.channels.len() {
                return Err(broken(key).expected_found(
                    format!("one number for each of {} channels", self.channels.len()),
                    length,
                ));
            }
        }
        Ok(())
    }

    /// Names of the components, made up where the file has none.
    pub fn component_names(&self) -> Vec<String> {
        if self.names.is_empty() {
            (1..=self.filters.len())
                .map(|n| format!("component {n}"))
                .collect()
        } else {
            self.names.clone()
        }
    }
}

fn broken(path: &str) -> Problem {
    Problem::new(
        Kind::Recipe,
        "the weights file breaks its rules",
        "take it from Teasel again",
    )
    .at(path)
}

#[derive(Serialize)]
struct Written<'a> {
    teasel_weights: u32,
    channels: Vec<ChannelPart<'a>>,
    rate_hz: f64,
    preparation: PreparationWritten<'a>,
    names: Vec<String>,
    filters: Vec<Vec<f64>>,
    patterns: Vec<Vec<Option<f64>>>,
    ratios: Vec<f64>,
    held_out: Vec<Option<f64>>,
    measure: Measure,
    made: Made,
}

#[derive(Serialize)]
struct PreparationWritten<'a> {
    channels: &'a Channels,
    filter: &'a Filter,
    #[serde(skip_serializing_if = "plain")]
    movie: &'a Movie,
}

fn plain(movie: &&Movie) -> bool {
    movie.is_plain()
}

/// Components in the take-away's order with their names.
pub(super) fn ordered(sheet: &Sheet) -> Vec<(String, &Component)> {
    let stronger = sheet.stronger.iter().enumerate();
    let weaker = sheet.weaker.iter().enumerate();
    stronger
        .map(|(k, c)| (format!("stronger {}", k + 1), c))
        .chain(weaker.map(|(k, c)| (format!("weaker {}", k + 1), c)))
        .collect()
}

/// Rows of one channel each: its name, unit, filter entries and pattern entries.
struct Row<'a> {
    name: &'a str,
    unit: &'a str,
    filters: Vec<f64>,
    patterns: Vec<Option<f64>>,
}

/// Where `name` stands among `names`; where names repeat, the k-th of `before` and itself is the k-th among `names`.
pub(super) fn same<'a>(
    names: impl Iterator<Item = &'a str>,
    before: impl Iterator<Item = &'a str>,
    name: &str,
) -> Option<usize> {
    let earlier = before.filter(|n| *n == name).count();
    names
        .enumerate()
        .filter(|(_, n)| *n == name)
        .nth(earlier)
        .map(|(at, _)| at)
}

fn rows(sheet: &Sheet) -> Result<Vec<Row<'_>>> {
    let components = ordered(sheet);
    if components.is_empty() {
        return Err(Problem::new(
            Kind::Contrast,
            "there are no filters yet",
            "wait until the components are there",
        ));
    }
    let prepared: &[String] = sheet
        .preparation
        .as_ref()
        .map_or(&[], |p| p.channels.as_slice());
    let rows = sheet.channels.iter().enumerate().map(|(at, channel)| {
        let before = &sheet.channels[..at];
        let pattern_at = same(
            prepared.iter().map(String::as_str),
            before.iter().map(|c| c.name.as_str()),
            &channel.name,
        );
        Row {
            name: &channel.name,
            unit: &channel.unit,
            filters: components
                .iter()
                .map(|(_, c)| c.filter_raw.get(at).copied().unwrap_or(0.0))
                .collect(),
            patterns: components
                .iter()
                .map(|(_, c)| pattern_at.and_then(|k| c.pattern.get(k).copied()))
                .collect(),
        }
    });
    Ok(rows
        .filter(|r| r.patterns.iter().any(Option::is_some) || r.filters.iter().any(|w| *w != 0.0))
        .collect())
}

/// Writes `weights.json`; an error where there are no components yet.
pub fn weights_json(sheet: &Sheet) -> Result<String> {
    let rows = rows(sheet)?;
    let components = ordered(sheet);
    let measure = sheet.recipe.measure;
    let column = |k: usize| rows.iter().map(move |r| r.filters[k]).collect();
    let pattern = |k: usize| rows.iter().map(move |r| r.patterns[k]).collect();
    super::to_json(&Written {
        teasel_weights: 1,
        channels: rows
            .iter()
            .map(|r| ChannelPart {
                name: r.name,
                unit: r.unit,
            })
            .collect(),
        rate_hz: sheet.recording.rate_hz,
        preparation: PreparationWritten {
            channels: &sheet.recipe.channels,
            filter: &sheet.recipe.filter,
            movie: &sheet.recipe.movie,
        },
        names: components.iter().map(|(name, _)| name.clone()).collect(),
        filters: (0..components.len()).map(column).collect(),
        patterns: (0..components.len()).map(pattern).collect(),
        ratios: components.iter().map(|(_, c)| fitted(c, measure)).collect(),
        held_out: components
            .iter()
            .map(|(_, c)| held_out(c, measure))
            .collect(),
        measure,
        made: MADE,
    })
}

/// A component's fitted ratio in a measure.
pub(super) fn fitted(component: &Component, measure: Measure) -> f64 {
    match measure {
        Measure::Typical => component.typical.fitted,
        Measure::Total => component.total.fitted,
    }
}

/// A component's held-out ratio in a measure.
pub(super) fn held_out(component: &Component, measure: Measure) -> Option<f64> {
    match measure {
        Measure::Typical => component.typical.held_out,
        Measure::Total => component.total.held_out,
    }
}

/// Writes `weights.csv`: `channel,unit,filter_1,…,pattern_1,…`, one channel a row, in the order of `weights.json`.
pub fn weights_csv(sheet: &Sheet) -> Result<String> {
    let rows = rows(sheet)?;
    let count = ordered(sheet).len();
    let names: Vec<String> = (1..=count)
        .map(|k| format!("filter_{k}"))
        .chain((1..=count).map(|k| format!("pattern_{k}")))
        .collect();
    let header = ["channel", "unit"]
        .into_iter()
        .chain(names.iter().map(String::as_str))
        .map(Cell::Text)
        .collect();
    let body = rows.iter().map(|r| {
        [Cell::Text(r.name), Cell::Text(r.unit)]
            .into_iter()
            .chain(r.filters.iter().map(|w| Cell::Number(Some(*w))))
            .chain(r.patterns.iter().map(|a| Cell::Number(*a)))
            .collect()
    });
    table(std::iter::once(header).chain(body))
}

/// The filters and the patterns as NumPy array files, `components × channels`, channels as in `weights.json`; a pattern
/// entry that is null there is not a number here.
pub fn weights_npy(sheet: &Sheet) -> Result<[(&'static str, Vec<u8>); 2]> {
    let rows = rows(sheet)?;
    let count = ordered(sheet).len();
    let filters: Vec<Vec<f64>> = (0..count)
        .map(|k| rows.iter().map(|r| r.filters[k]).collect())
        .collect();
    let patterns: Vec<Vec<f64>> = (0..count)
        .map(|k| {
            rows.iter()
                .map(|r| r.patterns[k].unwrap_or(f64::NAN))
                .collect()
        })
        .collect();
    Ok([
        ("filters.npy", matrix_npy(&filters)?),
        ("patterns.npy", matrix_npy(&patterns)?),
    ])
}
