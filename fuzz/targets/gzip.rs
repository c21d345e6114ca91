//! gzip: broken packing, and whatever bytes come out of packing that is not broken.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    teasel_fuzz::recording(b"\x1f\x8b\x08", bytes);
    teasel_fuzz::recording(b"", &teasel_fuzz::packed(bytes));
});
