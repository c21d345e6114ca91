//! Which samples belong to which side.
//!
//! # Time
//! An event window is [onset+from, onset+to): its first sample is round((onset+from)·f) on the file's clock and it holds
//! round((to−from)·f) samples, halves away from zero. It is dropped, with its reason counted, where it leaves the recording
//! (`outside`), crosses a gap (`gap`), touches a span that is not to be used (`marked`) or the share that is locked away (`locked`),
//! or, in a paired contrast, where its partner is dropped (`partner`). A window that lasts until another event is dropped where
//! none follows before the next of its own kind (`unanswered`) or where it comes too soon (`short`); one of too many where counts
//! are made equal is `drawn out`.
//!
//! # Pieces
//! Spans, and the whole recording for contrasts without windows, are cut into pieces of one length ([`super::pieces`]), so that a
//! typical piece can be spoken of.
use super::pieces::{Runs, both, cut, labelled, merged, runs, without};
use crate::error::{Kind, Problem, Result};
use crate::recipe::{Contrast, EventWindow, HoldBack, Recipe, Spans, Within};
use crate::recording::{Event, Stretch};
use crate::sheet::{SideCard, Trial, WindowsCard};
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};
use std::collections::BTreeMap;

/// Fewest samples a window may have: a variance needs several.
const LEAST_SAMPLES: usize = 3;
/// Stream of the draw that makes counts equal.
const STREAM_EQUAL: u64 = 3;

/// One used window.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Window {
    /// First sample, as an index into the prepared samples.
    pub first: usize,
    /// Samples.
    pub count: usize,
    /// Signal (or reference).
    pub signal: bool,
    /// Index of its pair, or of itself among its side's windows when unpaired.
    pub trial: usize,
    /// Onset of its event, or its own start.
    pub onset_s: f64,
}

/// What is exchanged under the null hypothesis of a contrast.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Exchange {
    /// The two sides of a pair.
    Swap,
    /// The labels of all windows.
    Shuffle,
    /// The labels of pieces in a row, all together along the row.
    Shift,
    /// The sign of a trial.
    Flip,
    /// The two sides of a segment, once they are brought to one level over all directions.
    Level,
}

impl Exchange {
    /// Whether both sides read the prepared samples as they are, each in windows of its own.
    pub fn labels_alone(self) -> bool {
        matches!(self, Exchange::Swap | Exchange::Shuffle | Exchange::Shift)
    }
}

/// The windows of a contrast.
#[derive(Debug, Clone)]
pub struct Selection {
    /// Both sides tied to the same event, or to the same segment.
    pub paired: bool,
    /// What the null hypothesis exchanges.
    pub exchange: Exchange,
    /// Used windows; paired: signal then reference of trial 0, of trial 1 …; unpaired: in order of time.
    pub windows: Vec<Window>,
    /// For the sheet.
    pub card: WindowsCard,
    /// Warnings, each a sentence.
    pub warnings: Vec<String>,
}

/// Where windows may lie.
#[derive(Debug, Clone)]
struct Room<'a> {
    stretches: &'a [Stretch],
    rate_hz: f64,
    /// Not to be used.
    marked: Runs,
    /// Locked away.
    locked: Runs,
}

/// Where a stretch of time lies in the samples.
enum Placed {
    At(usize),
    Dropped(&'static str),
}

fn clock(stretch: &Stretch, rate_hz: f64) -> i64 {
    (stretch.onset_s * rate_hz).round() as i64
}

impl<'a> Room<'a> {
    fn new(recipe: &Recipe, stretches: &'a [Stretch], rate_hz: f64) -> Self {
        Room {
            stretches,
            rate_hz,
            marked: runs(&recipe.not_used, rate_hz),
            locked: locked(recipe.hold_back, stretches, rate_hz),
        }
    }

    /// All runs that windows may lie in.
    fn open(&self) -> Runs {
        let all = merged(
            self.stretches
                .iter()
                .map(|s| {
                    let start = clock(s, self.rate_hz);
                    [start, start + s.count as i64]
                })
                .collect(),
        );
        without(&without(&all, &self.marked), &self.locked)
    }

