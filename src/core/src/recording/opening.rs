//! Opening a recording in steps: probe the content, read the header, decode slice after slice, add the side files.
use super::budget::Budget;
use super::large::{Flowing, Large, Scan};
use super::{
    MEMORY_BYTES, Recording, SideFile, Source, edf, gzip, joined, mat, npy, npz,
    sides as side_files, table, tiff,
};
use crate::error::{Kind, Problem, Result};
use std::fmt;

/// How to open a recording.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct OpenOptions {
    /// Open the whole records before a cut or other damage, with a warning, instead of refusing the file.
    pub salvage: bool,
    /// What the file does not carry.
    pub given: crate::recipe::Given,
}

/// What one format's reader does after its header is read.
pub(crate) trait Reader {
    /// Decodes the next slice; returns bytes done and bytes in all, equal when nothing is left.
    fn step(&mut self, source: &mut dyn Source, budget: &mut Budget) -> Result<(u64, u64)>;
    /// The recording, once nothing is left; without samples where they were handed through.
    fn finish(self: Box<Self>) -> Result<Recording>;
    /// Where the samples are not kept: the way to them, slice after slice.
    fn flowing(&mut self) -> Option<&mut dyn Flowing> {
        None
    }
    /// Date and time at which the file's clock starts, in seconds from any one moment; `None` where the file does not say.
    fn start_s(&self) -> Option<f64> {
        None
    }
}

type Begin = fn(&mut dyn Source, &OpenOptions, &mut Budget) -> Result<Box<dyn Reader>>;

/// One row of the probe table.
pub(crate) struct Format {
    /// Name in the trade.
    pub(crate) name: &'static str,
    /// How sure the reader is, from the file's first [`PROBE_BYTES`] bytes: 0 not mine, 100 certain.
    pub(crate) score: fn(&[u8]) -> u8,
    /// Reads the header.
    pub(crate) begin: Begin,
}

/// Every format, one row each. The highest score reads the file; a tie goes to the earlier row.
const FORMATS: &[Format] = &[
    edf::FORMAT,
    edf::FORMAT_24_BIT,
    npy::FORMAT,
    npz::FORMAT,
    mat::FORMAT,
    tiff::FORMAT,
    gzip::FORMAT,
    table::FORMAT,
];

/// First bytes that a probe sees.
const PROBE_BYTES: u64 = 4096;

/// Content that is often dropped by mistake: its first bytes and what to call it.
const OTHER_CONTENT: &[(&[u8], &str)] = &[
    (b"%PDF", "a PDF document"),
    (b"\x89PNG", "a PNG picture"),
    (b"\x89HDF", "an HDF5 file"),
    (b"<", "markup text"),
    (b"{", "JSON text"),
];

/// A recording that is being opened, one slice a step.
///
/// ```
/// use teasel_core::recording::{MemorySource, OpenOptions, Opening, edf};
/// let demo = teasel_core::demo::night_watch(1).recording;
/// let source = MemorySource::new("watch.edf", edf::write(&demo, &edf::Identity::default())?);
/// let mut opening = Opening::begin(Box::new(source), Vec::new(), OpenOptions::default())?;
/// while !opening.finished() {
///     let (_done, _of) = opening.step()?;
/// }
/// assert_eq!(opening.finish()?.samples, demo.samples);
/// # Ok::<(), teasel_core::error::Problem>(())
/// ```
pub struct Opening {
    source: Box<dyn Source>,
    sides: Vec<SideFile>,
    /// As the user gave them, without what side files add.
    options: OpenOptions,
    budget: Budget,
    reader: Box<dyn Reader>,
    /// Takes the samples that are not kept.
    scan: Option<Scan>,
    finished: bool,
}

/// What was opened.
#[derive(Debug)]
pub enum Opened {
    /// All samples are in the memory.
    Whole(Box<Recording>),
    /// The samples stay in the file.
    Large(Box<Large>),
}

impl fmt::Debug for Opening {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Opening")
            .field("source", &self.source.name())
            .field("finished", &self.finished)
            .finish_non_exhaustive()
    }
}

impl Opening {
    /// Probes the content and reads the header.
    ///
    /// # Errors
    /// `Empty`, `Unknown` (no format's mark in the first bytes), `Damaged` (with what can be salvaged), `Unsupported`,
    /// `TooLarge`, and whatever the source says. Each names the file.
    pub fn begin(
        source: Box<dyn Source>,
        sides: Vec<SideFile>,
        options: OpenOptions,
    ) -> Result<Opening> {
        Opening::begin_within(source, sides, options, MEMORY_BYTES)
    }

