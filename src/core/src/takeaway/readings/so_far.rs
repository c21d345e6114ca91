//! The finding in one sentence, or the question while there is none.
use super::judge::{self, Parting, State};
use super::{Line, Said, Tone, words};
use crate::recipe::Measure;
use crate::sheet::{Component, Sheet};
use crate::takeaway::weights::held_out;

pub(super) fn so_far(sheet: &Sheet) -> Option<Said> {
    Some(match judge::state(sheet) {
        State::Nothing => question(sheet),
        State::TooFew => too_few(sheet),
        State::Fitted => fitted(sheet),
        State::HeldOut => finding(sheet, Some("p is still being computed")),
        State::Untested => finding(
            sheet,
            Some("no permutation was asked for, so there is no p"),
        ),
        State::Tested => tested(sheet),
    })
}

/// "After **buoy**" or "After **buoy**, compared with **swell**".
fn opening(sheet: &Sheet) -> Line {
    let (signal, reference) = words::windows(&sheet.recipe.contrast);
    let line = Line::new(words::capital(words::side_of(signal)))
        .then(" ")
        .strong(words::name(&signal.event));
    if signal.event == reference.event {
        line
    } else {
        line.then(", compared with ")
            .then(words::side_of(reference))
            .then(" ")
            .strong(words::name(&reference.event))
    }
}

fn question(sheet: &Sheet) -> Said {
    let (signal, reference) = words::windows(&sheet.recipe.contrast);
    let text = Line::new("What differs between ")
        .tone(words::window(signal), Tone::Signal)
        .then(format!(
            " from {} (signal) and ",
            words::name(&signal.event)
        ))
        .tone(words::window(reference), Tone::Reference)
        .then(if signal.event == reference.event {
            " from it (reference)?".to_string()
        } else {
            format!(" from {} (reference)?", words::name(&reference.event))
        });
    (text, None)
}

fn too_few(sheet: &Sheet) -> Said {
    let text = Line::new("Only ")
        .strong(judge::repetitions(sheet))
        .then(": too few for a held-out ratio or a p, so both are withheld. The maps are a first look, and no ratio is quoted.");
    let but = Line::new(
        "filters fitted to so few windows always find something; mark at least ten, better forty.",
    );
    (text, Some(but))
}

fn fitted(sheet: &Sheet) -> Said {
    let Some((line, _)) = lead(sheet) else {
        return question(sheet);
    };
    let text = opening(sheet).then(", ").join(line).then(
        " is the leading candidate. Its ratio on windows it never saw is still being computed.",
    );
    let but = Line::new("until then nothing is known but the fit, and a fit always flatters.");
    (text, Some(but))
}

/// The leading component: the first stronger one, or the first weaker one where there is none stronger.
fn lead(sheet: &Sheet) -> Option<(Line, &Component)> {
    let component = sheet.stronger.first().or(sheet.weaker.first())?;
    Some((describe("a component", component), component))
}

/// "a component peaking at **21 Hz**, largest at CP1,".
fn describe(what: &str, component: &Component) -> Line {
    let line = Line::new(what);
    let line = match component.peak_hz {
        Some(hz) => line.then(" peaking at ").strong(words::hertz(hz)).then(","),
        None => line,
    };
    line.then(format!(
        " largest at {}",
        words::name(&component.largest_at)
    ))
    .then(",")
}

/// "in a typical trial" or "over all power".
pub(super) fn by_measure(measure: Measure) -> &'static str {
    match measure {
        Measure::Typical => "in a typical trial",
        Measure::Total => "over all power",
    }
}

/// Says what leads, whatever its p; the doubt falls back to `missing`.
fn finding(sheet: &Sheet, missing: Option<&str>) -> Said {
    let measure = sheet.recipe.measure;
    let stronger = sheet.stronger.first();
    let weaker = sheet.weaker.first();
    let show = |c: &&Component| missing.is_some() || judge::passes(c);
    let up = stronger
        .filter(show)
        .and_then(|c| held_out(c, measure).map(|r| (c, r)));
    let down = weaker
        .filter(show)
        .and_then(|c| held_out(c, measure).map(|r| (c, r)));
    let start = opening(sheet).then(", ");
    let text = match (up, down) {
        (Some((c, r)), Some((d, q))) => start
            .join(describe("a component", c))
            .then(" has ")
            .tone(words::times(r), Tone::Signal)
            .then(format!(" its reference variance {}; ", by_measure(measure)))
            .join(second(d))
            .then(if q < 1.0 { " falls to " } else { " reaches " })
            .tone(words::times(q), Tone::Reference)
            .then("."),
        (Some((c, r)), None) => start
            .join(describe("a component", c))
            .then(" has ")
            .tone(words::times(r), Tone::Signal)
            .then(format!(" its reference variance {}.", by_measure(measure))),
        (None, Some((d, q))) => start
            .join(describe("a component", d))
            .then(if q < 1.0 { " falls to " } else { " reaches " })
            .tone(words::times(q), Tone::Reference)
            .then(format!(" its reference variance {}.", by_measure(measure))),
        (None, None) => return question(sheet),
    };
    let shown: Vec<&Component> = [up, down].into_iter().flatten().map(|(c, _)| c).collect();
    (text, Some(doubt(sheet, &shown, missing)))
}

