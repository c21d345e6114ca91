//! A first question for a recording that arrives without one.
use crate::describe::welch::Welch;
use crate::recipe::{BandReference, Contrast, EventWindow, Filter, Recipe};
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
/// less than 0.1 s (doubled marks), half the gap that nine in ten exceed is taken. A recording without events is asked about its
/// strongest rhythm ([`strongest_peak`]). `None` where no event is frequent enough, or no rhythm stands out.
pub fn propose(recording: &Recording) -> Option<Proposal> {
    if recording.events.is_empty() {
        return propose_band(recording);
    }
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

/// The peak must stand this far above the background, in dB.
const STANDS_OUT_DB: f64 = 2.0;
/// Seconds a segment of the spectrum, and the most segments looked at.
const SEGMENT_S: f64 = 2.0;
const MOST_SEGMENTS: usize = 60;

fn propose_band(recording: &Recording) -> Option<Proposal> {
    let (peak_hz, above_db) = strongest_peak(recording)?;
    let centre_hz = (peak_hz * 2.0).round() / 2.0;
    // The flanks reach three and a half half widths from the centre, and have to stay above the high-pass.
    let half_width_hz = (((centre_hz - 1.0) / 3.5 * 4.0).floor() / 4.0).clamp(0.25, 2.0);
    let contrast = Contrast::Band {
        centre_hz,
        half_width_hz,
        reference: BandReference::Flanks,
        within: None,
        piece_s: None,
    };
    let fits = crate::contrast::windows::check(&contrast, &[], recording.rate_hz).is_ok()
        && centre_hz > 3.5 * half_width_hz;
    fits.then(|| Proposal {
        recipe: Recipe {
            filter: Filter {
                high_pass_hz: Some(1.0),
                ..Filter::default()
            },
            ..Recipe::asking(contrast)
        },
        why: format!(
            "The recording marks no events. Its spectrum, averaged over channels, stands out most at {centre_hz} Hz: {above_db:.1} dB above its 1/f background."
        ),
    })
}

/// The frequency, and the decibels, by which the spectrum averaged over channels (the mean of logs) stands farthest above its
/// background, a straight line in the logs of both axes by Theil (1950) and Sen (1968); between 3 Hz and the smaller of 45 Hz
/// and 0.4 of the rate. `None` where it is less than 2 dB.
pub fn strongest_peak(recording: &Recording) -> Option<(f64, f64)> {
    let rate = recording.rate_hz;
    let segment = ((SEGMENT_S * rate) as usize) & !1;
    let starts: Vec<usize> = recording
        .stretches
        .iter()
        .flat_map(|s| {
            (s.first..(s.first + s.count + 1).saturating_sub(segment)).step_by(segment.max(1))
        })
        .collect();
    if segment < 16 || starts.len() < 5 {
        return None;
    }
    let step = starts.len().div_ceil(MOST_SEGMENTS);
    let mut welch = Welch::new(segment, rate);
    let hz = welch.frequencies();
    let mut logs = vec![0.0; hz.len()];
    let mut channels = 0;
    for channel in &recording.samples {
        let mut density = vec![0.0; hz.len()];
        for first in starts.iter().step_by(step) {
            let samples: Vec<f64> = channel[*first..first + segment]
                .iter()
                .map(|x| f64::from(*x))
                .collect();
            for (d, x) in density.iter_mut().zip(welch.density(&samples)) {
                *d += x;
            }
        }
        if density.iter().skip(1).all(|d| d.is_finite() && *d > 0.0) {
            channels += 1;
            logs.iter_mut()
                .zip(&density)
                .for_each(|(l, d)| *l += d.log10());
        }
    }
    if channels == 0 {
        return None;
    }
    let points: Vec<(f64, f64)> = hz
        .iter()
        .zip(&logs)
        .filter(|(hz, _)| **hz >= 3.0 && **hz <= (0.4 * rate).min(45.0))
        .map(|(hz, l)| (hz.log10(), l / f64::from(channels)))
        .collect();
    let mut slopes: Vec<f64> = (0..points.len())
        .flat_map(|i| (0..i).map(move |j| (i, j)))
        .map(|(i, j)| (points[i].1 - points[j].1) / (points[i].0 - points[j].0))
        .collect();
    let slope = median(&mut slopes)?;
    let mut heights: Vec<f64> = points.iter().map(|(x, y)| y - slope * x).collect();
    let height = median(&mut heights)?;
    let above = |p: &(f64, f64)| 10.0 * (p.1 - slope * p.0 - height);
    let best = points.iter().max_by(|a, b| above(a).total_cmp(&above(b)))?;
    (above(best) >= STANDS_OUT_DB).then(|| (10f64.powf(best.0), above(best)))
}

fn median(values: &mut [f64]) -> Option<f64> {
    values.sort_by(f64::total_cmp);
    values.get(values.len() / 2).copied()
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
    fn without_events_the_strongest_rhythm_is_proposed() {
        let mut state = 9u64;
        let mut noise = || {
            state = state
                .wrapping_mul(6364136223846793005)
                .wrapping_add(1442695040888963407);
            (state >> 11) as f64 * 2f64.powi(-53) - 0.5
        };
        let mut slow = 0.0;
        let samples: Vec<f32> = (0..15_000)
            .map(|t| {
                slow = 0.95 * slow + noise();
                let rhythm = (2.0 * std::f64::consts::PI * 11.0 * f64::from(t) / 250.0).sin();
                (slow + 0.5 * noise() + 0.3 * rhythm) as f32
            })
            .collect();
        let quiet = Recording {
            stretches: vec![crate::recording::Stretch {
                first: 0,
                count: samples.len(),
                onset_s: 0.0,
            }],
            samples: vec![samples.clone(), samples],
            ..recording(&[])
        };
        let proposal = propose(&quiet).unwrap();
        assert!(
            matches!(proposal.recipe.contrast, Contrast::Band { centre_hz, half_width_hz, .. } if centre_hz == 11.0 && half_width_hz == 2.0),
            "{:?}",
            proposal.recipe.contrast
        );
        assert!(proposal.why.contains("at 11 Hz"), "{}", proposal.why);
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
