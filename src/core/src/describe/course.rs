//! Power and average of a component around an event, and its single trials.
//!
//! # Power
//! A trial is [onset + from, onset + to); its own mean over that span is taken off. Its power at a time is the squared series averaged under a
//! symmetric Hann window of 0.2 s full width centred there (weights renormalised where the stretch ends). Decibels are relative to the mean power
//! of the reference windows.
use super::bootstrap;
use super::spectra::Window;
use crate::recording::{Event, Stretch};
use crate::sheet::{Course, TrialImage};
use nalgebra::DMatrix;
use std::collections::BTreeMap;
use std::f64::consts::PI;

/// Full width of the window that smooths the power.
pub const SMOOTHING_S: f64 = 0.2;
/// Most times of a course: bins of one sample or more.
const COURSE_BINS: usize = 200;
/// Most times of the single-trial image.
const IMAGE_BINS: usize = 120;
/// Ratios are not shown below this (−120 dB): a flat trial has no logarithm.
const SMALLEST_RATIO: f64 = 1e-12;

/// What the power is relative to.
#[derive(Debug, Clone, Copy)]
pub enum Baseline<'a> {
    /// The reference window of each onset, in the onsets' order (paired contrasts): the bootstrap draws a trial with its window.
    Paired(&'a [Window]),
    /// All reference windows together (unpaired contrasts): one mean power, each window about its own mean.
    Pooled(&'a [Window]),
}

/// What is looked at around the event.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Span {
    /// Start relative to the onset.
    pub from_s: f64,
    /// End relative to the onset.
    pub to_s: f64,
}

/// The power course, the average and the single-trial image of one component.
///
/// `series` is the component over the whole prepared recording, `onsets` the sample index of each event with its time on the
/// file's clock. Trials whose span leaves their stretch or holds no sample are left out and not counted; `None` when none remains.
/// Times are centres of equal bins of whole samples, at most 200 (image: 120); the average is over each bin's samples. Rows of the image
/// are in the order of the onsets' times. `bootstrap` samples over trials give the 95 % intervals, 0 gives none.
#[expect(
    clippy::too_many_arguments,
    reason = "each is one plain fact, and all are needed"
)]
pub fn of_component(
    series: &[f64],
    stretches: &[Stretch],
    event: &str,
    onsets: &[(usize, f64)],
    baseline: Baseline<'_>,
    span: Span,
    rate_hz: f64,
    bootstrap: usize,
    seed: u64,
) -> Option<(Course, TrialImage)> {
    let trials = Trials::new(series, stretches, onsets, baseline, span, rate_hz)?;
    Some((trials.course(event, bootstrap, seed), trials.image()))
}

/// How long after each trial's event the next event of another label comes, where it does before `to_s`: of the label that follows in
/// most trials. Nothing is said where it follows in fewer than half of them.
pub fn lags(image: &mut TrialImage, events: &[Event], own: &str, to_s: f64) {
    let mut counts: BTreeMap<&str, usize> = BTreeMap::new();
    let follow = |onset: f64, label: Option<&str>| -> Option<&Event> {
        // Events are in order of time.
        let after = events.partition_point(|e| e.onset_s <= onset);
        events[after..]
            .iter()
            .take_while(|e| e.onset_s < onset + to_s)
            .find(|e| e.label != own && label.is_none_or(|l| e.label == l))
    };
    for onset in &image.onsets_s {
        if let Some(event) = follow(*onset, None) {
            *counts.entry(&event.label).or_default() += 1;
        }
    }
    let most = counts.into_iter().max_by_key(|(_, n)| *n);
    let Some((label, _)) = most.filter(|(_, n)| 2 * n >= image.onsets_s.len()) else {
        return;
    };
    image.lag_to = label.to_owned();
    image.lags_s = image
        .onsets_s
        .iter()
        .map(|onset| Some(follow(*onset, Some(label))?.onset_s - onset))
        .collect();
}

