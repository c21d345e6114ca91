//! Contrast ratios as points with intervals on one shared axis.
use crate::axis::{Axis, Frame, PlotBox};
use crate::pen::{At, Drawn, LABEL, Pen, TICK, Word};
use crate::table::{Table, cell, maybe};
use crate::weights::End;
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::recipe::Measure;
use teasel_core::sheet::{Comparator, ComparatorKind, Component, Sheet, TotalRatio, TypicalRatio};

/// A held-out ratio.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Estimate {
    /// The ratio, where it is not withheld.
    pub ratio: Option<f64>,
    /// 95 % interval.
    pub interval: Option<[f64; 2]>,
    /// Each fold's ratio.
    #[serde(with = "nan")]
    pub folds: Vec<f64>,
}

impl Estimate {
    fn of(measure: Measure, typical: &TypicalRatio, total: &TotalRatio) -> Self {
        let good = |v: f64| v.is_finite() && v > 0.0;
        match measure {
            Measure::Typical => Estimate {
                ratio: typical.held_out.filter(|v| good(*v)),
                interval: typical.interval.filter(|i| i.iter().all(|v| good(*v))),
                folds: Vec::new(),
            },
            Measure::Total => Estimate {
                ratio: total.held_out.filter(|v| good(*v)),
                interval: None,
                folds: total.folds.clone(),
            },
        }
    }

    fn crosses_one(&self) -> bool {
        self.interval
            .is_some_and(|[low, high]| low <= 1.0 && high >= 1.0)
    }

    fn ends(&self) -> impl Iterator<Item = f64> + '_ {
        self.ratio
            .into_iter()
            .chain(self.interval.into_iter().flatten())
    }

    fn spoken(&self) -> String {
        let interval = self.interval.map_or(String::new(), |[a, b]| {
            format!(", interval {}–{}", text::number(a, 2), text::number(b, 2))
        });
        match self.ratio {
            Some(ratio) => format!("held-out ratio {}{interval}", text::factor(ratio)),
            None => "held-out ratio withheld".to_owned(),
        }
    }

    fn draw<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        y: f64,
        side: Option<End>,
        hollow: bool,
    ) -> Drawn<DB> {
        let inks = pen.inks;
        let ink = side.map_or(inks.ink, |end| end.ink(&inks));
        let Some(ratio) = self.ratio else {
            return Ok(());
        };
        let x = |v: f64| frame.px_inside(v);
        if let Some([low, high]) = self.interval {
            let line = if hollow { inks.line } else { ink };
            pen.across(x(low), x(high), y, line, 2.0)?;
        }
        if hollow {
            pen.ring((x(ratio), y), 4.5, inks.ink, 1.8, inks.plate)
        } else {
            pen.dot((x(ratio), y), 5.0, ink)
        }
    }

    fn ticks<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame, y: f64) -> Drawn<DB> {
        for fold in self.folds.iter().filter(|f| f.is_finite() && **f > 0.0) {
            let x = frame.px_inside(*fold);
            pen.down(x, y, y + 6.0, pen.inks.slate, 1.0)?;
        }
        Ok(())
    }
}

/// ¼ to 4, and further by equal factors at both ends where a ratio or an interval asks for it.
fn shared(values: impl Iterator<Item = f64>) -> [f64; 2] {
    let far = values
        .map(|v| v.ln().abs())
        .filter(|v| v.is_finite())
        .fold(0.0, f64::max);
    let doublings = (far / std::f64::consts::LN_2 - 1e-9).ceil().clamp(2.0, 8.0);
    [(-doublings).exp2(), doublings.exp2()]
}

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

/// See [`crate::Figure::Beside`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Beside {
    /// The shared axis.
    pub axis: [f64; 2],
    /// Rows from above.
    pub rows: Vec<Rival>,
    /// Measure of the ratios: typical or total.
    pub measure: Measure,
}

