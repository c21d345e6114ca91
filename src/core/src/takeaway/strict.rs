//! Reading a JSON file of ours strictly: every error names line, column, what was expected and what was found.
//!
//! A [`Shape`] says what a file may hold. [`check`] walks the text with it (through `serde_json`'s raw values, so that
//! every piece knows where in the text it stands) before `serde` turns the same text into a structure.
use crate::error::{Kind, Problem, Result};
use serde::Deserialize;
use serde::de::{Deserializer, MapAccess, Visitor};
use serde_json::Value;
use serde_json::value::RawValue;
use std::fmt;

/// Keys of an object, whether each must be there, and what it holds.
type Keys = &'static [(&'static str, bool, Shape)];

/// What a piece of JSON may be.
pub(crate) enum Shape {
    /// Exactly these keys; the flag says which must be there.
    Object(Keys),
    /// An object with any keys, each of which holds this.
    Named(&'static Shape),
    /// An object whose `kind` decides its keys.
    Kinds(&'static [(&'static str, Keys)]),
    /// Any finite number.
    Number,
    /// A whole number from 0 to 2^53.
    Whole,
    /// A text.
    Text,
    /// true or false.
    Flag,
    /// A list of two numbers.
    Pair,
    /// A list.
    List(&'static Shape),
    /// One of these texts.
    Word(&'static [&'static str]),
    /// Any of these; the text describes them.
    Either(&'static [Shape], &'static str),
    /// This, or null.
    Maybe(&'static Shape),
}

/// The largest recipe read, in bytes.
pub(crate) const RECIPE_BYTES: usize = 1 << 20;
/// The largest weights file read, in bytes: 2,000 channels of 40 filters and patterns take about 4 MB.
pub(crate) const WEIGHTS_BYTES: usize = 16 << 20;

/// Checks `text`, of at most `most` bytes, against `shape`; `name` is what the file is called in errors ("the recipe").
pub(crate) fn check(text: &str, shape: &Shape, name: &str, most: usize) -> Result<()> {
    if text.len() > most {
        return Err(Problem::new(
            Kind::Recipe,
            format!("{name} is too long to be one"),
            "choose the right file",
        )
        .expected_found(
            format!("at most {most} bytes"),
            format!("{} bytes", text.len()),
        ));
    }
    if text.trim().is_empty() {
        return Err(Problem::new(
            Kind::Recipe,
            format!("{name} is empty"),
            "choose the right file",
        ));
    }
    let broken = |e: serde_json::Error| {
        Problem::new(
            Kind::Recipe,
            format!("{name} is not JSON"),
            "mend it there, or take it from Teasel again",
        )
        .at(format!("line {}, column {}", e.line(), e.column()))
        .expected_found("valid JSON", cause(&e.to_string()))
    };
    // A raw value leaves its numbers unread; the first reading finds those out of range.
    serde_json::from_str::<Value>(text).map_err(broken)?;
    let raw: &RawValue = serde_json::from_str(text).map_err(broken)?;
    Walk { text, name }.value(raw, shape, "")
}

/// Whether the text, a checked object, has this key.
pub(crate) fn holds(text: &str, key: &str) -> bool {
    serde_json::from_str::<Pairs>(text).is_ok_and(|pairs| pairs.0.iter().any(|(k, _)| k == key))
}

/// The place of `path` ("contrast.signal.from_s") in `text`, as words; the path alone where it stands nowhere.
pub(crate) fn place_of(text: &str, path: &str) -> String {
    let mut raw: Option<&RawValue> = serde_json::from_str(text).ok();
    for key in path.split('.') {
        raw = raw
            .and_then(|r| serde_json::from_str::<Pairs>(r.get()).ok())
            .and_then(|p| p.0.into_iter().find(|(k, _)| k == key).map(|(_, v)| v));
    }
    match raw {
        Some(raw) => Walk { text, name: "" }.place(raw, path),
        None => format!("\"{path}\""),
    }
}

/// The keys and raw values of an object, in order, repeated keys and all.
struct Pairs<'a>(Vec<(String, &'a RawValue)>);

