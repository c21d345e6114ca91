//! Movies: binning, masks and ΔF/F against NumPy (`reference/make_movie.py`), and what was planted in the drifting dish.
use teasel_core::analysis::Analysis;
use teasel_core::contrast::linalg::abs_cosine;
use teasel_core::demo::{DISH_SEED, drifting_dish};
use teasel_core::error::Kind;
use teasel_core::prepare::movie::{Viewing, against_baseline};
use teasel_core::recipe::{
    Above, Contrast, Dff, EventWindow, Evidence, Mask, Movie, Quantile, Recipe,
};
use teasel_core::recording::{Channel, Event, Layout, Recording, Stretch};
use teasel_core::sheet::{ComparatorKind, MovieCard};
use teasel_core::takeaway::{Weights, recipe_from_json, recipe_json, weights_json};
use teasel_tests::{close, close_all, number, numbers, reference, rows};

const F32: f64 = f32::EPSILON as f64;

fn a_movie(samples: Vec<Vec<f32>>, height: u32, width: u32) -> Recording {
    let count = samples[0].len();
    Recording {
        name: "a.tif".into(),
        format: "TIFF".into(),
        rate_hz: 20.0,
        channels: (0..height * width)
            .map(|p| Channel {
                name: format!("r{}c{}", p / width + 1, p % width + 1),
                unit: "counts".into(),
                position: None,
            })
            .collect(),
        samples,
        layout: Layout::Frames {
            height,
            width,
            pixels: (0..height * width).collect(),
        },
        stretches: vec![Stretch {
            first: 0,
            count,
            onset_s: 0.0,
        }],
        ..Recording::default()
    }
}

/// The movie of the reference file: 4 frames of 5 × 7.
fn small() -> Recording {
    let all = reference("movie");
    let frames: Vec<Vec<Vec<f64>>> = all["movie"].as_array().unwrap().iter().map(rows).collect();
    let pixel = |p: usize| {
        let course = frames.iter().map(|f| f[p / 7][p % 7] as f32);
        course.collect()
    };
    a_movie((0..35).map(pixel).collect(), 5, 7)
}

fn viewed(recording: &Recording, movie: Movie) -> (Recording, MovieCard) {
    let mut viewing = Viewing::new(recording, &movie).unwrap().unwrap();
    while !viewing.finished() {
        viewing.step(recording).unwrap();
    }
    let (done, of) = viewing.progress();
    assert_eq!(done, of);
    viewing.finish(recording)
}

#[test]
fn the_baseline_is_numpys_running_percentile() {
    let all = reference("movie");
    let samples = numbers(&all["samples"]);
    let whole = [Stretch {
        first: 0,
        count: samples.len(),
        onset_s: 0.0,
    }];
    for case in all["cases"].as_array().unwrap() {
        let dff = Dff {
            percentile: number(&case["percentile"]),
            window_s: number(&case["window_s"]),
        };
        let ours = against_baseline(&samples, &whole, number(&all["rate_hz"]), dff).unwrap();
        let ours: Vec<f64> = ours.iter().map(|x| f64::from(*x)).collect();
        close_all("dff", &ours, &numbers(&case["dff"]), F32);
    }
    // Runs on both sides of a gap know nothing of each other.
    let halves = [0, 100].map(|first| Stretch {
        first,
        count: 100,
        onset_s: first as f64,
    });
    let dff = Dff::default();
    let both = against_baseline(&samples, &halves, 20.0, dff).unwrap();
    let alone = [Stretch {
        first: 0,
        count: 100,
        onset_s: 0.0,
    }];
    let second = against_baseline(&samples[100..], &alone, 20.0, dff).unwrap();
    assert_eq!(both[100..], second);
    // A baseline that is not above 0 has no share.
    assert!(against_baseline(&[1.0, -3.0, 1.0], &whole[..0], 20.0, dff).is_some());
    let low: Vec<f64> = samples.iter().map(|x| x - 200.0).collect();
    assert!(against_baseline(&low, &whole, 20.0, dff).is_none());
}

