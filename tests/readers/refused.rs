//! Files that must be refused, each with its kind, place, both numbers and what to do.
use super::plan::{Plan, signal, text};
use super::{read, read_with};
use teasel_core::error::{Kind, Problem};
use teasel_core::recording::{MemorySource, OpenOptions, Opening, Source};

fn plan() -> Plan {
    let lists = ["+0\x14\x14\0", "+1\x14\x14\0", "+2\x14\x14\0"];
    Plan::new(vec![signal("Fz", 10), signal("Cz", 10), text(10)], 3).with_lists("EDF+C", &lists)
}

fn refused(bytes: &[u8]) -> Problem {
    let problem = read("a.edf", bytes).expect_err("this file must be refused");
    assert_eq!(problem.file.as_deref(), Some("a.edf"));
    assert!(!problem.advice.is_empty());
    assert!(
        problem.expected.is_some() && problem.found.is_some(),
        "{problem}"
    );
    let line = problem.to_string();
    assert!(
        !line.contains('\n') && line.starts_with("a.edf: "),
        "{line}"
    );
    problem
}

#[test]
fn every_field_of_the_header() {
    // Field, byte, width, what is written there, what the place must say, what must be found.
    let one = |field: usize| 256 + 3 * field + 8;
    for (byte, width, written, place, found) in [
        (
            184,
            8,
            "1025",
            "length of the header, byte 184",
            "1025 bytes",
        ),
        (184, 8, "what", "length of the header, byte 184", "\"what\""),
        (192, 5, "EDF+E", "reserved field, byte 192", "\"EDF+E\""),
        (236, 8, "-2", "number of records, byte 236", "-2"),
        (236, 8, "0", "number of records, byte 236", "0"),
        (236, 8, "3.5", "number of records, byte 236", "\"3.5\""),
        (236, 8, "", "number of records, byte 236", "\"\""),
        (244, 8, "0", "duration of a record, byte 244", "0 s"),
        (244, 8, "-1", "duration of a record, byte 244", "-1 s"),
        (244, 8, "inf", "duration of a record, byte 244", "\"inf\""),
        (244, 8, "nan", "duration of a record, byte 244", "\"nan\""),
        (
            244,
            8,
            "1e999",
            "duration of a record, byte 244",
            "\"1e999\"",
        ),
        (252, 4, "0", "number of signals, byte 252", "0"),
        (252, 4, "-3", "number of signals, byte 252", "-3"),
        (
            252,
            4,
            "9999",
            "length of the header, byte 184",
            "1024 bytes",
        ),
        (
            one(104),
            8,
            "x",
            "channel 2 \"Cz\", physical minimum",
            "\"x\"",
        ),
        (
            one(112),
            8,
            "1e400",
            "channel 2 \"Cz\", physical maximum",
            "\"1e400\"",
        ),
        (
            one(120),
            8,
            "1.5",
            "channel 2 \"Cz\", digital minimum",
            "\"1.5\"",
        ),
        (one(128), 8, "", "channel 2 \"Cz\", digital maximum", "\"\""),
        (
            one(216),
            8,
            "-5",
            "channel 2 \"Cz\", samples a record",
            "-5",
        ),
        (
            one(216),
            8,
            "ten",
            "channel 2 \"Cz\", samples a record",
            "\"ten\"",
        ),
    ] {
        let mut bytes = plan().bytes();
        bytes[byte..byte + width].copy_from_slice(format!("{written:width$}").as_bytes());
        let problem = refused(&bytes);
        assert_eq!(problem.kind, Kind::Damaged, "{problem}");
        let at = problem.place.clone().unwrap_or_default();
        assert!(at.contains(place), "{problem}");
        assert_eq!(problem.found.as_deref(), Some(found), "{problem}");
    }
}

