//! Filters, resampling, channel matrix, first look: against SciPy and by hand.
//!
//! Tolerances: 1e-9 of the largest value for f64 against SciPy (two f64 summation orders over some hundred taps stay below 1e-12);
//! where samples are stored as f32, half a unit in the last place: 2⁻²⁴ of the largest value, and as much again for rounding to even.
use serde_json::{Value, json};
use teasel_core::error::Kind;
use teasel_core::prepare::fir::{Design, Request, ZeroPhase, in_a_row};
use teasel_core::prepare::resample::{Resampler, ratio};
use teasel_core::prepare::{Prepared, Preparing, inspect, to_unit_sphere};
use teasel_core::recipe::Recipe;
use teasel_core::recording::{Channel, Recording, Stretch};
use teasel_core::sheet::ChannelState;
use teasel_tests::{Lcg, close, close_all, largest, number, numbers, reference, rows};

const F32: f64 = 1.0 / (1u32 << 23) as f64;

/// A recipe with these choices of channels and filters; its contrast does not matter here.
fn recipe(channels: Value, filter: Value) -> Recipe {
    let window = json!({"event": "buoy", "from_s": 0.0, "to_s": 1.0});
    serde_json::from_value(json!({
        "teasel_recipe": 1,
        "channels": channels,
        "filter": filter,
        "contrast": {"kind": "windows", "signal": window, "reference": window},
    }))
    .unwrap()
}

/// A recording of these channels; stretches of these counts, 100 s apart.
fn recording(names: &[&str], samples: Vec<Vec<f32>>, counts: &[usize], rate_hz: f64) -> Recording {
    let channel = |name: &&str| Channel {
        name: (*name).to_owned(),
        unit: "µV".to_owned(),
        position: None,
    };
    let mut first = 0;
    let stretches = counts
        .iter()
        .enumerate()
        .map(|(k, &count)| {
            first += count;
            Stretch {
                first: first - count,
                count,
                onset_s: 100.0 * k as f64,
            }
        })
        .collect();
    Recording {
        rate_hz,
        channels: names.iter().map(channel).collect(),
        samples,
        stretches,
        ..Recording::default()
    }
}

fn prepare(recording: &Recording, recipe: &Recipe) -> teasel_core::error::Result<Prepared> {
    let mut preparing = Preparing::new(recording, &inspect(recording, recipe), recipe)?;
    while preparing.step(recording) {}
    let (done, all) = preparing.progress();
    assert_eq!(done, all);
    assert!(!preparing.step(recording), "nothing is left");
    Ok(preparing.finish().expect("all channels are done"))
}

fn noise(channels: usize, samples: usize, seed: u64) -> Vec<Vec<f32>> {
    let mut random = Lcg(seed);
    (0..channels)
        .map(|_| (0..samples).map(|_| random.normal12() as f32).collect())
        .collect()
}

fn wide(samples: &[f32]) -> Vec<f64> {
    samples.iter().map(|&v| f64::from(v)).collect()
}

fn request(name: &str, edge: f64) -> Request {
    match name {
        "high-pass" => Request::HighPass(edge),
        "low-pass" => Request::LowPass(edge),
        "notch" => Request::Notch(edge),
        other => panic!("{other}"),
    }
}

#[test]
fn designs_match_scipy() {
    let all = reference("prepare");
    let designs = all["designs"].as_array().unwrap();
    assert_eq!(designs.len(), 9);
    for expected in designs {
        let name = expected["name"].as_str().unwrap();
        let (rate, edge) = (number(&expected["rate_hz"]), number(&expected["edge_hz"]));
        let design = Design::new(request(name, edge), rate);
        let taps = design.taps();
        assert_eq!(
            taps.len() as f64,
            number(&expected["length"]),
            "{name} {edge} at {rate}"
        );
        close(
            "transition",
            design.transition_hz,
            number(&expected["transition_hz"]),
            1e-15,
        );
        if let Some(some) = expected.get("every_512th") {
            let ours: Vec<f64> = taps.iter().copied().step_by(512).collect();
            close_all(name, &ours, &numbers(some), 1e-9 * largest(&taps));
            continue;
        }
        let half = numbers(&expected["first_half_and_centre"]);
        close_all(name, &taps[..half.len()], &half, 1e-12 * largest(&half));
        let mirror: Vec<f64> = taps.iter().rev().copied().collect();
        close_all("symmetry", &taps, &mirror, 1e-15);
        // −6 dB where the contract says; longer filters come closer to 1/2 exactly.
        close("gain", number(&expected["gain_at_cut_off"]), 0.5, 0.005);
    }
}

