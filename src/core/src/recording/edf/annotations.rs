//! Time-stamped annotation lists of EDF+ (Kemp & Olivan 2003, section 2.2).
//!
//! ```text
//! ±onset [0x15 duration] 0x14 text 0x14 text 0x14 … 0x00
//! ```
//! The first list in the first annotation signal of a record starts with an empty text: its onset is the record's own.
use crate::error::Result;
use crate::recording::Event;
use crate::recording::budget::Budget;

/// Onsets beyond this many seconds (30 years) are taken for damage.
const FARTHEST_S: f64 = 1e9;
/// What an event costs beside its label: itself, twice where a growing list doubles, and an allocation of its own.
const EVENT_BYTES: u64 = 2 * size_of::<Event>() as u64 + 16;

/// What one annotation signal of one record holds.
#[derive(Debug, Default, PartialEq)]
pub(super) struct Lists {
    /// Onset of the first list, where its first text is empty.
    pub(super) record_onset_s: Option<f64>,
    pub(super) events: Vec<Event>,
    /// Lists that cannot be read, and the offset of the first of them.
    pub(super) broken: u64,
    pub(super) first_broken: Option<usize>,
}

/// Reads every list in the bytes of one annotation signal in one record; every event is paid for before it is kept.
pub(super) fn read(bytes: &[u8], budget: &mut Budget) -> Result<Lists> {
    let mut lists = Lists::default();
    let mut start = 0;
    for list in bytes.split(|&b| b == 0) {
        if !list.is_empty() {
            match stamp_and_texts(list) {
                Some((onset_s, duration_s, texts)) => {
                    let mut texts = texts.split(|&b| b == 0x14).peekable();
                    if start == 0 && texts.peek().is_some_and(|t| t.is_empty()) {
                        lists.record_onset_s = Some(onset_s);
                    }
                    for label in texts.filter_map(label) {
                        budget.draw(EVENT_BYTES + label.len() as u64, "its annotations")?;
                        lists.events.push(Event {
                            onset_s,
                            duration_s,
                            label,
                        });
                    }
                }
                None => {
                    lists.broken += 1;
                    lists.first_broken.get_or_insert(start);
                }
            }
        }
        start += list.len() + 1;
    }
    Ok(lists)
}

/// Onset, duration and the texts (still joined by 0x14) of one list without its closing NUL.
fn stamp_and_texts(list: &[u8]) -> Option<(f64, f64, &[u8])> {
    let body = list.strip_suffix(b"\x14")?;
    let end = body.iter().position(|&b| b == 0x14).unwrap_or(body.len());
    let texts = body.get(end + 1..).unwrap_or(&[]);
    let mut stamp = body[..end].splitn(2, |&b| b == 0x15);
    let onset = stamp.next()?;
    if !matches!(onset.first(), Some(b'+' | b'-')) {
        return None;
    }
    let onset_s = seconds(onset)?;
    let duration_s = match stamp.next() {
        None | Some([]) => 0.0,
        Some(duration) => seconds(duration).filter(|d| *d >= 0.0)?,
    };
    Some((onset_s, duration_s, texts))
}

fn seconds(digits: &[u8]) -> Option<f64> {
    let plain = |b: &u8| b.is_ascii_digit() || b"+-.".contains(b);
    if !digits.iter().all(plain) {
        return None;
    }
    let value: f64 = std::str::from_utf8(digits).ok()?.parse().ok()?;
    (value.abs() <= FARTHEST_S).then_some(value)
}

/// A text as a label, `None` for an empty one. The standard says UTF-8; other bytes are taken as Latin-1.
fn label(text: &[u8]) -> Option<String> {
    let text = match std::str::from_utf8(text) {
        Ok(text) => text.to_owned(),
        Err(_) => text.iter().map(|&b| b as char).collect(),
    };
    let clean = text
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect::<String>();
    let trimmed = clean.trim();
    (!trimmed.is_empty()).then(|| trimmed.to_owned())
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a test may end where it fails")]
    use super::*;

    fn read(bytes: &[u8]) -> Lists {
        super::read(bytes, &mut Budget::new(1 << 20, 1 << 20)).unwrap()
    }

    fn texts(bytes: &[u8]) -> Vec<(f64, f64, String)> {
        read(bytes)
            .events
            .into_iter()
            .map(|e| (e.onset_s, e.duration_s, e.label))
            .collect()
    }

    #[test]
    fn the_examples_of_the_specification() {
        let bytes = b"+180\x14Lights off\x14Close door\x14\x00+180\x14Lights off\x14\x00+180\x14Close door\x14\x00+1800.2\x1525.5\x14Apnea\x14\x00\x00\x00";
        assert_eq!(
            texts(bytes),
            [
                (180.0, 0.0, "Lights off".into()),
                (180.0, 0.0, "Close door".into()),
                (180.0, 0.0, "Lights off".into()),
                (180.0, 0.0, "Close door".into()),
                (1800.2, 25.5, "Apnea".into()),
            ]
        );
    }

    #[test]
    fn a_record_keeps_time_with_its_first_list() {
        let lists = read(b"+567\x14\x14\x00+567.5\x14late\x14\x00\x00");
        assert_eq!(lists.record_onset_s, Some(567.0));
        assert_eq!(lists.events.len(), 1);
        let lists = read(b"-0.065\x14\x14R-wave\x14\x00");
        assert_eq!(lists.record_onset_s, Some(-0.065));
        assert_eq!(lists.events[0].label, "R-wave");
        assert_eq!(read(b"+3\x14word\x14\x00").record_onset_s, None);
    }

    #[test]
    fn broken_lists_are_counted_and_the_rest_is_read() {
        let lists = read(b"+1\x14\x14\x00oops\x14a\x14\x00+2\x14b\x14\x00+3\x14cut");
        assert_eq!((lists.broken, lists.first_broken), (2, Some(5)));
        assert_eq!(lists.events.len(), 1);
        for broken in [
            &b"1\x14a\x14"[..],
            b"+\x14a\x14",
            b"+1e9\x14a\x14",
            b"+1\x15x\x14a\x14",
            b"+1\x15-2\x14a\x14",
            b"+inf\x14a\x14",
            b"+99999999999\x14a\x14",
            b"+1",
        ] {
            assert_eq!(read(broken).broken, 1, "{}", broken.escape_ascii());
        }
    }

    #[test]
    fn utf8_and_latin_1() {
        assert_eq!(texts("+1\x14Bö → 灯\x14\0".as_bytes())[0].2, "Bö → 灯");
        assert_eq!(texts(b"+1\x14B\xf6\x14\0")[0].2, "Bö");
    }
}
