//! What is read of the recording for a window: its samples, or what a kind of contrast makes of them.
//!
//! * windows, spans: the prepared samples on both sides;
//! * band: the band-passed samples for signal, those of the flanks (or all) for reference;
//! * slow: (x(t + lag) + x(t))/√2 for signal, (x(t + lag) − x(t))/√2 for reference: with C₀ the mean covariance of both ends and C_τ
//!   the symmetrised lagged one, S = C₀ + C_τ and R = C₀ − C_τ. Both are positive semidefinite, S w = λ R w has the directions of
//!   C_τ w = r C₀ w (Molgedey & Schuster 1994, *Phys. Rev. Lett.* 72:3634–3637), and λ = (1 + r)/(1 − r).
//!
//! # Surrogates
//! Every channel's samples are taken from elsewhere along the row of segments, by an offset of its own that both sides share. Its
//! own spectrum, and its own ratio, stay; what it shares with other channels goes.
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

/// The segments of a contrast in a row, so that a channel can be moved along it.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Row {
    /// First sample, samples, and samples before it in the row, of each segment.
    segments: Vec<(usize, usize, usize)>,
    total: usize,
}

impl Row {
    /// The segments of the signal windows, in their order.
    pub fn of(windows: &[Window]) -> Self {
        let mut row = Row::default();
        for w in windows.iter().filter(|w| w.signal) {
            row.segments.push((w.first, w.count, row.total));
            row.total += w.count;
        }
        row
    }

    /// Samples in the row.
    pub fn samples(&self) -> usize {
        self.total
    }

    /// Segments in the row.
    pub fn segments(&self) -> usize {
        self.segments.len()
    }

    /// The row's samples from segment `segment`, moved on by `by`, as many as the segment holds.
    fn moved(&self, channel: &[f32], segment: usize, by: usize, out: &mut Vec<f32>) {
        let (_, count, before) = self.segments[segment];
        let mut at = (before + by) % self.total;
        let mut k = self.segments.partition_point(|s| s.2 <= at) - 1;
        while out.len() < count {
            let (first, length, start) = self.segments[k];
            let from = at - start;
            let take = (length - from).min(count - out.len());
            out.extend_from_slice(&channel[first + from..first + from + take]);
            k = (k + 1) % self.segments.len();
            at = self.segments[k].2;
        }
    }
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

    /// One channel of a window; with `moved` = (row, offset) from elsewhere along the row.
    pub fn channel(
        &self,
        window: &Window,
        c: usize,
        moved: Option<(&Row, usize)>,
        out: &mut Vec<f32>,
    ) {
        let side = if window.signal {
            self.signal
        } else {
            self.reference
        };
        out.clear();
        match moved {
            None => out.extend_from_slice(&side[c][window.first..window.first + window.count]),
            Some((row, by)) => row.moved(&side[c], window.trial, by, out),
        }
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
    fn sums_and_differences_share_the_power_and_a_moved_channel_keeps_all_its_samples() {
        let x: Vec<f32> = (0..20).map(|i| (i * i % 7) as f32).collect();
        let samples = vec![x.clone()];
        let reader = |lag| Reader {
            signal: &samples,
            reference: &samples,
            lag,
        };
        let mut out = Vec::new();
        reader(1).channel(&window(3, true, 0), 0, None, &mut out);
        let half = std::f32::consts::FRAC_1_SQRT_2;
        assert_eq!(out.len(), 3);
        assert!((out[0] - half * (x[4] + x[3])).abs() < 1e-6);
        reader(1).channel(&window(3, false, 0), 0, None, &mut out);
        assert!((out[2] - half * (x[6] - x[5])).abs() < 1e-6);
        let windows = [window(2, true, 0), window(10, true, 1), window(14, true, 2)];
        let row = Row::of(&windows);
        let mut all = Vec::new();
        for w in &windows {
            reader(0).channel(w, 0, Some((&row, 5)), &mut out);
            all.extend_from_slice(&out);
        }
        let laid: Vec<f32> = [2..6, 10..14, 14..18]
            .into_iter()
            .flat_map(|r| x[r].to_vec())
            .collect();
        let expected: Vec<f32> = (0..12).map(|i| laid[(i + 5) % 12]).collect();
        assert_eq!(all, expected);
    }
}
