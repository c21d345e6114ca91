//! What is read of the recording for a window: its samples, or what a kind of contrast makes of them.
//!
//! * windows, spans: the prepared samples on both sides;
//! * band: the band-passed samples for signal, those of the flanks (or all) for reference;
//! * slow: (x(t + lag) + x(t))/√2 for signal, (x(t + lag) − x(t))/√2 for reference: with C₀ the mean covariance of both ends and C_τ
//!   the symmetrised lagged one, S = C₀ + C_τ and R = C₀ − C_τ. Both are positive semidefinite, S w = λ R w has the directions of
//!   C_τ w = r C₀ w (Molgedey & Schuster 1994, *Phys. Rev. Lett.* 72:3634–3637), and λ = (1 + r)/(1 − r).
use super::windows::Window;

/// The samples of both sides.
#[derive(Debug, Clone, Copy)]
pub struct Reader<'a> {
    /// `channels × samples` of signal windows.
    pub signal: &'a [Vec<f32>],
    /// `channels × samples` of reference windows.
    pub reference: &'a [Vec<f32>],
    /// Samples between the two ends of a pair, 0 for none.
    pub lag: usize,
}

impl Reader<'_> {
    /// Channels.
    pub fn channels(&self) -> usize {
        self.signal.len()
    }

    /// Values that a window gives.
    pub fn values(&self, window: &Window) -> usize {
        window.count - self.lag
    }

    /// One channel of a window.
    pub fn channel(&self, window: &Window, c: usize, out: &mut Vec<f32>) {
        let side = if window.signal {
            self.signal
        } else {
            self.reference
        };
        out.clear();
        out.extend_from_slice(&side[c][window.first..window.first + window.count]);
        if self.lag == 0 {
            return;
        }
        let half = std::f32::consts::FRAC_1_SQRT_2;
        let sign = if window.signal { half } else { -half };
        for t in 0..window.count - self.lag {
            out[t] = half * out[t + self.lag] + sign * out[t];
        }
        out.truncate(window.count - self.lag);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn window(first: usize, signal: bool, trial: usize) -> Window {
        Window {
            first,
            count: 4,
            signal,
            trial,
            onset_s: 0.0,
        }
    }

    #[test]
    fn sums_and_differences_of_samples_a_lag_apart() {
        let x: Vec<f32> = (0..20).map(|i| (i * i % 7) as f32).collect();
        let samples = vec![x.clone()];
        let reader = |lag| Reader {
            signal: &samples,
            reference: &samples,
            lag,
        };
        let mut out = Vec::new();
        reader(1).channel(&window(3, true, 0), 0, &mut out);
        let half = std::f32::consts::FRAC_1_SQRT_2;
        assert_eq!(out.len(), 3);
        assert!((out[0] - half * (x[4] + x[3])).abs() < 1e-6);
        reader(1).channel(&window(3, false, 0), 0, &mut out);
        assert!((out[2] - half * (x[6] - x[5])).abs() < 1e-6);
    }
}
