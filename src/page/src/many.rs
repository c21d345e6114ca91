//! The table of many recordings and what they say together.
use crate::convert::{Outcome, from_js, thrown, to_js};
use serde::Serialize;
use teasel_core::error::Problem;
use teasel_core::takeaway::{Many, Row, SummaryRow, folder_names as names};
use teasel_figures::{Figure, group_figures};
use wasm_bindgen::JsValue;
use wasm_bindgen::prelude::wasm_bindgen;

/// Everything that the page shows of a set.
#[derive(Serialize)]
struct Told<'a> {
    recordings: &'a [SummaryRow],
    said: Vec<String>,
    but: Vec<String>,
    csv: String,
    json: String,
    group_csv: String,
    figures: Vec<Drawn>,
}

#[derive(Serialize)]
struct Drawn {
    name: String,
    caption: String,
    figure: Figure,
}

/// A name for each recording's folder, from file names.
#[wasm_bindgen(js_name = folderNames)]
#[must_use]
pub fn folder_names(files: Vec<String>) -> Vec<String> {
    names(&files)
}

/// The text of `row.json` for a recording that could not be analysed.
#[wasm_bindgen(js_name = failedRow)]
pub fn failed_row(recording: &str, folder: &str, problem: JsValue) -> Outcome<String> {
    let problem: Problem = from_js(problem)?;
    let problem = problem.in_file(recording);
    Row::failed(recording, folder, &problem)
        .json()
        .map_err(thrown)
}

/// The table, the group's test and figures, from the texts of `row.json`.
#[wasm_bindgen]
pub fn many(rows: Vec<String>) -> Outcome<JsValue> {
    let rows: Result<Vec<Row>, Problem> = rows.iter().map(|text| Row::from_json(text)).collect();
    let many = Many::of(rows.map_err(thrown)?);
    let (said, but) = many.reading();
    let group = many.group.iter().flat_map(group_figures);
    to_js(&Told {
        recordings: &many.recordings,
        said,
        but,
        csv: many.csv().map_err(thrown)?,
        json: many.json().map_err(thrown)?,
        group_csv: many.group_csv().map_err(thrown)?,
        figures: group
            .map(|(name, caption, figure)| Drawn {
                name,
                caption,
                figure,
            })
            .collect(),
    })
}