    /// [`Opening::begin`] where the caller knows how many bytes the open recording may take.
    pub fn begin_within(
        source: Box<dyn Source>,
        sides: Vec<SideFile>,
        options: OpenOptions,
        memory_bytes: u64,
    ) -> Result<Opening> {
        let budget = Budget::new(source.len(), memory_bytes);
        Opening::begin_with(source, sides, options, budget)
    }

    /// The same for a caller that takes what [`Opening::opened`] gives: where the samples do not fit into `memory_bytes` and the format allows
    /// it, they are looked over and stay in the file.
    pub fn begin_streaming(
        source: Box<dyn Source>,
        sides: Vec<SideFile>,
        options: OpenOptions,
        memory_bytes: u64,
    ) -> Result<Opening> {
        let budget = Budget::new(source.len(), memory_bytes).streaming();
        Opening::begin_with(source, sides, options, budget)
    }

    fn begin_with(
        mut source: Box<dyn Source>,
        sides: Vec<SideFile>,
        options: OpenOptions,
        mut budget: Budget,
    ) -> Result<Opening> {
        let name = source.name().to_owned();
        let sides = unpacked(sides)?;
        let completed = completed(&options, &name, &sides)?;
        let mut reader = begin_reader(source.as_mut(), &completed, &mut budget)
            .map_err(|problem| problem.in_file(name))?;
        let scan = reader
            .flowing()
            .map(|flow| Scan::new(flow.channels(), flow.expected()));
        Ok(Opening {
            source,
            sides,
            options,
            budget,
            reader,
            scan,
            finished: false,
        })
    }

    /// Opens several files of one recording, in the natural order of their names; the recording is called after the first. A single file is
    /// opened as by [`Opening::begin_streaming`].
    ///
    /// # Errors
    /// Those of [`Opening::begin`]; `Unsupported` for a file with other channels or another rate, named.
    pub fn begin_joined(
        mut sources: Vec<Box<dyn Source>>,
        sides: Vec<SideFile>,
        options: OpenOptions,
        memory_bytes: u64,
    ) -> Result<Opening> {
        if sources.len() == 1
            && let Some(source) = sources.pop()
        {
            return Opening::begin_streaming(source, sides, options, memory_bytes);
        }
        let first = sources.iter().map(|s| s.name());
        let name = first.min_by(|a, b| joined::natural_order(a, b));
        let together = joined::Together {
            name: name.unwrap_or_default().to_owned(),
            bytes: sources.iter().map(|source| source.len()).sum(),
        };
        let mut budget = Budget::new(together.bytes, memory_bytes);
        let sides = unpacked(sides)?;
        let completed = completed(&options, &together.name, &sides)?;
        let reader = joined::begin(sources, &completed, &mut budget)?;
        Ok(Opening {
            source: Box::new(together),
            sides,
            options,
            budget,
            reader,
            scan: None,
            finished: false,
        })
    }

    /// Reads and decodes the next slice of 8 MiB or one record; returns bytes done and bytes in all, equal when nothing is left.
    pub fn step(&mut self) -> Result<(u64, u64)> {
        let (done, of) = self
            .reader
            .step(self.source.as_mut(), &mut self.budget)
            .map_err(|problem| problem.in_file(self.source.name()))?;
        if let (Some(scan), Some(flow)) = (&mut self.scan, self.reader.flowing()) {
            let stretches = flow.stretches().to_vec();
            flow.drain(&mut |channel, samples| scan.push(channel, samples, &stretches));
        }
        self.finished = done >= of;
        Ok((done, of))
    }

    /// Whether nothing is left to read.
    pub fn finished(&self) -> bool {
        self.finished
    }

    /// The recording, with its side files; reads what is left, if anything is.
    ///
    /// # Errors
    /// Those of the reader; `TooLarge` where the samples were handed through ([`Opening::begin_streaming`]): [`Opening::opened`] gives those.
    pub fn finish(self) -> Result<Recording> {
        match self.opened()? {
            Opened::Whole(recording) => Ok(*recording),
            Opened::Large(large) => Err(Problem::new(
                Kind::TooLarge,
                "the recording is larger than the memory for it",
                "open a shorter part of it, or one with fewer channels or a lower sampling rate",
            )
            .in_file(large.outline().name.as_str())),
        }
    }