    fn place(&self, from_s: f64, count: usize) -> Placed {
        let first = (from_s * self.rate_hz).round();
        if first.abs() > 1e15 || count as u64 > 1 << 50 {
            return Placed::Dropped("outside");
        }
        let run = [first as i64, first as i64 + count as i64];
        let touches = |list: &Runs| !both(&[run], list).is_empty();
        let inside = self.stretches.iter().find_map(|s| {
            let start = clock(s, self.rate_hz);
            (run[0] >= start && run[1] <= start + s.count as i64)
                .then(|| s.first + (run[0] - start) as usize)
        });
        let whole = self.stretches.first().map(|s| clock(s, self.rate_hz)).zip(
            self.stretches
                .last()
                .map(|s| clock(s, self.rate_hz) + s.count as i64),
        );
        match (inside, whole) {
            (Some(_), _) if touches(&self.locked) => Placed::Dropped("locked"),
            (Some(_), _) if touches(&self.marked) => Placed::Dropped("marked"),
            (Some(at), _) => Placed::At(at),
            (None, Some((start, stop))) if run[0] >= start && run[1] <= stop => {
                Placed::Dropped("gap")
            }
            _ => Placed::Dropped("outside"),
        }
    }
}

/// The share of the recording's duration that is locked away at its end, by its clock.
fn locked(hold: Option<HoldBack>, stretches: &[Stretch], rate_hz: f64) -> Runs {
    let (Some(hold), Some(first), Some(last)) = (hold, stretches.first(), stretches.last()) else {
        return Runs::new();
    };
    let (start, end) = (
        clock(first, rate_hz),
        clock(last, rate_hz) + last.count as i64,
    );
    let from = end - (hold.last * (end - start) as f64).round() as i64;
    vec![[from, end]]
}

/// Samples a window of this length holds.
pub fn sample_count(window: &EventWindow, rate_hz: f64) -> usize {
    ((window.to_s - window.from_s) * rate_hz).round().max(0.0) as usize
}

/// The sample nearest to a time, if the recording holds it.
pub fn sample_at(stretches: &[Stretch], rate_hz: f64, at_s: f64) -> Option<usize> {
    let room = Room {
        stretches,
        rate_hz,
        marked: Runs::new(),
        locked: Runs::new(),
    };
    match room.place(at_s, 1) {
        Placed::At(sample) => Some(sample),
        Placed::Dropped(_) => None,
    }
}

/// Events of exactly this label; where there are none, those that fit the pattern, in which `*` stands for any text.
pub fn named<'a>(label: &str, events: &'a [Event]) -> impl Iterator<Item = &'a Event> {
    let exact = events.iter().any(|e| e.label == label);
    let parts: Vec<String> = label.split('*').map(str::to_owned).collect();
    events.iter().filter(move |e| {
        if exact || parts.len() == 1 {
            e.label == parts.join("*")
        } else {
            fits(&e.label, &parts)
        }
    })
}

/// Whether a text is made of these parts in this order, with anything between them.
fn fits(text: &str, parts: &[String]) -> bool {
    let (Some(head), Some(tail)) = (parts.first(), parts.last()) else {
        return false;
    };
    let Some(mut rest) = text.strip_prefix(head.as_str()) else {
        return false;
    };
    for part in &parts[1..parts.len() - 1] {
        match rest.find(part.as_str()) {
            Some(at) => rest = &rest[at + part.len()..],
            None => return false,
        }
    }
    rest.ends_with(tail.as_str())
}

/// The events of a window, in order of time: those of its labels, less what it leaves out.
pub fn events_of<'a>(window: &EventWindow, events: &'a [Event]) -> Vec<&'a Event> {
    let mut all: Vec<&Event> = window.labels().flat_map(|l| named(l, events)).collect();
    all.sort_by(|a, b| a.onset_s.total_cmp(&b.onset_s));
    all.dedup_by(|a, b| std::ptr::eq(*a, *b));
    let count = all.len();
    let first = window.first.unwrap_or(count);
    let from = count - window.last.unwrap_or(count).min(count);
    all.into_iter()
        .enumerate()
        .filter(|(i, _)| *i < first && *i >= from && !window.leave_out.contains(&(i + 1)))
        .map(|(_, event)| event)
        .collect()
}

