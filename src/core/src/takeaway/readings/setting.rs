//! Readings of what was given and chosen: recording, channels, windows, compression.
use super::judge;
use super::{Line, Said, words};
use crate::recipe::{Contrast, Keep, KeepWord, Measure};
use crate::recording::Layout;
use crate::sheet::{ChannelCard, ChannelState, End, Sheet, SideCard, WindowsCard};
use crate::takeaway::kinds;

fn said(text: impl Into<String>) -> Option<Line> {
    Some(Line::new(text.into()))
}

pub(super) fn recording(sheet: &Sheet) -> Said {
    let card = &sheet.recording;
    let count = sheet.channels.len();
    let text = Line::default()
        .strong(match &sheet.movie {
            Some(movie) => format!("{} × {} pixels", movie.height, movie.width),
            None => format!("{} {}", words::grouped(count), words::carrier(sheet, count)),
        })
        .then(" at ")
        .strong(words::hertz(card.rate_hz))
        .then(" for ")
        .strong(words::duration(card.duration_s))
        .then(unit(sheet))
        .then(match card.stretches.len() {
            0 | 1 => ", without gaps".to_string(),
            n => format!(", in {n} stretches with gaps between them"),
        })
        .join(events(sheet))
        .then(".");
    (text, recording_doubt(sheet))
}

/// ", in µV" where all share one.
fn unit(sheet: &Sheet) -> String {
    let first = sheet.channels.first().map_or("", |c| c.unit.as_str());
    if first.is_empty() {
        String::new()
    } else if sheet.channels.iter().all(|c| c.unit == first) {
        format!(", in {}", words::plain(first, 8))
    } else {
        ", in several units".into()
    }
}

fn events(sheet: &Sheet) -> Line {
    let mut events: Vec<(&String, &usize)> = sheet.recording.events.iter().collect();
    events.sort_by(|a, b| b.1.cmp(a.1).then(a.0.cmp(b.0)));
    let mut line = Line::default();
    for (at, (label, count)) in events.iter().take(2).enumerate() {
        line = line.then(match (at, events.len()) {
            (0, _) => "; ",
            (_, 2) => " and ",
            _ => ", ",
        });
        line = if at == 0 {
            line.strong(words::grouped(**count))
        } else {
            line.then(words::grouped(**count))
        };
        line = line.then(format!(" {}", words::name(label)));
    }
    match events.len() {
        0 => line.then("; no events"),
        1 | 2 => line,
        n => line.then(format!(
            " and {} more {} of events",
            words::count(n - 2),
            words::one(n - 2, "kind", "kinds")
        )),
    }
}

fn recording_doubt(sheet: &Sheet) -> Option<Line> {
    let card = &sheet.recording;
    if let Some(warning) = card.warnings.first() {
        let sentence = lower(&words::plain(warning, 220));
        let end = if sentence.ends_with(['.', '…']) {
            ""
        } else {
            "."
        };
        return said(format!("{sentence}{end}"));
    }
    if card.events.is_empty() {
        return said(
            "it marks no events: a rhythm, slow changes or marked spans can be asked about, and a table of events would add windows.",
        );
    }
    if let Some(first) = card.others.first() {
        let count = card.others.len();
        let names: Vec<String> = card.others.iter().map(|o| words::name(&o.name)).collect();
        return said(format!(
            "{} {} listed and not analysed: {} ({}).",
            words::count(count),
            words::one(count, "channel is", "channels are"),
            some(&names),
            words::plain(&first.reason, 100)
        ));
    }
    let mut sizes = card.envelope.clone();
    sizes.retain(|s| s.is_finite());
    sizes.sort_by(f64::total_cmp);
    let median = sizes.get(sizes.len() / 2).copied().unwrap_or(0.0);
    let (at, peak) = card
        .envelope
        .iter()
        .enumerate()
        .max_by(|a, b| a.1.total_cmp(b.1))?;
    if median > 0.0 && peak / median >= 2.0 {
        let time = (at as f64 + 0.5) / card.envelope.len() as f64 * card.duration_s;
        return said(format!(
            "near {} it grows to {} its usual size: look there for {}.",
            words::clock(time),
            words::times(peak / median),
            match &card.layout {
                Layout::Head => "a blink, a movement or a loose contact",
                Layout::Frames { .. } => "a flicker of the lamp, a movement or a change of focus",
                _ => "a movement, a loose contact or a discharge",
            }
        ));
    }
    said(match &card.layout {
        Layout::Head => {
            "what is largest in it need not be what differs: blinks, muscle and mains are often the largest."
        }
        Layout::Frames { .. } => {
            "what is largest in it need not be what differs: bleaching, flicker and motion are often the largest."
        }
        _ => {
            "what is largest in it need not be what differs: movement, mains and one loud contact are often the largest."
        }
    })
}

