//! Everything in one ZIP, with a page of plain words and the sums that prove it whole.
use super::written;
use crate::error::Result;
use flate2::{Compression, write::DeflateEncoder};
use rawzip::time::UtcDateTime;
use rawzip::{CompressionMethod, ZipArchiveWriter};
use sha2::{Digest, Sha256};
use std::fmt::Write as _;
use std::io::Write;

/// What each file is, by its name or its ending, for README.txt.
const KINDS: [(&str, &str); 21] = [
    (
        "weights.json",
        "filters for the raw channels, patterns and preparation; `teasel apply` reads it",
    ),
    (
        "weights.csv",
        "the same filters and patterns as a table, one channel a row",
    ),
    (
        "results.json",
        "every number of the result in full precision",
    ),
    (
        "recipe.json",
        "the choices alone; with the recording they give this result again",
    ),
    (
        "series.csv",
        "time courses of the components, one sample a row",
    ),
    (
        "series.npy",
        "the same as a NumPy array, components × samples",
    ),
    (
        "filters.npy",
        "filters for the raw channels as a NumPy array, components × channels",
    ),
    (
        "patterns.npy",
        "patterns as a NumPy array, components × channels",
    ),
    (
        "series.edf",
        "the same as EDF+ with the recording's events, rounded to 16 bits",
    ),
    (
        "trials.csv",
        "power of every component in every window, one row each, for statistics elsewhere",
    ),
    (
        "cleaned.edf",
        "the prepared recording without the chosen components (or with nothing but them), as EDF+",
    ),
    (
        "cleaned.npy",
        "the same as a NumPy array, channels × samples, without rounding to 16 bits",
    ),
    ("cleaned.csv", "what the cleaning did to every channel"),
    ("methods.txt", "the methods paragraph and its references"),
    ("references.bib", "the references as BibTeX"),
    (
        "row.json",
        "what `teasel gather` makes a table of recordings from",
    ),
    (
        "report.html",
        "the report: open it in a browser, print it on A4",
    ),
    (".svg", "a figure that can be enlarged without loss"),
    (".png", "a figure as pixels"),
    (".csv", "the numbers behind a figure"),
    (".npy", "a NumPy array"),
];

/// A file name that every system can store: letters, digits, `.`, `-` and `_`, at most 80 of them, no leading dot, no
/// reserved device name.
pub fn safe_name(name: &str) -> String {
    let mut safe: String = name
        .chars()
        .map(|c| {
            if c.is_ascii_alphanumeric() || ".-_".contains(c) {
                c
            } else {
                '_'
            }
        })
        .collect();
    if safe.len() > 80 {
        let ending = safe
            .rfind('.')
            .filter(|at| safe.len() - at <= 10)
            .map_or(String::new(), |at| safe[at..].to_string());
        safe.truncate(80 - ending.len());
        safe.push_str(&ending);
    }
    let safe = safe.trim_start_matches(['.', '-']).trim_end_matches('.');
    let stem = safe.split('.').next().unwrap_or("").to_ascii_lowercase();
    let device = ["con", "prn", "aux", "nul"].contains(&stem.as_str())
        || (stem.len() == 4
            && (stem.starts_with("com") || stem.starts_with("lpt"))
            && stem.ends_with(|c: char| c.is_ascii_digit()));
    match (safe.is_empty(), device) {
        (true, _) => "file".into(),
        (_, true) => format!("_{safe}"),
        _ => safe.into(),
    }
}

/// A path of safe names: folders are kept, `..` and roots are not.
fn safe_path(path: &str) -> String {
    let parts: Vec<String> = path
        .split(['/', '\\'])
        .filter(|part| !part.trim_matches('.').is_empty())
        .map(safe_name)
        .collect();
    if parts.is_empty() {
        "file".into()
    } else {
        parts.join("/")
    }
}

