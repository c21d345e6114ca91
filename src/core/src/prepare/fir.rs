//! Linear-phase FIR filters by the windowed-sinc method, applied with zero phase.
//!
//! h[n] = w[n] · Σ over pass bands (b sinc(b m) − a sinc(a m)), m = n − (N−1)/2, cut-offs a, b relative to the Nyquist frequency, then scaled
//! to gain 1 in the pass band's reference frequency (0, or Nyquist for a high-pass).
//!
//! # Length and transition
//! Hamming window, odd N ≥ 3.3·f/Δf. Δf = min(max(0.25·fc, 2 Hz), fc) at a low edge and min(max(0.25·fc, 2 Hz), f/2 − fc) at a high edge
//! (Widmann, Schröger & Maess 2015, *J. Neurosci. Methods* 250:34–46). fc is the edge of the pass band: the cut-off (−6 dB) lies Δf/2 outside.
//!
//! # Edges
//! A signal is continued by its mirror image, the edge sample not repeated (`x₂ x₁ | x₀ x₁ x₂`); one shorter than the continuation is
//! mirrored again and again.
use crate::fourier::RealTransform;
use rustfft::num_complex::Complex;
use std::f64::consts::PI;

/// Where a window or a mirrored signal of `length` samples is read for any index: mirrored at both ends, ends not repeated.
pub(super) fn mirrored(index: isize, length: usize) -> usize {
    if length < 2 {
        return 0;
    }
    let period = 2 * (length - 1);
    let place = index.rem_euclid(period as isize) as usize;
    place.min(period - place)
}

/// Symmetric Hamming window.
pub fn hamming(length: usize) -> Vec<f64> {
    let last = (length.max(2) - 1) as f64;
    (0..length)
        .map(|n| 0.54 - 0.46 * (2.0 * PI * n as f64 / last).cos())
        .collect()
}

/// Symmetric Kaiser window.
pub fn kaiser(length: usize, beta: f64) -> Vec<f64> {
    let last = (length.max(2) - 1) as f64;
    let top = bessel_i0(beta);
    (0..length)
        .map(|n| {
            let x = 2.0 * n as f64 / last - 1.0;
            bessel_i0(beta * (1.0 - x * x).max(0.0).sqrt()) / top
        })
        .collect()
}

/// Modified Bessel function of the first kind and order 0: Σ ((x/2)^k / k!)².
fn bessel_i0(x: f64) -> f64 {
    let quarter = x * x / 4.0;
    let (mut term, mut sum, mut k) = (1.0, 1.0, 1.0);
    while term > sum * 1e-17 {
        term *= quarter / (k * k);
        sum += term;
        k += 1.0;
    }
    sum
}

/// What a filter lets pass, with its cut-offs (gain 1/2) in units of the Nyquist frequency.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Pass {
    /// From 0 to the cut-off.
    Below(f64),
    /// From the cut-off to Nyquist.
    Above(f64),
    /// All but what lies between the two.
    Outside(f64, f64),
}

/// Taps of a windowed sinc with these window values (odd in number), scaled to gain 1 at 0 (`Above`: at Nyquist).
pub fn windowed_sinc(pass: Pass, window: &[f64]) -> Vec<f64> {
    let centre = (window.len() - 1) as f64 / 2.0;
    let ideal = |m: f64| match pass {
        Pass::Below(c) => c * sinc(c * m),
        Pass::Above(c) => sinc(m) - c * sinc(c * m),
        Pass::Outside(a, b) => a * sinc(a * m) + sinc(m) - b * sinc(b * m),
    };
    let mut taps: Vec<f64> = window
        .iter()
        .enumerate()
        .map(|(n, w)| w * ideal(n as f64 - centre))
        .collect();
    let at_reference = |(n, tap): (usize, &f64)| match pass {
        Pass::Above(_) => tap * (PI * (n as f64 - centre)).cos(),
        _ => *tap,
    };
    let gain: f64 = taps.iter().enumerate().map(at_reference).sum();
    for tap in &mut taps {
        *tap /= gain;
    }
    taps
}

/// sin(πx) / πx.
fn sinc(x: f64) -> f64 {
    if x == 0.0 {
        1.0
    } else {
        (PI * x).sin() / (PI * x)
    }
}

/// One requested filter.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Request {
    /// Lower edge of the pass band in Hz.
    HighPass(f64),
    /// Upper edge of the pass band in Hz.
    LowPass(f64),
    /// Centre in Hz of a stop band 2 Hz wide (−6 dB); pass bands begin 2 Hz from the centre.
    Notch(f64),
}

/// Its design at one sampling rate.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Design {
    /// What was asked for.
    pub request: Request,
    /// Width of the transition band.
    pub transition_hz: f64,
    /// Odd number of taps.
    pub length: usize,
    pass: Pass,
}

