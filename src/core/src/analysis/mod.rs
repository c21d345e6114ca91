//! The steps in order, each in bites that return to the caller, with what is stale recomputed and what still holds kept.
//!
//! ```text
//! Analysis::new(recording, recipe)   step() step() step() … until finished   sheet()
//! set_recipe(changed)                step() …                                sheet()
//! ```
//!
//! The first result (ratio, map, spectra) is on the sheet after [`Stage::Fitting`]; held-out ratios, the permutation test and the
//! ratio against C follow, in this order.
mod cards;
mod describing;
mod propose;
mod summary;
mod work;

use crate::contrast::windows::check;
use crate::error::Result;
use crate::prepare::movie::{Viewing, as_recorded};
use crate::recipe::{Recipe, recipe_check};
use crate::recording::Recording;
use crate::sheet::Sheet;
pub use propose::{Proposal, propose};
use serde::{Deserialize, Serialize};
pub use summary::{Summary, blank, fits, summary};
use work::Work;

/// What a step is about.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
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
    /// Permutations.
    Permuting,
    /// Ratio against C.
    Curve,
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
    /// A movie's pixels being made into channels, and made: everything after works on them.
    viewing: Option<Viewing>,
    viewed: Option<Recording>,
    work: Work,
}

/// Time courses of the reported components over the whole prepared recording.
#[derive(Debug, Clone)]
pub struct Series {
    /// `stronger 1`, `stronger 2`, …, `weaker 1`, ….
    pub names: Vec<String>,
    /// `components × samples`.
    pub samples: Vec<Vec<f64>>,
    /// Their sampling rate.
    pub rate_hz: f64,
    /// Time of every sample on the file's clock is given by its stretch.
    pub stretches: Vec<crate::recording::Stretch>,
}

impl Analysis {
    /// Begins; computes nothing yet, but refuses recipes that cannot fit the recording (unknown events, ranges).
    /// Unknown channels and impossible filters are refused by the first step.
    pub fn new(recording: Recording, recipe: Recipe) -> Result<Self> {
        check_recipe(&recipe, &recording)?;
        let viewing = Viewing::new(&recording, &recipe.movie)?;
        let mut work = Work::new(&recording, &recipe);
        work.sheet.movie = as_recorded(&recording);
        Ok(Analysis {
            recording,
            recipe,
            viewing,
            viewed: None,
            work,
        })
    }

    /// Takes a changed recipe and drops only what it made stale. On an error nothing changes.
    pub fn set_recipe(&mut self, recipe: Recipe) -> Result<()> {
        check_recipe(&recipe, &self.recording)?;
        if recipe.movie != self.recipe.movie {
            // Other pixels are other channels: nothing that was computed holds.
            self.viewing = Viewing::new(&self.recording, &recipe.movie)?;
            self.viewed = None;
            let known = self.work.sheet.movie.take();
            self.work = Work::new(&self.recording, &recipe);
            self.work.sheet.movie = match &self.viewing {
                Some(_) => known,
                None => as_recorded(&self.recording),
            };
        } else if self.viewing.is_some() {
            self.work.sheet.recipe = recipe.clone();
        } else {
            let recording = self.viewed.as_ref().unwrap_or(&self.recording);
            self.work.change(recording, &self.recipe, &recipe)?;
        }
        self.recipe = recipe;
        Ok(())
    }

    /// Does the next bite of work, about 20 ms of it. After an error the same step fails again until the recipe changes.
    pub fn step(&mut self) -> Result<Progress> {
        if self.viewing.is_some() {
            return self.view();
        }
        let recording = self.viewed.as_ref().unwrap_or(&self.recording);
        self.work.step(recording, &self.recipe)
    }

    /// A bite of making a movie's pixels into channels.
    fn view(&mut self) -> Result<Progress> {
        let (done, of) = match &mut self.viewing {
            Some(viewing) => {
                viewing.step(&self.recording)?;
                viewing.progress()
            }
            None => (1, 1),
        };
        let finished = self.viewing.take_if(|viewing| viewing.finished());
        let news = finished.is_some();
        if let Some(viewing) = finished {
            let (viewed, card) = viewing.finish(&self.recording);
            self.work = Work::new(&viewed, &self.recipe);
            self.work.sheet.movie = Some(card);
            self.viewed = Some(viewed);
        }
        Ok(Progress {
            stage: Stage::Preparing,
            done,
            of,
            news,
        })
    }

    /// Whether all work is done.
    pub fn finished(&self) -> bool {
        self.viewing.is_none() && self.work.finished(&self.recipe)
    }

    /// Runs every step.
    pub fn run(&mut self, mut on_progress: impl FnMut(Progress)) -> Result<()> {
        while !self.finished() {
            on_progress(self.step()?);
        }
        Ok(())
    }

    /// Everything known so far.
    pub fn sheet(&self) -> &Sheet {
        &self.work.sheet
    }

    /// The recording that is contrasted: of a movie, the one whose channels are the pixels in use, once they are made.
    pub fn recording(&self) -> &Recording {
        self.viewed.as_ref().unwrap_or(&self.recording)
    }

    /// Gives the recording back, to be analysed with something else.
    pub fn into_recording(self) -> Recording {
        self.recording
    }

    /// The choices in force.
    pub fn recipe(&self) -> &Recipe {
        &self.recipe
    }

    /// Time courses of the reported components, once there are any.
    pub fn series(&self) -> Option<Series> {
        self.work.series()
    }
}

/// Refuses ranges that no recording makes sense of, and events that this one does not hold.
fn check_recipe(recipe: &Recipe, recording: &Recording) -> Result<()> {
    recipe_check(recipe)?;
    check(&recipe.contrast, &recording.events, recording.rate_hz)
}
