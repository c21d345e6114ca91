//! Lines, surfaces and words in CSS pixels over any plotters backend.
use crate::look::{Inks, Look};
use crate::text;
use plotters::coord::Shift;
use plotters::drawing::{DrawingArea, DrawingAreaErrorKind};
use plotters::element::{Circle, PathElement, Polygon, Rectangle};
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{Color, FontStyle, FontTransform, RGBAColor, ShapeStyle, TextStyle};
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

/// Where a word stands about its point.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(crate) enum At {
    Left,
    Middle,
    Right,
}

/// A word's looks; its point is at half its height.
#[derive(Clone, Copy)]
pub(crate) struct Word {
    pub size: f64,
    pub color: RGBAColor,
    pub bold: bool,
    pub at: At,
    pub upward: bool,
}

impl Word {
    pub fn new(size: f64, color: RGBAColor) -> Self {
        Word {
            size,
            color,
            bold: false,
            at: At::Left,
            upward: false,
        }
    }
    pub fn bold(self) -> Self {
        Word { bold: true, ..self }
    }
    pub fn at(self, at: At) -> Self {
        Word { at, ..self }
    }
    /// Reads from below to above.
    pub fn upward(self) -> Self {
        Word {
            upward: true,
            ..self
        }
    }
}

/// Size of labels.
pub(crate) const LABEL: f64 = 12.5;
/// Size of ticks and captions of axes.
pub(crate) const TICK: f64 = 12.0;
/// Size where there is little room; nothing is smaller.
pub(crate) const SMALL: f64 = 11.0;

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

    /// A dashed line: `on` pixels drawn, `off` pixels not.
    pub fn dashes(
        &self,
        points: &[Point],
        color: RGBAColor,
        width: f64,
        (on, off): (f64, f64),
    ) -> Drawn<DB> {
        for dash in dashed(points, on, off) {
            self.path(&dash, color, width)?;
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

    /// A rectangle's outline, one pixel wide, inside the given corners.
    pub fn frame(&self, from: Point, to: Point, color: RGBAColor) -> Drawn<DB> {
        self.across(from.0, to.0, from.1 + 0.5, color, 1.0)?;
        self.across(from.0, to.0, to.1 - 0.5, color, 1.0)?;
        self.down(from.0 + 0.5, from.1, to.1, color, 1.0)?;
        self.down(to.0 - 0.5, from.1, to.1, color, 1.0)
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

    /// A dashed horizontal or vertical line on whole device pixels.
    pub fn dashed_rule(
        &self,
        from: Point,
        to: Point,
        color: RGBAColor,
        (on, off): (f64, f64),
    ) -> Drawn<DB> {
        let upright = (from.0 - to.0).abs() < 1e-9;
        let (start, end) = if upright {
            (from.1, to.1)
        } else {
            (from.0, to.0)
        };
        let mut at = start;
        while at < end {
            let stop = (at + on).min(end);
            if upright {
                self.down(from.0, at, stop, color, 1.0)?;
            } else {
                self.across(at, stop, from.1, color, 1.0)?;
            }
            at += on + off;
        }
        Ok(())
    }

    pub fn dot(&self, at: Point, radius: f64, color: RGBAColor) -> Drawn<DB> {
        if !at.0.is_finite() || !at.1.is_finite() {
            return Ok(());
        }
        let size = (radius * self.look.units()).round().max(1.0) as i32;
        self.area
            .draw(&Circle::new(self.point(at), size, color.filled()))
    }

    /// A ring filled with `inside`.
    pub fn ring(
        &self,
        at: Point,
        radius: f64,
        color: RGBAColor,
        width: f64,
        inside: RGBAColor,
    ) -> Drawn<DB> {
        if !at.0.is_finite() || !at.1.is_finite() {
            return Ok(());
        }
        self.dot(at, radius, inside)?;
        let size = (radius * self.look.units()).round().max(1.0) as i32;
        let style = self.stroke(color, width);
        self.area.draw(&Circle::new(self.point(at), size, style))
    }

    pub fn cross(&self, (x, y): Point, arm: f64, color: RGBAColor) -> Drawn<DB> {
        self.path(&[(x - arm, y - arm), (x + arm, y + arm)], color, 2.0)?;
        self.path(&[(x - arm, y + arm), (x + arm, y - arm)], color, 2.0)
    }

    /// Slanted lines in a rectangle.
    pub fn hatch(&self, from: Point, to: Point, color: RGBAColor) -> Drawn<DB> {
        let (w, h) = (to.0 - from.0, to.1 - from.1);
        let mut at = 0.0;
        while at < w + h {
            let start = (from.0 + (at - h).max(0.0), from.1 + at.min(h));
            let end = (from.0 + at.min(w), from.1 + (at - w).max(0.0));
            self.path(&[start, end], color, 1.0)?;
            at += 5.0;
        }
        Ok(())
    }

    /// Writes text as it is; names from a file go through [`text::fit`] before.
    pub fn word(&self, said: &str, at: Point, word: Word) -> Drawn<DB> {
        if said.is_empty() || !at.0.is_finite() || !at.1.is_finite() {
            return Ok(());
        }
        let weight = if word.bold {
            FontStyle::Bold
        } else {
            FontStyle::Normal
        };
        let side = match word.at {
            At::Left => HPos::Left,
            At::Middle => HPos::Center,
            At::Right => HPos::Right,
        };
        let size = word.size * self.look.units();
        let mut style = TextStyle::from((self.look.face.as_str(), size, weight))
            .color(&word.color)
            .pos(Pos::new(side, VPos::Center));
        if word.upward {
            style = style.transform(FontTransform::Rotate270);
        }
        self.area.draw_text(said, &style, self.point(at))
    }

    /// Writes a name from a file, shortened to `room` pixels.
    pub fn name(&self, said: &str, at: Point, room: f64, word: Word) -> Drawn<DB> {
        self.word(&text::fit(said, word.size, room), at, word)
    }
}

/// Cuts a line into dashes.
fn dashed(points: &[Point], on: f64, off: f64) -> Vec<Vec<Point>> {
    let mut dashes: Vec<Vec<Point>> = Vec::new();
    let mut left = on;
    let mut drawing = true;
    let mut current: Vec<Point> = Vec::new();
    for pair in points.windows(2) {
        let ((mut x, mut y), (x1, y1)) = (pair[0], pair[1]);
        if ![x, y, x1, y1].iter().all(|v| v.is_finite()) {
            dashes.push(std::mem::take(&mut current));
            (left, drawing) = (on, true);
            continue;
        }
        if drawing && current.is_empty() {
            current.push((x, y));
        }
        let mut rest = (x1 - x).hypot(y1 - y);
        while rest > left {
            (x, y) = (x + (x1 - x) * left / rest, y + (y1 - y) * left / rest);
            rest -= left;
            current.push((x, y));
            if drawing {
                dashes.push(std::mem::take(&mut current));
            }
            drawing = !drawing;
            left = if drawing { on } else { off };
        }
        left -= rest;
        if drawing {
            current.push((x1, y1));
        }
    }
    dashes.push(current);
    dashes.retain(|dash| dash.len() > 1);
    dashes
}
