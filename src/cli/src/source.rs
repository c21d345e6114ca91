//! Recordings and side files on disk.
use crate::Given;
use crate::say::Meter;
use std::fs::File;
use std::io::{ErrorKind, Read, Seek, SeekFrom};
use std::path::Path;
use teasel_core::error::{Kind, Problem, Result};
use teasel_core::recipe;
use teasel_core::recording::{
    MEMORY_BYTES, OpenOptions, Opened, Opening, Recording, SideFile, Source, lies_beside,
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
        Opened::Whole(recording) => Ok(*recording),
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

/// What a side file is about, as its name says: `events.tsv`, `eeg.json`.
fn kind(name: &str) -> &str {
    name.rsplit_once('_').map_or(name, |(_, kind)| kind)
}

/// The side files of a recording: the ones given that bear its name (or all of a kind, where none does), and those beside it under their
/// BIDS names, unless one of their kind was given.
fn sides(path: &Path, given: &Given) -> Result<Vec<SideFile>> {
    let recording = file_name(path);
    let mut sides = Vec::new();
    let names: Vec<String> = given.with.iter().map(|p| file_name(p)).collect();
    let own = |name: &String| lies_beside(&recording, name);
    for (side, name) in given.with.iter().zip(&names) {
        let rivals = names.iter().any(|n| kind(n) == kind(name) && own(n));
        if own(name) || !rivals {
            sides.push(side_file(side)?);
        }
    }
    // A table that was given, whatever its name, may be one of events.
    let is_table = |n: &String| {
        !["channels.tsv", "electrodes.tsv"].contains(&kind(n)) && !n.ends_with(".json")
    };
    for name in beside(path) {
        let given_one = names.iter().any(|n| kind(n) == kind(&name))
            || kind(&name) == "events.tsv" && names.iter().any(is_table);
        if !given_one {
            sides.push(side_file(&path.with_file_name(name))?);
        }
    }
    Ok(sides)
}

/// Names of the side files that lie beside a recording, in order.
fn beside(path: &Path) -> Vec<String> {
    let folder = path.parent().filter(|p| !p.as_os_str().is_empty());
    let recording = file_name(path);
    // A folder that cannot be listed has nothing to offer; the recording itself will say what is wrong.
    let entries = std::fs::read_dir(folder.unwrap_or(Path::new(".")))
        .into_iter()
        .flatten();
    let mut names: Vec<String> = entries
        .flatten()
        .filter(|entry| entry.path().is_file())
        .map(|entry| entry.file_name().to_string_lossy().into_owned())
        .filter(|name| lies_beside(&recording, name))
        .collect();
    names.sort();
    names
}

fn side_file(path: &Path) -> Result<SideFile> {
    Ok(SideFile {
        name: file_name(path),
        bytes: whole(path, SIDE_CAP)?,
    })
}
