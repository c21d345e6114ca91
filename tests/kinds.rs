//! The kinds of contrast other than event windows.
//!
//! | check | source |
//! |---|---|
//! | ratios of every kind | NumPy, `scipy.linalg.eigh`, `scipy.signal.firwin` on the file of `make_pipeline.py` (`reference/kinds.json`) |
//! | a rhythm at a signal-to-noise ratio of 1:10 | the setting of Nikulin, Nolte & Curio 2011, sec. 2.4, simulated here |
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use teasel_core::analysis::Analysis;
use teasel_core::contrast::linalg::abs_cosine;
use teasel_core::recipe::{
    BandReference, Contrast, EventWindow, Evidence, HoldBack, Keep, Measure, Recipe, Shrink, Spans,
    Within,
};
use teasel_core::recording::{Channel, Event, MemorySource, OpenOptions, Recording, Stretch, open};
use teasel_core::sheet::Sheet;
use teasel_tests::{close_all, number, numbers, reference, rows};

fn pipeline_recording() -> Recording {
    let path = format!("{}/reference/pipeline.edf", env!("CARGO_MANIFEST_DIR"));
    let source = MemorySource::new("pipeline.edf", std::fs::read(path).unwrap());
    open(Box::new(source), Vec::new(), OpenOptions::default()).unwrap()
}

/// Full rank, no shrinkage, every component.
fn plain(contrast: Contrast) -> Recipe {
    Recipe {
        keep: Keep::Number(10),
        measure: Measure::Total,
        shrink: Shrink::Number(0.0),
        components: 10,
        evidence: Evidence {
            permutations: 0,
            bootstrap: 0,
            ..Evidence::default()
        },
        ..Recipe::asking(contrast)
    }
}

fn sheet(recording: Recording, recipe: Recipe) -> Sheet {
    let mut analysis = Analysis::new(recording, recipe).unwrap();
    analysis.run(|_| ()).unwrap();
    analysis.sheet().clone()
}

/// Fitted total ratios of all directions, largest first.
fn ratios(sheet: &Sheet) -> Vec<f64> {
    let up = sheet.stronger.iter();
    up.chain(sheet.weaker.iter().rev())
        .map(|c| c.total.fitted)
        .collect()
}

/// Samples are kept as f32 (relative rounding 6e-8), and the smallest variance is about 1e-3 of the largest: 1e-4 of each ratio.
fn same(what: &str, found: &[f64], expected: &[f64]) {
    let relative: Vec<f64> = found.iter().zip(expected).map(|(a, b)| a / b).collect();
    assert_eq!(found.len(), expected.len(), "{what}");
    close_all(what, &relative, &vec![1.0; expected.len()], 1e-4);
}

fn band(reference: BandReference) -> Contrast {
    Contrast::Band {
        centre_hz: 17.0,
        half_width_hz: 2.0,
        reference,
        within: None,
        piece_s: None,
    }
}

#[test]
fn every_kind_equals_scipys_on_a_file_written_by_pyedflib() {
    let expected = reference("kinds");
    let times = rows(&expected["spans_s"])
        .iter()
        .map(|s| [s[0], s[1]])
        .collect();
    let spans = sheet(
        pipeline_recording(),
        plain(Contrast::Spans {
            signal: Spans::Times(times),
            reference: Spans::rest(),
            piece_s: None,
        }),
    );
    let card = spans.windows.as_ref().unwrap();
    assert_eq!(
        (card.signal.used as f64, card.reference.used as f64),
        (
            number(&expected["spans"]["signal"]),
            number(&expected["spans"]["reference"])
        )
    );
    same(
        "spans",
        &ratios(&spans),
        &numbers(&expected["spans"]["eigenvalues"]),
    );

    for (key, side) in [
        ("flanks", BandReference::Flanks),
        ("broadband", BandReference::Broadband),
    ] {
        let found = sheet(pipeline_recording(), plain(band(side)));
        same(key, &ratios(&found), &numbers(&expected["band"][key]));
    }

    let window = EventWindow::new("bell", 0.1, 0.8);
    let repeatable = sheet(pipeline_recording(), plain(Contrast::Repeatable(window)));
    let trials = number(&expected["repeatable"]["trials"]);
    // The ratio is the share of the power that the average holds, times the number of trials.
    let shares = numbers(&expected["repeatable"]["share"]);
    let expected_ratios: Vec<f64> = shares.iter().map(|s| s * trials).collect();
    same("repeatable", &ratios(&repeatable), &expected_ratios);

    let slow = Contrast::Slow {
        lag_s: number(&expected["slow"]["lag_s"]),
        within: None,
        piece_s: None,
    };
    let slow = sheet(pipeline_recording(), plain(slow));
    let r = numbers(&expected["slow"]["autocorrelation"]);
    let expected_ratios: Vec<f64> = r.iter().map(|r| (1.0 + r) / (1.0 - r)).collect();
    same("slow", &ratios(&slow), &expected_ratios);
}

