//! A recording whose samples stay in the file: which of them a recipe needs, and what is known without them.
//!
//! The windows are found on the stretches of the whole recording, so that reasons, folds and exchanges are those of the whole; then the
//! samples around them are read as islands ([`crate::recording::large`]), wide enough that no filter's edge reaches a window, and on
//! the whole's own grid of resampling. What is computed from a window is therefore what the whole recording would give, to rounding.
use crate::contrast::windows::{Selection, select};
use crate::error::{Kind, Problem, Result};
use crate::prepare::{Reach, inspect, reach};
use crate::recipe::{Contrast, Recipe, Reference};
use crate::recording::large::{Gathering, Large, inside, stretch_of};
use crate::recording::{Recording, Stretch};
use crate::sheet::{ChannelCard, ChannelState, RecordingCard};
use std::ops::Range;

/// Bytes that the islands may take; the preparation needs as much again.
pub(super) const ISLAND_BYTES: u64 = if cfg!(target_pointer_width = "32") {
    176 << 20
} else {
    4 << 30
};
/// Seconds around the windows of a trial that courses are drawn over, with what their smoothing needs.
const AROUND_S: f64 = 0.75;
/// Islands begin and end on multiples of this, so that a window's edge can be moved a little without reading again.
const STEP_S: f64 = 1.0;

/// The part of a large recording that a recipe needs.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Islands {
    pub(super) ranges: Vec<Range<usize>>,
    pub(super) wanted: Vec<bool>,
    reach: Reach,
}

/// What stands of the whole while only islands of it are in memory.
#[derive(Debug, Clone)]
pub(super) struct Standing {
    /// The recording as the sheet shows it.
    pub(super) card: RecordingCard,
    /// The channels.
    pub(super) cards: Vec<ChannelCard>,
    /// The stretches of the whole, prepared.
    pub(super) whole: Vec<Stretch>,
    /// Of each island the prepared samples of the whole that it holds.
    pub(super) islands: Vec<Range<usize>>,
}

/// Everything that is needed of a recording whose samples stay in the file.
#[derive(Debug)]
pub(super) struct Ashore {
    pub(super) large: Large,
    pub(super) islands: Islands,
    pub(super) gathering: Option<Gathering>,
}

impl Ashore {
    pub(super) fn new(large: Large, islands: Islands) -> Self {
        Ashore {
            gathering: Some(islands.gathering(&large)),
            large,
            islands,
        }
    }

    /// Begins to read other islands.
    pub(super) fn turn(&mut self, islands: Islands) {
        self.gathering = Some(islands.gathering(&self.large));
        self.islands = islands;
    }

    /// See [`Standing`].
    pub(super) fn standing(&self, recipe: &Recipe) -> Standing {
        let outline = self.large.outline();
        let read: usize = self.islands.ranges.iter().map(Range::len).sum();
        let mut card = super::cards::begin(outline, recipe).recording;
        card.envelope = self.large.envelope().to_vec();
        card.warnings.push(format!(
            "The recording is larger than the memory for it: {} of {} s were read, those that the windows need, and the channels were looked at in {} s of it.",
            (read as f64 / outline.rate_hz).round(),
            outline.duration_s().round(),
            self.large.middle().duration_s().round()
        ));
        Standing {
            card,
            cards: look(&self.large, recipe),
            whole: self.islands.reach.stretches.clone(),
            islands: self.islands.prepared(outline),
        }
    }
}

/// The cards of a large recording's channels: standard deviations of all samples, everything else from its middle.
pub(super) fn look(large: &Large, recipe: &Recipe) -> Vec<ChannelCard> {
    let mut cards = inspect(large.middle(), recipe);
    for (card, sd) in cards.iter_mut().zip(large.sds()) {
        let constant_in_the_middle =
            matches!(&card.state, ChannelState::Unusable(why) if why == "constant");
        card.sd = Some(*sd);
        if *sd == 0.0 && !matches!(card.state, ChannelState::LeftOut) {
            card.state = ChannelState::Unusable("constant".to_owned());
        } else if *sd > 0.0 && constant_in_the_middle {
            card.state =
                ChannelState::NeedsALook("constant in the middle of the recording".to_owned());
        }
    }
    cards
}

impl Islands {
    fn gathering(&self, large: &Large) -> Gathering {
        large.gathering(self.ranges.clone(), self.wanted.clone())
    }

    /// Of each island the samples of the whole preparation that it holds.
    fn prepared(&self, outline: &Recording) -> Vec<Range<usize>> {
        let Reach {
            grid,
            prepared_grid,
            stretches,
            ..
        } = &self.reach;
        (self.ranges.iter())
            .filter_map(|range| {
                let at = outline
                    .stretches
                    .partition_point(|s| s.first + s.count <= range.start);
                let (recorded, prepared) = (outline.stretches.get(at)?, stretches.get(at)?);
                let steps = (range.start - recorded.first) / grid;
                let first = prepared.first + steps * prepared_grid;
                let count = (range.len() as u64 * *prepared_grid as u64).div_ceil(*grid as u64);
                Some(first..first + count as usize)
            })
            .collect()
    }
}

/// A selection made on the whole, with its windows where the islands hold them.
pub(super) fn moved(mut selection: Selection, islands: &[Range<usize>]) -> Option<Selection> {
    let mut firsts = Vec::with_capacity(islands.len());
    let mut next = 0;
    for island in islands {
        firsts.push(next);
        next += island.len();
    }
    for window in &mut selection.windows {
        let at = islands
            .partition_point(|island| island.start <= window.first)
            .checked_sub(1)?;
        if window.first + window.count > islands[at].end {
            return None;
        }
        window.first = firsts[at] + (window.first - islands[at].start);
    }
    Some(selection)
}