#[test]
fn bins_are_means_and_what_fills_no_bin_is_left_off() {
    let all = reference("movie");
    let (made, card) = viewed(
        &small(),
        Movie {
            bin: Some(2),
            ..Movie::default()
        },
    );
    assert_eq!(
        (card.height, card.width, card.rows, card.columns),
        (5, 7, 2, 3)
    );
    for (ours, numpy) in made.samples.iter().zip(rows(&all["binned"])) {
        let ours: Vec<f64> = ours.iter().map(|x| f64::from(*x)).collect();
        close_all("binned", &ours, &numpy, 60.0 * F32);
    }
    let mean: Vec<f64> = card.mean.iter().map(|x| f64::from(*x)).collect();
    close_all("mean", &mean, &numbers(&all["mean"]), 60.0 * F32);
    assert_eq!(made.channels[5].name, "r2c3");
    assert_eq!(made.channels[5].unit, "counts");
}

#[test]
fn masks_keep_bright_or_painted_pixels() {
    let all = reference("movie");
    let mean = numbers(&all["mean"]);
    let threshold = number(&all["quantile_45"]);
    let bright: Vec<u32> = (0..6).filter(|i| mean[*i as usize] > threshold).collect();
    let by = |mask| {
        viewed(
            &small(),
            Movie {
                bin: Some(2),
                mask: Some(mask),
                dff: None,
            },
        )
    };
    let (made, card) = by(Mask::Quantile(Quantile { quantile: 0.45 }));
    close("threshold", card.threshold.unwrap(), threshold, 60.0 * F32);
    assert_eq!(card.used, bright);
    let Layout::Frames { pixels, width, .. } = &made.layout else {
        panic!("a movie stays one");
    };
    assert_eq!((pixels, *width), (&bright, 3));
    let (_, card) = by(Mask::Above(Above { above: threshold }));
    assert_eq!(card.used, bright);
    // Row 1, columns 3 to 6, and one pixel of row 3: two bins are half painted, the third is not.
    let (made, card) = by(Mask::Painted(vec![[1, 3, 6], [3, 1, 1]]));
    assert_eq!(card.used, [1, 2]);
    assert_eq!(made.channels[0].name, "r1c2");
    // A mask that leaves nothing is refused.
    let movie = Movie {
        mask: Some(Mask::Above(Above { above: 1e9 })),
        ..Movie::default()
    };
    let recording = small();
    let mut viewing = Viewing::new(&recording, &movie).unwrap().unwrap();
    let problem = loop {
        if let Err(problem) = viewing.step(&recording) {
            break problem;
        }
    };
    assert_eq!(problem.kind, Kind::Contrast);
}

#[test]
fn the_recipe_keeps_a_movies_choices() {
    let asking = Recipe::asking(Contrast::Windows {
        signal: EventWindow::new("puff", 0.0, 1.0),
        reference: EventWindow::new("puff", -1.0, 0.0),
    });
    assert!(!recipe_json(&asking).unwrap().contains("movie"));
    for mask in [
        Mask::Above(Above { above: 3.5 }),
        Mask::Quantile(Quantile { quantile: 0.25 }),
        Mask::Painted(vec![[1, 2, 3]]),
    ] {
        let recipe = Recipe {
            movie: Movie {
                bin: Some(4),
                mask: Some(mask),
                dff: Some(Dff::default()),
            },
            ..asking.clone()
        };
        let text = recipe_json(&recipe).unwrap();
        assert_eq!(recipe_from_json(&text).unwrap(), recipe);
    }
    let refused = |movie: &str| {
        let text = recipe_json(&asking).unwrap();
        let text = text.replacen('{', &format!("{{\"movie\": {movie},"), 1);
        recipe_from_json(&text).unwrap_err().kind
    };
    for wrong in [
        "{\"bin\": 0}",
        "{\"bins\": 2}",
        "{\"mask\": {\"above\": 1, \"quantile\": 0.5}}",
        "{\"mask\": {}}",
        "{\"mask\": {\"quantile\": 1}}",
        "{\"mask\": [[0, 1, 2]]}",
        "{\"mask\": [[1, 3, 2]]}",
        "{\"mask\": [[1, 2]]}",
        "{\"dff\": {\"percentile\": 101}}",
        "{\"dff\": {\"window_s\": 0}}",
    ] {
        assert_eq!(refused(wrong), Kind::Recipe, "{wrong}");
    }
}

