//! `recipe.json`: all choices of the user; with a recording it reproduces the result.
//!
//! Unknown keys are errors, every key is optional but `teasel_recipe` and `contrast`.
mod check;
mod contrast;
mod movie;

pub(crate) use check::WHOLE_MAX;
pub use check::{given_check, recipe_check};
pub use contrast::{
    BandReference, Contrast, ContrastKind, EventWindow, HoldBack, REST, Spans, Within,
};
pub use movie::{Above, Dff, Mask, Movie, Quantile};
use serde::{Deserialize, Serialize};
use std::collections::BTreeMap;

/// All choices.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Recipe {
    /// Version of the schema: 1.
    pub teasel_recipe: u32,
    /// What the recording's own file does not say.
    #[serde(default, skip_serializing_if = "Given::is_empty")]
    pub recording: Given,
    /// What becomes of a movie's pixels before they are channels.
    #[serde(default, skip_serializing_if = "Movie::is_plain")]
    pub movie: Movie,
    /// Which channels, against which reference.
    #[serde(default)]
    pub channels: Channels,
    /// Filters and resampling.
    #[serde(default)]
    pub filter: Filter,
    /// Which windows are dropped for what is in them; none by default.
    #[serde(default, skip_serializing_if = "DropWindows::is_empty")]
    pub drop_windows: DropWindows,
    /// The compression dimension C.
    #[serde(default)]
    pub keep: Keep,
    /// Which of the two measures orders and tests the components.
    #[serde(default)]
    pub measure: Measure,
    /// The question.
    pub contrast: Contrast,
    /// Stretches of time in seconds on the recording's clock that no window may touch.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub not_used: Vec<[f64; 2]>,
    /// What is locked away at the end.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub hold_back: Option<HoldBack>,
    /// γ for total, ρ for typical.
    #[serde(default)]
    pub shrink: Shrink,
    /// How many components are reported at each end.
    #[serde(default = "four")]
    pub components: usize,
    /// How spectra are estimated; it changes pictures, not components.
    #[serde(default, skip_serializing_if = "Spectrum::is_welch")]
    pub spectrum: Spectrum,
    /// Folds, permutations, bootstrap, seed.
    #[serde(default)]
    pub evidence: Evidence,
}

/// How the spectra of components are estimated.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Spectrum {
    /// Averaged periodograms (Welch 1967).
    #[default]
    Welch,
    /// Five orthogonal tapers, NW = 3 (Thomson 1982).
    Multitaper,
}

impl Spectrum {
    /// Whether it is the default.
    pub fn is_welch(&self) -> bool {
        *self == Spectrum::Welch
    }
}

impl Recipe {
    /// Everything else at its default, which for `measure` is that of the kind ([`Contrast::usual_measure`]).
    pub fn asking(contrast: Contrast) -> Self {
        Recipe {
            teasel_recipe: 1,
            recording: Given::default(),
            movie: Movie::default(),
            channels: Channels::default(),
            filter: Filter::default(),
            drop_windows: DropWindows::default(),
            keep: Keep::default(),
            measure: contrast.usual_measure(),
            contrast,
            not_used: Vec::new(),
            hold_back: None,
            shrink: Shrink::default(),
            components: four(),
            spectrum: Spectrum::default(),
            evidence: Evidence::default(),
        }
    }

    /// Why no p is told for this question by this measure, as part of a sentence; `None` where there is one.
    ///
    /// A test whose rate of false findings lies above its level in noise is not shown (`tests/reference/calibration.md` keeps the rates).
    pub fn p_withheld(&self) -> Option<&'static str> {
        let by_total = self.measure == Measure::Total;
        matches!(self.contrast, Contrast::Band { .. } if by_total).then_some(
            "p of a rhythm by total power is withheld: in noise with a shared artefact the test finds more than its level. The typical trial has a p",
        )
    }
}

fn four() -> usize {
    4
}

