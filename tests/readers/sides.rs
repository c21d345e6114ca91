//! Side files of the BIDS standard (version 1.10, "Electroencephalography", "Intracranial electroencephalography", "Common principles") and
//! tables of events with columns of their own.
//!
//! | clause | test |
//! |---|---|
//! | `*_channels.tsv`: name, type, units are columns; status is good, bad or n/a, with status_description | `kinds_and_bad_channels_are_set_aside` |
//! | channel types: what measures the brain, and what does not (EOG, ECG, EMG, TRIG, MISC …) | `kinds_and_bad_channels_are_set_aside`, `a_recording_of_one_kind_is_about_that_kind` |
//! | `*_electrodes.tsv`: name, x, y, z, or n/a | `electrodes_with_landmarks_are_turned_to_the_nose` |
//! | `*_coordsystem.json`: units m, mm, cm; landmarks NAS, LPA, RPA | `electrodes_with_landmarks_are_turned_to_the_nose`, `units_make_no_difference_on_a_head` |
//! | iEEG coordinates: on a plane, along a line, neither | `contacts_lie_on_a_plane_on_a_line_or_nowhere` |
//! | `*_eeg.json`: SamplingFrequency, PowerLineFrequency, EEGReference | `facts_are_told_and_checked` |
//! | inheritance: a file applies where no entity contradicts, the more specific counts | `the_more_specific_file_counts` |
//! | `n/a` for what is missing | all |
use super::plan::{Plan, signal};
use super::read_with;
use teasel_core::error::{Kind, Result};
use teasel_core::recipe::{EventColumns, Given, TimeUnit};
use teasel_core::recording::{
    Layout, MemorySource, OpenOptions, Recording, SideFile, events_preview, open,
};
use teasel_tests::{Lcg, close_all};

fn side(name: &str, text: &str) -> SideFile {
    SideFile {
        name: name.to_owned(),
        bytes: text.as_bytes().to_vec(),
    }
}

/// Two seconds at 10 Hz of channels with these names.
fn bytes(names: &[&str]) -> Vec<u8> {
    Plan::new(names.iter().map(|n| signal(n, 10)).collect(), 2).bytes()
}

fn opened(names: &[&str], sides: Vec<SideFile>) -> Result<Recording> {
    read_with("sub-01_task-watch_eeg.edf", &bytes(names), sides, false)
}

const CHANNELS: &str = "sub-01_task-watch_channels.tsv";
const ELECTRODES: &str = "sub-01_electrodes.tsv";
const SYSTEM: &str = "sub-01_coordsystem.json";

#[test]
fn kinds_and_bad_channels_are_set_aside() {
    let table = "name\ttype\tunits\tstatus\tstatus_description\n\
        Fz\tEEG\tuV\tgood\tn/a\nCz\tEEG\tuV\tbad\tloose\nPz\teeg\tuV\tn/a\tn/a\n\
        VEOG\tVEOG\tuV\tgood\tn/a\nStatus\tTRIG\tn/a\tgood\tn/a\nGone\tEEG\tuV\tgood\tn/a\n";
    let names = ["Fz", "Cz", "Pz", "VEOG", "Status"];
    let recording = opened(&names, vec![side(CHANNELS, table)]).unwrap();
    let aside: Vec<(&str, &str)> = recording
        .about
        .aside
        .iter()
        .map(|(n, why)| (n.as_str(), why.as_str()))
        .collect();
    assert_eq!(
        aside,
        [
            ("Cz", "marked bad: loose"),
            ("Status", "its kind is TRIG"),
            ("VEOG", "its kind is VEOG")
        ]
    );
    assert_eq!(recording.about.kinds["Pz"], "EEG");
    assert_eq!(recording.channels.len(), 5, "nothing is dropped");
    assert_eq!(recording.side_files, [CHANNELS]);
    assert!(recording.warnings.iter().any(|w| w.contains("Gone")));
}

#[test]
fn a_recording_of_one_kind_is_about_that_kind() {
    let table = "name\ttype\tunits\nArm\tEMG\tmV\nLeg\tEMG\tmV\n";
    let recording = opened(&["Arm", "Leg"], vec![side(CHANNELS, table)]).unwrap();
    assert!(recording.about.aside.is_empty());
    assert!(
        recording
            .warnings
            .iter()
            .any(|w| w.contains("all kinds are analysed"))
    );
}