#[test]
fn firwin_of_another_reference_run_matches_too() {
    let all = reference("dsp");
    let x = numbers(&all["x"]);
    let low = &all["firwin"]["lowpass_65_40Hz_hamming"];
    let taps = numbers(&low["taps"]);
    let expected = numbers(&low["zero_phase_by_delay_compensation_x_200_to_219"]);
    let mut out = Vec::new();
    ZeroPhase::new(&taps, x.len()).filter(&x, &mut out);
    close_all("zero phase", &out[200..220], &expected, 1e-9 * largest(&x));
}

/// Taps and signals of many lengths against the sum written out.
#[test]
fn overlap_save_equals_the_plain_sum() {
    let mut random = Lcg(21);
    for taps in [1, 3, 5, 33, 101, 331] {
        let kernel: Vec<f64> = (0..taps).map(|_| random.normal12()).collect();
        for length in [1, 2, 3, 7, 64, 500, 5000] {
            let x: Vec<f64> = (0..length).map(|_| random.normal12()).collect();
            let mut out = vec![1.0; 3];
            let mut plan = ZeroPhase::new(&kernel, length);
            plan.filter(&x, &mut out);
            let plain = plain_filter(&kernel, &x);
            // ε · log₂ of the block · sum of |taps| · largest sample, with room of 10
            let tolerance = 10.0 * f64::EPSILON * 16.0 * taps as f64 * 36.0;
            close_all(
                &format!("{taps} taps, {length} samples"),
                &out,
                &plain,
                tolerance,
            );
            let again = out.clone();
            plan.filter(&x, &mut out);
            assert_eq!(out, again, "used buffers make no difference");
        }
    }
}

/// Mirrored by walking to and fro, convolved by the definition.
fn plain_filter(kernel: &[f64], x: &[f64]) -> Vec<f64> {
    let half = kernel.len() as isize / 2;
    let walk = |mut i: isize| loop {
        let last = x.len() as isize - 1;
        if last == 0 {
            return x[0];
        }
        if i < 0 {
            i = -i;
        } else if i > last {
            i = 2 * last - i;
        } else {
            return x[i as usize];
        }
    };
    (0..x.len() as isize)
        .map(|n| {
            let terms = kernel.iter().enumerate();
            terms.map(|(k, h)| h * walk(n + half - k as isize)).sum()
        })
        .collect()
}

#[test]
fn filters_in_a_row_are_their_convolution() {
    let product = in_a_row(&[vec![1.0, 2.0, 1.0], vec![1.0, 0.0, -1.0], vec![2.0]]).unwrap();
    close_all("taps", &product, &[2.0, 4.0, 0.0, -4.0, -2.0], 1e-14);
    assert_eq!(in_a_row(&[]), None);
}

