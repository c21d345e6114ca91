//! Which samples belong to which side.
//!
//! # Time
//! An event window is [onset+from, onset+to): its first sample is round((onset+from)·f) on the file's clock and it holds
//! round((to−from)·f) samples, halves away from zero. It is dropped, with its reason counted, where it leaves the recording
//! (`outside`), crosses a gap (`gap`), or, in a paired contrast, where its partner is dropped (`partner`).
use crate::error::{Kind, Problem, Result};
use crate::recipe::{Contrast, EventWindow};
use crate::recording::{Event, Stretch};
use crate::sheet::{SideCard, Trial, WindowsCard};
use std::collections::{BTreeMap, BTreeSet};

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
    /// Onset of its event.
    pub onset_s: f64,
}

/// The windows of a contrast.
#[derive(Debug, Clone)]
pub struct Selection {
    /// Both sides tied to the same event.
    pub paired: bool,
    /// Used windows; paired: signal then reference of trial 0, of trial 1 …; unpaired: in order of time.
    pub windows: Vec<Window>,
    /// For the sheet.
    pub card: WindowsCard,
    /// Warnings, each a sentence.
    pub warnings: Vec<String>,
}

/// Where a stretch of time lies in the samples.
enum Placed {
    At(usize),
    Outside,
    Gap,
}

fn place(stretches: &[Stretch], rate_hz: f64, from_s: f64, count: usize) -> Placed {
    let first = (from_s * rate_hz).round();
    if first.abs() > 1e15 || count as u64 > 1 << 50 {
        return Placed::Outside;
    }
    let first = first as i64;
    let end = first + count as i64;
    let clock = |s: &Stretch| (s.onset_s * rate_hz).round() as i64;
    for s in stretches {
        let start = clock(s);
        if first >= start && end <= start + s.count as i64 {
            return Placed::At(s.first + (first - start) as usize);
        }
    }
    let whole = stretches
        .first()
        .map(clock)
        .zip(stretches.last().map(|s| clock(s) + s.count as i64));
    match whole {
        Some((start, stop)) if first >= start && end <= stop => Placed::Gap,
        _ => Placed::Outside,
    }
}

/// Samples a window of this length holds.
pub fn sample_count(window: &EventWindow, rate_hz: f64) -> usize {
    ((window.to_s - window.from_s) * rate_hz).round().max(0.0) as usize
}

/// The sample nearest to a time, if the recording holds it.
pub fn sample_at(stretches: &[Stretch], rate_hz: f64, at_s: f64) -> Option<usize> {
    match place(stretches, rate_hz, at_s, 1) {
        Placed::At(sample) => Some(sample),
        _ => None,
    }
}

/// Refuses labels that the recording does not hold and windows without length.
pub fn check(contrast: &Contrast, events: &[Event], rate_hz: f64) -> Result<()> {
    let Contrast::Windows { signal, reference } = contrast else {
        return Err(not_yet());
    };
    for (side, window) in [("signal", signal), ("reference", reference)] {
        if !events.iter().any(|e| e.label == window.event) {
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
            return Err(Problem::new(
                Kind::Contrast,
                format!("the recording holds no event \"{}\"", window.event),
                "choose one of the events that it holds, or add an events table",
            )
            .at(format!("{side} windows"))
            .expected_found(format!("events labelled \"{}\"", window.event), found));
        }
        let count = sample_count(window, rate_hz);
        if count < 3 {
            return Err(Problem::new(
                Kind::Contrast,
                format!("the {side} windows are too short"),
                "make the windows longer: a variance needs several samples",
            )
            .at(format!(
                "{side} windows, {} to {} s",
                window.from_s, window.to_s
            ))
            .expected_found("at least 3 samples", format!("{count} at {rate_hz} Hz")));
        }
    }
    Ok(())
}

/// Finds the windows of both sides. `events` in order of time.
pub fn select(
    contrast: &Contrast,
    events: &[Event],
    stretches: &[Stretch],
    rate_hz: f64,
) -> Result<Selection> {
    check(contrast, events, rate_hz)?;
    let Contrast::Windows { signal, reference } = contrast else {
        return Err(not_yet());
    };
    let selection = if signal.event == reference.event {
        paired(signal, reference, events, stretches, rate_hz)
    } else {
        unpaired(signal, reference, events, stretches, rate_hz)
    };
    selection.enough()?;
    Ok(selection)
}

fn not_yet() -> Problem {
    Problem::new(
        Kind::Contrast,
        "this kind of contrast is read, and not computed yet",
        "choose windows around events",
    )
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

fn reason(placed: &Placed) -> Option<&'static str> {
    match placed {
        Placed::At(_) => None,
        Placed::Outside => Some("outside"),
        Placed::Gap => Some("gap"),
    }
}