/// A sentence to go on after "But": its first letter small, unless a name or a unit begins it.
fn lower(sentence: &str) -> String {
    let first = sentence.split_whitespace().next().unwrap_or("");
    let common = [
        "The", "A", "An", "Some", "One", "No", "It", "There", "This", "Its", "All",
    ];
    if common.contains(&first) {
        let mut letters = sentence.chars();
        letters
            .next()
            .map_or_else(String::new, |c| c.to_lowercase().chain(letters).collect())
    } else {
        sentence.into()
    }
}

fn named<'a>(cards: impl Iterator<Item = &'a ChannelCard>) -> Vec<String> {
    cards.map(|c| words::name(&c.name)).collect()
}

/// Up to four names and how many more.
fn some(names: &[String]) -> String {
    match names.len() {
        0..=4 => words::list(names),
        n => format!("{} and {} more", names[..4].join(", "), n - 4),
    }
}

pub(super) fn channels(sheet: &Sheet) -> Option<Said> {
    if sheet.channels.is_empty() {
        return None;
    }
    let all = sheet.channels.len();
    let out = named(
        sheet
            .channels
            .iter()
            .filter(|c| c.state == ChannelState::LeftOut),
    );
    let unusable = sheet
        .channels
        .iter()
        .filter(|c| matches!(c.state, ChannelState::Unusable(_)))
        .count();
    let replaced = named(
        sheet
            .channels
            .iter()
            .filter(|c| c.state == ChannelState::Interpolated),
    );
    let mut used = all - out.len() - unusable;
    // A movie's pixels outside the mask are no channels at all.
    let all = match &sheet.movie {
        Some(movie) => {
            let pixels = movie.rows as usize * movie.columns as usize;
            used = used.min(pixels);
            pixels
        }
        None => all,
    };
    let mut text = Line::default()
        .strong(if used == all {
            format!("All {}", words::grouped(all))
        } else {
            format!("{} of {}", words::grouped(used), words::grouped(all))
        })
        .then(format!(" {}", words::carrier(sheet, all)))
        .then(binned(sheet))
        .then(" are used");
    if !out.is_empty() {
        text = text.then(format!("; left out: {}", some(&out)));
    }
    if !replaced.is_empty() {
        text = text.then(format!("; from their neighbours: {}", some(&replaced)));
    }
    let others: Vec<String> = (sheet.recording.others.iter())
        .map(|o| words::name(&o.name))
        .collect();
    if !others.is_empty() {
        text = text.then(format!("; not analysed: {}", some(&others)));
    }
    text = text.then(".").join(spread(sheet)).join(mains(sheet));
    Some((text, channels_doubt(sheet)))
}

/// " of 2 × 2 pixels".
fn binned(sheet: &Sheet) -> String {
    let side = sheet.movie.as_ref().map_or(1, words::side);
    match side {
        1 => String::new(),
        side => format!(" of {side} × {side} pixels"),
    }
}

/// The channel that varies most, where it stands out.
fn spread(sheet: &Sheet) -> Line {
    let mut sizes: Vec<f64> = sheet
        .channels
        .iter()
        .filter_map(|c| c.sd)
        .filter(|s| s.is_finite())
        .collect();
    sizes.sort_by(f64::total_cmp);
    let median = sizes.get(sizes.len() / 2).copied().unwrap_or(0.0);
    let widest = sheet
        .channels
        .iter()
        .filter_map(|c| c.sd.map(|s| (c, s)))
        .max_by(|a, b| a.1.total_cmp(&b.1));
    match widest {
        Some((channel, sd)) if median > 0.0 && sd / median >= 2.0 => Line::new(" ")
            .then(words::capital(&words::place(sheet, &channel.name)))
            .then(" varies most, ")
            .strong(words::times(sd / median))
            .then(" the median spread."),
        _ => Line::default(),
    }
}

