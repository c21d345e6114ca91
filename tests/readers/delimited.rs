//! Tables of text, against pandas and Python's csv module (`reference/make_tables.py`), and what is refused of them.
//!
//! Quotation marks and line ends: RFC 4180 (Shafranovich 2005), sections 2.1–2.7.
use super::{events, told};
use serde_json::Value;
use std::fmt::Write as _;
use teasel_core::error::{Kind, Problem, Result};
use teasel_core::recipe::{Axes, Given};
use teasel_core::recording::{MemorySource, OpenOptions, Opening, Recording, open};
use teasel_tests::{close, close_all, number, reference, rows};

fn with(text: &str, given: Given, salvage: bool) -> Result<Recording> {
    let source = MemorySource::new("unknown", text.as_bytes().to_vec());
    open(Box::new(source), Vec::new(), OpenOptions { salvage, given })
}

fn read(text: &str) -> Result<Recording> {
    with(text, told(100.0, "uV"), false)
}

fn refused(text: &str) -> Problem {
    read(text).unwrap_err()
}

fn texts(value: &Value) -> Vec<&str> {
    let list = value.as_array().unwrap();
    list.iter().map(|v| v.as_str().unwrap()).collect()
}

#[test]
fn what_pandas_writes() {
    let all = reference("tables");
    let tables = all["tables"].as_array().unwrap();
    assert_eq!(tables.len(), 14);
    for table in tables {
        let name = table["name"].as_str().unwrap();
        let has_time = table["rate_hz"].is_f64();
        let mut given = told(100.0, "uV");
        if has_time {
            given.rate_hz = None;
        }
        let recording = with(table["text"].as_str().unwrap(), given, false)
            .unwrap_or_else(|p| panic!("{name}: {p}"));
        let names: Vec<&str> = recording.channels.iter().map(|c| c.name.as_str()).collect();
        assert_eq!(names, texts(&table["names"]), "{name}");
        assert!(recording.channels.iter().all(|c| c.unit == "µV"), "{name}");
        let rate_hz = table["rate_hz"].as_f64().unwrap_or(100.0);
        assert_eq!(recording.rate_hz, rate_hz, "{name}");
        let onset_s = table["onset_s"].as_f64().unwrap_or(0.0);
        close(name, recording.stretches[0].onset_s, onset_s, 1e-12);
        let factor = if table["unit"] == "mV" { 1e3 } else { 1.0 };
        for (got, wanted) in recording.samples.iter().zip(rows(&table["samples"])) {
            let got: Vec<f64> = got.iter().map(|&x| f64::from(x)).collect();
            let wanted: Vec<f64> = wanted.iter().map(|x| x * factor).collect();
            // Samples are kept as f32: half a unit in the last place.
            let rounding = teasel_tests::largest(&wanted) * f64::from(f32::EPSILON) / 2.0;
            close_all(name, &got, &wanted, rounding);
        }
        let wanted = table["events"].as_array().cloned().unwrap_or_default();
        assert_eq!(recording.events.len(), wanted.len(), "{name}");
        for (got, wanted) in events(&recording).into_iter().zip(&wanted) {
            close(name, got.0, number(&wanted[0]), 1e-9);
            assert_eq!(Some(got.2), wanted[1].as_str());
        }
    }
}

#[test]
fn what_a_table_does_not_say_is_asked() {
    let plain = "a,b\n1,2\n3,4\n";
    let problem = with(plain, Given::default(), false).unwrap_err();
    assert_eq!(problem.kind, Kind::NeedsAnswer);
    let keys: Vec<&str> = problem.asks.iter().map(|a| a.key.as_str()).collect();
    assert_eq!(keys, ["rate_hz", "unit"]);
    assert_eq!(problem.asks[1].guess.as_deref(), Some("uV"));
    let keys = |text: &str| -> Vec<String> {
        let problem = with(text, Given::default(), false).unwrap_err();
        problem.asks.into_iter().map(|a| a.key).collect()
    };
    assert_eq!(keys("time,a\n0,2\n0.01,4\n0.02,5\n"), ["unit"]);
    assert_eq!(keys("a (uV),b [fT]\n0,2\n0.01,4\n"), ["rate_hz"]);
    let whole = "time,a (fT),b (mV)\n0,2,1\n0.5,4,1\n1,5,1\n";
    let recording = with(whole, Given::default(), false).unwrap();
    assert_eq!(recording.rate_hz, 2.0);
    let units: Vec<&str> = recording.channels.iter().map(|c| c.unit.as_str()).collect();
    assert_eq!(units, ["fT", "µV"]);
    assert_eq!(recording.samples[1], [1000.0; 3]);
}

