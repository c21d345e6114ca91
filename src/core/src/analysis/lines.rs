//! Lines to look at: channels as recorded, channels as prepared, and components, each as smallest and largest values of equal bins.
//!
//! # Bins
//! As in [`crate::recording::pyramid`]: sizes are powers of four. Bins of fewer than [`BASE`] samples are read from the samples,
//! larger ones from a pyramid that is made when a line is first looked at from afar, and forgotten when the line changes.
use super::Analysis;
use crate::error::Result;
use crate::prepare::Prepared;
use crate::recipe::{Channels, Filter};
use crate::recording::pyramid::{BASE, Ends, Pyramid, ends};
use crate::recording::{Large, Recording, Stretch};
use serde::{Deserialize, Serialize};

/// Which lines.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Kind {
    /// Channels as recorded.
    Recorded,
    /// Channels after the preparation.
    Prepared,
    /// Components, stronger ones first.
    Components,
}

/// What lines of one kind there are.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Track {
    /// Their sampling rate.
    pub rate_hz: f64,
    /// Where their samples lie on the file's clock.
    pub stretches: Vec<Stretch>,
    /// One entry a line.
    pub lines: Vec<Line>,
}

/// One line.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Line {
    /// Channel's name, or `stronger 1`.
    pub name: String,
    /// Unit of its values; empty for components, whose variance is 1 in the reference windows.
    pub unit: String,
    /// How far it usually swings: median over pieces of one second of largest less smallest value.
    pub swing: f64,
}

/// Pieces that a line's swing is measured on.
const PIECES: usize = 40;

/// Pyramids of the lines that were looked at from afar.
#[derive(Debug, Default)]
pub struct Lines {
    recorded: Vec<Option<Pyramid>>,
    prepared: Vec<Option<Pyramid>>,
    /// What `prepared` was made with.
    preparation: Option<(Channels, Filter)>,
    components: Vec<(Vec<f64>, Pyramid)>,
}

impl Lines {
    /// The lines of a recording: one entry a channel.
    pub fn recorded(recording: &Recording) -> Track {
        let line = |(channel, samples): (&crate::recording::Channel, &Vec<f32>)| Line {
            name: channel.name.clone(),
            unit: channel.unit.clone(),
            swing: swing(samples, recording.rate_hz),
        };
        Track {
            rate_hz: recording.rate_hz,
            stretches: recording.stretches.clone(),
            lines: (recording.channels.iter())
                .zip(&recording.samples)
                .map(line)
                .collect(),
        }
    }

    /// The lines of a recording whose samples stay in the file; how they swing is taken from its middle.
    pub fn recorded_large(large: &Large) -> Track {
        let middle = Lines::recorded(large.middle());
        Track {
            stretches: large.outline().stretches.clone(),
            ..middle
        }
    }

    /// See [`Lines::of_recorded`]; small bins are read from the file.
    pub fn of_large(
        large: &mut Large,
        which: &[usize],
        size: usize,
        first: usize,
        count: usize,
    ) -> Result<Vec<f32>> {
        let mut out = Vec::with_capacity(2 * count * which.len());
        for bins in large.bins(which, size.max(1), first, count)? {
            append(&mut out, &bins, count);
        }
        Ok(out)
    }

    /// The prepared channels, once there are any.
    pub fn prepared(analysis: &Analysis) -> Option<Track> {
        let prepared = analysis.work.prepared.as_ref()?;
        let line = |(at, name): (usize, &String)| {
            analysis.channel(at).map(|samples| Line {
                name: name.clone(),
                unit: prepared.unit.clone(),
                swing: swing(samples, prepared.rate_hz),
            })
        };
        Some(Track {
            rate_hz: prepared.rate_hz,
            stretches: prepared.stretches.clone(),
            lines: (prepared.channels.iter().enumerate())
                .filter_map(line)
                .collect(),
        })
    }

    /// The reported components, once there are any.
    pub fn components(analysis: &Analysis) -> Option<Track> {
        let prepared = analysis.work.prepared.as_ref()?;
        let sheet = analysis.sheet();
        let named = |word: &'static str| move |i: usize| format!("{word} {}", i + 1);
        let names = (0..sheet.stronger.len())
            .map(named("stronger"))
            .chain((0..sheet.weaker.len()).map(named("weaker")));
        let lines: Vec<Line> = names
            .zip(analysis.work.inner_filters())
            .map(|(name, filter)| Line {
                name,
                unit: String::new(),
                swing: swing_of(
                    prepared.samples.first().map_or(0, Vec::len),
                    prepared.rate_hz,
                    |from, to| projected(prepared, &filter, from, to),
                ),
            })
            .collect();
        (!lines.is_empty()).then(|| Track {
            rate_hz: prepared.rate_hz,
            stretches: prepared.stretches.clone(),
            lines,
        })
    }

