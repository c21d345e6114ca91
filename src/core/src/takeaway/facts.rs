//! What is told of a recording: label and sentence, the same on the page and in the terminal.
use super::words;
use crate::recording::Layout;
use crate::sheet::{ChannelCard, RecordingCard};
use serde::Serialize;
use std::collections::BTreeMap;

/// One thing that is told.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Fact {
    /// In a word or two: "format".
    pub label: String,
    /// The rest: "EDF+C".
    pub text: String,
}

/// Names listed in full; of more, the first and how many follow.
const NAMES: usize = 6;
/// Labels of events listed.
const LABELS: usize = 8;

/// Everything told of a recording beside its warnings, in the order it is read in.
pub fn facts(card: &RecordingCard, channels: &[ChannelCard]) -> Vec<Fact> {
    let mut all = Vec::new();
    let mut tell = |label: &str, text: String| {
        if !text.is_empty() {
            all.push(Fact {
                label: label.to_owned(),
                text,
            });
        }
    };
    tell("format", card.format.clone());
    tell("length", length(card));
    tell("starts at", card.about.start.clone().unwrap_or_default());
    tell("gaps", gaps(card));
    tell("channels", kinds(card, channels));
    tell("units", units(channels));
    tell("positions", positions(card, channels));
    tell(
        "reference",
        card.about.reference.clone().unwrap_or_default(),
    );
    let mains = card.about.mains_hz.map(words::hertz);
    tell("mains", mains.unwrap_or_default());
    tell("set aside", aside(card));
    tell("not analysed", others(card));
    tell("events", events(card));
    tell("side files", card.side_files.join(", "));
    all
}

fn length(card: &RecordingCard) -> String {
    let samples: usize = card.stretches.iter().map(|s| s.count).sum();
    format!(
        "{}, {} samples a channel at {}",
        words::duration(card.duration_s),
        words::grouped(samples),
        words::hertz(card.rate_hz)
    )
}

/// "none", or how many and where the longest lies.
fn gaps(card: &RecordingCard) -> String {
    let ends = |s: &crate::recording::Stretch| s.onset_s + s.count as f64 / card.rate_hz;
    let gaps = card
        .stretches
        .windows(2)
        .map(|w| (ends(&w[0]), w[1].onset_s - ends(&w[0])));
    let longest = gaps.max_by(|a, b| a.1.total_cmp(&b.1));
    match (longest, card.stretches.len()) {
        (None, _) => "none".into(),
        (Some((at, seconds)), n) => format!(
            "{}, the longest {} at {}",
            n - 1,
            words::duration(seconds),
            words::clock(at)
        ),
    }
}

/// "32 (30 EEG, 2 EOG)".
fn kinds(card: &RecordingCard, channels: &[ChannelCard]) -> String {
    let mut counts: BTreeMap<&str, usize> = BTreeMap::new();
    for channel in channels {
        let kind = card
            .about
            .kinds
            .get(&channel.name)
            .map_or("of unknown kind", String::as_str);
        *counts.entry(kind).or_default() += 1;
    }
    let total = channels.len();
    if let Layout::Frames { height, width, .. } = &card.layout {
        return format!("{total}: one for each of {height} × {width} pixels");
    }
    if card.about.kinds.is_empty() {
        return total.to_string();
    }
    let parts: Vec<String> = counts
        .iter()
        .map(|(kind, n)| format!("{n} {kind}"))
        .collect();
    format!("{total} ({})", parts.join(", "))
}

fn units(channels: &[ChannelCard]) -> String {
    let mut counts: BTreeMap<&str, usize> = BTreeMap::new();
    for channel in channels {
        let unit = if channel.unit.is_empty() {
            "no unit"
        } else {
            &channel.unit
        };
        *counts.entry(unit).or_default() += 1;
    }
    match counts.len() {
        0 | 1 => counts.keys().copied().collect::<String>(),
        _ => {
            let parts: Vec<String> = counts
                .iter()
                .map(|(unit, n)| format!("{n} in {unit}"))
                .collect();
            parts.join(", ")
        }
    }
}

/// "32 of 32, by name (10–05 system)".
fn positions(card: &RecordingCard, channels: &[ChannelCard]) -> String {
    if let Layout::Frames { .. } = card.layout {
        return "by row and column of the picture".into();
    }
    let known = channels.iter().filter(|c| c.position.is_some()).count();
    if known == 0 {
        return format!(
            "none of {}: patterns stand in order of size",
            channels.len()
        );
    }
    let from = match (&card.about.positions, &card.layout) {
        (Some(file), _) => format!("from {file}"),
        (None, Layout::Head) => "by name (10–05 system)".to_owned(),
        (None, _) => "as told".to_owned(),
    };
    let lie = match card.layout {
        Layout::Head => "on the head",
        Layout::Plane => "on a plane",
        Layout::Line => "on a line",
        Layout::Frames { .. } => "in a picture",
    };
    format!("{known} of {}, {lie}, {from}", channels.len())
}

/// "VEOG (its kind is EOG), Fz (marked bad: loose)".
fn aside(card: &RecordingCard) -> String {
    listed(
        card.about
            .aside
            .iter()
            .map(|(name, why)| format!("{name} ({why})")),
    )
}

fn others(card: &RecordingCard) -> String {
    listed(
        card.others
            .iter()
            .map(|o| format!("{} ({})", o.name, o.reason)),
    )
}

fn listed(all: impl ExactSizeIterator<Item = String>) -> String {
    let count = all.len();
    let mut names: Vec<String> = all.take(NAMES).collect();
    if count > names.len() {
        names.push(format!("{} more", count - names.len()));
    }
    names.join(", ")
}

fn events(card: &RecordingCard) -> String {
    let mut labels: Vec<(&String, &usize)> = card.events.iter().collect();
    labels.sort_by(|a, b| b.1.cmp(a.1).then(a.0.cmp(b.0)));
    let total: usize = card.events.values().sum();
    if labels.is_empty() {
        return "none".into();
    }
    let mut parts: Vec<String> = labels
        .iter()
        .take(LABELS)
        .map(|(l, n)| format!("{l} {n}×"))
        .collect();
    if labels.len() > LABELS {
        parts.push(format!("{} more kinds", labels.len() - LABELS));
    }
    format!("{}: {}", words::grouped(total), parts.join(", "))
}

/// Where the events of each label lie, as a line of `columns` marks over the whole recording: `·` none, `|` one, `:` a few, `#` ten or more.
/// The most frequent labels first, at most `most` of them.
pub fn timelines(card: &RecordingCard, columns: usize, most: usize) -> Vec<(String, String)> {
    let end = card
        .stretches
        .last()
        .map_or(0.0, |s| s.onset_s + s.count as f64 / card.rate_hz);
    let mut labels: Vec<(&String, &Vec<f64>)> = card.event_onsets_s.iter().collect();
    labels.sort_by(|a, b| b.1.len().cmp(&a.1.len()).then(a.0.cmp(b.0)));
    let line = |onsets: &Vec<f64>| {
        let mut counts = vec![0usize; columns];
        for onset in onsets {
            let at = (onset / end * columns as f64) as usize;
            if let Some(count) = counts.get_mut(at) {
                *count += 1;
            }
        }
        let mark = |n: &usize| match n {
            0 => '·',
            1 => '|',
            2..=9 => ':',
            _ => '#',
        };
        counts.iter().map(mark).collect::<String>()
    };
    labels
        .into_iter()
        .take(most)
        .map(|(label, onsets)| (label.clone(), line(onsets)))
        .collect()
}