#[test]
fn its_own_rate_comes_before_one_that_is_told() {
    let recording = read("time,a\n0,2\n0.5,4\n1,5\n").unwrap();
    assert_eq!(recording.rate_hz, 2.0);
    let said = |part: &str| recording.warnings.iter().any(|w| w.contains(part));
    assert!(said("sampling rate of 2 Hz") && said("not the 100 Hz"));
}

#[test]
fn times_that_do_not_run_evenly() {
    let table = |times: &[f64]| {
        times.iter().fold("time,a,b\n".to_owned(), |mut text, t| {
            let _ = writeln!(text, "{t},1,2");
            text
        })
    };
    let mut times: Vec<f64> = (0..50).map(|i| f64::from(i) / 100.0).collect();
    assert_eq!(read(&table(&times)).unwrap().rate_hz, 100.0);
    for (change, at) in [(0.01, 30), (2.0, 30), (-0.01, 30), (-5.0, 12)] {
        let mut bent = times.clone();
        bent[at..].iter_mut().for_each(|t| *t += change);
        let problem = refused(&table(&bent));
        assert_eq!(problem.kind, Kind::Damaged);
        // One line for the header, and lines count from 1.
        assert_eq!(
            problem.place,
            Some(format!("line {}, column \"time\"", at + 2))
        );
        assert_eq!(problem.salvage.unwrap().records, at as u64);
    }
    times[20] = f64::NAN;
    assert!(refused(&table(&times)).what.contains("no number"));
    // Each step is near the usual one, and yet the clock goes wrong by a whole sample.
    let slow: Vec<f64> = (0..400)
        .map(|i| f64::from(i) / 100.0 + f64::from(i - 200).max(0.0) * 0.002)
        .collect();
    assert!(refused(&table(&slow)).place.unwrap().starts_with("sample "));
}

#[test]
fn a_count_of_samples_is_no_channel_and_no_time() {
    let counted = |first: usize, name: &str| {
        (0..12).fold(format!("{name},a,b\n"), |mut text, i| {
            let _ = writeln!(text, "{},{},3", first + i, i * i);
            text
        })
    };
    for (first, name) in [(0, "sample"), (1, "x"), (0, "")] {
        let recording = read(&counted(first, name)).unwrap();
        assert_eq!(recording.channels.len(), 2, "{name}");
        assert_eq!(recording.others[0].reason, "it counts the samples");
    }
    assert_eq!(
        read(&counted(5, "x")).unwrap().rate_hz,
        1.0,
        "steps of 1 from 5 are a time"
    );
}

#[test]
fn broken_cells_name_their_place() {
    for (text, line, what) in [
        ("a,b\n1,2\n3,x\n", 3, "no number"),
        ("a,b\r\n1,2\r\n3,4\r\nfive,6\r\n", 4, "no number"),
        ("a,b\n1,2\n3\n", 3, "columns"),
        ("a,b\n1,2\n\n3,4,5\n6,7", 4, "columns"),
        ("a;b\n1,5;2,5\n2.5;3,5\n", 3, "decimal marks"),
        ("a;b\n1,5;2,5\n1.234,5;3,5\n", 3, "decimal marks"),
        ("a;b\n1.5;2.5\n1.5;2.5\n1,5;3.5\n", 4, "decimal marks"),
        ("a,b\n1,2\n3,1e39\n", 3, "too large"),
        ("a,b\n1,2\n3,inf\n", 3, "no number"),
        ("a,b\n1,2\n3,4\n5,6\n7,\"8\n9,10", 6, ""),
    ] {
        let problem = refused(text);
        assert_eq!(problem.kind, Kind::Damaged, "{text:?}: {problem}");
        assert!(problem.what.contains(what), "{text:?}: {problem}");
        let place = problem.place.unwrap();
        assert!(
            place.starts_with(&format!("line {line}")),
            "{text:?}: {place}"
        );
    }
}

