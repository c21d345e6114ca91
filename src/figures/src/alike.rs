//! The permutation test: what the largest ratio is when the two sides are alike.
use crate::axis::{Axis, range};
use crate::frame::{Frame, PlotBox};
use crate::pen::{At, Drawn, LABEL, Pen, TICK, Word};
use crate::table::{Table, cell};
use crate::weights::End;
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::Sheet;

/// Components with a line of their own.
const LINES: usize = 3;
const LEFT: f64 = 8.0;
const TOP: f64 = 26.0;
const STEP: f64 = 17.0;
const FOOT: f64 = 24.0;

/// See [`crate::Figure::Alike`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Alike {
    /// Stronger: the largest ratio of each arrangement; weaker: the smallest.
    pub end: End,
    /// The statistic of each arrangement, as a factor.
    #[serde(with = "nan")]
    pub null: Vec<f64>,
    /// The observed statistic of each component.
    #[serde(with = "nan")]
    pub observed: Vec<f64>,
    /// Every arrangement there is was done.
    pub exact: bool,
    /// Arrangements asked for.
    pub asked: usize,
}

/// A component's line and its label.
struct Labelled {
    first: bool,
    x: f64,
    reach: usize,
    said: String,
    wide: f64,
    left: bool,
}

impl Alike {
    pub(crate) fn of(sheet: &Sheet, end: End) -> Option<Self> {
        let test = sheet.permutation.as_ref()?;
        let (null, observed) = match end {
            End::Stronger => (&test.largest, &test.observed_stronger),
            End::Weaker => (&test.smallest, &test.observed_weaker),
        };
        let good = |v: &f64| v.is_finite() && *v > 0.0;
        let null: Vec<f64> = null.iter().copied().filter(good).collect();
        (!null.is_empty() && observed.iter().any(good)).then(|| Alike {
            end,
            null,
            observed: observed.clone(),
            exact: test.exact,
            asked: test.asked,
        })
    }

    /// Arrangements that do at least as well.
    fn reach(&self, observed: f64) -> usize {
        let slack = 1e-9 * observed;
        let as_well = |v: &&f64| match self.end {
            End::Stronger => **v >= observed - slack,
            End::Weaker => **v <= observed + slack,
        };
        self.null.iter().filter(as_well).count()
    }

    fn lines(&self) -> Vec<(usize, f64)> {
        let good = self
            .observed
            .iter()
            .copied()
            .enumerate()
            .filter(|(_, v)| v.is_finite() && *v > 0.0);
        good.take(LINES).collect()
    }

    /// Rows for the lines, so that no label runs across another line: first those whose label stands right of them, from the
    /// left, then the others from the right.
    fn rows(&self, frame: &Frame) -> Vec<Labelled> {
        let line = |(j, observed): (usize, f64)| {
            let reach = self.reach(observed);
            let said = format!("component {}: {}", j + 1, text::thousands(reach));
            let wide = text::bold_width(&said, LABEL);
            let x = frame.px(observed);
            let left = x - 7.0 - wide > 0.0;
            Labelled {
                first: j == 0,
                x,
                reach,
                said,
                wide,
                left,
            }
        };
        let mut rows: Vec<Labelled> = self.lines().into_iter().map(line).collect();
        let order = |l: &Labelled| if l.left { (1, -l.x) } else { (0, l.x) };
        rows.sort_by(|a, b| {
            order(a)
                .0
                .cmp(&order(b).0)
                .then(order(a).1.total_cmp(&order(b).1))
        });
        rows
    }

