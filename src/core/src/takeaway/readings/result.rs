//! Readings of the components and of the take-away.
use super::judge::{self, Parting, State};
use super::{Line, Said, Tone, words};
use crate::recipe::Measure;
use crate::sheet::{Component, Sheet};
use crate::takeaway::weights::held_out;

pub(super) fn components(sheet: &Sheet) -> Option<Said> {
    let text = match judge::state(sheet) {
        State::Nothing => return None,
        State::TooFew => Line::new("With ").strong(judge::repetitions(sheet)).then(
            " the components are shown without held-out ratios and p: they cannot be told from chance.",
        ),
        State::Fitted => found(sheet).then(" The held-out ratios are still being computed."),
        State::HeldOut | State::Untested => on_their_side(sheet).join(leads(sheet)).then(format!(
            " {}.",
            words::capital_unless_p(&judge::without_p(sheet))
        )),
        State::Tested => counts(sheet).join(leads(sheet)),
    };
    Some((text, components_doubt(sheet)))
}

fn found(sheet: &Sheet) -> Line {
    Line::new("Shown are ")
        .strong(words::count(sheet.stronger.len()))
        .then(format!(
            " {} stronger in signal and ",
            words::one(sheet.stronger.len(), "component", "components")
        ))
        .strong(words::count(sheet.weaker.len()))
        .then(" weaker.")
}

/// What is shown, and how many keep to their side of 1 on held-out windows, where some do not.
fn on_their_side(sheet: &Sheet) -> Line {
    let measure = sheet.recipe.measure;
    let keep = |components: &[Component], stronger: bool| {
        components
            .iter()
            .filter(|c| held_out(c, measure).is_some_and(|r| (r > 1.0) == stronger && r != 1.0))
            .count()
    };
    let (up, down) = (keep(&sheet.stronger, true), keep(&sheet.weaker, false));
    if (up, down) == (sheet.stronger.len(), sheet.weaker.len()) {
        return found(sheet);
    }
    Line::new("Held-out, ")
        .strong(format!("{up} of {}", sheet.stronger.len()))
        .then(" stronger and ")
        .strong(format!("{down} of {}", sheet.weaker.len()))
        .then(" weaker components keep to their side of 1.")
}

/// "**Two** components are stronger in signal and **one** is weaker at p ≤ 0.05."
fn counts(sheet: &Sheet) -> Line {
    let up = sheet.stronger.iter().filter(|c| judge::passes(c)).count();
    let down = sheet.weaker.iter().filter(|c| judge::passes(c)).count();
    let level = format!(" at p{0}≤{0}0.05", words::NB);
    let be = |n| words::one(n, "is", "are");
    match (up, down) {
        (0, 0) => Line::new("No component passes (smallest p = ")
            .strong(judge::smallest_p(sheet).map_or(String::new(), words::p_value))
            .then(")."),
        (0, n) => Line::default()
            .tone(words::capital(&words::count(n)), Tone::Strong)
            .then(format!(
                " {} {} weaker in signal{level} and none is stronger.",
                words::one(n, "component", "components"),
                be(n)
            )),
        (n, 0) => Line::default()
            .strong(words::capital(&words::count(n)))
            .then(format!(
                " {} {} stronger in signal{level} and none is weaker.",
                words::one(n, "component", "components"),
                be(n)
            )),
        (n, m) => Line::default()
            .strong(words::capital(&words::count(n)))
            .then(format!(
                " {} {} stronger in signal and ",
                words::one(n, "component", "components"),
                be(n)
            ))
            .strong(words::count(m))
            .then(format!(" {} weaker{level}.", be(m))),
    }
}

fn leads(sheet: &Sheet) -> Line {
    let Some(told) = judge::told(sheet) else {
        return Line::default();
    };
    let component = told.component;
    let name = words::capital(told.name());
    match judge::parting(component, told.stronger) {
        Some(Parting::Agree { typical, total }) => Line::new(format!(" {name} has "))
            .strong(words::factor(typical))
            .then(" in a typical held-out trial and ")
            .strong(words::factor(total))
            .then(" over all power, so a few trials are not the reason."),
        Some(Parting::FewCarry {
            typical,
            total,
            reach,
        }) => Line::new(format!(" {name} has "))
            .strong(words::factor(typical))
            .then(" in a typical held-out trial and ")
            .strong(words::factor(total))
            .then(" over all power: ")
            .then(match reach {
                Some(n) => format!("{n} of {} trials reach that.", component.trials.len()),
                None => "a few large windows carry it.".into(),
            }),
        Some(Parting::FewHide { typical, total }) => Line::new(format!(" {name} has "))
            .strong(words::factor(typical))
            .then(" in a typical held-out trial, only ")
            .strong(words::factor(total))
            .then(" over all power."),
        None => match held_out(component, sheet.recipe.measure) {
            Some(ratio) => Line::new(format!(" {name} has "))
                .strong(words::factor(ratio))
                .then(match sheet.recipe.measure {
                    Measure::Typical => " in a typical held-out trial.",
                    Measure::Total => " over all held-out power.",
                }),
            None => Line::default(),
        },
    }
}

