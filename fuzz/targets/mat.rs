//! MAT-files of level 5.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| teasel_fuzz::recording(b"MATLAB 5.0 MAT-file", bytes));