/// Refuses labels that the recording does not hold and windows without length.
pub fn check(contrast: &Contrast, events: &[Event], rate_hz: f64) -> Result<()> {
    let sides: &[&str] = match contrast {
        Contrast::Windows { .. } => &["signal windows", "reference windows"],
        _ => &["windows"],
    };
    for (side, window) in sides.iter().zip(contrast.around()) {
        for label in window.labels().chain(window.until.as_deref()) {
            if named(label, events).next().is_none() {
                return Err(unknown(label, events, side));
            }
        }
        let count = sample_count(window, rate_hz);
        if count < LEAST_SAMPLES && window.until.is_none() {
            return Err(Problem::new(
                Kind::Contrast,
                format!("the {side} are too short"),
                "make the windows longer: a variance needs several samples",
            )
            .at(format!("{side}, {} to {} s", window.from_s, window.to_s))
            .expected_found("at least 3 samples", format!("{count} at {rate_hz} Hz")));
        }
    }
    for (side, spans) in contrast.spans() {
        if let Spans::Label(label) = spans
            && !spans.is_rest()
            && labelled(label, events).is_empty()
        {
            return Err(match named(label, events).next() {
                None => unknown(label, events, side),
                Some(_) => Problem::new(
                    Kind::Contrast,
                    format!("the events \"{label}\" have no duration"),
                    "choose annotations that last, mark spans, or use windows around these events",
                )
                .at(format!("spans, {side}"))
                .expected_found("annotations with a duration above 0 s", "moments"),
            });
        }
    }
    check_band_at(contrast, rate_hz)?;
    check_pieces(contrast, rate_hz)
}

fn unknown(label: &str, events: &[Event], side: &str) -> Problem {
    let mut known: BTreeMap<&str, usize> = BTreeMap::new();
    events
        .iter()
        .for_each(|e| *known.entry(&e.label).or_default() += 1);
    let list: Vec<String> = known
        .iter()
        .take(12)
        .map(|(label, n)| format!("{label} ({n})"))
        .collect();
    let found = if list.is_empty() {
        "no events at all".to_owned()
    } else {
        list.join(", ")
    };
    Problem::new(
        Kind::Contrast,
        format!("the recording holds no event \"{label}\""),
        "choose one of the events that it holds, or add an events table",
    )
    .at(side.to_owned())
    .expected_found(format!("events labelled \"{label}\""), found)
}

/// Refuses a band that reaches half the sampling rate.
fn check_band_at(contrast: &Contrast, rate_hz: f64) -> Result<()> {
    let Contrast::Band {
        centre_hz,
        half_width_hz,
        reference,
        ..
    } = contrast
    else {
        return Ok(());
    };
    let reach = super::band::reach(*reference) * half_width_hz;
    if centre_hz + reach < rate_hz / 2.0 {
        return Ok(());
    }
    Err(Problem::new(
        Kind::Contrast,
        "the band, with what it is compared with, reaches beyond half the sampling rate",
        "lower the centre or narrow the band",
    )
    .at("contrast.centre_hz")
    .expected_found(
        format!("a centre below {:.2} Hz", rate_hz / 2.0 - reach),
        format!("{centre_hz} Hz"),
    ))
}

/// Length of the pieces in seconds: as the recipe says, or by the kind's rule.
pub fn piece_s(contrast: &Contrast) -> Option<f64> {
    match contrast {
        Contrast::Spans { piece_s, .. } => Some(piece_s.unwrap_or(1.0)),
        Contrast::Band {
            piece_s,
            half_width_hz,
            ..
        } => Some(piece_s.unwrap_or((8.0 / half_width_hz).clamp(1.0, 20.0))),
        Contrast::Slow { piece_s, lag_s, .. } => Some(piece_s.unwrap_or((10.0 * lag_s).max(1.0))),
        Contrast::Windows { .. } | Contrast::Repeatable(_) => None,
    }
}

/// Samples that a lag takes off each window, 0 for other kinds.
pub fn lag_samples(contrast: &Contrast, rate_hz: f64) -> usize {
    match contrast {
        Contrast::Slow { lag_s, .. } => (lag_s * rate_hz).round().max(1.0) as usize,
        _ => 0,
    }
}

fn check_pieces(contrast: &Contrast, rate_hz: f64) -> Result<()> {
    let Some(piece_s) = piece_s(contrast) else {
        return Ok(());
    };
    let lag = lag_samples(contrast, rate_hz);
    let length = match contrast.around().first() {
        Some(window) => sample_count(window, rate_hz),
        None => (piece_s * rate_hz).round() as usize,
    };
    if length >= lag + LEAST_SAMPLES {
        return Ok(());
    }
    Err(Problem::new(
        Kind::Contrast,
        "the pieces are too short",
        "make them longer, or the lag shorter: a variance needs several samples",
    )
    .at("contrast.piece_s")
    .expected_found(
        format!("at least {} samples", lag + LEAST_SAMPLES),
        format!("{length} at {rate_hz} Hz"),
    ))
}

