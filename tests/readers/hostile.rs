//! Any bytes at all get an answer: no panic, no hang, no more memory than a file of that size can need.
use super::plan::{Plan, signal, text};
use super::{read, read_with};
use std::time::Instant;
use teasel_core::error::Kind;
use teasel_core::recording::SideFile;
use teasel_tests::Lcg;

fn victims() -> Vec<Vec<u8>> {
    let lists = [
        "+0\x14\x14\0+0.5\x14a\x14\0",
        "+1\x14\x14\0",
        "+5\x14\x14\0+5.5\x151\x14b\x14c\x14\0",
    ];
    let plus = Plan::new(vec![signal("Fz", 6), signal("slow", 2), text(16)], 3);
    vec![
        Plan::new(vec![signal("Fz", 5), signal("Cz", 5)], 4).bytes(),
        plus.clone().with_lists("EDF+C", &lists).bytes(),
        plus.with_lists("EDF+D", &lists).bytes(),
    ]
}

/// Samples that a file of this size can hold are a bound for everything that came out of it.
fn sane(bytes: &[u8], salvage: bool) {
    if let Ok(recording) = read_with("a.edf", bytes, vec![], salvage) {
        let samples: usize = recording.samples.iter().map(Vec::len).sum();
        assert!(2 * samples <= bytes.len());
        assert!(recording.events.len() <= bytes.len());
        assert!(recording.rate_hz > 0.0 && recording.rate_hz.is_finite());
        assert!(recording.samples.iter().flatten().all(|x| x.is_finite()));
        let covered: usize = recording.stretches.iter().map(|s| s.count).sum();
        assert_eq!(covered, recording.sample_count());
    }
}

#[test]
fn cut_at_every_length() {
    for bytes in victims() {
        assert!(read("a.edf", &bytes).is_ok());
        for length in 0..bytes.len() {
            let problem = read("a.edf", &bytes[..length]).unwrap_err();
            assert!(
                matches!(problem.kind, Kind::Empty | Kind::Unknown | Kind::Damaged),
                "{length}: {problem}"
            );
            sane(&bytes[..length], true);
        }
    }
}

#[test]
fn bytes_changed_at_random() {
    let mut random = Lcg(2026);
    for bytes in victims() {
        for round in 0..6_000 {
            let mut changed = bytes.clone();
            let whole = if round % 2 == 0 {
                bytes.len()
            } else {
                1024.min(bytes.len())
            };
            for _ in 0..1 + (random.uniform() * 6.0) as usize {
                let at = (random.uniform() * whole as f64) as usize;
                let digits = b"0123456789-+.eE \0\x14\x15\xff";
                changed[at] = match round % 3 {
                    0 => (random.uniform() * 256.0) as u8,
                    _ => digits[(random.uniform() * digits.len() as f64) as usize],
                };
            }
            sane(&changed, round % 5 == 0);
        }
    }
}

#[test]
fn absurd_numbers_in_every_number_field() {
    let fields = |signals: usize| {
        let fixed = [(184, 8), (236, 8), (244, 8), (252, 4)];
        let each = [104, 112, 120, 128, 216].map(|f| 256 + signals * f);
        let of_signals = move |at: usize| (0..signals).map(move |i| (at + 8 * i, 8));
        fixed
            .into_iter()
            .chain(each.into_iter().flat_map(of_signals))
            .collect::<Vec<_>>()
    };
    for bytes in victims() {
        for (at, width) in fields(bytes[252..256].trim_ascii()[0] as usize - usize::from(b'0')) {
            for number in [
                "99999999", "-9999999", "1e308", "-1e308", "1e-308", "0", "-1", "1", "2", "0.0001",
                "+", "", "١٢",
            ] {
                let mut text = number.as_bytes().to_vec();
                text.resize(width, b' ');
                let mut changed = bytes.clone();
                changed[at..at + width].copy_from_slice(&text);
                sane(&changed, false);
                sane(&changed, true);
            }
        }
    }
}

#[test]
fn a_small_file_that_claims_a_huge_size() {
    for (samples, records) in [
        ("99999999", "99999999"),
        ("99999999", "-1"),
        ("1", "99999999"),
    ] {
        let mut plan = Plan::new(vec![signal("Fz", 1)], 1);
        plan.records = records.to_owned();
        let mut bytes = plan.bytes();
        let at = 256 + 216;
        bytes[at..at + 8].copy_from_slice(format!("{samples:8}").as_bytes());
        let start = Instant::now();
        let problem = read("a.edf", &bytes).unwrap_err();
        assert_eq!(problem.kind, Kind::Damaged, "{problem}");
        assert!(start.elapsed().as_millis() < 100);
    }
    let problem = read(
        "a.edf",
        b"0       X X X X                   99999999 9999 99",
    )
    .unwrap_err();
    assert_eq!(problem.kind, Kind::Damaged);
}

#[test]
fn annotations_cost_more_than_their_bytes_and_are_paid_for() {
    let texts = format!("+0\x14\x14{}\0", "a\x14".repeat(1_000_000));
    let signals = vec![signal("Fz", 2), text(1_000_010)];
    let plan = Plan::new(signals, 1).with_lists("EDF+C", &[&texts]);
    let problem = read("a.edf", &plan.bytes()).unwrap_err();
    assert_eq!(problem.kind, Kind::TooLarge, "{problem}");
}

#[test]
fn a_list_without_its_end_is_left_out() {
    let cut = format!("+0\x14\x14\0+1\x14{}", "a".repeat(1000));
    let plan = Plan::new(vec![signal("Fz", 2), text(504)], 1).with_lists("EDF+C", &[&cut]);
    let recording = read("a.edf", &plan.bytes()).unwrap();
    assert!(recording.events.is_empty());
    assert_eq!(recording.warnings.len(), 1, "{:?}", recording.warnings);
}

#[test]
fn a_broken_table_beside_a_good_recording() {
    let bytes = &victims()[0];
    let table = b"onset\tduration\ttrial_type\n0.5\t0\tbuoy\n1.5\t1\t\"a b\"\nn/a\tn/a\tn/a\n";
    let mut random = Lcg(7);
    for _ in 0..4_000 {
        let mut changed = table.to_vec();
        for _ in 0..1 + (random.uniform() * 4.0) as usize {
            let at = (random.uniform() * changed.len() as f64) as usize;
            changed[at] = (random.uniform() * 256.0) as u8;
        }
        changed.truncate((random.uniform() * 2.0 * table.len() as f64) as usize);
        let side = SideFile {
            name: "a_events.tsv".to_owned(),
            bytes: changed,
        };
        match read_with("a.edf", bytes, vec![side], false) {
            Ok(recording) => assert!(recording.events.iter().all(|e| e.onset_s.is_finite())),
            Err(problem) => assert_eq!(problem.file.as_deref(), Some("a_events.tsv"), "{problem}"),
        }
    }
}
