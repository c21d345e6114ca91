//! `weights.json`.
#![no_main]
use teasel_core::takeaway::Weights;

libfuzzer_sys::fuzz_target!(|text: &str| {
    let _ = Weights::from_json(text);
});
