//! Resampling repetitions with replacement: how often each is drawn, and percentile intervals.
use nalgebra::DMatrix;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// `samples × repetitions`: how often each repetition is drawn in each bootstrap sample; every row sums to the number of repetitions.
pub(crate) fn counts(repetitions: usize, samples: usize, seed: u64) -> DMatrix<f64> {
    let mut random = ChaCha8Rng::seed_from_u64(seed);
    let mut counts = DMatrix::zeros(samples, repetitions);
    // Drawn as u32, so that 32-bit and 64-bit machines draw alike.
    let end = u32::try_from(repetitions).unwrap_or(u32::MAX);
    for sample in 0..if end == 0 { 0 } else { samples } {
        for _ in 0..repetitions {
            counts[(sample, random.random_range(0..end) as usize)] += 1.0;
        }
    }
    counts
}

/// Means of the columns of `values` (`repetitions × columns`) and their 95 % percentile intervals: mean, low, high.
/// Without samples, or with fewer than two repetitions, the interval is the mean itself.
pub(crate) fn means(values: &DMatrix<f64>, samples: usize, seed: u64) -> [Vec<f64>; 3] {
    let n = values.nrows() as f64;
    let mean: Vec<f64> = values.column_iter().map(|c| c.sum() / n).collect();
    if samples == 0 || values.nrows() < 2 {
        return [mean.clone(), mean.clone(), mean];
    }
    let mut drawn = counts(values.nrows(), samples, seed) * values / n;
    let [low, high] = intervals(&mut drawn);
    [mean, low, high]
}

/// 2.5 % and 97.5 % points of every column; the columns are reordered.
pub(crate) fn intervals(drawn: &mut DMatrix<f64>) -> [Vec<f64>; 2] {
    let rows = drawn.nrows();
    let (mut low, mut high) = (Vec::new(), Vec::new());
    for column in drawn.as_mut_slice().chunks_exact_mut(rows.max(1)) {
        low.push(quantile(column, 0.025));
        high.push(quantile(column, 0.975));
    }
    [low, high]
}

/// A quantile, interpolated linearly between order statistics (definition 7 of Hyndman & Fan 1996); reorders the values.
fn quantile(values: &mut [f64], share: f64) -> f64 {
    let place = share * (values.len() - 1) as f64;
    let below = place as usize;
    let (_, &mut lower, above) = values.select_nth_unstable_by(below, f64::total_cmp);
    let upper = above.iter().copied().fold(f64::INFINITY, f64::min);
    if upper.is_finite() {
        lower + (place - below as f64) * (upper - lower)
    } else {
        lower
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quantiles_interpolate() {
        let mut values = [4.0, 1.0, 3.0, 2.0, 5.0];
        assert_eq!(quantile(&mut values, 0.5), 3.0);
        assert_eq!(quantile(&mut values, 0.125), 1.5);
        assert_eq!(quantile(&mut values, 1.0), 5.0);
    }

    #[test]
    fn every_sample_draws_as_many_as_there_are() {
        let drawn = counts(13, 40, 3);
        for row in drawn.row_iter() {
            assert_eq!(row.sum(), 13.0);
        }
        assert_ne!(drawn.row(0), drawn.row(1));
        assert_eq!(drawn, counts(13, 40, 3));
        assert_ne!(drawn, counts(13, 40, 4));
    }
}
