//! From recorded channels to the channels that are contrasted: one channel matrix T, linear-phase FIR filters, resampling.
//!
//! Prepared channel i = resample(filter(Σⱼ Tᵢⱼ xⱼ)), within each stretch on its own. All of it is linear, so a spatial filter w for the
//! prepared channels is w_raw = Tᵀw for the recorded ones.
//!
//! * `matrix`: T from what is left out, interpolated, re-referenced.
//! * `neighbours`: estimates by geometry; `quality`: proposals about doubtful channels; `reject`: what is in a window.
//! * [`steady`]: trend and fitted mains, taken off before the filters; `response`: what the filters let pass.
//! * [`fir`]: design and zero-phase application; several filters are convolved into one kernel first, so that edges are mirrored once.
//! * [`resample`]: rational change of rate, with its own anti-alias filter.
//! * [`inspect()`]: what is known of every channel before.
//!
//! # Precision
//! Sums and filters run in f64; samples are stored as f32.
//!
//! # Edges and gaps
//! Each stretch is continued by its mirror image. A stretch shorter than half the kernel is mirrored again and again, and a warning says so; a
//! kernel longer than every stretch is refused.
pub mod fir;
mod inspect;
mod matrix;
mod neighbours;
mod quality;
pub mod resample;
mod response;
pub mod steady;

pub use crate::describe::positions::to_unit_sphere;
pub use inspect::inspect;
pub use matrix::StepMatrix;
pub use quality::{Comparing, Quality};

use crate::error::{Kind, Problem, Result};
use crate::recipe::{Detrend, DetrendWord, Filter, Mains, MainsHow, Recipe};
use crate::recording::{Recording, Stretch};
use crate::sheet::{ChannelCard, PreparationCard};
use fir::{Design, Request, ZeroPhase};
use matrix::{ChannelMatrix, Sum};
use nalgebra::DMatrix;
use neighbours::Places;
use resample::Resampler;
use steady::MainsFit;

/// What the preparation gives.
#[derive(Debug, Clone)]
pub struct Prepared {
    /// Names, in the rows' order.
    pub channels: Vec<String>,
    /// Their unit, where they share one.
    pub unit: String,
    /// Unit-sphere positions, where known.
    pub positions: Vec<Option<[f64; 3]>>,
    /// `prepared × recorded` channel matrix T: w_raw = Tᵀw.
    pub matrix: DMatrix<f64>,
    /// Sampling rate.
    pub rate_hz: f64,
    /// `channels × samples`.
    pub samples: Vec<Vec<f32>>,
    /// Unbroken runs.
    pub stretches: Vec<Stretch>,
    /// T after each of its steps, for the rank; empty beyond 512 channels.
    pub steps: Vec<StepMatrix>,
    /// For the sheet (its ranks are filled in later).
    pub card: PreparationCard,
    /// Warnings, each a sentence.
    pub warnings: Vec<String>,
}

/// Preparation in bites: one channel a step.
#[derive(Debug)]
pub struct Preparing {
    matrix: ChannelMatrix,
    /// The reference series r·x, summed one recorded channel a step; empty without a reference.
    common: Vec<f64>,
    /// Recorded channels already in `common`.
    summed: usize,
    trend: Option<Detrend>,
    mains: Option<MainsFit>,
    rate_hz: f64,
    filter: Option<ZeroPhase>,
    resampler: Option<Resampler>,
    recorded: Vec<Stretch>,
    mixed: Vec<f64>,
    filtered: Vec<f64>,
    result: Prepared,
}

/// A matrix of channels by channels is never made beyond this.
const MOST_CHANNELS: usize = 2000;

