//! `teasel apply`: the filters of one recording on others.
use crate::say::{self, Meter};
use crate::{Given, folder, source};
use std::path::Path;
use teasel_core::error::Result;
use teasel_core::recipe::Recipe;
use teasel_core::takeaway::{
    Carried, CarriedRow, Weights, recipe_from_json, series_csv, series_npy,
};

/// Applies the weights to all recordings; false where the weights, the recipe or a recording was bad.
pub fn apply(weights: &Path, given: &Given, recipe: Option<&Path>, out: &Path) -> bool {
    let read = |path: &Path| source::text(path);
    let both = read(weights)
        .and_then(|text| {
            Weights::from_json(&text).map_err(|p| p.in_file(source::file_name(weights)))
        })
        .and_then(|weights| {
            let recipe = recipe.map(|path| {
                read(path).and_then(|text| {
                    recipe_from_json(&text).map_err(|p| p.in_file(source::file_name(path)))
                })
            });
            Ok((weights, recipe.transpose()?))
        });
    let (weights, recipe) = match both {
        Ok(both) => both,
        Err(problem) => {
            say::problem(&problem);
            return false;
        }
    };
    let mut fine = true;
    let recordings = given.each();
    for (path, name) in recordings.iter().zip(folder::names(&recordings)) {
        if let Err(problem) = one(&weights, path, given, recipe.as_ref(), &out.join(name)) {
            say::problem(&problem.in_file(source::file_name(path)));
            fine = false;
        }
    }
    fine
}

fn one(
    weights: &Weights,
    path: &Path,
    given: &Given,
    recipe: Option<&Recipe>,
    folder: &Path,
) -> Result<()> {
    let name = source::file_name(path);
    let recording = {
        let mut meter = Meter::new(&name);
        source::recording(path, given, &given.told.given(), &mut meter)?
    };
    let (applied, rows) = match recipe {
        Some(recipe) => {
            let Carried { applied, rows, .. } = weights.carry(&recording, recipe)?;
            (applied, rows)
        }
        None => (weights.apply(&recording)?, Vec::new()),
    };
    for note in &applied.notes {
        say::line(&format!("{name}: note: {note}"));
    }
    for row in &rows {
        say::line(&format!("{name}: {}", row.reading));
    }
    let mut files = vec![
        ("series.csv".into(), series_csv(&applied.series)?.into()),
        ("series.npy".into(), series_npy(&applied.series)?),
    ];
    if !rows.is_empty() {
        files.push(("carried.csv".into(), table(&rows).into()));
    }
    folder::write(folder, &files)
}

/// One row a component; an interval that too few trials left out is empty.
fn table(rows: &[CarriedRow]) -> String {
    let mut text = String::from(
        "component,before,before_held_out,typical,low,high,total,signal_windows,reference_windows\n",
    );
    for row in rows {
        let [low, high] = match row.interval {
            Some(ends) => ends.map(|end| end.to_string()),
            None => [String::new(), String::new()],
        };
        text += &format!(
            "{},{},{},{},{low},{high},{},{},{}\n",
            cell(&row.name),
            row.before,
            row.before_held_out,
            row.typical,
            row.total,
            row.windows[0],
            row.windows[1]
        );
    }
    text
}

/// A name out of a weights file as a quoted cell of text that no spreadsheet takes for a formula.
fn cell(name: &str) -> String {
    let formula = name.starts_with(['=', '+', '-', '@', '\t', '\r', '\0']);
    let text = name.replace('"', "\"\"");
    format!("\"{}{text}\"", if formula { "'" } else { "" })
}
