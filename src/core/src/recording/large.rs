//! A recording that does not fit into the memory: looked over once, then read in pieces.
//!
//! [`Opening`](super::Opening) hands the samples through without keeping them; a [`Scan`] takes from them what the page shows before
//! anything is asked: standard deviations, the envelope, the pyramids. What is asked later is read again from the file, as the islands
//! of samples that it needs: [`Large::gathering`].
//!
//! # Islands
//! Ascending runs of samples, each inside one stretch. As an ordinary [`Recording`] each island is a stretch of its own, with its
//! own time: whatever crosses no island's end comes out as from the whole recording.
use super::pyramid::{BASE, Ends, Pyramid, STEP, ends};
use super::{Recording, Source, Stretch};
use crate::error::{Kind, Problem, Result};
use std::fmt;
use std::ops::Range;

/// Bytes that the pyramids of all channels may take.
const PYRAMID_BYTES: u64 = 32 << 20;
/// Bins of the envelope.
const ENVELOPE_BINS: usize = 444;
/// Samples of all channels that one step of a gathering reads.
const STEP_SAMPLES: usize = 4 << 20;
/// Samples that are read within a moment.
const SOON: f64 = 32e6;
/// Seconds from the middle of the longest stretch that stand for the recording where a look at all samples would take long.
const SAMPLE_SECONDS: f64 = 60.0;

/// What a reader offers that can hand its samples through.
pub(crate) trait Flowing {
    /// Samples a channel, as the header says.
    fn expected(&self) -> usize;
    /// Analysed channels.
    fn channels(&self) -> usize;
    /// The stretches so far.
    fn stretches(&self) -> &[Stretch];
    /// Gives what was decoded since the last time, one channel a call, and lets it go.
    fn drain(&mut self, take: &mut dyn FnMut(usize, &[f32]));
    /// The way back to any samples.
    fn pieces(&self) -> Box<dyn Pieces>;
}

/// Samples anywhere in an open file.
pub(crate) trait Pieces {
    /// Appends samples `first .. first + count` of the wanted channels to theirs in `out`.
    fn read(
        &self,
        source: &mut dyn Source,
        wanted: &[bool],
        first: usize,
        count: usize,
        out: &mut [Vec<f32>],
    ) -> Result<()>;
}

/// Sums over a run of samples, each less a fixed value near them.
#[derive(Debug, Clone, Copy, Default)]
struct Sums {
    count: f64,
    sum: f64,
    squares: f64,
}

impl Sums {
    fn add(&mut self, samples: &[f32], near: f32) {
        const LANES: usize = 4;
        let near = f64::from(near);
        let (mut sum, mut squares) = ([0.0f64; LANES], [0.0f64; LANES]);
        let (whole, rest) = samples.as_chunks::<LANES>();
        for part in whole {
            for i in 0..LANES {
                let x = f64::from(part[i]) - near;
                sum[i] += x;
                squares[i] += x * x;
            }
        }
        for x in rest.iter().map(|x| f64::from(*x) - near) {
            sum[0] += x;
            squares[0] += x * x;
        }
        self.count += samples.len() as f64;
        self.sum += sum.iter().sum::<f64>();
        self.squares += squares.iter().sum::<f64>();
    }
    /// Σ (x − mean)².
    fn about_own_mean(&self) -> f64 {
        (self.squares - self.sum * self.sum / self.count.max(1.0)).max(0.0)
    }
    fn merge(&mut self, other: &Sums) {
        self.count += other.count;
        self.sum += other.sum;
        self.squares += other.squares;
    }
}

/// What one pass leaves of one channel.
#[derive(Debug, Clone)]
struct Track {
    pyramid: Pyramid,
    done: usize,
    near: f32,
    /// The stretch at work.
    stretch: Sums,
    reach: Ends,
    /// Sum of squares about each stretch's own mean, over the stretches that ended.
    within: f64,
    /// Every stretch so far holds one value.
    constant: bool,
    bins: Vec<Sums>,
}

impl Track {
    fn end_stretch(&mut self) {
        self.within += self.stretch.about_own_mean();
        // Of no value there is no smallest: the comparison is false.
        self.constant &= self.reach[0] >= self.reach[1] || self.stretch.count == 0.0;
        self.stretch = Sums::default();
        self.reach = [f32::NAN; 2];
    }
}

