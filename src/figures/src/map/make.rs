//! From a component to the grid of its map.
use super::{Map, RIM, SIDE};
use crate::ground::{Ground, lay};
use crate::weights::End;
use std::cell::RefCell;
use std::rc::Rc;
use teasel_core::describe::map::{EXTENT, MapGrid};
use teasel_core::describe::plate::Plate;
use teasel_core::sheet::{Component, Sheet};

/// Smoothing of the spline: so little that the map shows every channel's own value.
const LAMBDA: f64 = 1e-8;
/// Half the side of the square that the grid of a plane covers; its channels lie within 1.
pub(super) const PLANE_EXTENT: f64 = 1.0;

/// From the values of channels to the grid.
enum Surface {
    Head(MapGrid),
    /// The plate, and the points of its grid.
    Plane(Plate, Vec<[f64; 2]>),
}

impl Surface {
    fn of(ground: &Ground, positions: &[[f64; 3]], places: &[[f64; 2]]) -> Option<Surface> {
        match ground {
            Ground::Head => Some(Surface::Head(
                MapGrid::smoothed(positions, SIDE, LAMBDA).ok()?,
            )),
            Ground::Plane { pitch: None, .. } => {
                let step = 2.0 * PLANE_EXTENT / (SIDE - 1) as f64;
                let at = |k: usize| {
                    [
                        (k % SIDE) as f64 * step - PLANE_EXTENT,
                        PLANE_EXTENT - (k / SIDE) as f64 * step,
                    ]
                };
                let plate = Plate::new(places, 0.0).ok()?;
                Some(Surface::Plane(plate, (0..SIDE * SIDE).map(at).collect()))
            }
            _ => None,
        }
    }

    fn values(&self, pattern: &[f64]) -> Vec<f64> {
        match self {
            Surface::Head(grid) => grid.values(pattern),
            Surface::Plane(plate, points) => plate.interpolate(pattern, points),
        }
    }

    fn radius(&self) -> f64 {
        match self {
            Surface::Head(grid) => (grid.radius + RIM).min(EXTENT),
            Surface::Plane(..) => 1.0,
        }
    }
}

/// The positions and the ground that a surface was made for.
type Made = (Vec<[f64; 3]>, Ground, Rc<Surface>);

thread_local! {
    /// The surface last made and what it was made for: all components of a sheet share it, and making it takes longest.
    static LAST: RefCell<Option<Made>> = const { RefCell::new(None) };
}

fn surface_of(ground: &Ground, positions: &[[f64; 3]], places: &[[f64; 2]]) -> Option<Rc<Surface>> {
    LAST.with_borrow_mut(|last| {
        if let Some((known, on, surface)) = last
            && known == positions
            && on == ground
        {
            return Some(Rc::clone(surface));
        }
        let surface = Rc::new(Surface::of(ground, positions, places)?);
        *last = Some((positions.to_vec(), ground.clone(), Rc::clone(&surface)));
        Some(surface)
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
        let (ground, mut places) = lay(&sheet.recording.layout, &positions);
        let known: Vec<usize> = (0..names.len())
            .filter(|i| places[*i].is_some() && component.pattern[*i].is_finite())
            .collect();
        let at: Vec<[f64; 3]> = known.iter().filter_map(|i| positions[*i]).collect();
        let on: Vec<[f64; 2]> = known.iter().filter_map(|i| places[*i]).collect();
        let values: Vec<f64> = known.iter().map(|i| component.pattern[*i]).collect();
        // A map of some channels passes for a map of all, unless nearly all are on it.
        let enough = at.len() >= 4 && at.len() * 10 >= names.len() * 8;
        let surface = enough.then(|| surface_of(&ground, &at, &on)).flatten();
        let mut radius = 1.0;
        let mut grid = Vec::new();
        match (&surface, &ground) {
            (Some(surface), _) => {
                radius = surface.radius();
                grid = surface.values(&values);
                if small {
                    grid = every_other(&grid);
                }
            }
            (None, Ground::Head) => places.iter_mut().for_each(|p| *p = None),
            (None, _) => {}
        }
        Some(Map {
            small,
            end,
            names: names.clone(),
            values: component.pattern.clone(),
            ground,
            places,
            unit: card(&names[0]).map_or(String::new(), |c| c.unit.clone()),
            grid,
            radius,
        })
    }
}