/// Places of four channels with x forward and y left, in centimetres about a point between the ears.
const FORWARD: &str = "name\tx\ty\tz\nFpz\t9\t0\t4\nT7\t0\t8\t4\nT8\t0\t-8\t4\nOz\t-9\t0\t4\nCz\t0\t0\t13\nREF\tn/a\tn/a\tn/a\n";
const HEAD: [&str; 5] = ["Fpz", "T7", "T8", "Oz", "Cz"];

fn places(recording: &Recording) -> Vec<[f64; 3]> {
    recording
        .channels
        .iter()
        .filter_map(|c| c.position)
        .collect()
}

#[test]
fn electrodes_with_landmarks_are_turned_to_the_nose() {
    let system = "{\"EEGCoordinateSystem\":\"Other\",\"EEGCoordinateUnits\":\"cm\",\"AnatomicalLandmarkCoordinates\":{\"NAS\":[10,0,0],\"LPA\":[0,7,0],\"RPA\":[0,-7,0]}}";
    let sides = vec![side(ELECTRODES, FORWARD), side(SYSTEM, system)];
    let recording = opened(&HEAD, sides).unwrap();
    assert_eq!(recording.layout, Layout::Head);
    let expected = [
        [0.0, 0.09, 0.04],
        [-0.08, 0.0, 0.04],
        [0.08, 0.0, 0.04],
        [0.0, -0.09, 0.04],
        [0.0, 0.0, 0.13],
    ];
    for (found, expected) in places(&recording).iter().zip(expected) {
        close_all("metres", found, &expected, 1e-15);
    }
    assert_eq!(recording.about.positions.as_deref(), Some(ELECTRODES));
    assert_eq!(recording.side_files, [ELECTRODES, SYSTEM]);
}

#[test]
fn without_landmarks_six_names_decide_and_fewer_are_said() {
    let few = opened(&HEAD, vec![side(ELECTRODES, FORWARD)]).unwrap();
    assert!(
        few.warnings
            .iter()
            .any(|w| w.contains("which way its axes point"))
    );
    let names = ["Fpz", "T7", "T8", "Oz", "Cz", "Pz"];
    let table = format!("{FORWARD}Pz\t-6\t0\t10\n");
    let recording = opened(&names, vec![side(ELECTRODES, &table)]).unwrap();
    let front = recording.channels[0].position.unwrap();
    // Without a unit in the file of coordinates, millimetres are taken; on a head the scale plays no part.
    close_all("front", &front, &[0.0, 0.009, 0.004], 1e-12);
    assert!(!recording.warnings.iter().any(|w| w.contains("which way")));
}

#[test]
fn units_make_no_difference_on_a_head() {
    let directions = |unit: &str, scale: f64| {
        let row = |name: &str, p: [f64; 3]| {
            let [x, y, z] = p.map(|v| v * scale);
            format!("{name}\t{x}\t{y}\t{z}\n")
        };
        let table = format!(
            "name\tx\ty\tz\n{}{}",
            row("A", [0.01, 0.08, 0.03]),
            row("B", [-0.07, 0.0, 0.05])
        );
        let system = format!("{{\"EEGCoordinateUnits\":\"{unit}\"}}");
        let recording = opened(
            &["A", "B"],
            vec![side(ELECTRODES, &table), side(SYSTEM, &system)],
        )
        .unwrap();
        places(&recording).concat()
    };
    let metres = directions("m", 1.0);
    for (unit, scale) in [("cm", 1e2), ("mm", 1e3)] {
        close_all(unit, &directions(unit, scale), &metres, 1e-15);
    }
}

