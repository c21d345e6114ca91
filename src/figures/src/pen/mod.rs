//! Lines, surfaces and words in CSS pixels over any plotters backend.
mod shapes;
mod words;

pub(crate) use words::{At, LABEL, SMALL, TICK, Word};

use crate::inks::Inks;
use crate::look::Look;
use plotters::coord::Shift;
use plotters::drawing::{DrawingArea, DrawingAreaErrorKind};
use plotters::element::{Circle, PathElement, Polygon, Rectangle};
use plotters::style::{Color, RGBAColor, ShapeStyle};
use plotters_backend::DrawingBackend;

/// What every drawing step returns.
pub type Drawn<DB> = Result<(), DrawingAreaErrorKind<<DB as DrawingBackend>::ErrorType>>;
/// A point in CSS pixels from the upper left corner.
pub(crate) type Point = (f64, f64);

pub(crate) struct Pen<'a, DB: DrawingBackend> {
    area: &'a DrawingArea<DB, Shift>,
    look: &'a Look,
    pub inks: Inks,
    /// Width of the area in CSS pixels.
    pub w: f64,
    /// Height of the area in CSS pixels.
    pub h: f64,
}

impl<'a, DB: DrawingBackend> Pen<'a, DB> {
    pub fn new(area: &'a DrawingArea<DB, Shift>, look: &'a Look) -> Self {
        let (w, h) = area.dim_in_pixel();
        let units = look.units();
        Pen {
            area,
            look,
            inks: Inks::of(look.scheme),
            w: f64::from(w) / units,
            h: f64::from(h) / units,
        }
    }

    fn point(&self, (x, y): Point) -> (i32, i32) {
        let units = self.look.units();
        ((x * units).round() as i32, (y * units).round() as i32)
    }

    fn stroke(&self, color: RGBAColor, width: f64) -> ShapeStyle {
        color.stroke_width((width * self.look.units()).round().max(1.0) as u32)
    }

    /// Lays a place on the edge of a device pixel; the result is in drawing units.
    fn edge(&self, at: f64) -> i32 {
        ((at * self.look.scale).round() * f64::from(self.look.fine.max(1))) as i32
    }

    /// A line through points; it breaks where one is not a number.
    pub fn path(&self, points: &[Point], color: RGBAColor, width: f64) -> Drawn<DB> {
        let whole = |p: &Point| p.0.is_finite() && p.1.is_finite();
        for run in points.split(|p| !whole(p)).filter(|run| run.len() > 1) {
            let placed: Vec<_> = run.iter().map(|p| self.point(*p)).collect();
            self.area
                .draw(&PathElement::new(placed, self.stroke(color, width)))?;
        }
        Ok(())
    }

    pub fn polygon(&self, points: &[Point], color: RGBAColor) -> Drawn<DB> {
        if points.len() < 3 || points.iter().any(|p| !p.0.is_finite() || !p.1.is_finite()) {
            return Ok(());
        }
        let placed: Vec<_> = points.iter().map(|p| self.point(*p)).collect();
        self.area.draw(&Polygon::new(placed, color.filled()))
    }

    /// A band between two curves; it breaks where one is not a number.
    pub fn band(&self, low: &[Point], high: &[Point], color: RGBAColor) -> Drawn<DB> {
        let pairs: Vec<(Point, Point)> = low.iter().copied().zip(high.iter().copied()).collect();
        for run in pairs.split(|(a, b)| !a.1.is_finite() || !b.1.is_finite()) {
            let there = run.iter().map(|p| p.0);
            let back = run.iter().rev().map(|p| p.1);
            self.polygon(&there.chain(back).collect::<Vec<_>>(), color)?;
        }
        Ok(())
    }

    /// A filled rectangle on whole device pixels, at least one wide and high.
    pub fn rect(&self, from: Point, to: Point, color: RGBAColor) -> Drawn<DB> {
        if ![from.0, from.1, to.0, to.1].iter().all(|v| v.is_finite()) {
            return Ok(());
        }
        let (x0, x1) = (self.edge(from.0.min(to.0)), self.edge(from.0.max(to.0)));
        let (y0, y1) = (self.edge(from.1.min(to.1)), self.edge(from.1.max(to.1)));
        let one = self.look.fine.max(1) as i32;
        let corners = [(x0, y0), (x1.max(x0 + one), y1.max(y0 + one))];
        self.area.draw(&Rectangle::new(corners, color.filled()))
    }

    /// A horizontal line on whole device pixels.
    pub fn across(&self, x0: f64, x1: f64, y: f64, color: RGBAColor, width: f64) -> Drawn<DB> {
        let half = (width * self.look.scale).round().max(1.0) / self.look.scale / 2.0;
        let top = ((y - half) * self.look.scale).round() / self.look.scale;
        self.rect((x0, top), (x1, top + 2.0 * half), color)
    }

    /// A vertical line on whole device pixels.
    pub fn down(&self, x: f64, y0: f64, y1: f64, color: RGBAColor, width: f64) -> Drawn<DB> {
        let half = (width * self.look.scale).round().max(1.0) / self.look.scale / 2.0;
        let left = ((x - half) * self.look.scale).round() / self.look.scale;
        self.rect((left, y0), (left + 2.0 * half, y1), color)
    }

    pub fn dot(&self, at: Point, radius: f64, color: RGBAColor) -> Drawn<DB> {
        if !at.0.is_finite() || !at.1.is_finite() {
            return Ok(());
        }
        let size = (radius * self.look.units()).round().max(1.0) as i32;
        self.area
            .draw(&Circle::new(self.point(at), size, color.filled()))
    }
}
