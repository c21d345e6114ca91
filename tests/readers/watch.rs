//! The night watch demo: reproducible, as described, and the same after a file.
use super::read_twice;
use std::time::Instant;
use teasel_core::demo::{Pattern, WATCH_SEED, night_watch};
use teasel_core::recording::edf;
use teasel_tests::largest;

fn correlation(x: &[f64], y: &[f32]) -> f64 {
    let mean_x = x.iter().sum::<f64>() / x.len() as f64;
    let mean_y = y.iter().map(|&y| f64::from(y)).sum::<f64>() / y.len() as f64;
    let (mut xy, mut xx, mut yy) = (0.0, 0.0, 0.0);
    for (x, y) in x.iter().zip(y) {
        let (x, y) = (x - mean_x, f64::from(*y) - mean_y);
        xy += x * y;
        xx += x * x;
        yy += y * y;
    }
    xy / (xx * yy).sqrt()
}

#[test]
fn written_as_edf_and_read_again_it_is_the_same() {
    let demo = night_watch(3).recording;
    let bytes = edf::write(&demo, &edf::Identity::default()).unwrap();
    assert!(
        (3_800_000..4_000_000).contains(&bytes.len()),
        "{} bytes",
        bytes.len()
    );
    let read = read_twice("night-watch.edf", &bytes);
    assert_eq!(read.samples, demo.samples);
    assert_eq!(read.events, demo.events);
    assert_eq!(read.channels, demo.channels);
    assert_eq!(read.stretches, demo.stretches);
    assert_eq!(read.rate_hz, demo.rate_hz);
    assert!(read.warnings.is_empty());
}

#[test]
fn the_same_seed_gives_the_same_recording() {
    let (a, b, c) = (night_watch(1), night_watch(1), night_watch(2));
    assert_eq!(a.recording.samples, b.recording.samples);
    assert_eq!(a.recording.events, b.recording.events);
    assert_eq!(a.truth, b.truth);
    assert_ne!(a.recording.samples, c.recording.samples);
    assert_ne!(a.recording.events, c.recording.events);
}

/// The page makes the demo in WebAssembly and the terminal in machine code: the same samples came out of both when this sum
/// (FNV-1a over tenths of µV) was written down.
#[test]
fn the_demo_is_the_same_on_every_machine() {
    let samples = night_watch(WATCH_SEED).recording.samples;
    let tenths = samples.iter().flatten().map(|x| (x * 10.0).round() as i16);
    let sum = tenths
        .flat_map(i16::to_le_bytes)
        .fold(0xcbf2_9ce4_8422_2325_u64, |sum, byte| {
            (sum ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3)
        });
    assert_eq!(sum, 14_441_446_774_440_887_352);
}

#[test]
fn what_is_said_of_it_holds() {
    for seed in [1, 2, 77] {
        let demo = night_watch(seed);
        let recording = &demo.recording;
        assert_eq!(
            (
                recording.channels.len(),
                recording.rate_hz,
                recording.span_s()
            ),
            (32, 250.0, 240.0)
        );
        let count = |label: &str| recording.events.iter().filter(|e| e.label == label).count();
        assert_eq!((count("buoy"), count("swell")), (42, 20));
        let gaps = recording
            .events
            .windows(2)
            .map(|e| e[1].onset_s - e[0].onset_s);
        assert!(gaps.fold(f64::MAX, f64::min) >= 2.2);
        assert!(recording.events[0].onset_s >= 1.0 && recording.events[61].onset_s <= 239.0);

        let name_of_largest = |p: &Pattern| {
            let most = largest(&p.pattern);
            let at = p.pattern.iter().position(|w| w.abs() == most).unwrap();
            demo.truth.channels[at].clone()
        };
        assert_eq!(name_of_largest(&demo.truth.stronger), "CP1");
        assert_eq!(name_of_largest(&demo.truth.weaker), "Oz");
        let nuisance: Vec<String> = demo.truth.nuisance.iter().map(name_of_largest).collect();
        assert!(["Fp1", "Fp2"].contains(&nuisance[0].as_str()));
        assert_eq!(nuisance[1..], ["T7", "T8", "P8"]);

        let on_grid =
            |x: &f32| (f64::from(*x) * 10.0 - (f64::from(*x) * 10.0).round()).abs() < 1e-3;
        assert!(recording.samples.iter().flatten().all(on_grid));
    }
}

