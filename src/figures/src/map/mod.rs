//! A component's pattern on what its channels lie on, or in order of size where positions are missing.
mod bars;
pub(crate) use bars::key;
mod make;
mod on_head;
mod on_plane;
mod on_shaft;
mod surface;
mod veil;

use crate::ground::Ground;
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
    /// What they lie on.
    #[serde(default)]
    pub ground: Ground,
    /// Where each lies on it; `None` where it has no position.
    pub places: Vec<Option<[f64; 2]>>,
    /// Unit of the channels.
    pub unit: String,
    /// Values on a square grid, row by row from the upper left; empty where no surface is drawn between the channels.
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

    /// Whether the pattern is drawn where its channels lie.
    fn is_laid_out(&self) -> bool {
        let known = self.places.iter().flatten().count();
        match &self.ground {
            Ground::Head | Ground::Plane { pitch: None, .. } => !self.grid.is_empty(),
            Ground::Plane { .. } => known > 0,
            Ground::Line { .. } => known > 1,
        }
    }

    /// What has to be said below the map: channels left off, and what is drawn between electrodes.
    fn note(&self) -> Option<String> {
        let missing = self.missing();
        let between =
            matches!(&self.ground, Ground::Plane { pitch: None, .. }) && self.is_laid_out();
        match (missing, between) {
            (0, false) => None,
            (0, true) => Some("smooth between electrodes, nothing beyond them".into()),
            (n, _) => Some(format!(
                "{} without a position left off",
                text::count(n, "channel")
            )),
        }
    }

    fn say_note<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let Some(said) = self.note() else {
            return Ok(());
        };
        let word = Word::new(SMALL, pen.inks.slate).at(At::Middle);
        pen.word(
            &text::fit(&said, SMALL, pen.w),
            (pen.w / 2.0, pen.h - KEY - 9.0),
            word,
        )
    }

    fn missing(&self) -> usize {
        self.places.iter().filter(|p| p.is_none()).count()
    }
}

impl Plot for Map {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let ramp = self.end.ramp(&pen.inks);
        match &self.ground {
            Ground::Head if !self.grid.is_empty() => self.head_map(pen, &ramp)?,
            Ground::Plane { half, pitch, hull } if self.is_laid_out() => {
                self.plane_map(pen, *half, *pitch, hull, &ramp)?;
            }
            Ground::Line { depth_m } if self.is_laid_out() => self.shaft(pen, *depth_m, &ramp)?,
            _ => self.bars(pen, &ramp)?,
        }
        if self.small {
            return Ok(());
        }
        key(pen, &ramp, self.limit(), &self.unit)
    }

    fn height(&self, width: u32) -> u32 {
        if self.small {
            return width;
        }
        let width = f64::from(width.min(420));
        let r = width / 2.0 - 14.0;
        let body = match &self.ground {
            Ground::Plane { half, pitch, .. } if self.is_laid_out() => {
                on_plane::height(width, *half, *pitch)
            }
            Ground::Line { .. } if self.is_laid_out() => on_shaft::height(self.order().len()),
            _ => r * (2.0 + NOSE) + 4.0,
        };
        let note = if self.note().is_some() { 18.0 } else { 4.0 };
        (body + KEY + note) as u32
    }

    fn table(&self) -> Table {
        let unit = format!("pattern_{}_per_unit", self.unit);
        let [across, up] = self.ground.axes();
        let mut table = Table::new(&["channel", &unit, "low_95", "high_95", across, up]);
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
        let how = if self.is_laid_out() {
            self.ground.words()
        } else {
            "in order of size"
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
