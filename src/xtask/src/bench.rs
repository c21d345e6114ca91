//! The budget table: the page in Chromium beside the same steps with general libraries in Python, on one thread, in one run.
use crate::{bundle, check, house, python, shell};
use anyhow::{Context, Result};
use serde_json::Value;
use std::path::Path;
use std::process::Command;

const RECIPE: &str = "tests/bench/recipe.json";

/// Prints the table.
pub fn table() -> Result<()> {
    let page = bundle::build(crate::wasm::Finish::Shipped)?;
    check::browser()?;
    let python = python::ready()?;
    let recording = house::target("bench")?.join("long.edf");
    if !recording.exists() {
        println!("Making the recording: 64 channels, 10 minutes, 512 Hz, 200 events.");
        let mut make = python.command();
        make.args(["tests/bench/steps.py", "make"]).arg(&recording);
        shell::run("tests/bench/steps.py make", &mut make)?;
    }
    println!("Timing the page, then Python.");
    let ours = timed(Command::new("node").arg("tests/bench/page.mjs"), &recording)?;
    let theirs = timed(
        python.command().args(["tests/bench/steps.py", "time"]),
        &recording,
    )?;
    let rows = rows(
        page.html.len(),
        bundle::gzip(&page.html).len(),
        &ours,
        &theirs,
    );
    print_rows(&rows);
    Ok(())
}

fn timed(command: &mut Command, recording: &Path) -> Result<Value> {
    command
        .arg(recording)
        .arg(RECIPE)
        .current_dir(house::root());
    let said = shell::output("the benchmark", command)?;
    let last = said.lines().last().context("the benchmark said nothing")?;
    Ok(serde_json::from_str(last)?)
}

struct Row {
    work: &'static str,
    found: f64,
    unit: &'static str,
    budget: Budget,
    python: Option<f64>,
}

enum Budget {
    AtMost(f64),
    AtLeast(f64),
    /// No more than Python, and no more than this.
    BelowPythonAnd(f64),
    None,
}

impl Row {
    fn holds(&self) -> Option<bool> {
        match self.budget {
            Budget::AtMost(limit) => Some(self.found <= limit),
            Budget::AtLeast(limit) => Some(self.found >= limit),
            Budget::BelowPythonAnd(limit) => {
                Some(self.found <= limit && self.python.is_some_and(|python| self.found <= python))
            }
            Budget::None => None,
        }
    }
}

