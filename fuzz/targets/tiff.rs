//! TIFF and BigTIFF stacks, either byte order: nothing is put before them.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| teasel_fuzz::recording(b"", bytes));
