//! What all maps share: the surface, the dots on it, and the name of the largest.
use super::{Map, SIDE};
use crate::inks::{Ramp, mix, see_through, step};
use crate::pen::{At, Drawn, LABEL, Pen, Point, Word};
use crate::places::{Area, Places};
use crate::text;
use crate::topography::patches;
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;

/// Where the middle of the ground lies on the drawing, and pixels to its unit.
#[derive(Clone, Copy)]
pub(super) struct View {
    pub(super) centre: Point,
    pub(super) scale: f64,
    /// Half the side of the square that the grid covers.
    pub(super) extent: f64,
}

impl View {
    pub(super) fn to(&self, (x, y): Point) -> Point {
        (
            self.centre.0 + x * self.scale,
            self.centre.1 - y * self.scale,
        )
    }
    fn from(&self, x: f64, y: f64) -> Point {
        (
            (x - self.centre.0) / self.scale,
            (self.centre.1 - y) / self.scale,
        )
    }
}

impl Map {
    /// Filled bands within a border, convex and against the clock.
    pub(super) fn surface<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        view: View,
        border: &[Point],
        ramp: &Ramp,
    ) -> Drawn<DB> {
        for (points, color) in patches(&self.grid, view.extent, border, self.limit(), ramp) {
            let placed: Vec<Point> = points.into_iter().map(|p| view.to(p)).collect();
            pen.polygon(&placed, color)?;
        }
        Ok(())
    }

    /// A dot for every channel, and a ring with its name around the largest where the name finds room that `fits`.
    /// `under` is the map's value at a point of the ground.
    pub(super) fn dots<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        view: View,
        ramp: &Ramp,
        widest: f64,
        fits: impl Fn(&Area) -> bool,
        under: impl Fn(Point) -> f64,
    ) -> Drawn<DB> {
        let limit = self.limit();
        let ink_at = |p: Point| ramp[step(under(p), limit)];
        let known: Vec<(usize, Point)> = (0..self.places.len())
            .filter_map(|i| self.places[i].map(|[x, y]| (i, (x, y))))
            .collect();
        let size = if known.len() > 70 { 1.2 } else { 1.8 };
        for (_, place) in &known {
            let ground = ink_at(*place);
            pen.dot(view.to(*place), size, mix(pen.inks.on(ground), ground, 0.6))?;
        }
        let largest = self
            .order()
            .into_iter()
            .find_map(|i| known.iter().find(|k| k.0 == i));
        let Some((i, place)) = largest else {
            return Ok(());
        };
        let (at, ground) = (view.to(*place), ink_at(*place));
        pen.ring(at, 4.0, pen.inks.on(ground), 1.6, ground)?;
        let name = text::Shared::in_list(&self.names).without(&self.names[*i]);
        let said = text::fit(&name, LABEL, widest);
        let size = (text::bold_width(&said, LABEL), 14.0);
        if let Some((spot, side, area)) = Places::around(&[at], 5.0).near(at, size, 5.0, fits) {
            self.tag(pen, &said, spot, side, area, |x, y| ink_at(view.from(x, y)))?;
        }
        Ok(())
    }

    /// The grid's value nearest to a point of the ground.
    pub(super) fn grid_at(&self, (x, y): Point, extent: f64) -> f64 {
        let index = |v: f64| {
            ((v + extent) / (2.0 * extent) * (SIDE - 1) as f64)
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