/// Mains, where it stands out of its neighbours by 6 dB.
fn mains(sheet: &Sheet) -> Line {
    let worst = sheet
        .channels
        .iter()
        .filter_map(|c| c.mains_db.zip(c.mains_hz).map(|m| (c, m)))
        .max_by(|a, b| a.1.0.total_cmp(&b.1.0));
    match worst {
        Some((channel, (db, hz))) if db >= 6.0 => Line::new(format!(
            " Mains at {} is strongest in {}, ",
            words::hertz(hz),
            words::place(sheet, &channel.name)
        ))
        .strong(format!("{}{}dB", words::fixed(db, 0), words::NB))
        .then(" above its surroundings."),
        _ => Line::default(),
    }
}

/// "F8 is the same as F4", "T7 is left out (constant)".
fn doubt_of(sheet: &Sheet, channel: &ChannelCard) -> Option<String> {
    let name = words::place(sheet, &channel.name);
    match &channel.state {
        ChannelState::Unusable(why) => {
            Some(format!("{name} is left out ({})", words::plain(why, 60)))
        }
        ChannelState::NeedsALook(why) if why.starts_with("the same as ") => {
            Some(format!("{name} is {}", words::plain(why, 60)))
        }
        ChannelState::NeedsALook(why) => {
            Some(format!("{name} needs a look ({})", words::plain(why, 60)))
        }
        _ => None,
    }
}

fn channels_doubt(sheet: &Sheet) -> Option<Line> {
    let doubts: Vec<String> = (sheet.channels.iter())
        .filter_map(|channel| doubt_of(sheet, channel))
        .collect();
    if !doubts.is_empty() {
        return said(format!("{}.", some(&doubts)));
    }
    let strong_mains = sheet
        .channels
        .iter()
        .filter(|c| c.state == ChannelState::Used && c.mains_db.is_some_and(|db| db >= 10.0))
        .max_by(|a, b| {
            a.mains_db
                .unwrap_or(0.0)
                .total_cmp(&b.mains_db.unwrap_or(0.0))
        });
    if let Some((channel, hz)) = strong_mains.and_then(|c| c.mains_hz.map(|hz| (c, hz))) {
        let filter = &sheet.recipe.filter;
        let stopped = filter.notch_hz.iter().any(|n| (n - hz).abs() <= 1.0)
            || filter.low_pass_hz.is_some_and(|low| low < hz);
        return said(if stopped {
            format!(
                "{} stays in although its mains is strong: a poor contact also spoils its neighbours once a common reference is formed.",
                words::place(sheet, &channel.name)
            )
        } else {
            format!(
                "no filter stops {}, and {} carries much of it: a notch there, or a low-pass below it, would.",
                words::hertz(hz),
                words::place(sheet, &channel.name)
            )
        });
    }
    if let Some(movie) = &sheet.movie {
        return said(if sheet.recipe.movie.dff.is_some() {
            "a running baseline also follows slow changes: what lasts as long as its window is divided away."
        } else if words::side(movie) > 1 {
            "a bin is the mean of its pixels: what is smaller than a bin is diluted."
        } else {
            "light scatters into neighbouring pixels, so a pattern looks smoother than what made it."
        });
    }
    let placed = sheet
        .channels
        .iter()
        .filter(|c| c.position.is_some())
        .count();
    if placed < sheet.channels.len() {
        return said(format!(
            "{} of {} channels {} no known place, so maps leave {} out.",
            sheet.channels.len() - placed,
            sheet.channels.len(),
            words::one(sheet.channels.len() - placed, "has", "have"),
            words::one(sheet.channels.len() - placed, "it", "them")
        ));
    }
    let told =
        sheet.recording.about.positions.is_some() || sheet.recipe.channels.positions.is_some();
    said(match (&sheet.recording.layout, told) {
        (Layout::Head, false) => {
            "places come from the channels' names, not from this head; maps are a guide to the eye."
        }
        (Layout::Head, true) => {
            "between the electrodes a map is interpolated: a guide to the eye, not a measurement."
        }
        (Layout::Line, _) => {
            "the contacts' spacing is as it was told; what lies beside the shaft is not seen."
        }
        _ => "the contacts' places are as they were told; between them nothing was measured.",
    })
}

