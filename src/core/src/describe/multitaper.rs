//! Power spectral density by several orthogonal tapers (Thomson 1982, *Proc. IEEE* 70:1055–1096).
//!
//! # Tapers
//! Discrete prolate spheroidal sequences of half bandwidth W = NW / (N/f): eigenvectors of the symmetric tridiagonal matrix with
//! diagonal ((N − 1 − 2t)/2)² cos 2πW/f and off-diagonal t(N − t)/2 that commutes with the concentration problem (Slepian 1978, *Bell
//! Syst. Tech. J.* 57:1371–1430, eq. 17). Its largest eigenvalues are found by bisection on Sturm counts, its vectors by inverse iteration.
//!
//! # Normalisation
//! One-sided density, unit² / Hz; tapers have unit energy and the K = 2NW − 1 eigenspectra weigh alike. Each segment's mean is
//! removed before tapering.
//!
//! # Order and sign
//! Tapers from the most concentrated to the least; even ones have a positive sum, odd ones a positive first lobe.
use crate::fourier::RealTransform;
use rustfft::num_complex::Complex;
use std::f64::consts::PI;

/// Time–half-bandwidth product: 2NW − 1 = 5 tapers.
pub const NW: f64 = 3.0;

/// The `count` most concentrated tapers of `length` samples, each of unit energy.
pub fn dpss(length: usize, nw: f64, count: usize) -> Vec<Vec<f64>> {
    let n = length as f64;
    let w = nw / n;
    let diagonal: Vec<f64> = (0..length)
        .map(|t| ((n - 1.0) / 2.0 - t as f64).powi(2) * (2.0 * PI * w).cos())
        .collect();
    let off: Vec<f64> = (1..length)
        .map(|t| t as f64 * (n - t as f64) / 2.0)
        .collect();
    (0..count.min(length))
        .map(|k| {
            let value = eigenvalue(&diagonal, &off, k);
            let mut taper = eigenvector(&diagonal, &off, value, k);
            let turned = if k.is_multiple_of(2) {
                taper.iter().sum::<f64>() < 0.0
            } else {
                // Σ (N − 1 − 2t) v(t): the first half weighs positive, the second negative.
                let lean = |(t, v): (usize, &f64)| (n - 1.0 - 2.0 * t as f64) * v;
                taper.iter().enumerate().map(lean).sum::<f64>() < 0.0
            };
            if turned {
                taper.iter_mut().for_each(|v| *v = -*v);
            }
            taper
        })
        .collect()
}

/// How many eigenvalues lie above `x` (Sturm sequence of leading minors).
fn above(diagonal: &[f64], off: &[f64], x: f64) -> usize {
    let mut count = 0;
    let mut pivot = 1.0_f64;
    for (k, d) in diagonal.iter().enumerate() {
        let coupled = if k == 0 {
            0.0
        } else {
            off[k - 1].powi(2) / pivot
        };
        pivot = d - x - coupled;
        if pivot == 0.0 {
            pivot = -f64::MIN_POSITIVE.sqrt();
        }
        count += usize::from(pivot > 0.0);
    }
    count
}

/// The k-th largest eigenvalue, to rounding.
fn eigenvalue(diagonal: &[f64], off: &[f64], k: usize) -> f64 {
    // Gershgorin.
    let reach = |t: usize| {
        let left = if t == 0 { 0.0 } else { off[t - 1] };
        left + off.get(t).copied().unwrap_or(0.0)
    };
    let ends = diagonal
        .iter()
        .enumerate()
        .map(|(t, d)| (d - reach(t), d + reach(t)));
    let (mut low, mut high) = ends.fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), (a, b)| {
        (l.min(a), h.max(b))
    });
    for _ in 0..120 {
        let middle = 0.5 * (low + high);
        if middle <= low || middle >= high {
            break;
        }
        if above(diagonal, off, middle) > k {
            low = middle;
        } else {
            high = middle;
        }
    }
    0.5 * (low + high)
}

/// Unit eigenvector of an eigenvalue by inverse iteration from a vector of the right symmetry.
fn eigenvector(diagonal: &[f64], off: &[f64], value: f64, k: usize) -> Vec<f64> {
    let n = diagonal.len();
    let mut v: Vec<f64> = (0..n)
        .map(|t| (PI * (k + 1) as f64 * (t + 1) as f64 / (n + 1) as f64).sin())
        .collect();
    let shift = value + 4.0 * f64::EPSILON * value.abs().max(1.0);
    for _ in 0..4 {
        v = solve(diagonal, off, shift, &v);
        let length = v.iter().map(|x| x * x).sum::<f64>().sqrt();
        v.iter_mut().for_each(|x| *x /= length);
    }
    v
}

