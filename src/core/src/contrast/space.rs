//! Covariances of windows, and the space whitened by their pooled covariance.
//!
//! # Normalisation
//! C_k = X_k X_kᵀ/(n_k−1) about each window's own mean; pools are weighted by n_k−1. In a [`Space`] the coordinates are
//! z = diag(e)^(−1/2) Vᵀ x, so P becomes the identity; direction u there is the filter w = V diag(e)^(−1/2) u.
//!
//! # Rank
//! Samples are stored as f32, so every channel carries rounding noise of variance about 2^(−48)/12 of its mean square. A dimension
//! is counted when its eigenvalue exceeds ten times that noise and M·ε of the largest eigenvalue.
use super::linalg::{Packed, add_scaled, eigh, gram, packed_len, quadratic, unpack};
use super::read::Reader;
use super::windows::Window;
use nalgebra::DMatrix;

/// Covariances of all windows of a selection.
#[derive(Debug, Clone, Default)]
pub struct Covariances {
    /// M.
    pub channels: usize,
    /// One packed `M × M` matrix a window.
    pub packed: Vec<Packed>,
    /// n_k − 1.
    pub weights: Vec<f64>,
    /// Largest mean square of a channel in a window, its mean included.
    pub largest_mean_square: f64,
    /// What repeats: the samples of each trial about its mean, sample-major (`samples × channels`); empty for other kinds.
    pub courses: Vec<Vec<f64>>,
    /// Where the channels here are dimensions of a basis: the variance of every channel of the recording in every window.
    pub singles: Vec<Vec<f32>>,
}

impl Covariances {
    /// Adds the covariance of the next window; with `courses` a signal window's samples are kept as well.
    pub fn push(&mut self, reader: &Reader<'_>, window: &Window, courses: bool) {
        let (m, n) = (reader.channels(), reader.values(window));
        self.channels = m;
        let stride = m.next_multiple_of(4);
        let mut panel = vec![0.0; stride * n];
        let mut part = Vec::with_capacity(window.count);
        for c in 0..m {
            reader.channel(window, c, &mut part);
            let (mut sum, mut square) = (0.0, 0.0);
            for x in &part {
                let x = f64::from(*x);
                sum += x;
                square += x * x;
            }
            self.largest_mean_square = self.largest_mean_square.max(square / n as f64);
            let mean = sum / n as f64;
            for (t, x) in part.iter().enumerate() {
                panel[t * stride + c] = f64::from(*x) - mean;
            }
        }
        let mut packed = gram(&panel, m, stride);
        let weight = (n - 1) as f64;
        packed.iter_mut().for_each(|x| *x /= weight);
        self.packed.push(packed);
        self.weights.push(weight);
        if courses && window.signal {
            let rows = panel.chunks_exact(stride).flat_map(|row| &row[..m]);
            self.courses.push(rows.copied().collect());
        }
    }

    /// The average channel's ratio of signal to reference variance over all power.
    pub fn total_level(&self, signal: &[bool]) -> f64 {
        let side = |wanted: bool| self.pooled(|k| signal[k] == wanted);
        let (s, r) = (side(true), side(false));
        let ratios = (0..self.channels).map(|i| {
            let at = packed_len(i) + i;
            s[at] / r[at]
        });
        let usable: Vec<f64> = ratios.filter(|x| x.is_finite() && *x > 0.0).collect();
        let mean = usable.iter().sum::<f64>() / usable.len().max(1) as f64;
        if mean > 0.0 { mean } else { 1.0 }
    }

    /// The average channel's ratio in a typical pair of windows: exp of the mean over channels and pairs of the log ratio. A few
    /// windows of great power, which would decide the ratio over all power, count as every other here.
    pub fn typical_level(&self, signal: &[bool]) -> f64 {
        let (mut sum, mut count) = (0.0, 0usize);
        for (packed, side) in self.packed.iter().zip(signal) {
            let sign = if *side { 1.0 } else { -1.0 };
            for i in 0..self.channels {
                let variance = packed[packed_len(i) + i];
                if variance > 0.0 {
                    sum += sign * variance.ln();
                }
            }
            count += usize::from(*side);
        }
        (sum / (count * self.channels).max(1) as f64).exp()
    }