/// Finds the windows of both sides. `events` in order of time.
pub fn select(
    recipe: &Recipe,
    events: &[Event],
    stretches: &[Stretch],
    rate_hz: f64,
) -> Result<Selection> {
    let contrast = &recipe.contrast;
    check(contrast, events, rate_hz)?;
    let room = Room::new(recipe, stretches, rate_hz);
    let selection = match contrast {
        Contrast::Windows { signal, reference } if signal.same_events(reference) => {
            let of = events_of(signal, events);
            paired([signal, reference], &of, events, &room, Exchange::Swap)
        }
        Contrast::Windows { signal, reference } => {
            unpaired(signal, reference, events, &room, recipe.evidence.seed)
        }
        Contrast::Repeatable(window) => {
            let of = events_of(window, events);
            paired([window, window], &of, events, &room, Exchange::Flip)
        }
        Contrast::Spans {
            signal, reference, ..
        } => spans(contrast, [signal, reference], events, &room)?,
        Contrast::Band { within, .. } | Contrast::Slow { within, .. } => match within {
            Some(Within::Window(window)) => {
                let of = events_of(window, events);
                paired([window, window], &of, events, &room, Exchange::Level)
            }
            Some(Within::Spans(list)) => {
                let inside = both(&span_runs(list, events, rate_hz), &room.open());
                segments(contrast, &inside, &room)
            }
            None => segments(contrast, &room.open(), &room),
        },
    };
    selection.enough()?;
    Ok(selection)
}

/// The windows of the share that is locked away, and of nothing else.
///
/// # Errors
/// As [`select`]; also where nothing is locked away.
pub fn locked_part(
    recipe: &Recipe,
    events: &[Event],
    stretches: &[Stretch],
    rate_hz: f64,
) -> Result<Selection> {
    let locked = locked(recipe.hold_back, stretches, rate_hz);
    let from_s = locked
        .first()
        .map_or(f64::INFINITY, |run| run[0] as f64 / rate_hz);
    let mut opened = recipe.clone();
    opened.hold_back = None;
    let start_s = stretches.first().map_or(0.0, |s| s.onset_s);
    opened
        .not_used
        .push([start_s.min(from_s) - 1.0, from_s.min(1e12)]);
    select(&opened, events, stretches, rate_hz)
}

fn span_runs(spans: &Spans, events: &[Event], rate_hz: f64) -> Runs {
    match spans {
        Spans::Times(times) => runs(times, rate_hz),
        Spans::Label(label) => runs(&labelled(label, events), rate_hz),
    }
}

fn side_card(count: usize, rate_hz: f64) -> SideCard {
    SideCard {
        used: 0,
        dropped: BTreeMap::new(),
        samples: count,
        seconds: count as f64 / rate_hz,
    }
}

fn drop_one(card: &mut SideCard, reason: &str) {
    *card.dropped.entry(reason.to_owned()).or_default() += 1;
}

/// Where the window of one event lies, and how many samples it holds.
fn window_at(
    window: &EventWindow,
    event: &Event,
    events: &[Event],
    room: &Room<'_>,
) -> (Placed, usize) {
    let from_s = event.onset_s + window.from_s;
    let Some(until) = &window.until else {
        let count = sample_count(window, room.rate_hz);
        return (room.place(from_s, count), count);
    };
    let after = |e: &&Event| e.onset_s > event.onset_s;
    let answer = named(until, events).find(after);
    let own = window
        .labels()
        .filter_map(|l| named(l, events).find(after))
        .map(|e| e.onset_s)
        .fold(f64::INFINITY, f64::min);
    let Some(answer) = answer.filter(|a| a.onset_s <= own) else {
        return (Placed::Dropped("unanswered"), 0);
    };
    let count = ((answer.onset_s + window.to_s - from_s) * room.rate_hz)
        .round()
        .max(0.0) as usize;
    if count < LEAST_SAMPLES {
        return (Placed::Dropped("short"), count);
    }
    (room.place(from_s, count), count)
}

/// The middle of the lengths that were used, for the cards.
fn middle(windows: &[Window], signal: bool, otherwise: usize) -> usize {
    let mut counts: Vec<usize> = windows
        .iter()
        .filter(|w| w.signal == signal)
        .map(|w| w.count)
        .collect();
    counts.sort_unstable();
    counts.get(counts.len() / 2).copied().unwrap_or(otherwise)
}

