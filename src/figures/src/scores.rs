//! The held-out ratio of every trial, in order of time.
use crate::axis::{Axis, range};
use crate::frame::{Frame, LEFT, PlotBox, RIGHT};
use crate::pen::{At, Drawn, Pen, SMALL, TICK, Word};
use crate::table::{Table, cell};
use crate::weights::End;
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::Sheet;

const TOP: f64 = 10.0;
const FOOT: f64 = 26.0;

/// See [`crate::Figure::Scores`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Scores {
    /// Onset of each trial's event.
    #[serde(with = "nan")]
    pub onset_s: Vec<f64>,
    /// Fold it was tested in, from 0.
    pub fold: Vec<usize>,
    /// Its held-out ratio, as a factor.
    #[serde(with = "nan")]
    pub ratio: Vec<f64>,
    /// The end whose first component it is.
    pub end: End,
}

impl Scores {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let mut trials = sheet.first()?.trials.clone();
        trials.retain(|t| t.log_ratio.is_finite());
        trials.sort_by(|a, b| a.onset_s.total_cmp(&b.onset_s));
        (!trials.is_empty()).then(|| Scores {
            onset_s: trials.iter().map(|t| t.onset_s).collect(),
            fold: trials.iter().map(|t| t.fold).collect(),
            ratio: trials.iter().map(|t| t.log_ratio.exp()).collect(),
            end: sheet.leading.into(),
        })
    }

    /// Runs of trials of one fold: first trial, one past the last, fold, geometric mean.
    fn runs(&self) -> Vec<(usize, usize, usize, f64)> {
        let mut runs = Vec::new();
        let mut from = 0;
        for i in 1..=self.fold.len() {
            if i == self.fold.len() || self.fold[i] != self.fold[from] {
                let logs: f64 = self.ratio[from..i].iter().map(|r| r.ln()).sum();
                runs.push((from, i, self.fold[from], (logs / (i - from) as f64).exp()));
                from = i;
            }
        }
        runs
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let (low, high) = range(&self.ratio).unwrap_or((0.5, 2.0));
        Frame {
            left: LEFT,
            right: width - RIGHT,
            top: TOP,
            bottom: (height - FOOT).max(TOP + 20.0),
            x: Axis::linear(-0.5, self.ratio.len() as f64 - 0.5),
            y: Axis::log(low.min(0.7) / 1.2, high.max(1.5) * 1.2),
        }
    }

    fn folds<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let inks = pen.inks;
        for (from, to, fold, mean) in self.runs() {
            let (x0, x1) = (frame.px(from as f64 - 0.5), frame.px(to as f64 - 0.5));
            if from > 0 {
                pen.dashed_rule((x0, frame.top), (x0, frame.bottom), inks.line, (3.0, 3.0))?;
            }
            let ink = if mean >= 1.0 {
                inks.signal
            } else {
                inks.reference
            };
            pen.across(x0 + 4.0, x1 - 4.0, frame.py_inside(mean), ink, 2.0)?;
            let full = format!("fold {}: {}", fold + 1, text::factor(mean));
            let short = text::factor(mean);
            let room = x1 - x0 - 4.0;
            let said = [full, short]
                .into_iter()
                .find(|s| text::width(s, TICK) <= room);
            if let Some(said) = said {
                let word = Word::new(TICK, inks.slate).at(At::Middle);
                pen.word(&said, ((x0 + x1) / 2.0, frame.bottom + 14.0), word)?;
            }
        }
        Ok(())
    }
}

impl Plot for Scores {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let inks = pen.inks;
        let ticks = frame
            .y
            .ratio_ticks(((frame.bottom - frame.top) / 22.0).max(2.0) as usize);
        let labels: Vec<String> = ticks.iter().map(|t| text::ratio_tick(*t)).collect();
        frame.y_grid(pen, &ticks, &labels)?;
        let one = frame.py(1.0);
        pen.dashed_rule((frame.left, one), (frame.right, one), inks.line, (2.0, 3.0))?;
        pen.across(frame.left, frame.right, frame.bottom, inks.line, 1.0)?;
        self.folds(pen, &frame)?;
        let pitch = (frame.right - frame.left) / self.ratio.len().max(1) as f64;
        let r = (pitch * 0.35).clamp(1.3, 3.6);
        for (i, ratio) in self.ratio.iter().enumerate() {
            let at = (frame.px(i as f64), frame.py_inside(*ratio));
            if *ratio >= 1.0 {
                pen.dot(at, r, inks.signal)?;
            } else {
                pen.ring(
                    at,
                    (r - 0.6).max(1.0),
                    inks.reference,
                    (r * 0.45).min(1.7),
                    inks.plate,
                )?;
            }
        }
        pen.word(
            "trials",
            (4.0, frame.bottom + 14.0),
            Word::new(SMALL, inks.slate),
        )
    }

    fn height(&self, _width: u32) -> u32 {
        168
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let mut table = Table::new(&["trial", "onset_s", "fold", "held_out_ratio"]);
        for (i, ratio) in self.ratio.iter().enumerate() {
            let onset = self.onset_s.get(i).copied().unwrap_or(f64::NAN);
            let fold = self
                .fold
                .get(i)
                .map_or(String::new(), |f| (f + 1).to_string());
            table.row([(i + 1).to_string(), cell(onset), fold, cell(*ratio)]);
        }
        table
    }

    fn spoken(&self) -> String {
        let below = self.ratio.iter().filter(|r| **r < 1.0).count();
        format!(
            "Held-out ratio of {} in each of {} in order of time; {} below 1.",
            self.end.first(),
            text::count(self.ratio.len(), "trial"),
            below
        )
    }
}
