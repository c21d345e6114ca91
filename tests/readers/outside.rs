//! Against pyEDFlib: files it wrote (`reference/make_edf.py`) and the files in its own wheel (`reference/edf_samples.json`).
use super::{events, read_twice};
use serde_json::Value;
use teasel_core::recording::Recording;
use teasel_tests::{close, number, reference};

const FOLDER: &str = concat!(env!("CARGO_MANIFEST_DIR"), "/reference/edf");

/// Factor from a unit of the files to the unit that is read.
fn factor(unit: &str) -> (f64, &str) {
    match unit {
        "uV" => (1.0, "µV"),
        "mV" => (1e3, "µV"),
        "V" => (1e6, "µV"),
        "nV" => (1e-3, "µV"),
        other => (1.0, other),
    }
}

fn text<'a>(value: &'a Value, key: &str) -> &'a str {
    value[key]
        .as_str()
        .unwrap_or_else(|| panic!("{key} is a text"))
}

fn list<'a>(value: &'a Value, key: &str) -> &'a [Value] {
    let list = value[key].as_array();
    list.unwrap_or_else(|| panic!("{key} is a list"))
}

/// Every signal is analysed with the right samples or listed with the right rate; events are shifted to the file's clock.
fn compare(
    recording: &Recording,
    expected: &Value,
    names: [&str; 5],
    start_s: f64,
    annotations: &str,
) {
    let [count, first, last, mean, sd] = names;
    let (mut used, mut others) = (0, 0);
    for signal in list(expected, "signals") {
        let (label, rate_hz) = (text(signal, "label"), number(&signal["rate_hz"]));
        if rate_hz != recording.rate_hz {
            assert_eq!(recording.others[others].name, label);
            close(
                label,
                recording.others[others].rate_hz,
                rate_hz,
                1e-9 * rate_hz,
            );
            others += 1;
            continue;
        }
        let (factor, unit) = factor(text(signal, "unit"));
        assert_eq!(recording.channels[used].name, label);
        assert_eq!(recording.channels[used].unit, unit);
        let samples: Vec<f64> = recording.samples[used]
            .iter()
            .map(|&x| f64::from(x))
            .collect();
        assert_eq!(samples.len() as f64, number(&signal[count]), "{label}");
        let span =
            (number(&signal["physical_max"]) - number(&signal["physical_min"])).abs() * factor;
        // Samples are kept as f32: half a unit in the last place of the largest.
        let rounding = span * f64::from(f32::EPSILON);
        let (head, tail) = (list(signal, first), list(signal, last));
        let ends = head
            .iter()
            .zip(&samples)
            .chain(tail.iter().rev().zip(samples.iter().rev()));
        for (wanted, got) in ends {
            close(label, *got, number(wanted) * factor, rounding);
        }
        let n = samples.len() as f64;
        let average = samples.iter().sum::<f64>() / n;
        let variance = samples.iter().map(|x| (x - average).powi(2)).sum::<f64>() / n;
        close(label, average, number(&signal[mean]) * factor, rounding);
        close(
            label,
            variance.sqrt(),
            number(&signal[sd]) * factor,
            rounding,
        );
        used += 1;
    }
    assert_eq!(recording.channels.len(), used);
    assert_eq!(recording.others.len(), others);

    close("start", recording.stretches[0].onset_s, start_s, 0.0);
    assert_eq!(recording.stretches.len(), 1);
    let wanted = list(expected, annotations);
    assert_eq!(recording.events.len(), wanted.len());
    for ((onset_s, duration_s, label), wanted) in events(recording).into_iter().zip(wanted) {
        close(label, onset_s, number(&wanted[0]) + start_s, 1e-7);
        close(label, duration_s, number(&wanted[1]).max(0.0), 1e-7);
        assert_eq!(Some(label), wanted[2].as_str());
    }
}

#[test]
fn committed_files() {
    let all = reference("edf/expected");
    let files = list(&all, "files");
    assert_eq!(files.len(), 6);
    for expected in files {
        let name = text(expected, "file");
        let bytes = std::fs::read(format!("{FOLDER}/{name}")).unwrap();
        let recording = read_twice(name, &bytes);
        assert_eq!(recording.name, name);
        assert_eq!(recording.format, text(expected, "variant"), "{name}");
        assert!(
            recording.warnings.is_empty(),
            "{name}: {:?}",
            recording.warnings
        );
        let start_s = expected["first_record_onset_s"].as_f64().unwrap_or(0.0);
        let names = ["count", "first", "last", "mean", "sd_ddof0"];
        compare(&recording, expected, names, start_s, "annotations");
    }
}

/// pyEDFlib's packaged EDF files, two of which may stem from a person and are therefore read where they are installed:
/// `TEASEL_PYEDFLIB_DATA` names the folder `pyedflib/tests/data`.
#[test]
fn files_of_the_wheel() {
    let Ok(folder) = std::env::var("TEASEL_PYEDFLIB_DATA") else {
        #[allow(clippy::print_stderr, reason = "a check that did not run must say so")]
        {
            eprintln!(
                "NOT RUN: readers::outside::files_of_the_wheel, since TEASEL_PYEDFLIB_DATA does not name pyEDFlib's test files"
            );
        }
        return;
    };
    let all = reference("edf_samples");
    let mut seen = 0;
    for expected in list(&all, "files") {
        let name = text(expected, "file");
        let path = format!("{folder}/{name}");
        let bytes = std::fs::read(&path).unwrap_or_else(|e| panic!("{path}: {e}"));
        assert_eq!(bytes.len() as f64, number(&expected["bytes"]), "{name}");
        let recording = read_twice(name, &bytes);
        let variant = match text(expected, "reserved_field") {
            "" => "EDF",
            "24BIT" => "BDF",
            reserved => reserved,
        };
        assert_eq!(recording.format, variant, "{name}");
        let start_s = number(&expected["start_offset_s_of_first_record"]);
        let names = [
            "n_samples",
            "first_5_physical",
            "last_3_physical",
            "mean",
            "sd_ddof0",
        ];
        compare(
            &recording,
            expected,
            names,
            start_s,
            "annotations_onset_duration_text",
        );
        seen += 1;
    }
    assert_eq!(seen, 7);
}