/// One row.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Rival {
    /// What it is.
    pub name: String,
    /// What was chosen, and how often.
    pub note: String,
    /// Its held-out ratio.
    pub estimate: Estimate,
    /// This contrast's own component.
    pub own: bool,
}

const ROW: f64 = 42.0;
/// Narrower than this, names stand above their rows instead of left of them.
const STACKED: f64 = 440.0;
const TALL_ROW: f64 = 56.0;
const HEAD: f64 = 28.0;

impl Beside {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let first = sheet.stronger.first()?;
        if sheet.compare.is_empty() {
            return None;
        }
        let measure = sheet.recipe.measure;
        let mut estimate = Estimate::of(measure, &first.typical, &first.total);
        if measure == Measure::Typical {
            estimate.folds = sheet.folds.iter().map(|f| f.ratio).collect();
        }
        let mut rows = vec![Rival {
            name: "Component 1".to_owned(),
            note: "this contrast".to_owned(),
            estimate,
            own: true,
        }];
        let order = [
            ComparatorKind::BestPc,
            ComparatorKind::BestChannel,
            ComparatorKind::FirstPc,
        ];
        for kind in order {
            let found = sheet.compare.iter().find(|c| c.kind == kind);
            rows.extend(found.map(|c| rival(c, measure, sheet.folds.len())));
        }
        let ends: Vec<f64> = rows
            .iter()
            .flat_map(|r| r.estimate.ends().collect::<Vec<_>>())
            .collect();
        let (low, high) = crate::axis::range(&ends).unwrap_or((0.5, 4.0));
        let [least, most] = shared([low, high].into_iter());
        Some(Beside {
            axis: [
                least.max((low.log2().floor()).exp2().min(0.5)),
                most.min(high.log2().ceil().exp2().max(4.0)),
            ],
            rows,
            measure,
        })
    }

    fn row(width: f64) -> f64 {
        if width < STACKED { TALL_ROW } else { ROW }
    }

    fn frame(&self, width: f64) -> Frame {
        let left = if width < STACKED {
            16.0
        } else {
            (width * 0.36).clamp(112.0, 184.0)
        };
        Frame {
            left,
            right: (width - 92.0).max(left + 10.0),
            top: HEAD,
            bottom: HEAD + Self::row(width) * self.rows.len() as f64,
            x: Axis::log(self.axis[0], self.axis[1]),
            y: Axis::falling(self.rows.len() as f64, 0.0),
        }
    }

    /// What a row is: left of it, or in one line above it.
    fn title<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        row: &Rival,
        y: f64,
    ) -> Drawn<DB> {
        let slate = Word::new(TICK, pen.inks.slate);
        let name = Word::new(LABEL, pen.inks.ink);
        let name = if row.own { name.bold() } else { name };
        if pen.w >= STACKED {
            let room = frame.left - 12.0;
            pen.name(&row.name, (0.0, y - 8.0), room, name)?;
            return pen.name(&row.note, (0.0, y + 8.0), room, slate);
        }
        let wide = if row.own { text::bold_width } else { text::width };
        let wide = wide(&row.name, LABEL) + 8.0;
        pen.word(&row.name, (0.0, y - 26.0), name)?;
        pen.name(&row.note, (wide, y - 26.0), pen.w - wide, slate)
    }

    /// The grid, broken by names that stand above their rows.
    fn grid<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame, tick: f64) -> Drawn<DB> {
        let (x, tall) = (frame.px(tick), Self::row(pen.w));
        let own = (tick - 1.0).abs() < 1e-9;
        let ink = if own { pen.inks.line } else { pen.inks.rule };
        for i in 0..self.rows.len() {
            let end = frame.top + tall * (i as f64 + 1.0);
            let high = if tall > ROW { tall - 20.0 } else { tall };
            pen.down(x, end - high, end, ink, 1.0)?;
        }
        let word = Word::new(TICK, pen.inks.slate).at(At::Middle);
        pen.word(&text::ratio_tick(tick), (x, frame.bottom + 14.0), word)
    }
}

