//! Lines and progress on standard error.
use std::io::{IsTerminal, Write};
use teasel_core::analysis::{Progress, Stage};
use teasel_core::error::Problem;

/// Writes one line; a closed pipe is nobody's problem.
pub fn line(text: &str) {
    let _ = writeln!(std::io::stderr(), "teasel: {text}");
}

/// Writes a line for a person at a terminal; what it says stands in the results as well.
pub fn note(text: &str) {
    if std::io::stderr().is_terminal() {
        line(text);
    }
}

/// Says what went wrong, in one line.
pub fn problem(problem: &Problem) {
    let text = problem.to_string();
    let one: Vec<&str> = text.split_whitespace().collect();
    line(&one.join(" "));
}

/// Progress of one recording: a line that is written over, on a terminal only.
pub struct Meter {
    name: String,
    shown: bool,
    last: (String, u64),
}

impl Meter {
    pub fn new(name: &str) -> Self {
        Meter {
            name: name.into(),
            shown: std::io::stderr().is_terminal(),
            last: (String::new(), 0),
        }
    }

    /// Shows how far reading is.
    pub fn reading(&mut self, done: u64, of: u64) {
        self.show("reading", done, of);
    }

    /// Shows how far the analysis is.
    pub fn analysis(&mut self, progress: Progress) {
        let what = match progress.stage {
            Stage::Reading => "reading",
            Stage::Preparing => "preparing channels",
            Stage::Windows => "covariances of windows",
            Stage::Fitting => "fitting",
            Stage::HeldOut => "scoring on windows held out",
            Stage::Permuting => "permuting",
            Stage::Curve => "ratio against C",
            Stage::Picturing => "pictures over time and frequency",
            Stage::Done => "done",
        };
        self.show(what, progress.done, progress.of);
    }

    fn show(&mut self, what: &str, done: u64, of: u64) {
        if !self.shown || of == 0 {
            return;
        }
        let percent = (u128::from(done) * 100 / u128::from(of)) as u64;
        let now = (what.to_string(), percent);
        if now != self.last {
            let _ = write!(
                std::io::stderr(),
                "\r\x1b[2K{}: {what}, {percent} %",
                self.name
            );
            let _ = std::io::stderr().flush();
            self.last = now;
        }
    }
}

impl Drop for Meter {
    fn drop(&mut self) {
        if self.shown && !self.last.0.is_empty() {
            let _ = write!(std::io::stderr(), "\r\x1b[2K");
        }
    }
}
