//! The steps in order, each in bites that return to the caller, with what is stale recomputed and what still holds kept.
//!
//! ```text
//! Analysis::new(recording, recipe)   step() step() step() … until finished   sheet()
//! set_recipe(changed)                step() …                                sheet()
//! ```
use crate::error::{Kind, Problem, Result};
use crate::recipe::Recipe;
use crate::recording::Recording;
use crate::sheet::Sheet;
use serde::{Deserialize, Serialize};

/// What a step is about.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Stage {
    /// Decoding the file.
    Reading,
    /// Channel matrix, filters, resampling.
    Preparing,
    /// Covariances of the windows.
    Windows,
    /// Compression, both measures, patterns, spectra, courses: after this the sheet holds a first result.
    Fitting,
    /// Held-out ratios, comparators, bootstrap.
    HeldOut,
    /// Ratio against C.
    Curve,
    /// Permutations.
    Permuting,
    /// Nothing left to do.
    Done,
}

/// How far the work is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub struct Progress {
    /// What the last step was about.
    pub stage: Stage,
    /// Units of that stage done.
    pub done: u64,
    /// Units of that stage in all.
    pub of: u64,
    /// The sheet holds something new that is worth drawing.
    pub news: bool,
}

/// One recording, one recipe, and everything computed from them so far.
#[derive(Debug)]
pub struct Analysis {
    recording: Recording,
    recipe: Recipe,
}

/// A contrast proposed for a recording, with the reason in a sentence.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Proposal {
    /// The whole recipe, defaults and all.
    pub recipe: Recipe,
    /// "buoy is the most frequent event (42 times) …"
    pub why: String,
}

/// Proposes a contrast: the most frequent event with at least ten occurrences; signal [0, d), reference [−d, 0),
/// d the smaller of 1 s and half the shortest gap between events. `None` where no event is frequent enough.
pub fn propose(_recording: &Recording) -> Option<Proposal> {
    None
}

impl Analysis {
    /// Begins; computes nothing yet, but refuses recipes that cannot fit the recording (unknown channels or events, rates, ranges).
    pub fn new(recording: Recording, recipe: Recipe) -> Result<Self> {
        Ok(Analysis { recording, recipe })
    }
    /// Takes a changed recipe and drops only what it made stale. On an error nothing changes.
    pub fn set_recipe(&mut self, recipe: Recipe) -> Result<()> {
        self.recipe = recipe;
        Ok(())
    }
    /// Does the next bite of work, about 20 ms of it.
    pub fn step(&mut self) -> Result<Progress> {
        Err(Problem::new(
            Kind::Unsupported,
            "nothing can be computed",
            "wait",
        ))
    }
    /// Whether all work is done.
    pub fn finished(&self) -> bool {
        false
    }
    /// Runs every step.
    pub fn run(&mut self, mut on_progress: impl FnMut(Progress)) -> Result<()> {
        while !self.finished() {
            on_progress(self.step()?);
        }
        Ok(())
    }
    /// Everything known so far.
    pub fn sheet(&self) -> Option<&Sheet> {
        None
    }
    /// The recording.
    pub fn recording(&self) -> &Recording {
        &self.recording
    }
    /// The choices in force.
    pub fn recipe(&self) -> &Recipe {
        &self.recipe
    }
    /// Names and time courses of the reported components over the whole prepared recording, `components × samples`,
    /// and their sampling rate: `stronger 1`, `stronger 2`, …, `weaker 1`, ….
    pub fn series(&self) -> Option<(Vec<String>, Vec<Vec<f64>>, f64)> {
        None
    }
}
