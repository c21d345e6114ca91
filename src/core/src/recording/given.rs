//! What a file leaves open and the user answers: sampling rate, unit, axes, which of several arrays.
//!
//! A reader asks everything at once: it makes an [`Asking`] from what was told, takes each answer that is there, and
//! [`Asking::settle`] refuses with `NeedsAnswer` and the whole list where any is missing. Answers come from the recipe's `recording`,
//! from a side file or from the page's form; they are ranges of [`crate::recipe::recipe_check`] by then.
use super::units::Unit;
use crate::error::{Ask, Kind, Problem, Result};
use crate::recipe::{Axes, Given};

/// Units that are offered; any other may be written.
pub const UNITS: [&str; 6] = ["uV", "mV", "V", "nV", "fT", "counts"];

/// Questions gathered while a header is read.
#[derive(Debug)]
pub(crate) struct Asking<'a> {
    given: &'a Given,
    asks: Vec<Ask>,
}

impl<'a> Asking<'a> {
    /// Begins with what was told.
    pub(crate) fn new(given: &'a Given) -> Self {
        Asking {
            given,
            asks: Vec::new(),
        }
    }

    fn ask(&mut self, key: &str, question: String, options: Vec<String>, guess: Option<String>) {
        self.asks.push(Ask {
            key: key.to_owned(),
            question,
            options,
            guess,
        });
    }

    /// The rate that was told, without asking for it.
    pub(crate) fn told_rate(&self) -> Option<f64> {
        self.given.rate_hz
    }

    /// Samples (or frames, as `noun` says) a second.
    pub(crate) fn rate(&mut self, noun: &str) -> Option<f64> {
        if self.given.rate_hz.is_none() {
            let question = format!("How many {noun} a second does it hold?");
            self.ask("rate_hz", question, Vec::new(), None);
        }
        self.given.rate_hz
    }

    /// The unit of the samples, with the factor that brings them to it.
    pub(crate) fn unit(&mut self, guess: Option<&str>) -> Option<Unit> {
        match &self.given.unit {
            Some(unit) => Some(Unit::of(unit)),
            None => {
                let question = "In which unit are its samples?".to_owned();
                let options = UNITS.map(str::to_owned).to_vec();
                self.ask("unit", question, options, guess.map(str::to_owned));
                None
            }
        }
    }

    #[allow(dead_code, reason = "asked by formats that hold arrays")]
    /// What the axes are, of the ones that a file of this shape can have; of one possibility nothing is asked.
    pub(crate) fn axes(
        &mut self,
        shape: &[u64],
        possible: &[Axes],
        guess: Option<Axes>,
    ) -> Option<Axes> {
        match (self.given.axes, possible) {
            (Some(axes), _) if possible.contains(&axes) => return Some(axes),
            (None, [only]) => return Some(*only),
            _ => {}
        }
        let sizes: Vec<String> = shape.iter().map(u64::to_string).collect();
        let question = format!(
            "The array holds {} values: what are its axes, in this order?",
            sizes.join(" × ")
        );
        let options = possible.iter().map(|a| a.name().to_owned()).collect();
        let guess = guess.map(|a| a.name().to_owned());
        self.ask("axes", question, options, guess);
        None
    }

    #[allow(dead_code, reason = "asked by formats that hold arrays")]
    /// Which of several named arrays holds the samples; of one array nothing is asked.
    pub(crate) fn variable(&mut self, names: &[String], guess: Option<&str>) -> Option<String> {
        match (&self.given.variable, names) {
            (Some(name), _) if names.contains(name) => return Some(name.clone()),
            (None, [only]) => return Some(only.clone()),
            _ => {}
        }
        let question = match &self.given.variable {
            Some(name) => format!(
                "The file holds no array called \"{name}\" that can be read: which one holds the samples?"
            ),
            None => "The file holds several arrays: which one holds the samples?".to_owned(),
        };
        let guess = guess.map(str::to_owned);
        self.ask("variable", question, names.to_vec(), guess);
        None
    }