/// Reasons for dropped windows, as the cards name them, in words.
fn dropped(side: &SideCard, beyond: bool) -> Vec<String> {
    side.dropped
        .iter()
        .filter(|(_, n)| **n > 0)
        .map(|(reason, n)| {
            let verb = match reason.as_str() {
                "outside" => outside(*n, beyond).to_string(),
                "gap" => words::one(*n, "crosses a gap", "cross a gap").to_string(),
                "partner" => words::one(*n, "lost its partner", "lost their partner").to_string(),
                "marked" => words::one(
                    *n,
                    "touches a span marked not to be used",
                    "touch a span marked not to be used",
                )
                .to_string(),
                "amplitude" => words::one(*n, "is too large", "are too large").to_string(),
                "step" => {
                    words::one(*n, "holds too large a step", "hold too large a step").to_string()
                }
                "flat-window" => {
                    words::one(*n, "has too flat a channel", "have too flat a channel").to_string()
                }
                "covariance" => words::one(
                    *n,
                    "has an outlying covariance",
                    "have an outlying covariance",
                )
                .to_string(),
                other => format!(
                    "{} out as {}",
                    words::one(*n, "is", "are"),
                    words::plain(other, 40)
                ),
            };
            format!("{} {verb}", words::count(*n))
        })
        .collect()
}

pub(super) fn windows(sheet: &Sheet) -> Option<Said> {
    let card = sheet.windows.as_ref()?;
    let Some((signal, reference)) = words::windows(&sheet.recipe.contrast) else {
        let text = pieces(sheet, card);
        return Some((text.join(rises(sheet)), windows_doubt(sheet)));
    };
    let text = if card.paired {
        let asked = card.trials.len().max(card.signal.used);
        let line = Line::default()
            .strong(format!("{} of {asked}", card.signal.used))
            .then(format!(
                " {} events give a pair of windows",
                words::name(&signal.event)
            ));
        if card.signal.samples == card.reference.samples {
            line.then(" of ")
                .strong(words::seconds(card.signal.seconds))
                .then(".")
        } else {
            line.then(", ")
                .strong(words::seconds(card.signal.seconds))
                .then(" of signal and ")
                .strong(words::seconds(card.reference.seconds))
                .then(" of reference.")
        }
    } else {
        Line::default()
            .strong(card.signal.used.to_string())
            .then(format!(
                " signal windows at {} of ",
                words::name(&signal.event)
            ))
            .strong(words::seconds(card.signal.seconds))
            .then(" stand against ")
            .strong(card.reference.used.to_string())
            .then(format!(
                " reference windows at {} of ",
                words::name(&reference.event)
            ))
            .strong(words::seconds(card.reference.seconds))
            .then(".")
    };
    Some((text.join(rises(sheet)), windows_doubt(sheet)))
}

/// "**118** pieces of the 3 marked spans stand against **86** of the rest, **1.00 s** each."
fn pieces(sheet: &Sheet, card: &WindowsCard) -> Line {
    let [first, second] = kinds::sides(&sheet.recipe.contrast);
    let length = words::seconds(card.signal.seconds);
    let (used, others) = (
        words::grouped(card.signal.used),
        words::grouped(card.reference.used),
    );
    match &sheet.recipe.contrast {
        Contrast::Spans { .. } => Line::default()
            .strong(used)
            .then(format!(" pieces of {first} stand against "))
            .strong(others)
            .then(format!(" of {second}, "))
            .strong(length)
            .then(" each."),
        Contrast::Repeatable(_) => Line::default()
            .strong(used)
            .then(" trials of ")
            .strong(length)
            .then(": their average stands against the single trials."),
        _ => Line::new("In each of ")
            .strong(used)
            .then(" segments of ")
            .strong(length)
            .then(format!(", {first} stands against {second}.")),
    }
}

