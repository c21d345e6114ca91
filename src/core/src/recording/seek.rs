//! A [`Source`] as something that libraries can read and seek in.
use super::Source;
use std::io::{Error, Read, Result, Seek, SeekFrom};

/// Bytes read ahead, so that many small reads do not each reach the file.
const WINDOW_BYTES: u64 = 1 << 16;

/// Reads through a window that moves over the source; bytes laid over the beginning come first.
pub(super) struct Seeking<'a> {
    source: &'a mut dyn Source,
    at: u64,
    window: Vec<u8>,
    window_at: u64,
    /// Stand in the place of the first bytes.
    over: Vec<u8>,
}

impl<'a> Seeking<'a> {
    pub(super) fn new(source: &'a mut dyn Source) -> Self {
        Seeking::laid_over(source, Vec::new())
    }

    /// The first bytes are `over`, whatever the source holds there.
    pub(super) fn laid_over(source: &'a mut dyn Source, over: Vec<u8>) -> Self {
        Seeking {
            source,
            at: 0,
            window: Vec::new(),
            window_at: 0,
            over,
        }
    }

    fn load(&mut self, wanted: u64) -> Result<()> {
        let left = self.source.len() - self.at;
        let bytes = wanted.max(WINDOW_BYTES).min(left);
        self.window.resize(bytes as usize, 0);
        self.window_at = self.at;
        self.source
            .read_at(self.at, &mut self.window)
            .map_err(|problem| Error::other(problem.to_string()))
    }
}

impl Read for Seeking<'_> {
    fn read(&mut self, out: &mut [u8]) -> Result<usize> {
        if let Some(rest) = usize::try_from(self.at)
            .ok()
            .and_then(|at| self.over.get(at..))
            .filter(|rest| !rest.is_empty())
        {
            let bytes = rest.len().min(out.len());
            out[..bytes].copy_from_slice(&rest[..bytes]);
            self.at += bytes as u64;
            return Ok(bytes);
        }
        if self.at >= self.source.len() || out.is_empty() {
            return Ok(0);
        }
        let inside =
            self.at >= self.window_at && self.at < self.window_at + self.window.len() as u64;
        if !inside {
            // No more at a time than a few windows: a claimed length is no promise.
            self.load((out.len() as u64).min(64 * WINDOW_BYTES))?;
        }
        let from = (self.at - self.window_at) as usize;
        let bytes = out.len().min(self.window.len() - from);
        out[..bytes].copy_from_slice(&self.window[from..from + bytes]);
        self.at += bytes as u64;
        Ok(bytes)
    }
}

impl Seek for Seeking<'_> {
    fn seek(&mut self, to: SeekFrom) -> Result<u64> {
        let at = match to {
            SeekFrom::Start(at) => Some(at),
            SeekFrom::End(by) => self.source.len().checked_add_signed(by),
            SeekFrom::Current(by) => self.at.checked_add_signed(by),
        };
        self.at = at.ok_or_else(|| Error::other("a place before the beginning"))?;
        Ok(self.at)
    }
}
