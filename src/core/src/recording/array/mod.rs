//! Arrays of numbers: what NPY, NPZ and MAT-files have in common.
//!
//! # Axis order
//! Sizes stand as the file writes them. Which axis moves fastest is a property of the file: the last one, or the first one ("Fortran
//! order"). The two together say whether numbers come channel by channel or sample by sample; both are read in slices.
//!
//! # What an array does not carry
//! Its rate, its unit and what its axes are. They are taken from [`Given`], or asked for, all at once.
mod feed;
mod number;

pub(super) use feed::Feed;
pub(super) use number::Number;

use super::budget::Budget;
use super::given::Asking;
use super::opening::Reader;
use super::units::Unit;
use super::{Channel, Layout, Recording, Source, Stretch};
use crate::error::{Kind, Problem, Result};
use crate::recipe::{Axes, Given};

/// Bytes read a step: whole rows, and at least one.
const SLICE_BYTES: u64 = 8 << 20;
/// What a channel takes beside its samples: its name, its unit, its entry in the tables.
pub(super) const CHANNEL_BYTES: u64 = 160;

/// An array as it stands in a file.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Array {
    /// Type of its numbers.
    pub(super) number: Number,
    /// Most significant byte first.
    pub(super) big_endian: bool,
    /// Sizes of its axes, as the file writes them.
    pub(super) sizes: Vec<u64>,
    /// The first axis moves fastest.
    pub(super) first_fastest: bool,
}

impl Array {
    /// Numbers in it; `None` beyond 64 bits.
    pub(super) fn count(&self) -> Option<u64> {
        self.sizes
            .iter()
            .try_fold(1u64, |product, size| product.checked_mul(*size))
    }
    /// Bytes of its numbers; `None` beyond 64 bits.
    pub(super) fn bytes(&self) -> Option<u64> {
        self.count()?.checked_mul(self.number.bytes() as u64)
    }
    /// Whether it can hold a recording: channels and samples, or pictures.
    pub(super) fn fits(&self) -> bool {
        matches!(self.sizes.len(), 2 | 3) && self.sizes.iter().all(|s| *s > 0) && {
            let count = self.count();
            count.is_none_or(|n| n > 1)
        }
    }
    /// `32 × 15000`.
    pub(super) fn shape(&self) -> String {
        let sizes: Vec<String> = self.sizes.iter().map(u64::to_string).collect();
        match sizes.len() {
            0 => "1 value".to_owned(),
            _ => sizes.join(" × "),
        }
    }
}

/// How an array's numbers become channels and samples.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Plan {
    channels: u64,
    samples: u64,
    /// All samples of the first channel come first.
    by_channel: bool,
    /// Height and width, where the channels are pixels.
    picture: Option<[u64; 2]>,
    /// Pixels come column by column.
    by_column: bool,
}

impl Plan {
    fn of(array: &Array, axes: Axes) -> Option<Plan> {
        let first = array.first_fastest;
        let plain = |channels, samples, by_channel| Plan {
            channels,
            samples,
            by_channel,
            picture: None,
            by_column: false,
        };
        let movie = |frames, height: u64, width: u64, frames_first: bool| {
            Some(Plan {
                channels: height.checked_mul(width)?,
                samples: frames,
                by_channel: frames_first == first,
                picture: Some([height, width]),
                by_column: first,
            })
        };
        match (axes, &array.sizes[..]) {
            (Axes::ChannelsSamples, &[channels, samples]) => Some(plain(channels, samples, !first)),
            (Axes::SamplesChannels, &[samples, channels]) => Some(plain(channels, samples, first)),
            (Axes::FramesHeightWidth, &[frames, height, width]) => {
                movie(frames, height, width, true)
            }
            (Axes::HeightWidthFrames, &[height, width, frames]) => {
                movie(frames, height, width, false)
            }
            _ => None,
        }
    }
}

/// What is known of an array's meaning.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Meaning {
    plan: Plan,
    rate_hz: f64,
    unit: Unit,
}

/// What a movie's unit is likely to be, and a whole number's.
const LIKELY_UNIT: &str = "counts";

