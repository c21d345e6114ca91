//! What the numbers amount to, decided once for all sentences.
use crate::recipe::Measure;
use crate::sheet::{Component, Sheet};
use crate::takeaway::weights::{fitted, held_out};

/// How far the evidence is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(in crate::takeaway) enum State {
    /// No component yet.
    Nothing,
    /// Fewer than ten pairs (or windows a side): ratios and p are withheld.
    TooFew,
    /// Components, and held-out ratios still to come.
    Fitted,
    /// Held-out ratios, and p still to come.
    HeldOut,
    /// Held-out ratios, and no p was asked for.
    Untested,
    /// Everything.
    Tested,
}

/// The least pairs, or windows a side, for p and held-out ratios.
pub(in crate::takeaway) const LEAST: usize = 10;
/// Components at or under this p are called passing.
pub(in crate::takeaway) const LEVEL: f64 = 0.05;
/// Ratios further apart than this factor disagree.
const APART: f64 = 1.5;

pub(in crate::takeaway) fn state(sheet: &Sheet) -> State {
    let Some(first) = sheet.stronger.first().or(sheet.weaker.first()) else {
        return State::Nothing;
    };
    if sheet.repetitions() < LEAST {
        return State::TooFew;
    }
    if held_out(first, sheet.recipe.measure).is_none() {
        return State::Fitted;
    }
    if sheet.recipe.evidence.permutations == 0 {
        return State::Untested;
    }
    match &sheet.permutation {
        Some(p) if (p.exact || p.done >= p.asked) && first.p.is_some() => State::Tested,
        _ => State::HeldOut,
    }
}

pub(in crate::takeaway) fn passes(component: &Component) -> bool {
    component.p.is_some_and(|p| p <= LEVEL)
}

/// The interval over trials is that of the typical ratio.
pub(in crate::takeaway) fn reaches_one(component: &Component) -> bool {
    component
        .typical
        .interval
        .is_some_and(|[low, high]| low <= 1.0 && high >= 1.0)
}

/// Fitted far from 1, held-out near it: (fitted, held-out).
pub(in crate::takeaway) fn overfitted(
    component: &Component,
    measure: Measure,
) -> Option<(f64, f64)> {
    let fitted = fitted(component, measure);
    let held = held_out(component, measure)?;
    let far = fitted.ln().abs() >= APART.ln();
    let lost = held.ln() * fitted.ln().signum() < 0.35 * fitted.ln().abs();
    (far && lost).then_some((fitted, held))
}

/// How the two measures part for a component.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(in crate::takeaway) enum Parting {
    /// They agree within a factor of 1.5.
    Agree {
        /// Held-out typical ratio.
        typical: f64,
        /// Held-out total ratio.
        total: f64,
    },
    /// Much over all power, less in a typical trial.
    FewCarry {
        /// Held-out typical ratio.
        typical: f64,
        /// Held-out total ratio.
        total: f64,
        /// Trials that reach the total ratio.
        reach: Option<usize>,
    },
    /// Much in a typical trial, less over all power.
    FewHide {
        /// Held-out typical ratio.
        typical: f64,
        /// Held-out total ratio.
        total: f64,
    },
}

/// Compares the held-out ratios; `None` where one is missing.
pub(in crate::takeaway) fn parting(component: &Component, stronger: bool) -> Option<Parting> {
    let typical = component.typical.held_out?;
    let total = component.total.held_out?;
    let sign = if stronger { 1.0 } else { -1.0 };
    let gap = sign * (total.ln() - typical.ln());
    Some(if gap.abs() <= APART.ln() {
        Parting::Agree { typical, total }
    } else if gap > 0.0 {
        let reach = component
            .trials
            .iter()
            .filter(|t| sign * t.log_ratio >= sign * total.ln())
            .count();
        Parting::FewCarry {
            typical,
            total,
            reach: (!component.trials.is_empty()).then_some(reach),
        }
    } else {
        Parting::FewHide { typical, total }
    })
}

/// First and last fold's ratio where the folds mostly move one way and by much.
pub(in crate::takeaway) fn trend(sheet: &Sheet) -> Option<(f64, f64)> {
    let first = sheet.folds.first()?.ratio;
    let last = sheet.folds.last()?.ratio;
    let way = (last / first).ln();
    let with = sheet
        .folds
        .windows(2)
        .filter(|pair| (pair[1].ratio / pair[0].ratio).ln() * way > 0.0)
        .count();
    let enough = sheet.folds.len() >= 3 && with + 1 >= sheet.folds.len() - 1;
    (enough && way.abs() >= 1.4_f64.ln()).then_some((first, last))
}

/// The smallest p of all components.
pub(in crate::takeaway) fn smallest_p(sheet: &Sheet) -> Option<f64> {
    sheet
        .stronger
        .iter()
        .chain(&sheet.weaker)
        .filter_map(|c| c.p)
        .min_by(f64::total_cmp)
}

/// The ratio that the largest of the permuted ones stays under in 95 of 100 arrangements: less would not pass.
pub(in crate::takeaway) fn least_that_passes(sheet: &Sheet) -> Option<f64> {
    let mut largest = sheet.permutation.as_ref()?.largest.clone();
    largest.retain(|r| r.is_finite());
    largest.sort_by(f64::total_cmp);
    let at = (largest.len() as f64 * (1.0 - LEVEL)).ceil() as usize;
    largest.get(at.min(largest.len().checked_sub(1)?)).copied()
}

/// "trial" in a paired contrast, "window" otherwise.
pub(in crate::takeaway) fn unit(sheet: &Sheet) -> &'static str {
    if sheet.windows.as_ref().is_some_and(|w| w.paired) {
        "pair"
    } else {
        "window a side"
    }
}

/// "40 pairs", "20 windows a side".
pub(in crate::takeaway) fn repetitions(sheet: &Sheet) -> String {
    let count = sheet.repetitions();
    let paired = unit(sheet) == "pair";
    match (paired, count) {
        (true, 1) => "1 pair".into(),
        (true, n) => format!("{n} pairs"),
        (false, 1) => "1 window a side".into(),
        (false, n) => format!("{n} windows a side"),
    }
}