/// Names made safe and, where two would be one (also where letters' case is not told apart), numbered.
fn distinct(files: &[(String, Vec<u8>)]) -> Vec<String> {
    let mut taken: Vec<String> = vec!["readme.txt".into(), "manifest.txt".into()];
    let mut names = Vec::new();
    for (name, _) in files {
        let safe = safe_path(name);
        let mut candidate = safe.clone();
        let mut count = 2;
        while taken.contains(&candidate.to_ascii_lowercase()) {
            candidate = match safe.rsplit_once('.') {
                Some((stem, ending)) if !ending.contains('/') => {
                    format!("{stem}-{count}.{ending}")
                }
                _ => format!("{safe}-{count}"),
            };
            count += 1;
        }
        taken.push(candidate.to_ascii_lowercase());
        names.push(candidate);
    }
    names
}

/// The SHA-256 sum of bytes in hexadecimal digits.
fn sum(bytes: &[u8]) -> String {
    Sha256::digest(bytes)
        .iter()
        .fold(String::new(), |mut text, byte| {
            // Writing to a String cannot fail.
            let _ = write!(text, "{byte:02x}");
            text
        })
}

fn readme(names: &[String]) -> String {
    let mut text = format!(
        "Taken from {} {}.\r\n\r\nWhat is in here:\r\n\r\n",
        crate::PROGRAM,
        crate::VERSION
    );
    // One line a kind: a single file by its name, several by their folder and ending.
    let mut left: Vec<&String> = names.iter().collect();
    for (kind, what) in KINDS.iter().chain([&("", "a further file")]) {
        let (these, others): (Vec<&String>, Vec<&String>) =
            left.into_iter().partition(|name| name.ends_with(kind));
        left = others;
        let label = match these.as_slice() {
            [] => continue,
            [one] => (*one).clone(),
            [first, ..] if kind.is_empty() => format!("{first} and {} more", these.len() - 1),
            [first, ..] => {
                let folder = first.rsplit_once('/').map_or("", |(folder, _)| folder);
                let together = these
                    .iter()
                    .all(|name| name.rsplit_once('/').map_or("", |(f, _)| f) == folder);
                match (together, folder.is_empty()) {
                    (true, false) => format!("{folder}/*{kind} ({} files)", these.len()),
                    _ => format!("*{kind} ({} files)", these.len()),
                }
            }
        };
        let _ = write!(text, "  {label}: {what}\r\n");
    }
    text.push_str(
        "  manifest.txt: the SHA-256 sum of every other file; `sha256sum -c manifest.txt` checks them\r\n\r\n\
         The recording itself is not in here, nor what it says about the person recorded.\r\n\
         recipe.json and the recording together give the same numbers again, on the page or with `teasel run`.\r\n\r\n",
    );
    text.push_str(crate::CAUTION);
    text.push_str("\r\n");
    text
}

/// A ZIP of `files` (name, bytes) with `README.txt` in plain words and `manifest.txt` of SHA-256 sums. Names are made safe;
/// the same files give the same bytes (every time stamp is 1980-01-01, the format's first day).
pub fn archive(files: &[(String, Vec<u8>)]) -> Result<Vec<u8>> {
    let names = distinct(files);
    let readme = readme(&names);
    let mut manifest = format!("{}  README.txt\n", sum(readme.as_bytes()));
    for (name, (_, bytes)) in names.iter().zip(files) {
        let _ = writeln!(manifest, "{}  {name}", sum(bytes));
    }
    let first_day = UtcDateTime::from_components(1980, 1, 1, 0, 0, 0, 0);
    let mut zip = ZipArchiveWriter::new(Vec::new());
    let own = [
        ("README.txt", readme.as_bytes()),
        ("manifest.txt", manifest.as_bytes()),
    ];
    let all = own.into_iter().chain(
        names
            .iter()
            .map(String::as_str)
            .zip(files.iter().map(|(_, bytes)| bytes.as_slice())),
    );
    for (name, bytes) in all {
        let file = zip
            .new_file(name)
            .compression_method(CompressionMethod::DEFLATE)
            .unix_permissions(0o100_644);
        let file = match first_day {
            Some(day) => file.last_modified(day),
            None => file,
        };
        let (mut entry, plan) = file.start().map_err(written)?;
        let mut packed = plan.wrap(DeflateEncoder::new(&mut entry, Compression::default()));
        packed.write_all(bytes).map_err(written)?;
        let (deflate, sums) = packed.finish().map_err(written)?;
        deflate.finish().map_err(written)?;
        entry.finish(sums).map_err(written)?;
    }
    zip.finish().map_err(written)
}
