//! From recorded channels to the channels that are contrasted: one channel matrix T, linear-phase FIR filters, resampling.
use crate::error::Result;
use crate::recipe::Recipe;
use crate::recording::{Recording, Stretch};
use crate::sheet::{ChannelCard, PreparationCard};
use nalgebra::DMatrix;

/// What the preparation gives.
#[derive(Debug, Clone)]
pub struct Prepared {
    /// Names, in the rows' order.
    pub channels: Vec<String>,
    /// Their unit, where they share one.
    pub unit: String,
    /// Unit-sphere positions, where known.
    pub positions: Vec<Option<[f64; 3]>>,
    /// `prepared × recorded` channel matrix T: w_raw = Tᵀw.
    pub matrix: DMatrix<f64>,
    /// Sampling rate.
    pub rate_hz: f64,
    /// `channels × samples`.
    pub samples: Vec<Vec<f32>>,
    /// Unbroken runs.
    pub stretches: Vec<Stretch>,
    /// For the sheet (its rank is filled in later).
    pub card: PreparationCard,
    /// Warnings, each a sentence.
    pub warnings: Vec<String>,
}

/// Preparation in bites: one channel a step.
#[derive(Debug)]
pub struct Preparing {}

impl Preparing {
    /// Checks the recipe's channels and filter against the recording and builds T and the filters.
    pub fn new(
        _recording: &Recording,
        _channels: &[ChannelCard],
        _recipe: &Recipe,
    ) -> Result<Self> {
        Ok(Preparing {})
    }
    /// Prepared channels done, and in all.
    pub fn progress(&self) -> (usize, usize) {
        (0, 0)
    }
    /// Prepares the next channel; returns false when there is none left.
    pub fn step(&mut self, _recording: &Recording) -> bool {
        false
    }
    /// The result, once every channel is done.
    pub fn finish(self) -> Option<Prepared> {
        None
    }
}

/// Looks at every recorded channel: standard deviation, mains, constant, not-a-number, duplicated; sets positions by name where
/// the recording gives none. One channel a call would be too slow to matter; the whole is about one pass over the samples.
pub fn inspect(_recording: &Recording, _recipe: &Recipe) -> Vec<ChannelCard> {
    Vec::new()
}