/// What a general format does not carry, told by the user.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Given {
    /// Sampling rate, or frames a second.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub rate_hz: Option<f64>,
    /// Unit of the samples: `uV`, `mV`, `V`, `fT`, `counts`, …
    #[serde(skip_serializing_if = "Option::is_none")]
    pub unit: Option<String>,
    /// What the axes of an array are, in the order of its sizes.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub axes: Option<Axes>,
    /// Which of several named arrays holds the samples.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub variable: Option<String>,
    /// Which columns of the table of events are which, where it is no table of the BIDS standard.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub events: Option<EventColumns>,
}

/// Which columns of a table of events are which.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct EventColumns {
    /// Name of the column of onsets; `column 1`, `column 2` … where the table names none.
    pub onset: String,
    /// What onsets and durations are counted in, from the first sample on.
    #[serde(default)]
    pub unit: TimeUnit,
    /// Name of the column of labels; without one every event is called `event`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub label: Option<String>,
    /// Name of the column of durations.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub duration: Option<String>,
}

/// What the times of a table are counted in.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
pub enum TimeUnit {
    /// Seconds.
    #[default]
    #[serde(rename = "s")]
    Seconds,
    /// Thousandths of a second.
    #[serde(rename = "ms")]
    Milliseconds,
    /// Samples; the first is 0.
    #[serde(rename = "samples")]
    Samples,
}

impl Given {
    /// Whether nothing is told.
    pub fn is_empty(&self) -> bool {
        *self == Given::default()
    }
    /// What is told here, and from `less_sure` what is not.
    #[must_use]
    pub fn or(self, less_sure: Given) -> Given {
        Given {
            rate_hz: self.rate_hz.or(less_sure.rate_hz),
            unit: self.unit.or(less_sure.unit),
            axes: self.axes.or(less_sure.axes),
            variable: self.variable.or(less_sure.variable),
            events: self.events.or(less_sure.events),
        }
    }
}

/// What the axes of an array are, in the order of its sizes as the file writes them.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum Axes {
    /// One row a channel.
    #[serde(rename = "channels,samples")]
    ChannelsSamples,
    /// One row a sample.
    #[serde(rename = "samples,channels")]
    SamplesChannels,
    /// One picture after the other.
    #[serde(rename = "frames,height,width")]
    FramesHeightWidth,
    /// Time along the last axis of a movie.
    #[serde(rename = "height,width,frames")]
    HeightWidthFrames,
}

impl Axes {
    /// All of them.
    pub const ALL: [Axes; 4] = [
        Axes::ChannelsSamples,
        Axes::SamplesChannels,
        Axes::FramesHeightWidth,
        Axes::HeightWidthFrames,
    ];
    /// As it is written in a recipe.
    pub fn name(self) -> &'static str {
        match self {
            Axes::ChannelsSamples => "channels,samples",
            Axes::SamplesChannels => "samples,channels",
            Axes::FramesHeightWidth => "frames,height,width",
            Axes::HeightWidthFrames => "height,width,frames",
        }
    }
}

/// Which channels, against which reference.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Channels {
    /// Channels not analysed.
    pub leave_out: Vec<String>,
    /// Channels replaced by their estimate from the others, by where they lie.
    pub interpolate: Vec<String>,
    /// Doubtful channels that were looked at, and channels that a side file sets aside, which are used as they are.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub keep: Vec<String>,
    /// Reference.
    pub reference: Reference,
    /// Where the channels lie, in place of what names and side files say.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub positions: Option<Positions>,
}

/// Where the channels lie.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Positions {
    /// A rectangular grid of electrodes.
    Grid(Grid),
    /// A shaft with contacts at equal distances.
    Probe(Probe),
    /// Each channel's place: x to the right, y to the front or up, and z up. With a z they lie on a head, without on a plane; in metres,
    /// though only their proportions count.
    At(BTreeMap<String, Vec<f64>>),
}

