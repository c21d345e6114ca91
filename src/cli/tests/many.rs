//! Many recordings, one recipe: the same table and group whether one process runs them all, each has a process of its own, or a
//! workflow engine (GNU make, Snakemake) decides when.
#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    clippy::print_stderr,
    reason = "a check that cannot go on fails; one that is left out says so"
)]
mod program;

use program::teasel;
use std::fs;
use std::path::Path;
use std::process::{Command, Output};
use teasel_core::demo::night_watch;
use teasel_core::recipe::Keep;
use teasel_core::recording::edf;
use teasel_core::takeaway::recipe_json;

const NIGHTS: [&str; 6] = [
    "night-1", "night-2", "night-3", "night-4", "night-5", "torn",
];
const SHARED: [&str; 3] = ["table.csv", "table.json", "group.csv"];

fn said(output: &Output) -> String {
    format!(
        "{}{}",
        String::from_utf8_lossy(&output.stdout),
        String::from_utf8_lossy(&output.stderr)
    )
}

/// Five nights, the third with its channels in another order and one fewer, the second upside down, and one torn file.
fn desk() -> tempfile::TempDir {
    let desk = tempfile::tempdir().unwrap();
    let mut recipe = night_watch(1).recipe;
    recipe.keep = Keep::Number(16);
    recipe.components = 1;
    recipe.evidence.permutations = 40;
    recipe.evidence.bootstrap = 40;
    fs::write(
        desk.path().join("recipe.json"),
        recipe_json(&recipe).unwrap(),
    )
    .unwrap();
    for seed in 1..=5_u64 {
        let mut recording = night_watch(seed).recording;
        if seed == 2 {
            let samples = recording.samples.iter_mut().flatten();
            samples.for_each(|x| *x = -*x);
        }
        if seed == 3 {
            recording.channels.reverse();
            recording.samples.reverse();
            recording.channels.pop();
            recording.samples.pop();
        }
        let bytes = edf::write(&recording, &edf::Identity::default()).unwrap();
        fs::write(desk.path().join(format!("night-{seed}.edf")), &bytes).unwrap();
        if seed == 5 {
            fs::write(desk.path().join("torn.edf"), &bytes[..bytes.len() / 3 + 5]).unwrap();
        }
    }
    desk
}

fn same_tables(desk: &Path, one: &str, other: &str) {
    for name in SHARED {
        let read = |folder: &str| fs::read_to_string(desk.join(folder).join(name)).unwrap();
        assert_eq!(read(one), read(other), "{name} of {one} and {other}");
    }
}

#[test]
fn one_process_many_processes_and_workflow_engines_make_one_table() {
    let desk = desk();
    let at = desk.path();
    let mut all = vec!["run", "recipe.json"];
    // In another order than that of the table.
    let files: Vec<String> = NIGHTS.iter().rev().map(|n| format!("{n}.edf")).collect();
    all.extend(files.iter().map(String::as_str));
    all.extend(["--out", "together"]);
    let run = teasel(&all, at);
    assert_eq!(run.status.code(), Some(1), "{}", said(&run));
    assert!(said(&run).contains("teasel: torn.edf: "), "{}", said(&run));
    read_the_group(&at.join("together"));

    let makefile = format!(
        "TEASEL := {}\nNIGHTS := {}\n\nall: made/table.json\n\nmade/%/results.json: %.edf recipe.json\n\t$(TEASEL) run recipe.json $< --out made\n\n# The torn night fails; the group is made of the others.\nmade/table.json: $(NIGHTS:%=made/%/results.json)\n\t$(TEASEL) gather made\n",
        env!("CARGO_BIN_EXE_teasel"),
        NIGHTS[..5].join(" ")
    );
    fs::write(at.join("Makefile"), makefile).unwrap();
    let make = |goals: &[&str]| {
        Command::new("make")
            .args(["--jobs=2", "--keep-going"])
            .args(goals)
            .current_dir(at)
            .output()
    };
    match make(&["made/torn/results.json"]) {
        Ok(failed) => {
            assert!(!failed.status.success(), "{}", said(&failed));
            let made = make(&[]).unwrap();
            assert!(made.status.success(), "{}", said(&made));
            same_tables(at, "together", "made");
            // Nothing changed: nothing is done again.
            let again = make(&[]).unwrap();
            assert!(
                !said(&again).contains("run recipe.json"),
                "{}",
                said(&again)
            );
        }
        Err(_) => eprintln!("make is not installed: it does not run the recordings here"),
    }
    snakes(at);
}

