//! MAT-files of level 5: named matrices, compressed or not.
//!
//! Format: the published description of the level 5 MAT-file format: a header of 128 bytes, then elements. An element has a tag (type and
//! bytes, four bytes each; or both in four bytes where the data fit into the other four) and its data, padded to eight bytes. A matrix
//! is an element of elements: flags, sizes, name, numbers. A compressed element holds one deflated element.
//!
//! # Axis order
//! The first axis moves fastest.
use super::Source;
use super::array::{Array, Feed, Number};
use super::budget::Budget;
use super::npz::{Named, choose, rate};
use super::opening::{Format, OpenOptions, Reader};
use crate::error::{Kind, Problem, Result};

const HEADER_BYTES: u64 = 128;
const COMPRESSED: u32 = 15;
const MATRIX: u32 = 14;
/// Longer names and more axes than these belong to no matrix of numbers.
const NAME_BYTES: u32 = 256;
const AXES_BYTES: u32 = 64;

pub(super) const FORMAT: Format = Format {
    name: "MAT-file",
    score: |head| match head.get(124..128) {
        Some([_, 1, b'I', b'M'] | [1, _, b'M', b'I']) => 90,
        // Version 2.0: an HDF5 file behind the same 128 bytes.
        Some([_, 2, b'I', b'M'] | [2, _, b'M', b'I']) => 90,
        _ if level_4(head) => 30,
        _ => 0,
    },
    begin,
};

/// The 20 bytes that begin a level 4 file: type, rows, columns, imaginary part, length of the name; then a name that ends in NUL.
fn level_4(head: &[u8]) -> bool {
    let word = |at: usize| -> Option<u32> {
        Some(u32::from_le_bytes(head.get(at..at + 4)?.try_into().ok()?))
    };
    let (Some(kind), Some(rows), Some(columns), Some(imaginary), Some(name)) =
        (word(0), word(4), word(8), word(12), word(16))
    else {
        return false;
    };
    let named = head
        .get(20..20 + name.min(64) as usize)
        .and_then(|name| name.split_last())
        .is_some_and(|(end, name)| {
            *end == 0 && !name.is_empty() && name.iter().all(|c| c.is_ascii_graphic())
        });
    kind <= 52 && kind % 10 <= 2 && rows > 0 && columns > 0 && imaginary <= 1 && named
}

fn unsupported(what: &str, found: &str) -> Problem {
    Problem::new(
        Kind::Unsupported,
        what,
        "save it as a level 5 MAT-file (version 7 or 6) that holds one matrix of real numbers",
    )
    .at("file header")
    .expected_found("a MAT-file of level 5", found)
}

fn begin(
    source: &mut dyn Source,
    options: &OpenOptions,
    budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    let mut header = [0; HEADER_BYTES as usize];
    if source.len() < HEADER_BYTES {
        return Err(unsupported(
            "this looks like a MAT-file of level 4",
            "level 4",
        ));
    }
    source.read_at(0, &mut header)?;
    let (big_endian, version) = match header[124..128] {
        [_, version, b'I', b'M'] => (false, version),
        [version, _, b'M', b'I'] => (true, version),
        _ => {
            return Err(unsupported(
                "this looks like a MAT-file of level 4",
                "level 4",
            ));
        }
    };
    if version != 1 {
        return Err(unsupported(
            "this is a MAT-file of version 7.3, which is an HDF5 file inside",
            "version 7.3",
        ));
    }
    let mut all = matrices(source, big_endian, budget)?;
    let rate_hz = rate(source, &mut all)?;
    choose("MAT-file level 5", all, rate_hz, options, budget)
}

/// Every matrix of real numbers, by its name.
fn matrices(source: &mut dyn Source, big_endian: bool, budget: &mut Budget) -> Result<Vec<Named>> {
    let (mut at, length) = (HEADER_BYTES, source.len());
    let mut found = Vec::new();
    while at + 8 <= length {
        let mut feed = Feed::plain(at, length);
        let tag = tag(source, &mut feed, big_endian)?;
        // Only compressed elements are not padded to eight bytes.
        let bytes = u64::from(tag.bytes);
        let padded = if tag.kind == COMPRESSED {
            bytes
        } else {
            bytes.next_multiple_of(8)
        };
        let data = at + 8;
        if data + bytes > length {
            return Err(damaged(
                format!("byte {at}"),
                format!("{bytes} bytes of an element"),
                format!("{} bytes", length - data),
            ));
        }
        let inside = match tag.kind {
            MATRIX => Some(Feed::plain(data, data + bytes)),
            COMPRESSED => {
                let mut feed = Feed::inflated(data, data + bytes, true);
                let inner = self::tag(source, &mut feed, big_endian)?;
                (inner.kind == MATRIX).then_some(feed)
            }
            _ => None,
        };
        if let Some(feed) = inside {
            budget.draw(512, "its names")?;
            found.extend(matrix(source, feed, big_endian, at)?);
        }
        at = data + padded;
    }
    Ok(found)
}

