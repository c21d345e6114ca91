//! Shapes made of lines and surfaces.
use super::{Drawn, Pen, Point};
use plotters::element::Circle;
use plotters::style::RGBAColor;
use plotters_backend::DrawingBackend;

impl<DB: DrawingBackend> Pen<'_, DB> {
    /// A rectangle's outline, one pixel wide, inside the given corners.
    pub fn frame(&self, from: Point, to: Point, color: RGBAColor) -> Drawn<DB> {
        self.across(from.0, to.0, from.1 + 0.5, color, 1.0)?;
        self.across(from.0, to.0, to.1 - 0.5, color, 1.0)?;
        self.down(from.0 + 0.5, from.1, to.1, color, 1.0)?;
        self.down(to.0 - 0.5, from.1, to.1, color, 1.0)
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
