//! A component's pattern on the head, or in order of size where positions are missing.
use crate::head::{Area, NOSE, Places, outline, within};
use crate::look::{Ramp, mix, see_through, step};
use crate::pen::{At, Drawn, LABEL, Pen, Point, SMALL, TICK, Word};
use crate::table::{Table, cell};
use crate::topography::patches;
use crate::weights::End;
use crate::{Plot, nan, text};
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use std::cell::RefCell;
use std::rc::Rc;
use teasel_core::describe::map::{EXTENT, MapGrid};
use teasel_core::sheet::{Component, Sheet};

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
}

/// Positions and the grid made for them.
type Made = (Vec<[f64; 3]>, Rc<MapGrid>);

thread_local! {
    /// The grid last made and the positions it was made for: all components of a sheet share them, and making it takes longest.
    static LAST: RefCell<Option<Made>> = const { RefCell::new(None) };
}

fn grid_of(positions: &[[f64; 3]]) -> Option<Rc<MapGrid>> {
    LAST.with_borrow_mut(|last| {
        if let Some((known, grid)) = last
            && known == positions
        {
            return Some(Rc::clone(grid));
        }
        let grid = Rc::new(MapGrid::new(positions, SIDE).ok()?);
        *last = Some((positions.to_vec(), Rc::clone(&grid)));
        Some(grid)
    })
}

/// Every other row and column of a square grid with an odd side.
fn every_other(grid: &[f64]) -> Vec<f64> {
    let row = |r: usize| grid[r * SIDE..(r + 1) * SIDE].iter().step_by(2).copied();
    (0..SIDE).step_by(2).flat_map(row).collect()
}

impl Map {
    pub(crate) fn of(sheet: &Sheet, component: &Component, end: End, small: bool) -> Option<Self> {
        let names = &sheet.preparation.as_ref()?.channels;
        if names.is_empty() || names.len() != component.pattern.len() {
            return None;
        }
        let card = |name: &String| sheet.channels.iter().find(|c| c.name == *name);
        let positions: Vec<Option<[f64; 3]>> = names
            .iter()
            .map(|n| card(n).and_then(|c| c.position))
            .collect();
        let whole = |p: &[f64; 3]| p.iter().all(|v| v.is_finite());
        let known: Vec<usize> = (0..names.len())
            .filter(|i| {
                positions[*i].as_ref().is_some_and(whole) && component.pattern[*i].is_finite()
            })
            .collect();
        let at: Vec<[f64; 3]> = known.iter().filter_map(|i| positions[*i]).collect();
        let values: Vec<f64> = known.iter().map(|i| component.pattern[*i]).collect();
        // A map of some channels passes for a map of all, unless nearly all are on it.
        let enough = at.len() >= 4 && at.len() * 10 >= names.len() * 8;
        let spline = enough.then(|| grid_of(&at)).flatten();
        let mut places = vec![None; names.len()];
        let mut radius = 1.0;
        let mut grid = Vec::new();
        if let Some(spline) = spline {
            for (i, place) in known.iter().zip(&spline.places) {
                places[*i] = Some(*place);
            }
            radius = (spline.radius + RIM).min(EXTENT);
            grid = spline.values(&values);
            if small {
                grid = every_other(&grid);
            }
        }
        Some(Map {
            small,
            end,
            names: names.clone(),
            values: component.pattern.clone(),
            places,
            unit: card(&names[0]).map_or(String::new(), |c| c.unit.clone()),
            grid,
            radius,
        })
    }

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

