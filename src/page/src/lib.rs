//! The thin layer between the browser and Teasel's core: it translates, and computes nothing.
//!
//! One compiled module, two instances: the worker's holds a [`session::Session`] with the recording; the page's draws.
//!
//! * [`convert`]: plain data to and from JavaScript, problems as thrown objects.
//! * [`panics`]: the last words of an instance that ends.
mod convert;
mod panics;

use wasm_bindgen::prelude::wasm_bindgen;

/// Runs once when an instance starts.
#[wasm_bindgen(start)]
pub fn start() {
    panics::keep_last_words();
}

/// The program's version.
#[wasm_bindgen]
#[must_use]
pub fn version() -> String {
    teasel_core::VERSION.to_owned()
}