/// One pass over all samples.
#[derive(Debug)]
pub(crate) struct Scan {
    expected: usize,
    tracks: Vec<Track>,
}

impl Scan {
    pub(crate) fn new(channels: usize, expected: usize) -> Self {
        let bytes = |base: usize| {
            let bins = expected as u64 / base as u64 * channels as u64;
            bins * size_of::<Ends>() as u64 * 4 / 3
        };
        let mut base = BASE;
        while bytes(base) > PYRAMID_BYTES {
            base *= STEP;
        }
        let track = Track {
            pyramid: Pyramid::new(base),
            done: 0,
            near: 0.0,
            stretch: Sums::default(),
            reach: [f32::NAN; 2],
            within: 0.0,
            constant: true,
            bins: vec![Sums::default(); ENVELOPE_BINS.min(expected.max(1))],
        };
        Scan {
            expected: expected.max(1),
            tracks: vec![track; channels],
        }
    }

    /// Takes the samples that follow on a channel; `stretches` covers them.
    pub(crate) fn push(&mut self, channel: usize, mut samples: &[f32], stretches: &[Stretch]) {
        let Some(track) = self.tracks.get_mut(channel) else {
            return;
        };
        track.pyramid.push(samples);
        let bins = track.bins.len() as u64;
        let ends_at = |bin: u64| ((bin + 1) * self.expected as u64 / bins) as usize;
        let mut at = stretches.partition_point(|s| s.first + s.count <= track.done);
        let mut bin = (track.done as u64 * bins / self.expected as u64).min(bins - 1);
        while !samples.is_empty() {
            let stretch_end = stretches.get(at).map_or(usize::MAX, |s| s.first + s.count);
            if stretch_end <= track.done {
                at += 1;
                continue;
            }
            while bin + 1 < bins && ends_at(bin) <= track.done {
                bin += 1;
            }
            if stretches.get(at).is_some_and(|s| s.first == track.done) {
                track.end_stretch();
                track.near = samples[0];
            }
            let bin_end = if bin + 1 < bins {
                ends_at(bin)
            } else {
                usize::MAX
            };
            let count = (stretch_end.min(bin_end) - track.done).min(samples.len());
            let (now, rest) = samples.split_at(count);
            let mut sums = Sums::default();
            sums.add(now, track.near);
            track.stretch.merge(&sums);
            let [low, high] = ends(now);
            track.reach = [track.reach[0].min(low), track.reach[1].max(high)];
            // The envelope is about the mean of the channel: back to values as they are.
            let near = f64::from(track.near);
            track.bins[bin as usize].merge(&Sums {
                count: sums.count,
                sum: sums.sum + sums.count * near,
                squares: sums.squares + 2.0 * near * sums.sum + sums.count * near * near,
            });
            track.done += count;
            samples = rest;
        }
    }

    /// Standard deviation of each channel about the mean of each stretch (0 for a constant one), and the envelope: root mean square over channels,
    /// each about its mean, in equal bins.
    fn close(mut self, stretches: usize) -> (Vec<f64>, Vec<f64>, Vec<Pyramid>) {
        let bins = self.tracks.first().map_or(0, |t| t.bins.len());
        let mut envelope = vec![0.0; bins];
        let mut sds = Vec::with_capacity(self.tracks.len());
        for track in &mut self.tracks {
            track.end_stretch();
            track.pyramid.close();
            let free = (track.done.saturating_sub(stretches)).max(1) as f64;
            sds.push(if track.constant {
                0.0
            } else {
                (track.within / free).sqrt()
            });
            let whole = track.bins.iter().fold(Sums::default(), |mut all, bin| {
                all.merge(bin);
                all
            });
            let mean = whole.sum / whole.count.max(1.0);
            for (out, bin) in envelope.iter_mut().zip(&track.bins) {
                let about = bin.squares - 2.0 * mean * bin.sum + bin.count * mean * mean;
                *out += about.max(0.0) / bin.count.max(1.0);
            }
        }
        let channels = self.tracks.len().max(1) as f64;
        envelope
            .iter_mut()
            .for_each(|x| *x = (*x / channels).sqrt());
        let pyramids = self.tracks.into_iter().map(|t| t.pyramid).collect();
        (sds, envelope, pyramids)
    }
}

