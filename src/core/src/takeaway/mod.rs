//! What the user takes away: weights, results, readings, report, archive.
//!
//! * [`recipe_json`], [`recipe_from_json`], [`recipe_check`]: the recipe file; [`link_encode`], [`link_decode`]: the same inside an address.
//! * [`weights_json`], [`weights_csv`], [`weights_npy`]: the filters; [`Weights`] reads them back and applies them to another recording.
//! * [`results_json`]: every number in full precision.
//! * [`facts`]: what is told of a recording.
//! * [`series_csv`], [`series_npy`]: time courses; [`Row`], [`Many`]: many recordings in one table, and what they say together.
//! * [`readings`]: the sentences beside the figures; [`methods`], [`references`]: the paragraph for a paper.
//! * [`report_html`]: one page to keep; [`archive`]: everything in one ZIP.
//!
//! Whatever a file said about a person or a recorder is not in a [`Sheet`](crate::sheet::Sheet), and so in none of these.
mod apply;
mod archive;
mod cells;
mod facts;
mod kinds;
mod link;
mod many;
mod methods;
mod readings;
mod recipe_file;
mod report;
mod results;
mod samples;
mod series;
mod strict;
mod summary;
mod weights;
mod words;

pub use crate::recipe::recipe_check;
pub use apply::Applied;
pub use archive::{archive, safe_name};
pub use facts::{Fact, facts, timelines};
pub use link::{RecipeLink, link_decode, link_encode};
pub use many::{Group, GroupEnd, Many, Portrait, Row};
pub use methods::{methods, references};
pub use readings::{Reading, Section, Span, Tone, readings};
pub use recipe_file::{recipe_from_json, recipe_json};
pub use report::report_html;
pub use results::results_json;
pub use samples::{recording_csv, recording_npy};
pub use series::{series_csv, series_npy};
pub use summary::{Leader, SummaryRow};
pub use weights::{Weights, weights_csv, weights_json, weights_npy};

use crate::error::{Kind, Problem, Result};
use serde::Serialize;

/// Pretty JSON with a line feed at its end. A number that is none becomes null.
fn to_json(value: &impl Serialize) -> Result<String> {
    let mut text = serde_json::to_string_pretty(value).map_err(written)?;
    text.push('\n');
    Ok(text)
}

/// An error of a writer that writes into memory.
fn written(cause: impl std::fmt::Display) -> Problem {
    Problem::new(
        Kind::Storage,
        format!("the file could not be put together: {cause}"),
        "try again with fewer components",
    )
}