fn rival(c: &Comparator, measure: Measure, folds: usize) -> Rival {
    let chosen = text::clean(c.chosen.as_deref().unwrap_or(""));
    let times = c.chosen_in_folds.map_or(String::new(), |n| {
        if folds > 0 {
            format!(" in {n} of {folds} folds")
        } else {
            format!(" in {n} folds")
        }
    });
    let (name, note) = match c.kind {
        ComparatorKind::FirstPc => {
            let share = c
                .share
                .map(|s| format!("{} % of the variance", text::number(100.0 * s, 0)));
            ("First principal component", share.unwrap_or_default())
        }
        ComparatorKind::BestPc => ("Best principal component", format!("no. {chosen}{times}")),
        ComparatorKind::BestChannel => (
            "Best channel",
            format!("{}{times}", text::fit(&chosen, TICK, 70.0)),
        ),
    };
    Rival {
        name: name.to_owned(),
        note,
        estimate: Estimate::of(measure, &c.typical, &c.total),
        own: false,
    }
}

impl Plot for Beside {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w);
        let inks = pen.inks;
        let slate = Word::new(TICK, inks.slate);
        let ticks = frame
            .x
            .ratio_ticks(((frame.right - frame.left) / 42.0).clamp(2.0, 7.0) as usize);
        let one = frame.px(1.0);
        for tick in &ticks {
            self.grid(pen, &frame, *tick)?;
        }
        let stronger = if pen.w - one > 140.0 {
            "stronger in signal"
        } else {
            "stronger"
        };
        pen.word("weaker", (one - 6.0, frame.top - 12.0), slate.at(At::Right))?;
        pen.word(stronger, (one + 6.0, frame.top - 12.0), slate)?;
        for (i, row) in self.rows.iter().enumerate() {
            let tall = Self::row(pen.w);
            let y = frame.top + tall * (i as f64 + 0.5) + if tall > ROW { 10.0 } else { 0.0 };
            self.title(pen, &frame, row, y)?;
            let name = Word::new(LABEL, inks.ink);
            let name = if row.own { name.bold() } else { name };
            let side = row.own.then_some(End::Stronger);
            row.estimate.draw(pen, &frame, y, side, !row.own)?;
            row.estimate.ticks(pen, &frame, y + 9.0)?;
            let at = pen.w - 2.0;
            let said = row
                .estimate
                .ratio
                .map_or("withheld".to_owned(), text::factor);
            pen.word(&said, (at, y - 8.0), name.at(At::Right))?;
            if let Some([low, high]) = row.estimate.interval {
                let said = format!("{}–{}", text::number(low, 2), text::number(high, 2));
                pen.word(&said, (at, y + 8.0), slate.at(At::Right))?;
            }
        }
        Ok(())
    }

    fn height(&self, width: u32) -> u32 {
        (HEAD + Self::row(f64::from(width)) * self.rows.len() as f64 + 26.0) as u32
    }

    fn plot_box(&self, width: f64, _height: f64) -> Option<PlotBox> {
        Some(self.frame(width).plot_box())
    }

    fn table(&self) -> Table {
        let mut table = Table::new(&[
            "what",
            "chosen",
            "held_out_ratio",
            "low_95",
            "high_95",
            "folds",
        ]);
        for r in &self.rows {
            let e = &r.estimate;
            let folds: Vec<String> = e.folds.iter().map(|f| cell(*f)).collect();
            let interval = e.interval.map(|i| i.map(Some)).unwrap_or([None; 2]);
            table.row([
                r.name.clone(),
                text::clean(&r.note),
                maybe(e.ratio),
                maybe(interval[0]),
                maybe(interval[1]),
                folds.join(" "),
            ]);
        }
        table
    }

    fn spoken(&self) -> String {
        let rows: Vec<String> = self
            .rows
            .iter()
            .map(|r| format!("{}: {}", r.name, r.estimate.spoken()))
            .collect();
        format!("{}.", rows.join("; "))
    }
}