#[test]
fn a_chain_of_reference_filters_and_rates_matches_scipy() {
    let all = reference("prepare");
    let chain = &all["chain"];
    let samples: Vec<Vec<f32>> = rows(&chain["samples"])
        .iter()
        .map(|row| row.iter().map(|&v| v as f32).collect())
        .collect();
    let counts: Vec<usize> = numbers(&chain["counts"])
        .iter()
        .map(|&c| c as usize)
        .collect();
    let names = ["Fz", "C3", "Cz", "C4", "Pz"];
    let recording = recording(&names, samples, &counts, number(&chain["rate_hz"]));
    let filter = json!({"high_pass_hz": 1.0, "low_pass_hz": 40.0, "notch_hz": [25.0]});

    let alone = prepare(&recording, &recipe(json!({}), filter.clone())).unwrap();
    let expected = numbers(&chain["channel_0_as_recorded_filtered_every_5th"]);
    let ours: Vec<f64> = wide(&alone.samples[0]).into_iter().step_by(5).collect();
    close_all("as recorded", &ours, &expected, F32 * largest(&expected));
    assert_eq!(alone.matrix, nalgebra::DMatrix::identity(5, 5));

    let averaged = prepare(&recording, &recipe(json!({"reference": "average"}), filter)).unwrap();
    for (k, expected) in rows(&chain["filtered_every_5th"]).iter().enumerate() {
        let ours: Vec<f64> = wide(&averaged.samples[k]).into_iter().step_by(5).collect();
        close_all(names[k], &ours, expected, F32 * largest(expected));
    }
    for (i, row) in rows(&chain["matrix"]).iter().enumerate() {
        let ours: Vec<f64> = averaged.matrix.row(i).iter().copied().collect();
        close_all("T", &ours, row, 1e-15);
    }
    assert_eq!(rank(&averaged.samples) as f64, number(&chain["rank"]));
    assert_eq!(averaged.stretches, recording.stretches);
    assert_eq!(
        averaged.card.filters,
        [
            "high-pass 1 Hz, 1 Hz transition, 331 taps",
            "low-pass 40 Hz, 10 Hz transition, 33 taps",
            "notch 25 Hz, 2 Hz transition, 165 taps",
        ]
    );
    close("longest", averaged.card.longest_filter_s, 3.31, 1e-12);
    assert_eq!(number(&chain["kernel_length"]), 527.0);
    let short: Vec<&String> = averaged
        .warnings
        .iter()
        .filter(|w| w.contains("mirror"))
        .collect();
    assert_eq!(short.len(), 1, "{:?}", averaged.warnings);
    assert!(
        short[0].starts_with("1 unbroken part of the recording is shorter"),
        "{}",
        short[0]
    );

    let slower =
        json!({"high_pass_hz": 1.0, "low_pass_hz": 40.0, "notch_hz": [25.0], "resample_hz": 60.0});
    let resampled = prepare(&recording, &recipe(json!({"reference": "average"}), slower)).unwrap();
    for (k, expected) in rows(&chain["resampled_every_4th"]).iter().enumerate() {
        let ours: Vec<f64> = wide(&resampled.samples[k]).into_iter().step_by(4).collect();
        close_all(names[k], &ours, expected, F32 * largest(expected));
    }
    let counts: Vec<f64> = resampled.stretches.iter().map(|s| s.count as f64).collect();
    assert_eq!(counts, numbers(&chain["resampled_counts"]));
    for (now, before) in resampled.stretches.iter().zip(&recording.stretches) {
        assert_eq!(now.onset_s, before.onset_s);
    }
    close("rate", resampled.rate_hz, 60.0, 1e-12);
}

/// Numerical rank of the covariance: eigenvalues above what f32 storage leaves as noise.
fn rank(samples: &[Vec<f32>]) -> usize {
    let n = samples[0].len();
    let x = nalgebra::DMatrix::from_fn(samples.len(), n, |i, j| f64::from(samples[i][j]));
    let values = (&x * x.transpose()).symmetric_eigenvalues();
    values
        .iter()
        .filter(|v| **v > values.max() * F32 * F32 * 100.0)
        .count()
}

#[test]
fn nothing_asked_for_changes_nothing() {
    let recording = recording(&["Fz", "Cz", "Pz"], noise(3, 200, 5), &[120, 80], 100.0);
    let prepared = prepare(&recording, &recipe(json!({}), json!({}))).unwrap();
    assert_eq!(prepared.samples, recording.samples);
    assert_eq!(prepared.stretches, recording.stretches);
    assert_eq!(prepared.channels, ["Fz", "Cz", "Pz"]);
    assert_eq!(prepared.unit, "µV");
    assert_eq!(prepared.card.longest_filter_s, 0.0);
    assert!(prepared.card.filters.is_empty() && prepared.warnings.is_empty());
    let same_rate = prepare(
        &recording,
        &recipe(json!({}), json!({"resample_hz": 100.0})),
    )
    .unwrap();
    assert_eq!(same_rate.samples, recording.samples);
}

