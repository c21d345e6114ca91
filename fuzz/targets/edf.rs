//! EDF and EDF+, 16 bits.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| teasel_fuzz::recording(b"0       ", bytes));