    /// What was opened, with its side files; reads what is left, if anything is.
    pub fn opened(mut self) -> Result<Opened> {
        while !self.finished {
            self.step()?;
        }
        let pieces = self.reader.flowing().map(|flow| flow.pieces());
        let name = self.source.name().to_owned();
        let mut recording = self
            .reader
            .finish()
            .map_err(|problem| problem.in_file(name.as_str()))?;
        recording.name = name;
        warn_of_rate(&mut recording, self.options.given.rate_hz);
        side_files::apply(&mut recording, &self.sides, &self.options.given)?;
        recording
            .events
            .sort_by(|a, b| a.onset_s.total_cmp(&b.onset_s));
        Ok(match (self.scan, pieces) {
            (Some(scan), Some(pieces)) => {
                let large = Large::new(recording, self.source, pieces, scan)?;
                Opened::Large(Box::new(large))
            }
            _ => Opened::Whole(Box::new(recording)),
        })
    }
}

/// A file's own rate comes before one that was told; that the two differ is said.
fn warn_of_rate(recording: &mut Recording, told_hz: Option<f64>) {
    if let Some(told) = told_hz.filter(|hz| (hz / recording.rate_hz - 1.0).abs() > 1e-9) {
        recording.warnings.push(format!(
            "The file says {} Hz, which was used, and not the {told} Hz that it was opened with.",
            recording.rate_hz
        ));
    }
}

/// Opens a recording in one go.
pub fn open(
    source: Box<dyn Source>,
    sides: Vec<SideFile>,
    options: OpenOptions,
) -> Result<Recording> {
    Opening::begin(source, sides, options)?.finish()
}

/// Probes the content and lets its reader begin.
pub(super) fn begin_reader(
    source: &mut dyn Source,
    options: &OpenOptions,
    budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    let format = probe(source)?;
    (format.begin)(source, options, budget)
}

/// The options with what side files tell of a format that does not.
fn completed(options: &OpenOptions, name: &str, sides: &[SideFile]) -> Result<OpenOptions> {
    Ok(OpenOptions {
        given: side_files::complete(&options.given, name, sides)?,
        ..options.clone()
    })
}

fn unpacked(sides: Vec<SideFile>) -> Result<Vec<SideFile>> {
    sides.into_iter().map(gzip::side).collect()
}

fn probe(source: &mut dyn Source) -> Result<&'static Format> {
    if source.is_empty() {
        return Err(Problem::new(
            Kind::Empty,
            "the file is empty",
            "copy it again from where it was recorded",
        )
        .expected_found("a recording", "0 bytes"));
    }
    let mut head = vec![0; source.len().min(PROBE_BYTES) as usize];
    source.read_at(0, &mut head)?;
    let mut best: Option<(u8, &'static Format)> = None;
    for format in FORMATS {
        let score = (format.score)(&head);
        if score > best.map_or(0, |(score, _)| score) {
            best = Some((score, format));
        }
    }
    best.map(|(_, format)| format).ok_or_else(|| unknown(&head))
}

fn unknown(head: &[u8]) -> Problem {
    let found = OTHER_CONTENT
        .iter()
        .find(|(magic, _)| head.starts_with(magic))
        .map_or_else(
            || format!("\"{}\"", head[..head.len().min(8)].escape_ascii()),
            |(_, what)| (*what).to_owned(),
        );
    let names: Vec<&str> = FORMATS.iter().map(|format| format.name).collect();
    Problem::new(
        Kind::Unknown,
        "the content is not a recording that Teasel knows, whatever the file's name says",
        "open a recording in one of these formats",
    )
    .at("byte 0")
    .expected_found(format!("the mark of one of {}", names.join(", ")), found)
}

/// A recording's bytes in memory.
#[derive(Debug, Clone)]
pub struct MemorySource {
    name: String,
    bytes: Vec<u8>,
}

impl MemorySource {
    /// The file name without its folder, and the whole content.
    pub fn new(name: impl Into<String>, bytes: Vec<u8>) -> Self {
        MemorySource {
            name: name.into(),
            bytes,
        }
    }
}

impl Source for MemorySource {
    fn name(&self) -> &str {
        &self.name
    }
    fn len(&self) -> u64 {
        self.bytes.len() as u64
    }
    fn read_at(&mut self, offset: u64, out: &mut [u8]) -> Result<()> {
        let part = usize::try_from(offset)
            .ok()
            .and_then(|from| self.bytes.get(from..from.checked_add(out.len())?));
        match part {
            Some(part) => {
                out.copy_from_slice(part);
                Ok(())
            }
            None => Err(Problem::new(
                Kind::Storage,
                "the file ended while it was being read",
                "open it again once nothing writes to it any more",
            )
            .in_file(self.name.as_str())
            .at(format!("byte {offset}"))
            .expected_found(
                format!("{} bytes", out.len()),
                format!("{} bytes", (self.bytes.len() as u64).saturating_sub(offset)),
            )),
        }
    }
}
