//! A first look at every recorded channel.
use crate::describe::placing::placed;
use crate::describe::welch::Welch;
use crate::recipe::Recipe;
use crate::recording::{Recording, Stretch};
use crate::sheet::{ChannelCard, ChannelState};
use std::collections::HashMap;

/// Frequencies that mains may have.
const MAINS_HZ: [f64; 2] = [50.0, 60.0];
/// Seconds of the longest stretch, from its middle, that the mains ratio is measured on.
const MAINS_SECONDS: f64 = 60.0;
/// Half width of what counts as mains: the main lobe of the window at 2-second segments.
const MAINS_HALF_WIDTH_HZ: f64 = 1.0;
/// Distances of the neighbours.
const NEIGHBOURS_HZ: std::ops::RangeInclusive<f64> = 3.0..=8.0;

/// Looks at every recorded channel: standard deviation, mains, constant, not-a-number, duplicated; sets positions by name where
/// the recording gives none. One channel a call would be too slow to matter; the whole is about one pass over the samples.
///
/// # Standard deviation
/// About the mean of each stretch; the sum of squares over all stretches is divided by samples less stretches.
///
/// # Mains
/// Welch density in 2-second segments over at most 60 s from the middle of the longest stretch: mean within 1 Hz of 50 (60) Hz over the mean
/// 3–8 Hz away on both sides; the frequency that a side file gives, else the larger of the two. `None` where half the rate is too low or the stretch shorter than 2 s.
///
/// # State
/// What the recipe says comes first: left out, interpolated, or set aside by a side file and not kept. Then unusable: a value that is not a finite number, or every stretch constant.
/// Then a doubt: the same samples as an earlier channel in use.
///
/// # Positions
/// See [`placed`].
pub fn inspect(recording: &Recording, recipe: &Recipe) -> Vec<ChannelCard> {
    let mut mains = Mains::new(recording);
    let (_, positions) = placed(recording, &recipe.channels);
    let mut same = Same::default();
    let channels = recording.channels.iter().zip(&recording.samples);
    channels
        .zip(positions)
        .enumerate()
        .map(|(index, ((channel, samples), position))| {
            let spread = spread(samples, &recording.stretches);
            let (mains_hz, mains_db) = match (&spread, &mut mains) {
                (Some(sd), Some(mains)) if *sd > 0.0 => mains.ratio(samples),
                _ => None,
            }
            .unzip();
            let state = state_by_recipe(&channel.name, recording, recipe)
                .or_else(|| unusable(spread))
                .or_else(|| same.seen(index, spread, recording))
                .unwrap_or(ChannelState::Used);
            ChannelCard {
                name: channel.name.clone(),
                unit: channel.unit.clone(),
                sd: spread,
                mains_db,
                mains_hz,
                state,
                position,
            }
        })
        .collect()
}

fn state_by_recipe(name: &str, recording: &Recording, recipe: &Recipe) -> Option<ChannelState> {
    let named = |list: &[String]| list.iter().any(|n| n == name);
    let aside = recording.about.aside.contains_key(name);
    if named(&recipe.channels.leave_out) {
        Some(ChannelState::LeftOut)
    } else if named(&recipe.channels.interpolate) {
        Some(ChannelState::Interpolated)
    } else if aside && !named(&recipe.channels.keep) {
        Some(ChannelState::LeftOut)
    } else {
        None
    }
}

fn unusable(spread: Option<f64>) -> Option<ChannelState> {
    let reason = match spread {
        None => "holds values that are not numbers",
        Some(0.0) => "constant",
        Some(_) => return None,
    };
    Some(ChannelState::Unusable(reason.to_owned()))
}

/// Standard deviation about each stretch's mean: exactly 0 for constant stretches, `None` where a value is not finite.
fn spread(samples: &[f32], stretches: &[Stretch]) -> Option<f64> {
    let (mut squares, mut freedom) = (0.0, 0usize);
    for stretch in stretches {
        let Some(part) = samples.get(stretch.first..stretch.first + stretch.count) else {
            continue;
        };
        let Some((&first, rest)) = part.split_first() else {
            continue;
        };
        // About the first sample: a large offset costs no digits, and a constant gives exactly 0.
        let (sum, square) = sums(part, f64::from(first));
        if !square.is_finite() {
            return None;
        }
        squares += (square - sum * sum / part.len() as f64).max(0.0);
        freedom += rest.len();
    }
    Some(if freedom > 0 {
        (squares / freedom as f64).sqrt()
    } else {
        0.0
    })
}

