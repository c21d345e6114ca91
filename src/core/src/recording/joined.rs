//! Several files of one recording, in order.
//!
//! # Order
//! Files are joined in the natural order of their names: `part 2` before `part 10`.
//!
//! # Time
//! The clock is the first file's. Where the headers give start times, a later file lies where they say: it continues the stretch
//! before it if it starts within half a sample of that stretch's end, otherwise there is a gap. Where they do not say (no start time, the
//! same one in every file, or a start before the end of the file before), it is placed right after the file before, as a stretch of its
//! own and with a warning: no window, filter or spectrum crosses an edge that nothing vouches for.
use super::budget::Budget;
use super::names::counted;
use super::opening::{OpenOptions, Reader, begin_reader};
use super::{Recording, Source};
use crate::error::{Kind, Problem, Result};
use std::cmp::Ordering;
use std::collections::VecDeque;

/// Compares names as people do: digits as numbers, the rest character by character without regard to case.
pub fn natural_order(a: &str, b: &str) -> Ordering {
    let (mut left, mut right) = (a, b);
    while let (Some(x), Some(y)) = (left.chars().next(), right.chars().next()) {
        let order = if x.is_ascii_digit() && y.is_ascii_digit() {
            let (m, rest_left) = digits(left);
            let (n, rest_right) = digits(right);
            (left, right) = (rest_left, rest_right);
            m.len().cmp(&n.len()).then(m.cmp(n))
        } else {
            (left, right) = (&left[x.len_utf8()..], &right[y.len_utf8()..]);
            x.to_lowercase().cmp(y.to_lowercase())
        };
        if order != Ordering::Equal {
            return order;
        }
    }
    left.len().cmp(&right.len()).then(a.cmp(b))
}

/// A number's digits without leading zeros, and what follows them.
fn digits(text: &str) -> (&str, &str) {
    let end = text
        .find(|c: char| !c.is_ascii_digit())
        .unwrap_or(text.len());
    let (number, rest) = text.split_at(end);
    (number.trim_start_matches('0'), rest)
}

/// The file being read.
struct Part {
    source: Box<dyn Source>,
    reader: Box<dyn Reader>,
}

struct JoinedReader {
    options: OpenOptions,
    waiting: VecDeque<Box<dyn Source>>,
    part: Option<Part>,
    whole: Option<Recording>,
    /// Start in the first file's header.
    first_s: Option<f64>,
    /// Bytes of the files that are done, and of all.
    done: u64,
    bytes: u64,
}

/// Sorts the files and opens the first.
pub(super) fn begin(
    mut sources: Vec<Box<dyn Source>>,
    options: &OpenOptions,
    budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    sources.sort_by(|a, b| natural_order(a.name(), b.name()));
    let bytes = sources.iter().map(|source| source.len()).sum();
    let mut joined = JoinedReader {
        options: options.clone(),
        waiting: sources.into(),
        part: None,
        whole: None,
        first_s: None,
        done: 0,
        bytes,
    };
    joined.next(budget)?;
    Ok(Box::new(joined))
}

impl JoinedReader {
    /// Opens the next file.
    fn next(&mut self, budget: &mut Budget) -> Result<()> {
        let Some(mut source) = self.waiting.pop_front() else {
            return Ok(());
        };
        let reader = begin_reader(source.as_mut(), &self.options, budget)
            .map_err(|problem| problem.in_file(source.name()))?;
        self.part = Some(Part { source, reader });
        Ok(())
    }

    /// Adds the file that is done to what there is.
    fn add(&mut self, part: Part, budget: &mut Budget) -> Result<()> {
        let name = part.source.name().to_owned();
        self.done += part.source.len();
        let start_s = part.reader.start_s();
        let mut recording = part
            .reader
            .finish()
            .map_err(|problem| problem.in_file(name.as_str()))?;
        let Some(whole) = &mut self.whole else {
            recording.name = name;
            self.first_s = start_s;
            self.whole = Some(recording);
            return Ok(());
        };
        same(whole, &recording).map_err(|problem| problem.in_file(name.as_str()))?;
        let values = recording.sample_count() as u64 * recording.channels.len() as u64;
        budget.draw(4 * values, "its joined samples")?;
        let away_s = self.first_s.zip(start_s).map(|(first, this)| this - first);
        append(whole, recording, &name, away_s);
        Ok(())
    }
}

