//! The largest weights of a filter, and the two ends that components belong to.
use crate::inks::{Inks, Ramp};
use crate::pen::{At, Drawn, Pen, TICK, Word};
use crate::table::{Table, cell};
use crate::{Plot, nan, text};
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::{Component, Sheet};

/// The end that a component belongs to.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum End {
    /// More variance in signal windows.
    Stronger,
    /// Less variance in signal windows.
    Weaker,
}

impl From<teasel_core::sheet::End> for End {
    fn from(end: teasel_core::sheet::End) -> Self {
        match end {
            teasel_core::sheet::End::Stronger => End::Stronger,
            teasel_core::sheet::End::Weaker => End::Weaker,
        }
    }
}

impl End {
    /// What the first component of this end is called.
    pub(crate) fn first(self) -> &'static str {
        match self {
            End::Stronger => "component 1",
            End::Weaker => "weaker component 1",
        }
    }
    pub(crate) fn ink(self, inks: &Inks) -> RGBAColor {
        match self {
            End::Stronger => inks.signal,
            End::Weaker => inks.reference,
        }
    }
    pub(crate) fn ramp(self, inks: &Inks) -> Ramp {
        match self {
            End::Stronger => inks.stronger,
            End::Weaker => inks.weaker,
        }
    }
    pub(crate) fn word(self) -> &'static str {
        match self {
            End::Stronger => "stronger",
            End::Weaker => "weaker",
        }
    }
}

/// Stems drawn.
const SHOWN: usize = 8;
const ROW: f64 = 23.0;
const FOOT: f64 = 28.0;

/// See [`crate::Figure::Weights`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Weights {
    /// The component's end.
    pub end: End,
    /// Names of the prepared channels.
    pub names: Vec<String>,
    /// The filter's weight for each.
    #[serde(with = "nan")]
    pub values: Vec<f64>,
    /// Unit of the weights.
    pub unit: String,
}

impl Weights {
    pub(crate) fn of(sheet: &Sheet, component: &Component, end: End) -> Option<Self> {
        let names = &sheet.preparation.as_ref()?.channels;
        let whole = names.len() == component.filter.len() && !names.is_empty();
        let unit = sheet.channels.first().map_or("", |c| c.unit.as_str());
        whole.then(|| Weights {
            end,
            names: names.clone(),
            values: component.filter.clone(),
            unit: format!("per {unit}"),
        })
    }

    /// Indexes of the largest weights, largest first.
    fn largest(&self) -> Vec<usize> {
        let mut order: Vec<usize> = (0..self.values.len())
            .filter(|i| self.values[*i].is_finite())
            .collect();
        order.sort_by(|a, b| self.values[*b].abs().total_cmp(&self.values[*a].abs()));
        order.truncate(SHOWN);
        order
    }
}

impl Plot for Weights {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let inks = pen.inks;
        let shown = self.largest();
        let limit = shown.first().map_or(0.0, |i| self.values[*i].abs());
        let limit = if limit > 0.0 { limit } else { 1.0 };
        let (left, right) = (48.0, pen.w - 10.0);
        let zero = (left + right) / 2.0;
        let reach = (right - left) / 2.0 - 6.0;
        let row = ((pen.h - FOOT - 16.0) / SHOWN as f64).min(ROW);
        let bottom = 16.0 + row * shown.len() as f64;
        let said = format!("{} largest weights of {}", shown.len(), self.values.len());
        pen.word(&said, (4.0, 7.0), Word::new(TICK, inks.slate))?;
        pen.down(zero, 16.0, bottom, inks.line, 1.0)?;
        let ramp = self.end.ramp(&inks);
        let shared = text::Shared::in_list(&self.names);
        for (k, i) in shown.iter().enumerate() {
            let y = 16.0 + row * (k as f64 + 0.5);
            let x = zero + reach * self.values[*i] / limit;
            pen.across(zero.min(x), zero.max(x), y, inks.line, 1.5)?;
            let ink = if self.values[*i] >= 0.0 {
                ramp[10]
            } else {
                ramp[0]
            };
            pen.dot((x, y), 4.0, ink)?;
            let word = Word::new(TICK, inks.slate).at(At::Right);
            pen.name(
                &shared.without(&self.names[*i]),
                (left - 6.0, y),
                left - 6.0,
                word,
            )?;
        }
        let word = Word::new(TICK, inks.slate);
        let y = bottom + 12.0;
        let size = text::short(limit);
        pen.word(&format!("−{size}"), (zero - reach, y), word.at(At::Middle))?;
        pen.word("0", (zero, y), word.at(At::Middle))?;
        let said = text::fit(&format!("{size} {}", self.unit), TICK, reach);
        let half = text::width(&said, TICK) / 2.0;
        pen.word(
            &said,
            ((zero + reach).min(pen.w - half), y),
            word.at(At::Middle),
        )
    }

    fn height(&self, _width: u32) -> u32 {
        (16.0 + ROW * self.largest().len().max(1) as f64 + FOOT) as u32
    }

    fn table(&self) -> Table {
        let weight = format!("weight {}", self.unit);
        let mut table = Table::new(&["channel", &weight]);
        for (name, value) in self.names.iter().zip(&self.values) {
            table.row([text::clean(name), cell(*value)]);
        }
        table
    }

    fn spoken(&self) -> String {
        let said: Vec<String> = self
            .largest()
            .iter()
            .map(|i| format!("{} {}", self.names[*i], text::short(self.values[*i])))
            .collect();
        format!("Largest weights of the filter: {}.", said.join(", "))
    }
}