impl Preparing {
    /// Checks the recipe's channels and filter against the recording and builds T and the filters.
    /// `channels` are the cards of [`inspect()`] for the same recording and recipe.
    ///
    /// # Channels
    /// A reference of one channel leaves that channel out: it would be zero. A reference of several keeps them (the rank falls by one). Channels
    /// left out by the recipe may still serve as reference; unusable ones may not.
    ///
    /// # Errors
    /// Unknown channel names, fewer than 2 channels left, interpolation without positions, edges or rates out of range, a filter longer
    /// than every stretch.
    pub fn new(recording: &Recording, channels: &[ChannelCard], recipe: &Recipe) -> Result<Self> {
        let rate_hz = recording.rate_hz;
        if recording.channels.len() > MOST_CHANNELS {
            return Err(Problem::new(
                Kind::TooLarge,
                "more channels than a covariance can be made of",
                "split the recording into parts with fewer channels",
            )
            .at("channels")
            .expected_found(format!("at most {MOST_CHANNELS}"), recording.channels.len()));
        }
        let places = Places::of(recording, channels);
        let matrix = ChannelMatrix::new(channels, &places, &recipe.channels)?;
        let designs = designs(&recipe.filter, rate_hz)?;
        let mains = mains_fit(&recipe.filter, rate_hz)?;
        let resampler = resampler(&recipe.filter, rate_hz)?;
        let longest = recording
            .stretches
            .iter()
            .map(|s| s.count)
            .max()
            .unwrap_or(0);
        let taps = kernel(&designs, longest, rate_hz)?;

        let mut warnings = matrix.warnings.clone();
        warnings.extend(mixed_units(&matrix, channels));
        warnings.extend(
            taps.as_ref()
                .and_then(|t| short_stretches(&recording.stretches, t.len(), rate_hz)),
        );
        let mut filters: Vec<String> = designs.iter().map(Design::sentence).collect();
        let mut new_rate_hz = rate_hz;
        if let Some(r) = &resampler {
            new_rate_hz = new_rate(rate_hz, r, recipe.filter.resample_hz);
            filters.push(format!(
                "resampled from {rate_hz} to {new_rate_hz} Hz ({}/{})",
                r.up, r.down
            ));
        }
        let names = matrix.names.clone();
        let longest_filter = designs.iter().map(|d| d.length).max().unwrap_or(0);
        let result = Prepared {
            unit: shared_unit(&matrix, channels)
                .unwrap_or_default()
                .to_owned(),
            positions: matrix.positions.clone(),
            matrix: matrix.dense(channels.len()),
            steps: matrix.steps.clone(),
            rate_hz: new_rate_hz,
            samples: Vec::with_capacity(names.len()),
            stretches: after(&recording.stretches, resampler.as_ref()),
            card: PreparationCard {
                rate_hz: new_rate_hz,
                channels: names.clone(),
                rank: 0,
                longest_filter_s: longest_filter as f64 / rate_hz,
                filters,
                before_filters: before_filters(&recipe.filter, rate_hz),
                ranks: Vec::new(),
                response: taps
                    .as_ref()
                    .and_then(|t| response::response(t, &designs, rate_hz)),
            },
            channels: names,
            warnings,
        };
        Ok(Preparing {
            common: vec![
                0.0;
                if matrix.reference.is_empty() {
                    0
                } else {
                    recording.sample_count()
                }
            ],
            matrix,
            summed: 0,
            trend: recipe.filter.detrend,
            mains,
            rate_hz,
            filter: taps.map(|t| ZeroPhase::new(&t, longest)),
            resampler,
            recorded: recording.stretches.clone(),
            mixed: Vec::new(),
            filtered: Vec::new(),
            result,
        })
    }
    /// Steps done, and in all: one for each recorded channel in the reference's sum, then one for each prepared channel.
    pub fn progress(&self) -> (usize, usize) {
        (
            self.summed + self.result.samples.len(),
            self.matrix.reference.len() + self.matrix.rows.len(),
        )
    }
    /// Does the next step and says whether there is another; does nothing when all are done.
    pub fn step(&mut self, recording: &Recording) -> bool {
        if let Some(&(channel, weight)) = self.matrix.reference.get(self.summed) {
            add(&mut self.common, &recording.samples[channel], weight);
            self.summed += 1;
            return true;
        }
        let next = self.result.samples.len();
        let Some(row) = self.matrix.rows.get(next) else {
            return false;
        };
        let samples = match row[..] {
            [(channel, 1.0)] if self.untouched() => recording.samples[channel].clone(),
            _ => self.prepare(next, recording),
        };
        self.result.samples.push(samples);
        next + 1 < self.matrix.rows.len()
    }
    /// The result, once every channel is done.
    pub fn finish(self) -> Option<Prepared> {
        (self.result.samples.len() == self.matrix.rows.len()).then_some(self.result)
    }

