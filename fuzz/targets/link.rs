//! The text of a link, as base64url and as what is in it.
#![no_main]
use teasel_core::takeaway::{link_decode, link_encode};

libfuzzer_sys::fuzz_target!(|text: &str| {
    if let Ok(link) = link_decode(text) {
        for with_names in [true, false] {
            assert!(
                link_decode(&link_encode(&link.recipe, with_names)).is_ok()
                    || link.events.is_some()
            );
        }
    }
});