    /// `count` bins of `size` samples from bin `first` on of some recorded channels: `channels × count × (smallest, largest)`, not a
    /// number beyond the end and for channels that do not exist.
    pub fn of_recorded(
        &mut self,
        recording: &Recording,
        which: &[usize],
        size: usize,
        first: usize,
        count: usize,
    ) -> Vec<f32> {
        self.recorded.resize(recording.samples.len(), None);
        gathered(which, count, |at| {
            let samples = recording.samples.get(at)?;
            Some(bins(
                samples,
                self.recorded.get_mut(at)?,
                size,
                first,
                count,
            ))
        })
    }

    /// The same of prepared channels.
    pub fn of_prepared(
        &mut self,
        analysis: &Analysis,
        which: &[usize],
        size: usize,
        first: usize,
        count: usize,
    ) -> Vec<f32> {
        let channels = (analysis.work.prepared.as_ref()).map_or(0, |p| p.channels.len());
        let recipe = analysis.recipe();
        let made_with = (recipe.channels.clone(), recipe.filter.clone());
        if self.preparation.as_ref() != Some(&made_with) || self.prepared.len() != channels {
            self.prepared.clear();
            self.preparation = Some(made_with);
        }
        self.prepared.resize(channels, None);
        gathered(which, count, |at| {
            let samples = analysis.channel(at)?;
            Some(bins(
                samples,
                self.prepared.get_mut(at)?,
                size,
                first,
                count,
            ))
        })
    }

    /// The same of components.
    pub fn of_components(
        &mut self,
        analysis: &Analysis,
        which: &[usize],
        size: usize,
        first: usize,
        count: usize,
    ) -> Vec<f32> {
        let all: Vec<_> = analysis.work.inner_filters().collect();
        self.components
            .retain(|(filter, _)| all.iter().any(|one| one[..] == filter[..]));
        gathered(which, count, |at| {
            let prepared = analysis.work.prepared.as_ref()?;
            Some(self.of_component(prepared, all.get(at)?, size, first, count))
        })
    }

    fn of_component(
        &mut self,
        prepared: &Prepared,
        filter: &[f64],
        size: usize,
        first: usize,
        count: usize,
    ) -> Vec<Ends> {
        let all = prepared.samples.first().map_or(0, Vec::len);
        if size < BASE {
            let [from, to] =
                [first, first.saturating_add(count)].map(|bin| bin.saturating_mul(size).min(all));
            let part = projected(prepared, filter, from, to);
            return part.chunks(size.max(1)).map(ends).collect();
        }
        if !self.components.iter().any(|(f, _)| f == filter) {
            let pyramid = Pyramid::of(&projected(prepared, filter, 0, all), BASE);
            self.components.push((filter.to_vec(), pyramid));
        }
        let kept = self.components.iter().find(|(f, _)| f == filter);
        kept.and_then(|(_, pyramid)| pyramid.level(size))
            .map(|level| part(level, first, count).to_vec())
            .unwrap_or_default()
    }
}

/// The bins of several lines one after the other; a line that is not there is not a number.
fn gathered(
    which: &[usize],
    count: usize,
    mut line: impl FnMut(usize) -> Option<Vec<Ends>>,
) -> Vec<f32> {
    let mut out = Vec::with_capacity(2 * count * which.len());
    for &at in which {
        append(&mut out, &line(at).unwrap_or_default(), count);
    }
    out
}

fn append(out: &mut Vec<f32>, bins: &[Ends], count: usize) {
    out.extend(bins.iter().take(count).flatten());
    let missing = count.saturating_sub(bins.len());
    out.extend(std::iter::repeat_n(f32::NAN, 2 * missing));
}

fn part<T>(all: &[T], first: usize, count: usize) -> &[T] {
    let from = first.min(all.len());
    &all[from..first.saturating_add(count).min(all.len())]
}

fn bins(
    samples: &[f32],
    kept: &mut Option<Pyramid>,
    size: usize,
    first: usize,
    count: usize,
) -> Vec<Ends> {
    let size = size.max(1);
    if size < BASE {
        let inside = part(
            samples,
            first.saturating_mul(size),
            count.saturating_mul(size),
        );
        return inside.chunks(size).map(ends).collect();
    }
    let pyramid = kept.get_or_insert_with(|| Pyramid::of(samples, BASE));
    let level = pyramid.level(size).unwrap_or_default();
    part(level, first, count).to_vec()
}

/// Samples `from..to` of a component.
fn projected(prepared: &Prepared, filter: &[f64], from: usize, to: usize) -> Vec<f32> {
    let mut out = vec![0.0f64; to.saturating_sub(from)];
    for (weight, channel) in filter.iter().zip(&prepared.samples) {
        for (y, x) in out.iter_mut().zip(&channel[from..to]) {
            *y += weight * f64::from(*x);
        }
    }
    out.into_iter().map(|y| y as f32).collect()
}

