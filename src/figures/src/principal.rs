//! The first dimensions of the compression: where each is large and small, and its course over the recording. They have no side, so no hue.
use crate::frame::RIGHT;
use crate::head::{NOSE, outline};
use crate::pen::{At, Drawn, LABEL, Pen, SMALL, TICK, Word};
use crate::table::{Table, cell};
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::describe::positions::flat;
use teasel_core::sheet::Sheet;

const ROW: f64 = 92.0;
const TOP: f64 = 22.0;
const FOOT: f64 = 20.0;
/// Width of the column of heads.
const HEADS: f64 = 104.0;

/// See [`crate::Figure::Principal`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Principal {
    /// Names of the prepared channels.
    pub names: Vec<String>,
    /// Their places on the flat head; empty where fewer than four in five are known.
    pub places: Vec<Option<[f64; 2]>>,
    /// Unit of the patterns.
    pub unit: String,
    /// The dimensions, largest first.
    pub rows: Vec<Row>,
    /// Length of the recording.
    pub seconds: f64,
}

/// One dimension.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Row {
    /// Share of the variance.
    pub share: f64,
    /// Pattern of one standard deviation.
    #[serde(with = "nan")]
    pub pattern: Vec<f64>,
    /// Smallest value of each bin of time.
    #[serde(with = "nan")]
    pub low: Vec<f64>,
    /// Largest value of each bin.
    #[serde(with = "nan")]
    pub high: Vec<f64>,
}

impl Principal {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let names = sheet.preparation.as_ref()?.channels.clone();
        let card = |name: &String| sheet.channels.iter().find(|c| c.name == *name);
        let places: Vec<Option<[f64; 2]>> = names
            .iter()
            .map(|n| Some(flat(card(n)?.position?)))
            .collect();
        let known = places.iter().flatten().count();
        let wide = |v: &[f32]| v.iter().map(|x| f64::from(*x)).collect();
        let rows: Vec<Row> = sheet
            .principal
            .iter()
            .filter(|p| p.pattern.len() == names.len())
            .map(|p| Row {
                share: p.share,
                pattern: p.pattern.clone(),
                low: wide(&p.low),
                high: wide(&p.high),
            })
            .collect();
        (!rows.is_empty()).then(|| Principal {
            unit: names
                .first()
                .and_then(card)
                .map_or(String::new(), |c| c.unit.clone()),
            places: if known * 5 >= names.len() * 4 {
                places
            } else {
                Vec::new()
            },
            names,
            rows,
            seconds: sheet.recording.duration_s,
        })
    }

    fn left(&self) -> f64 {
        if self.places.is_empty() {
            150.0
        } else {
            150.0 + HEADS
        }
    }

    /// Filled where positive, a ring where negative, its area the size.
    fn head<DB: DrawingBackend>(&self, pen: &Pen<DB>, row: &Row, top: f64) -> Drawn<DB> {
        let radius = (ROW - 14.0) / (2.0 + NOSE);
        let centre = (150.0 + HEADS / 2.0 - 8.0, top + 4.0 + radius * (1.0 + NOSE));
        outline(pen, centre, radius, pen.inks.line, 1.0)?;
        let far = self.places.iter().flatten();
        let far = far.map(|p| p[0].hypot(p[1])).fold(1.0, f64::max) + 0.08;
        let largest = row.pattern.iter().fold(0.0_f64, |m, x| m.max(x.abs()));
        for (place, value) in self.places.iter().zip(&row.pattern) {
            let Some([x, y]) = place else { continue };
            let at = (centre.0 + x / far * radius, centre.1 - y / far * radius);
            let r = 5.0 * (value.abs() / largest).sqrt();
            if r < 0.8 {
                continue;
            }
            if *value > 0.0 {
                pen.dot(at, r, pen.inks.ink)?;
            } else {
                pen.ring(at, r.max(1.4), pen.inks.slate, 1.2, pen.inks.plate)?;
            }
        }
        Ok(())
    }

    fn words<DB: DrawingBackend>(&self, pen: &Pen<DB>, i: usize, row: &Row, top: f64) -> Drawn<DB> {
        let middle = top + ROW / 2.0;
        let word = Word::new(LABEL, pen.inks.ink);
        pen.word(&(i + 1).to_string(), (4.0, middle), word.bold())?;
        let share = format!("{} %", text::number(100.0 * row.share, 1));
        pen.word(&share, (28.0, middle - 8.0), word)?;
        let most = (0..row.pattern.len())
            .max_by(|a, b| row.pattern[*a].abs().total_cmp(&row.pattern[*b].abs()));
        let Some(most) = most else { return Ok(()) };
        let size = format!("±{} {}", text::short(row.pattern[most]), self.unit);
        let said = text::fit(
            &format!("{}, {}", self.names[most], text::clean(&size)),
            SMALL,
            112.0,
        );
        pen.word(
            &said,
            (28.0, middle + 8.0),
            Word::new(SMALL, pen.inks.slate),
        )
    }

    fn course<DB: DrawingBackend>(&self, pen: &Pen<DB>, row: &Row, top: f64) -> Drawn<DB> {
        let (left, right) = (self.left(), pen.w - RIGHT);
        let middle = top + ROW / 2.0;
        let most = row
            .low
            .iter()
            .chain(&row.high)
            .fold(1.0_f64, |m, x| m.max(x.abs()));
        let n = row.low.len().max(1) as f64;
        let y = |v: f64| middle - v / most * (ROW / 2.0 - 8.0);
        let x = |i: usize| left + (i as f64 + 0.5) / n * (right - left);
        pen.across(left, right, middle, pen.inks.rule, 1.0)?;
        let side = |v: &[f64]| -> Vec<(f64, f64)> {
            v.iter().enumerate().map(|(i, v)| (x(i), y(*v))).collect()
        };
        pen.band(&side(&row.low), &side(&row.high), pen.inks.area())?;
        let said = format!("±{} SD", text::short(most));
        let word = Word::new(SMALL, pen.inks.slate).at(At::Right);
        pen.word(&said, (right, top + 10.0), word)
    }
}

