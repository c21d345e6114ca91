//! A movie's pixels before they are channels: binned, masked, set against a running baseline.
//!
//! In this order:
//!
//! 1. bins of b × b pixels, their mean (common practice, no source);
//! 2. mask: pixels of the mean image above a value or a quantile of it, or painted ones (common practice, no source);
//! 3. ΔF/F = (F − F₀)/F₀, F₀(t) the percentile of F over a window centred on t, cut off at the ends of an unbroken run (running
//!    percentile baseline: Dombeck, Khabbaz, Collman, Adelman & Tank 2007, *Neuron* 56:43–57). Percentiles are linear between order statistics.
//!
//! # Units
//! ΔF/F is a share of the baseline: its unit is `ΔF/F`. Where the baseline is not above 0 in some frame there is no such share, and the pixel is left out with a warning.
//!
//! # Names
//! Rows and columns count from 1 and are those after binning: `r12c40`.
use crate::error::{Kind, Problem, Result};
use crate::recipe::{Dff, Mask, Movie};
use crate::recording::{Channel, Layout, Recording, Stretch, pixel_name};
use crate::sheet::MovieCard;

/// Samples looked at in one bite.
const BITE_SAMPLES: usize = 1 << 20;

/// A movie in the making, in bites.
#[derive(Debug)]
pub struct Viewing {
    movie: Movie,
    height: usize,
    width: usize,
    /// Source channel of every pixel of the picture.
    channel_of: Vec<Option<usize>>,
    rows: usize,
    columns: usize,
    mean: Vec<f64>,
    /// Bins that are used, once known.
    kept: Option<Vec<usize>>,
    threshold: Option<f64>,
    samples: Vec<Vec<f32>>,
    used: Vec<usize>,
    dark: usize,
}

impl Viewing {
    /// Begins; `None` where the recording is no movie or stays as it is.
    ///
    /// # Errors
    /// A bin larger than the picture; `movie` asked of a recording that is none.
    pub fn new(recording: &Recording, movie: &Movie) -> Result<Option<Self>> {
        let Layout::Frames {
            height,
            width,
            pixels,
        } = &recording.layout
        else {
            return if movie.is_plain() {
                Ok(None)
            } else {
                Err(Problem::new(
                    Kind::Recipe,
                    "the recording is no movie",
                    "take \"movie\" out of the recipe, or open a movie",
                )
                .at("movie")
                .expected_found("frames of pixels", "channels"))
            };
        };
        if movie.is_plain() {
            return Ok(None);
        }
        let (height, width) = (*height as usize, *width as usize);
        let bin = movie.side() as usize;
        let (rows, columns) = (height / bin, width / bin);
        if rows * columns < 2 {
            return Err(Problem::new(
                Kind::Recipe,
                "the bins are larger than the picture",
                "choose smaller bins",
            )
            .at("movie.bin")
            .expected_found(format!("at most {}", (height.min(width)).max(1)), bin));
        }
        let mut channel_of = vec![None; height * width];
        for (channel, pixel) in pixels.iter().enumerate() {
            if let Some(slot) = channel_of.get_mut(*pixel as usize) {
                *slot = Some(channel);
            }
        }
        Ok(Some(Viewing {
            movie: movie.clone(),
            height,
            width,
            channel_of,
            rows,
            columns,
            mean: Vec::with_capacity(rows * columns),
            kept: None,
            threshold: None,
            samples: Vec::new(),
            used: Vec::new(),
            dark: 0,
        }))
    }

    /// Bins done, and in all: once for the mean image, once for the samples.
    pub fn progress(&self) -> (u64, u64) {
        let all = self.rows * self.columns;
        let kept = self.kept.as_ref().map_or(all, Vec::len);
        let done = self.mean.len() + self.samples.len() + self.dark;
        (done as u64, (all + kept) as u64)
    }

    /// Whether everything is done.
    pub fn finished(&self) -> bool {
        let done = self.samples.len() + self.dark;
        self.kept.as_ref().is_some_and(|kept| done == kept.len())
    }

    /// The next bite.
    ///
    /// # Errors
    /// A mask that leaves fewer than two pixels.
    pub fn step(&mut self, recording: &Recording) -> Result<()> {
        let all = self.rows * self.columns;
        let mut left = BITE_SAMPLES;
        while left > 0 && !self.finished() {
            let cost = if self.mean.len() < all {
                let at = self.mean.len();
                let mean = self.mean_of(recording, at);
                self.mean.push(mean);
                recording.sample_count() * self.movie.side().pow(2) as usize
            } else if self.kept.is_none() {
                self.mask()?;
                1
            } else {
                self.push(recording);
                // Keeping a window sorted costs more than looking.
                let each = if self.movie.dff.is_some() { 16 } else { 2 };
                recording.sample_count() * each
            };
            left = left.saturating_sub(cost.max(1));
        }
        Ok(())
    }

