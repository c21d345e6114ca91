//! Pictures of a movie: the mean and the spread of its pixels, and a component's pattern on the mean frame.
//!
//! # Axis order
//! Row by row from the upper left; rows and columns are counted from 1, as in the pixels' names.
use crate::inks::{Inks, mix, step};
use crate::pen::{At, Drawn, Pen, Point, SMALL, TICK, Word};
use crate::table::{Table, cell};
use crate::weights::End;
use crate::{Plot, nan, text};
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::{Component, MovieCard, Sheet};

/// Pictures are drawn no finer than this along a side.
const FINEST: usize = 256;
const FINEST_SMALL: usize = 48;
/// Rows of a table of pixels: the largest.
const MOST_ROWS: usize = 200;
const KEY: f64 = 46.0;
const SCALE: f64 = 18.0;
const GAP: f64 = 20.0;
const TOP: f64 = 18.0;
/// Grey steps of a mean image.
const GREYS: usize = 24;

/// Values on a grid; not a number where there is no pixel in use.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Raster {
    /// Rows drawn.
    pub rows: usize,
    /// Columns drawn.
    pub columns: usize,
    /// `rows × columns`, row by row.
    #[serde(with = "nan")]
    pub values: Vec<f64>,
}

impl Raster {
    /// Made coarser by whole factors until no side is longer than `finest`: means of what is known.
    fn new(rows: usize, columns: usize, values: &[f64], finest: usize) -> Self {
        let by = rows.max(columns).div_ceil(finest).max(1);
        let (high, wide) = (rows.div_ceil(by), columns.div_ceil(by));
        let block = |at: usize| {
            let (r, c) = (at / wide * by, at % wide * by);
            let inside = (r..(r + by).min(rows))
                .flat_map(|r| (c..(c + by).min(columns)).map(move |c| values[r * columns + c]));
            let known = inside.filter(|v| v.is_finite());
            let (sum, count) = known.fold((0.0, 0usize), |(s, n), v| (s + v, n + 1));
            if count > 0 {
                sum / count as f64
            } else {
                f64::NAN
            }
        };
        Raster {
            rows: high,
            columns: wide,
            values: (0..high * wide).map(block).collect(),
        }
    }

    fn ends(&self) -> (f64, f64) {
        let known = self.values.iter().filter(|v| v.is_finite());
        known.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| {
            (low.min(*v), high.max(*v))
        })
    }

    /// Draws every cell with the colour of its place, equal neighbours of a row at once.
    fn draw<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        (left, top): Point,
        side: f64,
        color: impl Fn(usize) -> RGBAColor,
    ) -> Drawn<DB> {
        for r in 0..self.rows {
            let (y0, y1) = (top + side * r as f64, top + side * (r + 1) as f64);
            let mut from = 0;
            while from < self.columns {
                let ink = color(r * self.columns + from);
                let mut to = from + 1;
                while to < self.columns && color(r * self.columns + to) == ink {
                    to += 1;
                }
                let (x0, x1) = (left + side * from as f64, left + side * to as f64);
                pen.rect((x0, y0), (x1, y1), ink)?;
                from = to;
            }
        }
        let (right, bottom) = (
            left + side * self.columns as f64,
            top + side * self.rows as f64,
        );
        pen.frame((left, top), (right, bottom), pen.inks.line)
    }
}

/// From the ground (dark) to the ink (bright) and back in the light scheme: bright pixels are light on paper.
fn grey(inks: &Inks, share: f64) -> RGBAColor {
    if !share.is_finite() {
        return inks.wash;
    }
    let stepped = (share.clamp(0.0, 1.0) * GREYS as f64).round() / GREYS as f64;
    mix(inks.slate, inks.plate, 0.85 * (1.0 - stepped))
}

/// The values of a picture over the pixels in use.
fn spread(card: &MovieCard, values: &[f64]) -> Vec<f64> {
    let mut all = vec![f64::NAN; card.rows as usize * card.columns as usize];
    for (pixel, value) in card.used.iter().zip(values) {
        if let Some(slot) = all.get_mut(*pixel as usize) {
            *slot = *value;
        }
    }
    all
}

