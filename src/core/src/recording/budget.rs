//! The one purse that every reader pays its allocations from, so that a small file cannot ask for much memory.
use crate::error::{Kind, Problem, Result};

/// Memory that one open recording may take when the caller does not say: its samples, its events and the slice being read.
/// A 32-bit page has 4 GiB in all, and the preparation needs a second copy of the samples.
pub const MEMORY_BYTES: u64 = if cfg!(target_pointer_width = "32") {
    1 << 30
} else {
    8 << 30
};

/// A byte of 16-bit samples becomes two of `f32`; the rest leaves room for events, whose text costs more than it takes in the file.
const BYTES_A_FILE_BYTE: u64 = 8;
/// What even the smallest file may take: headers, names, small vectors.
const FLOOR_BYTES: u64 = 8 << 20;

/// Bytes that may still be allocated.
#[derive(Debug)]
pub(crate) struct Budget {
    left: u64,
    all: u64,
    memory: u64,
    /// The machine, not the size of the file, sets the limit.
    by_memory: bool,
    /// What is too large may be handed through instead.
    streaming: bool,
}

impl Budget {
    /// The smaller of what a file of this size can need and what the machine may give.
    pub(crate) fn new(file_bytes: u64, memory_bytes: u64) -> Self {
        let by_file = file_bytes
            .saturating_mul(BYTES_A_FILE_BYTE)
            .saturating_add(FLOOR_BYTES);
        let all = by_file.min(memory_bytes);
        Budget {
            left: all,
            all,
            memory: memory_bytes,
            by_memory: memory_bytes < by_file,
            streaming: false,
        }
    }

    /// The same where a reader may hand through what does not fit.
    pub(crate) fn streaming(self) -> Self {
        Budget {
            streaming: true,
            ..self
        }
    }

    /// Whether samples of so many bytes are to be handed through instead of kept.
    pub(crate) fn flows(&self, bytes: u64) -> bool {
        self.streaming && self.by_memory && bytes > self.left
    }

    /// One part in `parts` of what is left.
    pub(crate) fn share(&self, parts: u64) -> u64 {
        self.left / parts
    }

    /// The file turned out to hold this many bytes once unpacked: what they can need may be taken, as far as the machine gives it.
    pub(crate) fn unpacked(&mut self, bytes: u64) {
        let by_file = bytes
            .saturating_mul(BYTES_A_FILE_BYTE)
            .saturating_add(FLOOR_BYTES);
        let all = by_file.min(self.memory).max(self.all);
        self.left += all - self.all;
        self.all = all;
        self.by_memory = self.memory < by_file;
    }

    /// Takes `bytes` for `what` (as in "its samples").
    pub(crate) fn draw(&mut self, bytes: u64, what: &str) -> Result<()> {
        match self.left.checked_sub(bytes) {
            Some(left) => {
                self.left = left;
                Ok(())
            }
            None => Err(self.refusal(bytes, what)),
        }
    }

    /// Takes the memory for `count` values of `T` and allocates it.
    pub(crate) fn vec<T>(&mut self, count: u64, what: &str) -> Result<Vec<T>> {
        let bytes = count.saturating_mul(size_of::<T>() as u64);
        self.draw(bytes, what)?;
        let mut vec = Vec::new();
        let refused = |_| self.refusal(bytes, what);
        let count = usize::try_from(count).map_err(|_| self.refusal(bytes, what))?;
        vec.try_reserve_exact(count).map_err(refused)?;
        Ok(vec)
    }

    fn refusal(&self, bytes: u64, what: &str) -> Problem {
        let (why, advice) = if self.by_memory {
            (
                "the recording is larger than the memory for it",
                "open a shorter part of it, or one with fewer channels or a lower sampling rate",
            )
        } else {
            (
                "the file asks for more memory than a file of its size can need",
                "check the file with the program that wrote it",
            )
        };
        Problem::new(Kind::TooLarge, why, advice)
            .at(what)
            .expected_found(
                format!("at most {} in all", size(self.all)),
                size(bytes.saturating_add(self.all - self.left)),
            )
    }
}

/// Bytes in words: `512 bytes`, `1.5 GB`.
pub(crate) fn size(bytes: u64) -> String {
    match bytes {
        0..1_000 => format!("{bytes} bytes"),
        1_000..1_000_000 => format!("{:.1} kB", bytes as f64 / 1e3),
        1_000_000..1_000_000_000 => format!("{:.1} MB", bytes as f64 / 1e6),
        _ => format!("{:.1} GB", bytes as f64 / 1e9),
    }
}