/// The samples that a recipe needs.
///
/// # Errors
/// What the windows or the preparation refuse; `TooLarge` where what they need does not fit into the memory, or the question needs the whole.
pub(super) fn islands(outline: &Recording, recipe: &Recipe) -> Result<Islands> {
    if matches!(
        recipe.contrast,
        Contrast::Band { .. } | Contrast::Slow { .. }
    ) {
        return Err(Problem::new(
            Kind::TooLarge,
            "this question needs all samples in the memory, and the recording is larger than it",
            "ask about windows or marked spans, or cut the recording into shorter files first",
        )
        .at("contrast"));
    }
    let reach = reach(&outline.stretches, recipe, outline.rate_hz)?;
    if reach.whole {
        return Err(Problem::new(
            Kind::TooLarge,
            "a trend and fitted mains are taken off whole stretches, and these do not fit into the memory",
            "use a high-pass and a notch instead",
        )
        .at("filter"));
    }
    let selection = select(recipe, &outline.events, &reach.stretches, reach.rate_hz)?;
    let mut spans: Vec<(f64, f64)> = Vec::with_capacity(selection.windows.len());
    for window in &selection.windows {
        let Some(stretch) = stretch_of(&reach.stretches, window.first) else {
            continue;
        };
        let from = stretch.onset_s + (window.first - stretch.first) as f64 / reach.rate_hz;
        let long = window.count as f64 / reach.rate_hz;
        // Courses are drawn around both windows of a trial and around its event, and as far before it as the window is long.
        let low = from.min(window.onset_s - long);
        let high = (from + long).max(window.onset_s);
        // A window far from its event has no course that reaches from one to the other.
        let near = high - low <= 20.0 * long + 20.0;
        spans.push(if near {
            (low, high)
        } else {
            (from, from + long)
        });
    }
    // Both windows of a trial lie in one span, and what is between them.
    let mut by_trial: Vec<(f64, f64)> = Vec::new();
    if selection.paired {
        for pair in spans.chunks(2) {
            let low = pair.iter().map(|s| s.0).fold(f64::INFINITY, f64::min);
            let high = pair.iter().map(|s| s.1).fold(f64::NEG_INFINITY, f64::max);
            by_trial.push((low, high));
        }
    } else {
        by_trial = spans;
    }
    let mut ranges: Vec<Range<usize>> = by_trial
        .iter()
        .flat_map(|(low, high)| inside(outline, low - AROUND_S, high + AROUND_S))
        .filter_map(|range| widened(range, outline, &reach))
        .collect();
    ranges.sort_unstable_by_key(|r| r.start);
    let ranges = joined(ranges, &outline.stretches);
    let left_out = &recipe.channels.leave_out;
    let in_reference = |name: &String| match &recipe.channels.reference {
        Reference::Named(names) => names.contains(name),
        Reference::Bipolar(_) => true,
        Reference::Word(_) => false,
    };
    let wanted: Vec<bool> = (outline.channels.iter())
        .map(|c| !left_out.contains(&c.name) || in_reference(&c.name))
        .collect();
    let islands = Islands {
        ranges,
        wanted,
        reach,
    };
    afford(&islands, outline)?;
    Ok(islands)
}

/// With the margin on both sides, on the grid, inside the stretch.
fn widened(range: Range<usize>, outline: &Recording, reach: &Reach) -> Option<Range<usize>> {
    let stretch = stretch_of(&outline.stretches, range.start)?;
    let step = ((STEP_S * outline.rate_hz) as usize / reach.grid).max(1) * reach.grid;
    let from = (range.start - stretch.first).saturating_sub(reach.margin) / step * step;
    let to = (range.end - stretch.first + reach.margin).div_ceil(step) * step;
    Some(stretch.first + from..stretch.first + to.min(stretch.count))
}

/// Ranges in order, those that touch made one where no gap lies between.
fn joined(ranges: Vec<Range<usize>>, stretches: &[Stretch]) -> Vec<Range<usize>> {
    let mut out: Vec<Range<usize>> = Vec::with_capacity(ranges.len());
    for range in ranges {
        let same = |last: &&mut Range<usize>| {
            let ends = stretch_of(stretches, last.start).map_or(0, |s| s.first + s.count);
            range.start <= last.end && range.start < ends
        };
        match out.last_mut().filter(|last| same(last)) {
            Some(last) => last.end = last.end.max(range.end),
            None => out.push(range),
        }
    }
    out
}

fn afford(islands: &Islands, outline: &Recording) -> Result<()> {
    let samples: u64 = islands.ranges.iter().map(|r| r.len() as u64).sum();
    let channels = islands.wanted.iter().filter(|w| **w).count();
    let bytes = samples * channels as u64 * size_of::<f32>() as u64;
    if bytes <= ISLAND_BYTES {
        return Ok(());
    }
    let seconds = |bytes: u64| bytes as f64 / (4.0 * channels as f64) / outline.rate_hz;
    Err(Problem::new(
        Kind::TooLarge,
        "the parts of the recording that the windows need do not fit into the memory",
        "use fewer events, shorter windows or fewer channels, or cut the recording into shorter files first",
    )
    .at(format!("{channels} channels around the windows"))
    .expected_found(
        format!("at most {:.0} s", seconds(ISLAND_BYTES).floor()),
        format!("{:.0} s", seconds(bytes)),
    ))
}
