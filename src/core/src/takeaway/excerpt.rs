//! A few seconds of the prepared channels with a component's series beneath them.
use super::weights::ordered;
use crate::analysis::Analysis;
use crate::recording::{Channel, Recording, Stretch};

/// `seconds` from `from_s` on: the `count` prepared channels at which the component's pattern is largest, and below them the component
/// itself, in standard deviations of its reference windows. `None` where there is no such component or no sample.
pub fn excerpt(
    analysis: &Analysis,
    component: &str,
    count: usize,
    from_s: f64,
    seconds: f64,
) -> Option<Recording> {
    let prepared = analysis.prepared()?;
    let all = ordered(analysis.sheet());
    let (name, found) = all.iter().find(|(name, _)| name == component)?;
    let mut order: Vec<usize> = (0..found.pattern.len()).collect();
    order.sort_by(|a, b| found.pattern[*b].abs().total_cmp(&found.pattern[*a].abs()));
    order.truncate(count);
    order.sort_unstable();
    let from = analysis.recording();
    let whole = Recording {
        rate_hz: prepared.rate_hz,
        stretches: prepared.stretches.clone(),
        events: from.events.clone(),
        ..Recording::default()
    };
    let (range, onset_s) = range(&whole, from_s, seconds)?;
    let mut samples: Vec<Vec<f32>> = order
        .iter()
        .map(|c| {
            let samples = analysis.channel(*c).and_then(|all| all.get(range.clone()));
            samples.map_or_else(|| vec![f32::NAN; range.len()], <[f32]>::to_vec)
        })
        .collect();
    let at = all.iter().position(|(name, _)| name == component)?;
    let series = analysis.series_of(at, range.clone())?;
    samples.push(series.into_iter().map(|y| y as f32).collect());
    let unit = |name: &String| {
        let card = from.channels.iter().find(|c| c.name == *name);
        card.map_or_else(|| prepared.unit.clone(), |c| c.unit.clone())
    };
    let channels = order.iter().map(|c| Channel {
        name: prepared.channels[*c].clone(),
        unit: unit(&prepared.channels[*c]),
        position: None,
    });
    let own = Channel {
        name: name.replace("stronger", "up").replace("weaker", "down"),
        unit: "× reference SD".to_owned(),
        position: None,
    };
    Some(Recording {
        stretches: vec![Stretch {
            first: 0,
            count: range.len(),
            onset_s,
        }],
        channels: channels.chain([own]).collect(),
        samples,
        ..whole
    })
}

/// The first unbroken samples of a span, and the time of the first of them.
fn range(
    recording: &Recording,
    from_s: f64,
    seconds: f64,
) -> Option<(std::ops::Range<usize>, f64)> {
    let rate = recording.rate_hz;
    recording.stretches.iter().find_map(|s| {
        let skip = ((from_s - s.onset_s) * rate).ceil().max(0.0) as usize;
        let ahead = (s.onset_s + skip as f64 / rate) - from_s;
        let left = ((seconds - ahead) * rate).floor();
        (skip < s.count && left >= 1.0).then(|| {
            let count = (left as usize).min(s.count - skip);
            let first = s.first + skip;
            (first..first + count, s.onset_s + skip as f64 / rate)
        })
    })
}
