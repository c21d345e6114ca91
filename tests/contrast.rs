//! The contrast and its evidence against values made by general libraries.
//!
//! | check | source |
//! |---|---|
//! | generalised eigenproblem | 60-digit arithmetic and `scipy.linalg.eigh` (`reference/gev.json`) |
//! | Fisher's iris | Fisher 1936; R and scikit-learn agree (`reference/iris.json`) |
//! | Ledoit–Wolf, OAS | scikit-learn (`reference/shrinkage.json`) |
//! | (b+1)/(m+1) | Phipson & Smyth 2010 (`reference/permutation.json`) |
//! | patterns | Haufe et al. 2014 (`reference/pattern.json`) |
//! | the whole contrast | NumPy, `scipy.linalg.eigh`, `scipy.linalg.logm` on a file written and read by pyEDFlib (`reference/pipeline.json`) |
use nalgebra::DMatrix;
use serde_json::Value;
use teasel_core::analysis::Analysis;
use teasel_core::contrast::fit::{ledoit_wolf_of, oas_of};
use teasel_core::contrast::linalg::{abs_cosine, eigh, generalised_eigh};
use teasel_core::demo::{WATCH_SEED, night_watch};
use teasel_core::evidence::permute::p_value;
use teasel_core::recipe::{
    Contrast, ContrastKind, EventWindow, Evidence, Keep, Measure, Recipe, Shrink,
};
use teasel_core::recording::{MemorySource, OpenOptions, Recording, open};
use teasel_core::sheet::{ComparatorKind, Component, Sheet};
use teasel_tests::calibration::{Noise, binomial_99, null_recipe, null_recording, rejections};
use teasel_tests::{Lcg, close, close_all, largest, number, numbers, reference, rows};

fn matrix(value: &Value) -> DMatrix<f64> {
    let rows = rows(value);
    DMatrix::from_fn(rows.len(), rows[0].len(), |i, j| rows[i][j])
}

#[test]
fn the_generalised_eigenproblem_equals_that_of_60_digits() {
    for case in reference("gev")["cases"].as_array().unwrap() {
        let name = case["name"].as_str().unwrap();
        // README of the reference values: 1e-11 (p4, p8), 1e-9 (p32), 1e-4 for the matrix of condition 1e10.
        let tolerance = match name {
            "p32" => 1e-9,
            "p8_illcond" => 1e-4,
            _ => 1e-11,
        };
        let (s, r) = (matrix(&case["S"]), matrix(&case["R"]));
        let (values, vectors) = generalised_eigh(&s, &r).unwrap();
        let expected = numbers(&case["eigenvalues_desc"]);
        for (i, (a, b)) in values.iter().zip(&expected).enumerate() {
            close(&format!("{name}, eigenvalue {i}"), *a / b, 1.0, tolerance);
        }
        if name == "p8_illcond" {
            continue;
        }
        let columns = matrix(&case["eigenvectors_columns"]);
        for j in 0..values.len() {
            let (a, b) = (vectors.column(j), columns.column(j));
            let sign = a.dot(&b).signum();
            let apart = (a * sign - b).amax() / b.amax();
            assert!(apart < 1e-9, "{name}, eigenvector {j}: {apart:e} apart");
        }
    }
}

#[test]
fn fishers_iris() {
    let iris = reference("iris");
    let table = &iris["fisher_1936_table"];
    let (values, _) = generalised_eigh(
        &matrix(&table["between_sscp_B"]),
        &matrix(&table["within_sscp_W"]),
    )
    .unwrap();
    let expected = numbers(&table["eigenvalues_WinvB"]);
    for i in 0..2 {
        close("eigenvalue of W⁻¹B", values[i] / expected[i], 1.0, 1e-10);
        close(
            "the published four decimals",
            values[i],
            numbers(&iris["published"]["eigenvalues"])[i],
            5e-5,
        );
    }
}

