//! Tables that lie beside a recording, looked at before they are used.
use crate::convert::{Outcome, from_js, thrown, to_js};
use teasel_core::recipe::EventColumns;
use teasel_core::recording::{SideFile, events_preview, is_side_table};
use wasm_bindgen::JsValue;
use wasm_bindgen::prelude::wasm_bindgen;

fn side(name: String, bytes: Vec<u8>) -> SideFile {
    SideFile { name, bytes }
}

/// What a table of events would give with these columns (`{onset, unit, label, duration}`), or with the likeliest where `columns` is null.
#[wasm_bindgen(js_name = eventsPreview)]
pub fn preview(
    name: String,
    bytes: Vec<u8>,
    columns: JsValue,
    rate_hz: f64,
    span_s: f64,
) -> Outcome<JsValue> {
    let columns: Option<EventColumns> = from_js(columns)?;
    let side = side(name, bytes);
    to_js(&events_preview(&side, columns.as_ref(), rate_hz, span_s).map_err(thrown)?)
}

/// Whether a table is about a recording with these channels, rather than a recording itself.
#[wasm_bindgen(js_name = isSideTable)]
#[must_use]
pub fn is_side(name: String, bytes: Vec<u8>, channels: Vec<String>) -> bool {
    let channels: Vec<&str> = channels.iter().map(String::as_str).collect();
    is_side_table(&side(name, bytes), &channels)
}