    /// Fails with all questions where any stands open; `format` is how the file is called ("a table").
    ///
    /// # Errors
    /// `NeedsAnswer`.
    pub(crate) fn settle(self, format: &str) -> Result<()> {
        if self.asks.is_empty() {
            return Ok(());
        }
        let keys: Vec<&str> = self.asks.iter().map(|ask| ask.key.as_str()).collect();
        let written: Vec<String> = keys.iter().map(|key| format!("\"{key}\"")).collect();
        let lacks: Vec<&str> = keys.iter().map(|key| lack(key)).collect();
        Err(Problem::new(
            Kind::NeedsAnswer,
            format!("{format} does not say {}", joined(&lacks)),
            format!(
                "tell it: {} in the recipe's \"recording\", an option of the command, or the form on the page",
                joined(&written)
            ),
        )
        .asking(self.asks))
    }
}

/// What a file does not say, for a key.
fn lack(key: &str) -> &'static str {
    match key {
        "rate_hz" => "its sampling rate",
        "unit" => "its unit",
        "axes" => "which axis is time",
        _ => "which array holds the samples",
    }
}

/// `a`, `a and b`, `a, b and c`.
fn joined(parts: &[impl AsRef<str>]) -> String {
    let parts: Vec<&str> = parts.iter().map(AsRef::as_ref).collect();
    match parts.split_last() {
        Some((last, before)) if !before.is_empty() => format!("{} and {last}", before.join(", ")),
        _ => parts.concat(),
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a test may end where it fails")]
    use super::*;

    #[test]
    fn everything_that_is_missing_is_asked_at_once() {
        let nothing = Given::default();
        let mut asking = Asking::new(&nothing);
        let both = [Axes::ChannelsSamples, Axes::SamplesChannels];
        assert_eq!(asking.rate("samples"), None);
        assert_eq!(asking.unit(Some("uV")), None);
        assert_eq!(asking.axes(&[3, 50], &both, Some(both[0])), None);
        let problem = asking.settle("an array").unwrap_err();
        assert_eq!(problem.kind, Kind::NeedsAnswer);
        assert_eq!(
            problem.what,
            "an array does not say its sampling rate, its unit and which axis is time"
        );
        let keys: Vec<&str> = problem.asks.iter().map(|a| a.key.as_str()).collect();
        assert_eq!(keys, ["rate_hz", "unit", "axes"]);
        assert_eq!(problem.asks[2].guess.as_deref(), Some("channels,samples"));
        assert!(problem.asks[2].question.contains("3 × 50"));
    }

    #[test]
    fn answers_are_taken_and_single_possibilities_are_not_asked() {
        let told = Given {
            rate_hz: Some(250.0),
            unit: Some("mV".to_owned()),
            ..Given::default()
        };
        let mut asking = Asking::new(&told);
        assert_eq!(asking.rate("samples"), Some(250.0));
        let unit = asking.unit(None).unwrap();
        assert_eq!((unit.name.as_str(), unit.factor), ("µV", 1e3));
        let frames = [Axes::FramesHeightWidth];
        assert_eq!(asking.axes(&[2, 3, 4], &frames, None), Some(frames[0]));
        let one = ["x".to_owned()];
        assert_eq!(asking.variable(&one, None).as_deref(), Some("x"));
        assert!(asking.settle("an array").is_ok());
    }

    #[test]
    fn an_answer_that_does_not_fit_is_asked_again() {
        let told = Given {
            variable: Some("y".to_owned()),
            axes: Some(Axes::FramesHeightWidth),
            ..Given::default()
        };
        let mut asking = Asking::new(&told);
        assert_eq!(asking.variable(&["x".to_owned()], None), None);
        let two = [Axes::SamplesChannels];
        assert_eq!(asking.axes(&[2, 3], &two, None), None);
        assert_eq!(asking.settle("an archive").unwrap_err().asks.len(), 2);
    }
}
