//! Clauses of the two papers that pyEDFlib does not write, in files built byte by byte.
use super::plan::{Plan, digital, signal, text};
use super::{events, read, read_twice, read_with};
use teasel_core::error::Kind;
use teasel_core::recording::Stretch;

fn values(signal: usize, count: usize) -> Vec<f32> {
    (0..count).map(|i| f32::from(digital(signal, i))).collect()
}

#[test]
fn a_plain_file() {
    let plan = Plan::new(vec![signal("Fz", 10), signal("Cz", 10)], 3);
    let recording = read_twice("a.edf", &plan.bytes());
    assert_eq!(recording.samples, [values(0, 30), values(1, 30)]);
    assert_eq!(recording.format, "EDF");
    assert_eq!(recording.rate_hz, 10.0);
    assert_eq!(
        recording.stretches,
        [Stretch {
            first: 0,
            count: 30,
            onset_s: 0.0
        }]
    );
    assert!(recording.warnings.is_empty());
}

#[test]
fn the_commonest_rate_is_analysed() {
    let rates = |rates: &[usize]| {
        let signals = rates
            .iter()
            .enumerate()
            .map(|(i, &r)| signal(&format!("S{i}"), r));
        let recording = read("a.edf", &Plan::new(signals.collect(), 2).bytes()).unwrap();
        (
            recording.rate_hz,
            recording.channels.len(),
            recording.others.len(),
        )
    };
    assert_eq!(rates(&[8, 4, 8]), (8.0, 2, 1));
    assert_eq!(rates(&[16, 4, 4]), (4.0, 2, 1));
    assert_eq!(
        rates(&[4, 16]),
        (16.0, 1, 1),
        "of two equally frequent the higher"
    );
    assert_eq!(rates(&[0, 0, 0, 4]), (4.0, 1, 3), "no samples, no rate");
}

#[test]
fn a_plain_signal_called_annotations() {
    let plan = Plan::new(vec![signal("Fz", 8), text(8)], 2);
    let recording = read("a.edf", &plan.bytes()).unwrap();
    assert_eq!(recording.channels[1].name, "EDF Annotations");
    assert_eq!(recording.samples[1].len(), 16);
    assert!(recording.events.is_empty());
}

#[test]
fn gaps_make_stretches() {
    // 10 Hz: half a sample is 0.05 s. Record 3 is 0.04 s late and joins, record 4 is 1.5 s late.
    let lists = [
        "+0.5\x14\x14\0+0.7\x14buoy\x14\0",
        "+1.5\x14\x14\0",
        "+2.54\x14\x14\0",
        "+5\x14\x14\0+5.25\x150.5\x14swell\x14\0",
    ];
    let plan = Plan::new(vec![signal("Fz", 10), text(20)], 4).with_lists("EDF+D", &lists);
    let recording = read_twice("a.edf", &plan.bytes());
    assert_eq!(recording.format, "EDF+D");
    assert_eq!(
        recording.stretches,
        [
            Stretch {
                first: 0,
                count: 30,
                onset_s: 0.5
            },
            Stretch {
                first: 30,
                count: 10,
                onset_s: 5.0
            },
        ]
    );
    assert_eq!(
        events(&recording),
        [(0.7, 0.0, "buoy"), (5.25, 0.5, "swell")]
    );
    assert_eq!(recording.samples, [values(0, 40)]);
    assert_eq!(recording.span_s(), 6.0);
    assert_eq!(recording.warnings.len(), 1);
}

#[test]
fn lateness_does_not_add_up_unseen() {
    // Each record is 0.03 s later than the one before ends, under half a sample; the second time it is more than half.
    let onsets: Vec<String> = (0..6)
        .map(|r| format!("+{:.2}\x14\x14\0", 1.03 * f64::from(r)))
        .collect();
    let lists: Vec<&str> = onsets.iter().map(String::as_str).collect();
    let plan = Plan::new(vec![signal("Fz", 10), text(20)], 6).with_lists("EDF+D", &lists);
    let recording = read("a.edf", &plan.bytes()).unwrap();
    for (record, wanted_s) in (0..6).map(|r| (r, 1.03 * r as f64)) {
        let stretch = recording
            .stretches
            .iter()
            .rev()
            .find(|s| s.first <= record * 10)
            .unwrap();
        let time_s = stretch.onset_s + (record * 10 - stretch.first) as f64 / 10.0;
        assert!(
            (time_s - wanted_s).abs() <= 0.0501,
            "record {record}: {time_s}"
        );
    }
}

