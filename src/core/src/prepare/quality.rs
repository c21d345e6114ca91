//! How good every recorded channel is: numbers, and a proposal where a number stands out. Nothing is left out by itself.
//!
//! | criterion | measure | proposed when |
//! |---|---|---|
//! | not numbers | samples that are not finite | any |
//! | flat | share of seconds whose standard deviation is below 3 % of the median channel's median second | above 10 % |
//! | clipped | share of samples in runs of 3 or more at the channel's own largest or smallest value | above 0.1 % |
//! | large | median over seconds of the log variance in the band; robust z over channels | z above 5 |
//! | noisy | share of power above 40 Hz, mains left out, that three quarters of the seconds exceed | above 30 %, its odds 4 times the median channel's |
//! | mains | power at 50 or 60 Hz over its surroundings | 15 dB above the median channel, 20 dB at least |
//! | unlike | median over 12 parts of the recording of the correlation with the estimate from the other channels, up to 20 Hz | below 0.35, 0.3 below the median channel, and none of the 4 nearest channels correlates above 0.4 |
//! | bridged | least variance of a difference to another channel, over the median of these | below 1 % |
//! | drifting | robust spread of medians over 5 seconds of medians of seconds over the spread in the band | above 2, and 4 times the median channel |
//!
//! Estimates are spherical splines (Perrin et al. 1989) or inverse squared distance (see `neighbours`), fitted without the channels
//! that other criteria doubt and, one by one, without the least like its estimate. That bridged electrodes show in the variance
//! of their difference: Tenke & Kayser 2001, *Clin. Neurophysiol.* 112:545–550. Robust z: the distance from the median over 1.4826 times
//! the median absolute deviation (Huber 1981, *Robust Statistics*), which is taken as at least 0.25 in natural logarithms. All limits: common
//! practice, no source.
//!
//! # Medians over seconds
//! A blink fills less than half of the seconds and its neighbours see it too, so neither size nor drift nor likeness takes a
//! frontal channel for a bad one because of blinks. Jaw muscle comes in bursts and lies mostly above 20 Hz, so a temple is not noisy
//! unless it is so all the time, and not unlike its neighbours.
//!
//! # The band
//! 1–40 Hz, or what the sampling rate leaves of it, by the discrete Fourier transform of single seconds (line removed, Hann window); at most
//! 120 of them, spread evenly over the recording.
use super::neighbours::Places;
use crate::fourier::RealTransform;
use crate::recording::{Recording, Stretch};
use crate::sheet::{ChannelCard, ChannelQuality, Doubt, DoubtKind, QualityCard};
use nalgebra::DMatrix;
use rustfft::num_complex::Complex;
use std::f64::consts::PI;

const MOST_SECONDS: usize = 120;
/// Parts of the recording that likeness is the median over.
const PARTS: usize = 12;
/// Above so many channels they are not compared with each other.
const MOST_COMPARED: usize = 512;
/// Likeness is judged up to here: muscle is local and lies above.
const LIKENESS_HZ: f64 = 20.0;
const BAND_HZ: [f64; 2] = [1.0, 40.0];
/// Blocks of the pass over all samples: seconds, or longer ones where there would be more than this.
const MOST_BLOCKS: usize = 8192;
/// Blocks whose median is one point of the slow course.
const SLOW_BLOCKS: usize = 5;
/// Samples of a block that its median is taken of.
const SLOW_SAMPLES: usize = 64;
/// Samples that a rank is worked out from.
const RANK_SAMPLES: usize = 20_000;

const FLAT_SPREAD: f64 = 0.03;
const FLAT_SHARE: f64 = 0.1;
const CLIPPED_SHARE: f64 = 1e-3;
const CLIPPED_RUN: usize = 3;
const LARGE_Z: f64 = 5.0;
const NOISY_SHARE: f64 = 0.3;
const NOISY_ODDS: f64 = 4.0;
const MAINS_ABOVE_DB: f64 = 15.0;
const MAINS_DB: f64 = 20.0;
const UNLIKE: f64 = 0.35;
const UNLIKE_BELOW: f64 = 0.3;
/// A channel that is this like one of its nearest is not unlike, however badly a spline reaches it at the rim.
const LIKE_NEAREST: f64 = 0.4;
const NEAREST: usize = 4;
const BRIDGED: f64 = 0.01;
const DRIFT: f64 = 2.0;
const DRIFT_ABOVE: f64 = 4.0;
/// Least spread of logarithms over channels that counts as usual.
const LEAST_SPREAD: f64 = 0.25;
/// Fewest channels that one is estimated from.
const FEWEST: usize = 6;

