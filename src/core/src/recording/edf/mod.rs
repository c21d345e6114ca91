//! EDF (Kemp, Värri, Rosa, Nielsen & Gade 1992) and EDF+ (Kemp & Olivan 2003), 16 bits.
//!
//! ```text
//! header   256 bytes of ASCII fields, then 256 more for each signal, field by field over all signals
//! record   for each signal its samples, 16-bit little-endian two's complement; then the next record
//! value    physical = physical_min + (digital − digital_min) · (physical_max − physical_min) / (digital_max − digital_min)
//! ```
//!
//! # Units
//! V, mV, µV and nV become µV; any other unit stays as written, and so do its numbers.
//! Physical limits may be inverted (minimum above maximum): the gain is then negative, as the file says.
//!
//! # Rates
//! A signal's rate is its samples a record over the record's duration; both may make it fractional. The rate that most signals
//! have is analysed (of two equally frequent ones the higher), the others are listed in [`Recording::others`](super::Recording::others).
//!
//! # Time
//! Annotations and record onsets count from the start time in the header. The first record may start up to a second later;
//! its onset is then the onset of the first stretch, and events keep the file's clock.
//! In EDF+D a record joins the stretch before it where it starts within half a sample of where that stretch's own clock ends,
//! so no sample's time is wrong by more than half a sample. EDF+C is taken as continuous, with a warning where its records'
//! onsets say otherwise.
//!
//! # Names
//! A signal called `EDF Annotations` is text only in an EDF+ file. In plain EDF it is a signal like any other.
mod annotations;
mod header;
mod read;
mod records;
mod write;

pub use write::{Identity, write};

use super::Source;
use super::budget::Budget;
use super::opening::{Format, OpenOptions, Reader};
use crate::error::{Kind, Problem, Result};

pub(super) const FORMAT: Format = Format {
    name: "EDF",
    score: |head| {
        if head.starts_with(b"0       ") {
            100
        } else if head.len() >= 8
            && head[0] == b'0'
            && head[1..8].iter().all(|b| b" \0".contains(b))
        {
            60
        } else {
            0
        }
    },
    begin: read::begin,
};

/// The 24-bit sibling, known so that it can be refused in words.
pub(super) const FORMAT_24_BIT: Format = Format {
    name: "BDF",
    score: |head| {
        if head.starts_with(b"\xffBIOSEMI") {
            100
        } else {
            0
        }
    },
    begin: refuse_24_bit,
};

fn refuse_24_bit(
    _source: &mut dyn Source,
    _options: &OpenOptions,
    _budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    Err(Problem::new(
        Kind::Unsupported,
        "this is BDF, with samples of 24 bits, which this version does not read",
        "save it as EDF+ with 16 bits and open that",
    )
    .at("byte 0")
    .expected_found("EDF", "BDF"))
}