impl Plot for Principal {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let slate = Word::new(TICK, pen.inks.slate);
        pen.word("share; largest at", (28.0, 9.0), slate)?;
        if !self.places.is_empty() {
            pen.word("+ filled, − ring", (150.0, 9.0), slate)?;
        }
        let said = [
            "Course over the prepared recording, smallest to largest value of each bin",
            "Course over the recording",
        ];
        let room = pen.w - RIGHT - self.left() - 8.0;
        pen.word(text::first(&said, TICK, room), (self.left(), 9.0), slate)?;
        for (i, row) in self.rows.iter().enumerate() {
            let top = TOP + i as f64 * ROW;
            pen.across(0.0, pen.w, top, pen.inks.rule, 1.0)?;
            self.words(pen, i, row, top)?;
            if !self.places.is_empty() {
                self.head(pen, row, top)?;
            }
            self.course(pen, row, top)?;
        }
        let bottom = TOP + self.rows.len() as f64 * ROW;
        pen.across(0.0, pen.w, bottom, pen.inks.rule, 1.0)?;
        let long = self.seconds >= 3600.0;
        pen.word(&text::clock(0.0, long), (self.left(), bottom + 11.0), slate)?;
        let end = text::clock(self.seconds, long);
        pen.word(&end, (pen.w - RIGHT, bottom + 11.0), slate.at(At::Right))
    }

    fn height(&self, _width: u32) -> u32 {
        (TOP + ROW * self.rows.len() as f64 + FOOT) as u32
    }

    fn table(&self) -> Table {
        let mut columns = vec!["channel".to_owned()];
        columns.extend((1..=self.rows.len()).map(|i| format!("dimension_{i}")));
        let columns: Vec<&str> = columns.iter().map(String::as_str).collect();
        let mut table = Table::new(&columns);
        for (c, name) in self.names.iter().enumerate() {
            let values = self.rows.iter().map(|r| cell(r.pattern[c]));
            table.row(std::iter::once(text::clean(name)).chain(values));
        }
        table
    }

    fn spoken(&self) -> String {
        let shares: Vec<String> = self
            .rows
            .iter()
            .map(|r| format!("{} %", text::number(100.0 * r.share, 1)))
            .collect();
        format!(
            "The {} largest dimensions, which need not be the most relevant: {} of the variance.",
            self.rows.len(),
            shares.join(", ")
        )
    }
}