impl<'de: 'a, 'a> Deserialize<'de> for Pairs<'a> {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> std::result::Result<Self, D::Error> {
        struct Collect;
        impl<'de> Visitor<'de> for Collect {
            type Value = Vec<(String, &'de RawValue)>;
            fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                f.write_str("an object")
            }
            fn visit_map<A: MapAccess<'de>>(
                self,
                mut map: A,
            ) -> std::result::Result<Self::Value, A::Error> {
                let mut pairs = Vec::new();
                while let Some(pair) = map.next_entry()? {
                    pairs.push(pair);
                }
                Ok(pairs)
            }
        }
        deserializer.deserialize_map(Collect).map(Pairs)
    }
}

struct Walk<'a> {
    text: &'a str,
    name: &'a str,
}

impl<'a> Walk<'a> {
    fn place(&self, raw: &RawValue, path: &str) -> String {
        // A borrowed raw value is a slice of the text, so their addresses give its place.
        let at = (raw.get().as_ptr() as usize).wrapping_sub(self.text.as_ptr() as usize);
        let before = self.text.get(..at).unwrap_or("");
        let line = before.matches('\n').count() + 1;
        let column = before.rsplit('\n').next().map_or(0, |l| l.chars().count()) + 1;
        if path.is_empty() {
            format!("line {line}, column {column}")
        } else {
            format!("line {line}, column {column}, \"{path}\"")
        }
    }

    fn wrong(
        &self,
        raw: &RawValue,
        path: &str,
        expected: impl fmt::Display,
        found: impl fmt::Display,
    ) -> Problem {
        Problem::new(
            Kind::Recipe,
            format!("{} breaks its rules", self.name),
            "mend it there, or take it from Teasel again",
        )
        .at(self.place(raw, path))
        .expected_found(expected, found)
    }

    fn value(&self, raw: &'a RawValue, shape: &Shape, path: &str) -> Result<()> {
        let value: Value = serde_json::from_str(raw.get())
            .map_err(|e| self.wrong(raw, path, "JSON", cause(&e.to_string())))?;
        if fits(&value, shape) {
            return match shape {
                Shape::Object(keys) => self.object(raw, keys, None, path),
                Shape::Kinds(known) => self.kinds(raw, &value, known, path),
                Shape::List(item) => self.list(raw, item, path),
                Shape::Named(item) => self.named(raw, item, path),
                Shape::Either(shapes, _) => shapes
                    .iter()
                    .find(|s| fits(&value, s))
                    .map_or(Ok(()), |s| self.value(raw, s, path)),
                Shape::Maybe(inner) if !value.is_null() => self.value(raw, inner, path),
                _ => Ok(()),
            };
        }
        Err(self.wrong(raw, path, describe(shape), found(&value)))
    }

    fn object(
        &self,
        raw: &'a RawValue,
        keys: &[(&str, bool, Shape)],
        also: Option<&str>,
        path: &str,
    ) -> Result<()> {
        let pairs: Pairs = serde_json::from_str(raw.get())
            .map_err(|e| self.wrong(raw, path, "an object", cause(&e.to_string())))?;
        for (at, (key, value)) in pairs.0.iter().enumerate() {
            let here = join(path, key);
            if pairs.0.iter().take(at).any(|(k, _)| k == key) {
                return Err(self.wrong(value, &here, "each key once", "this key a second time"));
            }
            match keys.iter().find(|(k, _, _)| k == key) {
                Some((_, _, shape)) => self.value(value, shape, &here)?,
                None if also == Some(key) => {}
                None => {
                    let known: Vec<&str> =
                        also.into_iter().chain(keys.iter().map(|k| k.0)).collect();
                    return Err(self.wrong(
                        value,
                        path,
                        format!("one of the keys {}", known.join(", ")),
                        format!("the key {}", quote(key)),
                    ));
                }
            }
        }
        match keys
            .iter()
            .find(|(k, needed, _)| *needed && !pairs.0.iter().any(|(p, _)| p == k))
        {
            Some((missing, _, _)) => {
                Err(self.wrong(raw, path, format!("the key \"{missing}\""), "none"))
            }
            None => Ok(()),
        }
    }

