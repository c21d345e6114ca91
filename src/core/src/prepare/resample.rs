//! Rational resampling: up by inserting zeros, anti-alias FIR, down by dropping, all in one polyphase product.
//!
//! The FIR is a windowed sinc (Kaiser window, β = 5, 20·max(up, down) + 1 taps) with its cut-off (gain 1/2) at the lower of the two Nyquist
//! frequencies. Edges are mirrored as in [`super::fir`].
use super::fir::{Pass, kaiser, mirrored, windowed_sinc};

/// Largest numerator and denominator of the ratio of rates.
const LARGEST_TERM: u64 = 4096;

/// A planned change of rate by up / down.
#[derive(Debug, Clone)]
pub struct Resampler {
    /// Numerator.
    pub up: usize,
    /// Denominator.
    pub down: usize,
    half: usize,
    /// For each phase the taps it meets, in the order of the samples.
    phases: Vec<Vec<f64>>,
}

/// The best ratio up / down of terms up to 4096 for a change of rate, by continued fractions; `None` when it would be 0 or not finite.
pub fn ratio(from_hz: f64, to_hz: f64) -> Option<(usize, usize)> {
    let target = to_hz / from_hz;
    if !target.is_finite() || target <= 0.0 {
        return None;
    }
    let (mut p, mut q, mut p_before, mut q_before) = (1u64, 0u64, 0u64, 1u64);
    let mut rest = target;
    while rest.floor() <= LARGEST_TERM as f64 {
        let whole = rest.floor() as u64;
        let (p_next, q_next) = (whole * p + p_before, whole * q + q_before);
        if p_next > LARGEST_TERM || q_next > LARGEST_TERM {
            break;
        }
        (p_before, q_before, p, q) = (p, q, p_next, q_next);
        let error = (p as f64 / q as f64 / target - 1.0).abs();
        if error < 1e-13 || rest == rest.floor() {
            break;
        }
        rest = 1.0 / (rest - rest.floor());
    }
    (p > 0 && q > 0).then_some((p as usize, q as usize))
}

impl Resampler {
    /// Plans for up / down in lowest terms.
    pub fn new(up: usize, down: usize) -> Self {
        let largest = up.max(down);
        let half = 10 * largest;
        let taps = windowed_sinc(
            Pass::Below(1.0 / largest as f64),
            &kaiser(2 * half + 1, 5.0),
        );
        let phase = |phase: usize| {
            let mut met: Vec<f64> = taps
                .iter()
                .skip(phase)
                .step_by(up)
                .map(|t| t * up as f64)
                .collect();
            met.reverse();
            met
        };
        Resampler {
            up,
            down,
            half,
            phases: (0..up).map(phase).collect(),
        }
    }
    /// Samples on either side that one depends on.
    pub fn reach(&self) -> usize {
        self.half.div_ceil(self.up) + 1
    }
    /// How many samples come out of `samples`: ⌈samples · up / down⌉.
    pub fn count(&self, samples: usize) -> usize {
        (samples as u64 * self.up as u64).div_ceil(self.down as u64) as usize
    }
    /// Resamples one stretch into `out` (replaced). The first sample keeps its time.
    pub fn resample(&self, samples: &[f64], out: &mut Vec<f64>) {
        out.clear();
        out.extend((0..self.count(samples.len())).map(|j| self.value(samples, j)));
    }
    fn value(&self, samples: &[f64], j: usize) -> f64 {
        // The product outgrows the 32 bits of a browser's usize within hours of recording.
        let place = j as u64 * self.down as u64 + self.half as u64;
        let up = self.up as u64;
        let taps = &self.phases[(place % up) as usize];
        let first = (place / up + 1) as isize - taps.len() as isize;
        let end = first + taps.len() as isize;
        if first >= 0 && end <= samples.len() as isize {
            return dot(taps, &samples[first as usize..end as usize]);
        }
        (first..end)
            .zip(taps)
            .map(|(i, tap)| tap * samples[mirrored(i, samples.len())])
            .sum()
    }
}

/// Four sums side by side, so that the machine need not wait for each addition.
fn dot(a: &[f64], b: &[f64]) -> f64 {
    let mut sums = [0.0; 4];
    let (a_fours, b_fours) = (a.chunks_exact(4), b.chunks_exact(4));
    let rest: f64 = a_fours
        .remainder()
        .iter()
        .zip(b_fours.remainder())
        .map(|(x, y)| x * y)
        .sum();
    for (x, y) in a_fours.zip(b_fours) {
        for k in 0..4 {
            sums[k] += x[k] * y[k];
        }
    }
    sums.iter().sum::<f64>() + rest
}
