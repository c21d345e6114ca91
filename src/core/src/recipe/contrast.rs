//! The question: which two conditions are compared. Five kinds, each with its own sides.
use super::Measure;
use serde::{Deserialize, Serialize};

/// The question.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(tag = "kind", rename_all = "kebab-case", deny_unknown_fields)]
pub enum Contrast {
    /// Event windows against event windows.
    Windows {
        /// Windows of interest (S).
        signal: EventWindow,
        /// Windows they are compared with (R).
        reference: EventWindow,
    },
    /// Stretches of time that were marked, or annotated with a duration, against the rest or other stretches.
    Spans {
        /// Spans of interest (S).
        signal: Spans,
        /// Spans they are compared with (R); [`Spans::Label`] `"rest"` is everything else.
        reference: Spans,
        /// Length of the pieces that spans are cut into: 1 s unless told otherwise.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        piece_s: Option<f64>,
    },
    /// A rhythm against its neighbours in frequency, or against everything.
    Band {
        /// Centre of the band.
        centre_hz: f64,
        /// Half its width at −6 dB.
        half_width_hz: f64,
        /// What it is compared with.
        #[serde(default)]
        reference: BandReference,
        /// Where in time; everywhere unless told.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        within: Option<Within>,
        /// Length of the pieces that the recording (or spans) are cut into: eight periods of the half width, 1 to 20 s, unless
        /// told otherwise: shorter ones hold too few independent values for a covariance, and neighbours share too much.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        piece_s: Option<f64>,
    },
    /// What repeats over trials (the trial average) against the single trials.
    Repeatable(EventWindow),
    /// What changes slowly against what changes fast: sums of samples a lag apart against their differences.
    Slow {
        /// The lag.
        lag_s: f64,
        /// Where in time; everywhere unless told.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        within: Option<Within>,
        /// Length of the pieces that the recording (or spans) are cut into: ten lags, at least 1 s, unless told otherwise.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        piece_s: Option<f64>,
    },
}

/// The name of a kind, as the recipe writes it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum ContrastKind {
    /// Event windows.
    Windows,
    /// Spans.
    Spans,
    /// A rhythm.
    Band,
    /// What repeats.
    Repeatable,
    /// What changes slowly.
    Slow,
}

impl Contrast {
    /// Which kind it is.
    pub fn kind(&self) -> ContrastKind {
        match self {
            Contrast::Windows { .. } => ContrastKind::Windows,
            Contrast::Spans { .. } => ContrastKind::Spans,
            Contrast::Band { .. } => ContrastKind::Band,
            Contrast::Repeatable(_) => ContrastKind::Repeatable,
            Contrast::Slow { .. } => ContrastKind::Slow,
        }
    }

    /// The signal and the reference window, where both sides are event windows.
    pub fn event_windows(&self) -> Option<(&EventWindow, &EventWindow)> {
        match self {
            Contrast::Windows { signal, reference } => Some((signal, reference)),
            _ => None,
        }
    }

    /// The event windows that the question names, whatever its kind: both sides, the repeated one, or the one it looks within.
    pub fn around(&self) -> Vec<&EventWindow> {
        match self {
            Contrast::Windows { signal, reference } => vec![signal, reference],
            Contrast::Repeatable(window) => vec![window],
            Contrast::Band {
                within: Some(Within::Window(window)),
                ..
            }
            | Contrast::Slow {
                within: Some(Within::Window(window)),
                ..
            } => vec![window],
            _ => Vec::new(),
        }
    }

    /// As [`Self::around`], to be changed.
    pub fn around_mut(&mut self) -> Vec<&mut EventWindow> {
        match self {
            Contrast::Windows { signal, reference } => vec![signal, reference],
            Contrast::Repeatable(window) => vec![window],
            Contrast::Band {
                within: Some(Within::Window(window)),
                ..
            }
            | Contrast::Slow {
                within: Some(Within::Window(window)),
                ..
            } => vec![window],
            _ => Vec::new(),
        }
    }