    /// Whether a channel that stands alone in its row passes as it is.
    fn untouched(&self) -> bool {
        self.trend.is_none()
            && self.mains.is_none()
            && self.filter.is_none()
            && self.resampler.is_none()
            && self.common.is_empty()
    }

    fn prepare(&mut self, row: usize, recording: &Recording) -> Vec<f32> {
        let total = self.result.stretches.iter().map(|s| s.count).sum();
        let mut out = Vec::with_capacity(total);
        for stretch in &self.recorded {
            let range = stretch.first..stretch.first + stretch.count;
            mix(
                &self.matrix.rows[row],
                &self.common,
                recording,
                range,
                &mut self.mixed,
            );
            if let Some(trend) = self.trend {
                steady::detrend(&mut self.mixed, trend, self.rate_hz);
            }
            if let Some(mains) = &mut self.mains {
                mains.remove(&mut self.mixed);
            }
            if let Some(filter) = &mut self.filter {
                filter.filter(&self.mixed, &mut self.filtered);
                std::mem::swap(&mut self.mixed, &mut self.filtered);
            }
            if let Some(resampler) = &self.resampler {
                resampler.resample(&self.mixed, &mut self.filtered);
                std::mem::swap(&mut self.mixed, &mut self.filtered);
            }
            out.extend(self.mixed.iter().map(|&v| v as f32));
        }
        out
    }
}

/// What a preparation needs around a sample, known before it begins.
#[derive(Debug, Clone, PartialEq)]
pub struct Reach {
    /// Recorded samples on either side that a prepared sample depends on.
    pub margin: usize,
    /// Recorded samples to a step of both grids: a part that begins at a multiple of it keeps the grid of the whole.
    pub grid: usize,
    /// Prepared samples to the same step.
    pub prepared_grid: usize,
    /// Sampling rate afterwards.
    pub rate_hz: f64,
    /// The stretches afterwards.
    pub stretches: Vec<Stretch>,
    /// A prepared sample depends on its whole stretch.
    pub whole: bool,
}

/// The reach of a recipe's filters and resampling over these stretches.
///
/// # Errors
/// Edges and rates out of range, as [`Preparing::new`] says.
pub fn reach(stretches: &[Stretch], recipe: &Recipe, rate_hz: f64) -> Result<Reach> {
    let designs = designs(&recipe.filter, rate_hz)?;
    let resampler = resampler(&recipe.filter, rate_hz)?;
    let halves: usize = designs.iter().map(|d| d.length / 2).sum();
    let (grid, prepared_grid) = resampler.as_ref().map_or((1, 1), |r| (r.down, r.up));
    Ok(Reach {
        margin: halves + resampler.as_ref().map_or(0, Resampler::reach) + 1,
        grid,
        prepared_grid,
        rate_hz: resampler
            .as_ref()
            .map_or(rate_hz, |r| new_rate(rate_hz, r, recipe.filter.resample_hz)),
        stretches: after(stretches, resampler.as_ref()),
        whole: recipe.filter.detrend.is_some() || mains_fit(&recipe.filter, rate_hz)?.is_some(),
    })
}

/// The exact new rate: the wanted one where the two differ only by rounding.
fn new_rate(rate_hz: f64, r: &Resampler, wanted: Option<f64>) -> f64 {
    let exact = rate_hz * r.up as f64 / r.down as f64;
    wanted
        .filter(|w| (w / exact - 1.0).abs() < 4.0 * f64::EPSILON)
        .unwrap_or(exact)
}

/// A row of A over one stretch, less the reference.
fn mix(
    row: &Sum,
    common: &[f64],
    recording: &Recording,
    range: std::ops::Range<usize>,
    out: &mut Vec<f64>,
) {
    out.clear();
    match common.get(range.clone()) {
        Some(part) => out.extend(part.iter().map(|v| -v)),
        None => out.resize(range.len(), 0.0),
    }
    for &(channel, weight) in row {
        add(out, &recording.samples[channel][range.clone()], weight);
    }
}

fn add(sum: &mut [f64], samples: &[f32], weight: f64) {
    for (total, value) in sum.iter_mut().zip(samples) {
        *total += weight * f64::from(*value);
    }
}