#[test]
fn contacts_lie_on_a_plane_on_a_line_or_nowhere() {
    let names = ["G1", "G2", "G3", "G4", "G5", "G6"];
    let system = "{\"iEEGCoordinateSystem\":\"Other\",\"iEEGCoordinateUnits\":\"mm\"}";
    let lie = |place: fn(f64) -> [f64; 3]| {
        let rows: String = names
            .iter()
            .enumerate()
            .map(|(k, name)| {
                let [x, y, z] = place(k as f64);
                format!("{name}\t{x}\t{y}\t{z}\n")
            })
            .collect();
        let table = format!("name\tx\ty\tz\n{rows}");
        opened(&names, vec![side(ELECTRODES, &table), side(SYSTEM, system)]).unwrap()
    };
    // Two rows of three, tilted; a shaft of contacts 3 mm apart; corners of no plane.
    let grid = lie(|k| {
        [
            10.0 * (k % 3.0),
            8.0 * (k / 3.0).floor(),
            5.0 * (k % 3.0) + 20.0,
        ]
    });
    assert_eq!(grid.layout, Layout::Plane);
    let at = places(&grid);
    let apart = |a: usize, b: usize| (at[a][0] - at[b][0]).hypot(at[a][1] - at[b][1]);
    close_all(
        "distances",
        &[apart(0, 1), apart(0, 3)],
        &[125f64.sqrt() * 1e-3, 8e-3],
        1e-12,
    );
    let shaft = lie(|k| [1.0 + k * 2.0, 2.0 - k * 2.0, 3.0 + k]);
    assert_eq!(shaft.layout, Layout::Line);
    let depths: Vec<f64> = places(&shaft).iter().map(|p| -p[2]).collect();
    close_all(
        "depths",
        &depths,
        &[0.0, 3e-3, 6e-3, 9e-3, 12e-3, 15e-3],
        1e-12,
    );
    // Six of the corners of a cube.
    let nowhere = lie(|k| {
        let corner = [0b000, 0b001, 0b010, 0b100, 0b011, 0b111][k as usize];
        [0, 1, 2].map(|axis| f64::from(corner >> axis & 1) * 40.0)
    });
    assert!(places(&nowhere).is_empty());
    assert!(
        nowhere
            .warnings
            .iter()
            .any(|w| w.contains("there is no map"))
    );
}

#[test]
fn names_of_depth_electrodes_are_no_places_on_a_head() {
    let table = "name\ttype\tunits\nF1\tSEEG\tuV\nF2\tSEEG\tuV\n";
    let recording = opened(&["F1", "F2"], vec![side(CHANNELS, table)]).unwrap();
    let (layout, places) = teasel_core::describe::placing::placed(&recording, &Default::default());
    assert_eq!((layout, places), (Layout::Plane, vec![None, None]));
}

#[test]
fn a_plain_table_of_places_needs_no_standard() {
    for (name, text) in [
        ("places.csv", "name,x,y\nA,0,0\nB,3,0\nC,0,4\n"),
        ("places.csv", "A;0;0\nB;3,0;0\nC;0;4\n"),
        ("places.txt", "0\t0\n3\t0\n0\t4\n"),
    ] {
        let recording = opened(&["A", "B", "C"], vec![side(name, text)]).unwrap();
        assert_eq!(recording.layout, Layout::Plane, "{text}");
        let flat: Vec<f64> = places(&recording).concat();
        close_all(
            text,
            &flat,
            &[0.0, 0.0, 0.0, 3e-3, 0.0, 0.0, 0.0, 4e-3, 0.0],
            1e-15,
        );
    }
}

#[test]
fn facts_are_told_and_checked() {
    let json = "{\"SamplingFrequency\":10,\"PowerLineFrequency\":60,\"EEGReference\":\"left mastoid\",\"InstitutionName\":\"x\"}";
    let recording = opened(&["Fz"], vec![side("task-watch_eeg.json", json)]).unwrap();
    assert_eq!(recording.about.mains_hz, Some(60.0));
    assert_eq!(recording.about.reference.as_deref(), Some("left mastoid"));
    assert!(recording.warnings.is_empty(), "{:?}", recording.warnings);
    let wrong = opened(
        &["Fz"],
        vec![side("task-watch_eeg.json", "{\"SamplingFrequency\":500}")],
    )
    .unwrap();
    assert_eq!(wrong.rate_hz, 10.0);
    assert!(wrong.warnings.iter().any(|w| w.contains("500 Hz")));
}

#[test]
fn a_format_without_rate_and_unit_takes_them_from_side_files() {
    let table: String = (0..40)
        .map(|k| format!("{},{}\n", k % 7, (k * 3) % 5))
        .collect();
    let sides = vec![
        side("sub-01_task-watch_eeg.json", "{\"SamplingFrequency\":20}"),
        side(CHANNELS, "name\ttype\tunits\na\tEEG\tmV\nb\tEEG\tmV\n"),
    ];
    let source = MemorySource::new(
        "sub-01_task-watch_eeg.csv",
        format!("a,b\n{table}").into_bytes(),
    );
    let recording = open(Box::new(source), sides, OpenOptions::default()).unwrap();
    assert_eq!(
        (recording.rate_hz, recording.channels[0].unit.as_str()),
        (20.0, "µV")
    );
    assert_eq!(&recording.samples[0][..3], [0.0, 1000.0, 2000.0]);
}

