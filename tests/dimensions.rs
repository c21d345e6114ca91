//! Rules for the number of dimensions: published values and Monte Carlo of `reference/rank.json` (NumPy, SciPy), a fact of the trade.
//!
//! Gavish & Donoho 2014: λ(1) = 4/√3, ω(1) = 2.858. Closed forms to 1e-10, medians of the Marchenko–Pastur law to 1e-8.
use nalgebra::DMatrix;
use teasel_core::contrast::linalg::eigenvalues;
use teasel_core::contrast::read::Reader;
use teasel_core::contrast::space::{Covariances, Space};
use teasel_core::contrast::windows::Window;
use teasel_core::evidence::dimensions::{
    Counting, hard_threshold_known, hard_threshold_unknown, marchenko_pastur_edges,
    marchenko_pastur_median, noise_rules, outstanding,
};
use teasel_tests::{Lcg, close, number, numbers, reference};

fn matrix(random: &mut Lcg, rows: usize, columns: usize) -> DMatrix<f64> {
    let values: Vec<f64> = (0..rows * columns).map(|_| random.normal12()).collect();
    DMatrix::from_row_slice(rows, columns, &values)
}

/// Channels × samples as f32.
fn channels(x: &DMatrix<f64>) -> Vec<Vec<f32>> {
    x.column_iter()
        .map(|c| c.iter().map(|v| *v as f32).collect())
        .collect()
}

fn windows(count: usize, samples: usize) -> Vec<Window> {
    (0..count)
        .map(|k| Window {
            first: k * samples,
            count: samples,
            signal: k % 2 == 0,
            trial: k / 2,
            onset_s: 0.0,
        })
        .collect()
}

fn counted(
    samples: &[Vec<f32>],
    windows: &[Window],
    values: &[f64],
) -> teasel_core::sheet::DimensionsCard {
    let mut counting = Counting::new(samples, windows, 1);
    while counting.step(samples) {}
    counting.card(values)
}

#[test]
fn edges_medians_and_thresholds_are_the_published_ones() {
    let values = reference("rank");
    for case in values["marchenko_pastur"].as_array().unwrap() {
        let gamma = number(&case["gamma_p_over_n"]);
        if gamma > 1.0 || number(&case["sigma2"]) != 1.0 {
            continue;
        }
        let (low, high) = marchenko_pastur_edges(gamma);
        close("lower edge", low, number(&case["lower_edge"]), 1e-10);
        close("upper edge", high, number(&case["upper_edge"]), 1e-10);
    }
    for case in values["gavish_donoho"].as_array().unwrap() {
        let beta = number(&case["beta_m_over_n"]);
        let known = number(&case["lambda_known_noise"]);
        close("λ", hard_threshold_known(beta), known, 1e-10);
        close(
            "median",
            marchenko_pastur_median(beta),
            number(&case["mp_median"]),
            1e-8,
        );
        close(
            "ω",
            hard_threshold_unknown(beta),
            number(&case["omega_unknown_noise"]),
            1e-7,
        );
    }
    close("λ(1)", hard_threshold_known(1.0), 4.0 / 3f64.sqrt(), 1e-12);
    close("ω(1) as printed", hard_threshold_unknown(1.0), 2.858, 5e-4);
}

#[test]
fn three_of_a_hundred_dimensions_stand_out_of_noise() {
    let values = reference("rank");
    let example = &values["gavish_donoho_example"];
    let mut random = Lcg(42);
    let (u, v) = (
        matrix(&mut random, 100, 3) / 10.0,
        matrix(&mut random, 100, 3) / 10.0,
    );
    let noise = matrix(&mut random, 100, 100);
    let sizes = DMatrix::from_diagonal(&nalgebra::DVector::from_row_slice(&[60.0, 42.0, 30.0]));
    let y = u * sizes * v.transpose() + noise;
    // Eigenvalues of YᵀY/n, n one more than the columns so that γ stays below 1; the threshold moves by half a per cent.
    let found = eigenvalues(&(y.transpose() * &y / 101.0));
    let [_, edge, threshold] = noise_rules(&found, 101.0).unwrap();
    let singular = (threshold * 101.0).sqrt();
    close(
        "threshold",
        singular,
        number(&example["threshold_unknown_noise"]),
        0.2,
    );
    assert_eq!(found.iter().filter(|e| **e > threshold).count(), 3);
    assert!(found.iter().filter(|e| **e > edge).count() >= 3);
    assert!(
        noise_rules(&found, 99.0).is_none(),
        "fewer samples than dimensions"
    );
}

