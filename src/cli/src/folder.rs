//! Files written beside their place and renamed once they are whole.
use crate::source::{file_name, storage};
use std::fs;
use std::path::{Path, PathBuf};
use teasel_core::error::{Problem, Result};
use teasel_core::takeaway::folder_names;

/// Writes every file (its path within `folder`, its bytes): first all of them into a folder beside, then each to its place
/// by one rename, so that a file is old, new or not there, never half of either. Figures of an earlier run that this one does
/// not draw are taken away; anything else in the folder stays.
pub fn write(folder: &Path, files: &[(String, Vec<u8>)]) -> Result<()> {
    let fail = |path: &Path, e: &std::io::Error| cannot(path, e);
    let parent = folder.parent().unwrap_or(Path::new("."));
    fs::create_dir_all(parent).map_err(|e| fail(parent, &e))?;
    let staged = tempfile::Builder::new()
        .prefix(".teasel-")
        .tempdir_in(parent)
        .map_err(|e| fail(parent, &e))?;
    for (name, bytes) in files {
        let path = staged.path().join(name);
        if let Some(inner) = path.parent() {
            fs::create_dir_all(inner).map_err(|e| fail(folder, &e))?;
        }
        fs::write(&path, bytes).map_err(|e| fail(&folder.join(name), &e))?;
    }
    fs::create_dir_all(folder).map_err(|e| fail(folder, &e))?;
    for (name, _) in files {
        let place = folder.join(name);
        if let Some(inner) = place.parent() {
            fs::create_dir_all(inner).map_err(|e| fail(inner, &e))?;
        }
        fs::rename(staged.path().join(name), &place).map_err(|e| fail(&place, &e))?;
    }
    sweep(&folder.join("figures"), files);
    Ok(())
}

/// Takes away figures of components that are no longer drawn.
fn sweep(figures: &Path, files: &[(String, Vec<u8>)]) {
    let Ok(entries) = fs::read_dir(figures) else {
        return;
    };
    for entry in entries.flatten() {
        let name = entry.file_name().to_string_lossy().into_owned();
        let ours = (name.starts_with("stronger-") || name.starts_with("weaker-"))
            && name.ends_with(".svg");
        let drawn = files.iter().any(|(n, _)| *n == format!("figures/{name}"));
        if ours && !drawn {
            // What cannot be taken away is only too much, not wrong.
            let _ = fs::remove_file(entry.path());
        }
    }
}

fn cannot(path: &Path, cause: &std::io::Error) -> Problem {
    storage("it cannot be written", cause)
        .in_file(file_name(path))
        .at(path.display().to_string())
}

/// A folder for each recording, by the rule of [`folder_names`].
pub fn names(recordings: &[PathBuf]) -> Vec<PathBuf> {
    let files: Vec<String> = recordings.iter().map(|path| file_name(path)).collect();
    folder_names(&files)
        .into_iter()
        .map(PathBuf::from)
        .collect()
}
