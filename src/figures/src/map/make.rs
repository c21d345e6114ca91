//! From a component to the grid of its map.
use super::{Map, RIM, SIDE};
use crate::weights::End;
use std::cell::RefCell;
use std::rc::Rc;
use teasel_core::describe::map::{EXTENT, MapGrid};
use teasel_core::sheet::{Component, Sheet};

/// Smoothing of the spline: so little that the map shows every channel's own value.
const LAMBDA: f64 = 1e-8;

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
        let grid = Rc::new(MapGrid::smoothed(positions, SIDE, LAMBDA).ok()?);
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
            interval: if small {
                Vec::new()
            } else {
                component.pattern_interval.clone()
            },
        })
    }
}
