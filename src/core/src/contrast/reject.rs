//! Dropping windows for what is in them: amplitude, step, flatness, covariance.
//!
//! Every criterion is one number a window. A robust limit lies z · 1.4826 · MAD of the logarithms beyond their median (Huber 1981, *Robust
//! Statistics*; the spread is taken as at least 0.05), over the windows of both sides together: it is blind to the labels, so
//! permutations hold. Off by default: a filter has to see an artefact to learn to cancel it.
use super::linalg::{eigh, unpack};
use super::space::Covariances;
use super::windows::Window;
use crate::recipe::{DropWindows, Limit};
use crate::sheet::{CriterionCard, RejectionCard};
use nalgebra::DMatrix;

/// Least spread of the logarithms.
const LEAST_SPREAD: f64 = 0.05;

/// What a window holds, in the channels' unit: largest peak-to-peak amplitude of a channel, largest step between two samples, smallest
/// peak-to-peak amplitude of a channel.
pub fn measure(samples: &[Vec<f32>], window: &Window) -> [f64; 3] {
    let (mut largest, mut step, mut smallest) = (0.0_f32, 0.0_f32, f32::INFINITY);
    for channel in samples {
        let part = &channel[window.first..window.first + window.count];
        let (low, high) = part
            .iter()
            .fold((f32::INFINITY, f32::NEG_INFINITY), |(l, h), x| {
                (l.min(*x), h.max(*x))
            });
        largest = largest.max(high - low);
        smallest = smallest.min(high - low);
        for pair in part.windows(2) {
            step = step.max((pair[1] - pair[0]).abs());
        }
    }
    [largest, step, smallest].map(f64::from)
}

/// tr(P⁻¹C_k)/r of every window, P the covariance pooled over all and r its rank: 1 on average, large where a window is large in any
/// direction.
pub fn relative_size(all: &Covariances) -> Vec<f64> {
    let m = all.channels;
    let (values, vectors) = eigh(&unpack(&all.pooled(|_| true), m));
    let floor = values.first().copied().unwrap_or(0.0) * m as f64 * 1e-12;
    let rank = values.iter().take_while(|e| **e > floor).count();
    let inverse = DMatrix::from_fn(m, rank, |i, k| vectors[(i, k)] / values[k].sqrt());
    let inverse = &inverse * inverse.transpose();
    all.packed
        .iter()
        .map(|packed| unpack(packed, m).component_mul(&inverse).sum() / rank.max(1) as f64)
        .collect()
}

/// Judges every window by the criteria of the recipe; gives the card and, for each window, the first criterion that drops it.
/// `measures` are those of [`measure`], `sizes` those of [`relative_size`] (only looked at where asked for).
pub fn judge(
    drop: &DropWindows,
    measures: &[[f64; 3]],
    sizes: &[f64],
    windows: &[Window],
    unit: &str,
) -> (RejectionCard, Vec<Option<&'static str>>) {
    let column = |k: usize| -> Vec<f64> { measures.iter().map(|m| m[k]).collect() };
    let asked: Vec<(&'static str, Limit, Vec<f64>, &str)> = [
        drop.amplitude.map(|l| ("amplitude", l, column(0), unit)),
        drop.step.map(|l| ("step", l, column(1), unit)),
        drop.flat.map(|l| ("flat-window", l, column(2), unit)),
        drop.covariance
            .map(|z| ("covariance", Limit::Robust(z), sizes.to_vec(), "")),
    ]
    .into_iter()
    .flatten()
    .collect();
    let mut why = vec![None; windows.len()];
    let mut criteria = Vec::new();
    for (name, limit, values, unit) in asked {
        let below = name == "flat-window";
        let (median, limit) = threshold(&values, limit, below);
        let mut beyond = [0, 0];
        for (k, value) in values.iter().enumerate() {
            let out = if below {
                *value < limit
            } else {
                *value > limit
            };
            if out {
                beyond[usize::from(!windows[k].signal)] += 1;
                why[k].get_or_insert(name);
            }
        }
        criteria.push(CriterionCard {
            name: if below { "flat" } else { name }.to_owned(),
            limit,
            median,
            unit: unit.to_owned(),
            beyond,
        });
    }
    let card = RejectionCard {
        criteria,
        windows: [windows.len(), windows.len()],
        effect: None,
    };
    (card, why)
}

/// Median and limit in the values' own unit.
fn threshold(values: &[f64], limit: Limit, below: bool) -> (f64, f64) {
    let middle = median(values.to_vec());
    let z = match limit {
        Limit::Absolute(absolute) => return (middle, absolute.uv),
        Limit::Robust(robust) => robust.z,
    };
    let least = (1e-12 * middle).max(f64::MIN_POSITIVE);
    let logs: Vec<f64> = values.iter().map(|v| v.max(least).ln()).collect();
    let centre = median(logs.clone());
    let away = logs.iter().map(|l| (l - centre).abs()).collect();
    let spread = (1.4826 * median(away)).max(LEAST_SPREAD);
    let way = if below { -1.0 } else { 1.0 };
    (middle, (centre + way * z * spread).exp())
}

fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let n = values.len();
    match n {
        0 => 0.0,
        n if n % 2 == 1 => values[n / 2],
        _ => 0.5 * (values[n / 2 - 1] + values[n / 2]),
    }
}
