//! One planted recording through every format gives the same results, to the format's own precision.
//!
//! A format is a row of [`formats`]: its name, the recording as its bytes, and how far its samples may lie from those planted, in µV.
use super::packed::gz;
use super::{read_with, told};
use std::io::{Cursor, Write};
use teasel_core::analysis::Analysis;
use teasel_core::demo::{self, WATCH_SEED};
use teasel_core::error::Result;
use teasel_core::recipe::{Axes, Given, Keep, Recipe};
use teasel_core::recording::{MemorySource, OpenOptions, Recording, SideFile, edf, open};
use teasel_core::sheet::{Component, Sheet};
use teasel_core::takeaway::{recording_csv, recording_npy};
use teasel_tests::{close, largest};
use zip::ZipWriter;
use zip::write::SimpleFileOptions;

/// One way to keep the planted recording.
struct Format {
    name: &'static str,
    bytes: Vec<u8>,
    given: Given,
    /// The planted samples are multiples of 0.1 µV.
    rounding: f64,
}

fn formats(planted: &Recording) -> Vec<Format> {
    let nobody = edf::Identity::default();
    let edf = edf::write(planted, &nobody).unwrap();
    let table = recording_csv(planted).unwrap();
    let tabs = table.replace(',', "\t").replace('.', ",");
    let row = |name, bytes, given| Format {
        name,
        bytes,
        given,
        rounding: 0.0,
    };
    let nothing = Given::default;
    let array = recording_npy(planted).unwrap();
    let rows = Given {
        axes: Some(Axes::ChannelsSamples),
        ..told(planted.rate_hz, "uV")
    };
    vec![
        row("EDF+", edf.clone(), nothing()),
        row(
            "BDF+",
            edf::write_24_bit(planted, &nobody).unwrap(),
            nothing(),
        ),
        row("EDF+ in gzip", gz(&edf), nothing()),
        row("CSV", table.clone().into_bytes(), nothing()),
        row("CSV in gzip", gz(table.as_bytes()), nothing()),
        row("TSV with decimal commas", tabs.into_bytes(), nothing()),
        row(
            "CSV without time and units",
            bare(planted),
            told(planted.rate_hz, "uV"),
        ),
        row("NPY", array.clone(), rows.clone()),
        row("NPY in gzip", gz(&array), rows.clone()),
        row("NPZ", named("samples.npy", &array), rows),
    ]
}

/// A ZIP archive of one file.
fn named(name: &str, bytes: &[u8]) -> Vec<u8> {
    let mut archive = ZipWriter::new(Cursor::new(Vec::new()));
    archive
        .start_file(name, SimpleFileOptions::default())
        .unwrap();
    archive.write_all(bytes).unwrap();
    archive.finish().unwrap().into_inner()
}

/// A header of names and rows of numbers.
fn bare(planted: &Recording) -> Vec<u8> {
    let names: Vec<&str> = planted.channels.iter().map(|c| c.name.as_str()).collect();
    let mut text = names.join(",") + "\n";
    for k in 0..planted.sample_count() {
        let row: Vec<String> = planted.samples.iter().map(|s| s[k].to_string()).collect();
        text += &(row.join(",") + "\n");
    }
    text.into_bytes()
}

/// The events as BIDS keeps them, for the formats that hold none.
fn events(planted: &Recording) -> SideFile {
    let mut text = "onset\tduration\ttrial_type\n".to_owned();
    for event in &planted.events {
        text += &format!("{}\t{}\t{}\n", event.onset_s, event.duration_s, event.label);
    }
    SideFile {
        name: "watch_events.tsv".to_owned(),
        bytes: text.into_bytes(),
    }
}

fn read(format: &Format, planted: &Recording) -> Result<Recording> {
    if format.given.is_empty() {
        return read_with("watch_eeg", &format.bytes, vec![events(planted)], false);
    }
    let options = OpenOptions {
        given: format.given.clone(),
        ..OpenOptions::default()
    };
    let source = MemorySource::new("watch_eeg", format.bytes.clone());
    open(Box::new(source), vec![events(planted)], options)
}

fn analysed(recording: Recording, recipe: &Recipe) -> Sheet {
    let mut analysis = Analysis::new(recording, recipe.clone()).unwrap();
    analysis.run(|_| {}).unwrap();
    analysis.sheet().clone()
}

/// Ratios and filters, as one list of numbers.
fn numbers(sheet: &Sheet) -> Vec<f64> {
    let of = |c: &Component| {
        let ratios = [
            c.typical.fitted,
            c.total.fitted,
            c.typical.held_out.unwrap_or(0.0),
        ];
        let scale = largest(&c.filter);
        let filter: Vec<f64> = c.filter.iter().map(|w| w / scale).collect();
        ratios.into_iter().chain(filter).collect::<Vec<f64>>()
    };
    sheet
        .stronger
        .iter()
        .chain(&sheet.weaker)
        .flat_map(of)
        .collect()
}

#[test]
fn the_same_results_through_every_format() {
    let demo = demo::night_watch(WATCH_SEED);
    let planted = demo.recording;
    let mut recipe = demo.recipe;
    recipe.components = 2;
    recipe.keep = Keep::Number(8);
    recipe.evidence.permutations = 0;
    recipe.evidence.bootstrap = 0;
    let wanted = numbers(&analysed(planted.clone(), &recipe));
    assert!(wanted.len() > 60);
    for format in formats(&planted) {
        let name = format.name;
        let recording = read(&format, &planted).unwrap_or_else(|p| panic!("{name}: {p}"));
        assert_eq!(recording.rate_hz, planted.rate_hz, "{name}");
        assert_eq!(recording.channels.len(), planted.channels.len(), "{name}");
        for (a, b) in recording.samples.iter().zip(&planted.samples) {
            let apart = a.iter().zip(b).map(|(x, y)| f64::from((x - y).abs()));
            assert!(apart.fold(0.0, f64::max) <= format.rounding, "{name}");
        }
        if format.rounding == 0.0 {
            // The same samples: the same results, but for the order of two events at one time.
            let got = numbers(&analysed(recording, &recipe));
            assert_eq!(got.len(), wanted.len(), "{name}");
            for (a, b) in got.iter().zip(&wanted) {
                close(name, *a, *b, 1e-9);
            }
        } else {
            for (a, b) in numbers(&analysed(recording, &recipe)).iter().zip(&wanted) {
                // The rounding is noise against a standard deviation of 10 µV and more.
                close(name, *a, *b, 10.0 * format.rounding);
            }
        }
    }
}
