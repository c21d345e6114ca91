//! gzip (RFC 1952): one member and several, cut, broken, and packed to deceive.
use super::written::{event, recording};
use super::{read, read_twice, read_with, told};
use flate2::Compression;
use flate2::write::GzEncoder;
use std::io::Write;
use std::time::Instant;
use teasel_core::error::Kind;
use teasel_core::recording::{MemorySource, OpenOptions, Opening, Recording, SideFile, edf, open};

pub(super) fn gz(bytes: &[u8]) -> Vec<u8> {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::default());
    encoder.write_all(bytes).unwrap();
    encoder.finish().unwrap()
}

fn night(seconds: usize) -> Recording {
    let channels = [("A", "µV"), ("B", "µV")];
    let mut night = recording(100.0, &[(100 * seconds, 0.0)], &channels, |c, i| {
        ((i * 37 + c * 11) % 991) as f32
    });
    night.events = vec![event(0.5, 0.0, "buoy")];
    night
}

fn written(recording: &Recording) -> Vec<u8> {
    edf::write(recording, &edf::Identity::default()).unwrap()
}

#[test]
fn what_is_inside_is_read_as_it_is() {
    let before = night(3);
    let bytes = written(&before);
    let (front, back) = bytes.split_at(700);
    for packed in [
        gz(&bytes),
        [gz(front), gz(back)].concat(),
        [gz(&bytes), gz(b"")].concat(),
    ] {
        let after = read_twice("night.edf.gz", &packed);
        assert_eq!(after.samples, before.samples);
        assert_eq!(after.events, before.events);
        assert_eq!(after.format, "EDF+C, packed with gzip");
        assert_eq!(after.name, "night.edf.gz");
    }
}

#[test]
fn questions_come_through() {
    let packed = gz(b"a,b\n1,2\n3,4\n");
    assert_eq!(read("t.csv.gz", &packed).unwrap_err().asks.len(), 2);
    let source = MemorySource::new("t.csv.gz", packed);
    let options = OpenOptions {
        given: told(10.0, "uV"),
        ..OpenOptions::default()
    };
    assert_eq!(
        open(Box::new(source), vec![], options).unwrap().samples[1],
        [2.0, 4.0]
    );
}

#[test]
fn a_file_too_large_to_keep_is_unpacked_twice() {
    // 70 MB of samples, of which the packing leaves a part.
    let count = 12_000_000;
    let before = recording(
        1000.0,
        &[(count, 0.0)],
        &[("A", "µV"), ("B", "µV"), ("C", "µV")],
        |c, i| {
            if i % 16 < 12 {
                c as f32
            } else {
                (i * (c + 3) % 30_011) as f32
            }
        },
    );
    let packed = gz(&written(&before));
    assert!(packed.len() > 4 << 20, "{}", packed.len());
    let source = MemorySource::new("long.edf.gz", packed);
    let mut opening = Opening::begin(Box::new(source), vec![], OpenOptions::default()).unwrap();
    let mut steps = 0;
    let mut last = 0;
    while !opening.finished() {
        let (done, of) = opening.step().unwrap();
        assert!(done >= last && done <= of);
        (last, steps) = (done, steps + 1);
    }
    assert!(steps > 10);
    assert_eq!(opening.finish().unwrap().samples, before.samples);
}

#[test]
fn cut_at_every_length_and_opened_as_far_as_it_goes() {
    let packed = gz(&written(&night(3)));
    let mut opened = 0;
    for length in 0..packed.len() {
        let problem = read("a.gz", &packed[..length]).unwrap_err();
        assert!(
            matches!(problem.kind, Kind::Empty | Kind::Unknown | Kind::Damaged),
            "{length}: {problem}"
        );
        if let Ok(part) = read_with("a.gz", &packed[..length], vec![], true) {
            assert!(part.sample_count() <= 300);
            assert!(
                part.warnings
                    .iter()
                    .any(|w| w.contains("before the damage")),
                "{:?}",
                part.warnings
            );
            opened += 1;
        }
    }
    assert!(opened > 10);
}

#[test]
fn sums_that_do_not_fit_are_damage() {
    let good = gz(&written(&night(2)));
    for at in [good.len() - 1, good.len() - 6, good.len() / 2] {
        let mut bad = good.clone();
        bad[at] ^= 0x10;
        assert_eq!(
            read("a.gz", &bad).unwrap_err().kind,
            Kind::Damaged,
            "byte {at}"
        );
    }
}

#[test]
fn a_bomb_is_refused_and_costs_little() {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::best());
    let mebibyte = vec![b'0'; 1 << 20];
    for _ in 0..2000 {
        encoder.write_all(&mebibyte).unwrap();
    }
    let packed = encoder.finish().unwrap();
    assert!(packed.len() < 3 << 20);
    let start = Instant::now();
    let problem = read("a.csv.gz", &packed).unwrap_err();
    assert_eq!(problem.kind, Kind::TooLarge, "{problem}");
    assert!(start.elapsed().as_secs() < 20);
    assert_eq!(
        read("a", &gz(&packed)).unwrap_err().kind,
        Kind::Unsupported,
        "packed twice"
    );
}

#[test]
fn packed_side_files() {
    let table = gz(b"onset\tduration\ttrial_type\n0.25\t0\tswell\n");
    let side = SideFile {
        name: "sub-1_events.tsv.gz".to_owned(),
        bytes: table.clone(),
    };
    let bytes = written(&night(2));
    let recording = read_with("sub-1_eeg.edf", &bytes, vec![side], false).unwrap();
    assert_eq!(recording.events[0].label, "swell");
    assert_eq!(recording.side_files, ["sub-1_events.tsv"]);
    let cut = SideFile {
        name: "sub-1_events.tsv.gz".to_owned(),
        bytes: table[..20].to_vec(),
    };
    let problem = read_with("sub-1_eeg.edf", &bytes, vec![cut], false).unwrap_err();
    assert_eq!(
        (problem.kind, problem.file.as_deref()),
        (Kind::Damaged, Some("sub-1_events.tsv.gz"))
    );
}