#[test]
fn bytes_that_are_no_text() {
    let mut bytes = plan().bytes();
    bytes[184..192].fill(0xff);
    let problem = refused(&bytes);
    assert_eq!(
        problem.found.as_deref(),
        Some("\"\\xff\\xff\\xff\\xff\\xff\\xff\\xff\\xff\"")
    );
    let mut bytes = plan().bytes();
    bytes[8..168].fill(0xff);
    assert!(
        read("a.edf", &bytes).is_ok(),
        "whoever is recorded, the signals can be read"
    );
}

#[test]
fn a_cut_within_a_record() {
    let bytes = plan().bytes();
    // Record 3 begins at 1024 + 2·60; 31 bytes of it are left: 20 of Fz and 11 of Cz.
    let problem = refused(&bytes[..1024 + 120 + 31]);
    assert_eq!(problem.kind, Kind::Damaged);
    assert_eq!(
        problem.place.as_deref(),
        Some("record 3, channel \"Cz\", byte 1175")
    );
    assert_eq!(problem.expected.as_deref(), Some("60 bytes of this record"));
    assert_eq!(problem.found.as_deref(), Some("31 bytes"));
    assert_eq!(
        problem.salvage.map(|s| (s.records, s.seconds)),
        Some((2, 2.0))
    );

    let recording = read_with("a.edf", &bytes[..1175], vec![], true).unwrap();
    assert_eq!(recording.sample_count(), 20);
    assert!(
        recording.warnings[0].contains("Only the 2 whole records"),
        "{:?}",
        recording.warnings
    );
}

#[test]
fn a_cut_between_records_and_before_the_first() {
    let bytes = plan().bytes();
    let problem = refused(&bytes[..1024 + 120]);
    assert_eq!(problem.place.as_deref(), Some("record 3, byte 1144"));
    assert_eq!(problem.expected.as_deref(), Some("3 records"));
    assert_eq!(problem.found.as_deref(), Some("2 records"));
    let problem = refused(&bytes[..1024 + 59]);
    assert_eq!((problem.kind, problem.salvage), (Kind::Damaged, None));
    let problem = read_with("a.edf", &bytes[..1024 + 59], vec![], true).unwrap_err();
    assert_eq!(problem.kind, Kind::Damaged);
    let problem = refused(&bytes[..1000]);
    assert_eq!(problem.place.as_deref(), Some("file header, byte 1000"));
    let problem = refused(&bytes[..100]);
    assert_eq!(problem.found.as_deref(), Some("100 bytes"));
}

#[test]
fn a_header_and_nothing_more() {
    let bytes = plan().bytes();
    let problem = refused(&bytes[..1024]);
    assert_eq!(problem.kind, Kind::Damaged, "3 records were promised");
    let mut plan = Plan::new(vec![signal("Fz", 10)], 0);
    assert_eq!(refused(&plan.bytes()).kind, Kind::Empty);
    plan.records = "-1".to_owned();
    assert_eq!(refused(&plan.bytes()).kind, Kind::Empty);
}

#[test]
fn annotations_alone() {
    let plan = Plan::new(vec![text(10)], 1).with_lists("EDF+C", &["+0\x14\x14\0"]);
    assert_eq!(refused(&plan.bytes()).kind, Kind::Unsupported);
}

#[test]
fn other_content_under_this_name() {
    assert_eq!(refused(b"").kind, Kind::Empty);
    for (bytes, found) in [
        (&b"PK\x03\x04rest"[..], "a ZIP archive"),
        (b"%PDF-1.7", "a PDF document"),
        (b"onset\tduration\n", "\"onset\\tdu\""),
        (b"0", "\"0\""),
        (b"0      1", "\"0      1\""),
        (&[0; 5000], "\"\\x00\\x00\\x00\\x00\\x00\\x00\\x00\\x00\""),
    ] {
        let problem = refused(bytes);
        assert_eq!(problem.kind, Kind::Unknown, "{problem}");
        assert_eq!(problem.found.as_deref(), Some(found));
    }
}

/// A file of any length whose bytes after the header are zero, made as they are asked for.
struct Sparse {
    header: Vec<u8>,
    bytes: u64,
    largest_read: usize,
}

