//! The files that are taken away.
use crate::session::NamedBytes;
use serde::Serialize;
use teasel_core::analysis::{Analysis, Series};
use teasel_core::error::{Kind, Problem, Result};
use teasel_core::recording::Recording;
use teasel_core::sheet::Sheet;
use teasel_core::takeaway::{
    Carried, CarriedRow, Cleaned, Shares, archive, bibtex, methods_text, recipe_json, report_html,
    results_json, series_csv, series_edf, series_npy, trials_csv, weights_csv, weights_json,
};
use teasel_figures::{Figure, traces};

/// One file, by the name of its button.
pub fn file(analysis: &Analysis, kind: &str, extras: Vec<NamedBytes>) -> Result<Vec<u8>> {
    let sheet = analysis.sheet();
    match kind {
        "weights-json" => weights_json(sheet).map(String::into_bytes),
        "weights-csv" => weights_csv(sheet).map(String::into_bytes),
        "results-json" => results_json(sheet).map(String::into_bytes),
        "recipe" => recipe_json(&sheet.recipe).map(String::into_bytes),
        "report" => Ok(report_html(sheet, &figures(sheet)).into_bytes()),
        "everything" => everything(analysis, extras),
        "methods" => Ok(methods_text(sheet).into_bytes()),
        "bibtex" => Ok(bibtex(sheet).into_bytes()),
        "trials-csv" => trials_csv(sheet).map(String::into_bytes),
        "series-csv" => series_csv(&series(analysis)?).map(String::into_bytes),
        "series-npy" => series_npy(&series(analysis)?),
        "series-edf" => series_edf(&series(analysis)?, analysis.recording()),
        other => Err(Problem::new(
            Kind::Unknown,
            format!("there is no take-away called {other}"),
            "Choose one of the take-aways on the page.",
        )),
    }
}

fn everything(analysis: &Analysis, extras: Vec<NamedBytes>) -> Result<Vec<u8>> {
    let figures = figures(analysis.sheet());
    let mut files = teasel_core::takeaway::files(analysis, &figures, false)?;
    let drawn = figures
        .into_iter()
        .filter(|(name, _, _)| teasel_figures::stands_alone(name));
    files.extend(drawn.map(|(name, _, svg)| (format!("figures/{name}.svg"), svg.into())));
    files.extend(extras.into_iter().map(|extra| (extra.name, extra.bytes)));
    archive(&files)
}

fn series(analysis: &Analysis) -> Result<Series> {
    analysis.series().ok_or_else(|| {
        Problem::new(
            Kind::Contrast,
            "there are no components yet",
            "Wait until they are there.",
        )
    })
}

/// Every figure that can be drawn now: name, caption, SVG.
fn figures(sheet: &Sheet) -> Vec<(String, String, String)> {
    let look = teasel_figures::Look::default();
    teasel_figures::names(sheet)
        .into_iter()
        .filter_map(|(name, caption)| {
            let figure = teasel_figures::from_sheet(sheet, &name)?;
            let width = teasel_figures::report_width(&name);
            let height = teasel_figures::height(&figure, width);
            let svg = teasel_figures::svg(&figure, width, height, &look);
            Some((name, caption, svg))
        })
        .collect()
}

/// What cleaning would do, as the page shows it.
#[derive(Serialize)]
pub struct Look<'a> {
    note: &'a str,
    others: f64,
    shares: &'a Shares,
    before: Figure,
    after: Figure,
}

impl<'a> Look<'a> {
    /// Before and after over the channels whose variance changes most.
    pub fn of(analysis: &Analysis, cleaned: &'a Cleaned, from_s: f64, seconds: f64) -> Self {
        let shares = &cleaned.shares;
        let mut order: Vec<usize> = (0..shares.removed.len()).collect();
        order.sort_by(|a, b| {
            shares.removed[*b]
                .abs()
                .total_cmp(&shares.removed[*a].abs())
        });
        order.truncate(6);
        order.sort_unstable();
        let before: Vec<Vec<f32>> = (order.iter())
            .filter_map(|c| analysis.channel(*c).map(<[f32]>::to_vec))
            .collect();
        let after = (order.iter())
            .filter_map(|c| cleaned.recording.samples.get(*c).cloned())
            .collect();
        let few = |samples: Vec<Vec<f32>>| Recording {
            channels: order
                .iter()
                .map(|c| cleaned.recording.channels[*c].clone())
                .collect(),
            samples,
            rate_hz: cleaned.recording.rate_hz,
            stretches: cleaned.recording.stretches.clone(),
            events: cleaned.recording.events.clone(),
            ..Recording::default()
        };
        let rows: Vec<usize> = (0..order.len()).collect();
        let drawn = |samples| traces(&few(samples), from_s, seconds, &rows);
        Look {
            note: &cleaned.note,
            others: cleaned.others,
            shares,
            before: drawn(before),
            after: drawn(after),
        }
    }
}

/// Saved filters on another recording, as the page shows them.
#[derive(Serialize)]
pub struct Told<'a> {
    rows: &'a [CarriedRow],
    notes: &'a [String],
    csv: String,
    figures: Vec<(String, String, Figure)>,
}

impl<'a> Told<'a> {
    /// Rows, notes, time courses as a table, spectra and single trials of the first two components.
    pub fn of(carried: &'a Carried) -> Result<Self> {
        let sheet = &carried.sheet;
        let names = teasel_figures::names(sheet)
            .into_iter()
            .filter(|(name, _)| {
                let first = name.starts_with("stronger-1-") || name.starts_with("weaker-1-");
                let shown = ["-spectrum", "-course", "-trials", "-powers"];
                first && shown.iter().any(|part| name.ends_with(part))
            });
        let drawn = names.filter_map(|(name, caption)| {
            let figure = teasel_figures::from_sheet(sheet, &name)?;
            Some((name, caption, figure))
        });
        Ok(Told {
            rows: &carried.rows,
            notes: &carried.applied.notes,
            csv: series_csv(&carried.applied.series)?,
            figures: drawn.collect(),
        })
    }
}