/// Sum and sum of squares of the distances from `origin`, in four sums side by side.
fn sums(samples: &[f32], origin: f64) -> (f64, f64) {
    let (mut sum, mut square) = ([0.0; 4], [0.0; 4]);
    let fours = samples.chunks_exact(4);
    let rest = fours.remainder();
    for four in fours.chain(std::iter::once(rest)) {
        for (k, &value) in four.iter().enumerate() {
            let away = f64::from(value) - origin;
            sum[k] += away;
            square[k] += away * away;
        }
    }
    (sum.iter().sum(), square.iter().sum())
}

/// Finds channels with the very same samples.
#[derive(Debug, Default)]
struct Same {
    /// From the bits of the standard deviation, which equal samples share, to the channels that have it.
    by_spread: HashMap<u64, Vec<usize>>,
}

impl Same {
    fn seen(
        &mut self,
        index: usize,
        spread: Option<f64>,
        recording: &Recording,
    ) -> Option<ChannelState> {
        let samples = &recording.samples[index];
        let before = self.by_spread.entry(spread?.to_bits()).or_default();
        let twin = before
            .iter()
            .find(|&&other| recording.samples[other] == *samples);
        let state = twin.map(|&other| {
            ChannelState::NeedsALook(format!("the same as {}", recording.channels[other].name))
        });
        before.push(index);
        state
    }
}

/// Measures mains on one part of every channel.
struct Mains {
    welch: Welch,
    hz: Vec<f64>,
    part: std::ops::Range<usize>,
    /// The frequency that a side file gives, or both that mains may have.
    candidates: Vec<f64>,
    rate_hz: f64,
    buffer: Vec<f64>,
}

impl Mains {
    fn new(recording: &Recording) -> Option<Self> {
        let rate_hz = recording.rate_hz;
        let longest = recording.stretches.iter().max_by_key(|s| s.count)?;
        let segment = (2.0 * rate_hz).round() as usize & !1;
        if segment < 16 || longest.count < segment {
            return None;
        }
        let count = longest
            .count
            .min((MAINS_SECONDS * rate_hz) as usize)
            .max(segment);
        let first = longest.first + (longest.count - count) / 2;
        let welch = Welch::new(segment, rate_hz);
        Some(Mains {
            hz: welch.frequencies(),
            welch,
            part: first..first + count,
            candidates: match recording.about.mains_hz {
                Some(hz) => vec![hz],
                None => MAINS_HZ.to_vec(),
            },
            rate_hz,
            buffer: Vec::new(),
        })
    }
    /// The mains frequency with the larger ratio, and that ratio in dB.
    fn ratio(&mut self, samples: &[f32]) -> Option<(f64, f64)> {
        self.buffer.clear();
        self.buffer.extend(
            samples
                .get(self.part.clone())?
                .iter()
                .map(|&v| f64::from(v)),
        );
        let density = self.welch.density(&self.buffer);
        self.candidates
            .iter()
            .copied()
            .filter(|mains| mains + MAINS_HALF_WIDTH_HZ < self.rate_hz / 2.0)
            .filter_map(|mains| {
                let at = self.mean(&density, |hz| (hz - mains).abs() <= MAINS_HALF_WIDTH_HZ)?;
                let beside =
                    self.mean(&density, |hz| NEIGHBOURS_HZ.contains(&(hz - mains).abs()))?;
                let db = 10.0 * (at / beside).log10();
                db.is_finite().then_some((mains, db))
            })
            .max_by(|a, b| a.1.total_cmp(&b.1))
    }
    fn mean(&self, density: &[f64], wanted: impl Fn(f64) -> bool) -> Option<f64> {
        let (mut sum, mut count) = (0.0, 0);
        for (hz, value) in self.hz.iter().zip(density) {
            if wanted(*hz) {
                sum += value;
                count += 1;
            }
        }
        (count > 0).then(|| sum / f64::from(count))
    }
}
