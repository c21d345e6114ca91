//! Bytes in order: as they stand in the file, or inflated on the way.
use crate::error::{Kind, Problem, Result};
use crate::recording::Source;
use flate2::{Decompress, FlushDecompress, Status};

/// Compressed bytes read at a time.
const INPUT_BYTES: usize = 1 << 18;

/// Where an array's bytes come from, in order.
pub(in crate::recording) enum Feed {
    /// From `at` up to `end` of the file.
    Plain { at: u64, end: u64 },
    /// Inflated from a part of the file.
    Inflated(Box<Inflated>),
    /// In memory already, from the end backwards.
    Here(Vec<u8>),
}

/// A deflated part of a file.
pub(in crate::recording) struct Inflated {
    start: u64,
    at: u64,
    end: u64,
    state: Decompress,
    input: Vec<u8>,
    used: usize,
}

impl Feed {
    pub(in crate::recording) fn plain(at: u64, end: u64) -> Self {
        Feed::Plain { at, end }
    }

    /// A deflated stream from `at` up to `end`; `wrapped` in a zlib header and checksum or not.
    pub(in crate::recording) fn inflated(at: u64, end: u64, wrapped: bool) -> Self {
        Feed::Inflated(Box::new(Inflated {
            start: at,
            at,
            end,
            state: Decompress::new(wrapped),
            input: Vec::new(),
            used: 0,
        }))
    }

    /// These bytes.
    pub(in crate::recording) fn here(bytes: &[u8]) -> Self {
        Feed::Here(bytes.iter().rev().copied().collect())
    }

    /// Refuses where fewer than `bytes` bytes are left, as far as that is known before reading them.
    pub(in crate::recording) fn holds(&self, bytes: u64) -> Result<()> {
        match self {
            Feed::Plain { at, end } if end.saturating_sub(*at) < bytes => {
                Err(cut(*at, bytes, end.saturating_sub(*at)))
            }
            _ => Ok(()),
        }
    }

    /// Fills `out` with the next bytes.
    ///
    /// # Errors
    /// `Damaged` where the bytes end before, or cannot be inflated; what the source says.
    pub(in crate::recording) fn fill(
        &mut self,
        source: &mut dyn Source,
        out: &mut [u8],
    ) -> Result<()> {
        match self {
            Feed::Plain { at, end } => {
                let left = end.saturating_sub(*at);
                if left < out.len() as u64 {
                    return Err(cut(*at, out.len() as u64, left));
                }
                source.read_at(*at, out)?;
                *at += out.len() as u64;
                Ok(())
            }
            Feed::Inflated(inflated) => inflated.fill(source, out),
            Feed::Here(bytes) => {
                for (filled, byte) in out.iter_mut().enumerate() {
                    *byte = bytes
                        .pop()
                        .ok_or_else(|| cut(0, filled as u64 + 1, filled as u64))?;
                }
                Ok(())
            }
        }
    }

    /// Passes over `bytes` bytes.
    pub(in crate::recording) fn skip(&mut self, source: &mut dyn Source, bytes: u64) -> Result<()> {
        if let Feed::Plain { at, end } = self {
            let left = end.saturating_sub(*at);
            if left < bytes {
                return Err(cut(*at, bytes, left));
            }
            *at += bytes;
            return Ok(());
        }
        let mut left = bytes;
        let mut thrown = [0; 4096];
        while left > 0 {
            let part = left.min(thrown.len() as u64) as usize;
            self.fill(source, &mut thrown[..part])?;
            left -= part as u64;
        }
        Ok(())
    }
}

impl Inflated {
    fn fill(&mut self, source: &mut dyn Source, out: &mut [u8]) -> Result<()> {
        let mut filled = 0;
        while filled < out.len() {
            if self.used == self.input.len() && self.at < self.end {
                let bytes = (self.end - self.at).min(INPUT_BYTES as u64) as usize;
                self.input.resize(bytes, 0);
                source.read_at(self.at, &mut self.input)?;
                self.at += bytes as u64;
                self.used = 0;
            }
            let (before_in, before_out) = (self.state.total_in(), self.state.total_out());
            let status = self
                .state
                .decompress(
                    &self.input[self.used..],
                    &mut out[filled..],
                    FlushDecompress::None,
                )
                .map_err(|_| {
                    Problem::new(
                        Kind::Damaged,
                        "the compressed data are damaged",
                        "copy the file again from where it was written",
                    )
                    .at(format!("byte {}", self.start + self.state.total_in()))
                    .expected_found("a deflated stream", "bytes that are none")
                })?;
            let taken = (self.state.total_in() - before_in) as usize;
            let made = (self.state.total_out() - before_out) as usize;
            self.used += taken;
            filled += made;
            let ended = status == Status::StreamEnd;
            // Where nothing was taken and nothing made, the next call would do no better.
            let stuck = taken == 0 && made == 0;
            if filled < out.len() && (ended || stuck) {
                return Err(cut(self.at, out.len() as u64, filled as u64));
            }
        }
        Ok(())
    }
}

fn cut(at: u64, expected: u64, found: u64) -> Problem {
    Problem::new(
        Kind::Damaged,
        "the file ends before its array does",
        "copy it again from where it was written",
    )
    .at(format!("byte {at}"))
    .expected_found(format!("{expected} bytes"), format!("{found} bytes"))
}
