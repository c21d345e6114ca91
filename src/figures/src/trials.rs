//! Single trials around the event, one row each.
use crate::axis::{self, Axis};
use crate::frame::{Frame, PlotBox, RIGHT};
use crate::inks::step;
use crate::pen::{At, Drawn, Pen, TICK, Word};
use crate::table::Table;
use crate::{Plot, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::{Component, Sheet, TrialImage};

const LEFT: f64 = 42.0;
const TOP: f64 = 4.0;
const FOOT: f64 = 62.0;
/// Rows and columns are merged so that none is thinner than this.
const THIN: f64 = 1.5;
const KEY: f64 = 158.0;

/// See [`crate::Figure::Trials`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Trials {
    /// Centres of the columns.
    pub t_s: Vec<f64>,
    /// Power of each trial in dB of its own reference window; `None` where it is not a number.
    pub db: Vec<Vec<Option<f32>>>,
    /// The colours run from minus this to plus this.
    pub limit_db: f64,
    /// Reference and signal window, where both are tied to this event.
    pub windows: Option<[[f64; 2]; 2]>,
    /// What the rows are sorted by.
    #[serde(default)]
    pub order: Order,
    /// Seconds from each row's event to the event that follows, where it does within the span; empty unless sorted by it.
    #[serde(default)]
    pub lags_s: Vec<Option<f64>>,
    /// Label of the event that follows.
    #[serde(default)]
    pub lag_to: String,
}

/// What single trials are sorted by, from the top.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Order {
    /// Time in the recording.
    #[default]
    Time,
    /// Mean power in the signal window, the least first.
    Power,
    /// Time to the event that follows, the shortest first.
    Lag,
}

impl Trials {
    pub(crate) fn of(sheet: &Sheet, component: &Component, order: Order) -> Option<Self> {
        let image = component.image.as_ref()?;
        if image.t_s.len() < 2 || image.db.is_empty() {
            return None;
        }
        let windows = sheet
            .recipe
            .contrast
            .event_windows()
            .filter(|(signal, reference)| signal.event == reference.event)
            .map(|(signal, reference)| {
                [
                    [reference.from_s, reference.to_s],
                    [signal.from_s, signal.to_s],
                ]
            });
        let mut sizes: Vec<f32> = image
            .db
            .iter()
            .flatten()
            .map(|v| v.abs())
            .filter(|v| v.is_finite())
            .collect();
        sizes.sort_by(f32::total_cmp);
        let high = sizes.get(sizes.len() * 96 / 100).copied().unwrap_or(1.0);
        let round = axis::nice_step(f64::from(high) / 2.0) * 2.0;
        let row = |r: &Vec<f32>| r.iter().map(|v| v.is_finite().then_some(*v)).collect();
        let rows = sorted(sheet, image, order)?;
        let lags = match order {
            Order::Lag => rows.iter().map(|k| image.lags_s[*k]).collect(),
            Order::Time | Order::Power => Vec::new(),
        };
        Some(Trials {
            order,
            lags_s: lags,
            lag_to: image.lag_to.clone(),
            t_s: image.t_s.clone(),
            db: rows.iter().map(|k| row(&image.db[*k])).collect(),
            limit_db: if round > 0.0 { round } else { 1.0 },
            windows,
        })
    }

    fn frame(&self, width: f64, height: f64) -> Frame {
        let half = (self.t_s[1] - self.t_s[0]) / 2.0;
        let last = self.t_s[self.t_s.len() - 1];
        Frame {
            left: LEFT,
            right: width - RIGHT,
            top: TOP,
            bottom: (height - FOOT).max(TOP + 10.0),
            x: Axis::linear(self.t_s[0] - half, last + half),
            y: Axis::falling(self.db.len() as f64 + 0.5, 0.5),
        }
    }

