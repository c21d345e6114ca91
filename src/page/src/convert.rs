//! Plain data to and from JavaScript objects.
use serde::Serialize;
use serde::de::DeserializeOwned;
use serde_wasm_bindgen::Serializer;
use teasel_core::error::{Kind, Problem};
use wasm_bindgen::JsValue;

/// What a method of the page layer gives: a problem is thrown as an object with the fields of [`Problem`].
pub type Outcome<T> = Result<T, JsValue>;

/// Objects for maps and structures, `null` for nothing, numbers for every number.
pub fn to_js<T: Serialize + ?Sized>(value: &T) -> Outcome<JsValue> {
    value
        .serialize(&Serializer::json_compatible())
        .map_err(|error| thrown(translation(&error)))
}

/// A structure from a JavaScript object; unknown or missing fields are problems.
///
/// It goes through JSON text: files are read as JSON too, and a second reader of every structure would be a tenth of the module.
pub fn from_js<T: DeserializeOwned>(value: JsValue) -> Outcome<T> {
    let text = match js_sys::JSON::stringify(&value)?.as_string() {
        Some(text) => text,
        // What JSON cannot say (`undefined`) is nothing.
        None => "null".to_owned(),
    };
    serde_json::from_str(&text).map_err(|error| thrown(translation(&error)))
}

/// The same for structures that hold bytes.
pub fn from_js_with_bytes<T: DeserializeOwned>(value: JsValue) -> Outcome<T> {
    serde_wasm_bindgen::from_value(value).map_err(|error| thrown(translation(&error)))
}

/// The object to throw.
pub fn thrown(problem: Problem) -> JsValue {
    problem
        .serialize(&Serializer::json_compatible())
        .unwrap_or_else(|_| JsValue::from_str(&problem.to_string()))
}

fn translation(error: &impl ToString) -> Problem {
    Problem::new(
        Kind::Recipe,
        error.to_string(),
        "Correct the value that it names.",
    )
}
