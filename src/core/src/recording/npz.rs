//! NPZ: named NPY arrays in a ZIP archive, stored or deflated.
//!
//! The archive's directory is read by the `rawzip` crate; the one array that is wanted is then read straight from the file.
use super::Source;
use super::array::{Array, ArrayReader, Feed, ask, meaning};
use super::budget::Budget;
use super::given::Asking;
use super::npy;
use super::opening::{Format, OpenOptions, Reader};
use super::seek::Seeking;
use crate::error::{Kind, Problem, Result};
use rawzip::{CompressionMethod, ZipArchive};

/// Names that a single number is taken for the sampling rate by.
pub(super) const RATE_NAMES: &[&str] = &[
    "rate_hz",
    "rate",
    "fs",
    "sampling_rate",
    "sample_rate",
    "frame_rate",
];

/// Bytes of the archive's directory looked at at a time.
const BUFFER_BYTES: usize = 1 << 16;

pub(super) const FORMAT: Format = Format {
    name: "NPZ",
    score: |head| {
        if head.starts_with(b"PK\x03\x04") {
            40
        } else {
            0
        }
    },
    begin,
};

/// A named array and where its bytes begin.
pub(super) struct Named {
    pub(super) name: String,
    pub(super) array: Array,
    /// Stands at the first number.
    pub(super) feed: Feed,
}

fn begin(
    source: &mut dyn Source,
    options: &OpenOptions,
    budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    let mut all = Vec::new();
    for (name, feed) in entries(source)? {
        let mut feed = feed;
        let array = npy::header(source, &mut feed)?;
        all.push(Named { name, array, feed });
    }
    let rate_hz = rate(source, &mut all)?;
    choose("NPZ", all, rate_hz, options, budget)
}

/// Every entry `NAME.npy`, with its bytes.
fn entries(source: &mut dyn Source) -> Result<Vec<(String, Feed)>> {
    let length = source.len();
    let broken = |e: rawzip::Error| {
        Problem::new(
            Kind::Damaged,
            "the archive's directory cannot be read",
            "save the arrays again",
        )
        .at("ZIP directory")
        .expected_found("the directory of a ZIP archive", e)
    };
    let (mut end, mut part) = (vec![0; BUFFER_BYTES], vec![0; BUFFER_BYTES]);
    let archive = ZipArchive::from_seekable(Seeking::new(source), &mut end).map_err(broken)?;
    let mut entries = archive.entries(&mut part);
    let (mut found, mut others) = (Vec::new(), 0);
    while let Some(entry) = entries.next_entry().map_err(broken)? {
        let path = String::from_utf8_lossy(entry.file_path().as_ref()).into_owned();
        let Some(name) = path.strip_suffix(".npy") else {
            others += 1;
            continue;
        };
        let place = archive.get_entry(entry.wayfinder()).map_err(broken)?;
        let (at, end) = place.compressed_data_range();
        let (at, end) = (at.min(length), end.min(length));
        let feed = match entry.compression_method() {
            _ if entry.flags().is_encrypted() => None,
            CompressionMethod::STORE => Some(Feed::plain(at, end)),
            CompressionMethod::DEFLATE => Some(Feed::inflated(at, end, false)),
            _ => None,
        };
        let feed = feed.ok_or_else(|| {
            Problem::new(
                Kind::Unsupported,
                "an array in the archive is packed in a way that Teasel does not read",
                "save it stored or deflated, without a password",
            )
            .at(format!("\"{name}\""))
        })?;
        found.push((name.to_owned(), feed));
    }
    if found.is_empty() {
        return Err(Problem::new(
            Kind::Unknown,
            "the ZIP archive holds no NPY array",
            "open the recording itself, or an NPZ archive",
        )
        .at("ZIP directory")
        .expected_found("an entry that ends in .npy", format!("{others} others")));
    }
    Ok(found)
}

/// The rate that stands beside the samples as a single number; its array is taken out of the list.
pub(super) fn rate(source: &mut dyn Source, all: &mut Vec<Named>) -> Result<Option<f64>> {
    let single = |n: &Named| n.array.count() == Some(1) && RATE_NAMES.contains(&n.name.as_str());
    let Some(at) = all.iter().position(single) else {
        return Ok(None);
    };
    let Named {
        array, mut feed, ..
    } = all.remove(at);
    let mut bytes = vec![0; array.number.bytes()];
    feed.fill(source, &mut bytes)?;
    let mut out = Vec::new();
    array
        .number
        .decode(array.big_endian, &bytes, 1, 1, 1.0, &mut out);
    // Through the shortest decimal: 0.1 read as f32 would become 0.10000000149.
    Ok(out
        .first()
        .and_then(|hz| hz.to_string().parse::<f64>().ok()))
}

/// The array that is asked for, or the only one that fits.
pub(super) fn choose(
    format: &str,
    mut all: Vec<Named>,
    rate_hz: Option<f64>,
    options: &OpenOptions,
    budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    let listed: Vec<String> = all
        .iter()
        .take(12)
        .map(|n| format!("{} ({})", n.name, n.array.shape()))
        .collect();
    all.retain(|n| n.array.fits());
    if all.is_empty() {
        return Err(no_array(&listed));
    }
    let names: Vec<String> = all.iter().map(|n| n.name.clone()).collect();
    let largest = all.iter().max_by_key(|n| n.array.count());
    let mut asking = Asking::new(&options.given);
    let name = asking.variable(&names, largest.map(|n| n.name.as_str()));
    let Some(at) = names.iter().position(|n| Some(n) == name.as_ref()) else {
        // The other questions are about the array that is chosen; they are asked with the likeliest one in mind.
        if let Some(largest) = largest {
            ask(&largest.array, rate_hz, &mut asking);
        }
        asking.settle(&format!("the file with the arrays {}", listed.join(", ")))?;
        return Err(no_array(&listed));
    };
    let Named { array, feed, .. } = all.swap_remove(at);
    feed.holds(array.bytes().unwrap_or(u64::MAX))?;
    let meaning = meaning(&array, &options.given, rate_hz)?;
    ArrayReader::begin(format, array, meaning, feed, budget)
}

fn no_array(listed: &[String]) -> Problem {
    Problem::new(
        Kind::Unsupported,
        "no array of the file is channels × samples or frames × height × width",
        "save the recording as an array with two or three axes",
    )
    .at("arrays")
    .expected_found("2 or 3 axes", listed.join(", "))
}