    fn kinds(
        &self,
        raw: &'a RawValue,
        value: &Value,
        known: &[(&str, Keys)],
        path: &str,
    ) -> Result<()> {
        let all: Vec<String> = known.iter().map(|k| quote(k.0)).collect();
        let expected = format!("one of the kinds {}", all.join(", "));
        match value.get("kind") {
            Some(Value::String(kind)) => match known.iter().find(|k| k.0 == kind) {
                Some((_, keys)) => self.object(raw, keys, Some("kind"), path),
                None => Err(self.wrong(raw, path, expected, quote(kind))),
            },
            Some(other) => Err(self.wrong(raw, path, expected, found(other))),
            None => Err(self.wrong(raw, path, "the key \"kind\"", "none")),
        }
    }

    fn named(&self, raw: &'a RawValue, item: &Shape, path: &str) -> Result<()> {
        let pairs: Pairs = serde_json::from_str(raw.get())
            .map_err(|e| self.wrong(raw, path, "an object", cause(&e.to_string())))?;
        pairs
            .0
            .iter()
            .try_for_each(|(key, value)| self.value(value, item, &join(path, key)))
    }

    fn list(&self, raw: &'a RawValue, item: &Shape, path: &str) -> Result<()> {
        let items: Vec<&RawValue> = serde_json::from_str(raw.get())
            .map_err(|e| self.wrong(raw, path, "a list", cause(&e.to_string())))?;
        items
            .iter()
            .enumerate()
            .try_for_each(|(at, r)| self.value(r, item, &join(path, &(at + 1).to_string())))
    }
}

fn join(path: &str, key: &str) -> String {
    if path.is_empty() {
        shorten(key)
    } else {
        format!("{path}.{}", shorten(key))
    }
}

fn fits(value: &Value, shape: &Shape) -> bool {
    match shape {
        Shape::Object(_) | Shape::Named(_) | Shape::Kinds(_) => value.is_object(),
        Shape::Flag => value.is_boolean(),
        Shape::Pair => value
            .as_array()
            .is_some_and(|pair| pair.len() == 2 && pair.iter().all(|v| fits(v, &Shape::Number))),
        Shape::Number => value.as_f64().is_some_and(f64::is_finite),
        Shape::Whole => value
            .as_u64()
            .is_some_and(|n| n as f64 <= crate::recipe::WHOLE_MAX),
        Shape::Text => value.is_string(),
        Shape::List(_) => value.is_array(),
        Shape::Word(words) => value.as_str().is_some_and(|t| words.contains(&t)),
        Shape::Either(shapes, _) => shapes.iter().any(|s| fits(value, s)),
        Shape::Maybe(inner) => value.is_null() || fits(value, inner),
    }
}

fn describe(shape: &Shape) -> String {
    match shape {
        Shape::Object(_) | Shape::Named(_) | Shape::Kinds(_) => "an object".into(),
        Shape::Flag => "true or false".into(),
        Shape::Pair => "two numbers [from, to]".into(),
        Shape::Number => "a number".into(),
        Shape::Whole => "a whole number from 0 to 9007199254740991".into(),
        Shape::Text => "a text".into(),
        Shape::List(item) => format!("a list, each entry {}", describe(item)),
        Shape::Word(words) => words
            .iter()
            .map(|w| quote(w))
            .collect::<Vec<_>>()
            .join(" or "),
        Shape::Either(_, words) => (*words).into(),
        Shape::Maybe(inner) => format!("{} or null", describe(inner)),
    }
}

fn found(value: &Value) -> String {
    match value {
        Value::Null => "null".into(),
        Value::Array(items) => format!("a list of {}", items.len()),
        Value::Object(_) => "an object".into(),
        Value::String(text) => quote(text),
        other => other.to_string(),
    }
}

/// A name in quotes, on one line, at most 40 characters of it.
pub(crate) fn quote(text: &str) -> String {
    format!("\"{}\"", shorten(text))
}

fn shorten(text: &str) -> String {
    super::words::plain(text, 40)
}

/// serde_json's sentence without its place, which stands elsewhere.
fn cause(text: &str) -> String {
    text.split(" at line ").next().unwrap_or(text).to_string()
}