/// Asks what an array does not carry: its axes, its rate unless `found_hz` tells it, its unit.
pub(super) fn ask(array: &Array, found_hz: Option<f64>, asking: &mut Asking) -> Option<Meaning> {
    let movie = array.sizes.len() == 3;
    let possible: &[Axes] = if movie {
        &[Axes::FramesHeightWidth, Axes::HeightWidthFrames]
    } else {
        &[Axes::ChannelsSamples, Axes::SamplesChannels]
    };
    let guess = match array.sizes[..] {
        [rows, columns] => usize::from(rows > columns),
        _ => usize::from(array.first_fastest),
    };
    let axes = asking.axes(&array.sizes, possible, possible.get(guess).copied());
    let rate_hz = match found_hz {
        Some(hz) if hz.is_finite() && hz > 0.0 && asking.told_rate().is_none() => Some(hz),
        _ => asking.rate(if movie { "frames" } else { "samples" }),
    };
    let likely = movie || array.number.is_whole();
    let unit = asking.unit(likely.then_some(LIKELY_UNIT));
    Some(Meaning {
        plan: Plan::of(array, axes?)?,
        rate_hz: rate_hz?,
        unit: unit?,
    })
}

/// What the array means, from `given` and what the file tells beside it; asks for the rest.
///
/// # Errors
/// `NeedsAnswer` with every open question, `TooLarge` where its values cannot be counted.
pub(super) fn meaning(array: &Array, given: &Given, found_hz: Option<f64>) -> Result<Meaning> {
    if array.bytes().is_none() {
        return Err(Problem::new(
            Kind::TooLarge,
            "the array claims more values than can be counted",
            "check the file with the program that wrote it",
        )
        .at("shape of the array")
        .expected_found("fewer than 2^64 bytes", array.shape()));
    }
    let mut asking = Asking::new(given);
    let meaning = ask(array, found_hz, &mut asking);
    asking.settle(&format!("the array of {} values", array.shape()))?;
    meaning.ok_or_else(|| not_fitting(array))
}

pub(super) fn not_fitting(array: &Array) -> Problem {
    Problem::new(
        Kind::Unsupported,
        "the array is neither channels × samples nor frames × height × width",
        "save a recording with two axes or a movie with three, none of them empty",
    )
    .at("shape of the array")
    .expected_found("2 or 3 axes", array.shape())
}

/// Reads the numbers of an array in slices.
pub(super) struct ArrayReader {
    format: String,
    array: Array,
    meaning: Meaning,
    feed: Feed,
    slice: Vec<u8>,
    samples: Vec<Vec<f32>>,
    /// Numbers read.
    done: u64,
    warnings: Vec<String>,
}

impl ArrayReader {
    /// `feed` stands at the first number. All memory is drawn before any is taken.
    ///
    /// # Errors
    /// `Damaged` where an uncompressed array is longer than the file, `TooLarge`.
    pub(super) fn begin(
        format: &str,
        array: Array,
        meaning: Meaning,
        feed: Feed,
        budget: &mut Budget,
    ) -> Result<Box<dyn Reader>> {
        let bytes = array.bytes().unwrap_or(u64::MAX);
        feed.holds(bytes)?;
        let Plan {
            channels, samples, ..
        } = meaning.plan;
        budget.draw(channels.saturating_mul(CHANNEL_BYTES), "its channels")?;
        let size = array.number.bytes() as u64;
        let row = if meaning.plan.by_channel {
            size
        } else {
            channels * size
        };
        let slice_bytes = (SLICE_BYTES / row).max(1).saturating_mul(row).min(bytes);
        let slice = budget.vec(slice_bytes, "a slice of it")?;
        let columns = columns(channels, samples, budget)?;
        Ok(Box::new(ArrayReader {
            format: format.to_owned(),
            array,
            meaning,
            feed,
            slice,
            samples: columns,
            done: 0,
            warnings: Vec::new(),
        }))
    }

    fn take(&mut self, bytes: usize) {
        let Plan {
            channels,
            samples,
            by_channel,
            ..
        } = self.meaning.plan;
        let (size, factor) = (self.array.number.bytes(), self.meaning.unit.factor);
        let slice = &self.slice[..bytes];
        let decode = |from: usize, step: usize, count: usize, out: &mut Vec<f32>| {
            self.array.number.decode(
                self.array.big_endian,
                &slice[from * size..],
                step,
                count,
                factor,
                out,
            );
        };
        let count = bytes / size;
        if by_channel {
            let mut at = 0;
            while at < count {
                let number = self.done + at as u64;
                let channel = (number / samples) as usize;
                let left = (samples - number % samples) as usize;
                let run = left.min(count - at);
                decode(at, 1, run, &mut self.samples[channel]);
                at += run;
            }
        } else {
            let wide = channels as usize;
            for (channel, out) in self.samples.iter_mut().enumerate() {
                decode(channel, wide, count / wide, out);
            }
        }
        self.done += count as u64;
    }
}