/// Equal bins of whole samples over a span.
#[derive(Debug, Clone, Copy)]
struct Bins {
    /// Samples from the onset to the first bin.
    start: isize,
    /// Samples a bin.
    width: usize,
    /// Bins.
    count: usize,
}

impl Bins {
    fn new(start: isize, samples: usize, most: usize) -> Self {
        let width = samples.div_ceil(most).max(1);
        Bins {
            start,
            width,
            count: samples / width,
        }
    }
    fn times(&self, rate_hz: f64) -> Vec<f64> {
        let middle = (self.width - 1) as f64 / 2.0;
        (0..self.count)
            .map(|bin| (self.start as f64 + (bin * self.width) as f64 + middle) / rate_hz)
            .collect()
    }
    fn centre(&self, bin: usize) -> usize {
        bin * self.width + (self.width - 1) / 2
    }
}

/// The trials that fit, in order of time.
struct Trials<'a> {
    series: &'a [f64],
    rate_hz: f64,
    start: isize,
    samples: usize,
    /// Hann weights from −half to half.
    smoother: Vec<f64>,
    rows: Vec<Row>,
}

struct Row {
    onset_s: f64,
    first: usize,
    stretch: std::ops::Range<usize>,
    mean: f64,
    reference: f64,
}

impl<'a> Trials<'a> {
    fn new(
        series: &'a [f64],
        stretches: &[Stretch],
        onsets: &[(usize, f64)],
        baseline: Baseline<'_>,
        span: Span,
        rate_hz: f64,
    ) -> Option<Self> {
        let start = (span.from_s * rate_hz).round() as isize;
        let samples = ((span.to_s - span.from_s) * rate_hz).round();
        if !(samples >= 1.0 && samples <= series.len() as f64) {
            return None;
        }
        let samples = samples as usize;
        let pooled = match baseline {
            Baseline::Pooled(windows) => pooled_power(series, windows)?,
            Baseline::Paired(_) => 0.0,
        };
        let row = |index: usize, onset: (usize, f64)| {
            let first = onset.0.checked_add_signed(start)?;
            let stretch = stretches
                .iter()
                .map(|s| s.first..s.first + s.count)
                .find(|s| {
                    s.contains(&onset.0)
                        && s.start <= first
                        && first + samples <= s.end
                        && s.end <= series.len()
                })?;
            let mean = mean(&series[first..first + samples]);
            let reference = match baseline {
                Baseline::Paired(windows) => mean_square(part(series, *windows.get(index)?)?, mean),
                Baseline::Pooled(_) => pooled,
            };
            (reference > 0.0).then_some(Row {
                onset_s: onset.1,
                first,
                stretch,
                mean,
                reference,
            })
        };
        let mut rows: Vec<Row> = onsets
            .iter()
            .enumerate()
            .filter_map(|(i, &o)| row(i, o))
            .collect();
        rows.sort_by(|a, b| a.onset_s.total_cmp(&b.onset_s));
        let smoother = smoother(rate_hz);
        (!rows.is_empty()).then_some(Trials {
            series,
            rate_hz,
            start,
            samples,
            smoother,
            rows,
        })
    }

    fn course(&self, event: &str, bootstrap: usize, seed: u64) -> Course {
        let bins = Bins::new(self.start, self.samples, COURSE_BINS);
        let average = DMatrix::from_fn(self.rows.len(), bins.count, |k, bin| {
            self.value(k, bins, bin)
        });
        let [mean_db, low_db, high_db] = self.power_course(&self.powers(bins), bootstrap, seed);
        let [average, average_low, average_high] = bootstrap::means(&average, bootstrap, seed);
        Course {
            event: event.to_owned(),
            t_s: bins.times(self.rate_hz),
            mean_db,
            low_db,
            high_db,
            average,
            average_low,
            average_high,
            smoothing_s: SMOOTHING_S,
            trials: self.rows.len(),
        }
    }

