//! Everything that must hold before a change is kept: cheapest first, and the first failure ends it.
use crate::wasm::Finish;
use crate::{bundle, demo, house, node, packages, python, shell};
use anyhow::{Context, Result};
use std::ffi::OsString;
use std::path::PathBuf;
use std::process::Command;
use std::time::Instant;
use std::{env, fs};

const BROWSERS: &[&str] = &["chromium", "chromium-browser", "google-chrome"];

/// Runs all checks, or the page's alone.
pub fn test(page_only: bool, finish: Finish) -> Result<()> {
    let started = Instant::now();
    if !page_only {
        step("formatting", format)?;
        step("lints", lint)?;
    }
    step("build of the page", || {
        bundle::build(finish).map(|page| bundle::say_size(&page))
    })?;
    step("types of the scripts", types)?;
    if !page_only {
        step("Rust tests", rust)?;
    }
    step("page tests in Chromium", page)?;
    println!(
        "\nAll checks hold; {:.0} s.",
        started.elapsed().as_secs_f64()
    );
    Ok(())
}

fn step(name: &str, run: impl FnOnce() -> Result<()>) -> Result<()> {
    println!("\n— {name}");
    let started = Instant::now();
    run().with_context(|| format!("{name}: not in order"))?;
    println!("— {name}: {:.0} s", started.elapsed().as_secs_f64());
    Ok(())
}

fn format() -> Result<()> {
    component("rustfmt")?;
    shell::run(
        "cargo fmt --check",
        shell::cargo().args(["fmt", "--all", "--check"]),
    )
}

fn lint() -> Result<()> {
    component("clippy")?;
    let mut clippy = shell::cargo();
    clippy.args([
        "clippy",
        "--quiet",
        "--workspace",
        "--all-targets",
        "--",
        "-D",
        "warnings",
    ]);
    shell::run("cargo clippy", &mut clippy)
}

fn component(name: &str) -> Result<()> {
    let program = if name == "clippy" {
        "cargo-clippy"
    } else {
        "cargo-fmt"
    };
    shell::find(program).with_context(|| {
        format!("{name} is missing: rustup component add {name}, or apt-get install {name}")
    })?;
    Ok(())
}

fn types() -> Result<()> {
    for project in ["tsconfig.json", "tsconfig.worker.json"] {
        shell::run(
            "tsc",
            node::tool("tsc")?.args(["--pretty", "false", "-p", project]),
        )?;
    }
    Ok(())
}

fn rust() -> Result<()> {
    let python = python::ready()?;
    let mut tests = shell::cargo();
    tests
        .args(["test", "--quiet", "--workspace"])
        .env("TEASEL_PYTHON", python.program())
        .env("TEASEL_PYEDFLIB_DATA", python.recordings()?);
    shell::run("cargo test", &mut tests)
}

fn page() -> Result<()> {
    browser()?;
    let python = python::ready()?;
    let terminal = terminal_program()?;
    let recordings = house::target("page-tests")?;
    demo::write_to(&recordings)?;
    let mut files: Vec<PathBuf> = fs::read_dir(house::root().join("tests/page"))?
        .flatten()
        .map(|entry| entry.path())
        .filter(|path| path.to_string_lossy().ends_with(".test.mjs"))
        .collect();
    files.sort();
    let mut tests = Command::new("node");
    tests
        .args([
            "--test",
            "--test-concurrency=1",
            "--test-timeout=300000",
            "--test-reporter=spec",
        ])
        .args(files)
        .env("TEASEL_PYTHON", python.program())
        .env("TEASEL_TERMINAL", terminal)
        .env("TEASEL_RECORDINGS", recordings)
        .current_dir(house::root());
    shell::run("node --test", &mut tests)
}

/// Chromium, installed when it is missing and that can be done.
pub fn browser() -> Result<()> {
    let named = env::var_os("TEASEL_CHROMIUM").is_some();
    if !named && BROWSERS.iter().all(|name| shell::find(name).is_none()) {
        packages::install("Chromium runs the page's tests", &["chromium"])?;
    }
    Ok(())
}

/// Builds the terminal program as the tests use it.
pub fn terminal_program() -> Result<PathBuf> {
    shell::run(
        "cargo build",
        shell::cargo().args(["build", "--quiet", "--package", "teasel"]),
    )?;
    let target = env::var_os("CARGO_TARGET_DIR").unwrap_or_else(|| OsString::from("target"));
    Ok(house::root().join(target).join("debug/teasel"))
}