fn paired(
    sides: [&EventWindow; 2],
    of: &[&Event],
    events: &[Event],
    room: &Room<'_>,
    exchange: Exchange,
) -> Selection {
    let mut card = WindowsCard {
        paired: true,
        signal: side_card(0, room.rate_hz),
        reference: side_card(0, room.rate_hz),
        trials: Vec::new(),
    };
    let mut windows = Vec::new();
    for event in of {
        let [(s, ns), (r, nr)] = sides.map(|w| window_at(w, event, events, room));
        let mut dropped = None;
        match (s, r) {
            (Placed::At(s), Placed::At(r)) => {
                let window = |first, count, signal| Window {
                    first,
                    count,
                    signal,
                    trial: card.signal.used,
                    onset_s: event.onset_s,
                };
                windows.push(window(s, ns, true));
                windows.push(window(r, nr, false));
                card.signal.used += 1;
                card.reference.used += 1;
            }
            (s, r) => {
                let reason = |placed: &Placed| match placed {
                    Placed::At(_) => None,
                    Placed::Dropped(reason) => Some(*reason),
                };
                let (s, r) = (reason(&s), reason(&r));
                drop_one(&mut card.signal, s.unwrap_or("partner"));
                drop_one(&mut card.reference, r.unwrap_or("partner"));
                dropped = s.or(r).map(str::to_owned);
            }
        }
        card.trials.push(Trial {
            onset_s: event.onset_s,
            event: event.label.clone(),
            dropped,
        });
    }
    for (side, card, signal) in [
        (sides[0], &mut card.signal, true),
        (sides[1], &mut card.reference, false),
    ] {
        card.samples = middle(&windows, signal, sample_count(side, room.rate_hz));
        card.seconds = card.samples as f64 / room.rate_hz;
    }
    let warnings = if exchange == Exchange::Swap {
        overlap_warning(&windows)
    } else {
        Vec::new()
    };
    Selection {
        paired: true,
        exchange,
        windows,
        card,
        warnings,
    }
}

fn unpaired(
    signal: &EventWindow,
    reference: &EventWindow,
    events: &[Event],
    room: &Room<'_>,
    seed: u64,
) -> Selection {
    // Windows of both sides in order of time; at the same time signal comes first.
    let mut asked: Vec<(&Event, bool)> = events_of(signal, events)
        .into_iter()
        .map(|e| (e, true))
        .chain(events_of(reference, events).into_iter().map(|e| (e, false)))
        .collect();
    asked.sort_by(|a, b| a.0.onset_s.total_cmp(&b.0.onset_s).then(b.1.cmp(&a.1)));
    let mut placed: Vec<(Placed, usize)> = asked
        .iter()
        .map(|(event, is_signal)| {
            let window = if *is_signal { signal } else { reference };
            window_at(window, event, events, room)
        })
        .collect();
    make_equal([signal, reference], &asked, &mut placed, seed);
    let mut card = WindowsCard {
        paired: false,
        signal: side_card(0, room.rate_hz),
        reference: side_card(0, room.rate_hz),
        trials: Vec::new(),
    };
    let mut windows = Vec::new();
    for ((event, is_signal), (place, count)) in asked.iter().zip(placed) {
        let side = if *is_signal {
            &mut card.signal
        } else {
            &mut card.reference
        };
        let dropped = match place {
            Placed::At(first) => {
                windows.push(Window {
                    first,
                    count,
                    signal: *is_signal,
                    trial: side.used,
                    onset_s: event.onset_s,
                });
                side.used += 1;
                None
            }
            Placed::Dropped(reason) => {
                drop_one(side, reason);
                Some(reason.to_owned())
            }
        };
        card.trials.push(Trial {
            onset_s: event.onset_s,
            event: event.label.clone(),
            dropped,
        });
    }
    for (side, card, is_signal) in [
        (signal, &mut card.signal, true),
        (reference, &mut card.reference, false),
    ] {
        card.samples = middle(&windows, is_signal, sample_count(side, room.rate_hz));
        card.seconds = card.samples as f64 / room.rate_hz;
    }
    let warnings = overlap_warning(&windows);
    Selection {
        paired: false,
        exchange: Exchange::Shuffle,
        windows,
        card,
        warnings,
    }
}

/// Draws out windows of a side that asked to be no larger than the other (Fisher & Yates shuffle, seeded).
fn make_equal(
    sides: [&EventWindow; 2],
    asked: &[(&Event, bool)],
    placed: &mut [(Placed, usize)],
    seed: u64,
) {
    let members = |placed: &[(Placed, usize)], signal: bool| -> Vec<usize> {
        (0..placed.len())
            .filter(|k| asked[*k].1 == signal && matches!(placed[*k].0, Placed::At(_)))
            .collect()
    };
    for (window, signal) in [(sides[0], true), (sides[1], false)] {
        let mut own = members(placed, signal);
        let most = members(placed, !signal).len();
        if !window.equal || own.len() <= most {
            continue;
        }
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        rng.set_stream(STREAM_EQUAL);
        for a in (1..own.len()).rev() {
            let b = ((u128::from(rng.next_u64()) * (a as u128 + 1)) >> 64) as usize;
            own.swap(a, b);
        }
        for k in own.drain(most..) {
            placed[k].0 = Placed::Dropped("drawn out");
        }
    }
}

