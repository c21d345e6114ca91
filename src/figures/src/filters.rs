//! What the filters let pass: gain against frequency, with the edges of the pass band and the −6 dB points.
use crate::axis::{self, Axis};
use crate::frame::{Frame, LEFT, PlotBox, RIGHT};
use crate::pen::{At, Drawn, Pen, TICK, Word};
use crate::table::Table;
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::{ResponseEdge, Sheet};

/// Nothing below is drawn.
const LOWEST_DB: f64 = -80.0;
const TOP: f64 = 28.0;
const FOOT: f64 = 26.0;

/// See [`crate::Figure::Filters`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Filters {
    /// Frequencies.
    #[serde(with = "nan")]
    pub hz: Vec<f64>,
    /// Gain of all filters in a row.
    #[serde(with = "nan")]
    pub db: Vec<f64>,
    /// Edges of the pass bands.
    pub edges: Vec<ResponseEdge>,
    /// Reach to either side of a sample.
    pub reach_s: f64,
}

impl Filters {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let response = sheet.preparation.as_ref()?.response.as_ref()?;
        Some(Filters {
            hz: response.hz.clone(),
            db: response.db.clone(),
            edges: response.edges.clone(),
            reach_s: response.reach_s,
        })
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let (first, last) = (self.hz.first(), self.hz.last());
        Frame {
            left: LEFT,
            right: width - RIGHT,
            top: TOP,
            bottom: (height - FOOT).max(TOP + 20.0),
            x: Axis::log(
                first.copied().unwrap_or(0.1),
                last.copied().unwrap_or(100.0),
            ),
            y: Axis::linear(LOWEST_DB, 4.0),
        }
    }

    /// Where the words of the −6 dB points stand, from left to right without touching; those of a notch are left out where both would not fit.
    fn halves<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let mut edges: Vec<&ResponseEdge> = self.edges.iter().collect();
        edges.sort_by(|a, b| a.half_hz.total_cmp(&b.half_hz));
        let mut used = frame.left;
        let y = frame.py(-6.0);
        for edge in edges {
            let x = frame.px_inside(edge.half_hz);
            pen.ring((x, y), 3.5, pen.inks.ink, 1.6, pen.inks.plate)?;
            let said = format!("{} Hz", text::short(edge.half_hz));
            let wide = text::width(&said, TICK);
            let rises = edge.half_hz < edge.pass_hz;
            let (from, side, at) = if rises {
                (x - 8.0 - wide, At::Right, x - 8.0)
            } else {
                (x + 8.0, At::Left, x + 8.0)
            };
            if from > used && from + wide < pen.w {
                pen.word(&said, (at, y), Word::new(TICK, pen.inks.ink).at(side))?;
                used = from + wide + 4.0;
            }
        }
        Ok(())
    }
}

impl Plot for Filters {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let inks = pen.inks;
        let caption = format!(
            "Gain, dB; edges of the pass band dotted, transitions shaded; reach ±{} s",
            text::short(self.reach_s)
        );
        let said = [caption.as_str(), "Gain, dB; transitions shaded", "Gain, dB"];
        let slate = Word::new(TICK, inks.slate);
        pen.word(text::first(&said, TICK, pen.w - 8.0), (4.0, 9.0), slate)?;
        for edge in &self.edges {
            let other = 2.0 * edge.half_hz - edge.pass_hz;
            let [from, to] = [edge.pass_hz.min(other), edge.pass_hz.max(other)]
                .map(|hz| frame.px_inside(hz.max(frame.x.low)));
            pen.rect((from, frame.top), (to, frame.bottom), inks.wash)?;
        }
        let ticks = frame.y.ticks(5);
        frame.y_grid(pen, &ticks, &axis::labels(&ticks))?;
        for edge in &self.edges {
            let x = frame.px_inside(edge.pass_hz);
            pen.dashed_rule((x, frame.top), (x, frame.bottom), inks.line, (2.0, 3.0))?;
        }
        pen.path(&frame.points(&self.hz, &self.db), inks.ink, 2.0)?;
        self.halves(pen, &frame)?;
        let most = ((frame.right - frame.left) / 56.0).max(2.0) as usize;
        let ticks = frame.x.size_ticks(most);
        let labels: Vec<String> = ticks.iter().map(|t| text::short(*t)).collect();
        frame.x_axis(pen, &ticks, &labels, "Hz")
    }

    fn height(&self, _width: u32) -> u32 {
        200
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        Table::of(&["frequency_Hz", "gain_dB"], &[&self.hz, &self.db])
    }

    fn spoken(&self) -> String {
        let edges: Vec<String> = self
            .edges
            .iter()
            .map(|e| {
                format!(
                    "pass band edge at {} Hz, half the gain at {} Hz",
                    text::short(e.pass_hz),
                    text::short(e.half_hz)
                )
            })
            .collect();
        format!("Gain of all filters in a row: {}.", edges.join("; "))
    }
}
