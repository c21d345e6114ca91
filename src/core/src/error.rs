//! What can go wrong, kept apart by what the user can do about it.
use serde::{Deserialize, Serialize};
use std::fmt;

/// Why a file could not be opened.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Kind {
    /// The file holds nothing.
    Empty,
    /// No reader knows the content.
    Unknown,
    /// A reader knows the format, but the content breaks its rules.
    Damaged,
    /// A valid file that uses a part of the format Teasel does not read.
    Unsupported,
    /// Opening it would take more memory than there is.
    TooLarge,
    /// The file does not carry something that only the user knows: its sampling rate, its unit, which axis is time.
    NeedsAnswer,
    /// A recipe or weights file that breaks its rules.
    Recipe,
    /// The recording and the choices do not fit together (no windows, C above the rank …).
    Contrast,
    /// The storage below failed while reading or writing.
    Storage,
    /// The user stopped it.
    Stopped,
}

/// One clear error: what, where, expected, found, what to do.
///
/// Displayed as one line: `file: what; place: expected …, found …; advice`.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Problem {
    /// Which of the failures it is.
    pub kind: Kind,
    /// The file it is about, without its folder.
    pub file: Option<String>,
    /// One sentence without its full stop: "night-watch.edf is cut short".
    pub what: String,
    /// Where: `record 12, channel "Fz", byte 40960`.
    pub place: Option<String>,
    /// What stood to be expected there, with its number and unit.
    pub expected: Option<String>,
    /// What was found instead.
    pub found: Option<String>,
    /// What to do now, as a sentence.
    pub advice: String,
    /// How many whole records before the damage can still be opened, and their seconds.
    pub salvage: Option<Salvage>,
    /// What has to be told before the file can be opened.
    #[serde(default)]
    pub asks: Vec<Ask>,
}

/// A question that a file leaves open; the answer goes into the recipe's `recording` under `key`.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Ask {
    /// Key of [`crate::recipe::Given`]: `rate_hz`, `unit`, `axes`, `variable`.
    pub key: String,
    /// The question, with what the file shows: "The array holds 32 × 15000 values: which axis is time?".
    pub question: String,
    /// Answers to choose from; empty where it is a number or free text.
    pub options: Vec<String>,
    /// The likeliest answer, where there is one.
    pub guess: Option<String>,
}

/// The part of a damaged file that can still be opened.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Salvage {
    /// Whole records before the damage.
    pub records: u64,
    /// Their duration in seconds.
    pub seconds: f64,
}
impl Eq for Salvage {}

impl Problem {
    /// An error of one kind with its sentence and its advice; the rest by the `with_…` methods.
    pub fn new(kind: Kind, what: impl Into<String>, advice: impl Into<String>) -> Self {
        Problem {
            kind,
            file: None,
            what: what.into(),
            place: None,
            expected: None,
            found: None,
            advice: advice.into(),
            salvage: None,
            asks: Vec::new(),
        }
    }
    /// Names the file.
    #[must_use]
    pub fn in_file(mut self, file: impl Into<String>) -> Self {
        self.file.get_or_insert_with(|| file.into());
        self
    }
    /// Adds what has to be told.
    #[must_use]
    pub fn asking(mut self, asks: Vec<Ask>) -> Self {
        self.asks = asks;
        self
    }
    /// Names the place.
    #[must_use]
    pub fn at(mut self, place: impl Into<String>) -> Self {
        self.place = Some(place.into());
        self
    }
    /// Says what was expected and what was found.
    #[must_use]
    pub fn expected_found(mut self, expected: impl fmt::Display, found: impl fmt::Display) -> Self {
        self.expected = Some(expected.to_string());
        self.found = Some(found.to_string());
        self
    }
}

impl fmt::Display for Problem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(file) = &self.file {
            write!(f, "{file}: ")?;
        }
        f.write_str(&self.what)?;
        if let Some(place) = &self.place {
            write!(f, "; {place}")?;
        }
        if let (Some(expected), Some(found)) = (&self.expected, &self.found) {
            write!(f, ": expected {expected}, found {found}")?;
        }
        write!(f, "; {}", self.advice)
    }
}

impl std::error::Error for Problem {}

/// The result of everything that can fail.
pub type Result<T> = std::result::Result<T, Problem>;
