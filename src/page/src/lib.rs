//! The thin layer between the browser and Teasel's core: it translates, and computes nothing.
//!
//! One compiled module, two instances: the worker's holds a [`session::Session`] with the recording; the page's draws.
//!
//! * [`session`]: a recording, a recipe, and the steps from one to the other.
//! * [`source`]: a file of the browser as bytes that can be read anywhere.
//! * [`take`]: the files that are taken away.
//! * [`draw`]: figures on the page's canvas and as SVG, and the numbers behind them.
//! * [`links`]: recipes as text and inside an address.
//! * [`beside`]: tables beside a recording, looked at before they are used.
//! * [`convert`]: plain data to and from JavaScript, problems as thrown objects.
//! * [`bench`]: kernels by themselves, for the budget table.
//! * [`panics`]: the last words of an instance that ends.
pub mod bench;
pub mod beside;
mod convert;
pub mod draw;
pub mod links;
mod panics;
pub mod session;
mod source;
mod take;

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
