//! A recording larger than the memory gives what the same recording gives in memory.
//!
//! Source of the expected values: the path through memory itself, which `contrast`, `prepare` and `describe` check against outside truth.
#![allow(clippy::unwrap_used, reason = "a panic is the failure of a test")]
use serde_json::Value;
use teasel_core::analysis::lines::Lines;
use teasel_core::analysis::{Analysis, Stage, fits_large, summary, summary_of_large};
use teasel_core::demo;
use teasel_core::error::Kind;
use teasel_core::recipe::{Contrast, EventWindow, Recipe, Spans};
use teasel_core::recording::{
    Large, MemorySource, OpenOptions, Opened, Opening, Recording, Stretch, edf,
};

/// Less than the demo's samples take.
const LITTLE: u64 = 4 << 20;

fn bytes(recording: &Recording) -> Vec<u8> {
    edf::write(recording, &edf::Identity::default()).unwrap()
}

fn opening(bytes: Vec<u8>, memory: u64) -> Opening {
    let source = MemorySource::new("watch.edf", bytes);
    Opening::begin_streaming(Box::new(source), vec![], OpenOptions::default(), memory).unwrap()
}

fn large(recording: &Recording) -> Large {
    match opening(bytes(recording), LITTLE).opened().unwrap() {
        Opened::Large(large) => *large,
        Opened::Whole(_) => panic!("it fits into {LITTLE} bytes"),
    }
}

fn whole(recording: &Recording) -> Recording {
    match opening(bytes(recording), 1 << 30).opened().unwrap() {
        Opened::Whole(recording) => *recording,
        Opened::Large(_) => panic!("it does not fit into a gigabyte"),
    }
}

/// The demo with two gaps, of which one lies a fraction of a sample off the grid of the clock.
fn broken() -> Recording {
    let mut recording = demo::night_watch(demo::WATCH_SEED).recording;
    let all = recording.samples[0].len();
    let (a, b) = (70 * 250, 160 * 250);
    recording.stretches = vec![
        Stretch {
            first: 0,
            count: a,
            onset_s: 0.0,
        },
        Stretch {
            first: a,
            count: b - a,
            onset_s: 75.0,
        },
        Stretch {
            first: b,
            count: all - b,
            onset_s: 168.001,
        },
    ];
    for event in &mut recording.events {
        event.onset_s += match event.onset_s {
            t if t < 70.0 => 0.0,
            t if t < 160.0 => 5.0,
            _ => 8.001,
        };
    }
    recording
}

fn recipe() -> Recipe {
    let mut recipe = demo::night_watch(demo::WATCH_SEED).recipe;
    recipe.filter.high_pass_hz = Some(1.0);
    recipe.filter.low_pass_hz = Some(40.0);
    recipe.filter.notch_hz = vec![50.0];
    recipe.filter.resample_hz = Some(100.0);
    recipe.evidence.permutations = 30;
    recipe.evidence.bootstrap = 30;
    recipe
}

/// Fails unless two JSON values agree to `tolerance` of the larger number (or of 1e-3, for what is near zero).
fn alike(path: &str, a: &Value, b: &Value, tolerance: f64) {
    match (a, b) {
        (Value::Number(x), Value::Number(y)) => {
            let (x, y) = (x.as_f64().unwrap(), y.as_f64().unwrap());
            let most = tolerance * x.abs().max(y.abs()).max(1e-3);
            assert!((x - y).abs() <= most, "{path}: {x} against {y}");
        }
        (Value::Array(x), Value::Array(y)) => {
            assert_eq!(x.len(), y.len(), "{path}: lengths differ");
            for (i, (x, y)) in x.iter().zip(y).enumerate() {
                alike(&format!("{path}[{i}]"), x, y, tolerance);
            }
        }
        (Value::Object(x), Value::Object(y)) => {
            assert!(x.keys().eq(y.keys()), "{path}: keys differ");
            for (key, value) in x {
                alike(&format!("{path}.{key}"), value, &y[key], tolerance);
            }
        }
        _ => assert_eq!(a, b, "{path}"),
    }
}

/// The parts of a sheet that are computed from windows.
fn parts(analysis: &Analysis) -> Value {
    let mut sheet = serde_json::to_value(analysis.sheet()).unwrap();
    let object = sheet.as_object_mut().unwrap();
    // What was read is said for one only, and channels are looked at in the middle of the large one.
    object.remove("channels");
    object.remove("warnings");
    // What is asked of all samples is not asked of a large recording.
    object.remove("quality");
    object.remove("principal");
    let preparation = object["preparation"].as_object_mut().unwrap();
    preparation.remove("ranks");
    let recording = object["recording"].as_object_mut().unwrap();
    recording.remove("warnings");
    sheet
}

fn same_both_ways(recording: &Recording, recipe: &Recipe) {
    let mut near = Analysis::new(whole(recording), recipe.clone()).unwrap();
    near.run(|_| {}).unwrap();
    let mut far = Analysis::of_large(large(recording), recipe.clone()).unwrap();
    let mut read = 0;
    far.run(|progress| {
        if progress.stage == Stage::Reading {
            read = progress.of;
        }
    })
    .unwrap();
    let all = recording.sample_count() as u64;
    assert!(read > 0 && read < all, "{read} of {all} samples were read");
    // Filters run on other blocks, so sums differ in the last bits of f64; samples are rounded to f32 afterwards, and a filter of 31
    // dimensions multiplies what is left by the condition of the pooled covariance.
    alike("sheet", &parts(&near), &parts(&far), 1e-6);
}

