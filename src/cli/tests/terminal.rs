//! The built program: exit codes, messages, folders, the same bytes twice, weights carried to another file.
#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    clippy::print_stderr,
    reason = "a check that cannot go on fails; one that is left out says so"
)]
mod program;

use program::teasel;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};
use std::sync::OnceLock;
use teasel_core::demo::{Demo, night_watch};
use teasel_core::recipe::{Keep, Recipe};
use teasel_core::recording::edf;
use teasel_core::takeaway::recipe_json;

fn said(output: &Output) -> String {
    String::from_utf8_lossy(&output.stderr).into_owned()
}

/// Lines of standard error that are not notes.
fn errors(output: &Output) -> Vec<String> {
    said(output)
        .lines()
        .filter(|l| !l.contains(": note: "))
        .map(String::from)
        .collect()
}

fn demo() -> &'static (Demo, Vec<u8>) {
    static DEMO: OnceLock<(Demo, Vec<u8>)> = OnceLock::new();
    DEMO.get_or_init(|| {
        let demo = night_watch(1);
        let bytes = edf::write(&demo.recording, &edf::Identity::default()).unwrap();
        (demo, bytes)
    })
}

fn quick() -> Recipe {
    let mut recipe = demo().0.recipe.clone();
    recipe.keep = Keep::Number(8);
    recipe.components = 2;
    recipe.evidence.permutations = 60;
    recipe.evidence.bootstrap = 40;
    recipe
}

/// A folder with the demo recording and a quick recipe.
fn desk() -> tempfile::TempDir {
    let desk = tempfile::tempdir().unwrap();
    fs::write(desk.path().join("watch.edf"), &demo().1).unwrap();
    fs::write(
        desk.path().join("recipe.json"),
        recipe_json(&quick()).unwrap(),
    )
    .unwrap();
    desk
}

fn files(folder: &Path) -> Vec<PathBuf> {
    let mut all: Vec<PathBuf> = fs::read_dir(folder)
        .unwrap()
        .flat_map(|entry| {
            let path = entry.unwrap().path();
            if path.is_dir() {
                files(&path)
            } else {
                vec![path]
            }
        })
        .collect();
    all.sort();
    all
}

/// Columns of a series table without its time.
fn columns(path: &Path) -> Vec<Vec<f64>> {
    let mut reader = csv::Reader::from_path(path).unwrap();
    let rows: Vec<Vec<f64>> = reader
        .records()
        .map(|r| r.unwrap().iter().map(|c| c.parse().unwrap()).collect())
        .collect();
    (1..rows[0].len())
        .map(|c| rows.iter().map(|r| r[c]).collect())
        .collect()
}

#[test]
fn usage_and_help() {
    let desk = tempfile::tempdir().unwrap();
    let version = teasel(&["--version"], desk.path());
    assert_eq!(version.status.code(), Some(0));
    assert_eq!(
        String::from_utf8_lossy(&version.stdout).trim(),
        format!("teasel {}", teasel_core::VERSION)
    );
    let help = teasel(&["--help"], desk.path());
    assert_eq!(help.status.code(), Some(0));
    let text = String::from_utf8_lossy(&help.stdout).into_owned();
    assert!(
        text.contains("teasel run recipe.json night-watch.edf --out results"),
        "{text}"
    );
    // The example is a recipe that is read.
    let from = text.find("{ \"teasel_recipe\"").unwrap();
    let to = text.find("Exit codes").unwrap();
    teasel_core::takeaway::recipe_from_json(text[from..to].trim()).unwrap();
    for wrong in [
        &[][..],
        &["walk"],
        &["run", "recipe.json"],
        &["run", "recipe.json", "watch.edf"],
        &[
            "run",
            "recipe.json",
            "watch.edf",
            "--out",
            "x",
            "--seed",
            "-1",
        ],
        &["inspect"],
    ] {
        assert_eq!(
            teasel(wrong, desk.path()).status.code(),
            Some(2),
            "{wrong:?}"
        );
    }
}