/// An open recording whose samples stay in the file.
pub struct Large {
    outline: Recording,
    source: Box<dyn Source>,
    pieces: Box<dyn Pieces>,
    sds: Vec<f64>,
    envelope: Vec<f64>,
    pyramids: Vec<Pyramid>,
    middle: Recording,
}

impl fmt::Debug for Large {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Large")
            .field("outline", &self.outline)
            .finish_non_exhaustive()
    }
}

impl Large {
    pub(crate) fn new(
        outline: Recording,
        source: Box<dyn Source>,
        pieces: Box<dyn Pieces>,
        scan: Scan,
    ) -> Result<Self> {
        let (sds, envelope, pyramids) = scan.close(outline.stretches.len());
        let mut large = Large {
            middle: Recording::default(),
            outline,
            source,
            pieces,
            sds,
            envelope,
            pyramids,
        };
        large.middle = large.read_middle()?;
        Ok(large)
    }

    /// The recording without its samples.
    pub fn outline(&self) -> &Recording {
        &self.outline
    }

    /// Standard deviation of each channel about the mean of each stretch; 0 for one that is constant in every stretch.
    pub fn sds(&self) -> &[f64] {
        &self.sds
    }

    /// See [`crate::sheet::RecordingCard::envelope`].
    pub fn envelope(&self) -> &[f64] {
        &self.envelope
    }

    /// Up to 60 s from the middle of the longest stretch.
    pub fn middle(&self) -> &Recording {
        &self.middle
    }

    /// A channel's bins; their lowest level depends on the length of the recording.
    pub fn pyramid(&self, channel: usize) -> Option<&Pyramid> {
        self.pyramids.get(channel)
    }

    fn read_middle(&mut self) -> Result<Recording> {
        let longest = self.outline.stretches.iter().max_by_key(|s| s.count);
        let Some(stretch) = longest.copied() else {
            return Ok(self.outline.clone());
        };
        let count = ((SAMPLE_SECONDS * self.outline.rate_hz) as usize).clamp(1, stretch.count);
        let first = stretch.first + (stretch.count - count) / 2;
        self.run(std::slice::from_ref(&(first..first + count)))
    }

    /// The islands at once, with all channels.
    pub fn run(&mut self, islands: &[Range<usize>]) -> Result<Recording> {
        let all = vec![true; self.outline.channels.len()];
        let mut gathering = self.gathering(islands.to_vec(), all);
        while !self.gather(&mut gathering)? {}
        Ok(self.gathered(gathering))
    }

    /// Whether a span of so many seconds can be read within a moment.
    pub fn reads_soon(&self, seconds: f64) -> bool {
        seconds * self.outline.rate_hz * self.outline.channels.len() as f64 <= SOON
    }

    /// The samples of a span of time at once, cut where gaps are.
    pub fn span(&mut self, from_s: f64, to_s: f64) -> Result<Recording> {
        let islands = inside(&self.outline, from_s, to_s);
        self.run(&islands)
    }

    /// Begins to read islands: ascending, apart, each inside one stretch. Channels that are not wanted stay empty.
    pub fn gathering(&self, islands: Vec<Range<usize>>, wanted: Vec<bool>) -> Gathering {
        Gathering {
            all: islands.iter().map(Range::len).sum(),
            samples: vec![Vec::new(); wanted.len()],
            islands,
            wanted,
            at: 0,
            inside: 0,
            done: 0,
        }
    }

    /// Reads the next slice; true when all is read.
    pub fn gather(&mut self, gathering: &mut Gathering) -> Result<bool> {
        let Some(island) = gathering.islands.get(gathering.at) else {
            return Ok(true);
        };
        if gathering.done == 0 {
            for (samples, wanted) in gathering.samples.iter_mut().zip(&gathering.wanted) {
                let count = if *wanted { gathering.all } else { 0 };
                samples.try_reserve_exact(count).map_err(|_| no_room())?;
            }
        }
        let most = (STEP_SAMPLES / gathering.wanted.len().max(1)).max(1);
        let count = (island.len() - gathering.inside).min(most);
        self.pieces
            .read(
                self.source.as_mut(),
                &gathering.wanted,
                island.start + gathering.inside,
                count,
                &mut gathering.samples,
            )
            .map_err(|problem| problem.in_file(self.outline.name.as_str()))?;
        gathering.inside += count;
        gathering.done += count;
        if gathering.inside == island.len() {
            gathering.at += 1;
            gathering.inside = 0;
        }
        Ok(gathering.at == gathering.islands.len())
    }

