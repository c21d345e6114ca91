//! A panic ends the instance. Its message is left where the script around it can still read it: `globalThis.teaselLastWords`.
use wasm_bindgen::JsValue;

/// Installs the hook.
pub fn keep_last_words() {
    std::panic::set_hook(Box::new(|info| {
        let words = JsValue::from_str(&info.to_string());
        // Nothing is left to do when even this fails: the instance is ending.
        let _ = js_sys::Reflect::set(&js_sys::global(), &"teaselLastWords".into(), &words);
    }));
}