#[test]
fn parallel_analysis_keeps_the_three_factors_of_the_example() {
    let values = reference("rank");
    let example = &values["parallel_analysis_example"];
    let mut random = Lcg(41);
    let (f, l, e) = (
        matrix(&mut random, 200, 3),
        matrix(&mut random, 3, 20),
        matrix(&mut random, 200, 20),
    );
    let sizes = DMatrix::from_diagonal(&nalgebra::DVector::from_row_slice(&[1.0, 0.8, 0.6]));
    let x = f * sizes * l + e * 1.5;
    let card = counted(&channels(&x), &windows(1, 200), &[]);
    // f32 samples: 2⁻²³ of eigenvalues that sum to 20.
    for (found, expected) in card
        .correlation
        .iter()
        .zip(numbers(&example["eigenvalues"]))
    {
        close("eigenvalue", *found, expected, 5e-6);
    }
    assert_eq!(outstanding(&card.correlation, &card.surrogate_95), 3);
    assert_eq!(card.surrogates, 100);
}

#[test]
fn surrogates_of_noise_have_the_eigenvalues_of_noise() {
    let values = reference("rank");
    let null = values["parallel_analysis_null"]
        .as_array()
        .unwrap()
        .iter()
        .find(|n| n["n"] == 100 && n["p"] == 10)
        .unwrap();
    let x = matrix(&mut Lcg(5), 100, 10);
    let card = counted(&channels(&x), &windows(1, 100), &[]);
    let expected = numbers(&null["percentile95"]);
    // 100 surrogates of one recording: the 95th percentile has a standard error near 0.03; four of them.
    close(
        "largest, 95th percentile",
        card.surrogate_95[0],
        expected[0],
        0.12,
    );
    // White noise is worth its samples; the sum over 99 lags of products of 45 pairs has a standard error near 10 %.
    assert!(
        (card.effective_samples / 100.0 - 1.0).abs() < 0.3,
        "{}",
        card.effective_samples
    );
}

#[test]
fn an_autocorrelated_series_is_worth_fewer_samples() {
    // x(t) = a x(t−1) + e: ρ(k) = a^|k|, so Σρ² = (1+a²)/(1−a²), here 9.5 (Bartlett 1935).
    let a = 0.9_f64;
    let mut random = Lcg(12);
    let samples: Vec<Vec<f32>> = (0..8)
        .map(|_| {
            let mut x = 0.0;
            (0..40_000)
                .map(|_| {
                    x = a * x + random.normal12();
                    x as f32
                })
                .collect()
        })
        .collect();
    let card = counted(&samples, &windows(80, 500), &[]);
    let worth = card.samples as f64 / card.effective_samples;
    close("Σρ²", worth, (1.0 + a * a) / (1.0 - a * a), 0.8);
    // The surrogates say the same: off-diagonal correlations of variance 1/n spread the eigenvalues over 2√(p/n) either side of 1.
    let spread = 2.0 * (8.0 / card.effective_samples).sqrt();
    assert!(card.surrogate_95[0] - 1.0 < 1.5 * spread && card.surrogate_95[0] - 1.0 > 0.5 * spread);
}

#[test]
fn white_noise_makes_the_rank_full_and_hardly_changes_what_stands_out() {
    // A fact of the trade: 4 sources in 16 channels.
    let mut random = Lcg(21);
    let mixing = matrix(&mut random, 4, 16);
    let sources = matrix(&mut random, 4000, 4);
    let clean = sources * mixing;
    let noisy = &clean + matrix(&mut random, 4000, 16) * 0.3;
    let windows = windows(20, 200);
    let of = |x: &DMatrix<f64>| {
        let samples = channels(x);
        let mut all = Covariances::default();
        let reader = Reader {
            signal: &samples,
            reference: &samples,
            lag: 0,
        };
        windows.iter().for_each(|w| all.push(&reader, w, false));
        let space = Space::new(&all, 150, |_| true);
        let card = counted(&samples, &windows, &space.eigenvalues[..space.rank]);
        let stands_out = outstanding(&card.correlation, &card.surrogate_95);
        let above = card
            .noise_edge
            .map(|edge| space.eigenvalues.iter().filter(|e| **e > edge).count());
        (space.rank, stands_out, above)
    };
    assert_eq!(of(&clean).0, 4);
    assert_eq!(of(&clean).1, 4);
    let (rank, stands_out, above) = of(&noisy);
    assert_eq!(rank, 16);
    assert_eq!(stands_out, 4);
    assert_eq!(above, Some(4));
}