#[test]
fn the_more_specific_file_counts() {
    let bad = |name: &str| format!("name\tstatus\n{name}\tbad\nFz\tgood\n");
    let sides = vec![
        side("sub-01_channels.tsv", &bad("Cz")),
        side(CHANNELS, &bad("Pz")),
        side("sub-02_task-watch_channels.tsv", &bad("Fz")),
    ];
    let recording = opened(&["Fz", "Cz", "Pz"], sides).unwrap();
    let aside: Vec<&String> = recording.about.aside.keys().collect();
    assert_eq!(aside, ["Pz"]);
    assert!(
        recording
            .warnings
            .iter()
            .any(|w| w.starts_with("sub-02_task-watch_channels.tsv was not used"))
    );
}

fn columns(onset: &str, unit: TimeUnit, label: Option<&str>) -> EventColumns {
    EventColumns {
        onset: onset.into(),
        unit,
        label: label.map(str::to_owned),
        duration: None,
    }
}

fn mapped(text: &str, events: Option<EventColumns>) -> Result<Recording> {
    let source = MemorySource::new("watch.edf", bytes(&["Fz"]));
    let options = OpenOptions {
        given: Given {
            events,
            ..Given::default()
        },
        ..OpenOptions::default()
    };
    open(Box::new(source), vec![side("log.csv", text)], options)
}

#[test]
fn told_columns_in_any_unit() {
    for (text, unit) in [
        ("when,what\n0.5,left\n1.5,right\n", TimeUnit::Seconds),
        ("when,what\n500,left\n1500,right\n", TimeUnit::Milliseconds),
        ("when;what\n5;left\n15,0;right\n", TimeUnit::Samples),
        (
            "\u{feff}\"when\"\t\"what\"\r\n0.5\tleft\r\n1.5\t\"right\"\r\n",
            TimeUnit::Seconds,
        ),
    ] {
        let recording = mapped(text, Some(columns("when", unit, Some("what")))).unwrap();
        assert_eq!(
            super::events(&recording),
            [(0.5, 0.0, "left"), (1.5, 0.0, "right")],
            "{text}"
        );
    }
    let unlabelled = mapped("1\n2\n", None);
    assert!(unlabelled.is_ok());
    let bare = mapped(
        "0.5,7\n1.5,8\n",
        Some(columns("column 1", TimeUnit::Seconds, Some("column 2"))),
    )
    .unwrap();
    assert_eq!(super::events(&bare), [(0.5, 0.0, "7"), (1.5, 0.0, "8")]);
}

#[test]
fn a_table_that_was_not_told_waits_and_is_named() {
    let recording = mapped("when,what\n0.5,left\n", None).unwrap();
    assert_eq!(recording.about.untold.as_deref(), Some("log.csv"));
    assert!(recording.events.is_empty() && recording.side_files.is_empty());
    let problem = mapped(
        "when,what\n0.5,left\n",
        Some(columns("time", TimeUnit::Seconds, None)),
    )
    .unwrap_err();
    assert_eq!(problem.kind, Kind::Recipe);
    assert_eq!(problem.found.as_deref(), Some("when, what"));
    assert_eq!(problem.file.as_deref(), Some("log.csv"));
}

#[test]
fn a_preview_guesses_columns_and_unit() {
    let rows: String = (0..40)
        .map(|k| format!("{},{},0\n", 250 + 50 * k, ["go", "stop"][k % 2]))
        .collect();
    let table = side("log.csv", &format!("stamp_ms,condition,dur\n{rows}"));
    let preview = events_preview(&table, None, 10.0, 10.0).unwrap();
    assert_eq!(preview.mapping.onset, "stamp_ms");
    assert_eq!(preview.mapping.unit, TimeUnit::Milliseconds);
    assert_eq!(preview.mapping.label.as_deref(), Some("condition"));
    assert_eq!(preview.mapping.duration.as_deref(), Some("dur"));
    assert_eq!(
        (preview.rows.len(), preview.count, preview.late),
        (5, 40, 0)
    );
    assert_eq!(
        preview.labels,
        [("go".to_owned(), 20), ("stop".to_owned(), 20)]
    );
    assert_eq!(preview.span_s, Some([0.25, 2.2]));
    // The unit by size: 2,000 cannot be seconds of a recording of 10 s.
    let unnamed = side("log.csv", &rows);
    let by_size = events_preview(&unnamed, None, 100.0, 30.0).unwrap();
    assert_eq!(by_size.mapping.unit, TimeUnit::Samples);
    let wrong = columns("condition", TimeUnit::Seconds, None);
    let preview = events_preview(&table, Some(&wrong), 10.0, 10.0).unwrap();
    let problem = preview.problem.unwrap();
    assert_eq!(problem.place.as_deref(), Some("line 2, column condition"));
}