#[test]
fn filters_of_the_truth_read_the_sources() {
    let demo = night_watch(2);
    for source in [&demo.truth.stronger, &demo.truth.weaker] {
        let gain: f64 = source
            .filter
            .iter()
            .zip(&source.pattern)
            .map(|(w, a)| w * a)
            .sum();
        assert!((gain - 1.0).abs() < 1e-9, "unit gain, not {gain}");
        let output: Vec<f64> = (0..60_000)
            .map(|i| {
                demo.recording
                    .samples
                    .iter()
                    .zip(&source.filter)
                    .map(|(x, w)| f64::from(x[i]) * w)
                    .sum()
            })
            .collect();
        let best_channel = demo
            .recording
            .samples
            .iter()
            .map(|x| {
                correlation(
                    &x.iter().map(|&x| f64::from(x)).collect::<Vec<_>>(),
                    &source.course,
                )
                .abs()
            })
            .fold(0.0, f64::max);
        let filtered = correlation(&output, &source.course);
        assert!(
            filtered > best_channel + 0.1 && filtered > 0.8,
            "{}: {filtered} against {best_channel}",
            source.name
        );
    }
}

#[test]
fn the_planted_rhythms_change_after_a_buoy_and_only_then() {
    let demo = night_watch(2);
    let power = |source: &Pattern, label: &str, from_s: f64, to_s: f64| {
        let events = demo.recording.events.iter().filter(|e| e.label == label);
        let logs: Vec<f64> = events
            .map(|e| {
                let first = ((e.onset_s + from_s) * 250.0) as usize;
                let window = &source.course[first..first + ((to_s - from_s) * 250.0) as usize];
                (window.iter().map(|x| f64::from(x * x)).sum::<f64>() / window.len() as f64).ln()
            })
            .collect();
        (logs.iter().sum::<f64>() / logs.len() as f64).exp()
    };
    let ratio = |source: &Pattern, label: &str| {
        power(source, label, 0.2, 1.0) / power(source, label, -1.0, -0.2)
    };
    assert!(ratio(&demo.truth.stronger, "buoy") > 2.2);
    assert!(ratio(&demo.truth.weaker, "buoy") < 0.45);
    for source in [&demo.truth.stronger, &demo.truth.weaker] {
        let swell = ratio(source, "swell");
        assert!(
            (0.6..1.7).contains(&swell),
            "{} after swell: {swell}",
            source.name
        );
    }
}

#[test]
fn truth_and_recipe_are_json() {
    let demo = night_watch(1);
    let text = serde_json::to_string(&demo.truth).unwrap();
    let back: teasel_core::demo::Truth = serde_json::from_str(&text).unwrap();
    assert_eq!(back.stronger.pattern, demo.truth.stronger.pattern);
    assert_eq!(back.weaker.filter, demo.truth.weaker.filter);
    assert!(back.stronger.course.is_empty() && text.len() < 20_000);
    let recipe = serde_json::to_string(&demo.recipe).unwrap();
    let back: teasel_core::recipe::Recipe = serde_json::from_str(&recipe).unwrap();
    assert_eq!(back, demo.recipe);
}

#[test]
fn it_is_made_quickly() {
    let start = Instant::now();
    night_watch(1);
    let seconds = start.elapsed().as_secs_f64();
    assert!(
        seconds < 3.0,
        "{seconds} s, where a tenth of a second is usual"
    );
}