    /// Divides the signal covariances by `ratio`.
    pub fn scale_signal(&mut self, signal: &[bool], ratio: f64) {
        for (packed, _) in self.packed.iter_mut().zip(signal).filter(|(_, s)| **s) {
            packed.iter_mut().for_each(|x| *x /= ratio);
        }
    }

    /// Windows whose whole variance is below 1e-8 of the median window's: an amplifier that was blanked, a lead that was off.
    pub fn flat(&self) -> Vec<bool> {
        let trace = |packed: &Packed| -> f64 {
            (0..self.channels).map(|i| packed[packed_len(i) + i]).sum()
        };
        let traces: Vec<f64> = self.packed.iter().map(trace).collect();
        let mut sorted = traces.clone();
        sorted.sort_by(f64::total_cmp);
        let median = sorted.get(sorted.len() / 2).copied().unwrap_or(0.0);
        traces.iter().map(|t| *t <= 1e-8 * median).collect()
    }

    /// Drops the windows that `kept` does not name.
    pub fn keep_only(&mut self, kept: &[bool]) {
        let mut at = kept.iter();
        self.packed.retain(|_| at.next().copied().unwrap_or(true));
        // A trial's two windows hold the same samples, so they are kept or dropped together.
        let mut at = kept.iter().step_by(2);
        self.courses.retain(|_| at.next().copied().unwrap_or(true));
        let mut at = kept.iter();
        self.singles.retain(|_| at.next().copied().unwrap_or(true));
        let mut at = kept.iter();
        self.weights.retain(|_| at.next().copied().unwrap_or(true));
    }

    /// Single channels that [`Self::channel_variances`] knows.
    pub fn candidates(&self) -> usize {
        self.singles.first().map_or(self.channels, Vec::len)
    }

    /// As [`Space::variances`] for a channel.
    pub fn channel_variances(
        &self,
        i: usize,
        signal: &[bool],
        of: impl Fn(usize) -> bool,
    ) -> Vec<f64> {
        if !self.singles.is_empty() {
            let one = |(k, single): (usize, &Vec<f32>)| match of(k) {
                true => f64::from(single[i]),
                false => f64::NAN,
            };
            return self.singles.iter().enumerate().map(one).collect();
        }
        let m = self.channels;
        let pick = |course: &Vec<f64>| course.iter().skip(i).step_by(m).copied().collect();
        one_by_one(&self.packed, &self.courses, i, pick, signal, of)
    }

    /// As [`Space::variances`] for the mean of all channels.
    pub fn mean_variances(&self, signal: &[bool], of: impl Fn(usize) -> bool) -> Vec<f64> {
        let m = self.channels;
        let equal = vec![1.0 / m as f64; m];
        let plain = |k: usize| quadratic(&self.packed[k], &equal);
        if self.courses.is_empty() {
            let one = |k: usize| if of(k) { plain(k) } else { f64::NAN };
            return (0..self.packed.len()).map(one).collect();
        }
        let mean = |course: &Vec<f64>| {
            let rows = course.chunks_exact(m);
            rows.map(|row| row.iter().sum::<f64>() / m as f64).collect()
        };
        repeats(&self.courses, mean, signal, of, |t| plain(2 * t))
    }

    /// Weighted mean over the windows that `include` names.
    pub fn pooled(&self, include: impl Fn(usize) -> bool) -> Packed {
        pooled(
            &self.packed,
            &self.weights,
            packed_len(self.channels),
            include,
        )
    }
}

/// Σ weight·C / Σ weight over the windows that `include` names, first `len` entries.
pub fn pooled(
    packed: &[Packed],
    weights: &[f64],
    len: usize,
    include: impl Fn(usize) -> bool,
) -> Packed {
    let mut sum = vec![0.0; len];
    let mut weight = 0.0;
    for k in (0..packed.len()).filter(|k| include(*k)) {
        add_scaled(&mut sum, &packed[k], weights[k]);
        weight += weights[k];
    }
    if weight > 0.0 {
        sum.iter_mut().for_each(|x| *x /= weight);
    }
    sum
}