    /// Step of the ramp for each cell of a grid coarse enough to be seen: the mean of what falls into it.
    fn cells(&self, rows: usize, columns: usize) -> Vec<Vec<Option<usize>>> {
        let (n, m) = (self.db.len(), self.t_s.len());
        let part = |i: usize, of: usize, all: usize| {
            (i * all / of)..((i + 1) * all / of).max(i * all / of + 1)
        };
        let cell = |r: usize, c: usize| {
            let inside = part(r, rows, n).flat_map(|t| part(c, columns, m).map(move |k| (t, k)));
            let seen = inside.filter_map(|(t, k)| self.db.get(t)?.get(k).copied().flatten());
            let (sum, count) = seen.fold((0.0, 0usize), |(s, c), v| (s + f64::from(v), c + 1));
            (count > 0).then(|| step(sum / count as f64, self.limit_db))
        };
        (0..rows)
            .map(|r| (0..columns).map(|c| cell(r, c)).collect())
            .collect()
    }

    fn image<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let (w, h) = (frame.right - frame.left, frame.bottom - frame.top);
        let rows = self.db.len().min((h / THIN).max(1.0) as usize);
        let columns = self.t_s.len().min((w / THIN).max(1.0) as usize);
        let x = |c: usize| frame.left + w * c as f64 / columns as f64;
        let y = |r: usize| frame.top + h * r as f64 / rows as f64;
        pen.rect(
            (frame.left, frame.top),
            (frame.right, frame.bottom),
            pen.inks.image[5],
        )?;
        for (r, row) in self.cells(rows, columns).iter().enumerate() {
            let mut from = 0;
            while from < columns {
                let mut to = from + 1;
                while to < columns && row[to] == row[from] {
                    to += 1;
                }
                match row[from] {
                    Some(5) => {}
                    Some(k) => pen.rect((x(from), y(r)), (x(to), y(r + 1)), pen.inks.image[k])?,
                    None => pen.rect((x(from), y(r)), (x(to), y(r + 1)), pen.inks.plate)?,
                }
                from = to;
            }
        }
        pen.frame(
            (frame.left, frame.top),
            (frame.right, frame.bottom),
            pen.inks.line,
        )
    }

    fn key<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let wide = KEY.min(frame.right - frame.left);
        let (left, top) = (frame.right - wide, pen.h - 28.0);
        let x = |i: f64| left + wide * i / 11.0;
        for (i, color) in pen.inks.image.iter().enumerate() {
            pen.rect((x(i as f64), top), (x(i as f64 + 1.0), top + 9.0), *color)?;
        }
        pen.frame((left, top), (frame.right, top + 9.0), pen.inks.line)?;
        let word = Word::new(TICK, pen.inks.slate);
        let size = text::short(self.limit_db);
        let y = top + 19.0;
        pen.word(&format!("−{size}"), (left, y), word)?;
        pen.word("0", ((left + frame.right) / 2.0, y), word.at(At::Middle))?;
        pen.word(&format!("+{size} dB"), (frame.right, y), word.at(At::Right))?;
        let said = "power against each trial’s reference";
        if text::width(said, TICK) < left - frame.left - 8.0 {
            pen.word(said, (left - 10.0, top + 5.0), word.at(At::Right))?;
        }
        Ok(())
    }
}

/// Rows of the image in this order; `None` where there is nothing to sort by.
fn sorted(sheet: &Sheet, image: &TrialImage, order: Order) -> Option<Vec<usize>> {
    let mut rows: Vec<usize> = (0..image.db.len()).collect();
    let by: Vec<f64> = match order {
        Order::Time => return Some(rows),
        Order::Power => {
            let (signal, _) = sheet.recipe.contrast.event_windows()?;
            let inside = |t: &f64| (signal.from_s..signal.to_s).contains(t);
            let mean = |row: &Vec<f32>| {
                let pairs = image.t_s.iter().zip(row);
                let seen = pairs.filter(|(t, v)| inside(t) && v.is_finite());
                let (sum, n) = seen.fold((0.0, 0.0), |(s, n), (_, v)| (s + f64::from(*v), n + 1.0));
                sum / n
            };
            image.db.iter().map(mean).collect()
        }
        Order::Lag => {
            if image.lags_s.len() != image.db.len() {
                return None;
            }
            let lag = |l: &Option<f64>| l.unwrap_or(f64::INFINITY);
            image.lags_s.iter().map(lag).collect()
        }
    };
    rows.sort_by(|a, b| by[*a].total_cmp(&by[*b]));
    Some(rows)
}

