//! What is written as EDF+, BDF+, NPY and CSV is read back by pyEDFlib, edfio, NumPy and pandas (`reference/read_back.py`).
use super::written::{event, recording};
use serde_json::Value;
use std::process::Command;
use teasel_core::recording::{Recording, edf};
use teasel_core::takeaway::{recording_csv, recording_npy};
use teasel_tests::{close_all, rows};

fn before(stretches: &[(usize, f64)]) -> Recording {
    let channels = [("Fz", "µV"), ("B 2", "fT")];
    let mut before = recording(250.0, stretches, &channels, |c, i| {
        ((i * 37 + 11 * c) % 4001) as f32 / 10.0 - 200.0
    });
    before.events = vec![event(0.5, 0.0, "buoy"), event(1.25, 0.5, "Boje → 灯")];
    before
}

#[test]
fn by_general_libraries() {
    let Some(python) = std::env::var_os("TEASEL_PYTHON") else {
        #[allow(clippy::print_stderr, reason = "a check that did not run must say so")]
        {
            eprintln!("NOT RUN: readers::read_back, since TEASEL_PYTHON names no Python");
        }
        return;
    };
    let whole = before(&[(500, 0.0)]);
    let gaps = before(&[(500, 0.0), (250, 7.5)]);
    let nobody = edf::Identity::default();
    let folder = std::env::temp_dir().join(format!("teasel-read-back-{}", std::process::id()));
    std::fs::create_dir_all(&folder).unwrap();
    let files = [
        ("whole.edf", edf::write(&whole, &nobody).unwrap()),
        ("whole.bdf", edf::write_24_bit(&whole, &nobody).unwrap()),
        ("gaps.edf", edf::write(&gaps, &nobody).unwrap()),
        ("gaps.bdf", edf::write_24_bit(&gaps, &nobody).unwrap()),
        ("whole.npy", recording_npy(&whole).unwrap()),
        ("whole.csv", recording_csv(&whole).unwrap().into_bytes()),
    ];
    for (name, bytes) in &files {
        std::fs::write(folder.join(name), bytes).unwrap();
    }
    let script = concat!(env!("CARGO_MANIFEST_DIR"), "/reference/read_back.py");
    let run = Command::new(python)
        .arg(script)
        .arg(&folder)
        .output()
        .unwrap();
    std::fs::remove_dir_all(&folder).unwrap();
    assert!(
        run.status.success(),
        "{}",
        String::from_utf8_lossy(&run.stderr)
    );
    let told: Value = serde_json::from_slice(&run.stdout).unwrap();
    let readings = told.as_array().unwrap();
    assert_eq!(readings.len(), 7);
    for reading in readings {
        let what = reading["by"].as_str().unwrap();
        let recording = if what.contains("gaps") { &gaps } else { &whole };
        for (got, wanted) in rows(&reading["samples"]).iter().zip(&recording.samples) {
            let wanted: Vec<f64> = wanted.iter().map(|&x| f64::from(x)).collect();
            // A step of 0.1 is written exactly; the readers compute in f64 what is an f32 here.
            close_all(what, got, &wanted, 400.0 * f64::from(f32::EPSILON));
        }
        assert_eq!(reading["samples"].as_array().unwrap().len(), 2, "{what}");
        if let Some(rate_hz) = reading["rate_hz"].as_f64() {
            assert_eq!(rate_hz, 250.0, "{what}");
        }
        if let Some(names) = reading["names"].as_array() {
            assert_eq!(names, &["Fz", "B 2"], "{what}");
        }
        if let Some(events) = reading["events"].as_array() {
            assert_eq!(events.len(), 2, "{what}");
            assert_eq!(events[0], serde_json::json!([0.5, 0.0, "buoy"]), "{what}");
            assert_eq!(
                events[1],
                serde_json::json!([1.25, 0.5, "Boje → 灯"]),
                "{what}"
            );
        }
        if let Some(patient) = reading["patient"].as_str() {
            assert_eq!(patient, "X", "{what}");
        }
    }
}