/// Room for the samples of every channel, drawn as a whole before any is taken.
pub(super) fn columns(channels: u64, samples: u64, budget: &mut Budget) -> Result<Vec<Vec<f32>>> {
    let bytes = channels.saturating_mul(samples).saturating_mul(4);
    budget.draw(bytes, "its samples")?;
    let (channels, samples) = (channels as usize, samples as usize);
    let mut all = Vec::new();
    let refused = || {
        Problem::new(
            Kind::TooLarge,
            "the recording is larger than the memory for it",
            "open a shorter part of it",
        )
        .at("its samples")
    };
    all.try_reserve_exact(channels).map_err(|_| refused())?;
    for _ in 0..channels {
        let mut column = Vec::new();
        column.try_reserve_exact(samples).map_err(|_| refused())?;
        all.push(column);
    }
    Ok(all)
}

/// A movie's pixels as channels, row by row: `r1c1`, `r1c2`, …
pub(super) fn pixels(height: u32, width: u32, unit: &str) -> Vec<Channel> {
    (0..height)
        .flat_map(|row| (0..width).map(move |column| (row, column)))
        .map(|(row, column)| Channel {
            name: super::pixel_name(row, column),
            unit: unit.to_owned(),
            position: None,
        })
        .collect()
}

impl Reader for ArrayReader {
    fn step(&mut self, source: &mut dyn Source, _budget: &mut Budget) -> Result<(u64, u64)> {
        let size = self.array.number.bytes() as u64;
        let all = self.array.bytes().unwrap_or(0);
        let left = all - self.done * size;
        let bytes = (self.slice.capacity() as u64).min(left);
        let row = match self.meaning.plan.by_channel {
            true => size,
            false => self.meaning.plan.channels * size,
        };
        let bytes = (bytes / row * row) as usize;
        self.slice.resize(bytes, 0);
        let mut slice = std::mem::take(&mut self.slice);
        let filled = self.feed.fill(source, &mut slice);
        self.slice = slice;
        filled?;
        self.take(bytes);
        Ok((self.done * size, all))
    }

    fn finish(self: Box<Self>) -> Result<Recording> {
        let this = *self;
        let Meaning {
            plan,
            rate_hz,
            unit,
            ..
        } = this.meaning;
        let mut samples = this.samples;
        let (channels, layout) = match plan.picture {
            Some([height, width]) => {
                if plan.by_column {
                    samples = by_row(samples, height as usize, width as usize);
                }
                let (height, width) = (height as u32, width as u32);
                let pixels_of = (0..height * width).collect();
                (
                    pixels(height, width, &unit.name),
                    Layout::Frames {
                        height,
                        width,
                        pixels: pixels_of,
                    },
                )
            }
            None => (numbered(plan.channels, &unit.name), Layout::Head),
        };
        Ok(Recording {
            name: String::new(),
            format: this.format,
            rate_hz,
            channels,
            others: Vec::new(),
            samples,
            layout,
            stretches: vec![Stretch {
                first: 0,
                count: plan.samples as usize,
                onset_s: 0.0,
            }],
            events: Vec::new(),
            about: crate::recording::About::default(),
            side_files: Vec::new(),
            warnings: this.warnings,
        })
    }
}

/// Columns that came picture column by picture column, row by row.
fn by_row(mut columns: Vec<Vec<f32>>, height: usize, width: usize) -> Vec<Vec<f32>> {
    let mut rows = Vec::with_capacity(columns.len());
    for pixel in 0..height * width {
        let (row, column) = (pixel / width, pixel % width);
        rows.push(std::mem::take(&mut columns[column * height + row]));
    }
    rows
}

fn numbered(channels: u64, unit: &str) -> Vec<Channel> {
    (1..=channels)
        .map(|n| Channel {
            name: format!("channel {n}"),
            unit: unit.to_owned(),
            position: None,
        })
        .collect()
}
