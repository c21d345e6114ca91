//! Trend, mains by fitted sinusoids and filter responses against NumPy and SciPy (`reference/make_steady.py`), also across gaps.
//!
//! Tolerances: 1e-9 of the largest value for f64 (two orders of summation over some hundred terms); where samples pass through f32, 2⁻²³ of
//! the largest value, for the input and for the output.
use serde_json::{Value, json};
use teasel_core::prepare::steady::{MainsFit, detrend};
use teasel_core::prepare::{Comparing, Preparing, inspect};
use teasel_core::recipe::{Detrend, DetrendPieces, DetrendWord, Mains, MainsHow, Recipe};
use teasel_core::recording::{Channel, Recording, Stretch};
use teasel_core::sheet::Step;
use teasel_tests::{Lcg, close, close_all, largest, number, numbers, reference};

const F32: f64 = 1.0 / (1u32 << 23) as f64;

fn recipe(channels: Value, filter: Value) -> Recipe {
    let window = json!({"event": "buoy", "from_s": 0.0, "to_s": 1.0});
    let text = json!({
        "teasel_recipe": 1,
        "channels": channels,
        "filter": filter,
        "contrast": {"kind": "windows", "signal": window, "reference": window},
    })
    .to_string();
    teasel_core::takeaway::recipe_from_json(&text).unwrap()
}

/// Channels at 250 Hz; every channel's samples are repeated in each of two stretches with a gap between.
fn twice(names: &[&str], samples: &[Vec<f64>]) -> Recording {
    let count = samples[0].len();
    Recording {
        rate_hz: 250.0,
        channels: names
            .iter()
            .map(|name| Channel {
                name: (*name).to_owned(),
                unit: "µV".to_owned(),
                position: None,
            })
            .collect(),
        samples: samples
            .iter()
            .map(|c| c.iter().chain(c).map(|x| *x as f32).collect())
            .collect(),
        stretches: [0, count]
            .map(|first| Stretch {
                first,
                count,
                onset_s: first as f64,
            })
            .to_vec(),
        ..Recording::default()
    }
}

#[test]
fn trends_are_taken_off_as_scipy_does() {
    let values = reference("steady");
    let input = numbers(&values["input"]);
    let pieces = DetrendPieces {
        linear_every_s: 0.6,
    };
    let cases = [
        ("mean", Detrend::Word(DetrendWord::Mean)),
        ("linear", Detrend::Word(DetrendWord::Linear)),
        ("every_0.6_s", Detrend::Pieces(pieces)),
    ];
    for (name, how) in cases {
        let mut x = input.clone();
        detrend(&mut x, how, 250.0);
        let expected = numbers(&values[name]);
        close_all(name, &x, &expected, 1e-9 * largest(&input));
    }
}

#[test]
fn fitted_mains_is_least_squares_in_overlapping_windows() {
    let values = reference("steady");
    let input = numbers(&values["input"]);
    for (name, window_s) in [
        ("mains_fit_0.8_s", 0.8),
        ("mains_fit_longer_than_stretch", 4.0),
    ] {
        let mains = Mains {
            hz: 50.0,
            harmonics: 2,
            how: MainsHow::Fit,
            window_s,
        };
        let mut x = input.clone();
        MainsFit::new(&mains, 250.0).unwrap().remove(&mut x);
        let expected = numbers(&values[name]);
        close_all(name, &x, &expected, 1e-9 * largest(&input));
    }
}

#[test]
fn each_side_of_a_gap_is_treated_on_its_own() {
    let values = reference("steady");
    let input = numbers(&values["input"]);
    let recording = twice(&["Fz", "Cz"], &[input.clone(), input.clone()]);
    let cases = [
        (json!({"detrend": "linear"}), "linear"),
        (
            json!({"mains": {"hz": 50, "harmonics": 2, "window_s": 0.8}}),
            "mains_fit_0.8_s",
        ),
    ];
    for (filter, name) in cases {
        let recipe = recipe(json!({}), filter);
        let cards = inspect(&recording, &recipe);
        let mut preparing = Preparing::new(&recording, &cards, &recipe).unwrap();
        while preparing.step(&recording) {}
        let prepared = preparing.finish().unwrap();
        let expected = numbers(&values[name]);
        for part in prepared.samples[1].chunks(input.len()) {
            let found: Vec<f64> = part.iter().map(|x| f64::from(*x)).collect();
            close_all(name, &found, &expected, 2.0 * F32 * largest(&input));
        }
        assert_eq!(prepared.card.before_filters.len(), 1);
    }
}

