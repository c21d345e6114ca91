//! `cargo xtask …`: everything that is done with this house besides editing it.
//!
//! * `build`: compiles the page's module to WebAssembly, bundles the page and writes `dist/teasel.html`, one file that opens by
//!   double click ([`toolchain`] → [`wasm`] → [`bundle`], with [`node`] for the npm tools).
//! * `serve`: the same, on <http://127.0.0.1:8177>, rebuilt when a source is newer ([`serve`]).
//! * `test`: formatting, lints, Rust tests, type check of the scripts, page tests in Chromium ([`check`]).
//! * `bench`: the budget table, beside the same steps in Python ([`bench`]); `bench --null` calibrates the permutation test.
//! * `demo`: writes the demo recordings with their recipes and truths to `demo-data/` ([`demo`]).
//! * `reference`: makes the check values of `tests/reference` anew with the pinned Python libraries ([`python`]).
//!
//! What is missing is installed where that can be done without asking (npm packages, Python packages, Debian packages for root),
//! and each time said in words before; what cannot be installed is named with the command that installs it.
#![allow(
    clippy::print_stdout,
    reason = "a terminal program: its output is its purpose"
)]
mod bench;
mod bundle;
mod check;
mod demo;
mod house;
mod node;
mod packages;
mod python;
mod serve;
mod shell;
mod toolchain;
mod wasm;

use anyhow::Result;
use clap::{Parser, Subcommand};
use std::process::ExitCode;
use wasm::Finish;

/// Build, serve, test, bench and demo for Teasel.
#[derive(Parser)]
#[command(bin_name = "cargo xtask", disable_help_subcommand = true)]
struct Cli {
    #[command(subcommand)]
    task: Task,
}

#[derive(Subcommand)]
enum Task {
    /// Write dist/teasel.html, the whole page in one file
    Build {
        /// Built in a fraction of the time, larger and slower
        #[arg(long)]
        draft: bool,
    },
    /// Serve the page on 127.0.0.1, rebuilding when a source changes
    Serve {
        /// Port to listen on; 0 takes a free one
        #[arg(long, default_value_t = 8177)]
        port: u16,
        /// Built in a fraction of the time, larger and slower
        #[arg(long)]
        draft: bool,
    },
    /// Formatting, lints, Rust tests, type check, page tests in headless Chromium
    Test {
        /// Only the page tests, on a fresh build
        #[arg(long)]
        page: bool,
        /// On a page built in a fraction of the time, larger and slower
        #[arg(long)]
        draft: bool,
    },
    /// Print the budget table, beside the same steps in Python
    Bench {
        /// Instead: how often p ≤ 0.05 on seeded recordings without an effect
        #[arg(long)]
        null: bool,
        /// Recordings a kind of noise for --null
        #[arg(long, default_value_t = 200)]
        recordings: usize,
    },
    /// Write the demo recordings, recipes and truths to demo-data/
    Demo,
    /// Make the check values of tests/reference anew with the pinned Python libraries
    Reference,
}

fn main() -> ExitCode {
    let done = match Cli::parse().task {
        Task::Build { draft } => {
            bundle::build(Finish::draft(draft)).map(|page| bundle::say_size(&page))
        }
        Task::Serve { port, draft } => serve::serve(port, Finish::draft(draft)),
        Task::Test { page, draft } => check::test(page, Finish::draft(draft)),
        Task::Bench { null, recordings } => {
            if null {
                bench::null(recordings)
            } else {
                bench::table()
            }
        }
        Task::Demo => demo::write(),
        Task::Reference => python::reference(),
    };
    report(done)
}

fn report(done: Result<()>) -> ExitCode {
    match done {
        Ok(()) => ExitCode::SUCCESS,
        Err(problem) => {
            println!("\n{problem:#}");
            ExitCode::FAILURE
        }
    }
}
