//! What a recording is, and how one is opened.
//!
//! # Units
//! Voltages are brought to µV, magnetic fields stay as written. Times are seconds from the start of the file's own clock.
//!
//! # Axis order
//! `samples[channel][sample]`, one `Vec<f32>` a channel, all at [`Recording::rate_hz`].
//!
//! # Time
//! The file's clock starts at the start time in its header. A file may say that its first sample comes a fraction of a second
//! later, or that there are gaps: a sample's time is its [`Stretch`]'s onset plus its place in the stretch over the rate.
//!
//! # Adding a format
//! One file with a `FORMAT` row (name, score of the first bytes, begin) and a type that implements the crate's `Reader`;
//! one line in the table of `opening.rs`. The content decides who reads a file, its name never does.
mod budget;
pub mod edf;
mod given;
mod gzip;
mod joined;
pub mod large;
mod names;
mod opening;
pub mod pyramid;
mod sides;
mod table;
mod units;

pub use budget::MEMORY_BYTES;
pub use given::UNITS;
pub use joined::natural_order;
pub use large::Large;
pub use opening::{MemorySource, OpenOptions, Opened, Opening, open};
pub use sides::{EventsPreview, events_preview, is_side_table, lies_beside};

use serde::{Deserialize, Serialize};
use std::collections::BTreeMap;

/// A multichannel recording in memory.
#[derive(Debug, Clone, Default)]
pub struct Recording {
    /// File name without its folder.
    pub name: String,
    /// Format and variant, as its standard spells it: `EDF`, `EDF+C`, `EDF+D`, or `synthetic` for a demo.
    pub format: String,
    /// Sampling rate of every analysed channel.
    pub rate_hz: f64,
    /// The analysed channels, in file order.
    pub channels: Vec<Channel>,
    /// Channels that are listed and not analysed, with the reason.
    pub others: Vec<OtherChannel>,
    /// `channels × samples`.
    pub samples: Vec<Vec<f32>>,
    /// How the channels lie to each other.
    pub layout: Layout,
    /// Unbroken runs of samples, in order; together they cover every sample.
    pub stretches: Vec<Stretch>,
    /// Events in order of onset.
    pub events: Vec<Event>,
    /// What its header and its side files tell beside that.
    pub about: About,
    /// Names of the side files that were used.
    pub side_files: Vec<String>,
    /// What a careful reader of this file should know, each a sentence.
    pub warnings: Vec<String>,
}

/// What a header and side files tell beside samples and events.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct About {
    /// Time of day at which the file's clock starts, `22:13:05`; the day is not kept.
    pub start: Option<String>,
    /// Kinds of channels by name, as the table of channels gives them: `EEG`, `EOG`, ….
    pub kinds: BTreeMap<String, String>,
    /// Channels that a side file sets aside, by name, with the reason: they are not analysed unless the recipe keeps them.
    pub aside: BTreeMap<String, String>,
    /// Frequency of the mains where it was recorded.
    pub mains_hz: Option<f64>,
    /// The reference, in the words of a side file.
    pub reference: Option<String>,
    /// The side file that positions come from.
    pub positions: Option<String>,
    /// A table of events that is not used because its columns were not told.
    pub untold: Option<String>,
}

/// How the channels lie to each other, which decides what a map is drawn on and who is whose neighbour.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(tag = "kind", rename_all = "kebab-case")]
pub enum Layout {
    /// On a head, as far as positions are known.
    #[default]
    Head,
    /// On a plane: positions are metres, x to the right, y up, z 0 (a grid of electrodes).
    Plane,
    /// On a shaft: the position's z is minus the depth in metres.
    Line,
    /// Pixels of a movie.
    Frames {
        /// Rows of a picture, after binning.
        height: u32,
        /// Columns of a picture, after binning.
        width: u32,
        /// Which pixel each channel is: row · width + column.
        pixels: Vec<u32>,
    },
}

/// One analysed channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Channel {
    /// Label as in the file, trimmed.
    pub name: String,
    /// Unit of its samples, after scaling: `µV` for voltages.
    pub unit: String,
    /// Position in metres or on the unit sphere, where the file or a side file gives one: x to the right, y to the front, z up.
    pub position: Option<[f64; 3]>,
}

/// A channel that is listed and not analysed.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct OtherChannel {
    /// Label as in the file.
    pub name: String,
    /// Unit as in the file.
    pub unit: String,
    /// Its sampling rate.
    pub rate_hz: f64,
    /// Why it is not analysed: "sampled at 1 Hz, most channels at 250 Hz".
    pub reason: String,
}

/// An unbroken run of samples.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Stretch {
    /// Index of its first sample in [`Recording::samples`].
    pub first: usize,
    /// Number of samples.
    pub count: usize,
    /// Time of its first sample on the file's clock.
    pub onset_s: f64,
}

/// Something that happened at a time.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Event {
    /// On the file's clock.
    pub onset_s: f64,
    /// 0 for a moment.
    pub duration_s: f64,
    /// The annotation's text or the table's `trial_type`.
    pub label: String,
}

/// A file dropped together with, or found beside, the recording.
#[derive(Debug, Clone)]
pub struct SideFile {
    /// File name without its folder.
    pub name: String,
    /// Its whole content; side files are small.
    pub bytes: Vec<u8>,
}

/// Bytes that can be read anywhere: a file, a browser's `File`, or memory.
pub trait Source {
    /// File name without its folder.
    fn name(&self) -> &str;
    /// Length in bytes.
    fn len(&self) -> u64;
    /// Whether there is nothing.
    fn is_empty(&self) -> bool {
        self.len() == 0
    }
    /// Fills `out` with the bytes from `offset` on; asking beyond the end is an error.
    fn read_at(&mut self, offset: u64, out: &mut [u8]) -> crate::error::Result<()>;
}

impl Recording {
    /// Samples a channel; where the samples stay in the file, as many as its stretches say.
    pub fn sample_count(&self) -> usize {
        let all = || self.stretches.last().map_or(0, |s| s.first + s.count);
        self.samples.first().map_or_else(all, Vec::len)
    }
    /// Seconds that hold samples (gaps left out).
    pub fn duration_s(&self) -> f64 {
        self.sample_count() as f64 / self.rate_hz
    }
    /// Seconds from the start of the clock to the end of the last stretch.
    pub fn span_s(&self) -> f64 {
        self.stretches
            .last()
            .map_or(0.0, |s| s.onset_s + s.count as f64 / self.rate_hz)
    }
}