#[test]
fn windows_around_events_give_the_same_sheet() {
    same_both_ways(&demo::night_watch(demo::WATCH_SEED).recording, &recipe());
}

#[test]
fn gaps_and_resampling_give_the_same_sheet() {
    same_both_ways(&broken(), &recipe());
}

#[test]
fn windows_of_two_events_and_an_average_reference_give_the_same_sheet() {
    let mut recipe = recipe();
    recipe.contrast = Contrast::Windows {
        signal: EventWindow::new("buoy", 0.2, 1.0),
        reference: EventWindow::new("swell", 0.2, 1.0),
    };
    recipe.channels.reference =
        teasel_core::recipe::Reference::Word(teasel_core::recipe::ReferenceWord::Average);
    recipe.not_used = vec![[20.0, 30.0]];
    same_both_ways(&demo::night_watch(demo::WATCH_SEED).recording, &recipe);
}

#[test]
fn a_changed_question_reads_what_it_needs() {
    let recording = demo::night_watch(demo::WATCH_SEED).recording;
    let mut far = Analysis::of_large(large(&recording), recipe()).unwrap();
    far.run(|_| {}).unwrap();
    let mut changed = recipe();
    changed.contrast = Contrast::Windows {
        signal: EventWindow::new("swell", 0.2, 1.0),
        reference: EventWindow::new("swell", -1.0, -0.2),
    };
    changed.channels.leave_out = vec!["Fp1".to_owned()];
    far.set_recipe(changed.clone()).unwrap();
    far.run(|_| {}).unwrap();
    let mut near = Analysis::new(whole(&recording), changed).unwrap();
    near.run(|_| {}).unwrap();
    alike("sheet", &parts(&near), &parts(&far), 1e-6);
}

#[test]
fn a_window_moved_a_little_reads_nothing_again() {
    let recording = demo::night_watch(demo::WATCH_SEED).recording;
    let mut far = Analysis::of_large(large(&recording), recipe()).unwrap();
    far.run(|_| {}).unwrap();
    let mut changed = recipe();
    changed.keep = teasel_core::recipe::Keep::Number(8);
    far.set_recipe(changed).unwrap();
    let mut stages = Vec::new();
    far.run(|progress| stages.push(progress.stage)).unwrap();
    assert!(!stages.contains(&Stage::Reading));
}

#[test]
fn one_pass_tells_what_all_samples_tell() {
    for recording in [demo::night_watch(demo::WATCH_SEED).recording, broken()] {
        let (near, far) = (whole(&recording), large(&recording));
        let (told, known) = (summary(&near), summary_of_large(&far));
        assert_eq!(told.recording.stretches, known.recording.stretches);
        assert_eq!(told.recording.events, known.recording.events);
        assert_eq!(told.recording.duration_s, known.recording.duration_s);
        let sds = |s: &teasel_core::analysis::Summary| -> Vec<f64> {
            s.channels.iter().map(|c| c.sd.unwrap()).collect()
        };
        // Sums of 60,000 numbers in another order: n·ε of the mean square, which the first value of a stretch keeps small.
        for (a, b) in sds(&told).iter().zip(sds(&known)) {
            assert!((a - b).abs() <= 1e-9 * a, "{a} against {b}");
        }
        let (a, b) = (&told.recording.envelope, &known.recording.envelope);
        assert_eq!(a.len(), b.len());
        for (a, b) in a.iter().zip(b) {
            assert!((a - b).abs() <= 1e-6 * a, "{a} against {b}");
        }
    }
}

#[test]
fn lines_of_a_large_recording_are_those_of_the_whole() {
    let recording = broken();
    let (near, mut far) = (whole(&recording), large(&recording));
    let mut lines = Lines::default();
    for (size, first, count) in [
        (1, 17_400, 300),
        (16, 1000, 200),
        (64, 0, 900),
        (256, 3, 100),
    ] {
        let expected = lines.of_recorded(&near, &[0, 7], size, first, count);
        let found = Lines::of_large(&mut far, &[0, 7], size, first, count).unwrap();
        assert_eq!(expected.len(), found.len());
        let same = |(a, b): (&f32, &f32)| a == b || (a.is_nan() && b.is_nan());
        assert!(expected.iter().zip(&found).all(same), "bins of {size}");
    }
}

#[test]
fn a_question_about_everything_is_refused_with_the_need() {
    let far = large(&demo::night_watch(demo::WATCH_SEED).recording);
    let mut all = recipe();
    all.contrast = Contrast::Band {
        centre_hz: 10.0,
        half_width_hz: 2.0,
        reference: Default::default(),
        within: None,
        piece_s: None,
    };
    let problem = fits_large(&far, &all).unwrap_err();
    assert_eq!(problem.kind, Kind::TooLarge);
    // A few marked spans fit.
    all.contrast = Contrast::Spans {
        signal: Spans::Times(vec![[10.0, 20.0]]),
        reference: Spans::Times(vec![[30.0, 40.0]]),
        piece_s: None,
    };
    assert!(fits_large(&far, &all).is_ok());
}