/// The measures of a recording's channels, and what a rank is worked out from.
#[derive(Debug, Clone)]
pub struct Quality {
    /// For the sheet.
    pub card: QualityCard,
    /// Covariance of the recorded channels over the compared seconds, each about its mean; rows of channels that hold no numbers are 0.
    covariance: Option<DMatrix<f64>>,
    largest_mean_square: f64,
}

impl Quality {
    /// Numerical rank of T C Tᵀ, C the covariance of the recorded channels: eigenvalues above ten times the rounding noise of f32 samples
    /// and of the sums. `None` where channels are too many to compare.
    pub fn rank(&self, matrix: &DMatrix<f64>) -> Option<usize> {
        let covariance = self.covariance.as_ref()?;
        if matrix.ncols() != covariance.nrows() {
            return None;
        }
        let product = matrix * covariance * matrix.transpose();
        let half = 0.5 * (&product + product.transpose());
        let values = half.symmetric_eigenvalues();
        let largest = values.iter().copied().fold(0.0, f64::max);
        let storage = 10.0 * self.largest_mean_square * 2f64.powi(-48) / 12.0;
        let sums = 10.0 * largest * values.len() as f64 * f64::EPSILON;
        Some(values.iter().filter(|v| **v > storage.max(sums)).count())
    }
}

/// The comparison in bites: one channel, one second, one exclusion a step.
pub struct Comparing {
    alone: Vec<Alone>,
    block: usize,
    seconds: Vec<usize>,
    spectrum: Second,
    /// Recorded channels that hold numbers and are not constant.
    sane: Vec<usize>,
    done_seconds: usize,
    /// Log variance in the band, and share above 40 Hz, `sane × seconds`.
    size: Vec<Vec<f64>>,
    high: Vec<Vec<f64>>,
    /// Covariance up to 20 Hz of each part of the recording, over `sane`, every second scaled to the same total.
    parts: Vec<DMatrix<f64>>,
    recorded: DMatrix<f64>,
    rows: f64,
    largest_mean_square: f64,
    places: Places,
    mains_db: Vec<Option<f64>>,
    card: Option<QualityCard>,
    /// Indexes into `sane` that serve as sources of estimates.
    sources: Vec<usize>,
    likeness: Option<Vec<Option<f64>>>,
    finished: bool,
}

impl std::fmt::Debug for Comparing {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let (done, of) = self.progress();
        write!(f, "Comparing({done} of {of})")
    }
}

/// What one pass over a channel's samples tells.
#[derive(Debug, Clone, Default)]
struct Alone {
    not_numbers: usize,
    clipped: f64,
    /// Standard deviation of every block.
    spreads: Vec<f64>,
    /// Robust standard deviation of the slow course about each stretch's median.
    slow: Option<f64>,
}

impl Comparing {
    /// Plans; `cards` are those of [`super::inspect()`] for the same recording.
    pub fn new(recording: &Recording, cards: &[ChannelCard]) -> Self {
        let rate_hz = recording.rate_hz;
        let length = (rate_hz.round() as usize).max(64);
        let all = recording.sample_count();
        let sane: Vec<usize> = (0..cards.len())
            .filter(|c| cards[*c].sd.is_some_and(|sd| sd > 0.0))
            .collect();
        let compared = cards.len() <= MOST_COMPARED && sane.len() >= 2;
        let seconds = if compared {
            spread(&recording.stretches, length)
        } else {
            Vec::new()
        };
        let n = if compared { sane.len() } else { 0 };
        Comparing {
            alone: Vec::with_capacity(cards.len()),
            block: length.max(all.div_ceil(MOST_BLOCKS)),
            spectrum: Second::new(length, rate_hz),
            done_seconds: 0,
            size: vec![Vec::with_capacity(seconds.len()); n],
            high: vec![Vec::with_capacity(seconds.len()); n],
            parts: vec![DMatrix::zeros(n, n); PARTS.min(seconds.len().max(1))],
            recorded: DMatrix::zeros(n, n),
            rows: 0.0,
            largest_mean_square: 0.0,
            places: Places::of(recording, cards),
            mains_db: cards.iter().map(|c| c.mains_db).collect(),
            card: None,
            sources: Vec::new(),
            likeness: None,
            finished: false,
            seconds,
            sane,
        }
    }