impl Design {
    /// Edges must lie above 0 and below half the rate; a notch's cut-offs too.
    pub fn new(request: Request, rate_hz: f64) -> Self {
        let nyquist = rate_hz / 2.0;
        let usual = |edge: f64| (0.25 * edge).max(2.0);
        let (transition_hz, pass) = match request {
            Request::HighPass(edge) => {
                let width = usual(edge).min(edge);
                (width, Pass::Above((edge - width / 2.0) / nyquist))
            }
            Request::LowPass(edge) => {
                let width = usual(edge).min(nyquist - edge);
                (width, Pass::Below((edge + width / 2.0) / nyquist))
            }
            Request::Notch(centre) => (
                2.0,
                Pass::Outside((centre - 1.0) / nyquist, (centre + 1.0) / nyquist),
            ),
        };
        let length = (3.3 * rate_hz / transition_hz).ceil() as usize | 1;
        Design {
            request,
            transition_hz,
            length,
            pass,
        }
    }
    /// The taps.
    pub fn taps(&self) -> Vec<f64> {
        windowed_sinc(self.pass, &hamming(self.length))
    }
    /// `high-pass 1 Hz, 1 Hz transition, 825 taps`.
    pub fn sentence(&self) -> String {
        let (name, edge) = match self.request {
            Request::HighPass(edge) => ("high-pass", edge),
            Request::LowPass(edge) => ("low-pass", edge),
            Request::Notch(centre) => ("notch", centre),
        };
        format!(
            "{name} {edge} Hz, {} Hz transition, {} taps",
            self.transition_hz, self.length
        )
    }
}

/// The taps of filters in a row: their linear convolution. Edges are then mirrored once for all of them.
pub fn in_a_row(filters: &[Vec<f64>]) -> Option<Vec<f64>> {
    let (first, rest) = filters.split_first()?;
    Some(rest.iter().fold(first.clone(), |all, taps| {
        // A signal mirrored by zeros: convolution over the padded signal is the linear convolution.
        let mut padded = vec![0.0; taps.len() - 1];
        padded.extend_from_slice(&all);
        padded.resize(all.len() + 2 * (taps.len() - 1), 0.0);
        let mut out = Vec::new();
        ZeroPhase::new(taps, padded.len()).slide(&padded, &mut out);
        out
    }))
}

/// A planned zero-phase filter: odd symmetric taps, delay compensated, by overlap-save FFT in f64.
///
/// Planning allocates; [`Self::filter`] reuses its buffers. Cost per sample: about 2·log₂ of the block length, whatever the taps.
pub struct ZeroPhase {
    taps: usize,
    block: usize,
    fft: RealTransform,
    /// Spectrum of the taps, divided by the block length.
    response: Vec<Complex<f64>>,
    padded: Vec<f64>,
    time: Vec<f64>,
    spectrum: Vec<Complex<f64>>,
}

impl std::fmt::Debug for ZeroPhase {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "ZeroPhase({} taps, blocks of {})", self.taps, self.block)
    }
}

impl ZeroPhase {
    /// Plans for these taps and signals of about `samples`.
    pub fn new(taps: &[f64], samples: usize) -> Self {
        let block = block_for(taps.len(), samples);
        let fft = RealTransform::new(block);
        let none = vec![Complex::default(); fft.bins()];
        let mut plan = ZeroPhase {
            taps: taps.len(),
            block,
            response: none.clone(),
            padded: Vec::new(),
            time: vec![0.0; block],
            spectrum: none,
            fft,
        };
        for (slot, tap) in plan.time.iter_mut().zip(taps) {
            *slot = tap / block as f64;
        }
        plan.fft.transform(&plan.time, &mut plan.spectrum);
        plan.response.copy_from_slice(&plan.spectrum);
        plan
    }
    /// Filters one stretch, mirrored at its edges, into `out` (replaced; as long as `samples`).
    pub fn filter(&mut self, samples: &[f64], out: &mut Vec<f64>) {
        let half = (self.taps / 2) as isize;
        let mut padded = std::mem::take(&mut self.padded);
        padded.clear();
        if !samples.is_empty() {
            let n = samples.len();
            padded.extend((-half..0).map(|i| samples[mirrored(i, n)]));
            padded.extend_from_slice(samples);
            padded.extend((0..half).map(|i| samples[mirrored(n as isize + i, n)]));
        }
        self.slide(&padded, out);
        self.padded = padded;
    }
    /// Full-overlap convolution: `padded.len() − taps + 1` values.
    fn slide(&mut self, padded: &[f64], out: &mut Vec<f64>) {
        out.clear();
        let count = (padded.len() + 1).saturating_sub(self.taps);
        let step = self.block + 1 - self.taps;
        while out.len() < count {
            let rest = &padded[out.len()..];
            let filled = rest.len().min(self.block);
            self.time[..filled].copy_from_slice(&rest[..filled]);
            self.time[filled..].fill(0.0);
            self.fft.transform(&self.time, &mut self.spectrum);
            for (value, gain) in self.spectrum.iter_mut().zip(&self.response) {
                *value *= gain;
            }
            self.fft.transform_back(&self.spectrum, &mut self.time);
            let fresh = step.min(count - out.len());
            out.extend_from_slice(&self.time[self.taps - 1..self.taps - 1 + fresh]);
        }
    }
}

/// The power of two with the least work per fresh sample, no longer than the padded signal needs.
fn block_for(taps: usize, samples: usize) -> usize {
    let enough = (samples + 2 * taps).next_power_of_two();
    let work =
        |block: &usize| (*block as f64) * (*block as f64).log2() / (*block + 1 - taps) as f64;
    let smallest = (2 * taps).next_power_of_two().max(64);
    (0..4)
        .map(|k| smallest << k)
        .filter(|&block| block <= enough.max(smallest))
        .min_by(|a, b| work(a).total_cmp(&work(b)))
        .unwrap_or(smallest)
}
