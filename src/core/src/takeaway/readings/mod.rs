//! Readings: the sentence beside each figure that says, with numbers, what it shows, and the doubt that goes with it.
//!
//! A reading has at most 45 words and four strong numbers; its doubt at most 40 words. The doubt is written to follow
//! the word "But". Names from a file stand in plain spans, shortened, without invisible marks.
mod evidence;
mod judge;
mod result;
mod setting;
mod so_far;

use super::words;
use crate::sheet::Sheet;
pub(super) use judge::passes;
use serde::{Deserialize, Serialize};

/// The place on the page that a reading belongs to.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Section {
    /// The finding in one sentence.
    SoFar,
    /// The recording.
    Recording,
    /// Its channels.
    Channels,
    /// The windows.
    Windows,
    /// The compression.
    Compression,
    /// The components.
    Components,
    /// The evidence.
    Evidence,
    /// The take-away.
    TakeAway,
}

impl Section {
    /// As in the page's addresses: `so-far`, `recording`, …, `take-away`.
    pub fn id(self) -> &'static str {
        match self {
            Section::SoFar => "so-far",
            Section::Recording => "recording",
            Section::Channels => "channels",
            Section::Windows => "windows",
            Section::Compression => "compression",
            Section::Components => "components",
            Section::Evidence => "evidence",
            Section::TakeAway => "take-away",
        }
    }
    /// As a heading.
    pub fn title(self) -> &'static str {
        match self {
            Section::SoFar => "So far",
            Section::Recording => "Recording",
            Section::Channels => "Channels",
            Section::Windows => "Windows",
            Section::Compression => "Compression",
            Section::Components => "Components",
            Section::Evidence => "Evidence",
            Section::TakeAway => "Take-away",
        }
    }
}

/// One reading.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Reading {
    /// Where it stands.
    pub section: Section,
    /// What the figure shows.
    pub text: Vec<Span>,
    /// What to doubt, to be put after the word "But".
    pub but: Option<Vec<Span>>,
}

/// A run of text of one tone.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Span {
    /// The text itself, never markup.
    pub text: String,
    /// How it is set.
    pub tone: Tone,
}

/// How a span is set.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Tone {
    /// As the rest.
    Plain,
    /// A number or name that matters.
    Strong,
    /// A number of the signal side or the stronger end.
    Signal,
    /// A number of the reference side or the weaker end.
    Reference,
}

/// The readings of every section that has something to say, in the page's order.
pub fn readings(sheet: &Sheet) -> Vec<Reading> {
    [
        (Section::SoFar, so_far::so_far(sheet)),
        (Section::Recording, Some(setting::recording(sheet))),
        (Section::Channels, setting::channels(sheet)),
        (Section::Windows, setting::windows(sheet)),
        (Section::Compression, setting::compression(sheet)),
        (Section::Components, result::components(sheet)),
        (Section::Evidence, evidence::evidence(sheet)),
        (Section::TakeAway, result::take_away(sheet)),
    ]
    .into_iter()
    .filter_map(|(section, said)| {
        said.map(|(text, but)| Reading {
            section,
            text: text.0,
            but: but.map(|line| line.0),
        })
    })
    .collect()
}

/// A reading and its doubt.
type Said = (Line, Option<Line>);

/// A line under construction; neighbouring spans of one tone are joined.
#[derive(Debug, Default)]
struct Line(Vec<Span>);

impl Line {
    fn new(text: impl AsRef<str>) -> Self {
        Line::default().then(text)
    }
    fn put(mut self, text: &str, tone: Tone) -> Self {
        match self.0.last_mut() {
            Some(last) if last.tone == tone => last.text.push_str(text),
            _ if text.is_empty() => {}
            _ => self.0.push(Span {
                text: text.into(),
                tone,
            }),
        }
        self
    }
    /// Goes on in plain text.
    fn then(self, text: impl AsRef<str>) -> Self {
        self.put(text.as_ref(), Tone::Plain)
    }
    /// Goes on in strong text.
    fn strong(self, text: impl AsRef<str>) -> Self {
        self.put(text.as_ref(), Tone::Strong)
    }
    /// Goes on in the tone of an end.
    fn tone(self, text: impl AsRef<str>, tone: Tone) -> Self {
        self.put(text.as_ref(), tone)
    }
    /// Appends another line.
    fn join(mut self, other: Line) -> Self {
        for span in other.0 {
            self = self.put(&span.text, span.tone);
        }
        self
    }
}