impl Plot for Trials {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        if self.t_s.len() < 2 || self.db.is_empty() {
            return Ok(());
        }
        let frame = self.frame(pen.w, pen.h);
        self.image(pen, &frame)?;
        let zero = frame.px(0.0);
        if zero > frame.left && zero < frame.right {
            pen.dashed_rule(
                (zero, frame.top),
                (zero, frame.bottom),
                pen.inks.ink,
                (3.0, 3.0),
            )?;
        }
        let n = self.db.len();
        let high = (frame.bottom - frame.top) / n as f64;
        for (k, lag) in self.lags_s.iter().enumerate() {
            let Some(x) = lag.map(|t| frame.px(t)).filter(|x| *x < frame.right) else {
                continue;
            };
            let y = frame.top + high * k as f64;
            pen.down(x, y, y + high, pen.inks.ink, 1.5)?;
        }
        let word = Word::new(TICK, pen.inks.slate).at(At::Right);
        let row = (frame.bottom - frame.top) / n as f64;
        let mut rows = vec![1, n];
        if n >= 6 && row * n as f64 > 60.0 {
            rows.insert(1, n / 2);
        }
        for r in rows {
            let y = frame.top + row * (r as f64 - 0.5);
            pen.word(
                &text::thousands(r),
                (
                    frame.left - 7.0,
                    y.min(frame.bottom - 6.0).max(frame.top + 6.0),
                ),
                word,
            )?;
        }
        let inks = pen.inks;
        for (window, ink) in self
            .windows
            .iter()
            .flatten()
            .zip([inks.reference, inks.signal])
        {
            let x = window.map(|t| frame.px_inside(t));
            pen.rect((x[0], frame.bottom + 1.0), (x[1], frame.bottom + 5.0), ink)?;
        }
        let below = Frame {
            bottom: frame.bottom + 5.0,
            ..frame
        };
        let ticks = frame
            .x
            .ticks(((frame.right - frame.left) / 76.0).max(2.0) as usize);
        let labels = axis::labels(&ticks);
        below.x_labels(pen, &ticks, &labels, "s")?;
        self.key(pen, &frame)
    }

    fn height(&self, _width: u32) -> u32 {
        let rows = (self.db.len() as f64 * 5.0).clamp(120.0, 186.0);
        (TOP + rows + FOOT) as u32
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        (self.t_s.len() > 1).then(|| self.frame(width, height).plot_box())
    }

    fn table(&self) -> Table {
        let heads: Vec<String> = self.t_s.iter().map(|t| format!("dB_at_{t}_s")).collect();
        let mut columns = vec!["trial"];
        columns.extend(heads.iter().map(String::as_str));
        let mut table = Table::new(&columns);
        for (i, row) in self.db.iter().enumerate() {
            let cells = row
                .iter()
                .map(|v| v.map_or(String::new(), |v| format!("{v}")));
            table.row(std::iter::once((i + 1).to_string()).chain(cells));
        }
        table
    }

    fn spoken(&self) -> String {
        let order = match self.order {
            Order::Time => "of time".to_owned(),
            Order::Power => "of their power in the signal window, the least first".to_owned(),
            Order::Lag => format!("of the time to {}, the shortest first", self.lag_to),
        };
        format!(
            "Power of the component in {} around the event, in order {order}.",
            text::count(self.db.len(), "single trial")
        )
    }
}
