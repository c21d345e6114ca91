//! Reading and writing recordings, against pyEDFlib and against the published text.
//!
//! EDF: Kemp, Värri, Rosa, Nielsen & Gade 1992, *Electroenceph. clin. Neurophysiol.* 82:391–393.
//! EDF+: Kemp & Olivan 2003, *Clin. Neurophysiol.* 114:1755–1761. BIDS: the specification's section on task events.
//!
//! | clause | test |
//! |---|---|
//! | EDF header: version `0`, ASCII fields, 256 bytes and 256 a signal | `outside::committed_files`, `refused::every_field_of_the_header` |
//! | EDF: 16-bit little-endian two's complement, gain and offset from the limits | `outside::committed_files`, `outside::files_of_the_wheel` |
//! | EDF: signals of different rates in one record | `outside::committed_files` (rates, short, plain), `spec::the_commonest_rate_is_analysed` |
//! | EDF: −1 records while recording | `spec::unknown_number_of_records` |
//! | EDF+ 2.1.1: `EDF+C` and `EDF+D` in the reserved field | `spec::gaps_make_stretches`, `refused::every_field_of_the_header` |
//! | EDF+ 2.1.3: digital minimum below maximum, physical limits differ and may be inverted | `spec::limits_that_cannot_be_used`, `outside::committed_files` (upside down) |
//! | EDF+ 2.2.1: annotations only in `EDF Annotations`, only in EDF+ | `spec::a_plain_signal_called_annotations` |
//! | EDF+ 2.2.2: onset, duration, several texts, UTF-8 | `outside::committed_files` (words), unit tests of the reader |
//! | EDF+ 2.2.3: several annotation signals | `outside::committed_files` (words), `spec::several_annotation_signals` |
//! | EDF+ 2.2.4: the record's own onset, a start that is a fraction late | `outside::committed_files` (late), `spec::gaps_make_stretches`, `outside::files_of_the_wheel` |
//! | EDF: start date and time, years from 85 on of the last century | `parts::midnight_leap_days_and_the_turn_of_a_century` |
//! | BDF: first byte 255 and `BIOSEMI`, 24-bit little-endian two's complement, `24BIT` | `bdf::samples_annotations_and_trigger_codes`, `outside::files_of_the_wheel` |
//! | BDF+: `BDF+C`, `BDF+D`, `BDF Annotations` | `bdf` |
//! | BDF: trigger codes in the low 16 bits of `Status` (common practice, no source) | `bdf::samples_annotations_and_trigger_codes` |
//! | RFC 4180: separators, line ends, quotation marks | `delimited` |
//! | RFC 1952: members, sums, lengths | `packed` |
//! | BIDS events: onset, duration, trial_type, value, `n/a` | `tables` |
//! | BIDS channels, electrodes, coordinates, facts about the recording, inheritance | `sides` (with a table of its own) |
//! | any bytes at all: an answer, no panic, little memory | `hostile`, `changed` |
//! | what is written is read again, here and by general libraries | `written`, `watch`, `read_back` |
//! | the same recording in every format gives the same results | `matrix` |
mod bdf;
mod changed;
mod delimited;
mod hostile;
mod matrix;
mod outside;
mod packed;
mod parts;
mod plan;
mod read_back;
mod refused;
mod sides;
mod spec;
mod tables;
mod watch;
mod written;

use teasel_core::error::Result;
use teasel_core::recipe::Given;
use teasel_core::recording::{MemorySource, OpenOptions, Recording, SideFile, open};

/// Opens bytes under a name.
fn read(name: &str, bytes: &[u8]) -> Result<Recording> {
    read_with(name, bytes, Vec::new(), false)
}

fn read_with(name: &str, bytes: &[u8], sides: Vec<SideFile>, salvage: bool) -> Result<Recording> {
    let source = MemorySource::new(name, bytes.to_vec());
    open(
        Box::new(source),
        sides,
        OpenOptions {
            salvage,
            ..OpenOptions::default()
        },
    )
}

/// A rate and a unit for files that carry none.
fn told(rate_hz: f64, unit: &str) -> Given {
    Given {
        rate_hz: Some(rate_hz),
        unit: Some(unit.to_owned()),
        ..Given::default()
    }
}

/// Opens bytes that must be a recording, under their name and under one that says nothing: the content decides.
fn read_twice(name: &str, bytes: &[u8]) -> Recording {
    let named = read(name, bytes).unwrap_or_else(|p| panic!("{p}"));
    let unnamed = read("unknown", bytes).unwrap_or_else(|p| panic!("{p}"));
    assert_eq!(named.samples, unnamed.samples);
    assert_eq!(named.events, unnamed.events);
    named
}

/// Onset, duration and label of every event.
fn events(recording: &Recording) -> Vec<(f64, f64, &str)> {
    let events = recording.events.iter();
    events
        .map(|e| (e.onset_s, e.duration_s, e.label.as_str()))
        .collect()
}
