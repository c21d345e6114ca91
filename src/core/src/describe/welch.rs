//! Power spectral density by averaged periodograms (Welch 1967).

/// A planned estimate: periodic Hann window, half overlap, constant detrend a segment, one-sided density (unit²/Hz).
pub struct Welch {}

impl Welch {
    /// Plans for segments of `segment` samples at `rate_hz`.
    pub fn new(_segment: usize, _rate_hz: f64) -> Self {
        Welch {}
    }
    /// Frequencies of the bins.
    pub fn frequencies(&self) -> Vec<f64> {
        Vec::new()
    }
    /// Density of one window of samples, at least `segment` long.
    pub fn density(&mut self, _samples: &[f64]) -> Vec<f64> {
        Vec::new()
    }
}