/// The samples of a case, made anew from its seed (large cases do not store them).
fn shrinkage_samples(case: &Value) -> Vec<Vec<f64>> {
    let (n, p) = (number(&case["n"]) as usize, number(&case["p"]) as usize);
    let mut lcg = Lcg(number(&case["seed"]) as u64);
    let mut samples: Vec<Vec<f64>> = (0..n)
        .map(|_| (0..p).map(|j| lcg.normal12() * (1.0 + j as f64)).collect())
        .collect();
    for row in &mut samples {
        let common = lcg.normal12();
        row.iter_mut().for_each(|x| *x += 0.5 * common + 3.0);
    }
    samples
}

#[test]
fn shrinkage_equals_scikit_learns() {
    for case in reference("shrinkage")["cases"].as_array().unwrap() {
        let samples = shrinkage_samples(case);
        let (n, p) = (samples.len() as f64, samples[0].len());
        for (key, centred) in [("mean_removed", true), ("assume_centered", false)] {
            let means: Vec<f64> = (0..p)
                .map(|j| {
                    if centred {
                        samples.iter().map(|r| r[j]).sum::<f64>() / n
                    } else {
                        0.0
                    }
                })
                .collect();
            let centred = DMatrix::from_fn(samples.len(), p, |i, j| samples[i][j] - means[j]);
            let fourth: f64 = centred.row_iter().map(|r| r.norm_squared().powi(2)).sum();
            let covariance = centred.transpose() * &centred / n;
            close(
                key,
                ledoit_wolf_of(&covariance, fourth, n),
                number(&case[key]["ledoit_wolf_shrinkage"]),
                1e-10,
            );
            close(
                key,
                oas_of(&covariance, n),
                number(&case[key]["oas_shrinkage_sklearn"]),
                1e-10,
            );
        }
    }
}

#[test]
fn p_values_by_phipson_and_smyth() {
    let permutation = reference("permutation");
    for case in permutation["plus_one"].as_array().unwrap() {
        let (b, m) = (number(&case["b"]) as usize, number(&case["m"]) as usize);
        let null: Vec<f64> = (0..m).map(|i| if i < b { 2.0 } else { 1.0 }).collect();
        close(
            "(b+1)/(m+1)",
            p_value(2.0, &null, false, true),
            number(&case["p"]),
            1e-12,
        );
    }
}

#[test]
fn the_chain_of_mean_covariances_and_compression() {
    let chain = reference("chain");
    let (s, r) = (matrix(&chain["S"]), matrix(&chain["R"]));
    let pooled = (&s + &r) * 0.5;
    let (eigenvalues, v) = eigh(&pooled);
    let expected = numbers(&chain["pooled_pca_eigenvalues"]);
    close_all(
        "eigenvalues of the pooled covariance",
        &eigenvalues[..expected.len()],
        &expected,
        1e-9 * expected[0],
    );
    for result in chain["results"].as_array().unwrap() {
        let (c, gamma) = (
            number(&result["pca_components"]) as usize,
            number(&result["shrinkage"]),
        );
        let basis = v.columns(0, c);
        let small = |a: &DMatrix<f64>| basis.transpose() * a * basis;
        let reduced = small(&r);
        let shrunk = &reduced * (1.0 - gamma)
            + DMatrix::<f64>::identity(c, c) * (gamma * reduced.trace() / c as f64);
        let (values, w) = generalised_eigh(&small(&s), &shrunk).unwrap();
        let expected = numbers(&result["eigenvalues_desc"]);
        close_all(
            "eigenvalues of the chain",
            &values,
            &expected,
            1e-9 * expected[0],
        );
        let filters = matrix(&result["filters_W_columns"]);
        let patterns = matrix(&result["patterns_pooled_C_w"]);
        let own = basis * w;
        for j in 0..c {
            let sign = own.column(j).dot(&filters.column(j)).signum();
            assert!(
                (own.column(j) * sign - filters.column(j)).amax() < 1e-8 * filters.column(j).amax(),
                "filter {j}"
            );
            let pattern = &pooled * own.column(j) * sign;
            assert!(
                (pattern - patterns.column(j)).amax() < 1e-8 * patterns.column(j).amax(),
                "pattern {j}"
            );
        }
    }
}

