//! The same held-out measure for what one would have used otherwise.
use crate::axis::Axis;
use crate::estimate::{Estimate, shared};
use crate::frame::{Frame, PlotBox};
use crate::pen::{At, Drawn, LABEL, Pen, TICK, Word};
use crate::table::{Table, cell, maybe};
use crate::weights::End;
use crate::{Plot, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::recipe::Measure;
use teasel_core::sheet::{Comparator, ComparatorKind, Sheet};

const ROW: f64 = 42.0;

/// Narrower than this, names stand above their rows instead of left of them.
const STACKED: f64 = 440.0;

const TALL_ROW: f64 = 56.0;

const HEAD: f64 = 28.0;

/// See [`crate::Figure::Beside`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Beside {
    /// The shared axis.
    pub axis: [f64; 2],
    /// Rows from above.
    pub rows: Vec<Rival>,
    /// Measure of the ratios: typical or total.
    pub measure: Measure,
    /// The end that this contrast's own component belongs to.
    pub end: End,
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

impl Beside {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let first = sheet.first()?;
        let end = End::from(sheet.leading);
        if sheet.compare.is_empty() {
            return None;
        }
        let measure = sheet.recipe.measure;
        let mut estimate = Estimate::of(measure, &first.typical, &first.total);
        if measure == Measure::Typical {
            estimate.folds = sheet.folds.iter().map(|f| f.ratio).collect();
        }
        let mut rows = vec![Rival {
            name: match end {
                End::Stronger => "Component 1".to_owned(),
                End::Weaker => "Weaker component 1".to_owned(),
            },
            note: "this contrast".to_owned(),
            estimate,
            own: true,
        }];
        let order = [
            ComparatorKind::BestPc,
            ComparatorKind::BestChannel,
            ComparatorKind::FirstPc,
            ComparatorKind::MeanOfChannels,
            ComparatorKind::RandomDirection,
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
            end,
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
        let wide = if row.own {
            text::bold_width
        } else {
            text::width
        };
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
        ComparatorKind::MeanOfChannels => ("Mean of all channels", String::new()),
        ComparatorKind::RandomDirection => ("Random direction", "in the kept space".to_owned()),
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
            let side = row.own.then_some(self.end);
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