fn paired(
    signal: &EventWindow,
    reference: &EventWindow,
    events: &[Event],
    stretches: &[Stretch],
    rate_hz: f64,
) -> Selection {
    let (ns, nr) = (
        sample_count(signal, rate_hz),
        sample_count(reference, rate_hz),
    );
    let mut card = WindowsCard {
        paired: true,
        signal: side_card(ns, rate_hz),
        reference: side_card(nr, rate_hz),
        trials: Vec::new(),
    };
    let mut windows = Vec::new();
    for event in events.iter().filter(|e| e.label == signal.event) {
        let s = place(stretches, rate_hz, event.onset_s + signal.from_s, ns);
        let r = place(stretches, rate_hz, event.onset_s + reference.from_s, nr);
        let mut dropped = None;
        if let (Placed::At(s), Placed::At(r)) = (&s, &r) {
            let trial = card.signal.used;
            windows.push(Window {
                first: *s,
                count: ns,
                signal: true,
                trial,
                onset_s: event.onset_s,
            });
            windows.push(Window {
                first: *r,
                count: nr,
                signal: false,
                trial,
                onset_s: event.onset_s,
            });
            card.signal.used += 1;
            card.reference.used += 1;
        } else {
            drop_one(&mut card.signal, reason(&s).unwrap_or("partner"));
            drop_one(&mut card.reference, reason(&r).unwrap_or("partner"));
            dropped = reason(&s).or(reason(&r)).map(str::to_owned);
        }
        card.trials.push(Trial {
            onset_s: event.onset_s,
            event: event.label.clone(),
            dropped,
        });
    }
    let warnings = overlap_warning(&windows);
    Selection {
        paired: true,
        windows,
        card,
        warnings,
    }
}

fn unpaired(
    signal: &EventWindow,
    reference: &EventWindow,
    events: &[Event],
    stretches: &[Stretch],
    rate_hz: f64,
) -> Selection {
    let (ns, nr) = (
        sample_count(signal, rate_hz),
        sample_count(reference, rate_hz),
    );
    let mut card = WindowsCard {
        paired: false,
        signal: side_card(ns, rate_hz),
        reference: side_card(nr, rate_hz),
        trials: Vec::new(),
    };
    let mut windows = Vec::new();
    for event in events {
        let is_signal = event.label == signal.event;
        if !is_signal && event.label != reference.event {
            continue;
        }
        let (window, count, side) = if is_signal {
            (signal, ns, &mut card.signal)
        } else {
            (reference, nr, &mut card.reference)
        };
        let placed = place(stretches, rate_hz, event.onset_s + window.from_s, count);
        let dropped = reason(&placed).map(str::to_owned);
        if let Placed::At(first) = placed {
            windows.push(Window {
                first,
                count,
                signal: is_signal,
                trial: side.used,
                onset_s: event.onset_s,
            });
            side.used += 1;
        } else if let Some(reason) = &dropped {
            drop_one(side, reason);
        }
        card.trials.push(Trial {
            onset_s: event.onset_s,
            event: event.label.clone(),
            dropped,
        });
    }
    let warnings = overlap_warning(&windows);
    Selection {
        paired: false,
        windows,
        card,
        warnings,
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
        let paired = self.paired;
        let lost: BTreeSet<usize> = (0..flat.len())
            .filter(|k| paired && flat[*k])
            .map(|k| self.windows[k].trial)
            .collect();
        let gone = |k: usize, w: &Window| {
            if paired {
                lost.contains(&w.trial)
            } else {
                flat[k]
            }
        };
        let kept: Vec<bool> = self
            .windows
            .iter()
            .enumerate()
            .map(|(k, w)| !gone(k, w))
            .collect();
        for (k, w) in self.windows.iter().enumerate().filter(|(k, _)| !kept[*k]) {
            let side = if w.signal {
                &mut self.card.signal
            } else {
                &mut self.card.reference
            };
            side.used -= 1;
            drop_one(side, if flat[k] { "flat" } else { "partner" });
            let known = |t: &&mut Trial| t.onset_s == w.onset_s && t.dropped.is_none();
            if let Some(trial) = self.card.trials.iter_mut().find(known) {
                trial.dropped = Some("flat".to_owned());
            }
        }
        let dropped = kept.iter().filter(|k| !**k).count();
        let (windows, hold) = if dropped == 1 {
            ("window was", "it holds")
        } else {
            ("windows were", "they or their partners hold")
        };
        self.warnings.push(format!("{dropped} {windows} left out because {hold} no variance: a blanked amplifier or a lead that was off."));
        let mut at = kept.iter();
        self.windows.retain(|_| at.next().copied().unwrap_or(true));
        let mut next = [0usize; 2];
        for w in &mut self.windows {
            let count = &mut next[usize::from(w.signal)];
            w.trial = *count;
            *count += 1;
        }
        kept
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