impl Source for Sparse {
    fn name(&self) -> &str {
        "long.edf"
    }
    fn len(&self) -> u64 {
        self.bytes
    }
    fn read_at(&mut self, offset: u64, out: &mut [u8]) -> teasel_core::error::Result<()> {
        self.largest_read = self.largest_read.max(out.len());
        out.fill(0);
        let header = self.header.get(offset as usize..).unwrap_or(&[]);
        let n = header.len().min(out.len());
        out[..n].copy_from_slice(&header[..n]);
        Ok(())
    }
}

fn sparse(signals: usize, samples: usize, records: u64) -> Sparse {
    let signals = (0..signals).map(|i| signal(&format!("S{i}"), samples));
    let mut plan = Plan::new(signals.collect(), 0);
    plan.records = records.to_string();
    Sparse {
        bytes: plan.header_bytes() as u64 + plan.record_bytes() as u64 * records,
        header: plan.bytes(),
        largest_read: 0,
    }
}

#[test]
fn larger_than_memory() {
    let ten_gigabytes = sparse(64, 2000, 39_063);
    let problem = Opening::begin_within(
        Box::new(ten_gigabytes),
        vec![],
        OpenOptions::default(),
        1 << 30,
    )
    .unwrap_err();
    assert_eq!(problem.kind, Kind::TooLarge);
    assert_eq!(problem.expected.as_deref(), Some("at most 1.1 GB in all"));
    let found = problem.found.clone().unwrap_or_default();
    assert!(found.ends_with("GB"), "{problem}");
}

#[test]
fn a_long_file_is_read_in_slices() {
    let mut opening = Opening::begin(
        Box::new(sparse(4, 2000, 2_000)),
        vec![],
        OpenOptions::default(),
    )
    .unwrap();
    let mut steps = Vec::new();
    while !opening.finished() {
        steps.push(opening.step().unwrap());
    }
    assert_eq!(steps.len(), 4, "32 MB in slices of 8 MiB");
    assert!(
        steps
            .windows(2)
            .all(|s| s[0].0 < s[1].0 && s[0].1 == s[1].1)
    );
    assert_eq!(opening.finish().unwrap().sample_count(), 4_000_000);
}

/// Fails to read beyond a place.
struct Failing(MemorySource, u64);

impl Source for Failing {
    fn name(&self) -> &str {
        self.0.name()
    }
    fn len(&self) -> u64 {
        self.0.len()
    }
    fn read_at(&mut self, offset: u64, out: &mut [u8]) -> teasel_core::error::Result<()> {
        if offset + out.len() as u64 > self.1 {
            return Err(Problem::new(
                Kind::Storage,
                "the disk is gone",
                "plug it in",
            ));
        }
        self.0.read_at(offset, out)
    }
}

#[test]
fn a_disk_that_goes_away() {
    let bytes = Plan::new(vec![signal("Fz", 9000)], 600).bytes();
    let source = Failing(MemorySource::new("a.edf", bytes), 9_000_000);
    let mut opening = Opening::begin(Box::new(source), vec![], OpenOptions::default()).unwrap();
    assert!(opening.step().is_ok());
    assert_eq!(opening.step().unwrap_err().kind, Kind::Storage);
    assert_eq!(opening.step().unwrap_err().kind, Kind::Storage, "and still");
    let problem = opening.finish().unwrap_err();
    assert_eq!(problem.file.as_deref(), Some("a.edf"));
}

#[test]
fn a_source_that_fails() {
    let mut source = MemorySource::new("a.edf", vec![1, 2, 3]);
    let mut out = [0; 2];
    assert!(source.read_at(1, &mut out).is_ok());
    assert_eq!(out, [2, 3]);
    assert_eq!(source.read_at(2, &mut out).unwrap_err().kind, Kind::Storage);
    assert_eq!(
        source.read_at(u64::MAX, &mut out).unwrap_err().kind,
        Kind::Storage
    );
}