fn rows(bytes: usize, gzipped: usize, ours: &Value, theirs: &Value) -> Vec<Row> {
    let page = |key: &str| ours[key].as_f64().unwrap_or(f64::NAN);
    let python_ms = |key: &str| theirs[key].as_f64().map(|seconds| seconds * 1e3);
    let megabytes = theirs["bytes"].as_f64().unwrap_or(f64::NAN) / 1e6;
    let row = |work, found, unit, budget, python| Row {
        work,
        found,
        unit,
        budget,
        python,
    };
    let ms = |work, key: &str, budget, python: &str| {
        row(work, page(key), "ms", budget, python_ms(python))
    };
    vec![
        row("file", bytes as f64 / 1e6, "MB", Budget::AtMost(1.5), None),
        row(
            "file, gzipped",
            gzipped as f64 / 1e3,
            "KB",
            Budget::AtMost(600.0),
            None,
        ),
        ms(
            "first screen usable after load",
            "first_screen_ms",
            Budget::AtMost(300.0),
            "",
        ),
        row(
            "reading and decoding, 64 channels",
            megabytes / page("read_ms") * 1e3,
            "MB/s",
            Budget::AtLeast(500.0),
            python_ms("read").map(|ms| megabytes / ms * 1e3),
        ),
        ms(
            "10 min of 64 channels: read and looked at",
            "opened_ms",
            Budget::None,
            "read",
        ),
        ms(
            "10 min of 64 channels: drop to ratio, map, spectrum",
            "first_result_ms",
            Budget::BelowPythonAnd(3000.0),
            "first_result",
        ),
        ms(
            "the same, to the end of all evidence",
            "everything_ms",
            Budget::None,
            "",
        ),
        ms(
            "change of C, 64 channels",
            "change_keep_ms",
            Budget::AtMost(50.0),
            "change_keep",
        ),
        ms(
            "change of a window edge, 64 channels",
            "change_edge_ms",
            Budget::AtMost(50.0),
            "change_edge",
        ),
        ms(
            "1,000 permutations, C = 32, 200 trials",
            "permute_ms",
            Budget::AtMost(2000.0),
            "permute",
        ),
        ms(
            "symmetric eigenproblem, n = 512",
            "eigen_512_ms",
            Budget::AtMost(90.0),
            "eigen_512",
        ),
        row(
            "Gram products, 64 channels, f64",
            page("gram_gflops"),
            "GFLOP/s",
            Budget::AtLeast(10.0),
            python_ms("gram_64").map(|ms| 2.0 * 64.0 * 64.0 * 4096.0 / ms / 1e6),
        ),
        ms(
            "1 h of 64 channels: from read to first traces",
            "traces_first_ms",
            Budget::AtMost(2000.0),
            "",
        ),
        ms(
            "the same: slowest frame of moving about",
            "traces_slowest_frame_ms",
            Budget::AtMost(50.0),
            "",
        ),
        ms(
            "the same: usual frame",
            "traces_usual_frame_ms",
            Budget::AtMost(17.0),
            "",
        ),
        row(
            "10 GB, 64 channels: looked over",
            page("large_mb_s"),
            "MB/s",
            Budget::AtLeast(500.0),
            None,
        ),
        ms(
            "10 GB: windows read and contrast computed",
            "large_computed_ms",
            Budget::None,
            "",
        ),
        row(
            "10 GB: memory of the module at its peak",
            page("large_memory_bytes") / 1e6,
            "MB",
            Budget::AtMost(600.0),
            None,
        ),
        row(
            "memory of the module at its peak",
            page("memory_bytes") / 1e6,
            "MB",
            Budget::None,
            None,
        ),
    ]
}

fn print_rows(rows: &[Row]) {
    println!(
        "\n{:<52} {:>12} {:>16} {:>12} {:>9}",
        "work", "page", "budget", "Python", "page/Py"
    );
    for row in rows {
        let budget = match row.budget {
            Budget::AtMost(limit) => format!("≤ {limit}"),
            Budget::AtLeast(limit) => format!("≥ {limit}"),
            Budget::BelowPythonAnd(limit) => format!("≤ Py and ≤ {limit}"),
            Budget::None => String::new(),
        };
        let python = row.python.map_or(String::new(), three);
        let ratio = row
            .python
            .map_or(String::new(), |value| format!("{:.2}", row.found / value));
        let verdict = match row.holds() {
            Some(true) => "holds",
            Some(false) => "MISSED",
            None => "",
        };
        println!(
            "{:<52} {:>8} {:<8}{:>12} {:>12} {:>9}  {verdict}",
            row.work,
            three(row.found),
            row.unit,
            budget,
            python,
            ratio
        );
    }
}

/// Three figures that count.
fn three(value: f64) -> String {
    match value.abs() {
        large if large >= 100.0 => format!("{value:.0}"),
        middle if middle >= 10.0 => format!("{value:.1}"),
        _ => format!("{value:.2}"),
    }
}

/// How often p ≤ 0.05 where nothing differs: should lie in the binomial interval around 0.05.
pub fn null(recordings: usize) -> Result<()> {
    let mut calibrate = shell::cargo();
    calibrate
        .args([
            "run",
            "--quiet",
            "--package",
            "teasel-tests",
            "--bin",
            "calibrate",
            "--",
        ])
        .arg(recordings.to_string());
    shell::run("calibrate", &mut calibrate)
}
