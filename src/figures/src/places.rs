//! Room for names beside dots.
use crate::pen::{At, Point};

/// Left, top, right, bottom.
pub(crate) type Area = [f64; 4];

/// Names beside dots, placed one after another where nothing stands yet.
pub(crate) struct Places {
    taken: Vec<Area>,
}

impl Places {
    pub(crate) fn around(dots: &[Point], r: f64) -> Self {
        let taken = dots.iter().map(|(x, y)| [x - r, y - r, x + r, y + r]);
        Places {
            taken: taken.collect(),
        }
    }

    /// A place for a word of this width and height near a dot: below, above, right or left of it, where `fits` holds.
    pub(crate) fn near(
        &mut self,
        (x, y): Point,
        (wide, high): (f64, f64),
        r: f64,
        fits: impl Fn(&Area) -> bool,
    ) -> Option<(Point, At, Area)> {
        let half = wide / 2.0;
        let tries = [
            ((x, y + r + high / 2.0 + 1.0), At::Middle, x - half),
            ((x, y - r - high / 2.0 - 1.0), At::Middle, x - half),
            ((x + r + 3.0, y), At::Left, x + r + 3.0),
            ((x - r - 3.0, y), At::Right, x - r - 3.0 - wide),
        ];
        for (at, side, left) in tries {
            let mine = [left, at.1 - high / 2.0, left + wide, at.1 + high / 2.0];
            let apart =
                |o: &Area| mine[0] >= o[2] || o[0] >= mine[2] || mine[1] >= o[3] || o[1] >= mine[3];
            if fits(&mine) && self.taken.iter().all(apart) {
                self.taken.push(mine);
                return Some((at, side, mine));
            }
        }
        None
    }
}

/// Whether an area lies wholly inside a circle.
pub(crate) fn within(area: &Area, centre: Point, radius: f64) -> bool {
    let corners = [
        (area[0], area[1]),
        (area[2], area[1]),
        (area[0], area[3]),
        (area[2], area[3]),
    ];
    corners
        .iter()
        .all(|(x, y)| (x - centre.0).hypot(y - centre.1) <= radius)
}