/// Channels of 1/f-like noise with one rhythm at 10 Hz of a given pattern; the rhythm's power over all channels is `ratio` times
/// that of the noise between 8 and 12 Hz, as Nikulin et al. (2011) set it.
fn rhythm(seed: u64, ratio: f64, pattern: &[f64]) -> Recording {
    const RATE_HZ: f64 = 100.0;
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let (m, n) = (pattern.len(), (120.0 * RATE_HZ) as usize);
    let mut normal = || -> f64 { StandardNormal.sample(&mut rng) };
    let mix: Vec<Vec<f64>> = (0..m).map(|_| (0..m).map(|_| normal()).collect()).collect();
    let sources: Vec<Vec<f64>> = (0..m)
        .map(|_| {
            let mut state = 0.0;
            (0..n)
                .map(|_| {
                    state = 0.9 * state + normal();
                    state
                })
                .collect()
        })
        .collect();
    // A narrow-band rhythm: two poles at 10 Hz.
    let (radius, angle) = (0.97f64, 2.0 * std::f64::consts::PI * 10.0 / RATE_HZ);
    let (mut a, mut b) = (0.0, 0.0);
    let mut wave: Vec<f64> = (0..n)
        .map(|_| {
            let next = 2.0 * radius * angle.cos() * a - radius * radius * b + normal();
            (a, b) = (next, a);
            next
        })
        .collect();
    let power = |x: &[f64]| x.iter().map(|v| v * v).sum::<f64>() / x.len() as f64;
    let level = power(&wave).sqrt();
    wave.iter_mut().for_each(|w| *w /= level);
    // Power of the noise in the band, per unit of source: |1/(1 − 0.9 e^(−iω))|² averaged over 8 to 12 Hz, times its width.
    let density = |hz: f64| {
        let w = 2.0 * std::f64::consts::PI * hz / RATE_HZ;
        2.0 / RATE_HZ / (1.0 - 1.8 * w.cos() + 0.81)
    };
    let in_band: f64 = (0..400)
        .map(|i| density(8.0 + 4.0 * (f64::from(i) + 0.5) / 400.0) * 4.0 / 400.0)
        .sum();
    let noise: f64 = mix.iter().flatten().map(|x| x * x).sum::<f64>() * in_band;
    let size = (ratio * noise / pattern.iter().map(|p| p * p).sum::<f64>()).sqrt();
    let samples = (0..m)
        .map(|c| {
            (0..n)
                .map(|t| {
                    let noise: f64 = (0..m).map(|s| mix[c][s] * sources[s][t]).sum();
                    (noise + size * pattern[c] * wave[t]) as f32
                })
                .collect()
        })
        .collect();
    Recording {
        name: "rhythm".into(),
        format: "synthetic".into(),
        rate_hz: RATE_HZ,
        channels: (1..=m)
            .map(|i| Channel {
                name: format!("X{i}"),
                unit: "µV".into(),
                position: None,
            })
            .collect(),
        samples,
        stretches: vec![Stretch {
            first: 0,
            count: n,
            onset_s: 0.0,
        }],
        ..Recording::default()
    }
}

