//! Everything known so far about one recording and one recipe, as plain data.
//!
//! Figures, readings, the page, the report and `results.json` are all made from a [`Sheet`], and from nothing else.
//! Parts that are not computed yet are `None` or empty.
use crate::recipe::{Measure, Recipe};
use crate::recording::{About, Layout, OtherChannel, Stretch};
use serde::{Deserialize, Serialize};
use std::collections::BTreeMap;

/// The state of the whole job.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Sheet {
    /// The recording.
    pub recording: RecordingCard,
    /// The choices that this sheet answers.
    pub recipe: Recipe,
    /// Every analysed channel of the recording, in file order.
    pub channels: Vec<ChannelCard>,
    /// How good the channels are as recorded, with proposals; it does not depend on the recipe.
    #[serde(default)]
    pub quality: Option<QualityCard>,
    /// What the preparation did.
    pub preparation: Option<PreparationCard>,
    /// The windows of both sides.
    pub windows: Option<WindowsCard>,
    /// Windows that the recipe's criteria dropped, and what that did to the ratio; `None` where it has no criteria.
    #[serde(default)]
    pub rejection: Option<RejectionCard>,
    /// The compression to C dimensions.
    pub compression: Option<CompressionCard>,
    /// How many dimensions stand out of noise, by several rules.
    #[serde(default)]
    pub dimensions: Option<DimensionsCard>,
    /// The first dimensions of the compression: the largest, not the most relevant.
    #[serde(default)]
    pub principal: Vec<PrincipalCard>,
    /// Fitted and held-out ratio against C.
    pub curve: Option<KeepCurve>,
    /// The shrinkage in force: ρ (typical) or γ (total).
    pub shrinkage: Option<f64>,
    /// The end whose first component departs farther from 1 on the windows it was fitted to: curve, folds, comparators, and the
    /// figures and readings that speak of one component, are about the first component of this end.
    pub leading: End,
    /// Components stronger in signal, strongest first.
    pub stronger: Vec<Component>,
    /// Components weaker in signal, weakest first.
    pub weaker: Vec<Component>,
    /// The same held-out measure for what one would have used otherwise, chosen in the direction of the leading end.
    pub compare: Vec<Comparator>,
    /// The permutation test.
    pub permutation: Option<Permutation>,
    /// Mean held-out log ratio of the leading component in each fold, as a factor, with the trials in it.
    pub folds: Vec<FoldCard>,
    /// The share that was locked away, once it is opened.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub held_back: Option<HeldBack>,
    /// Everything a careful reader should know, each a sentence; the first is the most important.
    pub warnings: Vec<String>,
}

/// Which end of a contrast.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum End {
    /// More variance in signal windows.
    #[default]
    Stronger,
    /// Less variance in signal windows.
    Weaker,
}

/// The recording as the page and the report show it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RecordingCard {
    /// File name.
    pub name: String,
    /// Format and variant.
    pub format: String,
    /// Sampling rate.
    pub rate_hz: f64,
    /// Seconds that hold samples.
    pub duration_s: f64,
    /// Unbroken runs.
    pub stretches: Vec<Stretch>,
    /// Channels listed and not analysed.
    pub others: Vec<OtherChannel>,
    /// Count of each event label.
    pub events: BTreeMap<String, usize>,
    /// Onsets of each event label in seconds, in order.
    pub event_onsets_s: BTreeMap<String, Vec<f64>>,
    /// How the channels lie to each other, by the choices in force.
    #[serde(default)]
    pub layout: Layout,
    /// What its header and its side files tell beside that.
    #[serde(default)]
    pub about: About,
    /// Names of side files used.
    pub side_files: Vec<String>,
    /// Warnings of the reader.
    pub warnings: Vec<String>,
    /// Root mean square over channels (each about its mean) per equal bin of the recording's samples, in the channels' unit; at most 444 bins.
    pub envelope: Vec<f64>,
}

/// One channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ChannelCard {
    /// Label.
    pub name: String,
    /// Unit.
    pub unit: String,
    /// Standard deviation as recorded, about the mean of each stretch; `None` where it is not a number.
    pub sd: Option<f64>,
    /// Power at the mains frequency over the mean of its neighbours 3–8 Hz away, in dB (the larger of 50 and 60 Hz), where the rate allows.
    pub mains_db: Option<f64>,
    /// The frequency that `mains_db` is about.
    pub mains_hz: Option<f64>,
    /// What became of it.
    pub state: ChannelState,
    /// Position on the unit sphere: x right, y front, z up.
    pub position: Option<[f64; 3]>,
}