    /// Source channels of a bin.
    fn sources(&self, bin: usize) -> impl Iterator<Item = usize> + '_ {
        let side = self.movie.side() as usize;
        let (row, column) = (bin / self.columns * side, bin % self.columns * side);
        (row..row + side)
            .flat_map(move |r| (column..column + side).map(move |c| r * self.width + c))
            .filter_map(|pixel| self.channel_of[pixel])
    }

    fn mean_of(&self, recording: &Recording, bin: usize) -> f64 {
        let (mut sum, mut count) = (0.0, 0usize);
        for channel in self.sources(bin) {
            let samples = &recording.samples[channel];
            sum += samples.iter().map(|x| f64::from(*x)).sum::<f64>();
            count += samples.len();
        }
        if count > 0 {
            sum / count as f64
        } else {
            f64::NAN
        }
    }

    fn mask(&mut self) -> Result<()> {
        let finite = |i: &usize| self.mean[*i].is_finite();
        let all: Vec<usize> = (0..self.mean.len()).filter(finite).collect();
        let (kept, threshold): (Vec<usize>, Option<f64>) = match &self.movie.mask {
            None => (all, None),
            Some(Mask::Painted(runs)) => (self.painted(runs, &all), None),
            Some(Mask::Above(mask)) => (self.above(mask.above, &all), Some(mask.above)),
            Some(Mask::Quantile(mask)) => {
                let mut sorted: Vec<f64> = all.iter().map(|i| self.mean[*i]).collect();
                sorted.sort_by(f64::total_cmp);
                let value = quantile(&sorted, mask.quantile);
                (self.above(value, &all), Some(value))
            }
        };
        if kept.len() < 2 {
            return Err(Problem::new(
                Kind::Contrast,
                "the mask leaves too few pixels",
                "lower the threshold, or paint more",
            )
            .at("movie.mask")
            .expected_found("at least 2 pixels", kept.len()));
        }
        self.kept = Some(kept);
        self.threshold = threshold;
        Ok(())
    }

    fn above(&self, value: f64, all: &[usize]) -> Vec<usize> {
        let bright = |i: &usize| self.mean[*i] > value;
        all.iter().copied().filter(bright).collect()
    }

    fn painted(&self, runs: &[[u32; 3]], all: &[usize]) -> Vec<usize> {
        let mut paint = vec![false; self.height * self.width];
        for [row, first, last] in runs {
            let row = *row as usize - 1;
            let (first, last) = (*first as usize - 1, (*last as usize).min(self.width));
            if row < self.height && first < last {
                paint[row * self.width + first..row * self.width + last].fill(true);
            }
        }
        let side = self.movie.side() as usize;
        let half = |bin: &usize| {
            let (row, column) = (bin / self.columns * side, bin % self.columns * side);
            let inside = (row..row + side)
                .flat_map(|r| (column..column + side).map(move |c| r * self.width + c));
            2 * inside.filter(|p| paint[*p]).count() >= side * side
        };
        all.iter().copied().filter(half).collect()
    }

    /// Samples of the next used bin.
    fn push(&mut self, recording: &Recording) {
        let at = self.samples.len() + self.dark;
        let Some(&bin) = self.kept.as_ref().and_then(|kept| kept.get(at)) else {
            return;
        };
        let mut sum = vec![0.0f64; recording.sample_count()];
        let mut count = 0;
        for channel in self.sources(bin) {
            count += 1;
            for (s, x) in sum.iter_mut().zip(&recording.samples[channel]) {
                *s += f64::from(*x);
            }
        }
        sum.iter_mut().for_each(|s| *s /= f64::from(count.max(1)));
        let Some(dff) = self.movie.dff else {
            self.samples.push(sum.iter().map(|x| *x as f32).collect());
            self.used.push(bin);
            return;
        };
        match against_baseline(&sum, &recording.stretches, recording.rate_hz, dff) {
            Some(samples) => {
                self.samples.push(samples);
                self.used.push(bin);
            }
            None => self.dark += 1,
        }
    }

    /// The recording whose channels are the used bins, and what is said of them.
    pub fn finish(self, recording: &Recording) -> (Recording, MovieCard) {
        let unit = match self.movie.dff {
            Some(_) => "ΔF/F".to_owned(),
            None => recording
                .channels
                .first()
                .map_or_else(String::new, |c| c.unit.clone()),
        };
        let channels = self.used.iter().map(|bin| Channel {
            name: pixel_name((bin / self.columns) as u32, (bin % self.columns) as u32),
            unit: unit.clone(),
            position: None,
        });
        let mut warnings = recording.warnings.clone();
        if self.dark > 0 {
            let (pixels, have) = if self.dark == 1 {
                ("pixel has", "it is")
            } else {
                ("pixels have", "they are")
            };
            warnings.push(format!(
                "{} {pixels} a baseline that is not above 0, of which ΔF/F cannot be a share; {have} left out.",
                self.dark
            ));
        }
        let card = MovieCard {
            height: self.height as u32,
            width: self.width as u32,
            rows: self.rows as u32,
            columns: self.columns as u32,
            mean: self.mean.iter().map(|x| *x as f32).collect(),
            used: self.used.iter().map(|bin| *bin as u32).collect(),
            threshold: self.threshold,
        };
        let made = Recording {
            name: recording.name.clone(),
            format: recording.format.clone(),
            rate_hz: recording.rate_hz,
            channels: channels.collect(),
            others: recording.others.clone(),
            samples: self.samples,
            layout: Layout::Frames {
                height: self.rows as u32,
                width: self.columns as u32,
                pixels: card.used.clone(),
            },
            stretches: recording.stretches.clone(),
            events: recording.events.clone(),
            about: recording.about.clone(),
            side_files: recording.side_files.clone(),
            warnings,
        };
        (made, card)
    }
}

