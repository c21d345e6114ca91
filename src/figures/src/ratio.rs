//! One contrast ratio on the axis that all rows share, and that axis.
use crate::axis::Axis;
use crate::estimate::{Estimate, shared};
use crate::frame::{Frame, PlotBox};
use crate::pen::{At, Drawn, Pen, TICK, Word};
use crate::table::{Table, maybe};
use crate::weights::End;
use crate::{Plot, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::{Component, Sheet};

/// See [`crate::Figure::Ratio`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Row {
    /// The axis that all rows share.
    pub axis: [f64; 2],
    /// The ratio; `None` for the axis itself.
    pub estimate: Option<Estimate>,
    /// The component's end.
    pub end: End,
    /// p > 0.05, or the interval holds 1.
    pub hollow: bool,
}

impl Row {
    fn axis_of(sheet: &Sheet) -> [f64; 2] {
        let all = sheet.stronger.iter().chain(&sheet.weaker);
        let ends = all.flat_map(|c| {
            let estimate = Estimate::of(sheet.recipe.measure, &c.typical, &c.total);
            estimate.ends().collect::<Vec<_>>()
        });
        shared(ends)
    }

    pub(crate) fn of(sheet: &Sheet, component: &Component, end: End) -> Self {
        let estimate = Estimate::of(sheet.recipe.measure, &component.typical, &component.total);
        let fails = match component.p {
            Some(p) => p > 0.05,
            None => estimate.interval.is_none(),
        };
        Row {
            axis: Self::axis_of(sheet),
            hollow: fails || estimate.crosses_one(),
            estimate: Some(estimate),
            end,
        }
    }

    /// The axis that stands above the rows.
    pub(crate) fn head(sheet: &Sheet) -> Option<Self> {
        let any = !sheet.stronger.is_empty() || !sheet.weaker.is_empty();
        any.then(|| Row {
            axis: Self::axis_of(sheet),
            estimate: None,
            end: End::Stronger,
            hollow: false,
        })
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let (top, bottom) = (0.0, height);
        let axis = Axis::log(self.axis[0], self.axis[1]);
        Frame {
            left: 14.0,
            right: width - 18.0,
            top,
            bottom,
            x: axis,
            y: Axis::linear(0.0, 1.0),
        }
    }
}

impl Plot for Row {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let inks = pen.inks;
        let ticks = frame
            .x
            .ratio_ticks(((frame.right - frame.left) / 33.0).clamp(3.0, 5.0) as usize);
        let Some(estimate) = &self.estimate else {
            for (i, tick) in ticks.iter().enumerate() {
                let full = text::ratio_tick(*tick);
                let last = i + 1 == ticks.len();
                let said = if last {
                    full.as_str()
                } else {
                    full.trim_end_matches('×')
                };
                let word = Word::new(TICK, inks.slate).at(At::Middle);
                pen.word(said, (frame.px(*tick), pen.h - 14.0), word)?;
                pen.down(frame.px(*tick), pen.h - 5.0, pen.h, inks.line, 1.0)?;
            }
            return Ok(());
        };
        if estimate.ratio.is_none() {
            let word = Word::new(TICK, inks.slate).at(At::Middle);
            return pen.word("withheld: too few trials", (pen.w / 2.0, pen.h / 2.0), word);
        }
        for tick in &ticks {
            let ink = if (*tick - 1.0).abs() < 1e-9 {
                inks.line
            } else {
                inks.rule
            };
            pen.down(frame.px(*tick), frame.top, frame.bottom, ink, 1.0)?;
        }
        let y = pen.h / 2.0;
        estimate.ticks(pen, &frame, y + 8.0)?;
        estimate.draw(pen, &frame, y, Some(self.end), self.hollow)
    }

    fn height(&self, _width: u32) -> u32 {
        if self.estimate.is_some() { 40 } else { 26 }
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let mut table = Table::new(&["held_out_ratio", "low_95", "high_95"]);
        if let Some(e) = &self.estimate {
            table.row([
                maybe(e.ratio),
                maybe(e.interval.map(|i| i[0])),
                maybe(e.interval.map(|i| i[1])),
            ]);
        }
        table
    }

    fn spoken(&self) -> String {
        match &self.estimate {
            Some(estimate) => format!("{}.", estimate.spoken()),
            None => "Axis of ratios.".to_owned(),
        }
    }
}