/// A rectangular grid of electrodes.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Grid {
    /// Electrodes from top to bottom.
    pub rows: usize,
    /// Electrodes from left to right.
    pub columns: usize,
    /// Distance of neighbours.
    #[serde(default = "ten")]
    pub spacing_mm: f64,
    /// Corner of the electrode numbered 1.
    #[serde(default)]
    pub first: Corner,
    /// Where the electrode numbered 2 lies.
    #[serde(default)]
    pub along: Along,
    /// The grid's channels are called this and their number; without one they are the analysed channels in file order.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub prefix: Option<String>,
}

/// A shaft with contacts at equal distances.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Probe {
    /// Distance of neighbours.
    pub spacing_um: f64,
    /// Which end the first channel is at.
    #[serde(default)]
    pub order: Order,
    /// The probe's channels are called this and their number; without one they are the analysed channels in file order.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub prefix: Option<String>,
}

/// A corner of a grid.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Corner {
    /// Upper left.
    #[default]
    TopLeft,
    /// Upper right.
    TopRight,
    /// Lower left.
    BottomLeft,
    /// Lower right.
    BottomRight,
}

/// How the electrodes of a grid are counted.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Along {
    /// Row after row.
    #[default]
    Rows,
    /// Column after column.
    Columns,
}

/// How the contacts of a probe are counted.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Order {
    /// The first is the shallowest.
    #[default]
    TopDown,
    /// The first is at the tip.
    BottomUp,
}

fn ten() -> f64 {
    10.0
}

/// `"as recorded"`, `"average"`, a list of channel names, or `{"bipolar": "neighbours"}`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Reference {
    /// A word.
    Word(ReferenceWord),
    /// The mean of these channels.
    Named(Vec<String>),
    /// Differences of two channels each.
    Bipolar(BipolarReference),
}

/// Differences of two channels each: `{"bipolar": "neighbours"}` or `{"bipolar": [["F3", "F4"], …]}`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct BipolarReference {
    /// Which pairs.
    pub bipolar: Pairs,
}

/// Which channels are subtracted from which.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Pairs {
    /// Chosen by where the channels lie.
    Word(PairsWord),
    /// First less second of each.
    List(Vec<[String; 2]>),
}

/// The words that pairs may be.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum PairsWord {
    /// The pairs of the shortest tree that joins all channels: one fewer than the channels, and every difference of two channels is a sum of them.
    Neighbours,
}

impl Default for Reference {
    fn default() -> Self {
        Reference::Word(ReferenceWord::AsRecorded)
    }
}

/// The words a reference may be.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum ReferenceWord {
    /// Samples as they stand in the file.
    #[serde(rename = "as recorded")]
    AsRecorded,
    /// The mean of all used channels.
    #[serde(rename = "average")]
    Average,
}

/// Filters and resampling, in this order.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Filter {
    /// Lower edge of the pass band.
    pub high_pass_hz: Option<f64>,
    /// Upper edge of the pass band.
    pub low_pass_hz: Option<f64>,
    /// Centres of stop bands 2 Hz wide (−6 dB).
    pub notch_hz: Vec<f64>,
    /// New sampling rate.
    pub resample_hz: Option<f64>,
    /// What is taken off each unbroken stretch before anything else.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub detrend: Option<Detrend>,
    /// Mains and its harmonics.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub mains: Option<Mains>,
}

/// `"mean"`, `"linear"`, or `{"linear_every_s": 20}`.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Detrend {
    /// Over the whole stretch.
    Word(DetrendWord),
    /// A straight line over each piece of the stretch on its own.
    Pieces(DetrendPieces),
}

/// A straight line over each piece.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct DetrendPieces {
    /// Length of a piece; the last one takes the rest.
    pub linear_every_s: f64,
}

/// What is taken off a whole stretch.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum DetrendWord {
    /// Its mean.
    Mean,
    /// Its least-squares line.
    Linear,
}