    /// Mean power over trials against mean reference power, both drawn together.
    fn power_course(&self, powers: &DMatrix<f64>, bootstrap: usize, seed: u64) -> [Vec<f64>; 3] {
        let references = nalgebra::DVector::from_iterator(
            self.rows.len(),
            self.rows.iter().map(|r| r.reference),
        );
        let whole = references.sum();
        let mean: Vec<f64> = powers
            .column_iter()
            .map(|c| decibels(c.sum() / whole))
            .collect();
        if bootstrap == 0 || self.rows.len() < 2 {
            return [mean.clone(), mean.clone(), mean];
        }
        let counts = bootstrap::counts(self.rows.len(), bootstrap, seed);
        let below = &counts * references;
        let mut drawn = counts * powers;
        for mut column in drawn.column_iter_mut() {
            column.component_div_assign(&below);
        }
        let [low, high] = bootstrap::intervals(&mut drawn);
        let in_db = |values: Vec<f64>| values.into_iter().map(decibels).collect();
        [mean, in_db(low), in_db(high)]
    }

    fn image(&self) -> TrialImage {
        let bins = Bins::new(self.start, self.samples, IMAGE_BINS);
        let powers = self.powers(bins);
        let row = |k: usize| {
            powers
                .row(k)
                .iter()
                .map(|p| decibels(p / self.rows[k].reference) as f32)
                .collect()
        };
        TrialImage {
            t_s: bins.times(self.rate_hz),
            db: (0..self.rows.len()).map(row).collect(),
            onsets_s: self.rows.iter().map(|r| r.onset_s).collect(),
            lags_s: Vec::new(),
            lag_to: String::new(),
        }
    }

    /// `trials × bins`: smoothed power at the bins' centres.
    fn powers(&self, bins: Bins) -> DMatrix<f64> {
        DMatrix::from_fn(self.rows.len(), bins.count, |k, bin| {
            self.power(&self.rows[k], bins.centre(bin))
        })
    }

    fn power(&self, row: &Row, offset: usize) -> f64 {
        let half = self.smoother.len() / 2;
        let centre = row.first + offset;
        let from = centre.saturating_sub(half).max(row.stretch.start);
        let to = (centre + half + 1).min(row.stretch.end);
        let weights = &self.smoother[from + half - centre..to + half - centre];
        let (mut sum, mut weight) = (0.0, 0.0);
        for (value, w) in self.series[from..to].iter().zip(weights) {
            let x = value - row.mean;
            sum += w * x * x;
            weight += w;
        }
        sum / weight
    }

    fn value(&self, k: usize, bins: Bins, bin: usize) -> f64 {
        let row = &self.rows[k];
        let first = row.first + bin * bins.width;
        mean(&self.series[first..first + bins.width]) - row.mean
    }
}

/// Odd number of positive weights: a Hann window whose zeros lie just outside.
fn smoother(rate_hz: f64) -> Vec<f64> {
    let half = (SMOOTHING_S * rate_hz / 2.0).round().max(1.0) as usize;
    (1..2 * half)
        .map(|i| 0.5 - 0.5 * (PI * i as f64 / half as f64).cos())
        .collect()
}

fn part(series: &[f64], (first, count): Window) -> Option<&[f64]> {
    series
        .get(first..first.checked_add(count)?)
        .filter(|s| !s.is_empty())
}

fn pooled_power(series: &[f64], windows: &[Window]) -> Option<f64> {
    let parts: Vec<&[f64]> = windows.iter().filter_map(|&w| part(series, w)).collect();
    let samples: usize = parts.iter().map(|p| p.len()).sum();
    let sum: f64 = parts
        .iter()
        .map(|p| mean_square(p, mean(p)) * p.len() as f64)
        .sum();
    (samples > 0).then(|| sum / samples as f64)
}

fn mean(values: &[f64]) -> f64 {
    values.iter().sum::<f64>() / values.len() as f64
}

fn mean_square(values: &[f64], about: f64) -> f64 {
    values.iter().map(|v| (v - about).powi(2)).sum::<f64>() / values.len() as f64
}

fn decibels(ratio: f64) -> f64 {
    10.0 * ratio.max(SMALLEST_RATIO).log10()
}
