//! A pattern spread over the head.
use super::{Map, SIDE};
use crate::head::outline;
use crate::inks::{Ramp, mix, see_through, step};
use crate::pen::{At, Drawn, LABEL, Pen, Point, Word};
use crate::places::{Area, Places, within};
use crate::text;
use crate::topography::patches;
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;
use teasel_core::describe::map::EXTENT;

impl Map {
    pub(super) fn head<DB: DrawingBackend>(
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

    pub(super) fn dots<DB: DrawingBackend>(
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
        let under = |[x, y]: [f64; 2]| ramp[step(self.at(x, y), limit)];
        let known: Vec<(usize, Point)> = (0..self.places.len())
            .filter_map(|i| Some((i, to(self.places[i]?))))
            .collect();
        let size = if known.len() > 70 { 1.2 } else { 1.8 };
        for (i, at) in &known {
            let ground = under(self.places[*i].unwrap_or_default());
            pen.dot(*at, size, mix(pen.inks.on(ground), ground, 0.6))?;
        }
        let largest = self
            .order()
            .into_iter()
            .find_map(|i| known.iter().find(|k| k.0 == i));
        if let Some((i, at)) = largest {
            let ground = under(self.places[*i].unwrap_or_default());
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
}
