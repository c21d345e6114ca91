//! Power spectral density by averaged periodograms (Welch 1967, *IEEE Trans. Audio Electroacoust.* 15:70–73).
//!
//! # Normalisation
//! One-sided density, unit² / Hz: Σ density · bin width is the variance about the segments' means. Periodic Hann window, half overlap, each
//! segment's mean removed, segments averaged; an incomplete last segment is dropped.
use crate::fourier::RealTransform;
use rustfft::num_complex::Complex;
use std::f64::consts::PI;

/// A planned estimate: periodic Hann window, half overlap, constant detrend a segment, one-sided density (unit²/Hz).
pub struct Welch {
    segment: usize,
    rate_hz: f64,
    taper: Vec<f64>,
    fft: RealTransform,
    input: Vec<f64>,
    output: Vec<Complex<f64>>,
}

impl std::fmt::Debug for Welch {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "Welch({} samples at {} Hz)", self.segment, self.rate_hz)
    }
}

/// A segment length for windows of `window` samples: one second, so that bins are 1 Hz apart, or the whole window where that is
/// shorter; even, at least 16.
pub fn segment_for(window: usize, rate_hz: f64) -> usize {
    let second = rate_hz.round().max(0.0) as usize;
    (window.min(second) & !1).max(16)
}

fn hann(length: usize) -> Vec<f64> {
    (0..length)
        .map(|i| 0.5 - 0.5 * (2.0 * PI * i as f64 / length as f64).cos())
        .collect()
}

impl Welch {
    /// Plans for segments of `segment` samples (at least 2 are used) at `rate_hz`.
    pub fn new(segment: usize, rate_hz: f64) -> Self {
        let segment = segment.max(2);
        let fft = RealTransform::new(segment);
        Welch {
            segment,
            rate_hz,
            taper: hann(segment),
            input: vec![0.0; segment],
            output: vec![Complex::default(); fft.bins()],
            fft,
        }
    }
    /// Frequencies of the bins.
    pub fn frequencies(&self) -> Vec<f64> {
        (0..=self.segment / 2)
            .map(|k| k as f64 * self.rate_hz / self.segment as f64)
            .collect()
    }
    /// Density of one window of samples.
    ///
    /// A window shorter than the segment is one segment of its own length, tapered by a window of that length and padded with
    /// zeros; an empty one gives zeros.
    pub fn density(&mut self, samples: &[f64]) -> Vec<f64> {
        let mut sum = vec![0.0; self.segment / 2 + 1];
        let length = samples.len().min(self.segment);
        if length == 0 {
            return sum;
        }
        let short = (length < self.segment).then(|| hann(length));
        let hop = (length - length / 2).max(1);
        let count = (samples.len() - length) / hop + 1;
        for k in 0..count {
            let part = &samples[k * hop..k * hop + length];
            self.transform(part, short.as_deref());
            for (total, value) in sum.iter_mut().zip(&self.output) {
                *total += value.norm_sqr();
            }
        }
        let taper = short.as_deref().unwrap_or(&self.taper);
        let power: f64 = taper.iter().map(|w| w * w).sum();
        let scale = if power > 0.0 {
            1.0 / (power * self.rate_hz * count as f64)
        } else {
            0.0
        };
        let last = sum.len() - 1;
        for (k, value) in sum.iter_mut().enumerate() {
            let alone = k == 0 || (k == last && self.segment.is_multiple_of(2));
            *value *= if alone { scale } else { 2.0 * scale };
        }
        sum
    }
    /// Mean removed, tapered, padded, transformed into `output`.
    fn transform(&mut self, part: &[f64], short: Option<&[f64]>) {
        let mean = part.iter().sum::<f64>() / part.len() as f64;
        let taper = short.unwrap_or(&self.taper);
        for ((slot, value), weight) in self.input.iter_mut().zip(part).zip(taper) {
            *slot = (value - mean) * weight;
        }
        self.input[part.len()..].fill(0.0);
        self.fft.transform(&self.input, &mut self.output);
    }
}