/// Pieces of signal and reference spans, in order of time.
fn spans(
    contrast: &Contrast,
    sides: [&Spans; 2],
    events: &[Event],
    room: &Room<'_>,
) -> Result<Selection> {
    let count = piece_samples(contrast, room.rate_hz);
    let signal = span_runs(sides[0], events, room.rate_hz);
    let open = room.open();
    let reference = if sides[1].is_rest() {
        without(&open, &signal)
    } else {
        span_runs(sides[1], events, room.rate_hz)
    };
    if let Some(shared) = both(&signal, &reference).first() {
        let at = shared.map(|s| s as f64 / room.rate_hz);
        return Err(Problem::new(
            Kind::Contrast,
            "signal and reference spans overlap",
            "end one where the other begins",
        )
        .at(format!("{:.2} to {:.2} s", at[0], at[1]))
        .expected_found("spans of different times", "the same samples on both sides"));
    }
    let mut card = WindowsCard {
        paired: false,
        signal: side_card(count, room.rate_hz),
        reference: side_card(count, room.rate_hz),
        trials: Vec::new(),
    };
    let pieces = |runs: &Runs| cut(&both(runs, &open), room.stretches, room.rate_hz, count);
    let mut all: Vec<(usize, f64, bool)> = pieces(&signal)
        .into_iter()
        .map(|(first, at)| (first, at, true))
        .chain(
            pieces(&reference)
                .into_iter()
                .map(|(first, at)| (first, at, false)),
        )
        .collect();
    all.sort_by_key(|p| p.0);
    let mut windows = Vec::with_capacity(all.len());
    for (first, onset_s, signal) in all {
        let side = if signal {
            &mut card.signal
        } else {
            &mut card.reference
        };
        windows.push(Window {
            first,
            count,
            signal,
            trial: side.used,
            onset_s,
        });
        side.used += 1;
    }
    let mut warnings = Vec::new();
    if sides[1].is_rest() && events.iter().any(|e| e.label == crate::recipe::REST) {
        warnings.push("The reference is everything that is not signal; the annotations labelled rest are not it: the pattern rest* reaches them.".to_owned());
    }
    let changes = windows
        .windows(2)
        .filter(|w| w[0].signal != w[1].signal)
        .count();
    if changes <= 2 {
        warnings.push("The sides lie in one stretch each: whatever drifts over the recording differs between them as well, and a shift of the labels cannot tell the two apart.".to_owned());
    }
    Ok(Selection {
        paired: false,
        exchange: Exchange::Shift,
        windows,
        card,
        warnings,
    })
}

fn piece_samples(contrast: &Contrast, rate_hz: f64) -> usize {
    (piece_s(contrast).unwrap_or(1.0) * rate_hz)
        .round()
        .max(1.0) as usize
}

/// Segments that both sides are measured in.
fn segments(contrast: &Contrast, inside: &Runs, room: &Room<'_>) -> Selection {
    let count = piece_samples(contrast, room.rate_hz);
    let mut card = WindowsCard {
        paired: true,
        signal: side_card(count, room.rate_hz),
        reference: side_card(count, room.rate_hz),
        trials: Vec::new(),
    };
    let mut windows = Vec::new();
    for (first, onset_s) in cut(inside, room.stretches, room.rate_hz, count) {
        for signal in [true, false] {
            windows.push(Window {
                first,
                count,
                signal,
                trial: card.signal.used,
                onset_s,
            });
        }
        card.signal.used += 1;
        card.reference.used += 1;
    }
    Selection {
        paired: true,
        exchange: Exchange::Level,
        windows,
        card,
        warnings: Vec::new(),
    }
}

