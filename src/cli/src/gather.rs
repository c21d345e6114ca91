//! `teasel gather`: one table of recordings that were run one process each, and what they say together.
use crate::{folder, say, source};
use std::fs;
use std::path::{Path, PathBuf};
use teasel_core::error::{Kind, Problem, Result};
use teasel_core::takeaway::{Many, Row};
use teasel_figures::{Look, csv, group_figures, height, report_width, svg};

/// Gathers the rows of a folder; false where there are none or one of them is bad.
pub fn gather(out: &Path) -> bool {
    let written = rows(out).and_then(|rows| {
        let failed: Vec<String> = rows
            .iter()
            .filter_map(|r| r.summary.problem.clone())
            .collect();
        write(out, rows).map(|()| failed)
    });
    match written {
        Ok(failed) => {
            for problem in &failed {
                say::note(&format!("note: {problem}"));
            }
            true
        }
        Err(problem) => {
            say::problem(&problem);
            false
        }
    }
}

/// The rows in a folder's folders, in order of their names.
fn rows(out: &Path) -> Result<Vec<Row>> {
    let shown = source::file_name(out);
    let listed = fs::read_dir(out)
        .map_err(|e| source::storage("it cannot be listed", &e).in_file(&shown))?;
    let mut places: Vec<PathBuf> = listed
        .flatten()
        // A run at work keeps what it has not finished in a folder of this name.
        .filter(|entry| !entry.file_name().to_string_lossy().starts_with(".teasel-"))
        .map(|entry| entry.path().join("row.json"))
        .filter(|path| path.is_file())
        .collect();
    places.sort();
    if places.is_empty() {
        return Err(Problem::new(
            Kind::Empty,
            "no folder in it holds a row.json",
            "run recordings into it first: teasel run RECIPE RECORDING --out DIR",
        )
        .in_file(shown));
    }
    let read = |path: &PathBuf| {
        let name = path.strip_prefix(out).unwrap_or(path).display().to_string();
        source::text(path)
            .and_then(|text| Row::from_json(&text))
            .map_err(|p| p.in_file(name))
    };
    places.iter().map(read).collect()
}

/// Writes `table.csv`, `table.json`, and, where there is a group, `group.csv` and its figures with their numbers.
pub fn write(out: &Path, rows: Vec<Row>) -> Result<()> {
    let many = Many::of(rows);
    let mut files: Vec<(String, Vec<u8>)> = vec![
        ("table.csv".into(), many.csv()?.into()),
        ("table.json".into(), many.json()?.into()),
    ];
    if let Some(group) = &many.group {
        files.push(("group.csv".into(), many.group_csv()?.into()));
        for (name, _, figure) in group_figures(group) {
            let width = report_width(&name);
            let drawn = svg(&figure, width, height(&figure, width), &Look::default());
            files.push((format!("group/{name}.svg"), drawn.into()));
            files.push((format!("group/{name}.csv"), csv(&figure).into()));
        }
    }
    folder::write(out, &files)
}
