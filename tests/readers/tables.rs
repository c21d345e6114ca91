//! Event tables beside a recording.
use super::plan::{Plan, signal, text};
use super::{events, read_with};
use teasel_core::error::{Kind, Result};
use teasel_core::recording::{Recording, SideFile};

fn bytes() -> Vec<u8> {
    let lists = ["+0.25\x14\x14\0+0.5\x14own\x14\0", "+1.25\x14\x14\0"];
    let plan = Plan::new(vec![signal("Fz", 10), text(16)], 2);
    plan.with_lists("EDF+C", &lists).bytes()
}

fn table(name: &str, text: &str) -> SideFile {
    SideFile {
        name: name.to_owned(),
        bytes: text.as_bytes().to_vec(),
    }
}

fn with(text: &str) -> Result<Recording> {
    read_with(
        "sub-01_task-watch_eeg.edf",
        &bytes(),
        vec![table("sub-01_task-watch_events.tsv", text)],
        false,
    )
}

#[test]
fn the_table_replaces_the_annotations_on_the_clock_of_the_first_sample() {
    let recording = with("onset\tduration\ttrial_type\n1.5\t0.5\tswell\n0\tn/a\tbuoy\n").unwrap();
    assert_eq!(
        events(&recording),
        [(0.25, 0.0, "buoy"), (1.75, 0.5, "swell")]
    );
    assert_eq!(recording.side_files, ["sub-01_task-watch_events.tsv"]);
    assert_eq!(recording.warnings.len(), 1);
    assert!(
        recording.warnings[0].contains("2 events")
            && recording.warnings[0].contains("1 annotations")
    );
}

#[test]
fn labels_and_what_is_missing() {
    let text = "onset\tduration\ttrial_type\tvalue\n1\t0\tn/a\t7\n2\t0\tbuoy\t8\n3\t0\tn/a\tn/a\nn/a\t0\tbuoy\t9\n";
    let recording = with(text).unwrap();
    let labels: Vec<&str> = recording.events.iter().map(|e| e.label.as_str()).collect();
    assert_eq!(labels, ["7", "buoy"]);
    assert_eq!(recording.warnings.len(), 3, "{:?}", recording.warnings);
    assert_eq!(with("onset\n1\n").unwrap().events[0].label, "event");
}

#[test]
fn marks_line_ends_and_spaces() {
    for text in [
        "\u{feff}onset\tduration\ttrial_type\r\n1\t0\tbuoy\r\n",
        "duration\tonset\tother\ttrial_type\n0\t1\tx\tbuoy",
        "onset\tduration\ttrial_type\n 1 \t0\t buoy \n\n",
    ] {
        assert_eq!(
            events(&with(text).unwrap()),
            [(1.25, 0.0, "buoy")],
            "{text:?}"
        );
    }
}

#[test]
fn broken_tables_name_their_line() {
    for (text, place, found) in [
        ("time\tduration\n1\t0\n", "line 1", "time, duration"),
        ("onset,duration\n1,0\n", "line 1", "onset,duration"),
        ("", "line 1", ""),
        (
            "onset\tduration\n1\t0\nsoon\t0\n",
            "line 3, column onset",
            "\"soon\"",
        ),
        (
            "onset\tduration\n1\t0\n2\tinf\n",
            "line 3, column duration",
            "\"inf\"",
        ),
        ("onset\tduration\n1\t0\n2\t0\tbuoy\n", "line 3", "3 columns"),
    ] {
        let problem = with(text).unwrap_err();
        assert_eq!(problem.kind, Kind::Damaged);
        assert_eq!(
            problem.file.as_deref(),
            Some("sub-01_task-watch_events.tsv")
        );
        assert_eq!(problem.place.as_deref(), Some(place), "{problem}");
        assert_eq!(problem.found.as_deref(), Some(found), "{problem}");
    }
}

#[test]
fn which_side_files_are_used() {
    let good = "onset\tduration\n1\t0\n";
    let two = vec![table("other_events.tsv", good), table("a_events.tsv", good)];
    let recording = read_with("a_eeg.edf", &bytes(), two.clone(), false).unwrap();
    assert_eq!(recording.side_files, ["a_events.tsv"]);
    let problem = read_with("b_eeg.edf", &bytes(), two, false).unwrap_err();
    assert_eq!(problem.kind, Kind::Unsupported);
    let rest = vec![
        table("notes.txt", "x"),
        table("my-list.tsv", good),
        table("channels.tsv", "name\ttype\n"),
    ];
    let recording = read_with("a.edf", &bytes(), rest, false).unwrap();
    assert_eq!(recording.side_files, ["my-list.tsv"]);
    let unused = |name: &str| recording.warnings.iter().any(|w| w.starts_with(name));
    assert!(
        unused("notes.txt") && unused("channels.tsv"),
        "{:?}",
        recording.warnings
    );
}
