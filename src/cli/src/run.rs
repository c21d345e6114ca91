//! `teasel run`: everything a recipe asks of each recording.
use crate::say::{self, Meter};
use crate::{Given, figures, folder, gather, source};
use std::path::Path;
use teasel_core::analysis::Analysis;
use teasel_core::error::Result;
use teasel_core::recipe::Recipe;
use teasel_core::recording::Opened;
use teasel_core::takeaway::{self as take, Row};

/// Runs all recordings; false where the recipe or a recording was bad.
pub fn run(recipe: &Path, given: &Given, out: &Path, seed: Option<u64>) -> bool {
    let read = source::text(recipe).and_then(|text| {
        take::recipe_from_json(&text).map_err(|p| p.in_file(source::file_name(recipe)))
    });
    let mut recipe = match read {
        Ok(recipe) => recipe,
        Err(problem) => {
            say::problem(&problem);
            return false;
        }
    };
    if let Some(seed) = seed {
        recipe.evidence.seed = seed;
    }
    recipe.recording = given.told.given().or(recipe.recording);
    let mut rows = Vec::new();
    let mut fine = true;
    let recordings = given.each();
    for (path, name) in recordings.iter().zip(folder::names(&recordings)) {
        let shown = name.display().to_string();
        match one(&recipe, path, given, &out.join(&name), &shown) {
            Ok(row) => rows.push(row),
            Err(problem) => {
                let problem = problem.in_file(source::file_name(path));
                say::problem(&problem);
                fine = false;
                let row = Row::failed(&source::file_name(path), &shown, &problem);
                match write_failed(&row, &out.join(&name)) {
                    Ok(row) => rows.push(row),
                    Err(problem) => say::problem(&problem),
                }
            }
        }
    }
    if recordings.len() > 1
        && let Err(problem) = gather::write(out, rows)
    {
        say::problem(&problem);
        fine = false;
    }
    fine
}

fn one(recipe: &Recipe, path: &Path, given: &Given, folder: &Path, shown: &str) -> Result<Row> {
    let mut meter = Meter::new(&source::file_name(path));
    let mut analysis = match source::open(path, given, &recipe.recording, &mut meter)? {
        Opened::Whole(recording) => Analysis::new(*recording, recipe.clone())?,
        Opened::Large(large) => Analysis::of_large(*large, recipe.clone())?,
    };
    let large = analysis.large().is_some();
    analysis.run(|progress| meter.analysis(progress))?;
    let row = Row::of(analysis.sheet(), shown).json()?;
    let mut files = files(&analysis)?;
    files.push(("row.json".into(), row.clone().into()));
    folder::write(folder, &files)?;
    drop(meter);
    if large {
        say::line(&format!(
            "{}: note: no series was written, for the recording is larger than the memory for it; give more with --memory",
            source::file_name(path)
        ));
    }
    for warning in &analysis.sheet().warnings {
        say::note(&format!("{}: note: {warning}", source::file_name(path)));
    }
    // As it is read again: the table is the same whether one process made all rows or each a process of its own.
    Row::from_json(&row)
}

/// The row of a recording that could not be analysed stands where its results would, so that `gather` knows of it.
fn write_failed(row: &Row, folder: &Path) -> Result<Row> {
    let text = row.json()?;
    folder::write(folder, &[("row.json".into(), text.clone().into())])?;
    Row::from_json(&text)
}

/// Every file of one recording's folder.
fn files(analysis: &Analysis) -> Result<Vec<(String, Vec<u8>)>> {
    let drawings = figures::drawings(analysis.sheet());
    let mut files = take::files(analysis, &drawings, true)?;
    for (name, _, svg) in drawings {
        if teasel_figures::stands_alone(&name) {
            files.push((
                format!("figures/{}.svg", take::safe_name(&name)),
                svg.into(),
            ));
        }
    }
    Ok(files)
}