/// The same under Snakemake, where it is installed with the checks' Python.
fn snakes(at: &Path) {
    let python = std::env::var_os("TEASEL_PYTHON").filter(|python| {
        let mut ask = Command::new(python);
        let found = ask.args(["-m", "snakemake", "--version"]).output();
        found.is_ok_and(|output| output.status.success())
    });
    let Some(python) = python else {
        eprintln!("Snakemake is not installed: it does not run the recordings here");
        return;
    };
    let rules = format!(
        "NIGHTS = {:?}\n\nrule all:\n    input: \"snaked/table.json\"\n\nrule one:\n    input: recipe=\"recipe.json\", recording=\"{{night}}.edf\"\n    output: \"snaked/{{night}}/row.json\"\n    shell: \"'{1}' run {{input.recipe}} {{input.recording}} --out snaked || test {{wildcards.night}} = torn\"\n\nrule group:\n    input: expand(\"snaked/{{night}}/row.json\", night=NIGHTS)\n    output: \"snaked/table.json\", \"snaked/table.csv\", \"snaked/group.csv\"\n    shell: \"'{1}' gather snaked\"\n",
        NIGHTS,
        env!("CARGO_BIN_EXE_teasel")
    );
    fs::write(at.join("Snakefile"), rules).unwrap();
    let run = Command::new(python)
        .args(["-m", "snakemake", "--cores", "2", "--quiet", "all"])
        .env("HOME", at)
        .env("XDG_CACHE_HOME", at.join("cache"))
        .current_dir(at)
        .output()
        .unwrap();
    assert!(run.status.success(), "{}", said(&run));
    same_tables(at, "together", "snaked");
}

/// Twice the same effect upside down, once with fewer channels in another order: one group.
fn read_the_group(folder: &Path) {
    let table: serde_json::Value =
        serde_json::from_slice(&fs::read(folder.join("table.json")).unwrap()).unwrap();
    let rows = table["recordings"].as_array().unwrap();
    let names: Vec<&str> = rows.iter().map(|r| r["folder"].as_str().unwrap()).collect();
    assert_eq!(names, NIGHTS);
    assert!(rows[5]["problem"].as_str().unwrap().contains("cut short"));
    let group = &table["group"]["stronger"];
    assert_eq!(group["recordings"], 5);
    assert_eq!(group["channels"].as_array().unwrap().len(), 31);
    let test = &group["test"];
    assert_eq!(
        (&test["exact"], &test["arrangements"]),
        (&true.into(), &32.into())
    );
    // All five nights have the effect, so only the observed arrangement reaches the mean.
    assert_eq!(test["p"].as_f64().unwrap(), 1.0 / 32.0);
    assert!(test["ratio"].as_f64().unwrap() > 1.3, "{test}");
    for row in &rows[..5] {
        let alike = row["stronger_1"]["likeness"].as_f64().unwrap();
        assert!(alike > 0.7, "{row}");
    }
    let agreement = group["agreement"].as_f64().unwrap();
    assert!(agreement > 0.8 && agreement <= 1.0, "{agreement}");
    let notes = table["notes"].to_string();
    assert!(
        notes.contains("31 channels that all recordings share"),
        "{notes}"
    );
    for part in ["map", "spectrum", "course", "average"] {
        for ending in ["svg", "csv"] {
            let name = format!("group/stronger-1-{part}.{ending}");
            let length = fs::metadata(folder.join(&name)).map(|m| m.len());
            assert!(length.is_ok_and(|n| n > 300), "{name}");
        }
    }
}

#[test]
fn gather_says_what_is_missing_or_damaged() {
    let desk = tempfile::tempdir().unwrap();
    let at = desk.path();
    let nothing = teasel(&["gather", "."], at);
    assert_eq!(nothing.status.code(), Some(1));
    assert!(
        said(&nothing).contains("teasel run RECIPE"),
        "{}",
        said(&nothing)
    );
    fs::create_dir(at.join("monday")).unwrap();
    fs::write(at.join("monday/row.json"), "{\"teasel_row\": 1").unwrap();
    let damaged = teasel(&["gather", "."], at);
    assert_eq!(damaged.status.code(), Some(1));
    let text = said(&damaged);
    assert!(
        text.contains("monday/row.json") && text.contains("line 1"),
        "{text}"
    );
    assert!(!at.join("table.csv").exists());
}