#[test]
fn a_run_gives_every_file_and_the_same_bytes_twice() {
    let desk = desk();
    let first = teasel(
        &["run", "recipe.json", "watch.edf", "--out", "one"],
        desk.path(),
    );
    assert_eq!(first.status.code(), Some(0), "{}", said(&first));
    assert!(
        first.stdout.is_empty() && errors(&first).is_empty(),
        "{}",
        said(&first)
    );
    let folder = desk.path().join("one/watch");
    for name in [
        "results.json",
        "weights.json",
        "weights.csv",
        "series.csv",
        "series.npy",
        "report.html",
        "figures/stronger-1-map.svg",
    ] {
        assert!(
            fs::metadata(folder.join(name)).is_ok_and(|m| m.len() > 100),
            "{name}"
        );
    }
    // One recording gets no table, and nothing is left beside.
    let beside: Vec<_> = fs::read_dir(desk.path().join("one")).unwrap().collect();
    assert_eq!(beside.len(), 1);

    fs::create_dir_all(desk.path().join("two/watch/figures")).unwrap();
    fs::write(desk.path().join("two/watch/mine.txt"), "kept").unwrap();
    fs::write(
        desk.path().join("two/watch/figures/weaker-9-map.svg"),
        "old",
    )
    .unwrap();
    let second = teasel(
        &["run", "recipe.json", "watch.edf", "--out", "two"],
        desk.path(),
    );
    assert_eq!(second.status.code(), Some(0));
    assert!(desk.path().join("two/watch/mine.txt").exists());
    assert!(
        !desk
            .path()
            .join("two/watch/figures/weaker-9-map.svg")
            .exists()
    );
    for path in files(&folder) {
        let other = desk
            .path()
            .join("two")
            .join(path.strip_prefix(desk.path().join("one")).unwrap());
        assert!(
            fs::read(&path).unwrap() == fs::read(&other).unwrap(),
            "{}",
            path.display()
        );
    }

    let seeded = teasel(
        &[
            "run",
            "recipe.json",
            "watch.edf",
            "--out",
            "three",
            "--seed",
            "7",
        ],
        desk.path(),
    );
    assert_eq!(seeded.status.code(), Some(0));
    let results: serde_json::Value =
        serde_json::from_slice(&fs::read(desk.path().join("three/watch/results.json")).unwrap())
            .unwrap();
    assert_eq!(results["recipe"]["evidence"]["seed"], 7);
}

#[test]
fn weights_applied_to_the_same_file_give_the_series_of_the_run() {
    let desk = desk();
    let run = teasel(
        &["run", "recipe.json", "watch.edf", "--out", "one"],
        desk.path(),
    );
    assert_eq!(run.status.code(), Some(0), "{}", said(&run));
    let apply = teasel(
        &[
            "apply",
            "one/watch/weights.json",
            "watch.edf",
            "--out",
            "carried",
        ],
        desk.path(),
    );
    assert_eq!(apply.status.code(), Some(0), "{}", said(&apply));
    let made = columns(&desk.path().join("one/watch/series.csv"));
    let carried = columns(&desk.path().join("carried/watch/series.csv"));
    assert_eq!(made.len(), carried.len());
    for (x, y) in made.iter().zip(&carried) {
        assert_eq!(x.len(), y.len());
        let size = x.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
        let gap = x
            .iter()
            .zip(y)
            .fold(0.0_f64, |m, (v, w)| m.max((v - w).abs()));
        assert!(gap < 1e-6 * size, "{gap:e} of {size:e}");
    }
}