/// (A − xI)⁻¹ b for a symmetric tridiagonal A, by elimination with row exchanges.
fn solve(diagonal: &[f64], off: &[f64], x: f64, b: &[f64]) -> Vec<f64> {
    let n = diagonal.len();
    // Each row holds three entries from the diagonal to the right.
    let mut rows: Vec<[f64; 3]> = (0..n)
        .map(|t| [diagonal[t] - x, off.get(t).copied().unwrap_or(0.0), 0.0])
        .collect();
    let mut right = b.to_vec();
    for (t, coupled) in off.iter().enumerate() {
        let mut below = [*coupled, rows[t + 1][0], rows[t + 1][1]];
        if below[0].abs() > rows[t][0].abs() {
            std::mem::swap(&mut below, &mut rows[t]);
            right.swap(t, t + 1);
        }
        if rows[t][0] == 0.0 {
            rows[t][0] = f64::MIN_POSITIVE.sqrt();
        }
        let factor = below[0] / rows[t][0];
        rows[t + 1] = [
            below[1] - factor * rows[t][1],
            below[2] - factor * rows[t][2],
            0.0,
        ];
        right[t + 1] -= factor * right[t];
    }
    let tiny = f64::EPSILON * diagonal.iter().fold(1.0, |m: f64, d| m.max(d.abs()));
    for t in (0..n).rev() {
        let one = right.get(t + 1).map_or(0.0, |v| rows[t][1] * v);
        let two = right.get(t + 2).map_or(0.0, |v| rows[t][2] * v);
        let pivot = if rows[t][0].abs() < tiny * f64::EPSILON {
            tiny * f64::EPSILON
        } else {
            rows[t][0]
        };
        right[t] = (right[t] - one - two) / pivot;
    }
    right
}

/// A planned estimate with segments of one length.
pub struct Multitaper {
    length: usize,
    rate_hz: f64,
    tapers: Vec<Vec<f64>>,
    fft: RealTransform,
    input: Vec<f64>,
    output: Vec<Complex<f64>>,
}

impl Multitaper {
    /// Plans for segments of `length` samples (at least 8 are used): five tapers of NW = 3.
    pub fn new(length: usize, rate_hz: f64) -> Self {
        let length = length.max(8);
        let fft = RealTransform::new(length);
        Multitaper {
            length,
            rate_hz,
            tapers: dpss(length, NW, 2 * NW as usize - 1),
            input: vec![0.0; length],
            output: vec![Complex::default(); fft.bins()],
            fft,
        }
    }
    /// Frequencies of the bins.
    pub fn frequencies(&self) -> Vec<f64> {
        (0..=self.length / 2)
            .map(|k| k as f64 * self.rate_hz / self.length as f64)
            .collect()
    }
    /// Half the width of the band that a bin stands for.
    pub fn half_bandwidth_hz(&self) -> f64 {
        NW * self.rate_hz / self.length as f64
    }
    /// Density of one window: the mean over whole segments that overlap by half; a window shorter than a segment gives zeros.
    pub fn density(&mut self, samples: &[f64]) -> Vec<f64> {
        let mut sum = vec![0.0; self.length / 2 + 1];
        if samples.len() < self.length {
            return sum;
        }
        let hop = (self.length - self.length / 2).max(1);
        let count = (samples.len() - self.length) / hop + 1;
        for k in 0..count {
            let part = &samples[k * hop..k * hop + self.length];
            let mean = part.iter().sum::<f64>() / part.len() as f64;
            for taper in 0..self.tapers.len() {
                let weights = &self.tapers[taper];
                for ((slot, x), w) in self.input.iter_mut().zip(part).zip(weights) {
                    *slot = (x - mean) * w;
                }
                self.fft.transform(&self.input, &mut self.output);
                for (total, value) in sum.iter_mut().zip(&self.output) {
                    *total += value.norm_sqr();
                }
            }
        }
        let scale = 1.0 / (self.rate_hz * (count * self.tapers.len()) as f64);
        let last = sum.len() - 1;
        for (k, value) in sum.iter_mut().enumerate() {
            let alone = k == 0 || (k == last && self.length.is_multiple_of(2));
            *value *= if alone { scale } else { 2.0 * scale };
        }
        sum
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn tapers_are_orthonormal_whatever_their_length() {
        for n in [8, 9, 16, 63, 64, 200, 501] {
            let tapers = dpss(n, NW, 5);
            for (i, a) in tapers.iter().enumerate() {
                for (j, b) in tapers.iter().enumerate() {
                    let dot: f64 = a.iter().zip(b).map(|(x, y)| x * y).sum();
                    let wanted = f64::from(u8::from(i == j));
                    // Inverse iteration leaves about ε times the ratio of the largest eigenvalue to a gap.
                    assert!((dot - wanted).abs() < 1e-9, "{n}: {i}, {j}: {dot}");
                }
            }
        }
    }

    #[test]
    fn the_density_of_a_window_sums_to_its_variance() {
        let samples: Vec<f64> = (0..128).map(|t| (0.37 * t as f64).sin()).collect();
        let mut estimate = Multitaper::new(128, 250.0);
        let density = estimate.density(&samples);
        let power: f64 = density.iter().sum::<f64>() * 250.0 / 128.0;
        // The tapers weigh the samples differently, a sine's variance is ½.
        assert!((power - 0.5).abs() < 0.02, "{power}");
    }
}
