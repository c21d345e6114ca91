//! The reading of the evidence: held-out ratio, what stands beside it, permutation, drift over folds.
use super::judge::{self, Lead, State};
use super::so_far::by_measure;
use super::{Line, Said, words};
use crate::recipe::Measure;
use crate::sheet::{Comparator, ComparatorKind, Permutation, Sheet};
use crate::takeaway::kinds;
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
            let told = judge::told(sheet)?;
            let held = held_out(told.component, sheet.recipe.measure)?;
            let near = if told.leading {
                beside(sheet)
            } else {
                Line::default()
            };
            let text = Line::new(format!(
                "On windows it never saw, {} {} ",
                told.name(),
                reach(&told, held)
            ))
            .strong(words::factor(held))
            .then(format!(" {}", by_measure(sheet.recipe.measure)))
            .join(near)
            .then(".")
            .join(chance(sheet, told.component.p));
            Some((text, evidence_doubt(sheet, &told, held)))
        }
    }
}

/// "reaches", or "falls to" for a weaker component that does.
fn reach(told: &Lead, held: f64) -> &'static str {
    if !told.stronger && held < 1.0 {
        "falls to"
    } else {
        "reaches"
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
            "; the best principal component {} and the best single {} {}",
            words::factor(b),
            words::carrier(sheet, 1),
            words::factor(c)
        )),
        (Some(b), None) => Line::new(format!(
            "; the best principal component {}",
            words::factor(b)
        )),
        (None, Some(c)) => Line::new(format!(
            "; the best single {} {}",
            words::carrier(sheet, 1),
            words::factor(c)
        )),
        (None, None) => Line::default(),
    }
}

/// " Of 1,000 swapped arrangements **3** did as well: p = **0.004**."
fn chance(sheet: &Sheet, p: Option<f64>) -> Line {
    let how = kinds::arranged(sheet);
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
        _ => Line::new(format!(
            " {}.",
            words::capital_unless_p(&judge::without_p(sheet))
        )),
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

fn evidence_doubt(sheet: &Sheet, told: &Lead, held: f64) -> Option<Line> {
    let name = told.name();
    let single = format!("the best single {}", words::carrier(sheet, 1));
    let rivals = [
        (ComparatorKind::BestChannel, single.as_str()),
        (ComparatorKind::BestPc, "the best principal component"),
        (ComparatorKind::FirstPc, "the first principal component"),
    ];
    let size = held.ln().abs();
    for (kind, rival_name) in rivals {
        let way = if told.stronger { 1.0 } else { -1.0 };
        let rival = of(sheet, kind).filter(|_| told.leading && told.on_its_side(held));
        if let Some(r) = rival.filter(|r| way * r.ln() >= size) {
            return Some(Line::new(format!(
                "{rival_name} does as well ({}): where that is enough, it is the simpler account.",
                words::factor(r)
            )));
        }
    }
    let trend = judge::trend(sheet).filter(|_| told.leading);
    if let Some((first, last)) = trend {
        return Some(Line::new(format!(
            "{name} {} from {} in the first fold to {} in the last: practice, fatigue or a drifting contact could do that.",
            if last > first { "rises" } else { "falls" },
            words::factor(first),
            words::factor(last)
        )));
    }
    let under = (sheet.folds.iter())
        .filter(|f| !told.on_its_side(f.ratio))
        .count();
    if told.leading && under > 0 && under < sheet.folds.len() && told.on_its_side(held) {
        return Some(Line::new(format!(
            "in {} of {} folds {name} stays {} 1.",
            words::count(under),
            words::count(sheet.folds.len()),
            if told.stronger { "under" } else { "above" }
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
