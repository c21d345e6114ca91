//! Percentile bootstrap (Efron & Tibshirani 1993, ch. 13), seeded.
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

/// A generator for one purpose: the same seed gives independent streams to different purposes, in any order of work.
pub fn generator(seed: u64, stream: u64) -> ChaCha8Rng {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    rng.set_stream(stream);
    rng
}

/// A whole number below `n`, by the multiply-shift of Lemire (2019); its bias, n/2^64, is out of reach of any test here.
pub fn below(rng: &mut impl Rng, n: usize) -> usize {
    ((u128::from(rng.next_u64()) * n as u128) >> 64) as usize
}

/// The q-th quantile of sorted values, linear between neighbours (NumPy's default; Hyndman & Fan 1996, type 7).
pub fn quantile(sorted: &[f64], q: f64) -> f64 {
    let Some(last) = sorted.len().checked_sub(1) else {
        return f64::NAN;
    };
    let at = q * last as f64;
    let low = at.floor() as usize;
    let high = (low + 1).min(last);
    sorted[low] + (at - low as f64) * (sorted[high] - sorted[low])
}

/// 95 % interval of the mean of `values` (paired), or of mean(`values`) − mean(`others`) where `others` is not empty.
pub fn mean_interval(
    values: &[f64],
    others: &[f64],
    samples: usize,
    rng: &mut impl Rng,
) -> Option<[f64; 2]> {
    if samples == 0 || values.is_empty() {
        return None;
    }
    let mut draw = |from: &[f64]| {
        if from.is_empty() {
            0.0
        } else {
            (0..from.len())
                .map(|_| from[below(rng, from.len())])
                .sum::<f64>()
                / from.len() as f64
        }
    };
    let mut means: Vec<f64> = (0..samples).map(|_| draw(values) - draw(others)).collect();
    means.sort_by(f64::total_cmp);
    Some([quantile(&means, 0.025), quantile(&means, 0.975)])
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a panic is the failure of a test")]
    use super::*;

    #[test]
    fn quantiles_are_linear_between_neighbours() {
        // numpy.quantile([1, 2, 4, 8], [0, .025, .5, 1]) = [1, 1.075, 3, 8]
        let sorted = [1.0, 2.0, 4.0, 8.0];
        for (q, x) in [(0.0, 1.0), (0.025, 1.075), (0.5, 3.0), (1.0, 8.0)] {
            assert!((quantile(&sorted, q) - x).abs() < 1e-15);
        }
    }

    #[test]
    fn the_interval_of_a_mean_has_the_width_of_theory() {
        // 400 values of variance 1: the 95 % interval of the mean is about ±1.96/20 wide; 4,000 draws know it to about 3 %.
        let values: Vec<f64> = (0..400)
            .map(|i| if i % 2 == 0 { 1.0 } else { -1.0 })
            .collect();
        let [low, high] = mean_interval(&values, &[], 4000, &mut generator(1, 0)).unwrap();
        assert!(
            (high - low - 2.0 * 1.96 / 20.0).abs() < 0.15 * 0.196,
            "{low} {high}"
        );
    }
}
