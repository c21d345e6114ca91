//! Every file of a result but its figures, under the names it has everywhere.
use super::{
    bibtex, methods_text, recipe_json, report_html, results_json, series_csv, series_edf,
    series_npy, trials_csv, weights_csv, weights_json, weights_npy,
};
use crate::analysis::Analysis;
use crate::error::Result;

/// Name and bytes of every file; `drawings` are name, caption and SVG of the figures, for the report. `with_tables`: also the
/// time courses as a table, which is the largest of them.
///
/// # Errors
/// Those of the writers.
pub fn files(
    analysis: &Analysis,
    drawings: &[(String, String, String)],
    with_tables: bool,
) -> Result<Vec<(String, Vec<u8>)>> {
    let sheet = analysis.sheet();
    let mut files: Vec<(String, Vec<u8>)> = vec![
        ("recipe.json".into(), recipe_json(&sheet.recipe)?.into()),
        ("results.json".into(), results_json(sheet)?.into()),
        ("report.html".into(), report_html(sheet, drawings).into()),
        ("methods.txt".into(), methods_text(sheet).into()),
        ("references.bib".into(), bibtex(sheet).into()),
    ];
    if sheet.stronger.is_empty() && sheet.weaker.is_empty() {
        return Ok(files);
    }
    files.push(("weights.json".into(), weights_json(sheet)?.into()));
    files.push(("weights.csv".into(), weights_csv(sheet)?.into()));
    for (name, bytes) in weights_npy(sheet)? {
        files.push((name.into(), bytes));
    }
    files.push(("trials.csv".into(), trials_csv(sheet)?.into()));
    if let Some(series) = analysis.series() {
        files.push(("series.npy".into(), series_npy(&series)?));
        // Gaps and rates that no record length expresses have no EDF+; the array holds them all the same.
        if let Ok(bytes) = series_edf(&series, analysis.recording()) {
            files.push(("series.edf".into(), bytes));
        }
        if with_tables {
            files.push(("series.csv".into(), series_csv(&series)?.into()));
        }
    }
    Ok(files)
}