/// What became of a channel.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(tag = "state", content = "reason", rename_all = "kebab-case")]
pub enum ChannelState {
    /// Analysed.
    Used,
    /// Analysed after replacing it by its neighbours.
    Interpolated,
    /// Left out by the user.
    LeftOut,
    /// Left out because it cannot be analysed: "constant", "holds values that are not numbers".
    Unusable(String),
    /// Analysed, with a doubt: "the same as Fz".
    NeedsALook(String),
}

/// What the preparation did.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PreparationCard {
    /// Sampling rate after it.
    pub rate_hz: f64,
    /// Names of the channels after it, in the order of `filter` and `pattern`.
    pub channels: Vec<String>,
    /// Rank of the pooled covariance after it.
    pub rank: usize,
    /// Length of the longest FIR filter in seconds, 0 without one.
    pub longest_filter_s: f64,
    /// One sentence for each filter: "high-pass 1 Hz, 0.75 Hz transition, 1101 taps".
    pub filters: Vec<String>,
    /// What was taken off before the filters, a phrase each: "the mean of each unbroken stretch taken off".
    #[serde(default)]
    pub before_filters: Vec<String>,
    /// Channels and rank after each step, in order.
    #[serde(default)]
    pub ranks: Vec<RankStep>,
    /// What the FIR filters let pass; `None` without one.
    #[serde(default)]
    pub response: Option<Response>,
}

/// Channels and rank after one step of the preparation.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RankStep {
    /// Which step.
    pub step: Step,
    /// Channels after it.
    pub channels: usize,
    /// Numerical rank after it: of the recording's covariance; after the filters, of the windows' pooled covariance.
    pub rank: usize,
    /// What the step did to the rank, in a sentence.
    pub why: String,
}

/// Steps of the preparation.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Step {
    /// As recorded.
    Recorded,
    /// Channels left out.
    LeaveOut,
    /// Channels interpolated.
    Interpolate,
    /// Channels referred to others.
    Reference,
    /// Filters, resampling, and only the samples inside windows.
    Filter,
}

/// Magnitude response of all FIR filters in a row; passed once, with zero phase.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Response {
    /// Frequencies, ascending, to half the recorded rate.
    pub hz: Vec<f64>,
    /// Gain in dB at each, not below −120.
    pub db: Vec<f64>,
    /// Where it begins to fall and where it has fallen by 6 dB.
    pub edges: Vec<ResponseEdge>,
    /// Reach of the filters to either side of a sample.
    pub reach_s: f64,
}

/// One edge of a pass band.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct ResponseEdge {
    /// Edge of the pass band.
    pub pass_hz: f64,
    /// Where the gain is one half (−6 dB), by design.
    pub half_hz: f64,
    /// Width of the transition, centred on `half_hz`.
    pub transition_hz: f64,
}

/// How good every channel is, as recorded.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct QualityCard {
    /// Every channel, in file order.
    pub channels: Vec<ChannelQuality>,
    /// Seconds spread over the recording on which spectra and neighbours were compared.
    pub compared_s: f64,
    /// The band of that comparison.
    pub band_hz: [f64; 2],
    /// How a channel was estimated from the others: "spherical splines", "inverse squared distance"; `None` where positions are not known.
    pub estimate: Option<String>,
}

/// The measures of one channel; `None` where one cannot be taken.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct ChannelQuality {
    /// Label.
    pub name: String,
    /// Samples that are not finite numbers.
    pub not_numbers: usize,
    /// Share of seconds in which it stands still, 0…1.
    pub flat: f64,
    /// Share of samples in runs at its own largest or smallest value, 0…1.
    pub clipped: f64,
    /// Standard deviation in the band over the median channel's.
    pub size: Option<f64>,
    /// Robust z of the log variance in the band.
    pub size_z: Option<f64>,
    /// Share of power above 40 Hz, mains left out.
    pub high: Option<f64>,
    /// Mains over its surroundings in dB, less the median channel's.
    pub mains_above_db: Option<f64>,
    /// Median correlation with its estimate from the other channels.
    pub predicted: Option<f64>,
    /// The channel from which it differs least, and the variance of that difference over what is usual between nearest channels.
    pub nearest: Option<(String, f64)>,
    /// Spread of its slow course over its spread in the band.
    pub drift: Option<f64>,
    /// What speaks against it; empty for a good channel. A proposal, never done by itself.
    pub doubts: Vec<Doubt>,
}

