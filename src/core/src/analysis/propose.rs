//! A first question for a recording that arrives without one.
use crate::recipe::{Contrast, EventWindow, Filter, Recipe};
use crate::recording::Recording;
use serde::{Deserialize, Serialize};
use std::collections::BTreeMap;

/// A contrast proposed for a recording, with the reason in a sentence.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Proposal {
    /// The whole recipe, defaults and all.
    pub recipe: Recipe,
    /// "buoy is the most frequent event (42 times) …"
    pub why: String,
}

/// Occurrences an event needs to be proposed.
const FEWEST_EVENTS: usize = 10;
/// Slow drifts differ between any two windows; a recording sampled faster than this is high-passed at 1 Hz.
const HIGH_PASS_FROM_RATE_HZ: f64 = 50.0;

/// Proposes a contrast: the most frequent event with at least ten occurrences (the first by name of equals); signal [0, d),
/// reference [−d, 0), d the smaller of 1 s and half the shortest gap between its events, rounded down to 10 ms. Where that leaves
/// less than 0.1 s (doubled marks), half the gap that nine in ten exceed is taken. `None` where no event is frequent enough.
pub fn propose(recording: &Recording) -> Option<Proposal> {
    let mut onsets: BTreeMap<&str, Vec<f64>> = BTreeMap::new();
    for event in &recording.events {
        onsets.entry(&event.label).or_default().push(event.onset_s);
    }
    let (label, times) = onsets
        .iter()
        .filter(|(_, t)| t.len() >= FEWEST_EVENTS)
        .max_by(|a, b| a.1.len().cmp(&b.1.len()).then(b.0.cmp(a.0)))?;
    let equals = onsets.values().filter(|t| t.len() == times.len()).count();
    let most = if equals > 1 {
        "one of the most frequent events"
    } else {
        "the most frequent event"
    };
    let mut gaps: Vec<f64> = times.windows(2).map(|w| w[1] - w[0]).collect();
    gaps.sort_by(f64::total_cmp);
    let down = |gap: f64| ((gap / 2.0).min(1.0) * 100.0 + 1e-9).floor() / 100.0;
    let shortest = down(gaps[0]);
    let (d, which) = if shortest >= 0.1 {
        (shortest, "half the shortest gap")
    } else {
        (
            down(gaps[gaps.len() / 10]),
            "half the gap that nine in ten exceed",
        )
    };
    let fits = d * recording.rate_hz >= 3.0;
    if !fits {
        return None;
    }
    let window = |from_s: f64, to_s: f64| EventWindow::new(*label, from_s, to_s);
    let high_pass = (recording.rate_hz >= HIGH_PASS_FROM_RATE_HZ).then_some(1.0);
    let length = if d >= 1.0 {
        "1 s, as the gaps between them allow".to_owned()
    } else {
        format!("{d} s, {which} between them")
    };
    let filter = if high_pass.is_some() {
        " A high-pass at 1 Hz takes slow drifts away, which differ between any two windows."
    } else {
        ""
    };
    Some(Proposal {
        recipe: Recipe {
            filter: Filter {
                high_pass_hz: high_pass,
                ..Filter::default()
            },
            ..Recipe::asking(Contrast::Windows {
                signal: window(0.0, d),
                reference: window(-d, 0.0),
            })
        },
        why: format!(
            "\u{201c}{label}\u{201d} is {most} ({} times{}); the windows after and before it last {length}.{filter}",
            times.len(),
            if equals > 1 { " each" } else { "" }
        ),
    })
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a panic is the failure of a test")]
    use super::*;
    use crate::recording::Event;

    fn recording(onsets: &[f64]) -> Recording {
        let events = onsets
            .iter()
            .map(|t| Event {
                onset_s: *t,
                duration_s: 0.0,
                label: "buoy".into(),
            })
            .collect();
        Recording {
            rate_hz: 250.0,
            events,
            ..Recording::default()
        }
    }

    #[test]
    fn half_the_shortest_gap_bounds_the_windows() {
        let onsets: Vec<f64> = (0..12).map(|i| f64::from(i) * 1.5).collect();
        let proposal = propose(&recording(&onsets)).unwrap();
        let (signal, reference) = proposal.recipe.contrast.event_windows().unwrap();
        assert_eq!(
            (signal.from_s, signal.to_s, reference.from_s, reference.to_s),
            (0.0, 0.75, -0.75, 0.0)
        );
        assert!(proposal.why.contains("12 times"));
        assert!(proposal.why.contains("is the most frequent event"));
        assert_eq!(propose(&recording(&onsets[..9])), None);
    }

    #[test]
    fn a_tie_is_called_one() {
        let onsets: Vec<f64> = (0..12).map(|i| f64::from(i) * 1.5).collect();
        let mut tied = recording(&onsets);
        let more: Vec<Event> = (tied.events.iter())
            .map(|e| Event {
                label: "gull".into(),
                ..e.clone()
            })
            .collect();
        tied.events.extend(more);
        let why = propose(&tied).unwrap().why;
        assert!(why.contains("“buoy” is one of the most frequent events (12 times each)"));
    }
}