fn after(stretches: &[Stretch], resampler: Option<&Resampler>) -> Vec<Stretch> {
    let mut first = 0;
    let mut next = |stretch: &Stretch| {
        let count = resampler.map_or(stretch.count, |r| r.count(stretch.count));
        let now = Stretch {
            first,
            count,
            onset_s: stretch.onset_s,
        };
        first += count;
        now
    };
    stretches.iter().map(&mut next).collect()
}

fn shared_unit<'a>(matrix: &ChannelMatrix, channels: &'a [ChannelCard]) -> Option<&'a str> {
    let mut units = matrix.channels.iter().map(|&c| channels[c].unit.as_str());
    let first = units.next()?;
    units.all(|unit| unit == first).then_some(first)
}

fn mixed_units(matrix: &ChannelMatrix, channels: &[ChannelCard]) -> Option<String> {
    let mut units: Vec<&str> = matrix
        .channels
        .iter()
        .map(|&c| channels[c].unit.as_str())
        .collect();
    units.sort_unstable();
    units.dedup();
    let names = |unit: &&str| {
        if unit.is_empty() {
            "no unit".to_owned()
        } else {
            (*unit).to_owned()
        }
    };
    (units.len() > 1).then(|| {
        format!(
            "The channels have different units ({}); their variances are compared as numbers all the same.",
            units.iter().map(names).collect::<Vec<_>>().join(", ")
        )
    })
}

/// The fit of mains that a recipe asks for.
fn mains_fit(filter: &Filter, rate_hz: f64) -> Result<Option<MainsFit>> {
    let Some(mains) = filter.mains.filter(|m| m.how == MainsHow::Fit) else {
        return Ok(None);
    };
    match MainsFit::new(&mains, rate_hz) {
        Some(fit) => Ok(Some(fit)),
        None => Err(mains_refused(&mains, rate_hz)),
    }
}

fn mains_refused(mains: &Mains, rate_hz: f64) -> Problem {
    Problem::new(
        Kind::Recipe,
        "mains cannot be removed from this recording",
        "choose a frequency below half the sampling rate, and windows of several of its periods",
    )
    .at("recipe, filter.mains")
    .expected_found(
        format!("below {} Hz", rate_hz / 2.0),
        format!("{} Hz in windows of {} s", mains.hz, mains.window_s),
    )
}

/// A phrase for everything that is taken off before the filters.
fn before_filters(filter: &Filter, rate_hz: f64) -> Vec<String> {
    let trend = filter.detrend.map(|how| match how {
        Detrend::Word(DetrendWord::Mean) => {
            "the mean of each unbroken stretch taken off".to_owned()
        }
        Detrend::Word(DetrendWord::Linear) => {
            "the least-squares line of each unbroken stretch taken off".to_owned()
        }
        Detrend::Pieces(pieces) => format!(
            "a least-squares line taken off every {} s",
            pieces.linear_every_s
        ),
    });
    let mains = filter.mains.filter(|m| m.how == MainsHow::Fit).map(|m| {
        let hz = steady::harmonics(&m, rate_hz);
        let list: Vec<String> = hz.iter().map(f64::to_string).collect();
        format!(
            "sinusoids at {} Hz fitted by least squares in half-overlapping windows of {} s and subtracted",
            list.join(", "),
            m.window_s
        )
    });
    trend.into_iter().chain(mains).collect()
}

