//! NPY: one array of numbers.
//!
//! Format: NumPy's own description of versions 1.0 to 3.0 (`numpy.lib.format`): the mark, two version bytes, the header's length in two or
//! four little-endian bytes, the header (a dictionary of `descr`, `fortran_order` and `shape`), then the numbers.
use super::Source;
use super::array::{Array, ArrayReader, Feed, Number, meaning, not_fitting};
use super::budget::Budget;
use super::opening::{Format, OpenOptions, Reader};
use crate::error::{Kind, Problem, Result};

const MARK: &[u8] = b"\x93NUMPY";
/// The longest header that is read; NumPy itself refuses longer ones unless told otherwise.
const HEADER_BYTES: u64 = 10_000;

pub(super) const FORMAT: Format = Format {
    name: "NPY",
    score: |head| if head.starts_with(MARK) { 100 } else { 0 },
    begin,
};

fn begin(
    source: &mut dyn Source,
    options: &OpenOptions,
    budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    let mut feed = Feed::plain(0, source.len());
    let array = header(source, &mut feed)?;
    if !array.fits() {
        return Err(not_fitting(&array));
    }
    feed.holds(array.bytes().unwrap_or(u64::MAX))?;
    let meaning = meaning(&array, &options.given, None)?;
    ArrayReader::begin("NPY", array, meaning, feed, budget)
}

/// Reads the header; `feed` stands at the first number afterwards.
pub(super) fn header(source: &mut dyn Source, feed: &mut Feed) -> Result<Array> {
    let mut start = [0; 8];
    feed.fill(source, &mut start)?;
    if !start.starts_with(MARK) {
        return Err(damaged(
            "byte 0",
            "the mark of an NPY array",
            start.escape_ascii(),
        ));
    }
    let length = match start[6] {
        1 => {
            let mut bytes = [0; 2];
            feed.fill(source, &mut bytes)?;
            u64::from(u16::from_le_bytes(bytes))
        }
        2 | 3 => {
            let mut bytes = [0; 4];
            feed.fill(source, &mut bytes)?;
            u64::from(u32::from_le_bytes(bytes))
        }
        other => {
            return Err(Problem::new(
                Kind::Unsupported,
                "this is a version of NPY that Teasel does not read",
                "save it with version 1.0, 2.0 or 3.0",
            )
            .at("byte 6")
            .expected_found("1, 2 or 3", other));
        }
    };
    if length > HEADER_BYTES {
        let most = format!("at most {HEADER_BYTES} bytes of header");
        return Err(damaged("byte 8", &most, length));
    }
    let mut text = vec![0; length as usize];
    feed.fill(source, &mut text)?;
    parse(&String::from_utf8_lossy(&text))
}

fn damaged(place: &str, expected: &str, found: impl std::fmt::Display) -> Problem {
    Problem::new(
        Kind::Damaged,
        "the header of the NPY array is damaged",
        "save the array again",
    )
    .at(place)
    .expected_found(expected, found)
}

fn parse(text: &str) -> Result<Array> {
    let wrong = |key: &str, expected: &str| {
        let found = value_of(text, key).unwrap_or("nothing");
        let found: String = found.chars().take(40).collect();
        damaged(&format!("header, {key}"), expected, found)
    };
    let descr = value_of(text, "descr").ok_or_else(|| wrong("descr", "a type of numbers"))?;
    let (number, big_endian) = number(descr)?;
    let order = value_of(text, "fortran_order").unwrap_or_default();
    let first_fastest = match () {
        () if order.starts_with("True") => true,
        () if order.starts_with("False") => false,
        () => return Err(wrong("fortran_order", "True or False")),
    };
    let sizes = value_of(text, "shape")
        .and_then(|value| value.strip_prefix('(')?.split_once(')'))
        .and_then(|(inside, _)| {
            inside
                .split(',')
                .map(str::trim)
                .filter(|size| !size.is_empty())
                .map(|size| size.trim_end_matches('L').parse::<u64>().ok())
                .collect::<Option<Vec<u64>>>()
        })
        .ok_or_else(|| wrong("shape", "sizes in parentheses"))?;
    Ok(Array {
        number,
        big_endian,
        sizes,
        first_fastest,
    })
}

/// What follows `'key':` in the header.
fn value_of<'a>(text: &'a str, key: &str) -> Option<&'a str> {
    let at = text
        .find(&format!("'{key}'"))
        .or_else(|| text.find(&format!("\"{key}\"")))?;
    text[at + key.len() + 2..]
        .trim_start()
        .strip_prefix(':')
        .map(str::trim_start)
}

/// The type in `'<f4'`.
fn number(descr: &str) -> Result<(Number, bool)> {
    let unsupported = |found: &str| {
        Problem::new(
            Kind::Unsupported,
            "the array holds values that are not plain numbers of a known size",
            "save it as f4, f8, i1, i2, i4, i8, u1, u2, u4 or u8",
        )
        .at("header, descr")
        .expected_found(
            "a type such as <f4, >i2, |u1",
            found.chars().take(40).collect::<String>(),
        )
    };
    let quote = descr.chars().next().filter(|c| *c == '\'' || *c == '"');
    let word = quote
        .and_then(|quote| descr[1..].split_once(quote))
        .map(|(word, _)| word)
        .ok_or_else(|| unsupported(descr))?;
    let (big_endian, kind) = match word.as_bytes() {
        [b'>', ..] => (true, &word[1..]),
        [b'<' | b'=' | b'|', ..] => (false, &word[1..]),
        _ => (false, word),
    };
    let number = match kind {
        "i1" => Number::I8,
        "u1" => Number::U8,
        "i2" => Number::I16,
        "u2" => Number::U16,
        "i4" => Number::I32,
        "u4" => Number::U32,
        "i8" => Number::I64,
        "u8" => Number::U64,
        "f4" => Number::F32,
        "f8" => Number::F64,
        _ => return Err(unsupported(word)),
    };
    Ok((number, big_endian))
}