/// A sine in the pass band stays, one in the stop band goes, and neither crosses a gap.
#[test]
fn filters_pass_stop_and_respect_gaps() {
    let rate = 250.0;
    let wave = |hz: f64| move |i: usize| (std::f64::consts::TAU * hz * i as f64 / rate).sin();
    let (keep, stop) = (wave(10.0), wave(50.0));
    let first: Vec<f32> = (0..2000).map(|i| (keep(i) + stop(i)) as f32).collect();
    // After the gap: zero. What leaks over the gap would be seen.
    let both: Vec<f32> = first
        .iter()
        .copied()
        .chain(std::iter::repeat_n(0.0, 1500))
        .collect();
    let other: Vec<f32> = noise(1, 3500, 3).remove(0);
    let recording = recording(&["Cz", "Pz"], vec![both, other], &[2000, 1500], rate);
    let filter = json!({"high_pass_hz": 1.0, "notch_hz": [50.0]});
    let prepared = prepare(&recording, &recipe(json!({}), filter)).unwrap();
    let x = &prepared.samples[0];
    assert!(
        x[2000..].iter().all(|v| v.abs() < 1e-12),
        "zero stays zero behind the gap"
    );
    // Far from the edges; a Hamming window leaves a ripple of 0.2 %.
    for (i, value) in x.iter().enumerate().take(1100).skip(900) {
        close("10 Hz", f64::from(*value), keep(i), 0.006);
    }
}

#[test]
fn resampling_matches_scipy() {
    let all = reference("prepare");
    let part = &all["resampling"];
    let x = numbers(&part["samples"]);
    for expected in part["results"].as_array().unwrap() {
        let (up, down) = (
            number(&expected["up"]) as usize,
            number(&expected["down"]) as usize,
        );
        let mut out = vec![0.0];
        Resampler::new(up, down).resample(&x, &mut out);
        assert_eq!(out.len() as f64, number(&expected["count"]), "{up}/{down}");
        let step = number(&expected["step"]) as usize;
        let ours: Vec<f64> = out.into_iter().step_by(step).collect();
        close_all(
            &format!("{up}/{down}"),
            &ours,
            &numbers(&expected["values"]),
            1e-9,
        );
    }
    // Away from the edges, mirrored or padded with zeros makes no difference.
    let all = reference("dsp");
    let x = numbers(&all["x"]);
    for (up, down, edge) in [(3, 2, 16), (1, 4, 11), (2, 5, 11)] {
        let expected = numbers(&all["resample_poly"][format!("{up}_{down}")]["first_60"]);
        let mut out = Vec::new();
        Resampler::new(up, down).resample(&x, &mut out);
        close_all("dsp", &out[edge..60], &expected[edge..], 1e-9 * largest(&x));
    }
}

#[test]
fn rates_become_ratios() {
    for (from, to, expected) in [
        (512.0, 250.0, Some((125, 256))),
        (487.5, 250.0, Some((20, 39))),
        (1000.0, 250.0, Some((1, 4))),
        (499.5, 333.0, Some((2, 3))),
        (250.0, 0.01, None),
        (250.0, f64::NAN, None),
    ] {
        assert_eq!(ratio(from, to), expected, "{from} to {to}");
    }
    // No ratio of small terms: the nearest one, and the true new rate is reported.
    let (up, down) = ratio(1000.0, 100.0 * std::f64::consts::PI).unwrap();
    assert!(up <= 4096 && down <= 4096);
    close(
        "π",
        up as f64 / down as f64,
        std::f64::consts::PI / 10.0,
        1e-6,
    );
}

#[test]
fn a_first_look_matches_scipy() {
    let all = reference("prepare");
    let part = &all["channels"];
    let counts: Vec<usize> = numbers(&part["counts"])
        .iter()
        .map(|&c| c as usize)
        .collect();
    let (n, rate) = (counts.iter().sum::<usize>(), number(&part["rate_hz"]));
    let mut random = Lcg(number(&part["seed"]) as u64);
    let expected = part["channels"].as_array().unwrap();
    let samples = expected
        .iter()
        .map(|channel| {
            let (mains, size) = (number(&channel["mains_hz_added"]), number(&channel["size"]));
            (0..n)
                .map(|i| {
                    let t = i as f64 / rate;
                    let offset = if t < 15.0 { 1000.0 } else { -500.0 };
                    (random.normal12() + size * (std::f64::consts::TAU * mains * t).sin() + offset)
                        as f32
                })
                .collect()
        })
        .collect();
    let recording = recording(&["Fz", "EEG Cz-REF", "unknown"], samples, &counts, rate);
    let cards = inspect(&recording, &recipe(json!({}), json!({})));
    for (card, expected) in cards.iter().zip(expected) {
        // The inputs agree to the rounding to f32 of values near 1000 (one sine may differ in its last bit).
        close("sd", card.sd.unwrap(), number(&expected["sd"]), 1e-7);
        close(
            "mains",
            card.mains_db.unwrap(),
            number(&expected["mains_db"]),
            1e-4,
        );
        assert_eq!(card.mains_hz.unwrap(), number(&expected["mains_hz"]));
        assert_eq!(card.state, ChannelState::Used);
    }
    assert_eq!(cards[1].position, Some([0.0, 0.0, 1.0]));
    assert!(cards[0].position.is_some() && cards[2].position.is_none());
}

