//! The reading of the evidence: held-out ratio, what stands beside it, permutation, drift over folds.
use super::judge::{self, State};
use super::so_far::by_measure;
use super::{Line, Said, words};
use crate::recipe::Measure;
use crate::sheet::{Comparator, ComparatorKind, Component, Permutation, Sheet};
use crate::takeaway::weights::held_out;

pub(super) fn evidence(sheet: &Sheet) -> Option<Said> {
    match judge::state(sheet) {
        State::Nothing => None,
        State::TooFew => Some((
            Line::new("Held-out ratios and p are withheld: there are ")
                .strong(judge::repetitions(sheet))
                .then(format!(
                    ", and {} are the least.",
                    words::count(judge::LEAST)
                )),
            Some(Line::new(
                "with fewer, the smallest p that can be reached and the spread of a fold say more about the count than about the recording.",
            )),
        )),
        State::Fitted => Some((
            Line::new("The filters are being fitted again without each fold, and scored on it."),
            None,
        )),
        _ => {
            let (component, name, p) = leader(sheet)?;
            let held = held_out(component, sheet.recipe.measure)?;
            let text = Line::new(format!("On windows it never saw, {name} reaches "))
                .strong(words::factor(held))
                .then(format!(" {}", by_measure(sheet.recipe.measure)))
                .join(beside(sheet))
                .then(".")
                .join(chance(sheet, p));
            Some((text, evidence_doubt(sheet, held)))
        }
    }
}

fn leader(sheet: &Sheet) -> Option<(&Component, &'static str, Option<f64>)> {
    let up = sheet.stronger.first();
    let down = sheet.weaker.first();
    match (up, down) {
        (Some(c), Some(d)) if !judge::passes(c) && judge::passes(d) => {
            Some((d, "weaker component 1", d.p))
        }
        (Some(c), _) => Some((c, "component 1", c.p)),
        (None, Some(d)) => Some((d, "weaker component 1", d.p)),
        (None, None) => None,
    }
}

fn ratio(comparator: &Comparator, measure: Measure) -> Option<f64> {
    match measure {
        Measure::Typical => comparator.typical.held_out,
        Measure::Total => comparator.total.held_out,
    }
}

fn of(sheet: &Sheet, kind: ComparatorKind) -> Option<f64> {
    sheet
        .compare
        .iter()
        .find(|c| c.kind == kind)
        .and_then(|c| ratio(c, sheet.recipe.measure))
}

/// "; the best principal component reaches 1.74× and the best single channel 1.59×".
fn beside(sheet: &Sheet) -> Line {
    let best = of(sheet, ComparatorKind::BestPc);
    let channel = of(sheet, ComparatorKind::BestChannel);
    match (best, channel) {
        (Some(b), Some(c)) => Line::new(format!(
            "; the best principal component {} and the best single channel {}",
            words::factor(b),
            words::factor(c)
        )),
        (Some(b), None) => Line::new(format!(
            "; the best principal component {}",
            words::factor(b)
        )),
        (None, Some(c)) => Line::new(format!("; the best single channel {}", words::factor(c))),
        (None, None) => Line::default(),
    }
}

/// " Of 1,000 swapped arrangements **3** did as well: p = **0.004**."
fn chance(sheet: &Sheet, p: Option<f64>) -> Line {
    let paired = sheet.windows.as_ref().is_some_and(|w| w.paired);
    let how = if paired { "swapped" } else { "shuffled" };
    match (&sheet.permutation, p) {
        (Some(test), Some(p)) if test.done > 0 => {
            let b = as_good(test, p);
            let start = if test.exact {
                format!(
                    " Of all {} arrangements, this one included, ",
                    words::grouped(test.done)
                )
            } else {
                format!(" Of {} {how} arrangements ", words::grouped(test.done))
            };
            let number = if b == 0 {
                "none".into()
            } else {
                words::grouped(b)
            };
            Line::new(start)
                .strong(number)
                .then(format!(" did as well: p{0}={0}", words::NB))
                .strong(words::p_value(p))
                .then(".")
        }
        _ if sheet.recipe.evidence.permutations == 0 => Line::new(" No permutation was asked for."),
        _ => Line::new(" The permutations are still running."),
    }
}

/// Arrangements that did as well: from p = (b+1)/(m+1), or p = b/m where all were enumerated (Phipson & Smyth 2010).
pub(in crate::takeaway) fn as_good(test: &Permutation, p: f64) -> usize {
    if test.exact {
        (p * test.done as f64).round() as usize
    } else {
        ((p * (test.done as f64 + 1.0)).round() as usize).saturating_sub(1)
    }
}

fn evidence_doubt(sheet: &Sheet, held: f64) -> Option<Line> {
    let rivals = [
        (ComparatorKind::BestChannel, "the best single channel"),
        (ComparatorKind::BestPc, "the best principal component"),
        (ComparatorKind::FirstPc, "the first principal component"),
    ];
    let size = held.ln().abs();
    for (kind, name) in rivals {
        if let Some(r) = of(sheet, kind).filter(|r| held > 1.0 && r.ln() >= size) {
            return Some(Line::new(format!(
                "{name} does as well ({}): where that is enough, it is the simpler account.",
                words::factor(r)
            )));
        }
    }
    if let Some((first, last)) = judge::trend(sheet) {
        return Some(Line::new(format!(
            "component 1 {} from {} in the first fold to {} in the last: practice, fatigue or a drifting contact could do that.",
            if last > first { "grows" } else { "falls" },
            words::factor(first),
            words::factor(last)
        )));
    }
    let under = sheet.folds.iter().filter(|f| f.ratio < 1.0).count();
    if under > 0 && under < sheet.folds.len() && held > 1.0 {
        return Some(Line::new(format!(
            "in {} of {} folds component 1 stays under 1.",
            words::count(under),
            words::count(sheet.folds.len())
        )));
    }
    let first = sheet
        .compare
        .iter()
        .find(|c| c.kind == ComparatorKind::FirstPc)
        .and_then(|c| ratio(c, sheet.recipe.measure).zip(c.share));
    Some(match first {
        Some((r, share)) => Line::new(format!(
            "the folds come from one recording. The first principal component, {} of the variance, reaches {} on the same windows.",
            words::percent(share),
            words::factor(r)
        )),
        None => Line::new(
            "the folds come from one recording: what passes here may not pass in the next.",
        ),
    })
}
