//! Side files other than events: the first byte chooses which.
#![no_main]

const NAMES: [&str; 4] = [
    "sub-01_channels.tsv",
    "sub-01_electrodes.tsv",
    "sub-01_coordsystem.json",
    "sub-01_eeg.json",
];

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    if let [which, rest @ ..] = bytes {
        let name = NAMES[usize::from(*which) % NAMES.len()];
        teasel_fuzz::side(&teasel_fuzz::small(), name, rest);
    }
});