/// What is said of a movie that stays as it was recorded.
pub fn as_recorded(recording: &Recording) -> Option<MovieCard> {
    let Layout::Frames {
        height,
        width,
        pixels,
    } = &recording.layout
    else {
        return None;
    };
    let mut mean = vec![f32::NAN; *height as usize * *width as usize];
    for (samples, pixel) in recording.samples.iter().zip(pixels) {
        let sum: f64 = samples.iter().map(|x| f64::from(*x)).sum();
        if let Some(slot) = mean.get_mut(*pixel as usize) {
            *slot = (sum / samples.len().max(1) as f64) as f32;
        }
    }
    Some(MovieCard {
        height: *height,
        width: *width,
        rows: *height,
        columns: *width,
        mean,
        used: pixels.clone(),
        threshold: None,
    })
}

/// (F − F₀)/F₀ within each unbroken run; `None` where F₀ is not above 0 throughout.
pub fn against_baseline(
    samples: &[f64],
    stretches: &[Stretch],
    rate_hz: f64,
    dff: Dff,
) -> Option<Vec<f32>> {
    let half = (dff.window_s * rate_hz / 2.0).round().max(0.0) as usize;
    let mut out = Vec::with_capacity(samples.len());
    for stretch in stretches {
        let part = samples.get(stretch.first..stretch.first + stretch.count)?;
        let mut sorted: Vec<f64> = Vec::with_capacity(2 * half.min(part.len()) + 1);
        let place = |sorted: &[f64], x: f64| sorted.partition_point(|y| y.total_cmp(&x).is_lt());
        for (t, x) in part.iter().enumerate() {
            // The window holds t − half up to t + half, as far as there are samples.
            let (from, to) = (t.saturating_sub(half), (t + half + 1).min(part.len()));
            if t == 0 {
                sorted.extend(&part[from..to]);
                sorted.sort_by(f64::total_cmp);
            } else {
                if t > half {
                    let gone = place(&sorted, part[t - half - 1]);
                    sorted.remove(gone);
                }
                if t + half < part.len() {
                    let new = part[t + half];
                    sorted.insert(place(&sorted, new), new);
                }
            }
            let base = quantile(&sorted, dff.percentile / 100.0);
            if base.is_nan() || base <= 0.0 {
                return None;
            }
            out.push(((x - base) / base) as f32);
        }
    }
    Some(out)
}

/// Linear between order statistics.
fn quantile(sorted: &[f64], q: f64) -> f64 {
    let Some(last) = sorted.len().checked_sub(1) else {
        return f64::NAN;
    };
    let at = q * last as f64;
    let (low, high) = (at.floor() as usize, at.ceil() as usize);
    sorted[low] + (sorted[high] - sorted[low]) * (at - low as f64)
}