    /// Steps done, and about how many in all.
    pub fn progress(&self) -> (usize, usize) {
        let of = self.mains_db.len() + self.seconds.len() + 1;
        let done = self.alone.len() + self.done_seconds + usize::from(self.finished);
        (done, of)
    }

    /// Does the next step and says whether there is another.
    pub fn step(&mut self, recording: &Recording) -> bool {
        if let Some(samples) = recording.samples.get(self.alone.len()) {
            self.alone
                .push(alone(samples, &recording.stretches, self.block));
        } else if self.done_seconds < self.seconds.len() {
            self.second(recording);
        } else if self.card.is_none() {
            self.first_look(recording);
        } else if !self.finished {
            self.exclude();
        }
        !self.finished
    }

    /// The result, once all is done.
    pub fn finish(self) -> Option<Quality> {
        let all = self.mains_db.len();
        let mut covariance = DMatrix::zeros(all, all);
        for (i, a) in self.sane.iter().enumerate().take(self.recorded.nrows()) {
            for (j, b) in self.sane.iter().enumerate() {
                covariance[(*a, *b)] = self.recorded[(i, j)] / self.rows;
            }
        }
        let known = self.rows > 2.0 * self.sane.len() as f64;
        self.card.filter(|_| self.finished).map(|card| Quality {
            card,
            covariance: known.then_some(covariance),
            largest_mean_square: self.largest_mean_square,
        })
    }

    fn second(&mut self, recording: &Recording) {
        let first = self.seconds[self.done_seconds];
        let length = self.spectrum.length;
        let n = self.sane.len();
        let every = (length * self.seconds.len() / RANK_SAMPLES.max(20 * n)).max(1);
        let mut panel = DMatrix::zeros(n, 2 * self.spectrum.likeness);
        let mut raw = DMatrix::zeros(n, length.div_ceil(every));
        for (i, c) in self.sane.iter().enumerate() {
            let part = &recording.samples[*c][first..first + length];
            let mean = part.iter().map(|x| f64::from(*x)).sum::<f64>() / length as f64;
            let square = part.iter().map(|x| f64::from(*x).powi(2)).sum::<f64>() / length as f64;
            self.largest_mean_square = self.largest_mean_square.max(square);
            for (k, x) in part.iter().step_by(every).enumerate() {
                raw[(i, k)] = f64::from(*x) - mean;
            }
            let (inside, above) = self.spectrum.of(part);
            let power: f64 = inside.iter().map(|z| z.norm_sqr()).sum();
            for (k, z) in inside.iter().take(self.spectrum.likeness).enumerate() {
                panel[(i, 2 * k)] = z.re;
                panel[(i, 2 * k + 1)] = z.im;
            }
            self.size[i].push(power.ln());
            if let Some(above) = above {
                self.high[i].push(above / (above + power));
            }
        }
        let part = self.done_seconds * self.parts.len() / self.seconds.len();
        // A second counts by its shape, not its size, or blinks would decide how alike the front is.
        let size = panel.norm_squared();
        if size > 0.0 {
            self.parts[part] += &panel * panel.transpose() / size;
        }
        self.rows += raw.ncols() as f64;
        self.recorded += &raw * raw.transpose();
        self.done_seconds += 1;
    }

    /// Everything but the estimates; chooses the channels to begin these with.
    fn first_look(&mut self, recording: &Recording) {
        let mut channels: Vec<ChannelQuality> = self
            .alone
            .iter()
            .zip(&recording.channels)
            .map(|(alone, channel)| ChannelQuality {
                name: channel.name.clone(),
                not_numbers: alone.not_numbers,
                clipped: alone.clipped,
                ..ChannelQuality::default()
            })
            .collect();
        self.flat(&mut channels);
        self.sizes(&mut channels);
        self.high_and_mains(&mut channels);
        self.drift(&mut channels);
        let placed = |i: &usize| self.places.get(self.sane[*i]).is_some();
        self.sources = (0..self.parts.first().map_or(0, |p| p.nrows()))
            .filter(placed)
            .filter(|i| channels[self.sane[*i]].doubts.is_empty())
            .collect();
        let [low, high] = self.spectrum.band_hz();
        self.card = Some(QualityCard {
            channels,
            compared_s: (self.seconds.len() * self.spectrum.length) as f64 / recording.rate_hz,
            band_hz: [low, high],
            estimate: None,
        });
    }