/// The space whitened by a pooled covariance, and every window's covariance in it.
#[derive(Debug, Clone)]
pub struct Space {
    /// P, packed, in channel space.
    pub pooled: Packed,
    /// All eigenvalues of P, descending.
    pub eigenvalues: Vec<f64>,
    /// Dimensions above rounding noise.
    pub rank: usize,
    /// `dimensions × M`: diag(e)^(−1/2) Vᵀ.
    pub whitening: DMatrix<f64>,
    /// Whitened covariances of the windows done so far, packed.
    pub covariances: Vec<Packed>,
    /// What repeats: whitened samples of each trial (`samples × dimensions`, row by row); empty for other kinds.
    pub courses: Vec<Vec<f64>>,
}

impl Space {
    /// The space of the windows that `include` names, of at most `limit` dimensions; covariances come by [`Self::push_next`].
    pub fn new(all: &Covariances, limit: usize, include: impl Fn(usize) -> bool) -> Self {
        let m = all.channels;
        let pooled = all.pooled(include);
        let (eigenvalues, vectors) = eigh(&unpack(&pooled, m));
        let largest = eigenvalues.first().copied().unwrap_or(0.0).max(0.0);
        let storage_noise = all.largest_mean_square * 2f64.powi(-48) / 12.0;
        let floor = (10.0 * storage_noise).max(largest * m as f64 * f64::EPSILON);
        let rank = eigenvalues.iter().take_while(|e| **e > floor).count();
        let dimensions = rank.min(limit);
        let whitening = DMatrix::from_fn(dimensions, m, |i, c| {
            vectors[(c, i)] / eigenvalues[i].sqrt()
        });
        Space {
            pooled,
            eigenvalues,
            rank,
            whitening,
            covariances: Vec::new(),
            courses: Vec::new(),
        }
    }

    /// Dimensions of the whitened covariances.
    pub fn dimensions(&self) -> usize {
        self.whitening.nrows()
    }

    /// Whitens the covariance of the next window; false when all are done.
    pub fn push_next(&mut self, all: &Covariances) -> bool {
        let k = self.covariances.len();
        let Some(packed) = all.packed.get(k) else {
            return false;
        };
        let half = &self.whitening * unpack(packed, all.channels);
        let full = &half * self.whitening.transpose();
        let n = self.dimensions();
        let mut out = Vec::with_capacity(packed_len(n));
        for i in 0..n {
            for j in 0..=i {
                out.push(0.5 * (full[(i, j)] + full[(j, i)]));
            }
        }
        self.covariances.push(out);
        // The signal window of a trial comes first of its two.
        if let Some(course) = all.courses.get(k / 2).filter(|_| k.is_multiple_of(2)) {
            self.courses.push(self.whiten(course));
        }
        true
    }

    /// As [`Self::variances`] for principal component `i`, scaled to a pooled variance of 1.
    pub fn component_variances(
        &self,
        i: usize,
        signal: &[bool],
        of: impl Fn(usize) -> bool,
    ) -> Vec<f64> {
        let n = self.dimensions();
        let pick = |course: &Vec<f64>| course.iter().skip(i).step_by(n).copied().collect();
        one_by_one(&self.covariances, &self.courses, i, pick, signal, of)
    }

    fn whiten(&self, course: &[f64]) -> Vec<f64> {
        let (n, m) = (self.dimensions(), self.whitening.ncols());
        let samples = DMatrix::from_column_slice(m, course.len() / m, course);
        let out = &self.whitening * samples;
        debug_assert_eq!(out.nrows(), n);
        out.as_slice().to_vec()
    }

    /// Variance of each window under direction `u`, NaN for windows that `of` does not name.
    ///
    /// What repeats has no variance of its own in a trial: there the signal window of trial k holds the covariance of y_k = uᵀZ_k
    /// with the sum over the trials named (signed by their label), so that the mean over them is their number times the variance
    /// of their average.
    pub fn variances(&self, u: &[f64], signal: &[bool], of: impl Fn(usize) -> bool) -> Vec<f64> {
        let plain = |k: usize| quadratic(&self.covariances[k], u);
        if self.courses.is_empty() {
            let one = |k: usize| if of(k) { plain(k) } else { f64::NAN };
            return (0..self.covariances.len()).map(one).collect();
        }
        let n = self.dimensions();
        let project = |course: &Vec<f64>| -> Vec<f64> {
            let rows = course.chunks_exact(n);
            rows.map(|row| row.iter().zip(u).map(|(x, u)| x * u).sum())
                .collect()
        };
        repeats(&self.courses, project, signal, of, |t| plain(2 * t))
    }