/// The filters a recipe asks for, checked against the rate.
fn designs(filter: &Filter, rate_hz: f64) -> Result<Vec<Design>> {
    let nyquist = rate_hz / 2.0;
    for (key, value) in [
        ("high_pass_hz", filter.high_pass_hz),
        ("low_pass_hz", filter.low_pass_hz),
    ] {
        if let Some(edge) = value {
            in_range(key, edge, 0.0, nyquist)?;
        }
    }
    for &centre in &filter.notch_hz {
        in_range("notch_hz", centre, 1.0, nyquist - 1.0)?;
    }
    if let (Some(high), Some(low)) = (filter.high_pass_hz, filter.low_pass_hz)
        && high >= low
    {
        return Err(Problem::new(
            Kind::Recipe,
            "the high-pass edge is not below the low-pass edge: nothing would pass",
            "lower the high-pass or raise the low-pass",
        )
        .at("recipe, filter")
        .expected_found(format!("a high-pass below {low} Hz"), format!("{high} Hz")));
    }
    let stopped = filter.mains.filter(|m| m.how == MainsHow::Notch);
    if let Some(mains) = stopped {
        in_range("mains", mains.hz, 1.0, nyquist - 1.0)?;
    }
    let multiples = stopped.map_or_else(Vec::new, |m| steady::harmonics(&m, rate_hz));
    let requests = (filter.high_pass_hz.map(Request::HighPass).into_iter())
        .chain(filter.low_pass_hz.map(Request::LowPass))
        .chain(filter.notch_hz.iter().copied().map(Request::Notch))
        .chain(
            multiples
                .into_iter()
                .filter(|hz| *hz > 1.0 && *hz < nyquist - 1.0)
                .map(Request::Notch),
        );
    Ok(requests
        .map(|request| Design::new(request, rate_hz))
        .collect())
}

fn filter_in_words(key: &str) -> &'static str {
    match key {
        "high_pass_hz" => "the high-pass",
        "low_pass_hz" => "the low-pass",
        "mains" => "mains",
        _ => "the notch",
    }
}

/// Refuses a frequency outside the open interval; also one that is not a number.
fn in_range(key: &str, value: f64, above: f64, below: f64) -> Result<()> {
    if value > above && value < below {
        return Ok(());
    }
    Err(Problem::new(
        Kind::Recipe,
        format!("{} does not fit this recording", filter_in_words(key)),
        "choose a frequency between these limits; the upper one follows from the sampling rate",
    )
    .at(format!("recipe, filter.{key}"))
    .expected_found(
        format!("above {above} and below {below} Hz"),
        format!("{value} Hz"),
    ))
}

fn resampler(filter: &Filter, rate_hz: f64) -> Result<Option<Resampler>> {
    let Some(wanted) = filter.resample_hz.filter(|wanted| *wanted != rate_hz) else {
        return Ok(None);
    };
    let lowest = filter.high_pass_hz.map_or(0.0, |edge| 2.0 * edge);
    let ratio = resample::ratio(rate_hz, wanted).filter(|_| wanted > lowest && wanted < rate_hz);
    let (up, down) = ratio.ok_or_else(|| {
        Problem::new(
            Kind::Recipe,
            "the new sampling rate does not fit this recording",
            "choose a rate between twice the high-pass edge and the recording's own rate",
        )
        .at("recipe, filter.resample_hz")
        .expected_found(
            format!("above {lowest} and at most {rate_hz} Hz"),
            format!("{wanted} Hz"),
        )
    })?;
    Ok(Some(Resampler::new(up, down)))
}

/// All filters as one kernel; refused when it is longer than every stretch, which also bounds what is allocated.
fn kernel(designs: &[Design], longest: usize, rate_hz: f64) -> Result<Option<Vec<f64>>> {
    let length = designs
        .iter()
        .fold(1, |sum: usize, d| sum.saturating_add(d.length - 1));
    if !designs.is_empty() && length > longest {
        return Err(Problem::new(
            Kind::Recipe,
            "the filter is longer than the longest unbroken part of the recording",
            "raise the high-pass edge, or leave the filter out",
        )
        .at("recipe, filter")
        .expected_found(
            format!("at most {:.3} s", longest as f64 / rate_hz),
            format!("{:.3} s", length as f64 / rate_hz),
        ));
    }
    let taps: Vec<Vec<f64>> = designs.iter().map(Design::taps).collect();
    Ok(fir::in_a_row(&taps))
}

fn short_stretches(stretches: &[Stretch], taps: usize, rate_hz: f64) -> Option<String> {
    let short = stretches.iter().filter(|s| s.count <= taps / 2).count();
    let (parts, are) = if short == 1 {
        ("part", "is")
    } else {
        ("parts", "are")
    };
    (short > 0).then(|| {
        format!(
            "{short} unbroken {parts} of the recording {are} shorter than half the filter ({:.2} s); what is filtered there \
             comes mostly from mirror images.",
            (taps / 2) as f64 / rate_hz
        )
    })
}