#[test]
fn bad_recordings_are_one_line_each_and_the_others_still_run() {
    let desk = desk();
    let good = &demo().1;
    let header = 256
        * (1 + good[252..256].iter().fold(0, |n, c| {
            if c.is_ascii_digit() {
                n * 10 + usize::from(c - b'0')
            } else {
                n
            }
        }));
    let mut garbled = good.clone();
    garbled[184..192].copy_from_slice(b"whatever");
    for (name, bytes) in [
        ("empty.edf", vec![]),
        ("cut.edf", good[..good.len() / 2 + 7].to_vec()),
        ("stub.edf", good[..header.min(300)].to_vec()),
        ("unknown.edf", b"PK\x03\x04 not a recording at all".to_vec()),
        ("garbled.edf", garbled),
    ] {
        fs::write(desk.path().join(name), bytes).unwrap();
    }
    fs::create_dir(desk.path().join("folder.edf")).unwrap();
    let output = teasel(
        &[
            "run",
            "recipe.json",
            "empty.edf",
            "cut.edf",
            "watch.edf",
            "stub.edf",
            "unknown.edf",
            "garbled.edf",
            "missing.edf",
            "folder.edf",
            "--out",
            "out",
        ],
        desk.path(),
    );
    assert_eq!(output.status.code(), Some(1));
    let lines = errors(&output);
    let expected = [
        ("empty.edf", "empty"),
        ("cut.edf", "--salvage"),
        ("stub.edf", "expected"),
        ("unknown.edf", "ZIP archive"),
        ("garbled.edf", "expected"),
        ("missing.edf", "there is no such file"),
        ("folder.edf", "folder"),
    ];
    assert_eq!(lines.len(), expected.len(), "{lines:#?}");
    for (line, (file, part)) in lines.iter().zip(expected) {
        assert!(
            line.starts_with(&format!("teasel: {file}: ")) && line.contains(part),
            "{line}"
        );
        assert!(!line.contains("panick"), "{line}");
    }
    assert!(desk.path().join("out/watch/results.json").exists());
    for (file, _) in expected {
        assert!(
            !desk
                .path()
                .join("out")
                .join(file.trim_end_matches(".edf"))
                .join("results.json")
                .exists(),
            "{file}"
        );
    }
    let mut table = csv::Reader::from_path(desk.path().join("out/table.csv")).unwrap();
    let rows: Vec<csv::StringRecord> = table.records().map(Result::unwrap).collect();
    assert_eq!(rows.len(), 8);
    assert_eq!(rows.iter().filter(|r| r[2].is_empty()).count(), 1);
    let table: serde_json::Value =
        serde_json::from_slice(&fs::read(desk.path().join("out/table.json")).unwrap()).unwrap();
    assert_eq!(table["recordings"].as_array().unwrap().len(), 8);

    // The whole records before the cut, when asked for.
    let salvaged = teasel(&["inspect", "cut.edf", "--salvage", "--json"], desk.path());
    assert_eq!(salvaged.status.code(), Some(0), "{}", said(&salvaged));
    let card: serde_json::Value = serde_json::from_slice(&salvaged.stdout).unwrap();
    let seconds = card["duration_s"].as_f64().unwrap();
    assert!(seconds > 60.0 && seconds < demo().0.recording.duration_s());
}

#[test]
fn bad_recipes_and_weights_stop_before_any_recording() {
    let desk = desk();
    let recipe = recipe_json(&quick()).unwrap();
    let cases = [
        (
            "c1.json",
            recipe.replace("\"keep\": 8", "\"keep\": 1"),
            "nothing is left to compare",
        ),
        (
            "key.json",
            recipe.replace("\"keep\"", "\"kep\""),
            "the key \"kep\"",
        ),
        (
            "band.json",
            recipe.replace("\"windows\"", "\"band\""),
            "found the key \"signal\"",
        ),
        ("cut.json", recipe[..40].into(), "not JSON"),
        ("empty.json", String::new(), "empty"),
    ];
    for (name, text, part) in cases {
        fs::write(desk.path().join(name), text).unwrap();
        let output = teasel(&["run", name, "watch.edf", "--out", "never"], desk.path());
        assert_eq!(output.status.code(), Some(1));
        let lines = errors(&output);
        assert_eq!(lines.len(), 1, "{lines:?}");
        assert!(
            lines[0].contains(name) && lines[0].contains(part),
            "{lines:?}"
        );
    }
    let output = teasel(
        &["apply", "recipe.json", "watch.edf", "--out", "never"],
        desk.path(),
    );
    assert_eq!(output.status.code(), Some(1));
    assert!(
        errors(&output)[0].contains("the weights file breaks its rules"),
        "{}",
        said(&output)
    );
    assert!(!desk.path().join("never").exists());
}

#[test]
fn an_event_that_is_not_there_is_named() {
    let desk = desk();
    let recipe = recipe_json(&quick())
        .unwrap()
        .replace("\"buoy\"", "\"lighthouse\"");
    fs::write(desk.path().join("other.json"), recipe).unwrap();
    let output = teasel(
        &["run", "other.json", "watch.edf", "--out", "out"],
        desk.path(),
    );
    assert_eq!(output.status.code(), Some(1));
    let lines = errors(&output);
    assert!(
        lines.len() == 1 && lines[0].contains("lighthouse") && lines[0].contains("watch.edf"),
        "{lines:?}"
    );
}