/// One thing that speaks against a channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Doubt {
    /// Which criterion.
    pub kind: DoubtKind,
    /// With its number, to follow the channel's name: "stands still in 34 % of its seconds".
    pub reason: String,
}

/// Criteria of channel quality.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum DoubtKind {
    /// Holds values that are not numbers.
    NotNumbers,
    /// Stands still.
    Flat,
    /// Cut off at its extremes.
    Clipped,
    /// Much larger than the others.
    Large,
    /// Much power above 40 Hz.
    Noisy,
    /// Much mains.
    Mains,
    /// Unlike what its neighbours say.
    Unlike,
    /// Nearly the same as another.
    Bridged,
    /// Wanders slowly.
    Drifting,
}

/// What the criteria of `drop_windows` did.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RejectionCard {
    /// Every criterion of the recipe.
    pub criteria: Vec<CriterionCard>,
    /// Windows before and after, both sides together.
    pub windows: [usize; 2],
    /// Fitted ratios of the leading component with every window and without the dropped ones; `None` until they are computed.
    pub effect: Option<RejectionEffect>,
}

/// One criterion and what it dropped.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CriterionCard {
    /// `amplitude`, `step`, `flat`, `covariance`.
    pub name: String,
    /// Windows beyond this are dropped (below it, for `flat`), in `unit`.
    pub limit: f64,
    /// Median over windows.
    pub median: f64,
    /// Unit of `limit` and `median`.
    pub unit: String,
    /// Windows beyond it on the signal and on the reference side, whatever other criteria say.
    pub beyond: [usize; 2],
}

/// Fitted ratios of the leading component with every window, then without the dropped ones.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct RejectionEffect {
    /// In a typical trial.
    pub typical: [f64; 2],
    /// Over all power: the generalised eigenvalue λ where the measure is total.
    pub total: [f64; 2],
}

/// How many dimensions stand out of noise.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct DimensionsCard {
    /// Samples in windows.
    pub samples: usize,
    /// As many independent samples would estimate the covariances as well.
    pub effective_samples: f64,
    /// Variance of the noise, from the median eigenvalue.
    pub noise_variance: Option<f64>,
    /// Upper edge of the eigenvalues of noise alone (Marchenko & Pastur 1967).
    pub noise_edge: Option<f64>,
    /// Eigenvalues below are better dropped (Gavish & Donoho 2014).
    pub hard_threshold: Option<f64>,
    /// Eigenvalues of the correlation matrix of the windows that the surrogates were made from.
    pub correlation: Vec<f64>,
    /// 95th percentile of the surrogates' eigenvalues, in order of size.
    pub surrogate_95: Vec<f64>,
    /// Surrogates done.
    pub surrogates: usize,
    /// Samples that the surrogates were made from.
    pub surrogate_samples: usize,
}

/// One dimension of the compression.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PrincipalCard {
    /// Share of the variance, 0…1.
    pub share: f64,
    /// Its standard deviation's pattern over the prepared channels, the largest entry positive.
    pub pattern: Vec<f64>,
    /// Smallest value in each equal bin of the prepared recording's samples, in units of its own standard deviation.
    pub low: Vec<f32>,
    /// Largest value in each bin.
    pub high: Vec<f32>,
}

/// The windows of both sides.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct WindowsCard {
    /// Both sides tied to the same event.
    pub paired: bool,
    /// Signal side.
    pub signal: SideCard,
    /// Reference side.
    pub reference: SideCard,
    /// Every event of the signal label (and of the reference label when unpaired), in time order.
    pub trials: Vec<Trial>,
}

/// One side's windows.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SideCard {
    /// Windows used.
    pub used: usize,
    /// Windows dropped, by reason: `outside`, `gap`, `partner`, and by criterion: `amplitude`, `step`, `flat-window`, `covariance`.
    pub dropped: BTreeMap<String, usize>,
    /// Samples a window.
    pub samples: usize,
    /// Seconds a window.
    pub seconds: f64,
}