    fn flat(&self, channels: &mut [ChannelQuality]) {
        let typical: Vec<f64> = self
            .alone
            .iter()
            .filter(|a| a.not_numbers == 0)
            .filter_map(|a| median(&a.spreads))
            .collect();
        let usual = median(&typical).unwrap_or(0.0);
        for (channel, alone) in channels.iter_mut().zip(&self.alone) {
            let spreads = &alone.spreads;
            let still = spreads
                .iter()
                .filter(|s| **s <= FLAT_SPREAD * usual)
                .count();
            channel.flat = still as f64 / spreads.len().max(1) as f64;
            if channel.not_numbers > 0 {
                let count = channel.not_numbers;
                doubt(
                    channel,
                    DoubtKind::NotNumbers,
                    match count {
                        1 => "one sample is not a number".to_owned(),
                        n => format!("{n} samples are not numbers"),
                    },
                );
            } else if channel.flat >= 1.0 {
                doubt(
                    channel,
                    DoubtKind::Flat,
                    "stands still throughout".to_owned(),
                );
            } else if channel.flat > FLAT_SHARE {
                let share = percent(channel.flat);
                doubt(
                    channel,
                    DoubtKind::Flat,
                    format!("stands still in {share} of its seconds"),
                );
            }
            if channel.clipped > CLIPPED_SHARE && channel.flat <= FLAT_SHARE {
                let share = percent(channel.clipped);
                doubt(
                    channel,
                    DoubtKind::Clipped,
                    format!("{share} of its samples lie level at its extremes"),
                );
            }
        }
    }

    fn sizes(&self, channels: &mut [ChannelQuality]) {
        let logs: Vec<Option<f64>> = self.size.iter().map(|s| median(s)).collect();
        let (middle, spread) = robust(logs.iter().flatten());
        for (log, c) in logs.iter().zip(&self.sane) {
            let Some(log) = log.filter(|l| l.is_finite()) else {
                continue;
            };
            let z = (log - middle) / spread.max(LEAST_SPREAD);
            let size = ((log - middle) / 2.0).exp();
            let channel = &mut channels[*c];
            channel.size = Some(size);
            channel.size_z = Some(z);
            if z > LARGE_Z {
                doubt(
                    channel,
                    DoubtKind::Large,
                    format!("{} times as large as the median channel", times(size)),
                );
            }
        }
    }

    fn high_and_mains(&self, channels: &mut [ChannelQuality]) {
        let shares: Vec<Option<f64>> = self.high.iter().map(|s| quarter(s)).collect();
        let logit = |share: f64| (share / (1.0 - share)).ln();
        let logits: Vec<f64> = shares.iter().flatten().map(|s| logit(*s)).collect();
        let (middle, _) = robust(logits.iter());
        let usual = 1.0 / (1.0 + (-middle).exp());
        for (share, c) in shares.iter().zip(&self.sane) {
            let Some(share) = share else { continue };
            channels[*c].high = Some(*share);
            if *share > NOISY_SHARE && logit(*share) > middle + NOISY_ODDS.ln() {
                let reason = format!(
                    "{} of its power lies above 40\u{a0}Hz, usually {}",
                    percent(*share),
                    percent(usual)
                );
                doubt(&mut channels[*c], DoubtKind::Noisy, reason);
            }
        }
        let known: Vec<f64> = self.mains_db.iter().flatten().copied().collect();
        let Some(usual) = median(&known) else { return };
        for (channel, db) in channels.iter_mut().zip(&self.mains_db) {
            let Some(db) = db else { continue };
            channel.mains_above_db = Some(db - usual);
            if db - usual >= MAINS_ABOVE_DB && *db >= MAINS_DB {
                let reason = format!("mains {:.0}\u{a0}dB above the median channel’s", db - usual);
                doubt(channel, DoubtKind::Mains, reason);
            }
        }
    }