    fn head<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        centre: Point,
        r: f64,
        ramp: &Ramp,
    ) -> Drawn<DB> {
        let limit = self.limit();
        let to = |p: Point| {
            (
                centre.0 + p.0 / self.radius * r,
                centre.1 - p.1 / self.radius * r,
            )
        };
        for (points, color) in patches(&self.grid, EXTENT, self.radius, limit, ramp) {
            let placed: Vec<Point> = points.into_iter().map(to).collect();
            pen.polygon(&placed, color)?;
        }
        outline(
            pen,
            centre,
            r,
            pen.inks.ink,
            if self.small { 1.0 } else { 1.2 },
        )
    }

    fn dots<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        centre: Point,
        r: f64,
        ramp: &Ramp,
    ) -> Drawn<DB> {
        let limit = self.limit();
        let to = |p: [f64; 2]| {
            (
                centre.0 + p[0] / self.radius * r,
                centre.1 - p[1] / self.radius * r,
            )
        };
        let under = |i: usize| ramp[step(self.values[i], limit)];
        let known: Vec<(usize, Point)> = (0..self.places.len())
            .filter_map(|i| Some((i, to(self.places[i]?))))
            .collect();
        let size = if known.len() > 70 { 1.2 } else { 1.8 };
        for (i, at) in &known {
            let ground = under(*i);
            pen.dot(*at, size, mix(pen.inks.on(ground), ground, 0.6))?;
        }
        let largest = self
            .order()
            .into_iter()
            .find_map(|i| known.iter().find(|k| k.0 == i));
        if let Some((i, at)) = largest {
            let ground = under(*i);
            let ink = pen.inks.on(ground);
            pen.ring(*at, 4.0, ink, 1.6, ground)?;
            let said = text::fit(&self.names[*i], LABEL, r * 0.9);
            let size = (text::bold_width(&said, LABEL), 14.0);
            let mut places = Places::around(&[*at], 5.0);
            if let Some((spot, side, area)) =
                places.near(*at, size, 5.0, |a| within(a, centre, r - 2.0))
            {
                let from = |x: f64, y: f64| {
                    self.at(
                        (x - centre.0) / r * self.radius,
                        (centre.1 - y) / r * self.radius,
                    )
                };
                self.tag(pen, &said, spot, side, area, |x, y| {
                    ramp[step(from(x, y), limit)]
                })?;
            }
        }
        Ok(())
    }

    /// The grid's value nearest to a point of the plane.
    fn at(&self, x: f64, y: f64) -> f64 {
        let index = |v: f64| {
            ((v + EXTENT) / (2.0 * EXTENT) * (SIDE - 1) as f64)
                .round()
                .clamp(0.0, (SIDE - 1) as f64) as usize
        };
        self.grid
            .get(index(-y) * SIDE + index(x))
            .copied()
            .unwrap_or(f64::NAN)
    }

    /// The name at the largest channel: plain where one ink reads all along it, on a ground of its own elsewhere.
    fn tag<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        said: &str,
        at: Point,
        side: At,
        area: Area,
        under: impl Fn(f64, f64) -> RGBAColor,
    ) -> Drawn<DB> {
        let across = (0..=6).map(|i| area[0] + (area[2] - area[0]) * f64::from(i) / 6.0);
        let inks: Vec<RGBAColor> = across
            .flat_map(|x| [area[1], area[3]].map(|y| pen.inks.on(under(x, y))))
            .collect();
        let word = Word::new(LABEL, inks[0]).bold().at(side);
        if inks.iter().all(|ink| *ink == inks[0]) {
            return pen.word(said, at, word);
        }
        let ground = see_through(pen.inks.plate, 0.8);
        pen.rect(
            (area[0] - 2.0, area[1] - 1.0),
            (area[2] + 2.0, area[3] + 1.0),
            ground,
        )?;
        pen.word(
            said,
            at,
            Word {
                color: pen.inks.ink,
                ..word
            },
        )
    }

    fn key<DB: DrawingBackend>(&self, pen: &Pen<DB>, ramp: &Ramp) -> Drawn<DB> {
        let wide = (pen.w - 60.0).clamp(80.0, 162.0);
        let (left, top) = ((pen.w - wide) / 2.0, pen.h - 27.0);
        for (i, color) in ramp.iter().enumerate() {
            let x = |k: f64| left + wide * k / 11.0;
            pen.rect((x(i as f64), top), (x(i as f64 + 1.0), top + 9.0), *color)?;
        }
        pen.frame((left, top), (left + wide, top + 9.0), pen.inks.line)?;
        let word = Word::new(TICK, pen.inks.slate).at(At::Middle);
        let limit = text::short(self.limit());
        let unit = format!("{} per unit", text::fit(&self.unit, TICK, 90.0));
        pen.word(&unit, (pen.w / 2.0, top - 9.0), word)?;
        pen.word(&format!("−{limit}"), (left, top + 19.0), word.at(At::Left))?;
        pen.word("0", (pen.w / 2.0, top + 19.0), word)?;
        pen.word(&limit, (left + wide, top + 19.0), word.at(At::Right))
    }

    /// Where the map cannot be drawn: the largest entries as bars.
    fn bars<DB: DrawingBackend>(&self, pen: &Pen<DB>, ramp: &Ramp) -> Drawn<DB> {
        let (top, bottom) = if self.small {
            (2.0, pen.h - 2.0)
        } else {
            (22.0, pen.h - KEY - 20.0)
        };
        let row = if self.small { 5.0 } else { 15.0 };
        let fit = ((bottom - top) / row).max(1.0) as usize;
        let order = self.order();
        let shown = &order[..order.len().min(fit)];
        let (left, right) = if self.small {
            (2.0, pen.w - 2.0)
        } else {
            (64.0, pen.w - 12.0)
        };
        let zero = (left + right) / 2.0;
        let limit = self.limit();
        if !self.small {
            let said = format!(
                "{} of {}, by size",
                shown.len(),
                text::count(order.len(), "channel")
            );
            pen.word(&said, (4.0, 8.0), Word::new(TICK, pen.inks.slate))?;
            let note = format!(
                "no map: {} without a position",
                text::count(self.missing(), "channel")
            );
            let word = Word::new(SMALL, pen.inks.slate).at(At::Middle);
            pen.word(
                &text::fit(&note, SMALL, pen.w),
                (pen.w / 2.0, pen.h - KEY - 8.0),
                word,
            )?;
        }
        for (k, i) in shown.iter().enumerate() {
            let y = top + row * (k as f64 + 0.5);
            let x = zero + (right - zero) * self.values[*i] / limit;
            let half = if self.small { 1.5 } else { 4.5 };
            pen.rect(
                (zero, y - half),
                (x, y + half),
                ramp[step(self.values[*i], limit)],
            )?;
            if !self.small {
                let word = Word::new(SMALL, pen.inks.slate).at(At::Right);
                pen.name(&self.names[*i], (left - 6.0, y), left - 8.0, word)?;
            }
        }
        pen.down(
            zero,
            top,
            top + row * shown.len() as f64,
            pen.inks.line,
            1.0,
        )
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
        let mut table = Table::new(&["channel", &unit, "right", "front"]);
        for (i, name) in self.names.iter().enumerate() {
            let place = self.places.get(i).copied().flatten();
            let at = |k: usize| place.map_or(String::new(), |p| cell(p[k]));
            let value = self.values.get(i).map_or(String::new(), |v| cell(*v));
            table.row([text::clean(name), value, at(0), at(1)]);
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
        format!("Pattern of the component {how}{largest}.")
    }
}