fn pipeline_recording() -> Recording {
    let path = format!("{}/reference/pipeline.edf", env!("CARGO_MANIFEST_DIR"));
    let source = MemorySource::new("pipeline.edf", std::fs::read(path).unwrap());
    open(Box::new(source), Vec::new(), OpenOptions::default()).unwrap()
}

fn pipeline_recipe(measure: Measure, permutations: usize) -> Recipe {
    let window = |from_s, to_s| EventWindow::new("bell", from_s, to_s);
    Recipe {
        keep: Keep::Number(7),
        measure,
        shrink: Shrink::Number(if measure == Measure::Typical {
            0.1
        } else {
            0.0
        }),
        components: 3,
        evidence: Evidence {
            folds: 5,
            permutations,
            bootstrap: 200,
            seed: 1,
        },
        ..Recipe::asking(Contrast::Windows {
            signal: window(0.1, 0.8),
            reference: window(-0.9, -0.2),
        })
    }
}

fn sheet(recording: Recording, recipe: Recipe) -> Sheet {
    let mut analysis = Analysis::new(recording, recipe).unwrap();
    analysis.run(|_| ()).unwrap();
    analysis.sheet().clone()
}

/// Ratios to 1e-6 relative, filters and patterns to 1e-5 of their largest entry, signs included.
fn compare_component(what: &str, ours: &Component, expected: &Value) {
    for (key, own) in [
        ("typical_fitted", ours.typical.fitted),
        ("total_fitted", ours.total.fitted),
        ("typical_held_out", ours.typical.held_out.unwrap()),
        ("total_held_out", ours.total.held_out.unwrap()),
    ] {
        close(
            &format!("{what}, {key}"),
            own / number(&expected[key]),
            1.0,
            1e-6,
        );
    }
    for (key, own) in [("filter", &ours.filter), ("pattern", &ours.pattern)] {
        let expected = numbers(&expected[key]);
        close_all(
            &format!("{what}, {key}"),
            own,
            &expected,
            1e-5 * largest(&expected),
        );
    }
    close_all(
        &format!("{what}, filter_raw"),
        &ours.filter_raw,
        &ours.filter,
        0.0,
    );
    let folds = numbers(&expected["total_folds"]);
    close_all(
        &format!("{what}, folds"),
        &ours.total.folds,
        &folds,
        1e-6 * largest(&folds),
    );
    let trials: Vec<f64> = ours.trials.iter().map(|t| t.log_ratio).collect();
    close_all(
        &format!("{what}, trials"),
        &trials,
        &numbers(&expected["trial_log_ratios"]),
        1e-5,
    );
}

#[test]
fn the_whole_contrast_equals_scipys_on_a_file_written_by_pyedflib() {
    let expected = reference("pipeline");
    for (measure, key) in [(Measure::Typical, "typical"), (Measure::Total, "total")] {
        let sheet = sheet(pipeline_recording(), pipeline_recipe(measure, 200));
        let expected = &expected[key];
        let compression = sheet.compression.as_ref().unwrap();
        let eigenvalues = numbers(&expected["eigenvalues"]);
        close_all(
            "eigenvalues of P",
            &compression.eigenvalues,
            &eigenvalues,
            1e-6 * eigenvalues[0],
        );
        // Only directions on their own side of 1 are reported; the reference lists three at each end.
        assert!(
            sheet.stronger.len() >= 2 && sheet.weaker.len() >= 2,
            "{key}"
        );
        for (end, ours) in [("stronger", &sheet.stronger), ("weaker", &sheet.weaker)] {
            for (j, component) in ours.iter().enumerate() {
                compare_component(
                    &format!("{key}, {end} {}", j + 1),
                    component,
                    &expected[end][j],
                );
            }
        }
        let statistic = numbers(&expected["statistic"]);
        let own = &sheet.permutation.as_ref().unwrap().observed_stronger;
        for (j, x) in own.iter().enumerate() {
            let known = if measure == Measure::Typical {
                statistic[j].exp()
            } else {
                statistic[j]
            };
            close(&format!("{key}, statistic {j}"), x / known, 1.0, 1e-6);
        }
    }
}