    fn drift(&self, channels: &mut [ChannelQuality]) {
        let drifts: Vec<Option<f64>> = self
            .sane
            .iter()
            .zip(&self.size)
            .map(|(c, size)| Some(self.alone[*c].slow? / (median(size)? / 2.0).exp()))
            .map(|d| d.filter(|d| d.is_finite()))
            .collect();
        let known: Vec<f64> = drifts.iter().flatten().copied().collect();
        let Some(usual) = median(&known) else { return };
        for (drift, c) in drifts.iter().zip(&self.sane) {
            channels[*c].drift = *drift;
            if let Some(drift) = drift
                && *drift > DRIFT
                && *drift > DRIFT_ABOVE * usual
            {
                let reason = format!(
                    "wanders {} times as far as it swings, usually {}",
                    times(*drift),
                    times(usual)
                );
                doubt(&mut channels[*c], DoubtKind::Drifting, reason);
            }
        }
    }

    /// Takes the channel least like its estimate out of the sources, as long as one is too unlike; then writes all down.
    fn exclude(&mut self) {
        let enough = self.sources.len() >= FEWEST.max(self.sane.len() / 2);
        let weights = self.weights_of_sources().filter(|_| enough);
        let Some(weights) = weights else {
            self.bridges();
            self.finished = true;
            return;
        };
        let all: Vec<usize> = (0..self.sane.len())
            .filter(|i| self.places.get(self.sane[*i]).is_some())
            .collect();
        let likeness = self.likeness_of(&all, &weights);
        let among: Vec<f64> = self.sources.iter().filter_map(|i| likeness[*i]).collect();
        let limit = UNLIKE.min(median(&among).unwrap_or(0.0) - UNLIKE_BELOW);
        let worst = self
            .sources
            .iter()
            .filter_map(|i| Some((*i, likeness[*i]?)))
            .filter(|(i, r)| *r < limit && !self.like_nearest(*i))
            .min_by(|a, b| a.1.total_cmp(&b.1));
        self.likeness = Some(likeness);
        match worst {
            Some((worst, _)) => self.sources.retain(|i| *i != worst),
            None => {
                self.unlike(limit, median(&among).unwrap_or(0.0));
                self.bridges();
                self.finished = true;
            }
        }
    }

    /// Row i: the estimate of `sane[i]` from the sources, as weights over `sane`.
    fn weights_of_sources(&self) -> Option<DMatrix<f64>> {
        let channel =
            |list: &[usize]| -> Vec<usize> { list.iter().map(|i| self.sane[*i]).collect() };
        let n = self.sane.len();
        let others: Vec<usize> = (0..n)
            .filter(|i| !self.sources.contains(i) && self.places.get(self.sane[*i]).is_some())
            .collect();
        if self.sources.len() < FEWEST {
            return None;
        }
        let own = self.places.leave_one_out(&channel(&self.sources)).ok()?;
        let far = self
            .places
            .weights(&channel(&others), &channel(&self.sources))
            .ok()?;
        let mut weights = DMatrix::zeros(n, n);
        for (rows, block) in [(&self.sources, own), (&others, far)] {
            for (r, i) in rows.iter().enumerate() {
                for (k, j) in self.sources.iter().enumerate() {
                    weights[(*i, *j)] = block[(r, k)];
                }
            }
        }
        Some(weights)
    }

    /// Median over the parts of the correlation of each of `of` with its estimate.
    fn likeness_of(&self, of: &[usize], weights: &DMatrix<f64>) -> Vec<Option<f64>> {
        let n = self.sane.len();
        let mut found = vec![Vec::with_capacity(self.parts.len()); n];
        for part in &self.parts {
            let product = weights * part;
            for i in of {
                let estimate = product.row(*i).dot(&weights.row(*i));
                let r = product[(*i, *i)] / (estimate * part[(*i, *i)]).sqrt();
                if r.is_finite() {
                    found[*i].push(r);
                }
            }
        }
        found.iter().map(|r| median(r)).collect()
    }

    /// Whether one of the sources nearest to a channel correlates with it, in half of the parts.
    fn like_nearest(&self, i: usize) -> bool {
        let Some(place) = self.places.get(self.sane[i]) else {
            return false;
        };
        let mut near: Vec<(f64, usize)> = self
            .sources
            .iter()
            .filter(|j| **j != i)
            .filter_map(|j| {
                let other = self.places.get(self.sane[*j])?;
                Some(((0..3).map(|k| (place[k] - other[k]).powi(2)).sum(), *j))
            })
            .collect();
        near.sort_by(|a, b| a.0.total_cmp(&b.0));
        near.iter().take(NEAREST).any(|(_, j)| {
            let r = |part: &DMatrix<f64>| {
                (part[(i, *j)] / (part[(i, i)] * part[(*j, *j)]).sqrt()).abs()
            };
            let all: Vec<f64> = self.parts.iter().map(r).collect();
            median(&all).is_some_and(|r| r > LIKE_NEAREST)
        })
    }

