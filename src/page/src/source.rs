//! A file of the browser as a [`Source`].
use crate::convert::Outcome;
use js_sys::{Function, Reflect, Uint8Array};
use teasel_core::error::{Kind, Problem, Result};
use teasel_core::recording::Source;
use wasm_bindgen::{JsCast, JsValue};

/// Reads through a synchronous function `(offset, length) => Uint8Array`; a worker makes one of a `FileReaderSync`.
pub struct JsSource {
    name: String,
    bytes: u64,
    read: Function,
}

impl JsSource {
    /// From `{name, bytes, read}`.
    pub fn of(file: &JsValue) -> Outcome<Box<dyn Source>> {
        let part = |key: &str| Reflect::get(file, &JsValue::from_str(key));
        Ok(Box::new(JsSource {
            name: part("name")?.as_string().unwrap_or_default(),
            bytes: part("bytes")?.as_f64().unwrap_or(0.0) as u64,
            read: part("read")?.dyn_into()?,
        }))
    }
}

impl Source for JsSource {
    fn name(&self) -> &str {
        &self.name
    }
    fn len(&self) -> u64 {
        self.bytes
    }
    fn read_at(&mut self, offset: u64, out: &mut [u8]) -> Result<()> {
        let asked = [
            JsValue::from_f64(offset as f64),
            JsValue::from_f64(out.len() as f64),
        ];
        let read = self
            .read
            .call2(&JsValue::NULL, &asked[0], &asked[1])
            .map_err(|_| self.unreadable(offset))?;
        let read: Uint8Array = read.dyn_into().map_err(|_| self.unreadable(offset))?;
        if read.length() as usize != out.len() {
            return Err(self
                .unreadable(offset)
                .expected_found(bytes(out.len()), bytes(read.length() as usize)));
        }
        read.copy_to(out);
        Ok(())
    }
}

impl JsSource {
    fn unreadable(&self, offset: u64) -> Problem {
        Problem::new(
            Kind::Storage,
            "the browser could not read the file",
            "It may have been moved, changed or locked since it was chosen: choose it again.",
        )
        .in_file(self.name.as_str())
        .at(format!("byte {offset}"))
    }
}

fn bytes(count: usize) -> String {
    format!("{count} bytes")
}
