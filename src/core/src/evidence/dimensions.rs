//! How many dimensions stand out of noise: parallel analysis, the edge of noise eigenvalues, an optimal hard threshold.
//!
//! * **Parallel analysis** (Horn 1965, *Psychometrika* 30:179–185; 95th percentile: Glorfeld 1995, *Educ. Psychol. Meas.* 55:377–393): eigenvalues of the
//!   correlation matrix of the windows against those of surrogates in which each channel's windows, strung together, are shifted
//!   circularly by a random time. A shift keeps each channel's autocorrelation and breaks what channels share. Counted are the leading
//!   eigenvalues above the surrogates' 95th percentile of the same rank, up to the first that is not.
//! * **Noise edge** (Marchenko & Pastur 1967, *Math. USSR-Sbornik* 1:457–483): eigenvalues of white noise of variance σ² do not exceed
//!   σ²(1+√γ)², γ = p/n.
//! * **Hard threshold** (Gavish & Donoho 2014, *IEEE Trans. Inf. Theory* 60:5040–5053): singular values above ω(β) times the median one.
//!
//! # Effective samples
//! n is not the count of samples: they are autocorrelated. Two independent series have a sample correlation of variance
//! Σ_k ρ_i(k)ρ_j(k) / N (Bartlett 1935, *J. R. Stat. Soc.* 98:536–543); n = N over the mean of that sum over all pairs of channels, ρ from
//! within the windows. σ² is the median eigenvalue over the median of the Marchenko–Pastur law. Both rules on eigenvalues need
//! p < n and are withheld otherwise; p is the rank.
use super::bootstrap::{below, generator, quantile};
use crate::contrast::linalg::{eigenvalues, gram, unpack};
use crate::contrast::windows::Window;
use crate::fourier::RealTransform;
use crate::sheet::DimensionsCard;
use rustfft::num_complex::Complex;
use std::f64::consts::PI;

/// Surrogate i uses stream `STREAM_SURROGATES + i` of the seed.
const STREAM_SURROGATES: u64 = 1 << 48;
const MOST_SURROGATES: usize = 100;
const FEWEST_SURROGATES: usize = 20;
/// Multiplications that all surrogates together may take.
const WORK: f64 = 1e9;

/// Median of the Marchenko–Pastur law of variance 1 for 0 < γ ≤ 1, by bisection of its distribution function.
pub fn marchenko_pastur_median(gamma: f64) -> f64 {
    let (low, high) = marchenko_pastur_edges(gamma);
    let (mut from, mut to) = (low, high);
    for _ in 0..60 {
        let middle = 0.5 * (from + to);
        if below_share(gamma, middle) < 0.5 {
            from = middle;
        } else {
            to = middle;
        }
    }
    0.5 * (from + to)
}

/// Edges (1 ∓ √γ)² of the Marchenko–Pastur law of variance 1.
pub fn marchenko_pastur_edges(gamma: f64) -> (f64, f64) {
    ((1.0 - gamma.sqrt()).powi(2), (1.0 + gamma.sqrt()).powi(2))
}

/// ∫ √((b−t)(t−a)) / (2πγt) dt from a to x, by t = m + h sin θ and Simpson's rule; both root singularities are gone then.
fn below_share(gamma: f64, x: f64) -> f64 {
    const STEPS: usize = 512;
    let (a, b) = marchenko_pastur_edges(gamma);
    let (middle, half) = (0.5 * (a + b), 0.5 * (b - a));
    let end = ((x - middle) / half).clamp(-1.0, 1.0).asin();
    let width = (end + PI / 2.0) / STEPS as f64;
    let at = |i: usize| {
        let theta = -PI / 2.0 + i as f64 * width;
        let t = middle + half * theta.sin();
        // At γ = 1 the law begins at 0, where cos²θ/t tends to 2/h.
        let value = (half * theta.cos()).powi(2) / t;
        if value.is_finite() { value } else { 2.0 * half }
    };
    let inner: f64 = (1..STEPS)
        .map(|i| at(i) * if i % 2 == 1 { 4.0 } else { 2.0 })
        .sum();
    (at(0) + inner + at(STEPS)) * width / 3.0 / (2.0 * PI * gamma)
}