/// A round number of pixels about a quarter as long as the picture.
fn scale_bar(columns: f64) -> f64 {
    let quarter = (columns / 4.0).max(1.0);
    let ten = 10f64.powf(quarter.log10().floor());
    let round = [1.0, 2.0, 5.0].map(|k| k * ten);
    round
        .into_iter()
        .filter(|r| *r <= quarter)
        .fold(ten, f64::max)
        .max(1.0)
}

/// See [`crate::Figure::Pictures`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Pictures {
    /// Mean over all frames.
    pub mean: Raster,
    /// Standard deviation of every pixel in use.
    pub sd: Raster,
    /// Columns of the movie after binning, for the scale bar.
    pub columns: usize,
    /// Pixels in use, and in all.
    pub used: [usize; 2],
    /// Unit of the mean.
    pub unit: String,
    /// Unit of the standard deviation, which differs from it for ΔF/F.
    pub sd_unit: String,
}

impl Pictures {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let card = sheet.movie.as_ref()?;
        let (rows, columns) = (card.rows as usize, card.columns as usize);
        if sheet.channels.len() != card.used.len() || rows * columns != card.mean.len() {
            return None;
        }
        let mean: Vec<f64> = card.mean.iter().map(|x| f64::from(*x)).collect();
        let sd: Vec<f64> = sheet
            .channels
            .iter()
            .map(|c| c.sd.unwrap_or(f64::NAN))
            .collect();
        let sd_unit = sheet.channels.first()?.unit.clone();
        Some(Pictures {
            mean: Raster::new(rows, columns, &mean, FINEST),
            sd: Raster::new(rows, columns, &spread(card, &sd), FINEST),
            columns,
            used: [card.used.len(), card.mean.len()],
            unit: if sheet.recipe.movie.dff.is_some() {
                String::new()
            } else {
                sd_unit.clone()
            },
            sd_unit,
        })
    }

    fn side(&self, w: f64) -> f64 {
        ((w - GAP) / 2.0 / self.mean.columns as f64).min(360.0 / self.mean.rows as f64)
    }
}

impl Plot for Pictures {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let side = self
            .side(pen.w)
            .min((pen.h - TOP - KEY) / self.mean.rows as f64);
        let wide = side * self.mean.columns as f64;
        let pictures = [
            ("mean of each pixel", &self.mean, &self.unit),
            ("standard deviation of each pixel", &self.sd, &self.sd_unit),
        ];
        for (k, (name, raster, unit)) in pictures.into_iter().enumerate() {
            let left = k as f64 * (wide + GAP);
            let word = Word::new(TICK, pen.inks.slate);
            pen.word(&text::fit(name, TICK, wide), (left, 8.0), word)?;
            let (low, high) = raster.ends();
            let share = |v: f64| {
                if high > low {
                    (v - low) / (high - low)
                } else {
                    0.5
                }
            };
            raster.draw(pen, (left, TOP), side, |i| {
                grey(&pen.inks, share(raster.values[i]))
            })?;
            let foot = TOP + side * raster.rows as f64;
            grey_key(pen, (left, foot + 8.0), wide.min(150.0), (low, high), unit)?;
        }
        let share = scale_bar(self.columns as f64);
        let long = share / self.columns as f64 * wide;
        let foot = TOP + side * self.mean.rows as f64 + 12.0;
        let right = 2.0 * wide + GAP;
        bar(pen, (right - long, foot), long, share)
    }

    fn height(&self, width: u32) -> u32 {
        (TOP + self.side(f64::from(width)) * self.mean.rows as f64 + KEY) as u32
    }

    fn table(&self) -> Table {
        let mut table = Table::new(&["picture", "rows", "columns", "smallest", "largest"]);
        for (name, raster) in [("mean", &self.mean), ("standard deviation", &self.sd)] {
            let (low, high) = raster.ends();
            table.row([
                name.to_owned(),
                raster.rows.to_string(),
                raster.columns.to_string(),
                cell(low),
                cell(high),
            ]);
        }
        table
    }

    fn spoken(&self) -> String {
        let (low, high) = self.mean.ends();
        format!(
            "Mean and standard deviation of each pixel; {} of {} are in use. The mean runs from {} to {} {}.",
            self.used[0],
            self.used[1],
            text::short(low),
            text::short(high),
            self.unit
        )
    }
}

