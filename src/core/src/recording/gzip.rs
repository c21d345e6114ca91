//! Any recording packed with gzip (RFC 1952, Deutsch 1996), of one member or several.
//!
//! # How it is read
//! Once through to learn its length and to check its sums, keeping what comes out where that is little; then the reader for what is inside
//! takes over. A larger file is unpacked a second time while it is read, so that its bytes never lie in memory whole.
//!
//! # How much may come out
//! At most 200 bytes a byte, and 16 MiB however small the file. What asks for more is no recording and is refused.
use super::budget::{Budget, size};
use super::opening::{Format, OpenOptions, Reader, begin_reader};
use super::{MemorySource, Recording, SideFile, Source};
use crate::error::{Kind, Problem, Result};
use flate2::write::MultiGzDecoder;
use std::io::Write;

pub(super) const FORMAT: Format = Format {
    name: "gzip of any of these",
    score: |head| if head.starts_with(MARK) { 100 } else { 0 },
    begin,
};

/// First bytes: the mark, and Deflate as the method.
const MARK: &[u8] = b"\x1f\x8b\x08";
/// Most bytes that may come out for one that is in the file, and for the smallest file.
const MOST_A_BYTE: u64 = 200;
const FLOOR_BYTES: u64 = 16 << 20;
/// What comes out is kept in memory up to this size.
const KEPT_BYTES: u64 = 64 << 20;
/// Bytes unpacked in one go: so few that even the tightest packing gives little at once.
const BITE_BYTES: u64 = 16 << 10;
/// Bytes of the file unpacked in one step.
const STEP_BYTES: u64 = 1 << 20;
/// A file up to this size is unpacked when it is begun, so that questions and refusals come at once.
const SMALL_BYTES: u64 = 4 << 20;
/// How often a reader may go back in a file that is unpacked as it is read.
const MOST_RESTARTS: u32 = 16;

/// Where in the file unpacking stands, and what came out and was not fetched yet.
struct Unpacking {
    decoder: MultiGzDecoder<Vec<u8>>,
    /// Bytes of the file that went in.
    at: u64,
    /// Place of the first byte that the decoder holds.
    from: u64,
}

impl Unpacking {
    fn new() -> Unpacking {
        Unpacking {
            decoder: MultiGzDecoder::new(Vec::new()),
            at: 0,
            from: 0,
        }
    }

    /// Unpacks some more; false at the end of the file.
    fn bite(&mut self, packed: &mut dyn Source) -> Result<bool> {
        let count = (packed.len() - self.at).min(BITE_BYTES) as usize;
        if count == 0 {
            return Ok(false);
        }
        let mut bite = vec![0; count];
        packed.read_at(self.at, &mut bite)?;
        self.decoder
            .write_all(&bite)
            .map_err(|error| self.broken(&error))?;
        self.at += count as u64;
        if self.at == packed.len() {
            self.decoder
                .try_finish()
                .map_err(|error| self.broken(&error))?;
        }
        Ok(true)
    }

    fn broken(&self, error: &std::io::Error) -> Problem {
        let cut = error.kind() == std::io::ErrorKind::UnexpectedEof;
        let what = if cut {
            "the packed file is cut short"
        } else {
            "the packed data are broken"
        };
        Problem::new(
            Kind::Damaged,
            what,
            "copy the file again from where it was packed, or unpack it with another program",
        )
        .at(format!("byte {}", self.at))
        .expected_found("gzip data with their sums", error)
    }

    /// Bytes that came out in all.
    fn out(&self) -> u64 {
        self.from + self.decoder.get_ref().len() as u64
    }
}

/// What is inside, as bytes that can be read anywhere.
enum Inside {
    Kept(MemorySource),
    Streamed {
        unpacking: Box<Unpacking>,
        bytes: u64,
        restarts: u32,
    },
}

/// [`Inside`] while the packed file is at hand.
struct View<'a> {
    inside: &'a mut Inside,
    packed: &'a mut dyn Source,
    name: &'a str,
}