/// Every side file, cut at every length and with bytes changed at random: an answer or one clear problem, and never more than a few of its
/// own bytes in a warning.
#[test]
fn hostile_side_files_get_an_answer() {
    let good = [
        (CHANNELS, "name\ttype\tunits\tstatus\nFz\tEEG\tuV\tgood\nCz\tEOG\tmV\tbad\n".to_owned()),
        (ELECTRODES, FORWARD.to_owned()),
        (SYSTEM, "{\"EEGCoordinateUnits\":\"cm\",\"AnatomicalLandmarkCoordinates\":{\"NAS\":[10,0,0],\"LPA\":[0,7,0],\"RPA\":[0,-7,0]}}".to_owned()),
        ("sub-01_task-watch_eeg.json", "{\"SamplingFrequency\":10,\"PowerLineFrequency\":60}".to_owned()),
        ("sub-01_task-watch_events.tsv", "onset\tduration\ttrial_type\n0.5\t0\tgo\n1\tn/a\tstop\n".to_owned()),
        ("log.csv", "when,what\n0.5,\"left\"\n1.5,right\n".to_owned()),
        ("places.csv", "Fpz,1,2\nT7,2,3\nT8,3,4\n".to_owned()),
    ];
    let mut random = Lcg(8);
    let (mut answers, mut problems) = (0, 0);
    let mut judge = |name: &str, bytes: Vec<u8>| {
        let other = side(ELECTRODES, FORWARD);
        let mut sides = vec![SideFile {
            name: name.to_owned(),
            bytes,
        }];
        if name == SYSTEM {
            sides.push(other);
        }
        match opened(&HEAD, sides) {
            Ok(recording) => {
                answers += 1;
                assert!(recording.warnings.iter().all(|w| w.chars().count() < 400));
            }
            Err(problem) => {
                problems += 1;
                assert!(
                    problem.file.is_some() && !problem.advice.is_empty(),
                    "{problem}"
                );
            }
        }
    };
    for (name, text) in &good {
        let bytes = text.as_bytes();
        for cut in 0..bytes.len() {
            judge(name, bytes[..cut].to_vec());
        }
        for _ in 0..300 {
            let mut changed = bytes.to_vec();
            for _ in 0..1 + (random.uniform() * 4.0) as usize {
                let at = (random.uniform() * changed.len() as f64) as usize;
                let marks = b"\"\t\n\r,;{}[]:\\\0\xff9e-n/a";
                changed[at] = marks[(random.uniform() * marks.len() as f64) as usize];
            }
            judge(name, changed);
        }
    }
    assert!(
        answers > 500 && problems > 500,
        "{answers} answers, {problems} problems"
    );
}

#[test]
fn odd_side_files_are_said_to_be_odd() {
    let nan = "name\tx\ty\tz\nFpz\tNaN\t0\t4\n";
    let problem = opened(&HEAD, vec![side(ELECTRODES, nan)]).unwrap_err();
    assert_eq!(problem.place.as_deref(), Some("line 2, column x"));
    let wide = SideFile {
        name: CHANNELS.into(),
        bytes: b"\xff\xfen\0a\0m\0e\0".to_vec(),
    };
    let problem = opened(&HEAD, vec![wide]).unwrap_err();
    assert_eq!(problem.kind, Kind::Unsupported);
    let twice = "name\tstatus\nFpz\tgood\nFpz\tbad\nT7\tgood\n";
    let recording = opened(&HEAD, vec![side(CHANNELS, twice)]).unwrap();
    assert!(recording.about.aside.is_empty());
    assert!(
        recording
            .warnings
            .iter()
            .any(|w| w.contains("names 1 channels twice"))
    );
    let strange = "name\tstatus\nX1\tbad\n";
    let recording = opened(&HEAD, vec![side(CHANNELS, strange)]).unwrap();
    assert!(
        recording
            .warnings
            .iter()
            .any(|w| w.contains("was not used"))
    );
    // A header of a million columns is refused by the budget before its names are kept.
    let many = format!("name{}\n", "\t".repeat(2_000_000));
    let problem = opened(&HEAD, vec![side(CHANNELS, &many)]).unwrap_err();
    assert_eq!(problem.kind, Kind::TooLarge);
}