fn grey_key<DB: DrawingBackend>(
    pen: &Pen<DB>,
    (left, top): Point,
    wide: f64,
    (low, high): (f64, f64),
    unit: &str,
) -> Drawn<DB> {
    for i in 0..GREYS {
        let x = |k: usize| left + wide * k as f64 / GREYS as f64;
        let ink = grey(&pen.inks, i as f64 / (GREYS - 1) as f64);
        pen.rect((x(i), top), (x(i + 1), top + 9.0), ink)?;
    }
    pen.frame((left, top), (left + wide, top + 9.0), pen.inks.line)?;
    let word = Word::new(TICK, pen.inks.slate);
    pen.word(&text::short(low), (left, top + 19.0), word)?;
    let said = format!("{} {unit}", text::short(high));
    pen.word(&said, (left + wide, top + 19.0), word.at(At::Right))
}

/// A scale bar with its length in pixels below.
fn bar<DB: DrawingBackend>(pen: &Pen<DB>, (left, top): Point, long: f64, pixels: f64) -> Drawn<DB> {
    pen.across(left, left + long, top, pen.inks.ink, 2.0)?;
    let said = if pixels == 1.0 {
        "1 pixel".to_owned()
    } else {
        format!("{pixels} pixels")
    };
    let word = Word::new(SMALL, pen.inks.slate).at(At::Right);
    pen.word(&said, (left + long, top + 10.0), word)
}

/// See [`crate::Figure::PixelMap`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PixelMap {
    /// Without words, for a row of a table.
    pub small: bool,
    /// The component's end.
    pub end: End,
    /// The pattern.
    pub pattern: Raster,
    /// The mean frame, as far as it is drawn below.
    pub mean: Raster,
    /// Columns of the movie after binning, for the scale bar.
    pub columns: usize,
    /// Largest magnitude of the pattern.
    pub limit: f64,
    /// Row and column of the largest entry, counted from 1.
    pub largest_at: [usize; 2],
    /// Row, column and value of the largest entries, for the table.
    pub largest: Vec<(usize, usize, f64)>,
    /// Unit of the pixels.
    pub unit: String,
}

impl PixelMap {
    pub(crate) fn of(sheet: &Sheet, component: &Component, end: End, small: bool) -> Option<Self> {
        let card = sheet.movie.as_ref()?;
        let (rows, columns) = (card.rows as usize, card.columns as usize);
        // The pattern speaks of the prepared channels, which may be fewer than the pixels in use.
        let names = &sheet.preparation.as_ref()?.channels;
        let mut values = vec![f64::NAN; rows * columns];
        for (name, value) in names.iter().zip(&component.pattern) {
            let (row, column) = place(name)?;
            *values.get_mut((row - 1) * columns + column - 1)? = *value;
        }
        let finest = if small { FINEST_SMALL } else { FINEST };
        let mut order: Vec<usize> = (0..values.len())
            .filter(|i| values[*i].is_finite())
            .collect();
        order.sort_by(|a, b| values[*b].abs().total_cmp(&values[*a].abs()));
        let first = *order.first()?;
        let at = |i: usize| (i / columns + 1, i % columns + 1, values[i]);
        let mean: Vec<f64> = card.mean.iter().map(|x| f64::from(*x)).collect();
        Some(PixelMap {
            small,
            end,
            pattern: Raster::new(rows, columns, &values, finest),
            mean: Raster::new(rows, columns, &mean, finest),
            columns,
            limit: values[first].abs().max(f64::MIN_POSITIVE),
            largest_at: [first / columns + 1, first % columns + 1],
            largest: if small {
                Vec::new()
            } else {
                order.iter().take(MOST_ROWS).map(|i| at(*i)).collect()
            },
            unit: sheet
                .channels
                .first()
                .map_or(String::new(), |c| c.unit.clone()),
        })
    }