fn swing(samples: &[f32], rate_hz: f64) -> f64 {
    swing_of(samples.len(), rate_hz, |from, to| {
        samples[from..to].to_vec()
    })
}

/// Median over evenly spread pieces of one second of largest less smallest value.
fn swing_of(all: usize, rate_hz: f64, piece: impl Fn(usize, usize) -> Vec<f32>) -> f64 {
    let long = (rate_hz.ceil() as usize).clamp(1, all.max(1)).min(all);
    let mut found: Vec<f64> = (0..PIECES)
        .map(|i| {
            // A product of two counts outgrows the 32 bits of a browser's usize.
            let from = ((all - long) as u64 * i as u64 / (PIECES as u64 - 1)) as usize;
            let [low, high] = ends(&piece(from, from + long));
            f64::from(high) - f64::from(low)
        })
        .filter(|v| v.is_finite())
        .collect();
    found.sort_by(f64::total_cmp);
    found.get(found.len() / 2).copied().unwrap_or(0.0)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a panic is the failure of a test")]
    use super::*;
    use crate::demo;

    /// Smallest and largest of samples taken one by one.
    fn plain(samples: &[f64], size: usize, first: usize, count: usize) -> Vec<f32> {
        let mut out = Vec::new();
        for b in first..first + count {
            let part: Vec<f32> = (b * size..(b + 1) * size)
                .filter_map(|i| samples.get(i).map(|v| *v as f32))
                .collect();
            out.extend(ends(&part));
        }
        out
    }

    fn same(a: &[f32], b: &[f32], within: f32) -> bool {
        a.len() == b.len()
            && a.iter()
                .zip(b)
                .all(|(x, y)| (x - y).abs() <= within || (x.is_nan() && y.is_nan()))
    }

    #[test]
    fn lines_are_what_they_are_made_from_at_every_size() {
        let made = demo::night_watch(demo::WATCH_SEED);
        let mut recipe = made.recipe.clone();
        recipe.filter.high_pass_hz = Some(1.0);
        recipe.filter.resample_hz = Some(125.0);
        recipe.evidence.permutations = 0;
        let mut analysis = Analysis::new(made.recording, recipe).unwrap();
        analysis.run(|_| {}).unwrap();
        let series = analysis.series().unwrap();
        let mut lines = Lines::default();
        let wide =
            |samples: &[f32]| -> Vec<f64> { samples.iter().map(|v| f64::from(*v)).collect() };
        for (size, first, count) in [(1, 100, 50), (16, 7, 30), (64, 0, 40), (1024, 10, 500)] {
            let recorded = lines.of_recorded(analysis.recording(), &[3], size, first, count);
            let samples = wide(&analysis.recording().samples[3]);
            assert!(same(&recorded, &plain(&samples, size, first, count), 0.0));
            let prepared = lines.of_prepared(&analysis, &[5], size, first, count);
            let samples = wide(&analysis.work.prepared.as_ref().unwrap().samples[5]);
            assert!(same(&prepared, &plain(&samples, size, first, count), 0.0));
            let component = lines.of_components(&analysis, &[1], size, first, count);
            // Sums in another order: both are rounded to f32 at the end.
            let expected = plain(&series.samples[1], size, first, count);
            assert!(same(&component, &expected, 1e-5));
        }
    }

    #[test]
    fn lines_follow_a_changed_preparation() {
        let made = demo::night_watch(demo::WATCH_SEED);
        let mut recipe = made.recipe.clone();
        recipe.evidence.permutations = 0;
        let mut analysis = Analysis::new(made.recording, recipe.clone()).unwrap();
        analysis.run(|_| {}).unwrap();
        let mut lines = Lines::default();
        let before = lines.of_prepared(&analysis, &[0], 256, 0, 100);
        recipe.filter.high_pass_hz = Some(2.0);
        analysis.set_recipe(recipe).unwrap();
        analysis.run(|_| {}).unwrap();
        let after = lines.of_prepared(&analysis, &[0], 256, 0, 100);
        assert!(!same(&before, &after, 0.0));
    }

    #[test]
    fn what_does_not_exist_is_blank() {
        let recording = demo::night_watch(demo::WATCH_SEED).recording;
        let mut lines = Lines::default();
        let blank = lines.of_recorded(&recording, &[999], 16, 0, 3);
        assert!(blank.len() == 6 && blank.iter().all(|v| v.is_nan()));
        let beyond = lines.of_recorded(&recording, &[0], 64, usize::MAX / 64, 2);
        assert!(beyond.len() == 4 && beyond.iter().all(|v| v.is_nan()));
    }
}
