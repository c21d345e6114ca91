//! The files that are taken away.
use crate::session::NamedBytes;
use teasel_core::analysis::Analysis;
use teasel_core::error::{Kind, Problem, Result};
use teasel_core::sheet::Sheet;
use teasel_core::takeaway::{
    archive, methods, recipe_json, references, report_html, results_json, weights_csv, weights_json,
};
use teasel_figures::Look;

/// One file, by the name of its button.
pub fn file(analysis: &Analysis, kind: &str, extras: Vec<NamedBytes>) -> Result<Vec<u8>> {
    let sheet = analysis.sheet();
    match kind {
        "weights-json" => weights_json(sheet).map(String::into_bytes),
        "weights-csv" => weights_csv(sheet).map(String::into_bytes),
        "results-json" => results_json(sheet).map(String::into_bytes),
        "recipe" => recipe_json(&sheet.recipe).map(String::into_bytes),
        "report" => Ok(report_html(sheet, &figures(sheet)).into_bytes()),
        "everything" => everything(sheet, extras),
        "methods" => Ok(paragraph(sheet).into_bytes()),
        other => Err(Problem::new(
            Kind::Unknown,
            format!("there is no take-away called {other}"),
            "Choose one of the take-aways on the page.",
        )),
    }
}

/// The methods paragraph with its references below, as text.
fn paragraph(sheet: &Sheet) -> String {
    let cited = references(sheet);
    if cited.is_empty() {
        return methods(sheet);
    }
    format!("{}\n\n{}", methods(sheet), cited.join("\n"))
}

fn everything(sheet: &Sheet, extras: Vec<NamedBytes>) -> Result<Vec<u8>> {
    let figures = figures(sheet);
    let mut files = vec![
        ("recipe.json".into(), recipe_json(&sheet.recipe)?.into()),
        ("results.json".into(), results_json(sheet)?.into()),
        ("weights.json".into(), weights_json(sheet)?.into()),
        ("weights.csv".into(), weights_csv(sheet)?.into()),
        ("report.html".into(), report_html(sheet, &figures).into()),
    ];
    let drawn = figures
        .into_iter()
        .filter(|(name, _, _)| teasel_figures::stands_alone(name));
    files.extend(drawn.map(|(name, _, svg)| (format!("figures/{name}.svg"), svg.into())));
    files.extend(extras.into_iter().map(|extra| (extra.name, extra.bytes)));
    archive(&files)
}

/// Every figure that can be drawn now: name, caption, SVG.
fn figures(sheet: &Sheet) -> Vec<(String, String, String)> {
    let look = Look::default();
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