impl Source for View<'_> {
    fn name(&self) -> &str {
        self.name
    }
    fn len(&self) -> u64 {
        match &self.inside {
            Inside::Kept(memory) => memory.len(),
            Inside::Streamed { bytes, .. } => *bytes,
        }
    }
    fn read_at(&mut self, offset: u64, out: &mut [u8]) -> Result<()> {
        let (unpacking, restarts) = match self.inside {
            Inside::Kept(memory) => return memory.read_at(offset, out),
            Inside::Streamed {
                unpacking,
                restarts,
                ..
            } => (unpacking, restarts),
        };
        if offset < unpacking.from {
            *restarts += 1;
            if *restarts > MOST_RESTARTS {
                return Err(Problem::new(
                    Kind::Unsupported,
                    "a file of this format jumps to and fro, which a packed file of this size cannot",
                    "unpack it and open what comes out",
                ));
            }
            **unpacking = Unpacking::new();
        }
        let end = offset + out.len() as u64;
        while unpacking.out() < end {
            if !unpacking.bite(self.packed)? {
                return Err(Problem::new(
                    Kind::Storage,
                    "the file ended while it was being read",
                    "open it again once nothing writes to it any more",
                ));
            }
            // What lies before the wanted bytes is not needed any more.
            let before = offset.saturating_sub(unpacking.from);
            let held = unpacking.decoder.get_mut();
            let gone = (before as usize).min(held.len());
            held.drain(..gone);
            unpacking.from += gone as u64;
        }
        let held = unpacking.decoder.get_ref();
        let start = (offset - unpacking.from) as usize;
        out.copy_from_slice(&held[start..start + out.len()]);
        Ok(())
    }
}

enum State {
    /// The first time through.
    Counting {
        unpacking: Box<Unpacking>,
        kept: Option<Vec<u8>>,
        of: u64,
    },
    Reading {
        inside: Inside,
        reader: Box<dyn Reader>,
    },
    /// Between the two, and after a failure.
    Nothing,
}

struct GzipReader {
    options: OpenOptions,
    /// Name of what is inside: the file's without `.gz`.
    name: String,
    packed_bytes: u64,
    state: State,
    warnings: Vec<String>,
}

fn begin(
    source: &mut dyn Source,
    options: &OpenOptions,
    budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    let mut reader = GzipReader {
        options: options.clone(),
        name: inner_name(source.name()).to_owned(),
        packed_bytes: source.len(),
        state: State::Counting {
            unpacking: Box::new(Unpacking::new()),
            kept: Some(Vec::new()),
            of: most(source.len()),
        },
        warnings: Vec::new(),
    };
    if source.len() <= SMALL_BYTES {
        while matches!(reader.state, State::Counting { .. }) {
            reader.count(source, budget)?;
        }
    }
    Ok(Box::new(reader))
}

/// The name without its `.gz`.
fn inner_name(name: &str) -> &str {
    let at = name.len().saturating_sub(3);
    match name.get(at..) {
        Some(end) if end.eq_ignore_ascii_case(".gz") && at > 0 => &name[..at],
        _ => name,
    }
}

fn most(packed: u64) -> u64 {
    packed.saturating_mul(MOST_A_BYTE).max(FLOOR_BYTES)
}

fn bomb(of: u64) -> Problem {
    Problem::new(
        Kind::TooLarge,
        "far more comes out of the packed file than a recording of its size can hold",
        "unpack it with another program and look at what it is",
    )
    .expected_found(format!("at most {}", size(of)), "more")
}

impl GzipReader {
    /// Unpacks a step's worth for the first time; at the end the inner reader begins.
    fn count(&mut self, packed: &mut dyn Source, budget: &mut Budget) -> Result<()> {
        let State::Counting {
            unpacking,
            kept,
            of,
        } = &mut self.state
        else {
            return Ok(());
        };
        let until = (unpacking.at + STEP_BYTES).min(packed.len());
        let mut end = Ok(());
        while unpacking.at < until && end.is_ok() {
            end = unpacking.bite(packed).map(|_| ());
            let out = std::mem::take(unpacking.decoder.get_mut());
            unpacking.from += out.len() as u64;
            if unpacking.from > *of {
                return Err(bomb(*of));
            }
            if let Some(all) = kept {
                if unpacking.from > KEPT_BYTES {
                    *kept = None;
                } else {
                    all.extend(out);
                }
            }
        }
        let bytes = unpacking.from;
        if end.is_ok() && unpacking.at < packed.len() {
            return Ok(());
        }
        let kept = kept.take();
        self.state = State::Nothing;
        let begun = self.begin_inside(kept, bytes, packed, budget);
        self.state = match end {
            Ok(()) => begun?,
            Err(problem) => self.salvaged(problem, begun)?,
        };
        Ok(())
    }

