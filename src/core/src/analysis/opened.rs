//! The share that was locked away, opened once: the finished components on windows that no choice has seen.
use super::cards::filter_level;
use super::work::{Work, lost};
use crate::contrast::space::repeats;
use crate::contrast::windows::{Exchange, locked_part};
use crate::error::Result;
use crate::evidence::heldout::{Design, log_total, log_typical, project};
use crate::recipe::Recipe;
use crate::recording::Recording;
use crate::sheet::{Component, HeldBack, HeldBackRatio};

/// Ratios of every reported component on the windows of the locked share; none where it holds fewer than two a side.
pub(super) fn open(work: &Work, recording: &Recording, recipe: &Recipe) -> Result<HeldBack> {
    let Some(prepared) = &work.prepared else {
        return Err(lost());
    };
    let found = locked_part(
        recipe,
        &recording.events,
        &prepared.stretches,
        prepared.rate_hz,
    );
    let Ok(selection) = found else {
        return Ok(HeldBack::default());
    };
    let reader = work.reader(prepared, recipe);
    let signal = selection.sides();
    let design = Design {
        paired: selection.paired,
        exchange: selection.exchange,
        trial: selection.windows.iter().map(|w| w.trial).collect(),
        fold: vec![0; signal.len()],
        folds: 1,
        signal,
    };
    let weights: Vec<f64> = selection
        .windows
        .iter()
        .map(|w| reader.values(w) as f64 - 1.0)
        .collect();
    let level = filter_level(work, recipe);
    let ratio = |component: &Component| {
        let courses: Vec<Vec<f64>> = selection
            .windows
            .iter()
            .map(|w| project(&component.filter, &reader, w))
            .collect();
        let variance = |k: usize| {
            courses[k].iter().map(|y| y * y).sum::<f64>() / (courses[k].len() as f64 - 1.0)
        };
        let variances: Vec<f64> = if design.exchange == Exchange::Flip {
            let trials: Vec<Vec<f64>> = courses.iter().step_by(2).cloned().collect();
            repeats(
                &trials,
                Vec::clone,
                &design.signal,
                |_| true,
                |t| variance(2 * t),
            )
        } else {
            (0..courses.len())
                .map(|k| variance(k) / if design.signal[k] { level } else { 1.0 })
                .collect()
        };
        HeldBackRatio {
            typical: (design.exchange != Exchange::Flip)
                .then(|| log_typical(&variances, &design).exp())
                .filter(|r| r.is_finite()),
            total: log_total(&variances, &weights, &design, |_| true).exp(),
        }
    };
    Ok(HeldBack {
        signal: selection.card.signal.used,
        reference: selection.card.reference.used,
        stronger: work.sheet.stronger.iter().map(ratio).collect(),
        weaker: work.sheet.weaker.iter().map(ratio).collect(),
    })
}
