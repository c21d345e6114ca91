//! The variance of every dimension, and below it what several rules would keep, on the same axis.
use crate::axis::{self, Axis, range};
use crate::frame::{Frame, PlotBox};
use crate::kept::{TOP, beside_line, frame, kept_ground};
use crate::pen::{At, Drawn, Pen, TICK, Word};
use crate::table::{Table, cell};
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::Sheet;

/// See [`crate::Figure::Eigenvalues`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Eigenvalues {
    /// dB below the largest, for every dimension up to the rank.
    #[serde(with = "nan")]
    pub db: Vec<f64>,
    /// Variances in the square of the channels' unit.
    #[serde(with = "nan")]
    pub variance: Vec<f64>,
    /// C.
    pub kept: usize,
    /// Largest C.
    pub rank: usize,
    /// Share of the variance in the kept dimensions.
    pub share: f64,
    /// What rules would keep, in words and as a number of dimensions.
    #[serde(default)]
    pub guides: Vec<(String, usize)>,
}

/// Height of a rule's row.
const GUIDE: f64 = 17.0;
/// Rules in the order of their rows: key of the sheet and words.
const GUIDES: [(&str, &str); 6] = [
    ("share_95", "95 % of the variance"),
    ("parallel_analysis", "parallel analysis"),
    ("noise_edge", "above the noise edge"),
    ("hard_threshold", "hard threshold"),
    (
        "one_standard_error",
        "one standard error of the best held-out ratio",
    ),
    ("held_out_peak", "best held-out ratio"),
];

impl Eigenvalues {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let card = sheet.compression.as_ref()?;
        let largest = card
            .eigenvalues
            .iter()
            .copied()
            .find(|v| v.is_finite() && *v > 0.0)?;
        let shown = card.rank.clamp(1, card.eigenvalues.len());
        let variance = card.eigenvalues[..shown].to_vec();
        let db = |v: &f64| {
            if *v > 0.0 {
                10.0 * (v / largest).log10()
            } else {
                f64::NAN
            }
        };
        Some(Eigenvalues {
            db: variance.iter().map(db).collect(),
            variance,
            kept: card.kept,
            rank: card.rank,
            share: card.share,
            guides: GUIDES
                .iter()
                .filter_map(|(key, words)| Some(((*words).to_owned(), *card.guides.get(*key)?)))
                .collect(),
        })
    }

    fn guides_height(&self) -> f64 {
        match self.guides.len() {
            0 => 0.0,
            n => 8.0 + GUIDE * n as f64,
        }
    }

    /// A row for each rule: a dot at its number, and its words where there is room.
    fn rules<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let inks = pen.inks;
        let first = frame.bottom + 8.0 + GUIDE / 2.0;
        for (i, (words, keep)) in self.guides.iter().enumerate() {
            let y = first + GUIDE * i as f64;
            let x = frame.px_inside((*keep).max(1) as f64);
            pen.across(frame.left, frame.right, y, inks.rule, 1.0)?;
            let said = match keep {
                0 => format!("{words}: none"),
                n => format!("{words}: {n}"),
            };
            let said = text::fit(&said, TICK, frame.right - frame.left - 20.0);
            let wide = text::width(&said, TICK);
            let line = frame.px(self.kept as f64);
            // Beside the dot, on the side where neither the edge nor the line at C is met.
            let right_free = x + 9.0 + wide <= pen.w && !(line > x + 2.0 && line < x + 13.0 + wide);
            let left_fits = x - 9.0 - wide >= 0.0;
            let (at, side) = if right_free || !left_fits {
                (x + 9.0, At::Left)
            } else {
                (x - 9.0, At::Right)
            };
            let from = if side == At::Left {
                at - 2.0
            } else {
                at - wide - 2.0
            };
            pen.rect((from, y - 7.0), (from + wide + 4.0, y + 7.0), inks.plate)?;
            pen.word(&said, (at, y), Word::new(TICK, inks.slate).at(side))?;
            if *keep > 0 {
                pen.dot((x, y), 4.0, inks.ink)?;
            } else {
                pen.ring((x, y), 4.0, inks.line, 1.5, inks.plate)?;
            }
        }
        Ok(())
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let (low, _) = range(&self.db).unwrap_or((-10.0, 0.0));
        let low = (low / 10.0).floor() * 10.0;
        frame(
            width,
            TOP,
            height - 4.0 - self.guides_height(),
            self.rank,
            Axis::linear(low.min(-10.0) - 2.0, 1.0),
        )
    }
}

impl Plot for Eigenvalues {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let inks = pen.inks;
        kept_ground(pen, &frame, self.kept)?;
        let caption = text::fit(
            "Variance of each dimension, dB below the largest",
            TICK,
            pen.w - 8.0,
        );
        pen.word(&caption, (4.0, 9.0), Word::new(TICK, inks.slate))?;
        let ticks = frame.y.ticks(5);
        frame.y_grid(pen, &ticks, &axis::labels(&ticks))?;
        let pitch = (frame.right - frame.left) / (frame.x.high - 1.0);
        let r = (pitch * 0.3).clamp(1.2, 3.5);
        for (i, db) in self.db.iter().enumerate() {
            let (x, y) = (frame.px(i as f64 + 1.0), frame.py_inside(*db));
            if !y.is_finite() {
                continue;
            }
            if i < self.kept {
                pen.down(
                    x,
                    y,
                    frame.bottom,
                    inks.line,
                    if pitch > 5.0 { 1.5 } else { 1.0 },
                )?;
                pen.dot((x, y), r, inks.ink)?;
            } else {
                if pitch > 5.0 {
                    pen.dashed_rule((x, y + r), (x, frame.bottom), inks.line, (2.0, 3.0))?;
                }
                pen.ring((x, y), r, inks.line, 1.2, inks.plate)?;
            }
        }
        self.rules(pen, &frame)?;
        let x = frame.px(self.kept as f64);
        pen.down(x, frame.top - 20.0, pen.h, inks.ink, 1.5)?;
        let keep = format!("keep {}", self.kept);
        let share = text::number(100.0 * self.share, 1);
        let share = format!("{share} % of the variance");
        beside_line(pen, &frame, self.kept, &keep, &share)
    }

    fn height(&self, _width: u32) -> u32 {
        156 + self.guides_height() as u32
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let mut table = Table::new(&["dimension", "variance", "dB_below_largest", "kept"]);
        for (i, (variance, db)) in self.variance.iter().zip(&self.db).enumerate() {
            let kept = if i < self.kept { "yes" } else { "no" };
            table.row([
                (i + 1).to_string(),
                cell(*variance),
                cell(*db),
                kept.to_owned(),
            ]);
        }
        table
    }

    fn spoken(&self) -> String {
        let rules: Vec<String> = self
            .guides
            .iter()
            .map(|(words, keep)| format!("{words} {keep}"))
            .collect();
        let rules = match rules.is_empty() {
            true => String::new(),
            false => format!(" Rules: {}.", rules.join(", ")),
        };
        format!(
            "Variance of each of {} dimensions; the first {} hold {} % of the variance.{rules}",
            self.rank,
            self.kept,
            text::number(100.0 * self.share, 1)
        )
    }
}