#[test]
fn a_rhythm_at_one_tenth_of_the_noise_is_recovered() {
    let pattern: Vec<f64> = (0..12).map(|c| (f64::from(c) * 0.7).sin() + 0.2).collect();
    for (seed, measure) in [(1, Measure::Typical), (2, Measure::Total)] {
        let recipe = Recipe {
            measure,
            components: 2,
            evidence: Evidence {
                permutations: 199,
                bootstrap: 100,
                ..Evidence::default()
            },
            ..Recipe::asking(Contrast::Band {
                centre_hz: 10.0,
                half_width_hz: 2.0,
                reference: BandReference::Flanks,
                within: None,
                piece_s: None,
            })
        };
        let sheet = sheet(rhythm(seed, 0.1, &pattern), recipe);
        let first = &sheet.stronger[0];
        // A ratio of 1:10 over all channels leaves a pattern whose error is the noise's share of what the pooled covariance holds.
        let likeness = abs_cosine(&first.pattern, &pattern);
        assert!(likeness > 0.9, "{measure:?}: cosine {likeness}");
        if measure == Measure::Typical {
            assert!(first.p.unwrap() <= 0.01, "{measure:?}: p {:?}", first.p);
        } else {
            // Its test flatters where artefacts are shared, so there is no p, and a warning says so.
            assert_eq!(first.p, None);
            assert!(sheet.warnings.iter().any(|w| w.contains("withheld")));
        }
        let peak = first.peak_hz.unwrap();
        assert!((peak - 10.0).abs() <= 1.0, "{peak}");
        let held = if measure == Measure::Typical {
            first.typical.held_out
        } else {
            first.total.held_out
        };
        assert!(held.unwrap() > 1.5, "{held:?}");
    }
}

fn quiet(events: Vec<Event>) -> Recording {
    Recording {
        events,
        ..rhythm(3, 0.0, &[1.0, 1.0, 1.0, 1.0])
    }
}

fn event(onset_s: f64, duration_s: f64, label: &str) -> Event {
    Event {
        onset_s,
        duration_s,
        label: label.into(),
    }
}

fn windows_of(recording: Recording, recipe: Recipe) -> Sheet {
    let mut analysis = Analysis::new(recording, recipe).unwrap();
    while analysis.sheet().windows.is_none() {
        analysis.step().unwrap();
    }
    analysis.sheet().clone()
}

/// Used and dropped signal windows of a recipe.
fn used(recording: Recording, recipe: Recipe) -> (usize, usize, Vec<(String, usize)>) {
    let card = windows_of(recording, recipe).windows.unwrap();
    (
        card.signal.used,
        card.reference.used,
        card.signal.dropped.into_iter().collect(),
    )
}

#[test]
fn events_are_chosen_by_label_pattern_number_and_answer() {
    let mut events = Vec::new();
    for k in 0..20 {
        let at = 5.0 * f64::from(k) + 5.0;
        events.push(event(
            at,
            0.0,
            if k % 2 == 0 {
                "buoy/left"
            } else {
                "buoy/right"
            },
        ));
        // The fourth and the last have no answer.
        if k != 3 && k != 19 {
            events.push(event(at + 0.7, 0.0, "press"));
        }
        if k % 4 == 0 {
            events.push(event(at + 2.0, 0.0, "swell"));
        }
    }
    let signal = |window: EventWindow| {
        Recipe::asking(Contrast::Windows {
            signal: window,
            reference: EventWindow::new("press", -0.4, 0.0),
        })
    };
    let window = |label: &str| EventWindow::new(label, 0.0, 0.5);
    let count = |recipe| used(quiet(events.clone()), recipe).0;
    assert_eq!(count(signal(window("buoy/left"))), 10);
    assert_eq!(count(signal(window("buoy/*"))), 20);
    let mut both = window("buoy/left");
    both.also = vec!["sw*".into()];
    assert_eq!(count(signal(both)), 15);
    let mut few = window("buoy*");
    (few.first, few.leave_out) = (Some(8), vec![1, 8, 12]);
    assert_eq!(count(signal(few)), 6);
    let mut last = window("buoy*");
    last.last = Some(5);
    assert_eq!(count(signal(last)), 5);
    let mut equal = window("buoy*");
    equal.equal = true;
    let mut recipe = signal(equal);
    if let Contrast::Windows { reference, .. } = &mut recipe.contrast {
        *reference = EventWindow::new("swell", 0.0, 0.5);
    }
    assert_eq!(
        used(quiet(events.clone()), recipe.clone()),
        (5, 5, vec![("drawn out".into(), 15)])
    );
    // The same seed draws the same windows.
    let of = |seed| {
        let mut recipe = recipe.clone();
        recipe.evidence.seed = seed;
        windows_of(quiet(events.clone()), recipe)
            .windows
            .unwrap()
            .trials
    };
    assert_eq!(of(1), of(1));
    assert_ne!(of(1), of(2));
    let mut answered = window("buoy*");
    (answered.to_s, answered.until) = (0.1, Some("press".into()));
    let (n, _, dropped) = used(quiet(events.clone()), signal(answered));
    assert_eq!((n, dropped), (18, vec![("unanswered".into(), 2)]));
}

