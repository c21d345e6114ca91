//! What is known of a recording before a contrast is chosen.
use super::{cards, check_recipe};
use crate::error::Result;
use crate::prepare::inspect;
use crate::recipe::{Contrast, EventWindow, Recipe};
use crate::recording::Recording;
use crate::sheet::{ChannelCard, RecordingCard, Sheet};
use serde::Serialize;

/// The recording and its channels.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Summary {
    /// The recording.
    pub recording: RecordingCard,
    /// Every channel that can be analysed, in file order.
    pub channels: Vec<ChannelCard>,
}

/// Looks at a recording as it stands.
pub fn summary(recording: &Recording) -> Summary {
    let recipe = no_contrast();
    Summary {
        recording: cards::begin(recording, &recipe).recording,
        channels: inspect(recording, &recipe),
    }
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