/// A short movie for the whole pipeline: binned and as a share of its baseline.
#[test]
fn a_changed_movie_is_analysed_anew() {
    let mut random = teasel_tests::Lcg(3);
    let samples: Vec<Vec<f32>> = (0..36)
        .map(|_| {
            (0..600)
                .map(|_| (100.0 + random.normal12()) as f32)
                .collect()
        })
        .collect();
    let mut recording = a_movie(samples, 6, 6);
    recording.events = (1..14)
        .map(|i| Event {
            onset_s: 2.0 * f64::from(i),
            duration_s: 0.0,
            label: "puff".into(),
        })
        .collect();
    let plain = Recipe {
        evidence: Evidence {
            permutations: 20,
            bootstrap: 20,
            ..Evidence::default()
        },
        ..Recipe::asking(Contrast::Windows {
            signal: EventWindow::new("puff", 0.0, 0.8),
            reference: EventWindow::new("puff", -0.8, 0.0),
        })
    };
    let binned = Recipe {
        movie: Movie {
            bin: Some(2),
            mask: None,
            dff: Some(Dff::default()),
        },
        ..plain.clone()
    };
    let mut analysis = Analysis::new(recording.clone(), plain.clone()).unwrap();
    analysis.run(|_| ()).unwrap();
    assert_eq!(analysis.sheet().channels.len(), 36);
    assert_eq!(analysis.sheet().movie.as_ref().unwrap().used.len(), 36);
    let first = analysis.sheet().clone();
    analysis.set_recipe(binned.clone()).unwrap();
    assert!(!analysis.finished());
    analysis.run(|_| ()).unwrap();
    assert_eq!(analysis.sheet().channels.len(), 9);
    assert_eq!(analysis.sheet().channels[0].unit, "ΔF/F");
    assert_eq!(analysis.sheet().stronger[0].pattern.len(), 9);
    let mut fresh = Analysis::new(recording, binned).unwrap();
    fresh.run(|_| ()).unwrap();
    assert_eq!(fresh.sheet(), analysis.sheet());
    analysis.set_recipe(plain).unwrap();
    analysis.run(|_| ()).unwrap();
    assert_eq!(analysis.sheet(), &first);
    assert_eq!(analysis.into_recording().channels.len(), 36);
}

