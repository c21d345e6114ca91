//! Filled bands of a surface, cut at a border: the circle of a head, the outermost electrodes of a plane.
use crate::inks::{Ramp, step};
use crate::pen::Point;
use contour::ContourBuilder;
use plotters::style::RGBAColor;
use std::f64::consts::TAU;

/// A closed line and the colour inside it.
pub(crate) type Patch = (Vec<Point>, RGBAColor);

/// The patches of a square grid of values, to be painted in this order.
///
/// `grid` is row-major from the upper left; `extent` is half the grid's side; what lies outside `border`, convex and against the clock, is
/// cut off. Every ring of a level is painted, the largest first, in the colour of the side towards its
/// inside: a hole is simply painted over, so polygons need no holes.
pub(crate) fn patches(
    grid: &[f64],
    extent: f64,
    border: &[Point],
    limit: f64,
    ramp: &Ramp,
) -> Vec<Patch> {
    let side = (grid.len() as f64).sqrt().round() as usize;
    if side < 3 || side * side != grid.len() || grid.iter().any(|v| !v.is_finite()) {
        return Vec::new();
    }
    let mut painted: Vec<(f64, Vec<Point>, RGBAColor)> =
        vec![(f64::INFINITY, border.to_vec(), ramp[lowest(grid, limit)])];
    let cell = 2.0 * extent / (side - 1) as f64;
    let levels: Vec<f64> = (1..11)
        .map(|k| limit * (2.0 * f64::from(k) / 11.0 - 1.0))
        .collect();
    // The crate puts the grid's points at the middles of its cells: point i lies at i + 0.5.
    let builder = ContourBuilder::new(side, side, true);
    let Ok(lines) = builder.lines(grid, &levels) else {
        return Vec::new();
    };
    for (k, line) in lines.iter().enumerate() {
        for ring in &line.geometry().0 {
            let points = ring
                .0
                .iter()
                .map(|p| ((p.x - 0.5) * cell - extent, extent - (p.y - 0.5) * cell));
            let points: Vec<Point> = points.collect();
            let area = signed_area(&points);
            // Rings run against the clock, with y upwards, where the larger values lie inside.
            let color = if area > 0.0 { ramp[k + 1] } else { ramp[k] };
            let inside = clip(&points, border);
            if inside.len() > 2 {
                painted.push((area.abs(), inside, color));
            }
        }
    }
    painted.sort_by(|a, b| b.0.total_cmp(&a.0));
    painted
        .into_iter()
        .map(|(_, points, color)| (points, color))
        .collect()
}

/// The step that no ring rises from: that of the smallest value.
fn lowest(grid: &[f64], limit: f64) -> usize {
    step(grid.iter().copied().fold(f64::INFINITY, f64::min), limit)
}

/// A circle about the vertex as a polygon, against the clock.
pub(crate) fn circle(radius: f64) -> Vec<Point> {
    let at = |i: i32| {
        let angle = TAU * f64::from(i) / 120.0;
        (radius * angle.cos(), radius * angle.sin())
    };
    (0..120).map(at).collect()
}

fn signed_area(points: &[Point]) -> f64 {
    let next = points.iter().cycle().skip(1);
    points
        .iter()
        .zip(next)
        .map(|(a, b)| a.0 * b.1 - b.0 * a.1)
        .sum::<f64>()
        / 2.0
}