/// λ(β): the threshold on singular values over √n σ, n the larger side, where σ is known. λ(1) = 4/√3.
pub fn hard_threshold_known(beta: f64) -> f64 {
    let root = (beta * beta + 14.0 * beta + 1.0).sqrt();
    (2.0 * (beta + 1.0) + 8.0 * beta / (beta + 1.0 + root)).sqrt()
}

/// ω(β): the threshold on singular values over their median, where σ is not known. ω(1) = 2.858.
pub fn hard_threshold_unknown(beta: f64) -> f64 {
    hard_threshold_known(beta) / marchenko_pastur_median(beta).sqrt()
}

/// Leading values above those of noise of the same rank, up to the first that is not.
pub fn outstanding(values: &[f64], noise: &[f64]) -> usize {
    let pairs = values.iter().zip(noise);
    pairs.take_while(|(value, noise)| value > noise).count()
}

/// Noise variance, noise edge and hard threshold, all on eigenvalues of a covariance of `samples` (effective) samples. `values` descending,
/// up to the rank.
pub fn noise_rules(values: &[f64], samples: f64) -> Option<[f64; 3]> {
    let gamma = values.len() as f64 / samples;
    if values.len() < 2 || !(gamma > 0.0 && gamma < 1.0) {
        return None;
    }
    let rising: Vec<f64> = values.iter().rev().copied().collect();
    let median = quantile(&rising, 0.5);
    let variance = median / marchenko_pastur_median(gamma);
    let edge = variance * marchenko_pastur_edges(gamma).1;
    Some([
        variance,
        edge,
        median * hard_threshold_unknown(gamma).powi(2),
    ])
}

/// Parallel analysis in bites.
#[derive(Debug)]
pub struct Counting {
    samples: usize,
    /// `channels × samples` of the windows used, each window about its mean, each channel of variance 1.
    series: Vec<Vec<f64>>,
    windows: Vec<Window>,
    /// Σ over windows of x(t)x(t+k), over its value at k = 0, one list a channel.
    correlations: Vec<Vec<f64>>,
    observed: Vec<f64>,
    surrogates: Vec<Vec<f64>>,
    count: usize,
    seed: u64,
}

impl Counting {
    /// Plans: where the windows hold more than can be shuffled in good time, every so manyth is used.
    pub fn new(samples: &[Vec<f32>], windows: &[Window], seed: u64) -> Self {
        let m = samples.len() as f64;
        let all: usize = windows.iter().map(|w| w.count).sum();
        let one = |samples: f64| 0.5 * m * m * samples + 9.0 * m * m * m;
        let most =
            ((WORK / FEWEST_SURROGATES as f64 - 9.0 * m * m * m) / (0.5 * m * m)).max(4.0 * m);
        let every = (all as f64 / most).ceil().max(1.0) as usize;
        let windows: Vec<Window> = windows.iter().step_by(every).copied().collect();
        let used: usize = windows.iter().map(|w| w.count).sum();
        let count = (WORK / one(used as f64)) as usize;
        Counting {
            samples: all,
            series: Vec::with_capacity(samples.len()),
            windows,
            correlations: Vec::with_capacity(samples.len()),
            observed: Vec::new(),
            surrogates: Vec::new(),
            count: count.clamp(FEWEST_SURROGATES, MOST_SURROGATES),
            seed,
        }
    }

    /// Steps done, and in all.
    pub fn progress(&self, channels: usize) -> (usize, usize) {
        let done =
            self.series.len() + self.surrogates.len() + usize::from(!self.observed.is_empty());
        (done, channels + self.count + 1)
    }

    /// One channel, or one surrogate; false when all are done.
    pub fn step(&mut self, samples: &[Vec<f32>]) -> bool {
        if let Some(channel) = samples.get(self.series.len()) {
            self.take(channel);
        } else if self.observed.is_empty() {
            self.observed = self.spectrum(&vec![0; self.series.len()]);
        } else if self.surrogates.len() < self.count {
            let mut rng = generator(self.seed, STREAM_SURROGATES + self.surrogates.len() as u64);
            let n = self.series.first().map_or(1, Vec::len).max(1);
            let shifts: Vec<usize> = self.series.iter().map(|_| below(&mut rng, n)).collect();
            let values = self.spectrum(&shifts);
            self.surrogates.push(values);
        }
        self.surrogates.len() < self.count
    }