/// Refuses a file with other channels or another rate.
fn same(whole: &Recording, part: &Recording) -> Result<()> {
    let differs = |place: String, expected: String, found: String| {
        Err(Problem::new(
            Kind::Unsupported,
            format!("it is no part of the recording that {} begins", whole.name),
            "leave it out, or open the files one by one",
        )
        .at(place)
        .expected_found(expected, found))
    };
    let [rate, other] = [whole.rate_hz, part.rate_hz];
    if (rate / other - 1.0).abs() > 1e-9 {
        return differs(
            "sampling rate".into(),
            format!("{rate} Hz"),
            format!("{other} Hz"),
        );
    }
    let [count, found] = [whole, part].map(|r| counted(r.channels.len() as u64, "channel"));
    if count != found {
        return differs("channels".into(), count, found);
    }
    let pairs = whole.channels.iter().zip(&part.channels).enumerate();
    for (index, (one, two)) in pairs {
        if (&one.name, &one.unit) != (&two.name, &two.unit) {
            let [expected, found] = [one, two].map(|c| format!("\"{}\" in {}", c.name, c.unit));
            return differs(format!("channel {}", index + 1), expected, found);
        }
    }
    if whole.layout != part.layout {
        return differs("pixels".into(), "the same picture".into(), "another".into());
    }
    Ok(())
}

/// Puts a file at the end; `away_s` is its start after the first file's, by the headers.
fn append(whole: &mut Recording, part: Recording, name: &str, away_s: Option<f64>) {
    let end_s = whole.span_s();
    let first_s = part.stretches.first().map_or(0.0, |s| s.onset_s);
    let half_sample_s = 0.5 / whole.rate_hz * (1.0 + 1e-6);
    let gap_s = away_s.map(|away_s| away_s + first_s - end_s);
    let (offset_s, touches) = match (away_s, gap_s) {
        (Some(_), Some(gap_s)) if gap_s.abs() <= half_sample_s => (end_s - first_s, true),
        (Some(away_s), Some(gap_s)) if gap_s > 0.0 => (away_s, false),
        _ => {
            whole.warnings.push(format!(
                "How much time lies before {name} is not known: it is placed right after the file before, and no window and no filter crosses the edge."
            ));
            (end_s - first_s, false)
        }
    };
    let count = whole.sample_count();
    for (samples, more) in whole.samples.iter_mut().zip(part.samples) {
        samples.extend(more);
    }
    for (index, mut stretch) in part.stretches.into_iter().enumerate() {
        match whole.stretches.last_mut() {
            Some(last) if index == 0 && touches => last.count += stretch.count,
            _ => {
                stretch.first += count;
                stretch.onset_s += offset_s;
                whole.stretches.push(stretch);
            }
        }
    }
    whole
        .events
        .extend(part.events.into_iter().map(|mut event| {
            event.onset_s += offset_s;
            event
        }));
    let told = part
        .warnings
        .into_iter()
        .map(|warning| format!("{name}: {warning}"));
    whole.warnings.extend(told);
    whole.warnings.push(match touches {
        true => format!("{name} follows without a gap, as the start times in the headers say."),
        false => format!("{name} was joined; there is a gap before it."),
    });
}

impl Reader for JoinedReader {
    fn step(&mut self, _source: &mut dyn Source, budget: &mut Budget) -> Result<(u64, u64)> {
        let Some(mut part) = self.part.take() else {
            self.next(budget)?;
            return Ok((self.done, self.bytes));
        };
        let (done, of) = part
            .reader
            .step(part.source.as_mut(), budget)
            .map_err(|problem| problem.in_file(part.source.name()))?;
        if done < of {
            let share = part.source.len() as f64 * done as f64 / of as f64;
            self.part = Some(part);
            return Ok(((self.done + share as u64).min(self.bytes - 1), self.bytes));
        }
        self.add(part, budget)?;
        Ok((self.done, self.bytes))
    }

    fn finish(self: Box<Self>) -> Result<Recording> {
        self.whole.ok_or_else(|| {
            Problem::new(
                Kind::Empty,
                "no recording was given",
                "name at least one file",
            )
        })
    }
}

/// What the files together are to the opening: a name and a length.
pub(super) struct Together {
    pub(super) name: String,
    pub(super) bytes: u64,
}

impl Source for Together {
    fn name(&self) -> &str {
        &self.name
    }
    fn len(&self) -> u64 {
        self.bytes
    }
    fn read_at(&mut self, offset: u64, _out: &mut [u8]) -> Result<()> {
        Err(Problem::new(
            Kind::Storage,
            "files that are joined are read one by one",
            "open them together",
        )
        .at(format!("byte {offset}")))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_in_names_count_as_numbers() {
        let mut names = [
            "b", "a10", "a9", "A1", "a010b", "a", "a10b", "run-2_x", "run-10_x",
        ];
        names.sort_by(|a, b| natural_order(a, b));
        assert_eq!(
            names,
            [
                "a", "A1", "a9", "a10", "a010b", "a10b", "b", "run-2_x", "run-10_x"
            ]
        );
    }
}