#[test]
fn records_out_of_order() {
    let lists = [
        "+0\x14\x14\0",
        "+1\x14\x14\0+1.5\x14kept\x14\0",
        "+0.5\x14\x14\0+0.6\x14lost\x14\0",
        "+3\x14\x14\0",
    ];
    let plan = Plan::new(vec![signal("Fz", 10), text(20)], 4).with_lists("EDF+D", &lists);
    let problem = read("a.edf", &plan.bytes()).unwrap_err();
    assert_eq!(problem.kind, Kind::Damaged);
    let byte = 768 + 2 * 60 + 20;
    assert_eq!(
        problem.place,
        Some(format!(
            "record 3, channel \"EDF Annotations\", byte {byte}"
        ))
    );
    assert_eq!(
        problem.expected.as_deref(),
        Some("2 s or later, where the record before it ends")
    );
    assert_eq!(problem.found.as_deref(), Some("0.5 s"));
    assert_eq!(
        problem.salvage.map(|s| (s.records, s.seconds)),
        Some((2, 2.0))
    );

    let recording = read_with("a.edf", &plan.bytes(), vec![], true).unwrap();
    assert_eq!(recording.samples, [values(0, 20)]);
    assert_eq!(events(&recording), [(1.5, 0.0, "kept")]);
    assert!(
        recording.warnings[0].contains("record 3"),
        "{:?}",
        recording.warnings
    );
}

#[test]
fn a_record_of_edf_d_without_an_onset() {
    let plan = Plan::new(vec![signal("Fz", 10), text(20)], 2)
        .with_lists("EDF+D", &["+0\x14\x14\0", "+1\x14word\x14\0"]);
    let problem = read("a.edf", &plan.bytes()).unwrap_err();
    assert_eq!(problem.salvage.map(|s| s.records), Some(1));
    let mut plan = Plan::new(vec![signal("Fz", 10)], 2);
    plan.reserved = "EDF+D".to_owned();
    assert_eq!(
        read("a.edf", &plan.bytes()).unwrap_err().kind,
        Kind::Damaged
    );
}

#[test]
fn a_continuous_file_is_taken_as_continuous() {
    let lists = [
        "+0.25\x14\x14\0",
        "+9\x14\x14\0",
        "+2.25\x14\x14\0+2.5\x14buoy\x14\0+broken\x14x\x14\0",
    ];
    let plan = Plan::new(vec![signal("Fz", 10), text(30)], 3).with_lists("EDF+C", &lists);
    let recording = read("a.edf", &plan.bytes()).unwrap();
    assert_eq!(
        recording.stretches,
        [Stretch {
            first: 0,
            count: 30,
            onset_s: 0.25
        }]
    );
    assert_eq!(events(&recording), [(2.5, 0.0, "buoy")]);
    assert_eq!(recording.warnings.len(), 2, "{:?}", recording.warnings);
    assert!(recording.warnings[0].starts_with("1 annotation could not be read"));
    assert!(
        recording.warnings[1].contains("record 2"),
        "{:?}",
        recording.warnings
    );
}

#[test]
fn several_annotation_signals() {
    let mut plan = Plan::new(vec![text(12), signal("Fz", 10), text(12)], 2)
        .with_lists("EDF+C", &["+0.75\x14second\x14\0", ""]);
    plan.write_list(0, 0, "+0\x14\x14first\x14\0");
    plan.write_list(1, 0, "+1\x14\x14\0");
    let recording = read("a.edf", &plan.bytes()).unwrap();
    assert_eq!(
        events(&recording),
        [(0.0, 0.0, "first"), (0.75, 0.0, "second")]
    );
    assert_eq!(recording.samples, [values(1, 20)]);
    assert!(recording.warnings.is_empty(), "{:?}", recording.warnings);
}

