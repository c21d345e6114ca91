//! Power spectral densities of a component in signal and in reference windows.
use super::bootstrap;
use super::multitaper::Multitaper;
use super::welch::{Welch, segment_for};
use crate::recipe::Spectrum;
pub use crate::sheet::End;
use crate::sheet::Spectra;
use nalgebra::DMatrix;

/// A window: index of its first sample, number of samples.
pub type Window = (usize, usize);

/// Spectra of one component.
///
/// Each window's density is estimated on its own (Welch, segments of [`segment_for`] the shorter side's windows), then averaged over
/// the side's windows; the 95 % intervals are percentile bootstrap intervals over windows (`bootstrap` samples, 0 for none).
/// Windows that leave `series` are ignored; a side without windows has densities of 0.
pub fn of_component(
    series: &[f64],
    signal: &[Window],
    reference: &[Window],
    rate_hz: f64,
    bootstrap: usize,
    seed: u64,
) -> Spectra {
    by(
        Spectrum::Welch,
        series,
        signal,
        reference,
        rate_hz,
        bootstrap,
        seed,
    )
}

/// The same by the estimate that is asked for; multitaper segments are as long as the shorter side's windows, at most ten seconds.
pub fn by(
    estimate: Spectrum,
    series: &[f64],
    signal: &[Window],
    reference: &[Window],
    rate_hz: f64,
    bootstrap: usize,
    seed: u64,
) -> Spectra {
    let shortest = signal
        .iter()
        .chain(reference)
        .map(|w| w.1)
        .min()
        .unwrap_or(0);
    let (segment, mut estimate) = match estimate {
        Spectrum::Welch => {
            let segment = segment_for(shortest, rate_hz);
            (segment, Estimate::Welch(Welch::new(segment, rate_hz)))
        }
        Spectrum::Multitaper => {
            let segment = shortest.clamp(8, (10.0 * rate_hz).max(8.0) as usize);
            (
                segment,
                Estimate::Multitaper(Multitaper::new(segment, rate_hz)),
            )
        }
    };
    let [signal, signal_low, signal_high] = side(series, signal, &mut estimate, bootstrap, seed);
    let [reference, reference_low, reference_high] =
        side(series, reference, &mut estimate, bootstrap, seed ^ 1);
    Spectra {
        hz: estimate.frequencies(),
        signal,
        signal_low,
        signal_high,
        reference,
        reference_low,
        reference_high,
        segment,
    }
}

/// A planned estimate.
enum Estimate {
    Welch(Welch),
    Multitaper(Multitaper),
}

impl Estimate {
    fn frequencies(&self) -> Vec<f64> {
        match self {
            Estimate::Welch(welch) => welch.frequencies(),
            Estimate::Multitaper(multitaper) => multitaper.frequencies(),
        }
    }
    fn density(&mut self, samples: &[f64]) -> Vec<f64> {
        match self {
            Estimate::Welch(welch) => welch.density(samples),
            Estimate::Multitaper(multitaper) => multitaper.density(samples),
        }
    }
}

fn side(
    series: &[f64],
    windows: &[Window],
    estimate: &mut Estimate,
    bootstrap: usize,
    seed: u64,
) -> [Vec<f64>; 3] {
    let densities: Vec<Vec<f64>> = windows
        .iter()
        .filter_map(|&(first, count)| series.get(first..first.checked_add(count)?))
        .map(|samples| estimate.density(samples))
        .collect();
    let bins = estimate.frequencies().len();
    if densities.is_empty() {
        return [vec![0.0; bins], vec![0.0; bins], vec![0.0; bins]];
    }
    let matrix = DMatrix::from_fn(densities.len(), bins, |k, bin| densities[k][bin]);
    bootstrap::means(&matrix, bootstrap, seed)
}

/// The frequency that best characterises how the sides differ in an end's direction.
///
/// Of the bins above 0 Hz where signal exceeds reference (stronger; falls short of it: weaker) the one with the largest
/// (S − R) · ln(S / R). The difference alone would favour bins with much power on both sides, the ratio alone bins at the noise floor;
/// their product is the bin's share of the symmetric divergence between two variances (Jeffreys 1946, *Proc. R. Soc. A* 186:453–461).
pub fn peak_hz(spectra: &Spectra, end: End) -> Option<f64> {
    peak_bin(spectra, end).map(|bin| spectra.hz[bin])
}

/// Signal over reference at [`peak_hz`] in dB.
pub fn peak_db(spectra: &Spectra, end: End) -> Option<f64> {
    peak_bin(spectra, end).map(|bin| 10.0 * (spectra.signal[bin] / spectra.reference[bin]).log10())
}

fn peak_bin(spectra: &Spectra, end: End) -> Option<usize> {
    let worth = |bin: usize| {
        let (s, r) = (spectra.signal[bin], spectra.reference[bin]);
        let right_way = match end {
            End::Stronger => s > r,
            End::Weaker => s < r,
        };
        (right_way && s > 0.0 && r > 0.0).then(|| (s - r) * (s / r).ln())
    };
    (1..spectra.hz.len())
        .filter_map(|bin| worth(bin).map(|w| (bin, w)))
        .max_by(|a, b| a.1.total_cmp(&b.1))
        .map(|(bin, _)| bin)
}
