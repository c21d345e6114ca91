//! The invented demo recordings: made from a seed, with the truth kept beside them.
//!
//! The same seed gives the same recording on every machine: numbers come from a portable generator, every process has its own
//! stream, and the samples are rounded to steps of 0.1 µV (or one count), far above what two mathematics libraries differ by.
mod dish;
mod head;
mod process;
mod watch;

pub use dish::drifting_dish;
pub use watch::night_watch;

use crate::recipe::Recipe;
use crate::recording::Recording;
use serde::{Deserialize, Serialize};

/// The seed of the night watch that the page offers and the files under `demo-data/` hold.
pub const WATCH_SEED: u64 = 2;
/// Why its recipe asks what it asks, in a sentence.
pub const WATCH_WHY: &str = "The demo brings its own question: what follows a buoy from 0.2 to 1.0 s, against the time before it. \
A pass band of 1 to 40 Hz takes drifts, most of the jaw muscle and the mains away; swells are left alone.";

/// The seed of the drifting dish that the page offers.
pub const DISH_SEED: u64 = 3;
/// Why its recipe asks what it asks, in a sentence.
pub const DISH_WHY: &str = "The demo brings its own question: what follows a puff for a second, against the second before it. Lamp, drift and \
bleaching are left in: they are the same on both sides.";

/// A demo recording, what is true about it, and the recipe that asks for it.
#[derive(Debug, Clone)]
pub struct Demo {
    /// As if it had been read from a file.
    pub recording: Recording,
    /// What was planted.
    pub truth: Truth,
    /// A recipe that finds it.
    pub recipe: Recipe,
}

/// What was planted in a demo recording.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Truth {
    /// Names of the channels, in the order of every pattern and filter; empty where the channels are all pixels, row by row.
    pub channels: Vec<String>,
    /// The source that grows after the event.
    pub stronger: Pattern,
    /// The source that falls after the event.
    pub weaker: Pattern,
    /// Sources that are large and do not depend on the event.
    pub nuisance: Vec<Pattern>,
}

/// One source: how it appears on the channels, and how it is best read from them.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Pattern {
    /// What it is.
    pub name: String,
    /// Its frequency, for a rhythm.
    pub hz: Option<f64>,
    /// Its weight on every channel, the largest 1.
    pub pattern: Vec<f64>,
    /// The linear unit-gain filter with the least variance on the whole recording as it stands, without other filters:
    /// w = P⁻¹a / (aᵀP⁻¹a), P the covariance over all samples, a the pattern. Empty for nuisances and for movies.
    pub filter: Vec<f64>,
    /// The source itself, one value a sample, in µV at the channel where its pattern is largest. Not written to JSON.
    #[serde(skip)]
    pub course: Vec<f32>,
}