/// One event that was asked for a window.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Trial {
    /// Onset of its event.
    pub onset_s: f64,
    /// Label of its event.
    pub event: String,
    /// Why it was dropped, if it was.
    pub dropped: Option<String>,
}

/// The compression to C dimensions.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CompressionCard {
    /// C.
    pub kept: usize,
    /// Largest C: the numerical rank of the pooled covariance.
    pub rank: usize,
    /// Eigenvalues of the pooled covariance, descending, all of them.
    pub eigenvalues: Vec<f64>,
    /// Share of the variance in the kept dimensions, 0…1.
    pub share: f64,
    /// Numbers of dimensions other rules would keep: `share_95`, `one_standard_error`, `held_out_peak`, `parallel_analysis`,
    /// `noise_edge`, `hard_threshold`.
    pub guides: BTreeMap<String, usize>,
}

/// Fitted and held-out ratio of the leading component against C, in the chosen measure.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct KeepCurve {
    /// Values of C, ascending.
    pub keep: Vec<usize>,
    /// Fitted ratio at each.
    pub fitted: Vec<f64>,
    /// Held-out ratio at each.
    pub held_out: Vec<f64>,
    /// Standard error of the log held-out ratio at each.
    pub log_se: Vec<f64>,
}

/// One component: a spatial filter and everything known about it.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Component {
    /// Ratio in a typical trial.
    pub typical: TypicalRatio,
    /// Ratio over all power.
    pub total: TotalRatio,
    /// Family-wise p over components; withheld under 10 pairs or 10 windows a side.
    pub p: Option<f64>,
    /// Weights for the prepared channels, wᵀRw = 1.
    pub filter: Vec<f64>,
    /// Weights for the channels of the recording, in file order (0 for channels not used).
    pub filter_raw: Vec<f64>,
    /// Pattern over the prepared channels, in channel units per unit of component.
    pub pattern: Vec<f64>,
    /// Name of the channel where the pattern is largest.
    pub largest_at: String,
    /// Frequency at which the spectra differ most in the direction of this end.
    pub peak_hz: Option<f64>,
    /// Median over folds of |cosine| between the fold's pattern and this one.
    pub stability: Option<f64>,
    /// Folds in which, judged by patterns, another rank of the fold is more like this component.
    pub places_changed: Option<usize>,
    /// Held-out log ratio (natural) of every used trial, in time order (paired contrasts).
    pub trials: Vec<TrialScore>,
    /// Power spectral densities.
    pub spectra: Option<Spectra>,
    /// Power around the event.
    pub course: Option<Course>,
    /// Single trials around the event.
    pub image: Option<TrialImage>,
}

/// Ratio in a typical trial: exp of the mean log ratio.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct TypicalRatio {
    /// On the windows it was fitted to; not a number (null in JSON) where the kind of contrast has no ratio in a single trial.
    #[serde(deserialize_with = "number_or_nan")]
    pub fitted: f64,
    /// On windows it never saw.
    pub held_out: Option<f64>,
    /// 95 % bootstrap interval of `held_out` over trials.
    pub interval: Option<[f64; 2]>,
}

fn number_or_nan<'de, D: serde::Deserializer<'de>>(from: D) -> Result<f64, D::Error> {
    Ok(Option::deserialize(from)?.unwrap_or(f64::NAN))
}

/// Ratio of pooled variances.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct TotalRatio {
    /// On the windows it was fitted to.
    pub fitted: f64,
    /// Geometric mean over folds.
    pub held_out: Option<f64>,
    /// Each fold's ratio.
    pub folds: Vec<f64>,
}

/// Held-out score of one trial.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct TrialScore {
    /// Onset of its event.
    pub onset_s: f64,
    /// Fold it was tested in, from 0.
    pub fold: usize,
    /// Natural log of signal over reference variance.
    pub log_ratio: f64,
}

/// Spectra of a component in signal and reference windows (Welch; component variance is 1 in reference windows, so densities are 1/Hz).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Spectra {
    /// Frequencies.
    pub hz: Vec<f64>,
    /// Mean density in signal windows.
    pub signal: Vec<f64>,
    /// 95 % bootstrap interval over windows.
    pub signal_low: Vec<f64>,
    /// See `signal_low`.
    pub signal_high: Vec<f64>,
    /// Mean density in reference windows.
    pub reference: Vec<f64>,
    /// See `signal_low`.
    pub reference_low: Vec<f64>,
    /// See `signal_low`.
    pub reference_high: Vec<f64>,
    /// Samples a segment.
    pub segment: usize,
}