#[test]
fn a_first_look_finds_what_cannot_be_used() {
    let names = ["Fz", "F3", "F4", "Cz", "C3", "C4", "Pz", "P3"];
    let mut samples = noise(8, 300, 9);
    samples[1] = samples[0].clone();
    samples[2] = (0..300).map(|i| if i < 200 { 0.1 } else { -7.3 }).collect();
    samples[3][250] = f32::NAN;
    samples[4][3] = f32::INFINITY;
    samples[5] = samples[6].clone();
    let recording = recording(&names, samples, &[200, 100], 30.0);
    let choices = json!({"leave_out": ["C4"], "interpolate": ["P3"]});
    let cards = inspect(&recording, &recipe(choices, json!({})));
    let states: Vec<ChannelState> = cards.iter().map(|c| c.state.clone()).collect();
    let unusable = |reason: &str| ChannelState::Unusable(reason.to_owned());
    assert_eq!(
        states,
        [
            ChannelState::Used,
            ChannelState::NeedsALook("the same as Fz".to_owned()),
            unusable("constant"),
            unusable("holds values that are not numbers"),
            unusable("holds values that are not numbers"),
            ChannelState::LeftOut,
            ChannelState::Used,
            ChannelState::Interpolated,
        ]
    );
    assert_eq!(cards[2].sd, Some(0.0));
    assert_eq!(cards[3].sd, None);
    // Half of 30 Hz lies below mains.
    assert!(cards.iter().all(|c| c.mains_db.is_none()));
    let prepared = prepare(
        &recording,
        &recipe(json!({"leave_out": ["C4", "P3"]}), json!({})),
    )
    .unwrap();
    assert_eq!(prepared.channels, ["Fz", "F3", "Pz"]);
    assert_eq!(prepared.warnings.len(), 3, "{:?}", prepared.warnings);
    assert!(prepared.samples.iter().flatten().all(|v| v.is_finite()));
}

#[test]
fn interpolation_uses_the_published_weights() {
    let all = reference("spherical_spline");
    let example = &all["example"];
    let fit = example["fits"]
        .as_array()
        .unwrap()
        .iter()
        .find(|f| number(&f["lambda"]) == 1e-5)
        .unwrap();
    let positions = rows(&example["positions"]);
    let names: Vec<String> = (0..14).map(|i| format!("E{i}")).collect();
    let names: Vec<&str> = names.iter().map(String::as_str).collect();
    let mut recording = recording(&names, noise(14, 50, 4), &[50], 100.0);
    for (channel, p) in recording.channels.iter_mut().zip(&positions) {
        channel.position = Some([p[0], p[1], p[2]]);
    }
    // What the bad channel holds must not matter.
    recording.samples[4] = vec![f32::NAN; 50];
    let prepared = prepare(
        &recording,
        &recipe(json!({"interpolate": ["E4"]}), json!({})),
    )
    .unwrap();
    let mut expected = numbers(&fit["weights_row_for_channel_4"]);
    expected.insert(4, 0.0);
    let row: Vec<f64> = prepared.matrix.row(4).iter().copied().collect();
    close_all("weights", &row, &expected, 1e-8);
    for i in 0..50 {
        let sum: f64 = (0..14)
            .filter(|&k| k != 4)
            .map(|k| expected[k] * f64::from(recording.samples[k][i]))
            .sum();
        close("sample", f64::from(prepared.samples[4][i]), sum, 6.0 * F32);
    }
    // Average reference over all 14, the rebuilt one among them: every column of samples sums to 0.
    let averaged = prepare(
        &recording,
        &recipe(
            json!({"interpolate": ["E4"], "reference": "average"}),
            json!({}),
        ),
    )
    .unwrap();
    for i in 0..50 {
        let sum: f64 = averaged.samples.iter().map(|row| f64::from(row[i])).sum();
        close("sum", sum, 0.0, 14.0 * 6.0 * F32);
    }
    for row in averaged.matrix.row_iter() {
        close("a constant on all channels goes", row.sum(), 0.0, 1e-12);
    }
}