#[test]
fn total_ratios_at_full_rank_are_scipys_generalised_eigenvalues() {
    let mut recipe = pipeline_recipe(Measure::Total, 0);
    recipe.keep = Keep::Number(10);
    recipe.components = 10;
    let sheet = sheet(pipeline_recording(), recipe);
    let expected = numbers(&reference("pipeline")["total_full"]["eigenvalues"]);
    let above = expected.iter().filter(|x| **x > 1.0).count();
    assert_eq!(sheet.stronger.len(), above);
    assert_eq!(sheet.weaker.len(), expected.len() - above);
    for (c, x) in sheet.stronger.iter().zip(&expected) {
        close("total ratio", c.total.fitted / x, 1.0, 1e-6);
    }
    for (c, x) in sheet.weaker.iter().zip(expected.iter().rev()) {
        close("total ratio", c.total.fitted / x, 1.0, 1e-6);
    }
}

#[test]
fn the_comparators_on_the_same_held_out_windows() {
    let sheet = sheet(pipeline_recording(), pipeline_recipe(Measure::Typical, 0));
    let expected = &reference("pipeline")["compare"];
    for c in &sheet.compare {
        let key = match c.kind {
            ComparatorKind::FirstPc => "first_pc",
            ComparatorKind::BestPc => "best_pc",
            ComparatorKind::BestChannel => "best_channel",
            ComparatorKind::MeanOfChannels => "mean_of_channels",
            ComparatorKind::RandomDirection => continue,
        };
        close(
            key,
            c.typical.held_out.unwrap() / number(&expected[key]),
            1.0,
            1e-6,
        );
    }
    assert_eq!(sheet.compare.len(), 5);
}

#[test]
fn every_arrangement_of_ten_pairs_is_counted_as_numpy_counts_them() {
    let mut recording = pipeline_recording();
    recording.events.truncate(10);
    let sheet = sheet(recording, pipeline_recipe(Measure::Typical, 2000));
    let permutation = sheet.permutation.as_ref().unwrap();
    assert!(permutation.exact && permutation.done == 1024);
    let expected = &reference("pipeline")["exact_permutation_of_ten"];
    close(
        "p, stronger",
        sheet.stronger[0].p.unwrap() * 1024.0,
        number(&expected["count_largest"]),
        1e-9,
    );
    close(
        "p, weaker",
        sheet.weaker[0].p.unwrap() * 1024.0,
        number(&expected["count_smallest"]),
        1e-9,
    );
}

#[test]
fn a_component_in_the_reference_windows_has_variance_one_and_its_pattern_is_haufes() {
    let sheet = sheet(pipeline_recording(), pipeline_recipe(Measure::Typical, 0));
    for c in sheet.stronger.iter().chain(&sheet.weaker) {
        let largest = c
            .pattern
            .iter()
            .copied()
            .fold(0.0f64, |m, x| if x.abs() > m.abs() { x } else { m });
        assert!(largest > 0.0, "the entry of largest magnitude is positive");
        // wᵀa = 1 by a = Pw/(wᵀPw).
        let product: f64 = c.filter.iter().zip(&c.pattern).map(|(w, a)| w * a).sum();
        close("wᵀa", product, 1.0, 1e-9);
    }
}

#[test]
fn the_same_recipe_gives_the_same_sheet_and_a_detour_leaves_no_trace() {
    let recipe = pipeline_recipe(Measure::Typical, 100);
    let direct = sheet(pipeline_recording(), recipe.clone());
    let mut analysis = Analysis::new(pipeline_recording(), recipe.clone()).unwrap();
    let mut detours = vec![];
    for i in 0..6 {
        let mut other = recipe.clone();
        match i {
            0 => other.keep = Keep::Number(4),
            1 => other.measure = Measure::Total,
            2 => {
                other.contrast = Contrast::Windows {
                    signal: EventWindow::new("bell", 0.0, 0.5),
                    reference: EventWindow::new("bell", -0.5, 0.0),
                }
            }
            3 => other.evidence.folds = 3,
            4 => other.filter.high_pass_hz = Some(2.0),
            _ => other.evidence.bootstrap = 50,
        }
        detours.push(other);
    }
    for other in detours {
        analysis.set_recipe(other).unwrap();
        // Stopped at an arbitrary place, or run to the end.
        for _ in 0..40 {
            if analysis.finished() {
                break;
            }
            analysis.step().unwrap();
        }
        analysis.set_recipe(recipe.clone()).unwrap();
        analysis.run(|_| ()).unwrap();
        assert_eq!(
            serde_json::to_string(analysis.sheet()).unwrap(),
            serde_json::to_string(&direct).unwrap()
        );
    }
}

