//! A few seconds of channels, one above the other.
mod lines;
mod make;

pub use make::traces;

use crate::axis::Axis;
use crate::frame::{Frame, LEFT, PlotBox, RIGHT};
use crate::pen::{Drawn, Pen};
use crate::table::{Table, cell};
use crate::{Plot, axis, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};

const TOP: f64 = 24.0;
const FOOT: f64 = 26.0;

/// See [`crate::Figure::Traces`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Traces {
    /// Left edge on the file's clock.
    pub from_s: f64,
    /// Length shown.
    pub seconds: f64,
    /// Times of the values of every channel; not a number where the line breaks at a gap.
    #[serde(with = "nan")]
    pub t_s: Vec<f64>,
    /// The channels, from above.
    pub lines: Vec<Line>,
    /// Events inside: onset and label.
    pub events: Vec<(f64, String)>,
    /// Gaps inside.
    pub gaps: Vec<[f64; 2]>,
}

/// One channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Line {
    /// Label.
    pub name: String,
    /// Unit of `values`.
    pub unit: String,
    /// About the median of what is shown.
    #[serde(with = "nan")]
    pub values: Vec<f64>,
    /// Drawn faintly, as one that is left out.
    #[serde(default)]
    pub faint: bool,
}

/// Rows of room above the first line: frontal channels stand first in most montages, and blinks are tall.
const HEADROOM: f64 = 1.5;

impl Traces {
    fn frame(&self, width: f64, height: f64) -> Frame {
        Frame {
            left: LEFT,
            right: width - RIGHT,
            top: TOP,
            bottom: (height - FOOT).max(TOP + 1.0),
            x: Axis::linear(self.from_s, self.from_s + self.seconds),
            y: Axis::falling(self.lines.len().max(1) as f64 - 0.5, -0.5),
        }
    }
}

impl Plot for Traces {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let row = (frame.bottom - frame.top) / (self.lines.len().max(1) as f64 + HEADROOM);
        for gap in &self.gaps {
            let (x0, x1) = (frame.px(gap[0]), frame.px(gap[1]));
            pen.hatch((x0, frame.top), (x1, frame.bottom), pen.inks.line)?;
        }
        self.events(pen, &frame, row)?;
        self.lines(pen, &frame, row)?;
        self.bars(pen, &frame, row)?;
        let most = ((frame.right - frame.left) / 90.0).max(2.0) as usize;
        let ticks = frame.x.ticks(most);
        let whole = self.seconds > 4.0;
        let labels = if whole {
            ticks.iter().map(|t| text::clock(*t, false)).collect()
        } else {
            axis::labels(&ticks)
        };
        frame.x_axis(pen, &ticks, &labels, if whole { "" } else { "s" })
    }

    fn height(&self, _width: u32) -> u32 {
        let n = self.lines.len().max(1) as f64;
        let row = (400.0 / n).clamp(12.0, 29.0);
        (TOP + FOOT + (row * (n + HEADROOM)).min(720.0)) as u32
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let heads: Vec<String> = self
            .lines
            .iter()
            .map(|l| format!("{} {}", l.name, l.unit))
            .collect();
        let mut columns = vec!["time_s"];
        columns.extend(heads.iter().map(String::as_str));
        let mut table = Table::new(&columns);
        for (i, t) in self.t_s.iter().enumerate().filter(|(_, t)| t.is_finite()) {
            let values = self
                .lines
                .iter()
                .map(|l| l.values.get(i).map_or(String::new(), |v| cell(*v)));
            table.row(std::iter::once(cell(*t)).chain(values));
        }
        table
    }

    fn spoken(&self) -> String {
        format!(
            "{} over {} seconds from {}.",
            text::count(self.lines.len(), "channel"),
            text::short(self.seconds),
            text::clock(self.from_s, false),
        )
    }
}