/// Mean power of a component around the event, in dB of its mean power in the reference windows.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Course {
    /// Label of the event at time 0.
    pub event: String,
    /// Times relative to the event.
    pub t_s: Vec<f64>,
    /// Mean over trials.
    pub mean_db: Vec<f64>,
    /// 95 % bootstrap interval over trials.
    pub low_db: Vec<f64>,
    /// See `low_db`.
    pub high_db: Vec<f64>,
    /// Average of the component's signal itself (not its power), in its own unit.
    pub average: Vec<f64>,
    /// 95 % bootstrap interval of `average`.
    pub average_low: Vec<f64>,
    /// See `average_low`.
    pub average_high: Vec<f64>,
    /// Full width of the smoothing window of the power.
    pub smoothing_s: f64,
    /// Trials that went in.
    pub trials: usize,
}

/// Power of single trials around the event, in dB of each trial's reference window, in order of time.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct TrialImage {
    /// Times relative to the event (bin centres).
    pub t_s: Vec<f64>,
    /// `trials × times`.
    pub db: Vec<Vec<f32>>,
}

/// What one would have used otherwise, on the same held-out windows.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Comparator {
    /// Which.
    pub kind: ComparatorKind,
    /// Index of the principal component from 1, or name of the channel, as chosen most often in training ("3", "C2").
    pub chosen: Option<String>,
    /// In how many folds that choice was made.
    pub chosen_in_folds: Option<usize>,
    /// Share of variance (principal components).
    pub share: Option<f64>,
    /// In a typical trial.
    pub typical: TypicalRatio,
    /// Over all power.
    pub total: TotalRatio,
}

/// Kinds of comparators.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum ComparatorKind {
    /// The first principal component.
    FirstPc,
    /// The best of the kept principal components, chosen on training trials.
    BestPc,
    /// The best single channel, chosen on training trials.
    BestChannel,
    /// The mean of all channels.
    MeanOfChannels,
    /// A direction drawn at random in the kept space.
    RandomDirection,
}

/// The permutation test.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Permutation {
    /// Measure of the statistic.
    pub measure: Measure,
    /// Arrangements asked for.
    pub asked: usize,
    /// Arrangements done so far (or all there are, when `exact`).
    pub done: usize,
    /// Distinct arrangements, where that is at most 2^53.
    pub distinct: Option<f64>,
    /// Every arrangement was enumerated.
    pub exact: bool,
    /// The null hypothesis in a sentence.
    pub null: String,
    /// Largest fitted ratio of each arrangement, as a factor.
    pub largest: Vec<f64>,
    /// Smallest fitted ratio of each arrangement, as a factor.
    pub smallest: Vec<f64>,
    /// Observed statistic of each stronger component (comparable with `largest`).
    pub observed_stronger: Vec<f64>,
    /// Observed statistic of each weaker component (comparable with `smallest`).
    pub observed_weaker: Vec<f64>,
}

/// One fold of the held-out test.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct FoldCard {
    /// Trials (or windows) tested in it.
    pub trials: usize,
    /// Held-out typical ratio of the leading component in it.
    pub ratio: f64,
}

/// The finished components on the share that was locked away; no windows where it holds too few.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct HeldBack {
    /// Signal windows in it.
    pub signal: usize,
    /// Reference windows in it.
    pub reference: usize,
    /// Ratios of the stronger components.
    pub stronger: Vec<HeldBackRatio>,
    /// Ratios of the weaker components.
    pub weaker: Vec<HeldBackRatio>,
}

/// Ratios of one component on the share that was locked away.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct HeldBackRatio {
    /// In a typical trial, where the kind has one.
    pub typical: Option<f64>,
    /// Over all power.
    pub total: f64,
}

impl Sheet {
    /// The first component of the leading end.
    pub fn first(&self) -> Option<&Component> {
        match self.leading {
            End::Stronger => self.stronger.first(),
            End::Weaker => self.weaker.first(),
        }
    }
    /// Pairs (paired) or the smaller side's windows (unpaired).
    pub fn repetitions(&self) -> usize {
        self.windows
            .as_ref()
            .map_or(0, |w| w.signal.used.min(w.reference.used))
    }
}