/// The part of a polygon inside a convex one that runs against the clock (Sutherland & Hodgman 1974).
pub(crate) fn clip(polygon: &[Point], convex: &[Point]) -> Vec<Point> {
    // How far every side is from the middle; negative where the middle lies outside.
    let inner = convex
        .iter()
        .zip(convex.iter().cycle().skip(1))
        .map(|(a, b)| (a.0 * b.1 - a.1 * b.0) / (b.0 - a.0).hypot(b.1 - a.1).max(1e-12))
        .fold(f64::INFINITY, f64::min);
    if polygon.iter().all(|p| p.0.hypot(p.1) <= inner) {
        return polygon.to_vec();
    }
    let mut kept = polygon.to_vec();
    for (a, b) in convex.iter().zip(convex.iter().cycle().skip(1)) {
        let side = |p: &Point| (b.0 - a.0) * (p.1 - a.1) - (b.1 - a.1) * (p.0 - a.0);
        let mut out = Vec::with_capacity(kept.len() + 4);
        for (p, q) in kept.iter().zip(kept.iter().cycle().skip(1)) {
            let (sp, sq) = (side(p), side(q));
            if sp >= 0.0 {
                out.push(*p);
            }
            if (sp >= 0.0) != (sq >= 0.0) {
                let t = sp / (sp - sq);
                out.push((p.0 + t * (q.0 - p.0), p.1 + t * (q.1 - p.1)));
            }
        }
        kept = out;
        if kept.is_empty() {
            break;
        }
    }
    kept
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "tests")]
    use super::*;
    use crate::inks::Inks;
    use crate::look::Scheme;

    fn inside(polygon: &[Point], (x, y): Point) -> bool {
        let next = polygon.iter().cycle().skip(1);
        let crossed = polygon.iter().zip(next).filter(|(a, b)| {
            (a.1 > y) != (b.1 > y) && x < a.0 + (y - a.1) / (b.1 - a.1) * (b.0 - a.0)
        });
        crossed.count() % 2 == 1
    }

    /// At every point the patch painted last has the colour of the value there, on hills, in holes and along the border.
    #[test]
    fn every_point_has_the_colour_of_its_value() {
        let ramp = Inks::of(Scheme::Light).stronger;
        let surfaces: [fn(f64, f64) -> f64; 4] = [
            |x, y| 1.2 - 2.5 * (x * x + y * y),
            |x, y| 0.9 * (3.0 * x).sin() * (4.0 * y).cos() + 0.1,
            |x, y| x * 0.8 - y * 0.3,
            |x, y| {
                0.02 + (-(x * x + (y - 0.4) * (y - 0.4)) * 20.0).exp()
                    - 0.3 * (-(x * x + y * y) * 9.0).exp()
            },
        ];
        let (side, extent) = (57, 1.12);
        let cell = 2.0 * extent / (side - 1) as f64;
        for (n, value) in surfaces.into_iter().enumerate() {
            let point = |k: usize| {
                (
                    (k % side) as f64 * cell - extent,
                    extent - (k / side) as f64 * cell,
                )
            };
            let grid: Vec<f64> = (0..side * side)
                .map(|k| value(point(k).0, point(k).1))
                .collect();
            let painted = patches(&grid, extent, &circle(1.0), 1.0, &ramp);
            let mut seen = 0;
            for k in 0..2000 {
                let (turn, r) = (2.399963 * k as f64, 0.98 * (k as f64 / 2000.0).sqrt());
                let (x, y) = (r * turn.cos(), r * turn.sin());
                let near_level = ((value(x, y) + 1.0) * 5.5).fract();
                if !(0.12..0.88).contains(&near_level) {
                    continue;
                }
                let top = painted.iter().rfind(|(points, _)| inside(points, (x, y)));
                assert_eq!(
                    top.unwrap().1,
                    ramp[step(value(x, y), 1.0)],
                    "surface {n} at {x}, {y}"
                );
                seen += 1;
            }
            assert!(seen > 1000, "{seen} points");
        }
    }

    #[test]
    fn clipping_keeps_what_lies_inside() {
        let square = vec![(-2.0, -0.5), (2.0, -0.5), (2.0, 0.5), (-2.0, 0.5)];
        let disc = circle(1.0);
        let kept = clip(&square, &disc);
        assert!(kept.iter().all(|p| p.0.hypot(p.1) < 1.0 + 1e-9));
        // A strip of half width h of the unit disc: 2·(h·√(1 − h²) + asin h), less what the 120-sided polygon lacks.
        let strip = 2.0 * (0.5 * 0.75f64.sqrt() + 0.5f64.asin());
        assert!((signed_area(&kept) - strip).abs() < 2e-3);
        assert_eq!(
            clip(&[(5.0, 5.0), (6.0, 5.0), (5.0, 6.0)], &disc),
            Vec::new()
        );
    }
}