    fn unlike(&mut self, limit: f64, usual: f64) {
        let like: Vec<bool> = (0..self.sane.len()).map(|i| self.like_nearest(i)).collect();
        let (Some(card), Some(likeness)) = (&mut self.card, &self.likeness) else {
            return;
        };
        card.estimate = Some(self.places.method().to_owned());
        for ((r, c), like) in likeness.iter().zip(&self.sane).zip(like) {
            let channel = &mut card.channels[*c];
            channel.predicted = *r;
            if let Some(r) = r
                && *r < limit
                && !like
            {
                let reason = format!(
                    "correlation {} with its neighbours’ estimate, usually {usual:.2}",
                    signed(*r)
                );
                doubt(channel, DoubtKind::Unlike, reason);
            }
        }
    }

    /// Channels that hardly differ: all but the one that its neighbours explain best.
    fn bridges(&mut self) {
        let Some(mut card) = self.card.take() else {
            return;
        };
        let n = self.parts.first().map_or(0, |p| p.nrows());
        let still = |i: usize| card.channels[self.sane[i]].flat > FLAT_SHARE;
        let moving: Vec<usize> = (0..n).filter(|i| !still(*i)).collect();
        let sum = self.sum();
        let apart = |i: usize, j: usize| (sum[(i, i)] + sum[(j, j)] - 2.0 * sum[(i, j)]).max(0.0);
        let nearest: Vec<(usize, usize, f64)> = moving
            .iter()
            .filter_map(|i| {
                let others = moving.iter().filter(|j| *j != i);
                let near = others.map(|j| (*i, *j, apart(*i, *j)));
                near.min_by(|a, b| a.2.total_cmp(&b.2))
            })
            .collect();
        let usual = median(&nearest.iter().map(|n| n.2).collect::<Vec<_>>()).unwrap_or(0.0);
        let mut groups: Vec<Vec<usize>> = Vec::new();
        for (i, j, d) in &nearest {
            let ratio = d / usual;
            if !ratio.is_finite() {
                continue;
            }
            let name = card.channels[self.sane[*j]].name.clone();
            card.channels[self.sane[*i]].nearest = Some((name, ratio));
            if ratio < BRIDGED {
                match groups.iter_mut().find(|g| g.contains(i) || g.contains(j)) {
                    Some(group) => group.extend([*i, *j]),
                    None => groups.push(vec![*i, *j]),
                }
            }
        }
        for mut group in groups {
            group.sort_unstable();
            group.dedup();
            let kept = self.best_explained(&group);
            for i in group.into_iter().filter(|i| *i != kept) {
                let with = card.channels[self.sane[kept]].name.clone();
                let share = percent(apart(i, kept) / usual);
                let reason = format!("differs from {with} by {share} of what is usual");
                doubt(&mut card.channels[self.sane[i]], DoubtKind::Bridged, reason);
            }
        }
        self.card = Some(card);
    }

    /// The same over the whole recording.
    fn sum(&self) -> DMatrix<f64> {
        let n = self.parts.first().map_or(0, |p| p.nrows());
        self.parts.iter().fold(DMatrix::zeros(n, n), |s, p| s + p)
    }

    /// In whose place the samples that a group shares explain the channels outside it best (each of these from the others and that one);
    /// the first where that cannot be told.
    fn best_explained(&self, group: &[usize]) -> usize {
        let outside: Vec<usize> = self
            .sources
            .iter()
            .copied()
            .filter(|i| !group.contains(i))
            .collect();
        let placed = |i: &usize| self.places.get(self.sane[*i]).is_some();
        if outside.len() < FEWEST || !group.iter().all(placed) {
            return group[0];
        }
        let sum = self.sum();
        let unexplained = |i: usize| -> Option<f64> {
            let members: Vec<usize> = outside.iter().copied().chain([i]).collect();
            let recorded: Vec<usize> = members.iter().map(|k| self.sane[*k]).collect();
            let weights = self.places.leave_one_out(&recorded).ok()?;
            let among = DMatrix::from_fn(members.len(), members.len(), |a, b| {
                sum[(members[a], members[b])]
            });
            let product = &weights * &among;
            let left = |k: usize| {
                let estimate = product.row(k).dot(&weights.row(k));
                ((among[(k, k)] - 2.0 * product[(k, k)] + estimate) / among[(k, k)]).ln()
            };
            Some((0..outside.len()).map(left).sum())
        };
        let left: Vec<f64> = group
            .iter()
            .map(|i| unexplained(*i).unwrap_or(f64::INFINITY))
            .collect();
        let best = (0..group.len()).min_by(|a, b| left[*a].total_cmp(&left[*b]).then(a.cmp(b)));
        group[best.unwrap_or(0)]
    }
}

