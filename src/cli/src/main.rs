//! Teasel from a terminal: the page's pipeline for many recordings, and for checking.
//!
//! * `source`: recordings and side files on disk.
//! * `run`, `gather`, `apply`, `clean`, `inspect`: the commands.
//! * `folder`: files written beside their place and renamed, so that none is ever seen half written.
//! * `say`: lines and progress on standard error.
//!
//! Exit codes: 0 done, 1 bad input (one line each on standard error; the other recordings of the call still run), 2 usage.
mod apply;
mod clean;
mod figures;
mod folder;
mod gather;
mod inspect;
mod run;
mod say;
mod source;

use clap::{Args, Parser, Subcommand};
use std::path::PathBuf;
use std::process::ExitCode;
use teasel_core::recipe::{self, Axes};
use teasel_core::recording::natural_order;

const EXAMPLE: &str = "\
Example:
  teasel inspect night-watch.edf
  teasel run recipe.json night-watch.edf --out results
  teasel run recipe.json monday.edf tuesday.edf wednesday.edf --out results
  teasel gather results
  teasel clean recipe.json night-watch.edf --remove 'stronger 1' --out cleaned
  teasel apply results/night-watch/weights.json another-night.edf --out carried

A recipe that suffices:
  { \"teasel_recipe\": 1,
    \"contrast\": { \"kind\": \"windows\",
      \"signal\":    { \"event\": \"buoy\", \"from_s\": 0.2, \"to_s\": 1.0 },
      \"reference\": { \"event\": \"buoy\", \"from_s\": -1.0, \"to_s\": -0.2 } } }

Exit codes: 0 done, 1 bad input (one line for each file on standard error; the others still run), 2 usage.

Teasel is for research. It makes no diagnosis and replaces no licensed reading of a recording.";

/// Spatial filters that tell signal windows from reference windows, with the evidence for them.
#[derive(Parser)]
#[command(name = "teasel", version, after_help = EXAMPLE, arg_required_else_help = true)]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    /// Compute what a recipe asks of each recording.
    Run {
        /// The recipe (JSON).
        recipe: PathBuf,
        #[command(flatten)]
        given: Given,
        /// Folder for the results; each recording gets a folder of its name in it.
        #[arg(long, value_name = "DIR")]
        out: PathBuf,
        /// Seed of everything drawn, in place of the recipe's.
        #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(..=9_007_199_254_740_991))]
        seed: Option<u64>,
    },
    /// Make the table and the group of recordings that were run one process each.
    Gather {
        /// The folder that the runs wrote to (their --out).
        folder: PathBuf,
    },
    /// Apply the filters of a weights file to each recording.
    Apply {
        /// The weights (weights.json of a run).
        weights: PathBuf,
        #[command(flatten)]
        given: Given,
        /// A recipe with event windows: says whether the filters, as they are, still separate them here (carried.csv).
        #[arg(long, value_name = "FILE")]
        recipe: Option<PathBuf>,
        /// Folder for the time courses; each recording gets a folder of its name in it.
        #[arg(long, value_name = "DIR")]
        out: PathBuf,
    },
    /// Take components out of each recording (or keep nothing but them): X − A WᵀX in the prepared channels.
    Clean {
        /// The recipe that finds the components (JSON).
        recipe: PathBuf,
        #[command(flatten)]
        given: Given,
        /// A component to take out: 'stronger 1', 'weaker 2' (repeatable).
        #[arg(
            long,
            value_name = "COMPONENT",
            required_unless_present = "only",
            conflicts_with = "only"
        )]
        remove: Vec<String>,
        /// A component to keep while all else is taken out (repeatable).
        #[arg(long, value_name = "COMPONENT")]
        only: Vec<String>,
        /// What is written: EDF+ with events, or a NumPy array of channels × samples in f32.
        #[arg(long = "as", value_enum, default_value = "edf")]
        form: clean::Written,
        /// Folder for the results; each recording gets a folder of its name in it.
        #[arg(long, value_name = "DIR")]
        out: PathBuf,
    },
    /// Say what a recording holds, and propose a recipe for it.
    Inspect {
        #[command(flatten)]
        given: Given,
        /// Write JSON.
        #[arg(long)]
        json: bool,
    },
}

/// Recordings, and how they are opened.
#[derive(Args)]
struct Given {
    /// The recordings.
    #[arg(required = true, value_name = "RECORDING")]
    recordings: Vec<PathBuf>,
    /// A side file that does not lie beside the recording under its BIDS name (repeatable).
    #[arg(long = "with", value_name = "FILE")]
    with: Vec<PathBuf>,
    /// Open the whole records before a cut or other damage.
    #[arg(long)]
    salvage: bool,
    /// The recordings are files of one: join them in the natural order of their names.
    #[arg(long)]
    joined: bool,
    /// Memory that an open recording may take, in MiB; of a larger one only what the windows need is kept, and no series is written.
    #[arg(long, value_name = "MIB", value_parser = clap::value_parser!(u64).range(1..=1_048_576))]
    memory: Option<u64>,
    #[command(flatten)]
    told: Told,
}

impl Given {
    /// What is worked on: each recording, or the first of the files that are joined.
    fn each(&self) -> Vec<PathBuf> {
        let mut paths = self.recordings.clone();
        if self.joined {
            paths.sort_by(|a, b| natural_order(&source::file_name(a), &source::file_name(b)));
            paths.truncate(1);
        }
        paths
    }
}

/// What a file of a general format does not carry; each comes before the recipe's `recording` and before side files.
#[derive(Args)]
struct Told {
    /// Samples a second, or frames.
    #[arg(long, value_name = "HZ", allow_negative_numbers = true)]
    rate: Option<f64>,
    /// Unit of the samples: uV, mV, V, nV, fT, counts, or any other.
    #[arg(long, value_name = "UNIT")]
    unit: Option<String>,
    /// What the axes of an array are, in the order of its sizes: channels,samples or samples,channels, frames,height,width or height,width,frames.
    #[arg(long, value_name = "AXES", value_parser = axes)]
    axes: Option<Axes>,
    /// Which of several named arrays holds the samples.
    #[arg(long, value_name = "NAME")]
    array: Option<String>,
}

impl Told {
    /// As a recipe has it.
    fn given(&self) -> recipe::Given {
        recipe::Given {
            rate_hz: self.rate,
            unit: self.unit.clone(),
            axes: self.axes,
            variable: self.array.clone(),
            events: None,
        }
    }
}

fn axes(text: &str) -> Result<Axes, String> {
    let names = Axes::ALL.map(Axes::name);
    let found = Axes::ALL.into_iter().find(|axes| axes.name() == text);
    found.ok_or_else(|| format!("one of {} is expected", names.join(" or ")))
}

fn main() -> ExitCode {
    let fine = match Arguments::parse().command {
        Command::Run {
            recipe,
            given,
            out,
            seed,
        } => run::run(&recipe, &given, &out, seed),
        Command::Apply {
            weights,
            given,
            recipe,
            out,
        } => apply::apply(&weights, &given, recipe.as_deref(), &out),
        Command::Clean {
            recipe,
            given,
            remove,
            only,
            form,
            out,
        } => clean::clean(&recipe, &given, &remove, &only, form, &out),
        Command::Gather { folder } => gather::gather(&folder),
        Command::Inspect { given, json } => inspect::inspect(&given, json),
    };
    if fine {
        ExitCode::SUCCESS
    } else {
        ExitCode::from(1)
    }
}