#[test]
fn unknown_number_of_records() {
    let mut plan = Plan::new(vec![signal("Fz", 10)], 3);
    plan.records = "-1".to_owned();
    let mut bytes = plan.bytes();
    assert_eq!(read("a.edf", &bytes).unwrap().sample_count(), 30);
    bytes.extend([1, 2, 3]);
    let recording = read("a.edf", &bytes).unwrap();
    assert_eq!(recording.sample_count(), 30);
    assert!(
        recording.warnings[0].contains("3 whole records, and 3 bytes"),
        "{:?}",
        recording.warnings
    );
}

#[test]
fn more_bytes_than_records() {
    let mut plan = Plan::new(vec![signal("Fz", 10)], 3);
    plan.records = "2".to_owned();
    let recording = read("a.edf", &plan.bytes()).unwrap();
    assert_eq!(recording.samples, [values(0, 20)]);
    assert!(
        recording.warnings[0].contains("20 bytes after them"),
        "{:?}",
        recording.warnings
    );
}

#[test]
fn limits_that_cannot_be_used() {
    let mut plan = Plan::new(
        vec![signal("Fz", 10), signal("flat", 10), signal("turned", 10)],
        2,
    );
    plan.signals[1].physical = ["5", "5"].map(str::to_owned);
    plan.signals[2].digital = ["7", "-7"].map(str::to_owned);
    let recording = read("a.edf", &plan.bytes()).unwrap();
    assert_eq!(recording.channels.len(), 1);
    assert_eq!(
        recording.others[0].reason,
        "its physical limits should differ and are both 5"
    );
    assert_eq!(
        recording.others[1].reason,
        "its digital maximum should be above its digital minimum 7 and is -7"
    );
    assert_eq!(recording.warnings.len(), 2);
    plan.signals[0].physical = ["0", "0"].map(str::to_owned);
    assert_eq!(
        read("a.edf", &plan.bytes()).unwrap_err().kind,
        Kind::Damaged
    );
}

#[test]
fn limits_decide_gain_and_offset() {
    let mut plan = Plan::new(vec![signal("up", 1), signal("down", 1)], 1);
    plan.signals[0].physical = ["0", "100"].map(str::to_owned);
    plan.signals[0].digital = ["0", "1000"].map(str::to_owned);
    plan.signals[1].physical = ["3276,7", "-3276,8"].map(str::to_owned);
    plan.body[0] = vec![
        500_i16.to_le_bytes().to_vec(),
        (-32768_i16).to_le_bytes().to_vec(),
    ];
    let recording = read("a.edf", &plan.bytes()).unwrap();
    assert_eq!(recording.samples, [[50.0], [3276.7]]);
    assert_eq!(
        recording.warnings.len(),
        2,
        "two decimal commas: {:?}",
        recording.warnings
    );
}

#[test]
fn names_are_told_apart_and_micro_is_micro() {
    let mut signals = vec![
        signal("Fz", 4),
        signal("Fz", 4),
        signal("", 4),
        signal("Fz (2)", 4),
    ];
    for (signal, unit) in signals.iter_mut().zip(["µV", "μV", "mV", "nT"]) {
        signal.unit = unit.to_owned();
    }
    let mut plan = Plan::new(signals, 1);
    let name_apart = |plan: &Plan| {
        let recording = read("a.edf", &plan.bytes()).unwrap();
        recording
            .channels
            .into_iter()
            .map(|c| (c.name, c.unit))
            .collect::<Vec<_>>()
    };
    // A two-byte sign leaves the plan's fields a byte too long: cut their last space.
    for signal in &mut plan.signals[..2] {
        signal.unit = "uV".to_owned();
    }
    let got = name_apart(&plan);
    let names: Vec<&str> = got.iter().map(|c| c.0.as_str()).collect();
    assert_eq!(names, ["Fz", "Fz (2)", "channel 3", "Fz (2) (2)"]);
    assert_eq!(got[2].1, "µV");
    assert_eq!(got[3].1, "nT");
    let at = 256 + 4 * 96;
    for micro in [&b"\xb5V      "[..], b"\xc2\xb5V     ", b"\xce\xbcV     "] {
        let mut bytes = plan.bytes();
        bytes[at..at + 8].copy_from_slice(micro);
        assert_eq!(read("a.edf", &bytes).unwrap().channels[0].unit, "µV");
    }
}