fn doubt(channel: &mut ChannelQuality, kind: DoubtKind, reason: String) {
    channel.doubts.push(Doubt { kind, reason });
}

/// First samples of at most [`MOST_SECONDS`] pieces of `length`, spread evenly over the stretches.
fn spread(stretches: &[Stretch], length: usize) -> Vec<usize> {
    let pieces: Vec<usize> = stretches
        .iter()
        .flat_map(|s| (0..s.count / length).map(move |k| s.first + k * length))
        .collect();
    let wanted = pieces.len().min(MOST_SECONDS);
    // The middle of each of the equal shares.
    (0..wanted)
        .map(|k| pieces[(2 * k + 1) * pieces.len() / (2 * wanted)])
        .collect()
}

fn alone(samples: &[f32], stretches: &[Stretch], block: usize) -> Alone {
    let not_numbers = samples.iter().filter(|x| !x.is_finite()).count();
    if not_numbers > 0 {
        return Alone {
            not_numbers,
            ..Alone::default()
        };
    }
    let (low, high) = samples
        .iter()
        .fold((f32::INFINITY, f32::NEG_INFINITY), |(l, h), x| {
            (l.min(*x), h.max(*x))
        });
    let (mut level, mut spreads, mut away, mut freedom) = (0, Vec::new(), Vec::new(), 0usize);
    for stretch in stretches {
        let Some(part) = samples.get(stretch.first..stretch.first + stretch.count) else {
            continue;
        };
        level += level_at(part, low) + if high > low { level_at(part, high) } else { 0 };
        let mut levels = Vec::with_capacity(part.len() / block + 1);
        for piece in part.chunks_exact(block) {
            let some = piece.iter().step_by((block / SLOW_SAMPLES).max(1));
            let some: Vec<f64> = some.map(|x| f64::from(*x)).collect();
            levels.extend(median(&some));
            spreads.push(spread_of(piece));
        }
        let course: Vec<f64> = levels.chunks(SLOW_BLOCKS).filter_map(median).collect();
        let middle = median(&course).unwrap_or(0.0);
        away.extend(course.iter().map(|x| (x - middle).abs()));
        freedom += course.len().saturating_sub(1);
    }
    Alone {
        not_numbers,
        clipped: level as f64 / samples.len().max(1) as f64,
        spreads,
        slow: median(&away).filter(|_| freedom >= 3).map(|d| 1.4826 * d),
    }
}

/// Samples in runs of [`CLIPPED_RUN`] or more at `value`.
fn level_at(samples: &[f32], value: f32) -> usize {
    let (mut all, mut run) = (0, 0);
    for x in samples {
        if *x == value {
            run += 1;
        } else {
            if run >= CLIPPED_RUN {
                all += run;
            }
            run = 0;
        }
    }
    all + if run >= CLIPPED_RUN { run } else { 0 }
}

fn spread_of(samples: &[f32]) -> f64 {
    let origin = f64::from(samples.first().copied().unwrap_or(0.0));
    let n = samples.len().max(1) as f64;
    let (mut sum, mut square) = (0.0, 0.0);
    for x in samples {
        let away = f64::from(*x) - origin;
        sum += away;
        square += away * away;
    }
    (square / n - (sum / n).powi(2)).max(0.0).sqrt()
}

/// The median; `None` of nothing.
fn median(values: &[f64]) -> Option<f64> {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    let n = sorted.len();
    match n {
        0 => None,
        n if n % 2 == 1 => Some(sorted[n / 2]),
        _ => Some(0.5 * (sorted[n / 2 - 1] + sorted[n / 2])),
    }
}

/// What three quarters of the values exceed; `None` of nothing.
fn quarter(values: &[f64]) -> Option<f64> {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted.get(sorted.len() / 4).copied()
}

