//! `results.json`: every number of the result in full double precision.
use crate::error::Result;
use crate::recipe::Recipe;
use crate::sheet::{
    Comparator, ComparatorKind, Component, CompressionCard, KeepCurve, Sheet, SideCard, TotalRatio,
    TypicalRatio,
};
use serde::Serialize;
use std::collections::BTreeMap;

#[derive(Serialize)]
struct Results<'a> {
    teasel_results: u32,
    made: Made,
    recipe: &'a Recipe,
    recording: RecordingPart<'a>,
    windows: Option<WindowsPart<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    rejection: &'a Option<crate::sheet::RejectionCard>,
    #[serde(skip_serializing_if = "Option::is_none")]
    quality: &'a Option<crate::sheet::QualityCard>,
    #[serde(skip_serializing_if = "Option::is_none")]
    dimensions: &'a Option<crate::sheet::DimensionsCard>,
    rank: Option<usize>,
    compression: Option<CompressionPart<'a>>,
    measure: crate::recipe::Measure,
    shrinkage: Option<f64>,
    components: Vec<ComponentPart<'a>>,
    weaker: Vec<ComponentPart<'a>>,
    compare: ComparePart<'a>,
    permutation: Option<PermutationPart<'a>>,
    warnings: &'a [String],
}

/// Which program wrote a file.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub(super) struct Made {
    program: &'static str,
    version: &'static str,
}

pub(super) const MADE: Made = Made {
    program: crate::PROGRAM,
    version: crate::VERSION,
};

#[derive(Serialize)]
struct RecordingPart<'a> {
    name: &'a str,
    format: &'a str,
    rate_hz: f64,
    channels: Vec<ChannelPart<'a>>,
    duration_s: f64,
    events: &'a BTreeMap<String, usize>,
    prepared: Option<PreparedPart<'a>>,
}

#[derive(Serialize)]
pub(super) struct ChannelPart<'a> {
    pub name: &'a str,
    pub unit: &'a str,
}

/// The channels that `filter` and `pattern` stand for; `filter_raw` stands for the recording's channels.
#[derive(Serialize)]
struct PreparedPart<'a> {
    rate_hz: f64,
    channels: &'a [String],
    ranks: &'a [crate::sheet::RankStep],
}

#[derive(Serialize)]
struct WindowsPart<'a> {
    paired: bool,
    signal: SidePart<'a>,
    reference: SidePart<'a>,
}

#[derive(Serialize)]
struct SidePart<'a> {
    used: usize,
    samples: usize,
    dropped: &'a BTreeMap<String, usize>,
}

#[derive(Serialize)]
struct CompressionPart<'a> {
    kept: usize,
    eigenvalues: &'a [f64],
    share: f64,
    guides: &'a BTreeMap<String, usize>,
    curve: Option<&'a KeepCurve>,
}

#[derive(Serialize)]
struct ComponentPart<'a> {
    typical: &'a TypicalRatio,
    total: &'a TotalRatio,
    p: Option<f64>,
    largest_at: &'a str,
    peak_hz: Option<f64>,
    stability: Option<f64>,
    places_changed: Option<usize>,
    filter: &'a [f64],
    filter_raw: &'a [f64],
    pattern: &'a [f64],
}

#[derive(Serialize, Default)]
struct ComparePart<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    first_pc: Option<PrincipalPart<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    best_pc: Option<PrincipalPart<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    best_channel: Option<BestChannelPart<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    mean_of_channels: Option<RatiosPart<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    random_direction: Option<RatiosPart<'a>>,
}

#[derive(Serialize)]
struct PrincipalPart<'a> {
    index: Option<usize>,
    share: Option<f64>,
    chosen_in_folds: Option<usize>,
    typical: &'a TypicalRatio,
    total: &'a TotalRatio,
}

#[derive(Serialize)]
struct RatiosPart<'a> {
    typical: &'a TypicalRatio,
    total: &'a TotalRatio,
}

#[derive(Serialize)]
struct BestChannelPart<'a> {
    name: Option<&'a str>,
    chosen_in_folds: Option<usize>,
    typical: &'a TypicalRatio,
    total: &'a TotalRatio,
}

#[derive(Serialize)]
struct PermutationPart<'a> {
    measure: crate::recipe::Measure,
    asked: usize,
    done: usize,
    exact: bool,
    null: &'a str,
}

