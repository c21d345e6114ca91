//! Tables of text: the score decides from the first bytes, so that nothing is put before them.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| teasel_fuzz::recording(b"", bytes));
