//! Recordings and side files on disk.
use crate::Given;
use crate::say::Meter;
use std::fs::File;
use std::io::{ErrorKind, Read, Seek, SeekFrom};
use std::path::Path;
use teasel_core::error::{Kind, Problem, Result};
use teasel_core::recipe;
use teasel_core::recording::{
    MEMORY_BYTES, OpenOptions, Opened, Opening, Recording, SideFile, Source,
};

/// The largest text file (recipe, weights) that is read whole, in bytes; the parsers have their own, smaller caps.
const TEXT_CAP: u64 = 64 << 20;
/// The largest side file that is read whole, in bytes.
const SIDE_CAP: u64 = 1 << 30;

/// A file that is read in slices.
struct FileSource {
    name: String,
    file: File,
    length: u64,
}

impl Source for FileSource {
    fn name(&self) -> &str {
        &self.name
    }
    fn len(&self) -> u64 {
        self.length
    }
    fn read_at(&mut self, offset: u64, out: &mut [u8]) -> Result<()> {
        self.file
            .seek(SeekFrom::Start(offset))
            .and_then(|_| self.file.read_exact(out))
            .map_err(|e| {
                storage("it could not be read to its end", &e)
                    .in_file(&self.name)
                    .at(format!("byte {offset}"))
            })
    }
}

/// An error of the disk.
pub fn storage(what: &str, cause: &std::io::Error) -> Problem {
    let (what, advice) = match cause.kind() {
        ErrorKind::NotFound => ("there is no such file", "check the path".into()),
        ErrorKind::PermissionDenied => (what, "check who may read and write there".into()),
        _ => (what, format!("the system says: {cause}")),
    };
    Problem::new(Kind::Storage, what, advice)
}

/// A path's last part as text.
pub fn file_name(path: &Path) -> String {
    path.file_name()
        .unwrap_or(path.as_os_str())
        .to_string_lossy()
        .into_owned()
}

fn opened(path: &Path) -> Result<(File, u64)> {
    let name = file_name(path);
    let file = File::open(path).map_err(|e| storage("it cannot be opened", &e).in_file(&name))?;
    let about = file
        .metadata()
        .map_err(|e| storage("it cannot be opened", &e).in_file(&name))?;
    if about.is_dir() {
        return Err(Problem::new(
            Kind::Storage,
            "this is a folder, not a file",
            "name the file in it",
        )
        .in_file(name));
    }
    Ok((file, about.len()))
}

/// A whole file of at most `cap` bytes.
fn whole(path: &Path, cap: u64) -> Result<Vec<u8>> {
    let (file, length) = opened(path)?;
    if length > cap {
        return Err(Problem::new(
            Kind::TooLarge,
            "it is too large for a file of its kind",
            "choose the right file",
        )
        .in_file(file_name(path))
        .expected_found(format!("at most {cap} bytes"), format!("{length} bytes")));
    }
    let mut bytes = Vec::new();
    file.take(cap)
        .read_to_end(&mut bytes)
        .map_err(|e| storage("it could not be read", &e).in_file(file_name(path)))?;
    Ok(bytes)
}

/// A whole text file.
pub fn text(path: &Path) -> Result<String> {
    String::from_utf8(whole(path, TEXT_CAP)?).map_err(|e| {
        Problem::new(
            Kind::Recipe,
            "it is not a text in UTF-8",
            "choose the right file",
        )
        .in_file(file_name(path))
        .at(format!("byte {}", e.utf8_error().valid_up_to()))
    })
}

/// A recording with its side files and all its samples; `told` is what its own file does not carry.
pub fn recording(
    path: &Path,
    given: &Given,
    told: &recipe::Given,
    meter: &mut Meter,
) -> Result<Recording> {
    match open(path, given, told, meter)? {
        Opened::Whole(recording) => Ok(recording),
        Opened::Large(_) => Err(Problem::new(
            Kind::TooLarge,
            "the recording is larger than the memory for it",
            "give more with --memory, or open a shorter part of it",
        )
        .in_file(file_name(path))),
    }
}

/// Opens a recording with its side files; where it does not fit into the memory, its samples stay in the file.
pub fn open(path: &Path, given: &Given, told: &recipe::Given, meter: &mut Meter) -> Result<Opened> {
    recipe::given_check(told)?;
    let paths = match given.joined {
        true => &given.recordings[..],
        false => &[path.to_owned()],
    };
    let mut sources: Vec<Box<dyn Source>> = Vec::new();
    for path in paths {
        let (file, length) = opened(path)?;
        sources.push(Box::new(FileSource {
            name: file_name(path),
            file,
            length,
        }));
    }
    let options = OpenOptions {
        salvage: given.salvage,
        given: told.clone(),
    };
    let sides = sides(path, given)?;
    let hint = |mut problem: Problem| {
        let options: Vec<&str> = problem.asks.iter().map(|ask| option(&ask.key)).collect();
        if !options.is_empty() {
            problem.advice = format!(
                "tell it with {}, or in the recipe's \"recording\"",
                options.join(" ")
            );
        }
        if let (Some(part), false) = (problem.salvage, given.salvage) {
            let records = match part.records {
                1 => "1 whole record".to_string(),
                n => format!("{n} whole records"),
            };
            problem.advice.push_str(&format!(
                ", or open the {records} before it ({} s) with --salvage",
                (part.seconds * 1000.0).round() / 1000.0
            ));
        }
        problem
    };
    let memory = given.memory.map_or(MEMORY_BYTES, |mb| mb << 20);
    let mut opening = Opening::begin_joined(sources, sides, options, memory).map_err(hint)?;
    while !opening.finished() {
        let (done, of) = opening.step().map_err(hint)?;
        meter.reading(done, of);
    }
    opening.opened().map_err(hint)
}

/// The option that answers a question.
fn option(key: &str) -> &'static str {
    match key {
        "rate_hz" => "--rate HZ",
        "unit" => "--unit UNIT",
        "axes" => "--axes AXES",
        _ => "--array NAME",
    }
}

/// The recording's table of events under its BIDS name: `sub-01_task-watch_eeg.edf` → `sub-01_task-watch_events.tsv`.
fn bids_table(path: &Path) -> Option<String> {
    let stem = path.file_stem()?.to_string_lossy().into_owned();
    let entity = stem.rsplit_once('_').map_or(stem.as_str(), |(e, _)| e);
    Some(format!("{entity}_events.tsv"))
}

/// The side files of a recording: the ones given that bear its name (or all, where none does), and its table of events
/// beside it where no table was given.
fn sides(path: &Path, given: &Given) -> Result<Vec<SideFile>> {
    let table = bids_table(path);
    let is_table = |p: &Path| p.extension().is_some_and(|e| e.eq_ignore_ascii_case("tsv"));
    let own = given
        .with
        .iter()
        .any(|p| Some(file_name(p)) == table && is_table(p));
    let mut sides = Vec::new();
    for side in &given.with {
        if own && is_table(side) && Some(file_name(side)) != table {
            continue;
        }
        sides.push(SideFile {
            name: file_name(side),
            bytes: whole(side, SIDE_CAP)?,
        });
    }
    let given_one = given.with.iter().any(|p| is_table(p));
    if let Some(name) = table.filter(|_| !given_one) {
        let beside = path.with_file_name(&name);
        if beside.is_file() {
            sides.push(SideFile {
                bytes: whole(&beside, SIDE_CAP)?,
                name,
            });
        }
    }
    Ok(sides)
}