    /// The spans that the question names, with the path of each inside the contrast.
    pub fn spans(&self) -> Vec<(&'static str, &Spans)> {
        match self {
            Contrast::Spans {
                signal, reference, ..
            } => vec![("signal", signal), ("reference", reference)],
            Contrast::Band {
                within: Some(Within::Spans(spans)),
                ..
            }
            | Contrast::Slow {
                within: Some(Within::Spans(spans)),
                ..
            } => vec![("within", spans)],
            _ => Vec::new(),
        }
    }

    /// Whether a measure is defined for this kind.
    ///
    /// `typical` needs a variance of both sides in every trial. What repeats has none: the average over trials is one for all of
    /// them, so only `total` is defined there.
    pub fn allows(&self, measure: Measure) -> bool {
        measure == Measure::Total || self.kind() != ContrastKind::Repeatable
    }

    /// The measure of a recipe that names none: typical where the kind allows it.
    pub fn usual_measure(&self) -> Measure {
        if self.allows(Measure::Typical) {
            Measure::Typical
        } else {
            Measure::Total
        }
    }
}

/// `[onset + from, onset + to)` around every event of one label, or of several.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct EventWindow {
    /// Label of the event; where no event has exactly this label, `*` stands for any text (`buoy*`).
    pub event: String,
    /// Further labels, or patterns, whose events count as well.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub also: Vec<String>,
    /// Start, relative to the onset.
    pub from_s: f64,
    /// End, relative to the onset; with `until`, relative to the onset of the event that follows.
    pub to_s: f64,
    /// The window lasts until the next event of this label (or pattern), reaction times for instance. An event that is followed by
    /// another of its own kind first is left out.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub until: Option<String>,
    /// Only the first so many events.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub first: Option<usize>,
    /// Only the last so many events.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub last: Option<usize>,
    /// Events not to be used, by their number in order of time, from 1.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub leave_out: Vec<usize>,
    /// At most as many windows as the other side has, drawn at random by the recipe's seed.
    #[serde(default, skip_serializing_if = "std::ops::Not::not")]
    pub equal: bool,
}

impl EventWindow {
    /// From `from_s` to `to_s` around every event of a label.
    pub fn new(event: impl Into<String>, from_s: f64, to_s: f64) -> Self {
        EventWindow {
            event: event.into(),
            from_s,
            to_s,
            ..EventWindow::default()
        }
    }

    /// Whether both windows are tied to the same events, so that each event gives a pair.
    pub fn same_events(&self, other: &EventWindow) -> bool {
        self.event == other.event
            && self.also == other.also
            && self.first == other.first
            && self.last == other.last
            && self.leave_out == other.leave_out
    }

    /// All labels and patterns it names for its events.
    pub fn labels(&self) -> impl Iterator<Item = &str> {
        std::iter::once(self.event.as_str()).chain(self.also.iter().map(String::as_str))
    }
}

/// Stretches of time: `[[t0, t1], …]` in seconds on the recording's clock, or the label of annotations that last.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Spans {
    /// From, to.
    Times(Vec<[f64; 2]>),
    /// The label (or pattern) of annotations with a duration; as the reference, `"rest"` is everything that is not signal. An
    /// annotation labelled rest is reached by the pattern `rest*`.
    Label(String),
}

/// The word for everything that is not signal.
pub const REST: &str = "rest";

impl Spans {
    /// Everything that is not signal.
    pub fn rest() -> Self {
        Spans::Label(REST.into())
    }

    /// Whether it is the word for everything that is not signal.
    pub fn is_rest(&self) -> bool {
        matches!(self, Spans::Label(label) if label == REST)
    }
}

/// Where in time a contrast of another kind looks.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Within {
    /// In windows around events.
    Window(EventWindow),
    /// In spans.
    Spans(Spans),
}

/// What a rhythm is compared with.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum BandReference {
    /// The neighbouring bands, half a band wide each, two half widths away (Nikulin, Nolte & Curio 2011).
    #[default]
    Flanks,
    /// All frequencies (de Cheveigné & Arzounian 2015).
    Broadband,
}

/// A share of the recording locked away at its end, to be opened once.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct HoldBack {
    /// The share of its duration.
    pub last: f64,
    /// Whether it is opened: the finished components are then tested on it.
    #[serde(default)]
    pub open: bool,
}
