//! The steps in order, each in bites that return to the caller, with what is stale recomputed and what still holds kept.
//!
//! ```text
//! Analysis::new(recording, recipe)   step() step() step() … until finished   sheet()
//! set_recipe(changed)                step() …                                sheet()
//! ```
//!
//! The first result (ratio, map, spectra) is on the sheet after [`Stage::Fitting`]; held-out ratios, the permutation test, the
//! ratio against C and pictures over time and frequency follow, in this order.
mod cards;
mod describing;
mod islands;
pub mod lines;
mod opened;
mod portrait;
mod propose;
mod summary;
mod work;

use crate::contrast::windows::check;
use crate::describe::placing;
use crate::error::Result;
use crate::prepare::movie::{Viewing, as_recorded};
use crate::recipe::{Recipe, recipe_check};
use crate::recording::{Large, Recording};
use crate::sheet::Sheet;
use islands::Ashore;
pub use propose::{Proposal, propose};
use serde::{Deserialize, Serialize};
pub use summary::{Summary, blank, fits, fits_large, summary, summary_of_large};
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
    /// Power over time and frequency of every component.
    Picturing,
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
    /// Where the samples stay in the file: `recording` then holds islands of them.
    ashore: Option<Box<Ashore>>,
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
            ashore: None,
        })
    }

    /// The same for a recording whose samples stay in the file: the first steps read what the recipe needs of it ([`Stage::Reading`]).
    ///
    /// # Errors
    /// Those of [`Analysis::new`]; `TooLarge` where what the windows need does not fit into the memory. Ask [`fits_large`] first to keep the
    /// recording.
    pub fn of_large(large: Large, recipe: Recipe) -> Result<Self> {
        check_recipe(&recipe, large.outline())?;
        let islands = islands::islands(large.outline(), &recipe)?;
        let ashore = Ashore::new(large, islands);
        let recording = ashore.large.outline().clone();
        let work = Work::on_islands(&recording, &recipe, ashore.standing(&recipe));
        Ok(Analysis {
            recording,
            recipe,
            viewing: None,
            viewed: None,
            work,
            ashore: Some(Box::new(ashore)),
        })
    }

    /// The recording whose samples stay in the file, if this is one.
    pub fn large(&mut self) -> Option<&mut Large> {
        self.ashore.as_mut().map(|ashore| &mut ashore.large)
    }

    /// A changed recipe where the samples stay in the file: reads again where other samples are needed.
    fn turn(&mut self, recipe: Recipe) -> Result<()> {
        let Some(ashore) = &mut self.ashore else {
            return Ok(());
        };
        let islands = islands::islands(ashore.large.outline(), &recipe)?;
        let prepared =
            self.recipe.channels == recipe.channels && self.recipe.filter == recipe.filter;
        let whole = ashore.gathering.is_none() && islands == ashore.islands;
        if whole && prepared {
            self.work.change(&self.recording, &self.recipe, &recipe)?;
        } else {
            if !whole {
                // The islands of before make room first.
                self.recording = ashore.large.outline().clone();
                ashore.turn(islands);
            }
            let standing = ashore.standing(&recipe);
            self.work = Work::on_islands(&self.recording, &recipe, standing);
        }
        self.recipe = recipe;
        Ok(())
    }

    /// Reads the next slice of the islands; `None` where nothing is to be read.
    fn gather(&mut self) -> Result<Option<Progress>> {
        let Some(ashore) = &mut self.ashore else {
            return Ok(None);
        };
        let Some(mut gathering) = ashore.gathering.take() else {
            return Ok(None);
        };
        let read = ashore.large.gather(&mut gathering);
        let (done, of) = gathering.progress();
        if *read.as_ref().unwrap_or(&false) {
            self.recording = ashore.large.gathered(gathering);
            let standing = ashore.standing(&self.recipe);
            self.work = Work::on_islands(&self.recording, &self.recipe, standing);
        } else {
            ashore.gathering = Some(gathering);
        }
        read.map(|_| {
            Some(Progress {
                stage: Stage::Reading,
                done,
                of,
                news: false,
            })
        })
    }

    /// Takes a changed recipe and drops only what it made stale. On an error nothing changes.
    pub fn set_recipe(&mut self, recipe: Recipe) -> Result<()> {
        check_recipe(&recipe, &self.recording)?;
        if self.ashore.is_some() {
            return self.turn(recipe);
        }
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
        if let Some(progress) = self.gather()? {
            return Ok(progress);
        }
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
        let reading = |ashore: &Ashore| ashore.gathering.is_some();
        self.viewing.is_none()
            && !self.ashore.as_deref().is_some_and(reading)
            && self.work.finished(&self.recipe)
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

    /// The recording as it was opened: of a movie, every pixel.
    pub fn recorded(&self) -> &Recording {
        &self.recording
    }

    /// Gives the recording back, to be analysed with something else.
    pub fn into_recording(self) -> Recording {
        self.recording
    }

    /// The choices in force.
    pub fn recipe(&self) -> &Recipe {
        &self.recipe
    }

    /// The prepared channels, once they are there.
    pub fn prepared(&self) -> Option<&crate::prepare::Prepared> {
        self.work.prepared.as_ref()
    }

    /// Samples of prepared channel `index` (in the order of [`Prepared::channels`](crate::prepare::Prepared::channels)), once they are
    /// there; where there are so many channels that `prepared` holds the samples of a basis, those of the channel all the same.
    pub fn channel(&self, index: usize) -> Option<&[f32]> {
        self.work.channel(self.recording(), index)
    }

    /// Part of the time course of one component (stronger first, then weaker), over prepared samples.
    pub fn series_of(&self, component: usize, range: std::ops::Range<usize>) -> Option<Vec<f64>> {
        let prepared = self.work.prepared.as_ref()?;
        let filter = self.work.inner_filters().nth(component)?;
        let mut out = vec![0.0; range.len()];
        for (weight, channel) in filter.iter().zip(&prepared.samples) {
            for (y, x) in out.iter_mut().zip(channel.get(range.clone())?) {
                *y += weight * f64::from(*x);
            }
        }
        Some(out)
    }

    /// Time courses of the reported components over the whole recording, once there are any; never where the samples stay in the file.
    pub fn series(&self) -> Option<Series> {
        if self.ashore.is_some() {
            return None;
        }
        self.work.series()
    }
}

/// Refuses ranges that no recording makes sense of, and events that this one does not hold.
fn check_recipe(recipe: &Recipe, recording: &Recording) -> Result<()> {
    recipe_check(recipe)?;
    placing::check(recording, &recipe.channels)?;
    check(&recipe.contrast, &recording.events, recording.rate_hz)
}