/// " Component 1, held-out, rises in **37 of 40** trials." on held-out scores.
fn rises(sheet: &Sheet) -> Line {
    let Some(lead) = judge::lead(sheet).filter(|l| !l.component.trials.is_empty()) else {
        return Line::default();
    };
    let trials = &lead.component.trials;
    let way = if lead.stronger { 1.0 } else { -1.0 };
    let with = trials.iter().filter(|t| way * t.log_ratio > 0.0).count();
    let verb = if lead.stronger { "rises" } else { "falls" };
    Line::new(format!(
        " {}, held-out, {verb} in ",
        words::capital(lead.name())
    ))
    .strong(format!("{with} of {}", trials.len()))
    .then(match sheet.recipe.contrast {
        Contrast::Band { .. } | Contrast::Slow { .. } => " segments.",
        Contrast::Spans { .. } => " pieces.",
        _ => " trials.",
    })
}

/// What became of the windows that are not used.
fn lost(sheet: &Sheet, card: &WindowsCard) -> Option<String> {
    let beyond = beyond_the_end(sheet, card);
    let total = |side: &SideCard| side.dropped.values().sum::<usize>();
    let partners = |side: &SideCard| {
        (side.dropped.iter()).all(|(why, n)| *n == 0 || why == "outside" || why == "partner")
    };
    let n = total(&card.signal);
    let alike = n == total(&card.reference) && partners(&card.signal) && partners(&card.reference);
    if beyond && alike && card.signal.dropped != card.reference.dropped {
        return Some(format!(
            "{n} {} a side {}, or {} partner does",
            words::one(n, "window", "windows"),
            outside(n, true),
            words::one(n, "its", "their")
        ));
    }
    let (left, right) = (
        dropped(&card.signal, beyond),
        dropped(&card.reference, beyond),
    );
    match (left.is_empty(), right.is_empty()) {
        (true, true) => None,
        (false, true) => Some(format!("of the signal windows {}", words::list(&left))),
        (true, false) => Some(format!("of the reference windows {}", words::list(&right))),
        (false, false) if card.signal.dropped == card.reference.dropped => {
            let mut sides = card.signal.dropped.iter().filter(|(_, n)| **n > 0);
            match (sides.next(), sides.next()) {
                (Some((reason, n)), None) if reason == "outside" => Some(format!(
                    "{n} {} a side {}",
                    words::one(*n, "window", "windows"),
                    outside(*n, beyond)
                )),
                _ => Some(format!(
                    "of the windows on either side {}",
                    words::list(&left)
                )),
            }
        }
        (false, false) => Some(format!(
            "of the signal windows {}; of the reference windows {}",
            words::list(&left),
            words::list(&right)
        )),
    }
}

/// Whether every window that leaves the recording does so at its end, as in one whose whole part before a damage was opened.
fn beyond_the_end(sheet: &Sheet, card: &WindowsCard) -> bool {
    let mut outside = (card.trials.iter())
        .filter(|t| t.dropped.as_deref() == Some("outside"))
        .peekable();
    let half = sheet.recording.duration_s / 2.0;
    outside.peek().is_some() && outside.all(|t| t.onset_s > half)
}

fn outside(n: usize, beyond: bool) -> &'static str {
    if beyond {
        words::one(n, "lies beyond the end", "lie beyond the end")
    } else {
        words::one(n, "leaves the recording", "leave the recording")
    }
}

fn windows_doubt(sheet: &Sheet) -> Option<Line> {
    let card = sheet.windows.as_ref()?;
    if sheet.repetitions() < judge::LEAST {
        return said(format!(
            "{} are too few for a held-out ratio or a p; at least {} are needed.",
            judge::repetitions(sheet),
            words::count(judge::LEAST)
        ));
    }
    let lost = lost(sheet, card);
    match (judge::lengths(sheet), lost) {
        (Some(lengths), Some(lost)) => {
            let both = format!("{lengths}; {lost}.");
            let fits = both.split_whitespace().count() <= 40;
            return said(if fits { both } else { format!("{lengths}.") });
        }
        (Some(one), None) | (None, Some(one)) => return said(format!("{one}.")),
        (None, None) => {}
    }
    let shortest = card.signal.seconds.min(card.reference.seconds);
    said(format!(
        "in {} rhythms closer together than {}{}Hz run into one another.",
        words::seconds(shortest),
        words::trimmed(1.0 / shortest, 2),
        words::NB
    ))
}

