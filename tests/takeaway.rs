//! Recipes, links, weights, results, readings, reports and archives.
#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    reason = "a check that cannot go on fails"
)]
#[path = "takeaway/carried.rs"]
mod carried;
#[path = "takeaway/cleaned.rs"]
mod cleaned;
#[path = "takeaway/files.rs"]
mod files;
#[path = "takeaway/pictures.rs"]
mod pictures;
#[path = "takeaway/recipes.rs"]
mod recipes;
#[path = "takeaway/reports.rs"]
mod reports;
#[path = "takeaway/sample.rs"]
mod sample;
#[path = "takeaway/saved.rs"]
mod saved;
#[path = "takeaway/sentences.rs"]
mod sentences;
