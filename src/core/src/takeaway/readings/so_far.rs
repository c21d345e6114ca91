//! The finding in one sentence, or the question while there is none.
use super::judge::{self, Lead, Parting, State};
use super::{Line, Said, Tone, words};
use crate::recipe::Measure;
use crate::sheet::{Component, Sheet};
use crate::takeaway::kinds;
use crate::takeaway::weights::held_out;

pub(super) fn so_far(sheet: &Sheet) -> Option<Said> {
    Some(match judge::state(sheet) {
        State::Nothing => question(sheet),
        State::TooFew => too_few(sheet),
        State::Fitted => fitted(sheet),
        State::HeldOut | State::Untested => finding(sheet, Some(&judge::without_p(sheet))),
        State::Tested => tested(sheet),
    })
}

/// "After **buoy**" or "After **buoy**, compared with **swell**".
fn opening(sheet: &Sheet) -> Line {
    let Some((signal, reference)) = words::windows(&sheet.recipe.contrast) else {
        return Line::default().strong(kinds::opening(&sheet.recipe.contrast));
    };
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

/// "of **buoy**" or "of **buoy** and **swell**", in plain words.
fn contrast(sheet: &Sheet) -> String {
    let Some((signal, reference)) = words::windows(&sheet.recipe.contrast) else {
        return kinds::of(&sheet.recipe.contrast);
    };
    if signal.event == reference.event {
        format!("of {}", words::name(&signal.event))
    } else {
        format!(
            "of {} and {}",
            words::name(&signal.event),
            words::name(&reference.event)
        )
    }
}

fn question(sheet: &Sheet) -> Said {
    let Some((signal, reference)) = words::windows(&sheet.recipe.contrast) else {
        let [first, second] = kinds::sides(&sheet.recipe.contrast);
        let text = Line::new("What differs between ")
            .tone(first, Tone::Signal)
            .then(" (signal) and ")
            .tone(second, Tone::Reference)
            .then(" (reference)?");
        return (text, None);
    };
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
        .then(format!(
            " {}: too few for a held-out ratio or a p, so both are withheld. The maps are a first look; a ratio of the fit alone says nothing yet.",
            contrast(sheet)
        ));
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

/// The leading component in words.
fn lead(sheet: &Sheet) -> Option<(Line, &Component)> {
    let lead = judge::lead(sheet)?;
    Some((
        describe(sheet, "a component", lead.component),
        lead.component,
    ))
}

/// "a component peaking at **21 Hz**, largest at CP1,".
fn describe(sheet: &Sheet, what: &str, component: &Component) -> Line {
    let line = Line::new(what);
    let line = match component.peak_hz {
        Some(hz) => line.then(" peaking at ").strong(words::hertz(hz)).then(","),
        None => line,
    };
    line.then(format!(
        " largest at {}",
        words::place(sheet, &component.largest_at)
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

/// Says what leads, whatever its p, as long as it keeps to its side of 1; the doubt falls back to `missing`.
fn finding(sheet: &Sheet, missing: Option<&str>) -> Said {
    let measure = sheet.recipe.measure;
    let shown: Vec<(Lead, f64)> = judge::firsts(sheet)
        .into_iter()
        .filter_map(|lead| held_out(lead.component, measure).map(|ratio| (lead, ratio)))
        .filter(|(lead, ratio)| {
            if missing.is_some() {
                lead.on_its_side(*ratio)
            } else {
                judge::passes(lead.component)
            }
        })
        .collect();
    let mut text = opening(sheet).then(", ");
    if shown.is_empty() {
        return nothing_leads(sheet, text, missing);
    }
    for (at, (lead, ratio)) in shown.iter().enumerate() {
        let what = if at == 0 {
            describe(sheet, "a component", lead.component)
        } else {
            second(sheet, lead.component)
        };
        let (verb, tone) = match (lead.stronger, *ratio < 1.0) {
            (true, _) => (" has ", Tone::Signal),
            (false, true) => (" falls to ", Tone::Reference),
            (false, false) => (" reaches ", Tone::Reference),
        };
        text = text
            .then(if at == 0 { "" } else { "; " })
            .join(what)
            .then(verb)
            .tone(words::times(*ratio), tone);
        if at == 0 {
            text = text.then(format!(" its reference variance {}", by_measure(measure)));
        }
    }
    let components: Vec<&Component> = shown.iter().map(|(lead, _)| lead.component).collect();
    (text.then("."), Some(doubt(sheet, &components, missing)))
}

/// Held-out ratios that all lie on the other side of 1 are no finding, whatever p will be.
fn nothing_leads(sheet: &Sheet, start: Line, missing: Option<&str>) -> Said {
    let Some((lead, ratio)) = judge::lead(sheet)
        .and_then(|lead| held_out(lead.component, sheet.recipe.measure).map(|ratio| (lead, ratio)))
    else {
        return question(sheet);
    };
    let end = if lead.stronger { "stronger" } else { "weaker" };
    let text = start
        .then(format!(
            "nothing stands out so far: what was fitted as {end} has "
        ))
        .strong(words::times(ratio))
        .then(format!(
            " its reference variance on windows it never saw, {}.",
            by_measure(sheet.recipe.measure)
        ));
    let but = match missing {
        Some(reason) => format!("{reason}, and that is no proof of sameness."),
        None => "that is no proof of sameness.".into(),
    };
    (text, Some(Line::new(but)))
}

/// "one at **10.5 Hz**, largest at Oz,".
fn second(sheet: &Sheet, component: &Component) -> Line {
    let line = match component.peak_hz {
        Some(hz) => Line::new("one at ").strong(words::hertz(hz)).then(","),
        None => Line::new("another,"),
    };
    line.then(format!(
        " largest at {},",
        words::place(sheet, &component.largest_at)
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
    let ends = match (missing, p_values(shown)) {
        (Some(reason), _) => format!("; {reason}"),
        (None, Some(p)) => format!("; {p}"),
        (None, None) => String::new(),
    };
    let lengths = judge::lengths(sheet);
    if measure == Measure::Total {
        return match lengths {
            Some(lengths) => Line::new(format!("{lengths}{ends}.")),
            None => total_doubt(sheet, shown, &ends),
        };
    }
    let intervals: Vec<String> = shown
        .iter()
        .filter_map(|c| c.typical.interval.map(words::interval))
        .collect();
    let reach = shown.iter().any(|c| judge::reaches_one(c));
    if let Some(lengths) = lengths.filter(|_| !reach) {
        let long = format!(
            "{lengths}; 95{}% {} {}, {}{ends}.",
            words::NB,
            words::one(intervals.len(), "interval", "intervals"),
            words::list(&intervals),
            judge::repetitions(sheet)
        );
        let fits = !intervals.is_empty() && long.split_whitespace().count() <= 40;
        return Line::new(if fits {
            long
        } else {
            format!("{lengths}{ends}.")
        });
    }
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

/// A total ratio has no interval over trials; what is known of its spread is its range over the folds.
fn total_doubt(sheet: &Sheet, shown: &[&Component], ends: &str) -> Line {
    let ranges: Vec<[f64; 2]> = shown
        .iter()
        .filter_map(|c| {
            let folds = || c.total.folds.iter().copied().filter(|r| r.is_finite());
            Some([
                folds().min_by(f64::total_cmp)?,
                folds().max_by(f64::total_cmp)?,
            ])
        })
        .collect();
    if ranges.is_empty() {
        return Line::new(format!(
            "this is one recording with {}{ends}.",
            judge::repetitions(sheet)
        ));
    }
    let reach = ranges.iter().any(|[low, high]| *low <= 1.0 && *high >= 1.0);
    let said: Vec<String> = ranges.into_iter().map(words::interval).collect();
    Line::new(format!(
        "over the {} folds the held-out total {} {}{}, from {} of one recording{ends}.",
        sheet.recipe.evidence.folds,
        words::one(said.len(), "ratio ranges over", "ratios range over"),
        words::list(&said),
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
    if judge::firsts(sheet)
        .iter()
        .any(|lead| judge::passes(lead.component))
    {
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
            .join(describe(sheet, "a component", component))
            .then(" passes (p = ")
            .strong(component.p.map_or(String::new(), words::p_value))
            .then("), though it does not lead its end.");
        return (text, Some(no_proof(sheet)));
    }
    if let Some((fitted, held)) =
        judge::lead(sheet).and_then(|lead| judge::overfitted(lead.component, sheet.recipe.measure))
    {
        let text = opening(sheet)
            .then(", nothing differs that new windows show (fitted ")
            .strong(words::times(fitted))
            .then(", held-out ")
            .strong(words::times(held))
            .then(format!(
                "): the filters learnt these trials, not the difference. No component passes (smallest p = {smallest})."
            ));
        let but = Line::new(
            "with fewer dimensions or longer windows less can be learnt by heart; that nothing passed is no proof of sameness.",
        );
        return (text, Some(but));
    }
    let text = opening(sheet)
        .then(", nothing differs that ")
        .strong(judge::repetitions(sheet))
        .then(" could show: no component passes (smallest p = ")
        .strong(smallest)
        .then(").");
    (text, Some(no_proof(sheet)))
}

fn no_proof(sheet: &Sheet) -> Line {
    match judge::least_that_passes(sheet) {
        Some(ratio) => Line::new(format!(
            "that is no proof of sameness: with {}, a ratio {} about {} would not have passed.",
            judge::repetitions(sheet),
            if ratio < 1.0 { "above" } else { "under" },
            words::three(ratio)
        )),
        None => Line::new("that is no proof of sameness."),
    }
}