    /// w = V diag(e)^(−1/2) u in channel space, for u of the leading dimensions.
    pub fn filter(&self, u: &[f64]) -> Vec<f64> {
        (0..self.whitening.ncols())
            .map(|c| {
                u.iter()
                    .enumerate()
                    .map(|(i, x)| x * self.whitening[(i, c)])
                    .sum()
            })
            .collect()
    }
}

/// Variances of one coordinate: diagonal entries, or, where trials repeat, their courses.
fn one_by_one(
    packed: &[Packed],
    courses: &[Vec<f64>],
    i: usize,
    pick: impl Fn(&Vec<f64>) -> Vec<f64>,
    signal: &[bool],
    of: impl Fn(usize) -> bool,
) -> Vec<f64> {
    let plain = |k: usize| packed[k][packed_len(i) + i];
    if courses.is_empty() {
        let one = |k: usize| if of(k) { plain(k) } else { f64::NAN };
        return (0..packed.len()).map(one).collect();
    }
    repeats(courses, pick, signal, of, |t| plain(2 * t))
}

/// Both windows of each trial as [`Space::variances`] has them, from any projection of the trials' samples.
pub fn repeats(
    courses: &[Vec<f64>],
    project: impl Fn(&Vec<f64>) -> Vec<f64>,
    signal: &[bool],
    of: impl Fn(usize) -> bool,
    plain: impl Fn(usize) -> f64,
) -> Vec<f64> {
    let mut out = vec![f64::NAN; 2 * courses.len()];
    let trials: Vec<(usize, Vec<f64>)> = courses
        .iter()
        .enumerate()
        .filter(|(t, _)| of(2 * t))
        .map(|(t, course)| {
            let mut y = project(course);
            if !signal[2 * t] {
                y.iter_mut().for_each(|x| *x = -*x);
            }
            (t, y)
        })
        .collect();
    let length = trials.first().map_or(0, |(_, y)| y.len());
    let mut sum = vec![0.0; length];
    for (_, y) in &trials {
        add_scaled(&mut sum, y, 1.0);
    }
    for (t, y) in &trials {
        let shared: f64 = y.iter().zip(&sum).map(|(a, b)| a * b).sum();
        // A flipped trial has its labels exchanged: its signal window stands second.
        let (own, other) = if signal[2 * t] {
            (2 * t, 2 * t + 1)
        } else {
            (2 * t + 1, 2 * t)
        };
        out[own] = shared / (length as f64 - 1.0);
        out[other] = plain(*t);
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_pooled_covariance_becomes_the_identity_and_a_copied_channel_costs_one_rank() {
        let mut state = 5u64;
        let mut next = || {
            state = state
                .wrapping_mul(6364136223846793005)
                .wrapping_add(1442695040888963407);
            ((state >> 11) as f64 * 2f64.powi(-53) - 0.5) as f32
        };
        let mut samples: Vec<Vec<f32>> = (0..5)
            .map(|_| (0..400).map(|_| 100.0 + next()).collect())
            .collect();
        samples.push(samples[0].clone());
        let mut all = Covariances::default();
        for k in 0..8 {
            let reader = Reader {
                signal: &samples,
                reference: &samples,
                lag: 0,
            };
            let window = Window {
                first: 50 * k,
                count: 50,
                signal: k % 2 == 0,
                trial: k / 2,
                onset_s: 0.0,
            };
            all.push(&reader, &window, false);
        }
        let mut space = Space::new(&all, 150, |_| true);
        assert_eq!(space.rank, 5);
        while space.push_next(&all) {}
        let p = pooled(&space.covariances, &all.weights, packed_len(5), |_| true);
        let identity = unpack(&p, 5);
        assert!((identity - DMatrix::<f64>::identity(5, 5)).amax() < 1e-10);
    }
}
