//! BDF and BDF+, 24 bits.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| teasel_fuzz::recording(b"\xffBIOSEMI", bytes));
