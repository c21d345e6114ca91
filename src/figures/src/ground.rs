//! What channels lie on, and where on a drawing of it.
use serde::{Deserialize, Serialize};
use teasel_core::describe::plate::hull;
use teasel_core::describe::positions::flat;
use teasel_core::recording::Layout;

/// What the channels lie on.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(tag = "on", rename_all = "kebab-case")]
pub enum Ground {
    /// A head seen from above: 1 is the circle of Fpz, T7, Oz, T8.
    #[default]
    Head,
    /// A plane: the longer half side of the rectangle around all channels is 1.
    Plane {
        /// Half sides of that rectangle.
        half: [f64; 2],
        /// Distances of neighbours, where the channels form a regular grid.
        pitch: Option<[f64; 2]>,
        /// The outermost channels, against the clock.
        hull: Vec<[f64; 2]>,
    },
    /// A shaft: from 1 at the top to −1 at the bottom.
    Line {
        /// Depth in metres at the top and at the bottom.
        depth_m: [f64; 2],
    },
}

/// Where each channel lies on a drawing; `None` where it has no position.
pub(crate) type Places = Vec<Option<[f64; 2]>>;

/// Neighbours in a regular grid may be out of line by this share of their distance.
const SLACK: f64 = 0.05;

/// The ground of a layout and the places on it.
pub(crate) fn lay(layout: &Layout, positions: &[Option<[f64; 3]>]) -> (Ground, Places) {
    let whole = |p: &[f64; 3]| p.iter().all(|v| v.is_finite());
    let known = positions.iter().map(|p| p.filter(whole));
    match layout {
        Layout::Plane => on_plane(&known.map(|p| p.map(|p| [p[0], p[1]])).collect::<Places>()),
        Layout::Line => on_line(&known.map(|p| p.map(|p| -p[2])).collect::<Vec<_>>()),
        _ => (Ground::Head, known.map(|p| p.map(flat)).collect()),
    }
}

fn on_plane(given: &Places) -> (Ground, Places) {
    let span = |k: usize| extent(given.iter().flatten().map(|p| p[k]));
    let (x, y) = (span(0), span(1));
    let long = ((x.1 - x.0).max(y.1 - y.0) / 2.0).max(f64::MIN_POSITIVE);
    let middle = [f64::midpoint(x.0, x.1), f64::midpoint(y.0, y.1)];
    let place = |p: &[f64; 2]| [(p[0] - middle[0]) / long, (p[1] - middle[1]) / long];
    let places: Places = given.iter().map(|p| p.as_ref().map(place)).collect();
    let known: Vec<[f64; 2]> = places.iter().flatten().copied().collect();
    let ground = Ground::Plane {
        half: [(x.1 - x.0) / 2.0 / long, (y.1 - y.0) / 2.0 / long],
        pitch: pitch(&known),
        hull: hull(&known),
    };
    (ground, places)
}

fn on_line(depths: &[Option<f64>]) -> (Ground, Places) {
    let (top, bottom) = extent(depths.iter().flatten().copied());
    let span = (bottom - top).max(f64::MIN_POSITIVE);
    let place = |d: &f64| [0.0, 1.0 - 2.0 * (d - top) / span];
    let places = depths.iter().map(|d| d.as_ref().map(place)).collect();
    let ground = Ground::Line {
        depth_m: [top, bottom],
    };
    (ground, places)
}

fn extent(values: impl Iterator<Item = f64>) -> (f64, f64) {
    let all = values.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| {
        (v.min(low), v.max(high))
    });
    if all.0 <= all.1 { all } else { (0.0, 0.0) }
}

/// Distances of neighbours across and upwards, where the places fill at least two rows and two columns of a regular grid by half.
fn pitch(places: &[[f64; 2]]) -> Option<[f64; 2]> {
    let (x, y) = (steps(places, 0)?, steps(places, 1)?);
    let cells = x.1 * y.1;
    (x.1 >= 2 && y.1 >= 2 && places.len() * 2 >= cells && places.len() <= cells)
        .then_some([x.0, y.0])
}

/// The equal step between the values that occur, and how many there are from the first to the last.
fn steps(places: &[[f64; 2]], k: usize) -> Option<(f64, usize)> {
    let mut values: Vec<f64> = places.iter().map(|p| p[k]).collect();
    values.sort_by(f64::total_cmp);
    let gaps = values
        .windows(2)
        .map(|w| w[1] - w[0])
        .filter(|gap| *gap > 1e-3);
    let step = gaps.fold(f64::INFINITY, f64::min);
    let (first, last) = (*values.first()?, *values.last()?);
    let even = |v: &f64| {
        let at = (v - first) / step;
        (at - at.round()).abs() <= SLACK
    };
    (step.is_finite() && values.iter().all(even))
        .then(|| (step, ((last - first) / step).round() as usize + 1))
}

impl Ground {
    /// In words: "on the head".
    pub(crate) fn words(&self) -> &'static str {
        match self {
            Ground::Head => "on the head",
            Ground::Plane { pitch: Some(_), .. } => "on the grid",
            Ground::Plane { .. } => "on the plane",
            Ground::Line { .. } => "along the shaft",
        }
    }

    /// Names of the two coordinates in a table.
    pub(crate) fn axes(&self) -> [&'static str; 2] {
        match self {
            Ground::Head => ["right", "front"],
            Ground::Plane { .. } => ["right", "up"],
            Ground::Line { .. } => ["across", "up"],
        }
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, clippy::panic, reason = "tests")]
    use super::*;

    #[test]
    fn grids_are_known_by_their_equal_steps() {
        let grid: Vec<Option<[f64; 3]>> = (0..12)
            .map(|k| Some([f64::from(k % 4) * 0.01, f64::from(k / 4) * 0.01, 0.0]))
            .collect();
        let (ground, places) = lay(&Layout::Plane, &grid);
        let Ground::Plane {
            half,
            pitch: Some(pitch),
            hull,
        } = ground
        else {
            panic!("a grid");
        };
        assert!((half[0] - 1.0).abs() < 1e-12 && (half[1] - 2.0 / 3.0).abs() < 1e-12);
        assert!(pitch.iter().all(|p| (p - 2.0 / 3.0).abs() < 1e-12));
        assert_eq!(hull.len(), 4);
        assert_eq!(places[0].unwrap()[0], -1.0);
        let mut askew = grid;
        askew[5] = Some([0.0137, 0.0122, 0.0]);
        assert!(matches!(
            lay(&Layout::Plane, &askew).0,
            Ground::Plane { pitch: None, .. }
        ));
    }

    #[test]
    fn a_shaft_runs_from_the_top_down() {
        let shaft: Vec<Option<[f64; 3]>> = (0..5)
            .map(|k| Some([0.0, 0.0, -1e-4 * f64::from(k)]))
            .collect();
        let (ground, places) = lay(&Layout::Line, &shaft);
        let Ground::Line { depth_m } = ground else {
            panic!("a line");
        };
        assert!(depth_m[0].abs() < 1e-15 && (depth_m[1] - 4e-4).abs() < 1e-15);
        assert_eq!(places[0], Some([0.0, 1.0]));
        assert_eq!(places[4], Some([0.0, -1.0]));
    }
}