/// Writes `results.json`. Parts that are not computed are null or empty; `filter` and `pattern` are in the order of
/// `recording.prepared.channels`, `filter_raw` in the order of `recording.channels`.
pub fn results_json(sheet: &Sheet) -> Result<String> {
    let recording = &sheet.recording;
    super::to_json(&Results {
        teasel_results: 1,
        made: MADE,
        recipe: &sheet.recipe,
        recording: RecordingPart {
            name: &recording.name,
            format: &recording.format,
            rate_hz: recording.rate_hz,
            channels: sheet
                .channels
                .iter()
                .map(|c| ChannelPart {
                    name: &c.name,
                    unit: &c.unit,
                })
                .collect(),
            duration_s: recording.duration_s,
            events: &recording.events,
            prepared: sheet.preparation.as_ref().map(|p| PreparedPart {
                rate_hz: p.rate_hz,
                channels: &p.channels,
                ranks: &p.ranks,
            }),
        },
        windows: sheet.windows.as_ref().map(|w| WindowsPart {
            paired: w.paired,
            signal: side(&w.signal),
            reference: side(&w.reference),
        }),
        rejection: &sheet.rejection,
        quality: &sheet.quality,
        dimensions: &sheet.dimensions,
        rank: sheet
            .compression
            .as_ref()
            .map(|c| c.rank)
            .or(sheet.preparation.as_ref().map(|p| p.rank)),
        compression: sheet
            .compression
            .as_ref()
            .map(|c| compression(c, sheet.curve.as_ref())),
        measure: sheet.recipe.measure,
        shrinkage: sheet.shrinkage,
        components: sheet.stronger.iter().map(component).collect(),
        weaker: sheet.weaker.iter().map(component).collect(),
        compare: compare(&sheet.compare),
        permutation: sheet.permutation.as_ref().map(|p| PermutationPart {
            measure: p.measure,
            asked: p.asked,
            done: p.done,
            exact: p.exact,
            null: &p.null,
        }),
        warnings: &sheet.warnings,
    })
}

fn side(side: &SideCard) -> SidePart<'_> {
    SidePart {
        used: side.used,
        samples: side.samples,
        dropped: &side.dropped,
    }
}

fn compression<'a>(card: &'a CompressionCard, curve: Option<&'a KeepCurve>) -> CompressionPart<'a> {
    CompressionPart {
        kept: card.kept,
        eigenvalues: &card.eigenvalues,
        share: card.share,
        guides: &card.guides,
        curve,
    }
}

fn component(component: &Component) -> ComponentPart<'_> {
    ComponentPart {
        typical: &component.typical,
        total: &component.total,
        p: component.p,
        largest_at: &component.largest_at,
        peak_hz: component.peak_hz,
        stability: component.stability,
        places_changed: component.places_changed,
        filter: &component.filter,
        filter_raw: &component.filter_raw,
        pattern: &component.pattern,
    }
}

fn compare(comparators: &[Comparator]) -> ComparePart<'_> {
    let of = |kind| comparators.iter().find(|c| c.kind == kind);
    let principal = |c: &'_ Comparator, index: Option<usize>| -> Option<usize> {
        c.chosen.as_deref().and_then(|t| t.parse().ok()).or(index)
    };
    ComparePart {
        first_pc: of(ComparatorKind::FirstPc).map(|c| PrincipalPart {
            index: principal(c, Some(1)),
            share: c.share,
            chosen_in_folds: c.chosen_in_folds,
            typical: &c.typical,
            total: &c.total,
        }),
        best_pc: of(ComparatorKind::BestPc).map(|c| PrincipalPart {
            index: principal(c, None),
            share: c.share,
            chosen_in_folds: c.chosen_in_folds,
            typical: &c.typical,
            total: &c.total,
        }),
        best_channel: of(ComparatorKind::BestChannel).map(|c| BestChannelPart {
            name: c.chosen.as_deref(),
            chosen_in_folds: c.chosen_in_folds,
            typical: &c.typical,
            total: &c.total,
        }),
        mean_of_channels: of(ComparatorKind::MeanOfChannels).map(plain),
        random_direction: of(ComparatorKind::RandomDirection).map(plain),
    }
}

fn plain(c: &Comparator) -> RatiosPart<'_> {
    RatiosPart {
        typical: &c.typical,
        total: &c.total,
    }
}