#[test]
fn the_drawn_response_is_that_of_the_taps() {
    let values = reference("steady");
    let samples: Vec<Vec<f64>> = (0..2)
        .map(|k| {
            let mut random = Lcg(k + 9);
            (0..2000).map(|_| random.normal12()).collect()
        })
        .collect();
    let recording = twice(&["Fz", "Cz"], &samples);
    let recipe = recipe(json!({}), json!({"high_pass_hz": 1.0}));
    let cards = inspect(&recording, &recipe);
    let preparing = Preparing::new(&recording, &cards, &recipe).unwrap();
    let mut preparing = preparing;
    while preparing.step(&recording) {}
    let response = preparing.finish().unwrap().card.response.unwrap();
    let edge = response.edges[0];
    assert_eq!(
        [edge.pass_hz, edge.half_hz, edge.transition_hz],
        [1.0, 0.5, 1.0]
    );
    assert_eq!(response.reach_s, 412.0 / 250.0);
    let wanted = numbers(&values["high_pass_1_hz"]["hz"]);
    let gains = numbers(&values["high_pass_1_hz"]["gain"]);
    for (hz, gain) in wanted.iter().zip(gains) {
        let Some(i) = response.hz.iter().position(|f| (f - hz).abs() < 1e-9) else {
            continue;
        };
        // The value is kept in dB: 1e-9 of a gain near 1 is 1e-8 dB.
        let found = 10f64.powf(response.db[i] / 20.0);
        close(&format!("{hz} Hz"), found, gain, 1e-8);
    }
    let seen = |f: &&f64| wanted.iter().any(|hz| (*f - hz).abs() < 1e-9);
    assert!(
        response.hz.iter().filter(seen).count() >= 3,
        "the −6 dB point, the edge and its mirror are drawn"
    );
}

#[test]
fn the_rank_after_each_step_is_what_linear_algebra_says() {
    let names = ["Fz", "Cz", "Pz", "C3", "C4", "F3", "F4", "Oz"];
    let mut random = Lcg(3);
    let samples: Vec<Vec<f64>> = names
        .iter()
        .map(|_| (0..6000).map(|_| 10.0 * random.normal12()).collect())
        .collect();
    let recording = twice(&names, &samples);
    let ranks = |channels: Value| -> Vec<(Step, usize, usize)> {
        let recipe = recipe(channels, json!({}));
        let cards = inspect(&recording, &recipe);
        let mut comparing = Comparing::new(&recording, &cards);
        while comparing.step(&recording) {}
        let quality = comparing.finish().unwrap();
        let mut preparing = Preparing::new(&recording, &cards, &recipe).unwrap();
        while preparing.step(&recording) {}
        let steps = preparing.finish().unwrap().steps;
        steps
            .iter()
            .map(|s| (s.step, s.matrix.nrows(), quality.rank(&s.matrix).unwrap()))
            .collect()
    };
    let all = (Step::Recorded, 8, 8);
    assert_eq!(ranks(json!({})), [all]);
    assert_eq!(
        ranks(json!({"leave_out": ["Oz"], "interpolate": ["Cz"], "reference": "average"})),
        [
            all,
            (Step::LeaveOut, 7, 7),
            (Step::Interpolate, 7, 6),
            (Step::Reference, 7, 5)
        ]
    );
    assert_eq!(
        ranks(json!({"reference": ["Cz"]})),
        [all, (Step::Reference, 7, 7)]
    );
    assert_eq!(
        ranks(json!({"reference": ["Cz", "Oz"]})),
        [all, (Step::Reference, 8, 7)]
    );
    assert_eq!(
        ranks(json!({"reference": {"bipolar": "neighbours"}})),
        [all, (Step::Reference, 7, 7)]
    );
    assert_eq!(
        ranks(json!({"reference": {"bipolar": [["Fz", "Cz"], ["Cz", "Pz"], ["Fz", "Pz"]]}})),
        [all, (Step::Reference, 3, 2)]
    );
}

#[test]
fn a_difference_of_two_channels_is_that_and_has_their_names() {
    let mut random = Lcg(8);
    let samples: Vec<Vec<f64>> = (0..3)
        .map(|_| (0..500).map(|_| random.normal12()).collect())
        .collect();
    let recording = twice(&["F3", "F4", "Cz"], &samples);
    let recipe = recipe(
        json!({"reference": {"bipolar": [["F4", "Cz"], ["F3", "F4"]]}}),
        json!({}),
    );
    let cards = inspect(&recording, &recipe);
    let mut preparing = Preparing::new(&recording, &cards, &recipe).unwrap();
    while preparing.step(&recording) {}
    let prepared = preparing.finish().unwrap();
    assert_eq!(prepared.channels, ["F4-Cz", "F3-F4"]);
    let expected: Vec<f64> = (0..500).map(|t| samples[1][t] - samples[2][t]).collect();
    let found: Vec<f64> = prepared.samples[0][..500]
        .iter()
        .map(|x| f64::from(*x))
        .collect();
    close_all("F4-Cz", &found, &expected, 2.0 * F32 * largest(&expected));
    assert_eq!(number(&json!(prepared.matrix[(1, 0)])), 1.0);
    assert_eq!(prepared.matrix[(1, 1)], -1.0);
}
