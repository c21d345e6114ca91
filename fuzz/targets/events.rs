//! A table of events beside a recording.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| teasel_fuzz::side(
    &teasel_fuzz::small(),
    "sub-01_events.tsv",
    bytes
));