/// Mains and its harmonics: `{"hz": 50, "harmonics": 3, "how": "fit", "window_s": 4}`.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Mains {
    /// Its frequency.
    pub hz: f64,
    /// Multiples of it that are removed, itself the first; those at or above half the rate are passed over.
    #[serde(default = "three")]
    pub harmonics: usize,
    /// By what.
    #[serde(default)]
    pub how: MainsHow,
    /// Length of the windows of a fit.
    #[serde(default = "four_seconds")]
    pub window_s: f64,
}

fn three() -> usize {
    3
}

fn four_seconds() -> f64 {
    4.0
}

/// How mains is removed.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum MainsHow {
    /// Sinusoids fitted by least squares in half-overlapping windows are subtracted.
    #[default]
    Fit,
    /// Stop bands 2 Hz wide.
    Notch,
}

/// Which windows are dropped for what is in them. Thresholds are set over the windows of both sides together, blind to the labels.
#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct DropWindows {
    /// The largest peak-to-peak amplitude of a channel.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub amplitude: Option<Limit>,
    /// The largest step between two samples of a channel.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub step: Option<Limit>,
    /// The smallest peak-to-peak amplitude of a channel.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub flat: Option<Limit>,
    /// The window's variance summed over the whitened dimensions.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub covariance: Option<RobustLimit>,
}

impl DropWindows {
    /// Whether nothing is dropped.
    pub fn is_empty(&self) -> bool {
        *self == DropWindows::default()
    }
}

/// `{"z": 5}` or `{"uv": 150}`.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Limit {
    /// So many robust standard deviations of the logarithm beyond its median.
    Robust(RobustLimit),
    /// A value.
    Absolute(AbsoluteLimit),
}

/// So many robust standard deviations (1.4826 times the median absolute deviation) of the logarithm beyond its median.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct RobustLimit {
    /// How many.
    pub z: f64,
}

/// A value in the unit of the channels.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct AbsoluteLimit {
    /// In µV where the channels are voltages, else in their own unit.
    pub uv: f64,
}

/// An integer above 1, `"auto"` or `"best"`.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Keep {
    /// C.
    Number(usize),
    /// A word.
    Word(KeepWord),
}

impl Default for Keep {
    fn default() -> Self {
        Keep::Word(KeepWord::Auto)
    }
}

/// The words `keep` may be.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum KeepWord {
    /// The smaller of the rank and 150; blind to the labels.
    Auto,
    /// The smallest C within one standard error of the best held-out ratio; repeated inside every permutation.
    Best,
}

/// Which measure orders and tests the components.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Measure {
    /// Mean over trials of the log ratio.
    #[default]
    Typical,
    /// Ratio of pooled variances.
    Total,
}

/// `"auto"`, `"ledoit-wolf"`, `"oas"` or a number.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Shrink {
    /// γ or ρ itself.
    Number(f64),
    /// A word.
    Word(ShrinkWord),
}

impl Default for Shrink {
    fn default() -> Self {
        Shrink::Word(ShrinkWord::Auto)
    }
}

/// The words `shrink` may be.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum ShrinkWord {
    /// Total: chosen on inner folds; typical: 0.1.
    Auto,
    /// Ledoit & Wolf 2004 (total only).
    LedoitWolf,
    /// Chen et al. 2010 as scikit-learn has it (total only).
    Oas,
}

/// Folds, permutations, bootstrap, seed.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Evidence {
    /// K contiguous folds of trials.
    pub folds: usize,
    /// Arrangements drawn.
    pub permutations: usize,
    /// Bootstrap samples.
    pub bootstrap: usize,
    /// Seed of everything drawn.
    pub seed: u64,
}

impl Default for Evidence {
    fn default() -> Self {
        Evidence {
            folds: 5,
            permutations: 1000,
            bootstrap: 500,
            seed: 1,
        }
    }
}
