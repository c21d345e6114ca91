//! Fourier transforms of real signals, over rustfft's complex ones.
//!
//! A real signal of even length n is taken as n/2 complex numbers, transformed, and untangled (Press et al. 2007, *Numerical Recipes*,
//! 3rd ed., §12.3.2). Not scaled: forward and back gives n times the signal.
//!
//! In the browser only the planner for its vector instructions comes along: the general one would be the largest guest in the file.
use rustfft::num_complex::Complex;
use rustfft::{Fft, FftDirection};
use std::f64::consts::PI;
use std::sync::Arc;

/// A planned transform of one length, with its own buffers.
pub(crate) struct RealTransform {
    length: usize,
    forward: Arc<dyn Fft<f64>>,
    back: Arc<dyn Fft<f64>>,
    /// exp(−2πik/n) for k up to n/4; empty for odd lengths, which go through a complex transform of full length.
    turns: Vec<Complex<f64>>,
    work: Vec<Complex<f64>>,
    scratch: Vec<Complex<f64>>,
}

impl RealTransform {
    /// Plans for signals of `length` samples, at least 1.
    pub(crate) fn new(length: usize) -> Self {
        let length = length.max(1);
        let even = length.is_multiple_of(2);
        let complex = if even { length / 2 } else { length };
        let [forward, back] = plan(complex);
        let scratch = forward
            .get_inplace_scratch_len()
            .max(back.get_inplace_scratch_len());
        let turn = |k: usize| Complex::from_polar(1.0, -2.0 * PI * k as f64 / length as f64);
        RealTransform {
            length,
            forward,
            back,
            turns: if even {
                (0..=length / 4).map(turn).collect()
            } else {
                Vec::new()
            },
            work: vec![Complex::default(); complex],
            scratch: vec![Complex::default(); scratch],
        }
    }

    /// Numbers in a spectrum: frequencies 0 to Nyquist.
    pub(crate) fn bins(&self) -> usize {
        self.length / 2 + 1
    }

    /// Σ x[t]·exp(−2πikt/n) for k from 0 to n/2. `signal` holds n samples, `spectrum` n/2 + 1 numbers.
    pub(crate) fn transform(&mut self, signal: &[f64], spectrum: &mut [Complex<f64>]) {
        debug_assert!(signal.len() == self.length && spectrum.len() == self.bins());
        if self.turns.is_empty() {
            for (slot, value) in self.work.iter_mut().zip(signal) {
                *slot = Complex::new(*value, 0.0);
            }
            self.forward
                .process_with_scratch(&mut self.work, &mut self.scratch);
            spectrum.copy_from_slice(&self.work[..self.length / 2 + 1]);
            return;
        }
        for (slot, pair) in self.work.iter_mut().zip(signal.chunks_exact(2)) {
            *slot = Complex::new(pair[0], pair[1]);
        }
        self.forward
            .process_with_scratch(&mut self.work, &mut self.scratch);
        let half = self.work.len();
        let first = self.work[0];
        spectrum[0] = Complex::new(first.re + first.im, 0.0);
        spectrum[half] = Complex::new(first.re - first.im, 0.0);
        for k in 1..=half / 2 {
            let (here, there) = (self.work[k], self.work[half - k].conj());
            let even = (here + there) * 0.5;
            let odd = (here - there) * Complex::new(0.0, -0.5) * self.turns[k];
            spectrum[k] = even + odd;
            spectrum[half - k] = (even - odd).conj();
        }
    }

    /// n times the signal whose spectrum this is; what a real signal cannot have (imaginary parts at 0 and Nyquist) is left out.
    pub(crate) fn transform_back(&mut self, spectrum: &[Complex<f64>], signal: &mut [f64]) {
        debug_assert!(signal.len() == self.length && spectrum.len() == self.bins());
        if self.turns.is_empty() {
            self.work[0] = Complex::new(spectrum[0].re, 0.0);
            for (k, value) in spectrum.iter().enumerate().skip(1) {
                self.work[k] = *value;
                self.work[self.length - k] = value.conj();
            }
            self.back
                .process_with_scratch(&mut self.work, &mut self.scratch);
            for (slot, value) in signal.iter_mut().zip(&self.work) {
                *slot = value.re;
            }
            return;
        }
        let half = self.work.len();
        let (low, high) = (spectrum[0].re, spectrum[half].re);
        self.work[0] = Complex::new(low + high, low - high);
        for k in 1..=half / 2 {
            let (here, there) = (spectrum[k], spectrum[half - k].conj());
            let even = here + there;
            let odd = (here - there) * self.turns[k].conj() * Complex::i();
            self.work[k] = even + odd;
            self.work[half - k] = (even - odd).conj();
        }
        self.back
            .process_with_scratch(&mut self.work, &mut self.scratch);
        for (pair, value) in signal.chunks_exact_mut(2).zip(&self.work) {
            pair[0] = value.re;
            pair[1] = value.im;
        }
    }
}

#[cfg(all(target_arch = "wasm32", target_feature = "simd128"))]
fn plan(length: usize) -> [Arc<dyn Fft<f64>>; 2] {
    use rustfft::{FftPlannerWasmSimd, algorithm::Dft};
    let mut planner = FftPlannerWasmSimd::new();
    [FftDirection::Forward, FftDirection::Inverse].map(|direction| match &mut planner {
        Ok(planner) => planner.plan_fft(length, direction),
        // The planner refuses only where the instructions are missing.
        Err(()) => Arc::new(Dft::new(length, direction)),
    })
}

#[cfg(not(all(target_arch = "wasm32", target_feature = "simd128")))]
fn plan(length: usize) -> [Arc<dyn Fft<f64>>; 2] {
    let mut planner = rustfft::FftPlanner::new();
    [FftDirection::Forward, FftDirection::Inverse]
        .map(|direction| planner.plan_fft(length, direction))
}

#[cfg(test)]
mod tests {
    use super::*;
    use realfft::RealFftPlanner;

    #[test]
    fn agrees_with_realfft_and_comes_back() {
        for length in (1..40).chain([64, 97, 250, 256, 1000, 1001]) {
            let signal: Vec<f64> = (0..length)
                .map(|t| ((t * t * 7 + 3 * t) % 31) as f64 - 15.0)
                .collect();
            let plan = RealFftPlanner::<f64>::new().plan_fft_forward(length);
            let mut expected = plan.make_output_vec();
            assert!(plan.process(&mut signal.clone(), &mut expected).is_ok());
            let mut ours = RealTransform::new(length);
            let mut spectrum = vec![Complex::default(); ours.bins()];
            ours.transform(&signal, &mut spectrum);
            let scale = 15.0 * length as f64;
            for (a, b) in spectrum.iter().zip(&expected) {
                assert!((a - b).norm() < 1e-13 * scale, "{length}: {a} {b}");
            }
            let mut again = vec![0.0; length];
            ours.transform_back(&spectrum, &mut again);
            for (a, b) in again.iter().zip(&signal) {
                assert!((a / length as f64 - b).abs() < 1e-12, "{length}: {a} {b}");
            }
        }
    }
}
