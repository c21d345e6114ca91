//! What the targets check: bytes in, an answer out, no panic, no runaway memory; and a recording that comes out holds together.
use flate2::Compression;
use flate2::write::GzEncoder;
use std::io::Write;
use teasel_core::error::Kind;
use teasel_core::recipe::{Axes, Given};
use teasel_core::recording::{
    Channel, Event, MemorySource, OpenOptions, Recording, SideFile, Stretch, edf, open,
};

/// What the general formats do not carry.
pub fn given(axes: Option<Axes>) -> Given {
    Given {
        rate_hz: Some(100.0),
        unit: Some("uV".to_owned()),
        axes,
        ..Given::default()
    }
}

/// Opens bytes as a recording, strictly and with salvage; the first bytes are made those of the format.
pub fn recording(mark: &[u8], bytes: &[u8]) {
    let mut bytes = bytes.to_vec();
    if bytes.len() < mark.len() {
        bytes.resize(mark.len(), 0);
    }
    bytes[..mark.len()].copy_from_slice(mark);
    for (salvage, axes) in [
        (false, None),
        (true, None),
        (true, Some(Axes::ChannelsSamples)),
    ] {
        let source = MemorySource::new("fuzz", bytes.clone());
        let options = OpenOptions {
            salvage,
            given: given(axes),
        };
        answer(open(Box::new(source), Vec::new(), options));
    }
}

/// Opens a small recording with a side file of this name and content.
pub fn side(recording: &[u8], name: &str, bytes: &[u8]) {
    let source = MemorySource::new("sub-01_eeg.edf", recording.to_vec());
    let side = SideFile {
        name: name.to_owned(),
        bytes: bytes.to_vec(),
    };
    answer(open(Box::new(source), vec![side], OpenOptions::default()));
}

fn answer(opened: teasel_core::error::Result<Recording>) {
    match opened {
        Ok(recording) => whole(&recording),
        Err(problem) => {
            assert!(!problem.what.is_empty() && !problem.advice.is_empty());
            assert_eq!(problem.kind == Kind::NeedsAnswer, !problem.asks.is_empty());
        }
    }
}

/// As many samples in every channel, all of them in one stretch or another, and times that are numbers.
fn whole(recording: &Recording) {
    let count = recording.sample_count();
    assert!(recording.rate_hz > 0.0 && recording.rate_hz.is_finite());
    assert_eq!(recording.samples.len(), recording.channels.len());
    assert!(recording.samples.iter().all(|s| s.len() == count));
    let covered: usize = recording.stretches.iter().map(|s| s.count).sum();
    assert_eq!(covered, count);
    assert!(recording.events.iter().all(|e| e.onset_s.is_finite()));
    assert!(recording.events.iter().all(|e| e.duration_s >= 0.0));
}

/// An EDF+ file of two channels and a second.
pub fn small() -> Vec<u8> {
    let recording = seed(2, 10);
    edf::write(&recording, &edf::Identity::default()).unwrap_or_default()
}

/// A recording that every format can hold: counting channels, two events.
pub fn seed(channels: usize, samples: usize) -> Recording {
    let event = |onset_s: f64, label: &str| Event {
        onset_s,
        duration_s: 0.0,
        label: label.to_owned(),
    };
    Recording {
        rate_hz: 10.0,
        channels: (0..channels)
            .map(|c| Channel {
                name: format!("C{c}"),
                unit: "µV".to_owned(),
                position: None,
            })
            .collect(),
        samples: (0..channels)
            .map(|c| (0..samples).map(|i| ((i * 7 + c) % 50) as f32).collect())
            .collect(),
        stretches: vec![Stretch {
            first: 0,
            count: samples,
            onset_s: 0.0,
        }],
        events: vec![event(0.1, "buoy"), event(0.5, "swell")],
        ..Recording::default()
    }
}

/// Bytes packed with gzip.
pub fn packed(bytes: &[u8]) -> Vec<u8> {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::fast());
    // Writing into a vector cannot fail.
    let _ = encoder.write_all(bytes);
    encoder.finish().unwrap_or_default()
}
