//! The time column: its name, its steps, the rate that they give.
use super::read::damaged;
use crate::error::{Problem, Result};

/// Rows that must rise evenly before an unnamed column is taken for the time.
const FEWEST_ROWS: usize = 8;
/// Rates are snapped to a multiple of this where the printed times allow it.
const NICE_HZ: [f64; 4] = [1.0, 0.5, 0.1, 0.01];

/// `Fz (uV)` and `Fz [uV]` as name and unit.
pub(super) fn unit_of(name: &str) -> (String, Option<String>) {
    for (open, close) in [('(', ')'), ('[', ']')] {
        if let Some((label, unit)) = name.strip_suffix(close).and_then(|n| n.rsplit_once(open)) {
            let (label, unit) = (label.trim(), unit.trim());
            let short = !unit.is_empty() && unit.chars().count() <= 8;
            if short && !label.is_empty() {
                return (label.to_owned(), Some(unit.to_owned()));
            }
        }
    }
    (name.to_owned(), None)
}

/// Factor to seconds for the name, in lower case, of a column of times.
pub(super) fn factor(name: &str) -> Option<f64> {
    let (label, unit) = unit_of(name);
    let (label, unit) = match (label.rsplit_once('_'), &unit) {
        (Some((label, unit)), None) => (label.to_owned(), Some(unit.to_owned())),
        _ => (label, unit),
    };
    let named = ["time", "t", "timestamp", "second", "seconds", "sec"].contains(&label.as_str());
    match unit.as_deref() {
        _ if !named => None,
        None | Some("s" | "sec" | "seconds") => Some(1.0),
        Some("ms" | "msec" | "milliseconds") => Some(1e-3),
        Some("us" | "µs" | "μs") => Some(1e-6),
        Some(_) => None,
    }
}

/// Whether numbers count rows from 0 or 1; a column without a telling name must go on for some rows.
pub(super) fn counts(numbers: &[f64], name: &str) -> bool {
    let named =
        ["", "#", "n", "sample", "samples", "index", "row"].contains(&name.to_lowercase().as_str());
    let first = numbers.first().copied().unwrap_or(f64::NAN);
    let counted = (first == 0.0 || first == 1.0)
        && numbers
            .iter()
            .enumerate()
            .all(|(k, &n)| n == first + k as f64);
    counted && (named && numbers.len() > 1 || numbers.len() >= FEWEST_ROWS)
}

/// Whether numbers rise by steps that differ by no more than their last printed place.
pub(super) fn rises_evenly(numbers: &[f64]) -> bool {
    let (Some(first), Some(last)) = (numbers.first(), numbers.last()) else {
        return false;
    };
    let step = (last - first) / (numbers.len() - 1) as f64;
    numbers.len() >= FEWEST_ROWS
        && step > 0.0
        && numbers
            .iter()
            .enumerate()
            .all(|(k, n)| (n - (first + k as f64 * step)).abs() <= 1e-3 * step + 1e-9 * n.abs())
}

/// The time column as it is read.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Clock {
    pub(super) name: String,
    /// To seconds.
    factor: f64,
    /// The usual step among the first rows; where printing rounded them so much that none is usual, their mean.
    step_s: f64,
    /// By how much a step may depart from that.
    slack_s: f64,
    /// One in the last printed place.
    place_s: f64,
    times: Vec<f64>,
}

impl Clock {
    /// From the column's name, the factor to seconds and the first numbers as they stand in the table.
    pub(super) fn new(name: &str, factor: f64, first: &[f64]) -> Clock {
        let mut steps: Vec<f64> = first.windows(2).map(|w| w[1] - w[0]).collect();
        let mean = steps.iter().sum::<f64>() / steps.len() as f64;
        steps.sort_by(f64::total_cmp);
        let middle = steps.get(steps.len() / 2).copied().unwrap_or(f64::NAN);
        let usual = steps
            .iter()
            .filter(|s| (*s - middle).abs() <= 0.01 * middle)
            .count();
        let is_rounded = 5 * usual < 3 * steps.len();
        let place = last_place(first);
        let (step, slack) = match is_rounded {
            true => (mean, 0.5 * mean + place),
            false => (middle, 0.5 * middle),
        };
        Clock {
            name: name.to_owned(),
            factor,
            step_s: factor * step,
            slack_s: factor * slack,
            place_s: factor * place,
            times: Vec::new(),
        }
    }

