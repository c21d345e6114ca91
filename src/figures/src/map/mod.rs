//! A component's pattern on the head, or in order of size where positions are missing.
mod bars;
mod make;
mod on_head;
mod veil;

use crate::head::NOSE;
use crate::pen::{At, Drawn, Pen, SMALL, Word};
use crate::table::{Table, cell};
use crate::weights::End;
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};

/// Points along a side of the grid.
const SIDE: usize = 57;
/// The map ends this far outside the outermost channel.
const RIM: f64 = 0.06;
const KEY: f64 = 46.0;

/// See [`crate::Figure::Map`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Map {
    /// Without words, for a row of a table.
    pub small: bool,
    /// The component's end.
    pub end: End,
    /// Names of the prepared channels.
    pub names: Vec<String>,
    /// The pattern's value for each.
    #[serde(with = "nan")]
    pub values: Vec<f64>,
    /// Where each lies on the plane; `None` where it has no position.
    pub places: Vec<Option<[f64; 2]>>,
    /// Unit of the channels.
    pub unit: String,
    /// Values on a square grid, row by row from the front left; empty where too few channels have a position.
    #[serde(with = "nan")]
    pub grid: Vec<f64>,
    /// Radius at which the map ends.
    pub radius: f64,
    /// 95 % interval of each value over trials; empty where it is not known.
    #[serde(default)]
    pub interval: Vec<[f64; 2]>,
}

impl Map {
    fn limit(&self) -> f64 {
        let sizes = self
            .values
            .iter()
            .map(|v| v.abs())
            .filter(|v| v.is_finite());
        let largest = sizes.fold(0.0, f64::max);
        if largest > 0.0 { largest } else { 1.0 }
    }

    /// Indexes from the largest magnitude to the smallest.
    fn order(&self) -> Vec<usize> {
        let mut order: Vec<usize> = (0..self.values.len())
            .filter(|i| self.values[*i].is_finite())
            .collect();
        order.sort_by(|a, b| self.values[*b].abs().total_cmp(&self.values[*a].abs()));
        order
    }

    fn missing(&self) -> usize {
        self.places.iter().filter(|p| p.is_none()).count()
    }
}

impl Plot for Map {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let ramp = self.end.ramp(&pen.inks);
        if self.grid.is_empty() {
            self.bars(pen, &ramp)?;
        } else if self.small {
            let r = (pen.w / 2.0 - 3.0).min(pen.h / (2.0 + NOSE) - 1.5).max(4.0);
            return self.head(pen, (pen.w / 2.0, pen.h - r - 1.5), r, &ramp);
        } else {
            let note = self.missing();
            let foot = KEY + if note > 0 { 18.0 } else { 4.0 };
            let r = (pen.w / 2.0 - 14.0)
                .min((pen.h - foot) / (2.0 + NOSE) - 2.0)
                .max(10.0);
            let centre = (pen.w / 2.0, 2.0 + r * (1.0 + NOSE));
            self.head(pen, centre, r, &ramp)?;
            self.veil(pen, centre, r)?;
            self.dots(pen, centre, r, &ramp)?;
            if note > 0 {
                let said = format!(
                    "{} without a position left off",
                    text::count(note, "channel")
                );
                let word = Word::new(SMALL, pen.inks.slate).at(At::Middle);
                pen.word(&said, (pen.w / 2.0, pen.h - KEY - 9.0), word)?;
            }
        }
        if self.small {
            Ok(())
        } else {
            self.key(pen, &ramp)
        }
    }

    fn height(&self, width: u32) -> u32 {
        if self.small {
            return width;
        }
        let r = f64::from(width.min(420)) / 2.0 - 14.0;
        let note = if self.missing() > 0 { 18.0 } else { 4.0 };
        (r * (2.0 + NOSE) + KEY + note + 4.0) as u32
    }

    fn table(&self) -> Table {
        let unit = format!("pattern_{}_per_unit", self.unit);
        let mut table = Table::new(&["channel", &unit, "low_95", "high_95", "right", "front"]);
        for (i, name) in self.names.iter().enumerate() {
            let place = self.places.get(i).copied().flatten();
            let at = |k: usize| place.map_or(String::new(), |p| cell(p[k]));
            let value = self.values.get(i).map_or(String::new(), |v| cell(*v));
            let bound = |k: usize| self.interval.get(i).map_or(String::new(), |b| cell(b[k]));
            table.row([text::clean(name), value, bound(0), bound(1), at(0), at(1)]);
        }
        table
    }

    fn spoken(&self) -> String {
        let largest = self.order().first().map_or(String::new(), |i| {
            format!(
                ", largest at {}: {} {} per unit",
                self.names[*i],
                text::short(self.values[*i]),
                self.unit
            )
        });
        let how = if self.grid.is_empty() {
            "in order of size"
        } else {
            "on the head"
        };
        let doubt = self.doubtful().iter().filter(|d| **d).count();
        let told = if self.interval.is_empty() {
            String::new()
        } else {
            format!(
                "; at {doubt} of {} its 95 % interval over trials includes zero, which is striped",
                text::count(self.values.len(), "channel")
            )
        };
        format!("Pattern of the component {how}{largest}{told}.")
    }
}
