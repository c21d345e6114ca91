//! A first look at every recorded channel.
use crate::describe::positions::standard;
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
/// 3–8 Hz away on both sides; the larger of the two frequencies. `None` where half the rate is too low or the stretch shorter than 2 s.
///
/// # State
/// What the recipe says comes first: left out, interpolated. Then unusable: a value that is not a finite number, or every stretch constant.
/// Then a doubt: the same samples as an earlier channel in use.
///
/// # Positions
/// The recording's own, brought to the unit sphere ([`to_unit_sphere`]); else by the channel's name.
pub fn inspect(recording: &Recording, recipe: &Recipe) -> Vec<ChannelCard> {
    let mut mains = Mains::new(recording);
    let positions = positions(recording);
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
            let state = state_by_recipe(&channel.name, recipe)
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

fn state_by_recipe(name: &str, recipe: &Recipe) -> Option<ChannelState> {
    let named = |list: &[String]| list.iter().any(|n| n == name);
    if named(&recipe.channels.leave_out) {
        Some(ChannelState::LeftOut)
    } else if named(&recipe.channels.interpolate) {
        Some(ChannelState::Interpolated)
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
    rate_hz: f64,
    buffer: Vec<f64>,
}

impl Mains {
    fn new(recording: &Recording) -> Option<Self> {
        let rate_hz = recording.rate_hz;
        if rate_hz / 2.0 <= MAINS_HZ[0] + MAINS_HALF_WIDTH_HZ {
            return None;
        }
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
        MAINS_HZ
            .into_iter()
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

/// Positions on the unit sphere: the recording's own where it has any, else by name.
fn positions(recording: &Recording) -> Vec<Option<[f64; 3]>> {
    let given: Vec<[f64; 3]> = recording
        .channels
        .iter()
        .filter_map(|c| c.position)
        .collect();
    let mut placed = to_unit_sphere(&given).into_iter();
    recording
        .channels
        .iter()
        .map(|channel| match channel.position {
            Some(_) => placed.next().flatten(),
            None => standard(&channel.name),
        })
        .collect()
}

/// Positions as directions from the centre of the head.
///
/// Positions of length 1 (within 0.1 %) are kept. Otherwise the centre is that of the sphere that fits them best (linear least squares on
/// |p|² = 2 p·c + k), if there are at least 8, the sphere fits (root mean square distance at most 15 % of its radius) and its centre
/// lies within a radius of the origin; else the origin. A position at the centre has no direction: `None`.
pub fn to_unit_sphere(positions: &[[f64; 3]]) -> Vec<Option<[f64; 3]>> {
    let length = |p: &[f64; 3]| p.iter().map(|v| v * v).sum::<f64>().sqrt();
    let unit_already = positions.iter().all(|p| (length(p) - 1.0).abs() < 1e-3);
    let centre = if unit_already {
        None
    } else {
        fitted_centre(positions)
    }
    .unwrap_or([0.0; 3]);
    positions
        .iter()
        .map(|p| {
            let away = [p[0] - centre[0], p[1] - centre[1], p[2] - centre[2]];
            let distance = length(&away);
            (distance.is_finite() && distance > 0.0).then(|| away.map(|v| v / distance))
        })
        .collect()
}

fn fitted_centre(positions: &[[f64; 3]]) -> Option<[f64; 3]> {
    let n = positions.len();
    if n < 8 || positions.iter().flatten().any(|v| !v.is_finite()) {
        return None;
    }
    // Scaled by the largest coordinate, so that metres and millimetres give the same equations.
    let scale = positions
        .iter()
        .flatten()
        .fold(0.0, |most: f64, v| v.abs().max(most));
    let at = |i: usize, j: usize| positions[i][j] / scale;
    let system = nalgebra::DMatrix::from_fn(n, 4, |i, j| if j < 3 { 2.0 * at(i, j) } else { 1.0 });
    let right = nalgebra::DVector::from_fn(n, |i, _| (0..3).map(|j| at(i, j).powi(2)).sum::<f64>());
    let fit = system.svd(true, true).solve(&right, 1e-9).ok()?;
    let centre = [fit[0], fit[1], fit[2]];
    let shift = centre.iter().map(|v| v * v).sum::<f64>();
    let radius = (fit[3] + shift).sqrt();
    let off = |i: usize| {
        let distance = (0..3)
            .map(|j| (at(i, j) - centre[j]).powi(2))
            .sum::<f64>()
            .sqrt();
        (distance - radius).powi(2)
    };
    let misfit = ((0..n).map(off).sum::<f64>() / n as f64).sqrt();
    (misfit <= 0.15 * radius && shift.sqrt() <= radius).then(|| centre.map(|v| v * scale))
}