#[test]
fn rows_before_a_broken_one_can_be_opened() {
    // The broken row's first cell is whole, and yet nothing of the row is kept.
    let half = with("a,b\n1,2\n3,4\n5,x\n", told(100.0, "uV"), true).unwrap();
    assert_eq!(half.samples, [[1.0, 3.0], [2.0, 4.0]]);
    let text = "a,b\n1,2\n3,4\n5\n";
    let problem = refused(text);
    let salvage = problem.salvage.unwrap();
    assert_eq!((salvage.records, salvage.seconds), (2, 0.02));
    let recording = with(text, told(100.0, "uV"), true).unwrap();
    assert_eq!(recording.samples, [[1.0, 3.0], [2.0, 4.0]]);
    assert!(
        recording.warnings[0].contains("Only the 2 whole rows"),
        "{:?}",
        recording.warnings
    );
}

#[test]
fn missing_numbers_stay_missing_and_are_said() {
    let recording = read("a,b\n1,2\n,NaN\n3,n/a\n").unwrap();
    assert!(recording.samples[0][1].is_nan() && recording.samples[1][2].is_nan());
    assert_eq!(recording.samples[0][2], 3.0);
    assert_eq!(
        recording.warnings,
        [
            "Channel \"a\" lacks 1 number, the first in line 3.",
            "Channel \"b\" lacks 2 numbers, the first in line 3."
        ]
    );
}

#[test]
fn columns_of_text_and_names_twice() {
    let recording = read("note,a,a\nfine,1,2\nwell,3,4\n").unwrap();
    let names: Vec<&str> = recording.channels.iter().map(|c| c.name.as_str()).collect();
    assert_eq!(names, ["a", "a (2)"]);
    assert_eq!(recording.others[0].reason, "it holds text");
}

#[test]
fn what_is_no_table_of_samples() {
    assert_eq!(
        refused("onset,duration\n1,0\n2,0\n").kind,
        Kind::Unsupported
    );
    for text in [
        "a,b\n",
        "words, and more\nof them, here\n",
        "one\n2\n",
        "{\"a\": 1, \"b\": 2}\n",
    ] {
        assert_eq!(refused(text).kind, Kind::Unknown, "{text}");
    }
    let rows_for_channels = Given {
        axes: Some(Axes::ChannelsSamples),
        ..told(100.0, "uV")
    };
    let problem = with("1,2\n3,4\n", rows_for_channels, false).unwrap_err();
    assert_eq!(problem.kind, Kind::Unsupported);
}

#[test]
fn comments_a_byte_order_mark_and_many_columns() {
    let recording = read("\u{feff}# made by hand\na,b\n1,2\n# half time\n3,4\n").unwrap();
    assert_eq!(recording.channels[0].name, "a");
    assert_eq!(recording.samples, [[1.0, 3.0], [2.0, 4.0]]);
    let row = |value: &dyn Fn(usize) -> String| {
        let cells: Vec<String> = (0..3000).map(value).collect();
        cells.join(",") + "\n"
    };
    let wide =
        row(&|c| format!("pixel {c}")) + &row(&|c| c.to_string()) + &row(&|c| (c + 1).to_string());
    let recording = read(&wide).unwrap();
    assert_eq!(recording.channels.len(), 3000);
    assert_eq!(recording.samples[2999], [2999.0, 3000.0]);
}

#[test]
fn a_long_table_is_read_in_slices() {
    let rows = 700_000;
    let mut text = "a;b\n".to_owned();
    for i in 0..rows {
        let _ = writeln!(text, "{},5;\"-{i}\"", i % 37);
    }
    assert!(text.len() > 9 << 20);
    let source = MemorySource::new("long.csv", text.into_bytes());
    let options = OpenOptions {
        given: told(1000.0, "mV"),
        ..OpenOptions::default()
    };
    let mut opening = Opening::begin(Box::new(source), Vec::new(), options).unwrap();
    let mut steps = 0;
    while !opening.finished() {
        let (done, of) = opening.step().unwrap();
        assert!(done <= of);
        steps += 1;
    }
    assert!(steps > 9);
    let recording = opening.finish().unwrap();
    assert_eq!(recording.sample_count(), rows);
    assert_eq!(recording.samples[0][654_321], 13_500.0);
    assert_eq!(recording.samples[1][654_321], -654_321_000.0);
}

#[test]
fn a_quotation_mark_left_open_ends_somewhere() {
    let mut text = "a,b\n1,2\n3,\"4\n".to_owned();
    for i in 0..3_000_000 {
        let _ = writeln!(text, "{i},1");
    }
    let problem = refused(&text);
    assert_eq!(problem.kind, Kind::Damaged, "{problem}");
    assert!(problem.expected.unwrap().contains("quotation marks"));
}