/// What stands before an element's data.
struct Tag {
    kind: u32,
    bytes: u32,
    /// The data themselves, where they stand in the tag.
    inside: Option<[u8; 4]>,
}

fn word(bytes: [u8; 4], big_endian: bool) -> u32 {
    if big_endian {
        u32::from_be_bytes(bytes)
    } else {
        u32::from_le_bytes(bytes)
    }
}

fn tag(source: &mut dyn Source, feed: &mut Feed, big_endian: bool) -> Result<Tag> {
    let mut bytes = [0; 8];
    feed.fill(source, &mut bytes)?;
    let [a, b, c, d, e, f, g, h] = bytes;
    let (first, second) = (
        word([a, b, c, d], big_endian),
        word([e, f, g, h], big_endian),
    );
    Ok(match first >> 16 {
        0 => Tag {
            kind: first,
            bytes: second,
            inside: None,
        },
        small => Tag {
            kind: first & 0xffff,
            bytes: small.min(4),
            inside: Some([e, f, g, h]),
        },
    })
}

/// An element's data, of at most `most` bytes, and the padding after them.
fn data(
    source: &mut dyn Source,
    feed: &mut Feed,
    big_endian: bool,
    most: u32,
) -> Result<Option<(u32, Vec<u8>)>> {
    let tag = tag(source, feed, big_endian)?;
    if tag.bytes > most {
        return Ok(None);
    }
    if let Some(inside) = tag.inside {
        return Ok(Some((tag.kind, inside[..tag.bytes as usize].to_vec())));
    }
    let mut bytes = vec![0; tag.bytes as usize];
    feed.fill(source, &mut bytes)?;
    feed.skip(source, u64::from(tag.bytes.next_multiple_of(8) - tag.bytes))?;
    Ok(Some((tag.kind, bytes)))
}

/// The matrix in `feed`, if it is one of real numbers.
fn matrix(
    source: &mut dyn Source,
    mut feed: Feed,
    big_endian: bool,
    at: u64,
) -> Result<Option<Named>> {
    let broken = |what: &str| damaged(format!("byte {at}"), what.to_owned(), "none".to_owned());
    let Some((_, flags)) = data(source, &mut feed, big_endian, 8)? else {
        return Err(broken("the flags of a matrix"));
    };
    let Some(flags) = flags.first_chunk::<4>().map(|b| word(*b, big_endian)) else {
        return Err(broken("the flags of a matrix"));
    };
    let (class, complex) = (flags & 0xff, flags & 0x800 != 0);
    // 6 double, 7 single, 8 to 15 whole numbers; below 6 cells, structures, objects, text and sparse matrices.
    if !(6..=15).contains(&class) || complex {
        return Ok(None);
    }
    let Some((_, sizes)) = data(source, &mut feed, big_endian, AXES_BYTES)? else {
        return Ok(None);
    };
    let (sizes, _) = sizes.as_chunks::<4>();
    let sizes = sizes
        .iter()
        .map(|b| u64::from(word(*b, big_endian) & i32::MAX as u32))
        .collect();
    let Some((_, name)) = data(source, &mut feed, big_endian, NAME_BYTES)? else {
        return Ok(None);
    };
    let tag = tag(source, &mut feed, big_endian)?;
    let number = match tag.kind {
        1 => Number::I8,
        2 => Number::U8,
        3 => Number::I16,
        4 => Number::U16,
        5 => Number::I32,
        6 => Number::U32,
        7 => Number::F32,
        9 => Number::F64,
        12 => Number::I64,
        13 => Number::U64,
        other => {
            return Err(damaged(
                format!("byte {at}, type of the numbers"),
                "a type from 1 to 13".to_owned(),
                other.to_string(),
            ));
        }
    };
    let array = Array {
        number,
        big_endian,
        sizes,
        first_fastest: true,
    };
    let bytes = u64::from(tag.bytes);
    if array.bytes() != Some(bytes) {
        return Err(damaged(
            format!("byte {at}, sizes {}", array.shape()),
            format!("numbers of {} bytes each", number.bytes()),
            format!("{bytes} bytes in all"),
        ));
    }
    if let Some(inside) = tag.inside {
        feed = Feed::here(&inside[..tag.bytes as usize]);
    }
    Ok(Some(Named {
        name: String::from_utf8_lossy(&name).into_owned(),
        array,
        feed,
    }))
}

fn damaged(place: String, expected: String, found: String) -> Problem {
    Problem::new(
        Kind::Damaged,
        "the MAT-file is damaged",
        "copy it again, or save it again",
    )
    .at(place)
    .expected_found(expected, found)
}
