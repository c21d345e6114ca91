//! From a recording to the lines of a few seconds.
use super::{Line, Traces};
use crate::Figure;
use crate::text;
use teasel_core::recording::Recording;

/// `seconds` of some channels from `from_s` on the file's clock; indexes that do not exist are passed over.
pub fn traces(recording: &Recording, from_s: f64, seconds: f64, channels: &[usize]) -> Figure {
    let rate = recording.rate_hz;
    let to_s = from_s + seconds;
    let mut pieces: Vec<(usize, usize, f64)> = Vec::new();
    let mut gaps = Vec::new();
    for (i, s) in recording.stretches.iter().enumerate() {
        let end_s = s.onset_s + s.count as f64 / rate;
        let first = ((from_s - s.onset_s) * rate).ceil().max(0.0) as usize;
        let last = ((to_s - s.onset_s) * rate)
            .floor()
            .clamp(-1.0, s.count as f64 - 1.0);
        if last >= 0.0 && first as f64 <= last {
            let onset = s.onset_s + first as f64 / rate;
            pieces.push((s.first + first, last as usize + 1 - first, onset));
        }
        let next = recording.stretches.get(i + 1).map(|n| n.onset_s);
        if let Some(next) = next.filter(|n| *n > end_s + 0.5 / rate && end_s < to_s && *n > from_s)
        {
            gaps.push([end_s.max(from_s), next.min(to_s)]);
        }
    }
    let shown: usize = pieces.iter().map(|p| p.1).sum();
    let bin = if shown > DENSE {
        shown.div_ceil(BINS)
    } else {
        1
    };
    let mut t_s = Vec::new();
    for (_, count, onset) in &pieces {
        for at in (0..*count).step_by(bin) {
            let copies = if bin > 1 { 2 } else { 1 };
            t_s.extend(std::iter::repeat_n(onset + at as f64 / rate, copies));
        }
        t_s.push(f64::NAN);
    }
    let shared = text::Shared::of(recording.channels.iter().map(|c| c.name.as_str()));
    let line = |c: &usize| -> Option<Line> {
        let samples = recording.samples.get(*c)?;
        let card = recording.channels.get(*c)?;
        let mut values = Vec::with_capacity(t_s.len());
        for (first, count, _) in &pieces {
            let piece = samples.get(*first..first + count)?;
            for part in piece.chunks(bin) {
                thin(part, &mut values);
            }
            values.push(f64::NAN);
        }
        let middle = median(&values);
        values.iter_mut().for_each(|v| *v -= middle);
        Some(Line {
            name: shared.without(&card.name),
            unit: card.unit.clone(),
            values,
            faint: false,
        })
    };
    let inside = recording
        .events
        .iter()
        .filter(|e| (from_s..=to_s).contains(&e.onset_s));
    Figure::Traces(Traces {
        from_s,
        seconds,
        lines: channels.iter().filter_map(line).collect(),
        events: inside.map(|e| (e.onset_s, e.label.clone())).collect(),
        gaps,
        t_s,
    })
}

/// One sample as it is; of several the smallest and the largest.
fn thin(part: &[f32], out: &mut Vec<f64>) {
    if let [one] = part {
        out.push(f64::from(*one));
        return;
    }
    let finite = part.iter().copied().filter(|v| v.is_finite());
    let (low, high) = finite.fold((f32::INFINITY, f32::NEG_INFINITY), |(l, h), v| {
        (l.min(v), h.max(v))
    });
    let ends = if low <= high {
        [low, high]
    } else {
        [f32::NAN; 2]
    };
    out.extend(ends.map(f64::from));
}

/// Samples a channel above which smallest and largest values of equal bins are drawn instead.
const DENSE: usize = 2400;

const BINS: usize = 1200;

pub(super) fn median(values: &[f64]) -> f64 {
    let mut finite: Vec<f64> = values.iter().copied().filter(|v| v.is_finite()).collect();
    finite.sort_by(f64::total_cmp);
    finite.get(finite.len() / 2).copied().unwrap_or(0.0)
}

/// Half the range that holds the middle nine tenths.
pub(super) fn spread(values: &[f64]) -> f64 {
    let mut sizes: Vec<f64> = values
        .iter()
        .filter(|v| v.is_finite())
        .map(|v| v.abs())
        .collect();
    sizes.sort_by(f64::total_cmp);
    sizes.get(sizes.len() * 9 / 10).copied().unwrap_or(0.0)
}