#[test]
fn on_noise_alone_p_is_uniform() {
    // The small form of `cargo xtask bench --null`; scipy.stats.binom.interval(0.99, 400, 0.05) = (10, 32).
    assert_eq!(binomial_99(400), [10, 32]);
    let count = 100;
    let [low, high] = binomial_99(count);
    for noise in [Noise::White, Noise::Pink] {
        let kind = ContrastKind::Windows;
        for hits in rejections(1, count, kind, noise, Measure::Typical, 99) {
            assert!(
                (low..=high).contains(&hits),
                "{hits} of {count} null recordings of {noise:?} noise reach p ≤ 0.05"
            );
        }
    }
}

#[test]
fn no_kind_finds_more_in_noise_than_it_says() {
    // The small form; `reference/calibration.md` keeps the full one.
    let count = 60;
    let [_, high] = binomial_99(count);
    for (kind, measure) in [
        (ContrastKind::Spans, Measure::Typical),
        (ContrastKind::Band, Measure::Total),
        (ContrastKind::Repeatable, Measure::Total),
        (ContrastKind::Slow, Measure::Total),
    ] {
        for hits in rejections(1, count, kind, Noise::White, measure, 39) {
            assert!(
                hits <= high,
                "{kind:?}: {hits} of {count} null recordings reach p ≤ 0.05"
            );
        }
    }
}

#[test]
fn the_night_watch_gives_back_what_was_planted() {
    let demo = night_watch(WATCH_SEED);
    let sheet = sheet(demo.recording, demo.recipe);
    let (up, down) = (&sheet.stronger[0], &sheet.weaker[0]);
    for (found, planted) in [(up, &demo.truth.stronger), (down, &demo.truth.weaker)] {
        let likeness = abs_cosine(&found.pattern, &planted.pattern);
        assert!(likeness > 0.9, "{}: cosine {likeness}", planted.name);
        assert!(
            found.p.unwrap() <= 0.01,
            "{}: p = {:?}",
            planted.name,
            found.p
        );
        // A window of 0.8 s tells frequencies 1.25 Hz apart; the planted rhythms wander by about as much.
        close(
            &planted.name,
            found.peak_hz.unwrap(),
            planted.hz.unwrap(),
            2.0,
        );
    }
    assert!(up.typical.held_out.unwrap() > 2.0 && down.typical.held_out.unwrap() < 0.5);
    // The largest component does not show it: that is why one does not stop at principal components.
    let first = sheet
        .compare
        .iter()
        .find(|c| c.kind == ComparatorKind::FirstPc)
        .unwrap();
    assert!((0.7..1.4).contains(&first.typical.held_out.unwrap()));
}

/// Noise with `trials` events "tick" and no others.
fn plain_recording(trials: usize) -> Recording {
    let mut recording = null_recording(3, Noise::White, 6, trials);
    recording.events.retain(|e| e.label == "tick");
    recording
}

#[test]
fn flat_windows_are_left_out_with_their_partners_and_said() {
    let mut recording = plain_recording(20);
    // The amplifier is blanked after the third event.
    let at = (recording.events[2].onset_s * recording.rate_hz).round() as usize;
    for channel in &mut recording.samples {
        channel[at..at + 90].fill(0.0);
    }
    let sheet = sheet(recording, null_recipe(Measure::Typical, 50));
    let windows = sheet.windows.unwrap();
    assert_eq!((windows.signal.used, windows.reference.used), (19, 19));
    assert_eq!(windows.signal.dropped.get("flat"), Some(&1));
    assert_eq!(windows.reference.dropped.get("partner"), Some(&1));
    assert_eq!(windows.trials[2].dropped.as_deref(), Some("flat"));
    assert!(sheet.stronger[0].typical.held_out.unwrap().is_finite());
    assert!(
        sheet.warnings.iter().any(|w| w.contains("no variance")),
        "{:?}",
        sheet.warnings
    );
}