/// "one at **10.5 Hz**, largest at Oz,".
fn second(component: &Component) -> Line {
    let line = match component.peak_hz {
        Some(hz) => Line::new("one at ").strong(words::hertz(hz)).then(","),
        None => Line::new("another,"),
    };
    line.then(format!(
        " largest at {},",
        words::name(&component.largest_at)
    ))
}

/// The largest doubt about what is shown: overfitting, parting measures, an interval that reaches 1, else the intervals.
fn doubt(sheet: &Sheet, shown: &[&Component], missing: Option<&str>) -> Line {
    let measure = sheet.recipe.measure;
    let first = shown.first();
    if let Some((fitted, held)) = first.and_then(|c| judge::overfitted(c, measure)) {
        return Line::new(format!(
            "fitted it reached {}, held-out {}: most of the fit was learnt from these very trials.",
            words::times(fitted),
            words::times(held)
        ));
    }
    let up = |c: &Component| sheet.stronger.iter().any(|s| std::ptr::eq(s, c));
    match first.and_then(|c| judge::parting(c, up(c))) {
        Some(Parting::FewCarry { typical, total, .. }) => {
            return Line::new(format!(
                "in a typical trial it is {}, over all power {}: a few large windows carry it.",
                words::times(typical),
                words::times(total)
            ));
        }
        Some(Parting::FewHide { typical, total }) => {
            return Line::new(format!(
                "over all power it is {} and in a typical trial {}: a few large windows hide it.",
                words::times(total),
                words::times(typical)
            ));
        }
        _ => {}
    }
    let intervals: Vec<String> = shown
        .iter()
        .filter_map(|c| c.typical.interval.map(words::interval))
        .collect();
    let reach = shown.iter().any(|c| judge::reaches_one(c));
    let ends = match (missing, p_values(shown)) {
        (Some(reason), _) => format!("; {reason}"),
        (None, Some(p)) => format!("; {p}"),
        (None, None) => String::new(),
    };
    if intervals.is_empty() {
        return Line::new(format!(
            "this is one recording with {}{ends}.",
            judge::repetitions(sheet)
        ));
    }
    Line::new(format!(
        "the 95{}% {} {} {}{}, from {} of one recording{ends}.",
        words::NB,
        words::one(
            intervals.len(),
            "interval of the held-out",
            "intervals of the held-out"
        ),
        words::one(intervals.len(), "typical ratio is", "typical ratios are"),
        words::list(&intervals),
        if reach { ", which takes in 1" } else { "" },
        judge::repetitions(sheet),
    ))
}

fn p_values(shown: &[&Component]) -> Option<String> {
    let values: Vec<String> = shown
        .iter()
        .filter_map(|c| c.p.map(words::p_value))
        .collect();
    (!values.is_empty()).then(|| format!("p{0}={0}{1}", words::NB, words::list(&values)))
}

fn tested(sheet: &Sheet) -> Said {
    let leads = [sheet.stronger.first(), sheet.weaker.first()];
    if leads.into_iter().flatten().any(judge::passes) {
        return finding(sheet, None);
    }
    let smallest = judge::smallest_p(sheet).map_or(String::new(), words::p_value);
    let passing = sheet
        .stronger
        .iter()
        .chain(&sheet.weaker)
        .find(|c| judge::passes(c));
    if let Some(component) = passing {
        let text = opening(sheet)
            .then(", ")
            .join(describe("a component", component))
            .then(" passes (p = ")
            .strong(component.p.map_or(String::new(), words::p_value))
            .then("), though it does not lead its end.");
        return (text, Some(no_proof(sheet)));
    }
    if let Some((fitted, held)) = sheet
        .stronger
        .first()
        .and_then(|c| judge::overfitted(c, sheet.recipe.measure))
    {
        let text = Line::new("Fitted ")
            .strong(words::times(fitted))
            .then(", held-out ")
            .strong(words::times(held))
            .then(": the filters learnt these trials, not the difference. No component passes (smallest p = ")
            .strong(smallest)
            .then(").");
        let but = Line::new(
            "with fewer dimensions or longer windows less can be learnt by heart; that nothing passed is no proof of sameness.",
        );
        return (text, Some(but));
    }
    let text = opening(sheet)
        .then(", no component passes (smallest p = ")
        .strong(smallest)
        .then("): nothing differs that ")
        .strong(judge::repetitions(sheet))
        .then(" could show.");
    (text, Some(no_proof(sheet)))
}

fn no_proof(sheet: &Sheet) -> Line {
    match judge::least_that_passes(sheet) {
        Some(ratio) => Line::new(format!(
            "that is no proof of sameness: with {}, a ratio under about {} would not have passed.",
            judge::repetitions(sheet),
            words::three(ratio)
        )),
        None => Line::new("that is no proof of sameness."),
    }
}