#[test]
fn what_is_marked_or_locked_away_is_touched_by_no_window() {
    let events: Vec<Event> = (0..22)
        .map(|k| event(5.0 * f64::from(k) + 5.0, 0.0, "tick"))
        .collect();
    let window = EventWindow::new("tick", 0.0, 0.5);
    let mut recipe = Recipe::asking(Contrast::Windows {
        signal: window.clone(),
        reference: EventWindow::new("tick", -0.5, 0.0),
    });
    // Marks the signal window of the event at 10 s and the reference window of that at 15 s.
    recipe.not_used = vec![[10.2, 10.3], [14.4, 14.6]];
    // A quarter of 120 s: from 90 s on; the event at 90 s has its signal window there.
    recipe.hold_back = Some(HoldBack {
        last: 0.25,
        open: false,
    });
    let (signal, reference, dropped) = used(quiet(events.clone()), recipe.clone());
    assert_eq!((signal, reference), (15, 15));
    assert_eq!(
        dropped,
        vec![
            ("locked".into(), 5),
            ("marked".into(), 1),
            ("partner".into(), 1)
        ]
    );
    // Pieces are cut from what is left: 90 s less two marks, in whole seconds of each run.
    recipe.contrast = Contrast::Slow {
        lag_s: 0.02,
        within: None,
        piece_s: Some(1.0),
    };
    assert_eq!(used(quiet(events.clone()), recipe.clone()).0, 10 + 4 + 75);
    recipe.contrast = Contrast::Band {
        centre_hz: 10.0,
        half_width_hz: 2.0,
        reference: BandReference::Flanks,
        within: Some(Within::Window(window)),
        piece_s: None,
    };
    assert_eq!(used(quiet(events), recipe).0, 16);
}

#[test]
fn spans_by_label_are_refused_where_they_do_not_last_or_overlap() {
    let events = vec![
        event(10.0, 20.0, "calm"),
        event(20.0, 30.0, "storm"),
        event(5.0, 0.0, "tick"),
    ];
    let asking = |signal: &str, reference: &str| {
        let recipe = Recipe::asking(Contrast::Spans {
            signal: Spans::Label(signal.into()),
            reference: Spans::Label(reference.into()),
            piece_s: None,
        });
        let mut analysis = Analysis::new(quiet(events.clone()), recipe)?;
        while analysis.sheet().windows.is_none() {
            analysis.step()?;
        }
        let card = analysis.sheet().windows.clone().unwrap();
        Ok::<_, teasel_core::error::Problem>((card.signal.used, card.reference.used))
    };
    assert_eq!(asking("calm", "rest").unwrap(), (20, 100));
    assert!(
        asking("tick", "rest")
            .unwrap_err()
            .what
            .contains("have no duration")
    );
    assert!(
        asking("calm", "storm")
            .unwrap_err()
            .what
            .contains("overlap")
    );
    assert!(
        asking("gale", "rest")
            .unwrap_err()
            .what
            .contains("no event \"gale\"")
    );
}