#[test]
fn named_references() {
    let recording = recording(&["Fz", "Cz", "M1", "M2"], noise(4, 60, 6), &[60], 100.0);
    let at = |k: usize, i: usize| f64::from(recording.samples[k][i]);
    // One: it would be zero, so it goes.
    let one = prepare(&recording, &recipe(json!({"reference": ["Cz"]}), json!({}))).unwrap();
    assert_eq!(one.channels, ["Fz", "M1", "M2"]);
    assert_eq!(one.warnings.len(), 1);
    close(
        "Fz − Cz",
        f64::from(one.samples[0][7]),
        at(0, 7) - at(1, 7),
        12.0 * F32,
    );
    // Two, left out of the analysis: they serve all the same.
    let ears = json!({"leave_out": ["M1", "M2"], "reference": ["M1", "M2"]});
    let two = prepare(&recording, &recipe(ears, json!({}))).unwrap();
    assert_eq!(two.channels, ["Fz", "Cz"]);
    assert!(two.warnings.is_empty());
    let expected = at(1, 9) - (at(2, 9) + at(3, 9)) / 2.0;
    close("Cz", f64::from(two.samples[1][9]), expected, 12.0 * F32);
    assert_eq!(
        two.matrix.row(1).iter().copied().collect::<Vec<_>>(),
        [0.0, 1.0, -0.5, -0.5]
    );
    // w_raw = Tᵀw: the same series either way.
    let w = nalgebra::dvector![0.3, -1.1];
    let raw = two.matrix.transpose() * &w;
    let prepared = w[0] * f64::from(two.samples[0][5]) + w[1] * f64::from(two.samples[1][5]);
    let recorded: f64 = (0..4).map(|k| raw[k] * at(k, 5)).sum();
    close("series", prepared, recorded, 24.0 * F32);
}

#[test]
fn what_does_not_fit_is_refused_with_its_numbers() {
    let names = ["Fz", "Cz", "Pz", "X1"];
    let recording = recording(&names, noise(4, 1000, 8), &[1000], 100.0);
    let refused = |channels: Value, filter: Value| {
        prepare(&recording, &recipe(channels, filter)).unwrap_err()
    };
    let none = || json!({});
    for (channels, place) in [
        (json!({"leave_out": ["FZ"]}), "recipe, channels.leave_out"),
        (
            json!({"interpolate": ["O9"]}),
            "recipe, channels.interpolate",
        ),
        (json!({"reference": ["Ear"]}), "recipe, channels.reference"),
    ] {
        let problem = refused(channels, none());
        assert_eq!(problem.kind, Kind::Contrast);
        assert_eq!(problem.place.as_deref(), Some(place));
        assert_eq!(problem.expected.as_deref(), Some("one of Fz, Cz, Pz, X1"));
    }
    let problem = refused(json!({"leave_out": ["Fz", "Cz", "Pz"]}), none());
    assert_eq!(problem.found.as_deref(), Some("1"));
    let problem = refused(
        json!({"leave_out": ["Fz", "Cz"], "reference": ["Pz"]}),
        none(),
    );
    assert_eq!(problem.found.as_deref(), Some("1"));
    let problem = refused(json!({"interpolate": ["X1"]}), none());
    assert!(problem.what.contains("position is not known"), "{problem}");
    let problem = refused(json!({"interpolate": ["Fz"]}), none());
    assert!(
        problem.what.starts_with("too few electrode positions"),
        "{problem}"
    );
    assert_eq!(
        refused(json!({"interpolate": ["Fz"], "leave_out": ["Fz"]}), none()).kind,
        Kind::Recipe
    );
    assert_eq!(refused(json!({"reference": []}), none()).kind, Kind::Recipe);

    for (filter, place) in [
        (json!({"high_pass_hz": 0.0}), "recipe, filter.high_pass_hz"),
        (json!({"high_pass_hz": -1.0}), "recipe, filter.high_pass_hz"),
        (json!({"high_pass_hz": 50.0}), "recipe, filter.high_pass_hz"),
        (json!({"low_pass_hz": 50.0}), "recipe, filter.low_pass_hz"),
        (json!({"low_pass_hz": 1e300}), "recipe, filter.low_pass_hz"),
        (json!({"notch_hz": [25.0, 49.5]}), "recipe, filter.notch_hz"),
        (json!({"notch_hz": [0.5]}), "recipe, filter.notch_hz"),
        (
            json!({"high_pass_hz": 20.0, "low_pass_hz": 20.0}),
            "recipe, filter",
        ),
        (json!({"resample_hz": 101.0}), "recipe, filter.resample_hz"),
        (json!({"resample_hz": 0.0}), "recipe, filter.resample_hz"),
        (json!({"resample_hz": -5.0}), "recipe, filter.resample_hz"),
        (
            json!({"resample_hz": 8.0, "high_pass_hz": 4.0}),
            "recipe, filter.resample_hz",
        ),
        // 33 s of filter for 10 s of recording; and what would fill any memory
        (json!({"high_pass_hz": 0.1}), "recipe, filter"),
        (json!({"high_pass_hz": 1e-300}), "recipe, filter"),
        (json!({"low_pass_hz": 49.999_999_999_999}), "recipe, filter"),
    ] {
        let problem = refused(none(), filter.clone());
        assert_eq!(problem.kind, Kind::Recipe, "{filter}");
        assert_eq!(problem.place.as_deref(), Some(place), "{filter}");
        assert!(
            problem.expected.is_some() && problem.found.is_some(),
            "{filter}"
        );
    }
    let mut not_a_number = recipe(none(), none());
    not_a_number.filter.high_pass_hz = Some(f64::NAN);
    assert!(prepare(&recording, &not_a_number).is_err());
}