/// Says how many windows share samples with one of the other side, and with one of their own.
fn overlap_warning(windows: &[Window]) -> Vec<String> {
    let mut spans: Vec<(usize, usize, usize)> = windows
        .iter()
        .map(|w| (w.first, w.first + w.count, usize::from(w.signal)))
        .collect();
    spans.sort_unstable();
    let (mut ends, mut across, mut within) = ([0usize; 2], 0usize, 0usize);
    for (first, end, side) in spans {
        across += usize::from(first < ends[1 - side]);
        within += usize::from(first < ends[side]);
        ends[side] = ends[side].max(end);
    }
    let times = |n: usize| {
        if n == 1 {
            "once".to_owned()
        } else {
            format!("{n} times")
        }
    };
    let mut warnings = Vec::new();
    if across > 0 {
        let times = times(across);
        warnings.push(format!("Signal and reference windows overlap {times}; samples that both sides share pull the ratio toward 1."));
    }
    if within > 0 {
        let times = times(within);
        warnings.push(format!("Windows of the same side overlap {times}: trials that share samples are not independent, so held-out ratios and p flatter."));
    }
    warnings
}

/// K contiguous folds of `count` trials: sizes differ by at most one, larger ones first. The fold of each trial.
pub fn contiguous_folds(count: usize, folds: usize) -> Vec<usize> {
    let k = folds.clamp(1, count.max(1));
    let (base, larger) = (count / k, count % k);
    (0..k)
        .flat_map(|f| std::iter::repeat_n(f, base + usize::from(f < larger)))
        .collect()
}

impl Selection {
    /// Refuses fewer than two windows a side.
    pub fn enough(&self) -> Result<()> {
        let least = self.card.signal.used.min(self.card.reference.used);
        if least < 2 {
            let reasons = |side: &SideCard| {
                let list: Vec<String> = side
                    .dropped
                    .iter()
                    .map(|(reason, n)| format!("{n} {reason}"))
                    .collect();
                if list.is_empty() {
                    "none dropped".to_owned()
                } else {
                    list.join(", ")
                }
            };
            return Err(Problem::new(
                Kind::Contrast,
                "too few windows are left",
                "choose another event, or windows that stay inside the recording",
            )
            .at(format!(
                "signal dropped: {}; reference dropped: {}",
                reasons(&self.card.signal),
                reasons(&self.card.reference)
            ))
            .expected_found(
                "at least 2 windows a side",
                format!(
                    "{} signal and {} reference",
                    self.card.signal.used, self.card.reference.used
                ),
            ));
        }
        Ok(())
    }

    /// Drops the flat windows and their partners, counted as `flat` and `partner`; gives which windows are kept.
    pub fn drop_flat(&mut self, flat: &[bool]) -> Vec<bool> {
        let why: Vec<Option<&'static str>> = flat.iter().map(|f| f.then_some("flat")).collect();
        let kept = self.drop_for(&why);
        let dropped = kept.iter().filter(|k| !**k).count();
        let (windows, hold) = if dropped == 1 {
            ("window was", "it holds")
        } else {
            ("windows were", "they or their partners hold")
        };
        self.warnings.push(format!("{dropped} {windows} left out because {hold} no variance: a blanked amplifier or a lead that was off."));
        kept
    }