/// Median and 1.4826 times the median absolute deviation of the finite values.
fn robust<'a>(values: impl Iterator<Item = &'a f64>) -> (f64, f64) {
    let known: Vec<f64> = values.copied().filter(|v| v.is_finite()).collect();
    let middle = median(&known).unwrap_or(0.0);
    let away: Vec<f64> = known.iter().map(|v| (v - middle).abs()).collect();
    (middle, 1.4826 * median(&away).unwrap_or(0.0))
}

fn percent(share: f64) -> String {
    let value = 100.0 * share;
    match value {
        v if v >= 9.95 => format!("{v:.0}\u{a0}%"),
        v if v >= 0.095 => format!("{v:.1}\u{a0}%"),
        v if v >= 0.0095 => format!("{v:.2}\u{a0}%"),
        _ => "less than 0.01\u{a0}%".to_owned(),
    }
}

fn times(value: f64) -> String {
    if value >= 9.95 {
        format!("{value:.0}")
    } else {
        format!("{value:.1}")
    }
}

fn signed(value: f64) -> String {
    format!("{value:.2}").replace('-', "\u{2212}")
}

/// The spectrum of one second.
struct Second {
    length: usize,
    rate_hz: f64,
    taper: Vec<f64>,
    fft: RealTransform,
    input: Vec<f64>,
    output: Vec<Complex<f64>>,
    in_band: Vec<usize>,
    /// How many of these are looked at for likeness.
    likeness: usize,
    above: Vec<usize>,
    scale: f64,
}

impl Second {
    fn new(length: usize, rate_hz: f64) -> Self {
        let fft = RealTransform::new(length);
        let taper: Vec<f64> = (0..length)
            .map(|i| 0.5 - 0.5 * (2.0 * PI * i as f64 / length as f64).cos())
            .collect();
        let hz = |k: usize| k as f64 * rate_hz / length as f64;
        let top = 0.45 * rate_hz;
        let low = BAND_HZ[0].min(hz(1));
        let mains = |f: f64| {
            [50.0, 60.0]
                .iter()
                .any(|m| f > m - 3.0 && (f - (f / m).round() * m).abs() <= 2.0)
        };
        let bins = 1..=length / 2;
        let in_band: Vec<usize> = bins
            .clone()
            .filter(|k| hz(*k) >= low - 1e-9 && hz(*k) <= BAND_HZ[1].min(top))
            .collect();
        let above: Vec<usize> = bins
            .filter(|k| hz(*k) > BAND_HZ[1] && hz(*k) <= top && !mains(hz(*k)))
            .collect();
        let power: f64 = taper.iter().map(|w| w * w).sum();
        Second {
            length,
            rate_hz,
            input: vec![0.0; length],
            output: vec![Complex::default(); fft.bins()],
            fft,
            taper,
            likeness: in_band.iter().filter(|k| hz(**k) <= LIKENESS_HZ).count(),
            in_band,
            above,
            // Σ|z|² over the bins of the band is the variance in it.
            scale: (2.0 / (power * length as f64)).sqrt(),
        }
    }
    fn band_hz(&self) -> [f64; 2] {
        let hz =
            |k: Option<&usize>| k.map_or(0.0, |k| *k as f64 * self.rate_hz / self.length as f64);
        [hz(self.in_band.first()), hz(self.in_band.last())]
    }
    /// Coefficients in the band, and the power above it where the rate leaves at least 10 Hz of it.
    fn of(&mut self, samples: &[f32]) -> (Vec<Complex<f64>>, Option<f64>) {
        for (slot, x) in self.input.iter_mut().zip(samples) {
            *slot = f64::from(*x);
        }
        let line = crate::recipe::Detrend::Word(crate::recipe::DetrendWord::Linear);
        super::steady::detrend(&mut self.input, line, self.rate_hz);
        for (slot, weight) in self.input.iter_mut().zip(&self.taper) {
            *slot *= weight;
        }
        self.fft.transform(&self.input, &mut self.output);
        let inside = self.in_band.iter().map(|k| self.output[*k] * self.scale);
        let enough = self.above.len() as f64 * self.rate_hz / self.length as f64 >= 10.0;
        let above = enough.then(|| {
            let all = self.above.iter().map(|k| self.output[*k].norm_sqr());
            all.sum::<f64>() * self.scale * self.scale
        });
        (inside.collect(), above)
    }
}