    /// Seconds that a row lasts, as far as the first rows tell.
    pub(super) fn step_s(&self) -> f64 {
        self.step_s
    }

    /// Forgets the times after so many rows.
    pub(super) fn truncate(&mut self, rows: usize) {
        self.times.truncate(rows);
    }

    /// Takes the time of the next row, as it stands in the table; refuses one that is not about a step after the one before.
    pub(super) fn tick(&mut self, number: f64, line: u64) -> Result<()> {
        let now_s = number * self.factor;
        if let Some(before_s) = self.times.last() {
            let step_s = now_s - before_s;
            if !self.step_s.is_finite() {
                (self.step_s, self.slack_s) = (step_s, 0.5 * step_s);
            }
            let slack_s = self.slack_s + 1e-9 * now_s.abs();
            let even = step_s > 0.0 && (step_s - self.step_s).abs() <= slack_s;
            if !even {
                return Err(self.irregular(&format!("line {line}"), step_s));
            }
        }
        self.times.push(now_s);
        Ok(())
    }

    fn irregular(&self, place: &str, step_s: f64) -> Problem {
        let mut problem = damaged("the time does not run evenly")
            .at(format!("{place}, column \"{}\"", self.name))
            .expected_found(
                format!("{} s after the row before", brief(self.step_s)),
                format!("{} s", brief(step_s)),
            );
        problem.advice = "resample the table to even steps, or split it where the time jumps and open the parts together".into();
        problem
    }

    /// First time and sampling rate; refuses times that leave the line through the first and the last by more than three
    /// quarters of a step.
    pub(super) fn settle(&self) -> Result<(f64, f64)> {
        let (first_s, last_s, rows) = match self.times[..] {
            [first_s, .., last_s] => (first_s, last_s, self.times.len()),
            _ => {
                return Err(damaged("the time column gives no rate")
                    .at(format!("column \"{}\"", self.name))
                    .expected_found("two rows or more", self.times.len()));
            }
        };
        let step_s = (last_s - first_s) / (rows - 1) as f64;
        let away = |k: usize, t: f64| (t - first_s - k as f64 * step_s).abs();
        for (k, pair) in self.times.windows(2).enumerate() {
            if away(k + 1, pair[1]) > 0.75 * step_s {
                let place = format!("sample {}", k + 2);
                return Err(self.irregular(&place, pair[1] - pair[0]));
            }
        }
        // Neither end is known better than the last printed place; a rate within that of a round one is the round one.
        let rate_hz = 1.0 / step_s;
        let doubt = rate_hz * (self.place_s / (last_s - first_s)).max(1e-12);
        let near = |nice: &f64| (nice - rate_hz).abs() <= doubt && *nice > 0.0;
        let nice = NICE_HZ.iter().map(|n| (rate_hz / n).round() * n).find(near);
        Ok((first_s, nice.unwrap_or(rate_hz)))
    }
}

/// One in the last decimal place that numbers were printed with, at most nine places.
fn last_place(numbers: &[f64]) -> f64 {
    let whole = |shift: f64| {
        let is_whole = |n: &f64| (n * shift - (n * shift).round()).abs() <= 1e-6;
        numbers.iter().all(is_whole)
    };
    let shift = (0..9).map(|places| 10_f64.powi(places)).find(|s| whole(*s));
    shift.map_or(1e-9, |shift| 1.0 / shift)
}

/// A number of seconds in at most six figures.
fn brief(seconds: f64) -> f64 {
    let digits = 5 - seconds.abs().max(1e-12).log10().floor() as i32;
    let shift = 10_f64.powi(digits);
    (seconds * shift).round() / shift
}
