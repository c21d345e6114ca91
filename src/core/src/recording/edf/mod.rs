//! EDF (Kemp, Värri, Rosa, Nielsen & Gade 1992) and EDF+ (Kemp & Olivan 2003), 16 bits; BDF and BDF+, the same with 24 bits.
//!
//! ```text
//! header   256 bytes of ASCII fields, then 256 more for each signal, field by field over all signals
//! record   for each signal its samples, little-endian two's complement of 16 bits (BDF: 24); then the next record
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
//! # Trigger codes
//! In BDF a signal called `Status` holds trigger codes in its low 16 bits. Wherever a bit of them rises, there is an event; its label is the
//! code as a number (common practice, no source). What stands there at the very start is no event.
//!
//! # Names
//! A signal called `EDF Annotations` (`BDF Annotations`) is text only in an EDF+ (BDF+) file. In plain EDF it is a signal like any other.
mod annotations;
mod codes;
mod header;
mod read;
mod records;
mod write;

pub use write::{Identity, write, write_24_bit};

use super::opening::Format;
use header::Width;

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
    begin: |source, options, budget| read::begin(Width::Two, source, options, budget),
};

/// The 24-bit sibling: the same header and records, three bytes a sample, and a channel of trigger codes.
pub(super) const FORMAT_24_BIT: Format = Format {
    name: "BDF",
    score: |head| {
        if head.starts_with(b"\xffBIOSEMI") {
            100
        } else {
            0
        }
    },
    begin: |source, options, budget| read::begin(Width::Three, source, options, budget),
};
