//! What the numbers amount to, decided once for all sentences.
use super::words;
use crate::recipe::{Contrast, Measure};
use crate::sheet::{Component, End, Sheet};
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
    let Some(Lead {
        component: first, ..
    }) = lead(sheet)
    else {
        return State::Nothing;
    };
    if sheet.repetitions() < LEAST {
        return State::TooFew;
    }
    if held_out(first, sheet.recipe.measure).is_none() {
        return State::Fitted;
    }
    if sheet.recipe.evidence.permutations == 0 || sheet.recipe.p_withheld().is_some() {
        return State::Untested;
    }
    match &sheet.permutation {
        Some(p) if (p.exact || p.done >= p.asked) && first.p.is_some() => State::Tested,
        _ => State::HeldOut,
    }
}

/// A first component of one end, and how the sentences call it.
#[derive(Debug, Clone, Copy)]
pub(in crate::takeaway) struct Lead<'a> {
    /// The component.
    pub component: &'a Component,
    /// Whether it belongs to the stronger end.
    pub stronger: bool,
    /// Whether curve, folds and comparators are about it.
    pub leading: bool,
}

impl Lead<'_> {
    /// "component 1" or "weaker component 1".
    pub(in crate::takeaway) fn name(&self) -> &'static str {
        if self.stronger {
            "component 1"
        } else {
            "weaker component 1"
        }
    }
    /// Whether a ratio lies on this end's side of 1.
    pub(in crate::takeaway) fn on_its_side(&self, ratio: f64) -> bool {
        if self.stronger {
            ratio > 1.0
        } else {
            ratio < 1.0
        }
    }
}

/// The first components of both ends, the leading end first; an empty end gives none.
pub(in crate::takeaway) fn firsts(sheet: &Sheet) -> Vec<Lead<'_>> {
    let of = |stronger: bool| {
        let list = if stronger {
            &sheet.stronger
        } else {
            &sheet.weaker
        };
        list.first().map(|component| Lead {
            component,
            stronger,
            leading: stronger == (sheet.leading == End::Stronger),
        })
    };
    let up = sheet.leading == End::Stronger;
    [of(up), of(!up)].into_iter().flatten().collect()
}

/// The first component of the leading end, or of the other where the leading one is empty.
pub(in crate::takeaway) fn lead(sheet: &Sheet) -> Option<Lead<'_>> {
    firsts(sheet).into_iter().next()
}

/// The component that sentences about one component are about: the leading one, unless only the other end's first passes.
pub(in crate::takeaway) fn told(sheet: &Sheet) -> Option<Lead<'_>> {
    let firsts = firsts(sheet);
    firsts
        .iter()
        .find(|f| passes(f.component))
        .or(firsts.first())
        .copied()
}

/// How it stands with p where it is not final: "p is not computed yet".
pub(in crate::takeaway) fn without_p(sheet: &Sheet) -> String {
    if sheet.recipe.evidence.permutations == 0 {
        return "no permutations were asked for, so there is no p".into();
    }
    if let Some(why) = sheet.recipe.p_withheld() {
        return why.into();
    }
    let known = lead(sheet).is_some_and(|l| l.component.p.is_some());
    match &sheet.permutation {
        Some(test) if known && test.done > 0 => format!(
            "p rests on {} of {} arrangements",
            words::grouped(test.done),
            words::grouped(test.asked)
        ),
        _ => "p is not computed yet".into(),
    }
}

/// What the windows' lengths alone can do: lengths that differ by more than a factor of 2, or windows shorter than one cycle
/// of the high-pass.
pub(in crate::takeaway) fn lengths(sheet: &Sheet) -> Option<String> {
    let card = sheet.windows.as_ref()?;
    let (signal, reference) = (card.signal.seconds, card.reference.seconds);
    let shortest = signal.min(reference);
    if shortest <= 0.0 {
        return None;
    }
    if signal.max(reference) / shortest > 2.001 {
        return Some(format!(
            "signal windows last {}, reference windows {}: the shorter hold less of slow rhythms, so length alone makes the sides differ",
            words::seconds(signal),
            words::seconds(reference)
        ));
    }
    let hz = sheet.recipe.filter.high_pass_hz.filter(|hz| *hz > 0.0)?;
    (shortest * hz < 0.98).then(|| {
        format!(
            "windows of {} hold less than one cycle of the high-pass ({}), so only a part of rhythms under {}",
            words::seconds(shortest),
            words::hertz(hz),
            words::hertz(1.0 / shortest)
        )
    })
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

/// The ratio that the most extreme of the permuted ones keeps within in 95 of 100 arrangements, at the leading end: one nearer
/// to 1 would not pass.
pub(in crate::takeaway) fn least_that_passes(sheet: &Sheet) -> Option<f64> {
    let test = sheet.permutation.as_ref()?;
    let stronger = lead(sheet).is_none_or(|l| l.stronger);
    let extremes = if stronger {
        &test.largest
    } else {
        &test.smallest
    };
    let mut extremes: Vec<f64> = extremes.iter().copied().filter(|r| r.is_finite()).collect();
    extremes.sort_by(f64::total_cmp);
    if !stronger {
        extremes.reverse();
    }
    let at = (extremes.len() as f64 * (1.0 - LEVEL)).ceil() as usize;
    extremes
        .get(at.min(extremes.len().checked_sub(1)?))
        .copied()
}

/// "pair" in a paired contrast, "trial" where what repeats is asked for, "window a side" otherwise.
pub(in crate::takeaway) fn unit(sheet: &Sheet) -> &'static str {
    if matches!(sheet.recipe.contrast, Contrast::Repeatable(_)) {
        "trial"
    } else if sheet.windows.as_ref().is_some_and(|w| w.paired) {
        "pair"
    } else {
        "window a side"
    }
}

/// "40 pairs", "40 trials", "20 windows a side".
pub(in crate::takeaway) fn repetitions(sheet: &Sheet) -> String {
    let count = sheet.repetitions();
    let [one, many] = match unit(sheet) {
        "pair" => ["pair", "pairs"],
        "trial" => ["trial", "trials"],
        _ => ["window a side", "windows a side"],
    };
    format!("{count} {}", if count == 1 { one } else { many })
}
