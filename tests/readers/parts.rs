//! Several files of one recording: their order, the time between them, and what is refused.
use super::written::{event, recording};
use teasel_core::error::{Kind, Result};
use teasel_core::recording::{
    MEMORY_BYTES, MemorySource, OpenOptions, Opening, Recording, Source, Stretch, edf,
};

const CHANNELS: [(&str, &str); 2] = [("A", "µV"), ("B", "µV")];

/// A part of 200 samples at 100 Hz that counts on from `first`, with its start in the header.
fn part(first: usize, start: &str) -> Vec<u8> {
    let mut part = recording(100.0, &[(200, 0.0)], &CHANNELS, |c, i| {
        (c * 1000 + first + i) as f32
    });
    part.events = vec![event(0.5, 0.0, &format!("from {first}"))];
    let mut bytes = edf::write(&part, &edf::Identity::default()).unwrap();
    bytes[168..184].copy_from_slice(start.as_bytes());
    bytes
}

fn join(files: &[(&str, Vec<u8>)]) -> Result<Recording> {
    let sources = files
        .iter()
        .map(|(name, bytes)| Box::new(MemorySource::new(*name, bytes.clone())) as Box<dyn Source>);
    let mut opening = Opening::begin_joined(
        sources.collect(),
        vec![],
        OpenOptions::default(),
        MEMORY_BYTES,
    )?;
    while !opening.finished() {
        let (done, of) = opening.step()?;
        assert!(done <= of);
    }
    opening.finish()
}

#[test]
fn names_give_the_order_and_start_times_the_gaps() {
    let joined = join(&[
        ("night-10.edf", part(400, "01.01.2610.00.30")),
        ("night-2.edf", part(200, "01.01.2610.00.02")),
        ("night-1.edf", part(0, "01.01.2610.00.00")),
    ])
    .unwrap();
    assert_eq!(joined.name, "night-1.edf");
    let wanted: Vec<f32> = (0..600).map(|i| i as f32).collect();
    assert_eq!(joined.samples[0], wanted);
    let stretch = |first, count, onset_s| Stretch {
        first,
        count,
        onset_s,
    };
    assert_eq!(
        joined.stretches,
        [stretch(0, 400, 0.0), stretch(400, 200, 30.0)]
    );
    let onsets: Vec<f64> = joined.events.iter().map(|e| e.onset_s).collect();
    assert_eq!(onsets, [0.5, 2.5, 30.5]);
    assert!(
        joined.warnings[0].contains("night-2.edf follows without a gap"),
        "{:?}",
        joined.warnings
    );
}

#[test]
fn midnight_leap_days_and_the_turn_of_a_century() {
    for [one, two] in [
        ["31.12.9923.59.58", "01.01.0000.00.00"],
        ["28.02.2423.59.58", "29.02.2400.00.00"],
        ["28.02.2323.59.58", "01.03.2300.00.00"],
    ] {
        let joined = join(&[("1", part(0, one)), ("2", part(200, two))]).unwrap();
        assert_eq!(joined.stretches.len(), 1, "{one} {two}");
    }
}

#[test]
fn where_no_time_is_known_no_window_crosses_the_edge() {
    for [one, two] in [
        ["01.01.8500.00.00", "01.01.8500.00.00"],
        ["01.01.2610.00.00", "01.01.2610.00.01"],
        ["01.01.2610.00.00", "xx.xx.xx00.00.00"],
    ] {
        let joined = join(&[("1", part(0, one)), ("2", part(200, two))]).unwrap();
        let onsets: Vec<f64> = joined.stretches.iter().map(|s| s.onset_s).collect();
        assert_eq!(onsets, [0.0, 2.0], "{one} {two}");
        assert!(joined.warnings[0].contains("How much time lies before 2 is not known"));
    }
}

#[test]
fn a_file_that_is_no_part_is_named() {
    let start = "01.01.8500.00.00";
    let other = |rate_hz: f64, channels: &[(&str, &str)]| {
        let other = recording(rate_hz, &[(200, 0.0)], channels, |_, i| i as f32);
        edf::write(&other, &edf::Identity::default()).unwrap()
    };
    for (bytes, place) in [
        (other(50.0, &CHANNELS), "sampling rate"),
        (other(100.0, &CHANNELS[..1]), "channels"),
        (other(100.0, &[("A", "µV"), ("C", "µV")]), "channel 2"),
        (other(100.0, &[("A", "fT"), ("B", "µV")]), "channel 1"),
    ] {
        let problem = join(&[("one.edf", part(0, start)), ("two.edf", bytes)]).unwrap_err();
        assert_eq!(problem.kind, Kind::Unsupported, "{problem}");
        assert_eq!(problem.file.as_deref(), Some("two.edf"));
        assert_eq!(problem.place.as_deref(), Some(place));
    }
    let problem =
        join(&[("1", part(0, start)), ("2", part(0, start)[..600].to_vec())]).unwrap_err();
    assert_eq!(
        (problem.kind, problem.file.as_deref()),
        (Kind::Damaged, Some("2"))
    );
}