fn components_doubt(sheet: &Sheet) -> Option<Line> {
    if judge::state(sheet) == State::TooFew {
        return Some(Line::new(
            "filters always find a direction that fits; only windows they never saw can speak for it.",
        ));
    }
    if let Some(told) = judge::told(sheet) {
        let component = told.component;
        if let Some((fitted, held)) = judge::overfitted(component, sheet.recipe.measure) {
            return Some(Line::new(format!(
                "fitted {}, held-out {}: the filters learnt these trials, not the difference. Keep fewer dimensions.",
                words::factor(fitted),
                words::factor(held)
            )));
        }
        match judge::parting(component, told.stronger) {
            Some(Parting::FewCarry { .. }) => {
                return Some(Line::new(
                    "what a few large windows carry is an anecdote: look at those windows first, and at the other measure.",
                ));
            }
            Some(Parting::FewHide { .. }) => {
                return Some(Line::new(
                    "a few windows that are large for other reasons weigh down the total; look at them before you quote either.",
                ));
            }
            _ => {}
        }
    }
    changed(sheet).or_else(|| wide(sheet)).or_else(|| {
        Some(Line::new(match &sheet.movie {
            Some(_) => {
                "a pattern shows where a component is seen in the picture, not what made it."
            }
            None => "a pattern shows how a component looks at the channels, not where it arises.",
        }))
    })
}

/// Components that changed places in at least a third of the folds.
fn changed(sheet: &Sheet) -> Option<Line> {
    let folds = sheet.recipe.evidence.folds;
    let end = |components: &[Component]| -> Vec<String> {
        components
            .iter()
            .enumerate()
            .filter(|(_, c)| c.places_changed.is_some_and(|n| n > 0 && 3 * n >= folds))
            .map(|(k, _)| (k + 1).to_string())
            .collect()
    };
    let (up, down) = (end(&sheet.stronger), end(&sheet.weaker));
    let many = up.len() + down.len();
    let names = match (up.is_empty(), down.is_empty()) {
        (true, true) => return None,
        (false, true) => format!(
            "{} {}",
            words::one(up.len(), "component", "components"),
            words::list(&up)
        ),
        (true, false) => format!(
            "weaker {} {}",
            words::one(down.len(), "component", "components"),
            words::list(&down)
        ),
        (false, false) => format!(
            "{} {} and weaker {}",
            words::one(up.len(), "component", "components"),
            words::list(&up),
            words::list(&down)
        ),
    };
    Some(Line::new(format!(
        "{names} {} places in a third of the folds or more: report {} from this recording alone with care.",
        words::one(many, "changes", "change"),
        words::one(many, "it", "them")
    )))
}

/// A component that passes while its held-out interval takes in 1.
fn wide(sheet: &Sheet) -> Option<Line> {
    let all = sheet
        .stronger
        .iter()
        .enumerate()
        .map(|(k, c)| (format!("component {}", k + 1), c))
        .chain(
            sheet
                .weaker
                .iter()
                .enumerate()
                .map(|(k, c)| (format!("weaker component {}", k + 1), c)),
        );
    let (name, interval) = all
        .filter(|(_, c)| judge::passes(c) && judge::reaches_one(c))
        .find_map(|(name, c)| c.typical.interval.map(|i| (name, i)))?;
    Some(Line::new(format!(
        "{name} passes the permutation test, yet its held-out interval ({}) takes in 1.",
        words::interval(interval)
    )))
}

pub(super) fn take_away(sheet: &Sheet) -> Option<Said> {
    let count = sheet.stronger.len() + sheet.weaker.len();
    if count == 0 {
        return None;
    }
    let channels = sheet
        .preparation
        .as_ref()
        .map_or(sheet.channels.len(), |p| p.channels.len());
    let text = Line::default()
        .strong(words::count(count))
        .then(format!(" {} for ", words::one(count, "filter", "filters")))
        .strong(words::grouped(channels))
        .then(format!(" {}", words::carrier(sheet, channels)))
        .then(". Recipe and recording together give these numbers again, to the last digit, here or from the terminal.");
    let text = Line(
        text.0
            .into_iter()
            .enumerate()
            .map(|(at, mut span)| {
                if at == 0 {
                    span.text = words::capital(&span.text);
                }
                span
            })
            .collect(),
    );
    let but = Line::new(match &sheet.movie {
        Some(_) => {
            "the filters suit this field of view and this preparation; in another movie Teasel makes the same bins and baseline, and cannot see a shift of the picture."
        }
        None => {
            "the filters suit this montage and this preparation; on another recording Teasel checks both before it applies them."
        }
    });
    Some((text, Some(but)))
}