#[test]
fn channels_that_are_flat_outside_one_fold_are_an_error_in_words() {
    let mut recording = plain_recording(20);
    let count = recording.sample_count();
    for (i, channel) in recording.samples.iter_mut().enumerate().skip(1) {
        // All but one channel lie on a line through the first four fifths.
        let first = channel[0];
        channel[..count * 4 / 5 - 200].fill(first * i as f32);
    }
    let mut recipe = null_recipe(Measure::Typical, 10);
    recipe.evidence.folds = 5;
    let mut analysis = Analysis::new(recording, recipe).unwrap();
    let problem = analysis.run(|_| ()).unwrap_err();
    assert!(problem.to_string().contains("fold 5"), "{problem}");
}

#[test]
fn times_beyond_any_clock_are_outside() {
    let mut recording = plain_recording(20);
    recording.events.push(teasel_core::recording::Event {
        onset_s: 9e17,
        duration_s: 0.0,
        label: "tick".into(),
    });
    let sheet = sheet(recording, null_recipe(Measure::Typical, 10));
    assert_eq!(
        sheet.windows.unwrap().signal.dropped.get("outside"),
        Some(&1)
    );
}

#[test]
fn a_side_with_fewer_windows_than_folds_still_tests_both_sides_in_every_fold() {
    let mut recording = plain_recording(60);
    for (k, event) in recording.events.iter_mut().enumerate() {
        event.label = if k % 5 == 0 {
            "tick".into()
        } else {
            "tock".into()
        };
    }
    let mut recipe = null_recipe(Measure::Total, 20);
    recipe.evidence.folds = 20;
    recipe.contrast = Contrast::Windows {
        signal: EventWindow::new("tick", 0.0, 0.8),
        reference: EventWindow::new("tock", 0.0, 0.8),
    };
    let sheet = sheet(recording, recipe);
    assert_eq!(sheet.folds.len(), 12);
    let c = &sheet.stronger[0];
    assert!(c.total.folds.iter().all(|x| x.is_finite()) && c.total.held_out.unwrap().is_finite());
    assert!(c.typical.held_out.unwrap().is_finite());
}

#[test]
fn the_sheet_after_a_change_of_c_is_that_of_a_fresh_run() {
    let recording = null_recording(5, Noise::Pink, 24, 30);
    let mut recipe = null_recipe(Measure::Typical, 20);
    recipe.keep = Keep::Number(11);
    let fresh = sheet(recording.clone(), recipe.clone());
    let mut other = recipe.clone();
    let mut analysis = {
        other.keep = Keep::Number(15);
        Analysis::new(recording, other).unwrap()
    };
    analysis.run(|_| ()).unwrap();
    analysis.set_recipe(recipe).unwrap();
    analysis.run(|_| ()).unwrap();
    assert_eq!(
        serde_json::to_string(analysis.sheet()).unwrap(),
        serde_json::to_string(&fresh).unwrap()
    );
}

#[test]
fn trials_that_share_samples_are_said_to_flatter() {
    let mut recording = plain_recording(20);
    let doubled: Vec<_> = recording
        .events
        .iter()
        .map(|e| teasel_core::recording::Event {
            onset_s: e.onset_s + 0.002,
            ..e.clone()
        })
        .collect();
    recording.events.extend(doubled);
    recording
        .events
        .sort_by(|a, b| a.onset_s.total_cmp(&b.onset_s));
    let sheet = sheet(recording, null_recipe(Measure::Typical, 10));
    assert!(
        sheet.warnings.iter().any(|w| w.contains("not independent")),
        "{:?}",
        sheet.warnings
    );
}