/// The drifting dish: 10,000 pixels come back as two patches, with evidence.
#[test]
fn the_planted_patches_come_back() {
    let demo = drifting_dish(DISH_SEED);
    let recipe = Recipe {
        evidence: Evidence {
            permutations: 99,
            bootstrap: 50,
            ..Evidence::default()
        },
        ..demo.recipe
    };
    let mut analysis = Analysis::new(demo.recording, recipe).unwrap();
    analysis.run(|_| ()).unwrap();
    let sheet = analysis.sheet();
    assert!(sheet.warnings.len() < 10, "{:?}", sheet.warnings);
    let card = sheet.compression.as_ref().unwrap();
    let basis = card.basis.unwrap();
    assert!(card.kept == 20 && basis.dimensions > 100);
    assert!(basis.outside < 0.01 * card.eigenvalues[0], "{basis:?}");
    for (component, truth) in [
        (&sheet.stronger[0], &demo.truth.stronger),
        (&sheet.weaker[0], &demo.truth.weaker),
    ] {
        let alike = abs_cosine(&component.pattern, &truth.pattern);
        assert!(alike > 0.9, "{}: {alike}", truth.name);
        assert!(component.p.unwrap() <= 0.02, "{}", truth.name);
        assert_eq!(component.filter_raw.len(), 10_000);
        assert_eq!(component.filter, component.filter_raw);
    }
    let held = |c: &teasel_core::sheet::TypicalRatio| c.held_out.unwrap();
    assert!(held(&sheet.stronger[0].typical) > 2.0);
    assert!(held(&sheet.weaker[0].typical) < 0.5);
    // Neither the largest dimension nor the best pixel shows it as well.
    let beside = |kind| {
        let found = sheet.compare.iter().find(|c| c.kind == kind).unwrap();
        held(&found.typical).ln().abs()
    };
    let lead = held(&sheet.first().unwrap().typical).ln().abs();
    assert!(beside(ComparatorKind::FirstPc) < 0.5 * lead);
    assert!(beside(ComparatorKind::BestChannel) < lead);
}

/// Twelve events in a movie of 8 × 8 pixels, whose four middle pixels are brighter after each.
fn answering() -> Recording {
    let frames = 12 * 60;
    let mut state = 7_u64;
    let mut noise = || {
        state = state
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        (state >> 40) as f32 / 16_777_216.0 - 0.5
    };
    let pixel = |p: usize| {
        let middle = (3..5).contains(&(p / 8)) && (3..5).contains(&(p % 8));
        let course = (0..frames).map(|t| {
            let after = (30..50).contains(&(t % 60));
            let size = if middle && after { 9.0 } else { 1.0 };
            200.0 + p as f32 + size * noise()
        });
        course.collect::<Vec<f32>>()
    };
    let mut movie = a_movie((0..64).map(pixel).collect(), 8, 8);
    movie.events = (0..12)
        .map(|k| Event {
            onset_s: (k * 60 + 30) as f64 / 20.0,
            duration_s: 0.0,
            label: "puff".into(),
        })
        .collect();
    movie
}

#[test]
fn weights_of_bins_and_baselines_make_the_same_of_a_movie_before_they_are_applied() {
    let window = |from_s, to_s| EventWindow::new("puff", from_s, to_s);
    let recipe = Recipe {
        movie: Movie {
            bin: Some(2),
            mask: Some(Mask::Quantile(Quantile { quantile: 0.25 })),
            dff: Some(Dff {
                percentile: 20.0,
                window_s: 6.0,
            }),
        },
        evidence: Evidence {
            permutations: 0,
            bootstrap: 0,
            ..Evidence::default()
        },
        ..Recipe::asking(Contrast::Windows {
            signal: window(0.0, 1.0),
            reference: window(-1.0, 0.0),
        })
    };
    let mut analysis = Analysis::new(answering(), recipe).unwrap();
    analysis.run(|_| {}).unwrap();
    let text = weights_json(analysis.sheet()).unwrap();
    let weights = Weights::from_json(&text).unwrap();
    assert_eq!(weights.preparation.movie, analysis.recipe().movie);
    let ours = analysis.series().unwrap();
    let applied = weights.apply(analysis.recorded()).unwrap();
    assert_eq!(applied.series.names, ours.names);
    for (a, b) in applied.series.samples.iter().zip(&ours.samples) {
        let largest = b.iter().fold(0.0_f64, |m, x| m.max(x.abs()));
        // The series are sums over f32 samples in another order: a few units of f32's last place.
        close_all("series", a, b, 16.0 * F32 * largest);
    }
    assert!(applied.notes.iter().any(|note| note.contains("binned")));
    let plain = Recording {
        layout: Layout::Head,
        ..answering()
    };
    let refused = weights.apply(&plain).unwrap_err();
    assert_eq!(refused.what, "the recording is no movie");
}
