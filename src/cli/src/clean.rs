//! `teasel clean`: recordings without some of their components, or with nothing but them.
use crate::say::{self, Meter};
use crate::{Given, folder, source};
use std::path::Path;
use teasel_core::analysis::{Analysis, Stage};
use teasel_core::error::Result;
use teasel_core::recipe::Recipe;
use teasel_core::takeaway::{Cleaning, Form, clean as cleaned, recipe_from_json};

/// What is written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, clap::ValueEnum)]
pub enum Written {
    /// EDF+ with 16 bits and the events.
    Edf,
    /// NumPy, channels × samples, f32.
    Npy,
}

/// What is asked of each recording.
struct Asked<'a> {
    recipe: Recipe,
    chosen: &'a [String],
    how: Cleaning,
    form: Written,
}

/// Cleans all recordings; false where the recipe or a recording was bad.
pub fn clean(
    recipe: &Path,
    given: &Given,
    remove: &[String],
    only: &[String],
    form: Written,
    out: &Path,
) -> bool {
    let read = source::text(recipe)
        .and_then(|text| recipe_from_json(&text).map_err(|p| p.in_file(source::file_name(recipe))));
    let recipe = match read {
        Ok(recipe) => recipe,
        Err(problem) => {
            say::problem(&problem);
            return false;
        }
    };
    let (chosen, how) = if only.is_empty() {
        (remove, Cleaning::Remove)
    } else {
        (only, Cleaning::KeepOnly)
    };
    let asked = Asked {
        recipe,
        chosen,
        how,
        form,
    };
    let mut fine = true;
    for (path, name) in given
        .recordings
        .iter()
        .zip(folder::names(&given.recordings))
    {
        if let Err(problem) = one(&asked, path, given, &out.join(name)) {
            say::problem(&problem.in_file(source::file_name(path)));
            fine = false;
        }
    }
    fine
}

fn one(asked: &Asked<'_>, path: &Path, given: &Given, folder: &Path) -> Result<()> {
    let name = source::file_name(path);
    let mut meter = Meter::new(&name);
    let recording = source::recording(path, given, &asked.recipe.recording, &mut meter)?;
    let mut analysis = Analysis::new(recording, asked.recipe.clone())?;
    // The filters are there after the fit; how sure they are is `run`'s to say.
    while !analysis.finished() {
        let progress = analysis.step()?;
        if progress.stage > Stage::Fitting {
            break;
        }
        meter.analysis(progress);
    }
    let cleaned = cleaned(&analysis, asked.chosen, asked.how)?;
    drop(meter);
    say::line(&format!(
        "{name}: {} The other components change by at most {:.1e} of their size.",
        cleaned.note, cleaned.others
    ));
    let (file, form) = match asked.form {
        Written::Edf => ("cleaned.edf", Form::Edf),
        Written::Npy => ("cleaned.npy", Form::Npy),
    };
    folder::write(
        folder,
        &[
            (file.into(), cleaned.bytes(form)?),
            ("cleaned.csv".into(), cleaned.csv()?.into()),
        ],
    )
}