    /// The islands as a recording.
    pub fn gathered(&self, gathering: Gathering) -> Recording {
        let mut first = 0;
        let stretches = gathering.islands.iter().map(|island| {
            let stretch = stretch_of(&self.outline.stretches, island.start);
            let onset_s = stretch.map_or(0.0, |s| {
                s.onset_s + (island.start - s.first) as f64 / self.outline.rate_hz
            });
            let now = Stretch {
                first,
                count: island.len(),
                onset_s,
            };
            first += island.len();
            now
        });
        Recording {
            stretches: stretches.collect(),
            samples: gathering.samples,
            ..self.outline.clone()
        }
    }

    /// `count` bins of `size` samples from bin `first` on of some channels; see [`crate::analysis::lines`]. Small bins are read from the file.
    pub(crate) fn bins(
        &mut self,
        which: &[usize],
        size: usize,
        first: usize,
        count: usize,
    ) -> Result<Vec<Vec<Ends>>> {
        let ready = which.iter().all(|c| {
            self.pyramids
                .get(*c)
                .is_none_or(|p| p.level(size).is_some())
        });
        let part = |level: &[Ends]| -> Vec<Ends> {
            level.iter().skip(first).take(count).copied().collect()
        };
        if ready {
            let level = |c: &usize| self.pyramids.get(*c).and_then(|p| p.level(size));
            return Ok(which
                .iter()
                .map(|c| level(c).map(part).unwrap_or_default())
                .collect());
        }
        let all = self.outline.sample_count();
        let [mut from, to] =
            [first, first.saturating_add(count)].map(|bin| bin.saturating_mul(size).min(all));
        let mut wanted = vec![false; self.outline.channels.len()];
        for c in which {
            if let Some(one) = wanted.get_mut(*c) {
                *one = true;
            }
        }
        // Whole bins at a time, so that no bin is cut.
        let slice = (STEP_SAMPLES / wanted.len().max(1) / size).max(1) * size;
        let mut out = vec![Vec::new(); which.len()];
        while from < to {
            let count = (to - from).min(slice);
            let mut samples = vec![Vec::new(); wanted.len()];
            self.pieces
                .read(self.source.as_mut(), &wanted, from, count, &mut samples)?;
            for (bins, c) in out.iter_mut().zip(which) {
                let read = samples.get(*c).map_or(&[][..], Vec::as_slice);
                bins.extend(read.chunks(size).map(ends));
            }
            from += count;
        }
        Ok(out)
    }
}

/// Islands that are being read.
#[derive(Debug)]
pub struct Gathering {
    islands: Vec<Range<usize>>,
    wanted: Vec<bool>,
    at: usize,
    inside: usize,
    done: usize,
    all: usize,
    samples: Vec<Vec<f32>>,
}

impl Gathering {
    /// Samples a channel read, and in all.
    pub fn progress(&self) -> (u64, u64) {
        (self.done as u64, self.all as u64)
    }
    /// What it reads.
    pub fn reads(&self) -> (&[Range<usize>], &[bool]) {
        (&self.islands, &self.wanted)
    }
}

/// The stretch that holds a sample.
pub(crate) fn stretch_of(stretches: &[Stretch], sample: usize) -> Option<&Stretch> {
    stretches.get(stretches.partition_point(|s| s.first + s.count <= sample))
}

/// The samples between two times, one range a stretch.
pub(crate) fn inside(recording: &Recording, from_s: f64, to_s: f64) -> Vec<Range<usize>> {
    let rate = recording.rate_hz;
    let within = |s: &Stretch| {
        let at = |t: f64| ((t - s.onset_s) * rate).clamp(0.0, s.count as f64);
        s.first + at(from_s).floor() as usize..s.first + at(to_s).ceil() as usize
    };
    recording
        .stretches
        .iter()
        .map(within)
        .filter(|range| !range.is_empty())
        .collect()
}

fn no_room() -> Problem {
    Problem::new(
        Kind::TooLarge,
        "the parts of the recording that the windows need do not fit into the memory",
        "use fewer events, shorter windows or fewer channels, or cut the recording into shorter files first",
    )
}