#[test]
fn inspect_tells_what_is_there_and_proposes_a_recipe_that_runs() {
    let desk = desk();
    let text = teasel(&["inspect", "watch.edf"], desk.path());
    let text = String::from_utf8(text.stdout).unwrap();
    for part in [
        "watch.edf",
        "250 Hz",
        "units        µV",
        "buoy",
        "swell",
        "proposal",
    ] {
        assert!(text.contains(part), "{part}\n{text}");
    }
    let from = text.find("{\n").unwrap();
    teasel_core::takeaway::recipe_from_json(&text[from..]).unwrap();
    let card = teasel(&["inspect", "watch.edf", "--json"], desk.path());
    let card: serde_json::Value = serde_json::from_slice(&card.stdout).unwrap();
    assert_eq!(card["rate_hz"], 250.0);
    assert_eq!(card["channels"].as_array().unwrap().len(), 32);
    assert_eq!(
        card["proposal"]["recipe"]["contrast"]["signal"]["event"],
        "buoy"
    );
}

#[test]
fn a_table_of_events_beside_the_recording_is_used_and_one_given_is_preferred() {
    let desk = desk();
    fs::rename(
        desk.path().join("watch.edf"),
        desk.path().join("sub-01_task-watch_eeg.edf"),
    )
    .unwrap();
    let table = |label: &str| {
        let rows: String = (0..12)
            .map(|k| format!("{}\t0\t{label}\n", 5 + 10 * k))
            .collect();
        format!("onset\tduration\ttrial_type\n{rows}")
    };
    fs::write(
        desk.path().join("sub-01_task-watch_events.tsv"),
        table("lamp"),
    )
    .unwrap();
    fs::write(desk.path().join("mine.tsv"), table("bell")).unwrap();
    let events = |arguments: &[&str]| {
        let output = teasel(arguments, desk.path());
        assert_eq!(output.status.code(), Some(0), "{}", said(&output));
        let card: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
        card["events"].clone()
    };
    let name = "sub-01_task-watch_eeg.edf";
    assert_eq!(
        events(&["inspect", name, "--json"]),
        serde_json::json!({"lamp": 12})
    );
    assert_eq!(
        events(&["inspect", name, "--json", "--with", "mine.tsv"]),
        serde_json::json!({"bell": 12})
    );
    let output = teasel(&["inspect", name, "--with", "absent.tsv"], desk.path());
    assert_eq!(output.status.code(), Some(1));
    assert!(
        errors(&output)[0].contains("absent.tsv: there is no such file"),
        "{}",
        said(&output)
    );
}

#[test]
fn what_a_table_does_not_say_is_told_by_options_or_by_the_recipe() {
    let desk = desk();
    let recording = &demo().0.recording;
    let names: Vec<&str> = recording.channels.iter().map(|c| c.name.as_str()).collect();
    let mut text = format!("{}\n", names.join(","));
    for k in 0..recording.sample_count() {
        let row: Vec<String> = recording.samples.iter().map(|s| s[k].to_string()).collect();
        text += &format!("{}\n", row.join(","));
    }
    let mut events = "onset\tduration\ttrial_type\n".to_owned();
    for event in &recording.events {
        events += &format!("{}\t{}\t{}\n", event.onset_s, event.duration_s, event.label);
    }
    fs::write(desk.path().join("watch_events.tsv"), events).unwrap();
    fs::write(desk.path().join("watch.csv"), text).unwrap();
    let output = teasel(&["inspect", "watch.csv"], desk.path());
    assert_eq!(output.status.code(), Some(1));
    let line = &errors(&output)[0];
    assert!(line.contains("--rate HZ --unit UNIT"), "{line}");
    let output = teasel(
        &["inspect", "watch.csv", "--rate", "250", "--unit", "uV"],
        desk.path(),
    );
    assert!(output.status.success(), "{}", said(&output));
    let shown = String::from_utf8(output.stdout).unwrap();
    assert!(
        shown.contains("250 Hz") && shown.contains("\"unit\": \"uV\""),
        "{shown}"
    );

    let mut recipe = quick();
    recipe.recording.rate_hz = Some(250.0);
    recipe.recording.unit = Some("uV".to_owned());
    fs::write(desk.path().join("told.json"), recipe_json(&recipe).unwrap()).unwrap();
    let run = ["run", "told.json", "watch.csv", "--out", "told"];
    let output = teasel(&run, desk.path());
    assert!(output.status.success(), "{}", said(&output));
    let output = teasel(
        &["run", "recipe.json", "watch.edf", "--out", "plain"],
        desk.path(),
    );
    assert!(output.status.success(), "{}", said(&output));
    let components = |folder: &str| {
        let path = desk.path().join(folder).join("watch/results.json");
        let results: serde_json::Value =
            serde_json::from_str(&fs::read_to_string(path).unwrap()).unwrap();
        results["components"].clone()
    };
    assert_eq!(components("told"), components("plain"));
    let output = teasel(
        &["inspect", "watch.csv", "--rate", "-3", "--unit", "uV"],
        desk.path(),
    );
    assert_eq!(output.status.code(), Some(1), "{}", said(&output));
}

