//! Archives of named NumPy arrays.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| teasel_fuzz::recording(b"PK\x03\x04", bytes));
