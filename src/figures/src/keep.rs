//! The fitted and the held-out ratio against the number of kept dimensions.
use crate::axis::{Axis, range};
use crate::frame::{Frame, PlotBox};
use crate::inks::mix;
use crate::kept::{TOP, beside_line, frame, kept_ground};
use crate::pen::{At, Drawn, Pen, TICK, Word};
use crate::table::{Table, cell};
use crate::weights::End;
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::Sheet;

/// Room left of C = 1, so that the hatching over it does not touch the labels.
const FIRST: f64 = 7.0;

/// See [`crate::Figure::Keep`]. To follow C while it is moved, change `kept` and draw again.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Keep {
    /// Values of C.
    pub keep: Vec<usize>,
    /// Fitted ratio at each.
    #[serde(with = "nan")]
    pub fitted: Vec<f64>,
    /// Held-out ratio at each.
    #[serde(with = "nan")]
    pub held_out: Vec<f64>,
    /// Standard error of the log held-out ratio at each.
    #[serde(with = "nan")]
    pub log_se: Vec<f64>,
    /// C in force.
    pub kept: usize,
    /// Largest C.
    pub rank: usize,
    /// The end whose first component it is.
    pub end: End,
}

impl Keep {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let curve = sheet.curve.as_ref().filter(|c| !c.keep.is_empty())?;
        let card = sheet.compression.as_ref()?;
        Some(Keep {
            keep: curve.keep.clone(),
            fitted: curve.fitted.clone(),
            held_out: curve.held_out.clone(),
            log_se: curve.log_se.clone(),
            kept: card.kept,
            rank: card.rank,
            end: sheet.leading.into(),
        })
    }

    fn edge(&self, sign: f64) -> Vec<f64> {
        let pairs = self.held_out.iter().zip(&self.log_se);
        pairs.map(|(ratio, se)| ratio * (sign * se).exp()).collect()
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let (low, high) = (self.edge(-1.0), self.edge(1.0));
        let all = low
            .iter()
            .chain(&high)
            .chain(&self.held_out)
            .chain(&self.fitted);
        let (low, high) = range(all.filter(|v| **v > 0.0)).unwrap_or((0.5, 2.0));
        let y = Axis::log(low.min(0.8) / 1.06, high.max(1.1) * 1.08);
        frame(width, TOP, height - 24.0, self.rank, y)
    }

    fn at_kept(&self) -> Option<f64> {
        let i = self.keep.iter().position(|c| *c == self.kept)?;
        self.held_out.get(i).copied().filter(|v| v.is_finite())
    }
}

impl Plot for Keep {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let inks = pen.inks;
        let slate = Word::new(TICK, inks.slate);
        kept_ground(pen, &frame, self.kept)?;
        let said = [
            &format!(
                "Ratio of {}: held-out with ± one standard error, fitted thin",
                self.end.first()
            ),
            "Ratio, held-out ± one standard error; fitted thin",
            "Held-out ratio (fitted thin)",
        ];
        pen.word(text::first(&said, TICK, pen.w - 8.0), (4.0, 9.0), slate)?;
        pen.hatch(
            (frame.left - FIRST, frame.top),
            (frame.left + FIRST, frame.bottom),
            inks.rule,
        )?;
        let ticks = frame.y.ratio_ticks(6);
        let labels: Vec<String> = ticks.iter().map(|t| text::ratio_tick(*t)).collect();
        frame.y_grid(pen, &ticks, &labels)?;
        let one = frame.py(1.0);
        pen.dashed_rule((frame.left, one), (frame.right, one), inks.line, (2.0, 3.0))?;
        pen.word(
            "1× = no difference",
            (
                frame.right,
                if frame.bottom - one > 19.0 && self.held_out.last().is_none_or(|x| *x >= 1.0) {
                    one + 9.0
                } else {
                    one - 9.0
                },
            ),
            slate.at(At::Right),
        )?;
        let c: Vec<f64> = self.keep.iter().map(|c| *c as f64).collect();
        let band = (
            frame.points(&c, &self.edge(-1.0)),
            frame.points(&c, &self.edge(1.0)),
        );
        pen.band(&band.0, &band.1, inks.band())?;
        pen.path(
            &frame.points(&c, &self.fitted),
            mix(inks.slate, inks.plate, 0.85),
            1.0,
        )?;
        let held = frame.points(&c, &self.held_out);
        pen.path(&held, inks.ink, 2.0)?;
        let pitch = (frame.right - frame.left) / (frame.x.high - 1.0);
        if pitch > 7.0 {
            for (at, c) in held.iter().zip(&self.keep) {
                if *c <= self.kept {
                    pen.dot(*at, 2.4, inks.ink)?;
                } else {
                    pen.ring(*at, 2.4, inks.ink, 1.2, inks.plate)?;
                }
            }
        }
        let x = frame.px(self.kept as f64);
        pen.down(x, frame.top - 20.0, frame.bottom + 24.0, inks.ink, 1.5)?;
        if let Some(ratio) = self.at_kept() {
            pen.dot((x, frame.py_inside(ratio)), 4.5, inks.ink)?;
            let said = format!("{} at C = {}", text::factor(ratio), self.kept);
            beside_line(pen, &frame, self.kept, &said, "")?;
        }
        let most = ((frame.right - frame.left) / 60.0).max(2.0) as usize;
        let mut ticks: Vec<f64> = frame
            .x
            .ticks(most)
            .into_iter()
            .filter(|t| t.fract() == 0.0 && *t > 0.0)
            .collect();
        if ticks.first().is_none_or(|t| *t > 1.0) {
            ticks.insert(0, 1.0);
        }
        pen.word("kept", (4.0, frame.bottom + 14.0), slate)?;
        let labels: Vec<String> = ticks.iter().map(|t| text::number(*t, 0)).collect();
        frame.x_axis_but(pen, &ticks, &labels, "", &[x])
    }

    fn height(&self, _width: u32) -> u32 {
        206
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let mut table = Table::new(&[
            "kept",
            "fitted_ratio",
            "held_out_ratio",
            "standard_error_of_log",
        ]);
        let value = |v: &[f64], i: usize| v.get(i).map_or(String::new(), |x| cell(*x));
        for (i, c) in self.keep.iter().enumerate() {
            table.row([
                c.to_string(),
                value(&self.fitted, i),
                value(&self.held_out, i),
                value(&self.log_se, i),
            ]);
        }
        table
    }

    fn spoken(&self) -> String {
        let now = self.at_kept().map_or(String::new(), |r| {
            format!(", {} at C = {}", text::factor(r), self.kept)
        });
        format!(
            "Held-out and fitted ratio of {} against the number of dimensions kept{now}.",
            self.end.first()
        )
    }
}
