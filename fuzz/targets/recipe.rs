//! `recipe.json`: what is read is written and read again.
#![no_main]
use teasel_core::takeaway::{recipe_from_json, recipe_json};

libfuzzer_sys::fuzz_target!(|text: &str| {
    if let Ok(recipe) = recipe_from_json(text) {
        let again = recipe_json(&recipe).and_then(|json| recipe_from_json(&json));
        assert_eq!(again.as_ref(), Ok(&recipe));
    }
});
