//! What is known of a recording before a contrast is chosen.
use super::{cards, check_recipe, islands};
use crate::error::Result;
use crate::prepare::inspect;
use crate::recipe::{Contrast, EventWindow, Recipe};
use crate::recording::{Large, Recording};
use crate::sheet::{ChannelCard, RecordingCard, Sheet};
use serde::Serialize;

/// The recording and its channels.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Summary {
    /// The recording.
    pub recording: RecordingCard,
    /// Every channel that can be analysed, in file order.
    pub channels: Vec<ChannelCard>,
    /// The samples stay in the file; bytes that the part of them may take which a recipe needs, with its preparation.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub part_bytes: Option<u64>,
}

/// Looks at a recording as it stands.
pub fn summary(recording: &Recording) -> Summary {
    let recipe = no_contrast();
    Summary {
        recording: cards::begin(recording, &recipe).recording,
        channels: inspect(recording, &recipe),
        part_bytes: None,
    }
}

/// Looks at a recording whose samples stay in the file.
pub fn summary_of_large(large: &Large) -> Summary {
    let recipe = no_contrast();
    let mut recording = cards::begin(large.outline(), &recipe).recording;
    recording.envelope = large.envelope().to_vec();
    Summary {
        recording,
        channels: islands::look(large, &recipe),
        part_bytes: Some(2 * islands::ISLAND_BYTES),
    }
}

/// What [`super::Analysis::of_large`] would refuse, without giving the recording away.
///
/// # Errors
/// Those of [`super::Analysis::of_large`].
pub fn fits_large(large: &Large, recipe: &Recipe) -> Result<()> {
    check_recipe(recipe, large.outline())?;
    islands::islands(large.outline(), recipe).map(|_| ())
}

/// What [`super::Analysis::new`] would refuse, without giving the recording away.
///
/// # Errors
/// Those of [`super::Analysis::new`].
pub fn fits(recording: &Recording, recipe: &Recipe) -> Result<()> {
    check_recipe(recipe, recording)
}

/// A sheet that knows a recording and a recipe, and no result.
pub fn blank(recording: &Recording, recipe: &Recipe) -> Sheet {
    cards::begin(recording, recipe)
}

fn no_contrast() -> Recipe {
    Recipe::asking(Contrast::Windows {
        signal: EventWindow::default(),
        reference: EventWindow::default(),
    })
}