#[test]
fn positions_come_to_the_unit_sphere() {
    let centre = [0.01, -0.02, 0.04];
    let radius = 0.095;
    let names = ["Fpz", "T7", "T8", "Oz", "Cz", "Fz", "Pz", "C3", "C4"];
    let truth: Vec<[f64; 3]> = names
        .iter()
        .map(|n| teasel_core::describe::positions::standard(n).unwrap())
        .collect();
    let metres: Vec<[f64; 3]> = truth
        .iter()
        .map(|p| [0, 1, 2].map(|k| centre[k] + radius * p[k]))
        .collect();
    for (found, expected) in to_unit_sphere(&metres).iter().zip(&truth) {
        close_all("fitted", &found.unwrap(), expected, 1e-9);
    }
    // On the unit sphere already: nothing moves.
    for (found, expected) in to_unit_sphere(&truth).iter().zip(&truth) {
        close_all("kept", &found.unwrap(), expected, 1e-15);
    }
    // Too few for a fit: directions from the origin. And no direction at all.
    let few = to_unit_sphere(&[[0.0, 0.0, 0.1], [0.0; 3], [0.03, 0.04, 0.0]]);
    close_all("few", &few[0].unwrap(), &[0.0, 0.0, 1.0], 1e-15);
    assert_eq!(few[1], None);
    close_all("few", &few[2].unwrap(), &[0.6, 0.8, 0.0], 1e-15);
}

/// The demo as a user meets it: every channel has its place, and the preparation of its own recipe goes through.
#[test]
fn the_night_watch_is_prepared() {
    let demo = teasel_core::demo::night_watch(1);
    let cards = inspect(&demo.recording, &demo.recipe);
    assert_eq!(cards.len(), demo.recording.channels.len());
    for card in &cards {
        assert_eq!(card.state, ChannelState::Used, "{}", card.name);
        assert!(
            card.position.is_some() && card.sd.unwrap() > 0.0,
            "{}",
            card.name
        );
    }
    // Mains is part of its story.
    assert!(
        cards
            .iter()
            .any(|c| c.mains_hz == Some(50.0) && c.mains_db.unwrap() > 10.0)
    );
    let prepared = prepare(&demo.recording, &demo.recipe).unwrap();
    assert_eq!(prepared.channels.len(), prepared.samples.len());
    let count: usize = prepared.stretches.iter().map(|s| s.count).sum();
    assert!(prepared.samples.iter().all(|row| row.len() == count));
}