pub(super) fn compression(sheet: &Sheet) -> Option<Said> {
    let card = sheet.compression.as_ref()?;
    let text = Line::default()
        .strong(card.kept.to_string())
        .then(format!(" of {} dimensions hold ", card.rank))
        .strong(words::percent(card.share))
        .then(" of the variance")
        .join(curve(sheet))
        .join(above_noise(sheet));
    Some((text, compression_doubt(sheet)))
}

/// " Rules blind to the labels count 8 to 12 above noise." where they are worked out.
fn above_noise(sheet: &Sheet) -> Line {
    let Some(card) = &sheet.compression else {
        return Line::default();
    };
    let found: Vec<usize> = ["parallel_analysis", "noise_edge", "hard_threshold"]
        .iter()
        .filter_map(|rule| card.guides.get(*rule).copied())
        .collect();
    let (Some(low), Some(high)) = (found.iter().min(), found.iter().max()) else {
        return Line::default();
    };
    let range = if low == high {
        low.to_string()
    } else {
        format!("{low} to {high}")
    };
    let choose = if card.kept >= *low {
        ""
    } else {
        "; keep as many"
    };
    Line::new(format!(" Noise rules count {range}{choose}."))
}

/// Where the held-out ratio stands at C, and where it is highest; ends the sentence.
fn curve(sheet: &Sheet) -> Line {
    let Some(card) = &sheet.compression else {
        return Line::new(".");
    };
    let Some((curve, here)) = sheet.curve.as_ref().and_then(|c| {
        let at = c.keep.iter().position(|k| *k == card.kept)?;
        Some((c, c.held_out.get(at).copied()?))
    }) else {
        return Line::new(".");
    };
    let stronger = sheet.leading == End::Stronger;
    let way = if stronger { 1.0 } else { -1.0 };
    let (of_which, most) = if stronger {
        ("the held-out ratio", "highest")
    } else {
        ("weaker component 1's held-out ratio", "lowest")
    };
    let best = curve
        .keep
        .iter()
        .zip(&curve.held_out)
        .filter(|(_, r)| r.is_finite())
        .max_by(|a, b| (way * a.1).total_cmp(&(way * b.1)));
    match best {
        Some((keep, _)) if *keep == card.kept => {
            Line::new(format!(", and {of_which} is {most} there: "))
                .strong(words::factor(here))
                .then(".")
                .join(plateau(sheet))
        }
        Some((keep, ratio)) => Line::new(format!(", and {of_which} there is "))
            .strong(words::factor(here))
            .then(format!(
                "; it is {most} at {keep}, {}.",
                words::factor(*ratio)
            ))
            .join(plateau(sheet)),
        None => Line::new("."),
    }
}

fn plateau(sheet: &Sheet) -> Line {
    match (
        sheet.compression.as_ref(),
        sheet
            .compression
            .as_ref()
            .and_then(|c| c.guides.get("one_standard_error")),
    ) {
        (Some(card), Some(from)) if *from < card.kept => Line::new(format!(
            " From {from} up it changes by less than one standard error."
        )),
        _ => Line::default(),
    }
}

fn compression_doubt(sheet: &Sheet) -> Option<Line> {
    let card = sheet.compression.as_ref()?;
    let prepared = sheet.preparation.as_ref().map_or(0, |p| p.channels.len());
    if card.rank < prepared && sheet.curve.is_none() {
        return said(format!(
            "the rank is {} for {} {}: {}.",
            card.rank,
            words::grouped(prepared),
            words::carrier(sheet, prepared),
            match &card.basis {
                Some(_) => "so many are first put into a basis of fewer dimensions",
                None =>
                    "a common reference, an interpolated or a repeated channel takes a dimension away",
            }
        ));
    }
    let best = sheet.recipe.keep == Keep::Word(KeepWord::Best);
    if sheet.curve.is_some() {
        return said(if best {
            "C was chosen by held-out ratio; every permutation chooses it again, so p pays for that choice and this curve's peak does not."
        } else {
            "this curve was drawn on the same trials, so a C read off its peak flatters a little; a C fixed beforehand does not."
        });
    }
    said(match sheet.recipe.measure {
        Measure::Typical => {
            "a small share of variance can hold what differs: leave room above the knee of the curve."
        }
        Measure::Total => {
            "the total measure pays for every dimension kept: few windows want a small C."
        }
    })
}