    /// What was found; `values` are the eigenvalues of the pooled covariance up to the rank.
    pub fn card(&self, values: &[f64]) -> DimensionsCard {
        let effective = self.effective_samples();
        let rules = noise_rules(values, effective);
        let at = |i: usize| {
            let mut all: Vec<f64> = self
                .surrogates
                .iter()
                .filter_map(|s| s.get(i).copied())
                .collect();
            all.sort_by(f64::total_cmp);
            quantile(&all, 0.95)
        };
        DimensionsCard {
            samples: self.samples,
            effective_samples: effective,
            noise_variance: rules.map(|r| r[0]),
            noise_edge: rules.map(|r| r[1]),
            hard_threshold: rules.map(|r| r[2]),
            correlation: self.observed.clone(),
            surrogate_95: (0..self.observed.len()).map(at).collect(),
            surrogates: self.surrogates.len(),
            surrogate_samples: self.series.first().map_or(0, Vec::len),
        }
    }

    /// One channel's windows about their means, scaled to variance 1, and their autocorrelation.
    fn take(&mut self, channel: &[f32]) {
        let longest = self.windows.iter().map(|w| w.count).max().unwrap_or(1);
        let size = (2 * longest).next_power_of_two();
        let mut transform = RealTransform::new(size);
        let mut input = vec![0.0; size];
        let mut output = vec![Complex::default(); transform.bins()];
        let mut power = vec![0.0; output.len()];
        let mut series = Vec::with_capacity(self.windows.iter().map(|w| w.count).sum());
        for window in &self.windows {
            let part = &channel[window.first..window.first + window.count];
            let mean = part.iter().map(|x| f64::from(*x)).sum::<f64>() / part.len() as f64;
            input.fill(0.0);
            for (slot, x) in input.iter_mut().zip(part) {
                *slot = f64::from(*x) - mean;
            }
            series.extend_from_slice(&input[..part.len()]);
            transform.transform(&input, &mut output);
            power
                .iter_mut()
                .zip(&output)
                .for_each(|(p, z)| *p += z.norm_sqr());
        }
        for (z, p) in output.iter_mut().zip(&power) {
            *z = Complex::new(*p, 0.0);
        }
        transform.transform_back(&output, &mut input);
        let whole = input.first().copied().filter(|r| *r > 0.0).unwrap_or(1.0);
        let correlation = input[..longest].iter().map(|r| r / whole).collect();
        let square = series.iter().map(|x| x * x).sum::<f64>() / series.len().max(1) as f64;
        let scale = if square > 0.0 {
            1.0 / square.sqrt()
        } else {
            0.0
        };
        series.iter_mut().for_each(|x| *x *= scale);
        self.series.push(series);
        self.correlations.push(correlation);
    }

    /// Eigenvalues, descending, of the correlation matrix with each channel shifted.
    fn spectrum(&self, shifts: &[usize]) -> Vec<f64> {
        let (m, n) = (self.series.len(), self.series.first().map_or(0, Vec::len));
        let stride = m.next_multiple_of(4);
        let mut panel = vec![0.0; stride * n];
        for (c, (channel, shift)) in self.series.iter().zip(shifts).enumerate() {
            let (head, tail) = channel.split_at(*shift);
            for (t, x) in tail.iter().chain(head).enumerate() {
                panel[t * stride + c] = *x;
            }
        }
        let mut packed = gram(&panel, m, stride);
        packed.iter_mut().for_each(|x| *x /= n.max(1) as f64);
        eigenvalues(&unpack(&packed, m))
    }

    /// N over the mean over pairs of channels of Σ_k ρ_i(k)ρ_j(k).
    fn effective_samples(&self) -> f64 {
        let m = self.correlations.len() as f64;
        let lags = self.correlations.first().map_or(0, Vec::len);
        let pairs = |k: usize| {
            let (mut sum, mut squares) = (0.0, 0.0);
            for rho in &self.correlations {
                sum += rho[k];
                squares += rho[k] * rho[k];
            }
            (sum * sum - squares) / (m * (m - 1.0))
        };
        let spread = 1.0 + 2.0 * (1..lags).map(pairs).sum::<f64>();
        self.samples as f64 / spread.max(1.0)
    }
}