    fn side(&self, w: f64) -> f64 {
        (w / self.pattern.columns as f64).min(420.0 / self.pattern.rows as f64)
    }
}

/// Row and column in `r12c40`.
fn place(name: &str) -> Option<(usize, usize)> {
    let (row, column) = name.strip_prefix('r')?.split_once('c')?;
    let (row, column) = (row.parse::<usize>().ok()?, column.parse::<usize>().ok()?);
    (row > 0 && column > 0).then_some((row, column))
}

impl Plot for PixelMap {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let ramp = self.end.ramp(&pen.inks);
        let foot = if self.small { 0.0 } else { KEY + SCALE };
        let side = self
            .side(pen.w)
            .min((pen.h - foot) / self.pattern.rows as f64);
        let wide = side * self.pattern.columns as f64;
        let high = side * self.pattern.rows as f64;
        let left = (pen.w - wide) / 2.0;
        let (low, top) = self.mean.ends();
        let share = |v: f64| {
            if top > low {
                (v - low) / (top - low)
            } else {
                0.5
            }
        };
        // Where the pattern is next to nothing, or a pixel is not in use, the mean frame shows.
        let color = |i: usize| {
            let value = self.pattern.values[i];
            match step(value, self.limit) {
                5 => mix(
                    grey(&pen.inks, share(self.mean.values[i])),
                    pen.inks.plate,
                    0.45,
                ),
                k => ramp[k],
            }
        };
        self.pattern.draw(pen, (left, 0.0), side, color)?;
        if self.small {
            return Ok(());
        }
        let pixel = wide / self.columns as f64;
        let [row, column] = self.largest_at.map(|x| x as f64 - 0.5);
        let ink = pen.inks.on(ramp[step(self.limit, self.limit)]);
        let spot = (left + pixel * column, pixel * row);
        pen.cross(spot, 4.0, ink)?;
        let share = scale_bar(self.columns as f64);
        let long = share * pixel;
        bar(pen, (left + wide - long, high + 6.0), long, share)?;
        crate::map::key(pen, &ramp, self.limit, &self.unit)
    }

    fn height(&self, width: u32) -> u32 {
        let picture = self.side(f64::from(width)) * self.pattern.rows as f64;
        if self.small {
            return picture as u32;
        }
        (picture + KEY + SCALE) as u32
    }

    fn table(&self) -> Table {
        let unit = format!("pattern_{}_per_unit", self.unit);
        let mut table = Table::new(&["row", "column", &unit]);
        for (row, column, value) in &self.largest {
            table.row([row.to_string(), column.to_string(), cell(*value)]);
        }
        table
    }

    fn spoken(&self) -> String {
        let [row, column] = self.largest_at;
        format!(
            "Pattern of the component on the mean frame, largest at row {row}, column {column}: {} {} per unit.",
            text::short(self.limit),
            self.unit
        )
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a test may end where it fails")]
    use super::*;

    #[test]
    fn a_raster_is_made_coarser_by_means_of_what_is_known() {
        let values = [
            1.0,
            3.0,
            f64::NAN,
            5.0,
            7.0,
            f64::NAN,
            f64::NAN,
            f64::NAN,
            f64::NAN,
        ];
        let raster = Raster::new(3, 3, &values, 2);
        assert_eq!((raster.rows, raster.columns), (2, 2));
        assert_eq!(raster.values[0], 4.0);
        assert!(raster.values[1..].iter().all(|v| v.is_nan()));
        assert_eq!(Raster::new(3, 3, &values, 3).values[3], 5.0);
    }

    #[test]
    fn scale_bars_are_round_and_no_longer_than_a_quarter() {
        for (columns, long) in [(100.0, 20.0), (512.0, 100.0), (30.0, 5.0), (3.0, 1.0)] {
            assert_eq!(scale_bar(columns), long);
        }
    }

    #[test]
    fn a_pixels_name_tells_its_place() {
        assert_eq!(place("r12c40"), Some((12, 40)));
        for name in ["c1", "r0c1", "r1", "Fz", "r1cx"] {
            assert_eq!(place(name), None, "{name}");
        }
    }
}