    fn bins(&self, frame: &Frame) -> Vec<(f64, f64, usize)> {
        let (low, high) = range(&self.null).unwrap_or((1.0, 2.0));
        let (a, b) = (low.ln(), high.ln());
        let most = ((frame.px(high) - frame.px(low)) / 4.0).max(1.0);
        let n = ((self.null.len() as f64).sqrt() * 1.6).clamp(1.0, most.max(1.0)) as usize;
        let step = ((b - a) / n as f64).max(1e-6);
        let mut counts = vec![0usize; n];
        for v in &self.null {
            counts[(((v.ln() - a) / step) as usize).min(n - 1)] += 1;
        }
        let edge = |i: usize| (a + step * i as f64).exp();
        counts
            .iter()
            .enumerate()
            .map(|(i, c)| (edge(i), edge(i + 1), *c))
            .collect()
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let lines: Vec<f64> = self.lines().iter().map(|l| l.1).collect();
        let (low, high) = range(self.null.iter().chain(&lines)).unwrap_or((1.0, 2.0));
        let room = (high / low).max(1.05).powf(0.03);
        Frame {
            left: LEFT,
            right: width - LEFT - 4.0,
            top: TOP + STEP * lines.len() as f64,
            bottom: (height - FOOT).max(TOP + 80.0),
            x: Axis::log(low / room, high * room),
            y: Axis::linear(0.0, 1.0),
        }
    }
}

impl Plot for Alike {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w, pen.h);
        let inks = pen.inks;
        let which = if self.end == End::Stronger {
            "largest"
        } else {
            "smallest"
        };
        let all = text::thousands(self.null.len());
        let full =
            format!("{which} fitted ratio of {all} arrangements; how many reach each component");
        let short = format!("{which} fitted ratio; arrangements that reach it");
        let least = format!("{which} fitted ratio");
        let said = text::first(&[&full, &short, &least], TICK, pen.w - 6.0);
        pen.word(said, (4.0, 9.0), Word::new(TICK, inks.slate))?;
        let bins = self.bins(&frame);
        let tallest = bins.iter().map(|b| b.2).max().unwrap_or(1).max(1) as f64;
        for (from, to, count) in &bins {
            if *count > 0 {
                let top = frame.bottom - (frame.bottom - frame.top - 4.0) * *count as f64 / tallest;
                let (x0, x1) = (frame.px(*from), frame.px(*to));
                let gap = if x1 - x0 > 4.0 { 1.0 } else { 0.0 };
                pen.rect((x0, top), (x1 - gap, frame.bottom), inks.area())?;
            }
        }
        let rows = self.rows(&frame);
        let top = |row: usize| TOP + STEP * row as f64 + 4.0;
        for (row, line) in rows.iter().enumerate() {
            let passes = (line.reach + 1) as f64 / (self.null.len() + 1) as f64 <= 0.05;
            let ink = if passes {
                self.end.ink(&inks)
            } else {
                inks.line
            };
            pen.down(line.x, top(row) - 7.0, frame.bottom, ink, 2.0)?;
        }
        for (row, line) in rows.iter().enumerate() {
            let y = top(row);
            let (at, side, from) = if line.left {
                (line.x - 7.0, At::Right, line.x - 9.0 - line.wide)
            } else {
                (line.x + 7.0, At::Left, line.x + 5.0)
            };
            let to = from + line.wide + 4.0;
            if rows[..row].iter().any(|o| o.x > from && o.x < to) {
                pen.rect((from, y - 7.0), (to, y + 7.0), inks.plate)?;
            }
            let word = Word::new(LABEL, inks.ink).at(side);
            pen.word(
                &line.said,
                (at, y),
                if line.first { word.bold() } else { word },
            )?;
        }
        let ticks = frame
            .x
            .ratio_ticks(((frame.right - frame.left) / 46.0).max(2.0) as usize);
        let labels: Vec<String> = ticks.iter().map(|t| text::ratio_tick(*t)).collect();
        frame.x_axis(pen, &ticks, &labels, "")
    }

    fn height(&self, _width: u32) -> u32 {
        222
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        Some(self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let mut table = Table::new(&["arrangement", "ratio"]);
        for (j, v) in self.observed.iter().enumerate() {
            table.row([format!("observed, component {}", j + 1), cell(*v)]);
        }
        for (i, v) in self.null.iter().enumerate() {
            table.row([(i + 1).to_string(), cell(*v)]);
        }
        table
    }

    fn spoken(&self) -> String {
        let lines = self.lines();
        let said: Vec<String> = lines
            .iter()
            .map(|(j, v)| format!("component {}: {}", j + 1, self.reach(*v)))
            .collect();
        let all = text::count(self.null.len(), "arrangement");
        format!(
            "Of {all}, so many reach the ratio of each component: {}.",
            said.join(", ")
        )
    }
}