    /// Drops every window with a reason, counted under it, and its partner, counted as `partner`; gives which windows are kept.
    pub fn drop_for(&mut self, why: &[Option<&'static str>]) -> Vec<bool> {
        let paired = self.paired;
        let mut lost: BTreeMap<usize, &'static str> = BTreeMap::new();
        for (window, reason) in self.windows.iter().zip(why) {
            if let (true, Some(reason)) = (paired, reason) {
                lost.entry(window.trial).or_insert(reason);
            }
        }
        let gone = |k: usize, w: &Window| why[k].or(lost.get(&w.trial).copied());
        let reasons: Vec<Option<&'static str>> = self
            .windows
            .iter()
            .enumerate()
            .map(|(k, w)| gone(k, w))
            .collect();
        for ((w, reason), own) in self.windows.iter().zip(&reasons).zip(why) {
            let Some(reason) = reason else { continue };
            let side = if w.signal {
                &mut self.card.signal
            } else {
                &mut self.card.reference
            };
            side.used -= 1;
            drop_one(side, own.unwrap_or("partner"));
            let known = |t: &&mut Trial| t.onset_s == w.onset_s && t.dropped.is_none();
            if let Some(trial) = self.card.trials.iter_mut().find(known) {
                trial.dropped = Some((*reason).to_owned());
            }
        }
        let mut at = reasons.iter();
        self.windows
            .retain(|_| at.next().is_none_or(|r| r.is_none()));
        let mut next = [0usize; 2];
        for w in &mut self.windows {
            let count = &mut next[usize::from(w.signal)];
            w.trial = *count;
            *count += 1;
        }
        reasons.iter().map(Option::is_none).collect()
    }

    /// The fold of every window: trials (paired) or each side's windows (unpaired) in contiguous folds.
    pub fn folds(&self, folds: usize) -> Vec<usize> {
        // Every fold tests both sides.
        let folds = folds.min(self.repetitions());
        let of_signal = contiguous_folds(self.card.signal.used, folds);
        let of_reference = contiguous_folds(self.card.reference.used, folds);
        self.windows
            .iter()
            .map(|w| {
                if w.signal {
                    of_signal[w.trial]
                } else {
                    of_reference[w.trial]
                }
            })
            .collect()
    }
    /// Pairs, or the smaller side's windows.
    pub fn repetitions(&self) -> usize {
        self.card.signal.used.min(self.card.reference.used)
    }
    /// Which windows are signal.
    pub fn sides(&self) -> Vec<bool> {
        self.windows.iter().map(|w| w.signal).collect()
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a panic is the failure of a test")]
    use super::*;

    fn event(onset_s: f64, label: &str) -> Event {
        Event {
            onset_s,
            duration_s: 0.0,
            label: label.into(),
        }
    }
    fn contrast(s: &str, from: f64, to: f64, r: &str, from_r: f64, to_r: f64) -> Contrast {
        Contrast::Windows {
            signal: EventWindow::new(s, from, to),
            reference: EventWindow::new(r, from_r, to_r),
        }
    }

    fn select(
        contrast: &Contrast,
        events: &[Event],
        stretches: &[Stretch],
        rate_hz: f64,
    ) -> Result<Selection> {
        super::select(
            &Recipe::asking(contrast.clone()),
            events,
            stretches,
            rate_hz,
        )
    }

    #[test]
    fn halves_round_away_from_zero_and_the_end_is_open() {
        let stretches = [Stretch {
            first: 0,
            count: 100,
            onset_s: 0.0,
        }];
        let events = [event(1.25, "a"), event(2.0, "a"), event(9.0, "a")];
        let s = select(
            &contrast("a", 0.0, 1.0, "a", -1.0, 0.0),
            &events,
            &stretches,
            10.0,
        )
        .unwrap();
        // 1.25 s at 10 Hz is sample 12.5, which rounds to 13; reference begins at 2.5, which rounds to 3.
        assert_eq!((s.windows[0].first, s.windows[0].count), (13, 10));
        assert_eq!((s.windows[1].first, s.windows[1].count), (3, 10));
        assert_eq!(s.card.signal.used, 3);
    }

    #[test]
    fn reasons_are_counted_on_their_own_side() {
        let stretches = [
            Stretch {
                first: 0,
                count: 50,
                onset_s: 0.0,
            },
            Stretch {
                first: 50,
                count: 50,
                onset_s: 7.0,
            },
        ];
        let events = [
            event(0.5, "a"),
            event(2.0, "a"),
            event(4.5, "a"),
            event(8.5, "a"),
            event(11.9, "a"),
        ];
        let s = select(
            &contrast("a", 0.0, 1.0, "a", -1.0, 0.0),
            &events,
            &stretches,
            10.0,
        )
        .unwrap();
        let counts = |list: &[(&str, usize)]| -> BTreeMap<String, usize> {
            list.iter()
                .map(|(reason, n)| ((*reason).to_owned(), *n))
                .collect()
        };
        assert_eq!(
            s.card.signal.dropped,
            counts(&[("gap", 1), ("outside", 1), ("partner", 1)])
        );
        assert_eq!(
            s.card.reference.dropped,
            counts(&[("outside", 1), ("partner", 2)])
        );
        assert_eq!((s.card.signal.used, s.card.reference.used), (2, 2));
        // The window in the second stretch: clock sample 85 lies 15 after its start at 70, so at 50 + 15.
        assert_eq!(s.windows[2].first, 65);
    }

    #[test]
    fn folds_differ_by_at_most_one_larger_first() {
        assert_eq!(
            contiguous_folds(12, 5),
            [0, 0, 0, 1, 1, 1, 2, 2, 3, 3, 4, 4]
        );
        assert_eq!(contiguous_folds(3, 5), [0, 1, 2]);
    }

    #[test]
    fn an_unknown_event_names_those_that_exist() {
        let e = select(
            &contrast("b", 0.0, 1.0, "a", -1.0, 0.0),
            &[event(1.0, "a")],
            &[],
            10.0,
        )
        .unwrap_err();
        assert!(e.to_string().contains("a (1)"), "{e}");
    }
}