#[test]
fn files_of_one_recording_are_joined() {
    let desk = desk();
    for part in ["night-10.edf", "night-9.edf"] {
        fs::write(desk.path().join(part), &demo().1).unwrap();
    }
    let joined = [
        "inspect",
        "--joined",
        "night-10.edf",
        "night-9.edf",
        "--json",
    ];
    let output = teasel(&joined, desk.path());
    assert!(output.status.success(), "{}", said(&output));
    let card: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(card["name"], "night-9.edf");
    assert_eq!(card["stretches"].as_array().unwrap().len(), 2);
    let run = [
        "run",
        "recipe.json",
        "--joined",
        "night-10.edf",
        "night-9.edf",
        "--out",
        "out",
    ];
    let output = teasel(&run, desk.path());
    assert!(output.status.success(), "{}", said(&output));
    assert!(desk.path().join("out/night-9/results.json").is_file());
    assert!(!desk.path().join("out/night-10").exists());
}

/// Reads what a run writes with Python's csv and NumPy, where an interpreter with NumPy is given.
#[test]
fn python_reads_the_tables_and_arrays() {
    let Some(python) = std::env::var_os("TEASEL_PYTHON") else {
        eprintln!("TEASEL_PYTHON is not set: tables and arrays are not read back by Python");
        return;
    };
    const SCRIPT: &str = r#"
import csv, json, sys
import numpy as np
folder = sys.argv[1]
series = np.load(folder + "/series.npy")
rows = list(csv.reader(open(folder + "/series.csv", encoding="utf-8", newline="")))
table = np.array(rows[1:], dtype=float)
assert series.dtype == np.float64 and series.flags["C_CONTIGUOUS"]
assert np.array_equal(table[:, 1:].T, series), "series.csv and series.npy differ"
weights = json.load(open(folder + "/weights.json", encoding="utf-8"))
rows = list(csv.reader(open(folder + "/weights.csv", encoding="utf-8", newline="")))
n = len(weights["filters"])
assert rows[0] == ["channel", "unit"] + [f"filter_{k+1}" for k in range(n)] + [f"pattern_{k+1}" for k in range(n)]
assert [r[0] for r in rows[1:]] == [c["name"] for c in weights["channels"]]
table = np.array([[float(x) for x in r[2:]] for r in rows[1:]])
assert np.array_equal(table[:, :n].T, np.array(weights["filters"]))
assert np.array_equal(table[:, n:].T, np.array(weights["patterns"]))
assert np.array_equal(np.load(folder + "/filters.npy"), np.array(weights["filters"]))
assert np.array_equal(np.load(folder + "/patterns.npy"), np.array(weights["patterns"]))
results = json.load(open(folder + "/results.json", encoding="utf-8"))
assert series.shape == (len(results["components"]) + len(results["weaker"]), 60000), series.shape
"#;
    let desk = desk();
    let run = teasel(
        &["run", "recipe.json", "watch.edf", "--out", "out"],
        desk.path(),
    );
    assert_eq!(run.status.code(), Some(0), "{}", said(&run));
    let script = desk.path().join("read.py");
    fs::write(&script, SCRIPT).unwrap();
    let output = Command::new(python)
        .arg(&script)
        .arg(desk.path().join("out/watch"))
        .output()
        .unwrap();
    assert!(output.status.success(), "{}", said(&output));
}