    fn begin_inside(
        &mut self,
        kept: Option<Vec<u8>>,
        bytes: u64,
        packed: &mut dyn Source,
        budget: &mut Budget,
    ) -> Result<State> {
        budget.unpacked(bytes);
        let mut inside = match kept {
            Some(all) => {
                budget.draw(all.len() as u64, "what comes out of it")?;
                Inside::Kept(MemorySource::new(self.name.as_str(), all))
            }
            None => Inside::Streamed {
                unpacking: Box::new(Unpacking::new()),
                bytes,
                restarts: 0,
            },
        };
        let mut view = View {
            inside: &mut inside,
            packed,
            name: &self.name,
        };
        let mut head = [0; MARK.len()];
        if bytes >= MARK.len() as u64 {
            view.read_at(0, &mut head)?;
        }
        if head == MARK {
            return Err(Problem::new(
                Kind::Unsupported,
                "the file is packed twice",
                "unpack it once and open what comes out",
            ));
        }
        let reader = begin_reader(&mut view, &self.options, budget)?;
        Ok(State::Reading { inside, reader })
    }

    /// The packed file ends in damage: what came out before it may still hold whole records.
    fn salvaged(&mut self, mut problem: Problem, begun: Result<State>) -> Result<State> {
        match begun {
            Ok(state) if self.options.salvage => {
                self.warnings.push(format!(
                    "Only what came out before the damage was read: {} ({}).",
                    problem.what,
                    problem.place.unwrap_or_default()
                ));
                Ok(state)
            }
            Ok(_) => Err(problem),
            Err(inner) => {
                problem.salvage = inner.salvage;
                Err(problem)
            }
        }
    }
}

impl Reader for GzipReader {
    fn step(&mut self, source: &mut dyn Source, budget: &mut Budget) -> Result<(u64, u64)> {
        // Each time through counts for half.
        let of = 2 * self.packed_bytes;
        if let State::Reading { inside, reader } = &mut self.state {
            let mut view = View {
                inside,
                packed: source,
                name: &self.name,
            };
            let (done, inner_of) = reader.step(&mut view, budget)?;
            let share = self.packed_bytes as f64 * done as f64 / inner_of.max(1) as f64;
            return Ok(match done < inner_of {
                true => ((self.packed_bytes + share as u64).min(of - 1), of),
                false => (of, of),
            });
        }
        self.count(source, budget)?;
        Ok(match &self.state {
            State::Counting { unpacking, .. } => (unpacking.at.min(self.packed_bytes), of),
            _ => (self.packed_bytes, of),
        })
    }

    fn finish(self: Box<Self>) -> Result<Recording> {
        let State::Reading { reader, .. } = self.state else {
            return Err(bomb(0));
        };
        let mut recording = reader.finish()?;
        recording.format = format!("{}, packed with gzip", recording.format);
        recording.warnings.extend(self.warnings);
        Ok(recording)
    }

    fn start_s(&self) -> Option<f64> {
        match &self.state {
            State::Reading { reader, .. } => reader.start_s(),
            _ => None,
        }
    }
}

/// A side file as it is, unpacked where it is packed with gzip.
pub(super) fn side(side: SideFile) -> Result<SideFile> {
    if !side.bytes.starts_with(MARK) {
        return Ok(side);
    }
    let of = most(side.bytes.len() as u64);
    let name = inner_name(&side.name).to_owned();
    let mut packed = MemorySource::new(side.name.as_str(), side.bytes);
    let mut unpacking = Unpacking::new();
    while unpacking
        .bite(&mut packed)
        .map_err(|p| p.in_file(side.name.as_str()))?
    {
        if unpacking.out() > of {
            return Err(bomb(of).in_file(side.name.as_str()));
        }
    }
    Ok(SideFile {
        name,
        bytes: std::mem::take(unpacking.decoder.get_mut()),
    })
}
