//! The demo recordings as files.
use crate::house;
use anyhow::Result;
use std::path::{Path, PathBuf};
use teasel_core::demo;
use teasel_core::recording::edf;
use teasel_core::takeaway::recipe_json;

/// Writes `demo-data/night-watch.edf` with its recipe and its true patterns, and those of the drifting dish.
pub fn write() -> Result<()> {
    for (path, bytes) in write_to(&house::root().join("demo-data"))? {
        println!("{}: {bytes} bytes", path.display());
    }
    Ok(())
}

/// Writes the same files elsewhere; gives their paths and sizes.
pub fn write_to(folder: &Path) -> Result<Vec<(PathBuf, usize)>> {
    let made = demo::night_watch(demo::WATCH_SEED);
    let mut truth = serde_json::to_string_pretty(&made.truth)?;
    truth.push('\n');
    let dish = demo::drifting_dish(demo::DISH_SEED);
    let mut dish_truth = serde_json::to_string(&dish.truth)?;
    dish_truth.push('\n');
    let files = [
        (
            "night-watch.edf",
            edf::write(&made.recording, &edf::Identity::default())?,
        ),
        (
            "night-watch.recipe.json",
            recipe_json(&made.recipe)?.into_bytes(),
        ),
        ("night-watch.truth.json", truth.into_bytes()),
        // The movie itself is made where it is opened: it would be 28 MB.
        (
            "drifting-dish.recipe.json",
            recipe_json(&dish.recipe)?.into_bytes(),
        ),
        ("drifting-dish.truth.json", dish_truth.into_bytes()),
    ];
    let mut written = Vec::new();
    for (name, bytes) in files {
        let path = folder.join(name);
        house::write(&path, &bytes)?;
        written.push((path, bytes.len()));
    }
    Ok(written)
}
