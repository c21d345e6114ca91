//! `teasel apply`: the filters of one recording on others.
use crate::say::{self, Meter};
use crate::{Given, folder, source};
use std::path::Path;
use teasel_core::error::Result;
use teasel_core::takeaway::{Weights, series_csv, series_npy};

/// Applies the weights to all recordings; false where the weights or a recording was bad.
pub fn apply(weights: &Path, given: &Given, out: &Path) -> bool {
    let read = source::text(weights).and_then(|text| {
        Weights::from_json(&text).map_err(|p| p.in_file(source::file_name(weights)))
    });
    let weights = match read {
        Ok(weights) => weights,
        Err(problem) => {
            say::problem(&problem);
            return false;
        }
    };
    let mut fine = true;
    let recordings = given.each();
    for (path, name) in recordings.iter().zip(folder::names(&recordings)) {
        if let Err(problem) = one(&weights, path, given, &out.join(name)) {
            say::problem(&problem.in_file(source::file_name(path)));
            fine = false;
        }
    }
    fine
}

fn one(weights: &Weights, path: &Path, given: &Given, folder: &Path) -> Result<()> {
    let name = source::file_name(path);
    let recording = {
        let mut meter = Meter::new(&name);
        source::recording(path, given, &given.told.given(), &mut meter)?
    };
    let applied = weights.apply(&recording)?;
    for note in &applied.notes {
        say::line(&format!("{name}: note: {note}"));
    }
    folder::write(
        folder,
        &[
            ("series.csv".into(), series_csv(&applied.series)?.into()),
            ("series.npy".into(), series_npy(&applied.series)?),
        ],
    )
}
