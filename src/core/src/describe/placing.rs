//! Where the channels of a recording lie: what the recipe says, else what the recording and its side files say, else what their names say.
//!
//! # Units
//! On a head positions are directions from its centre (unit sphere); on a plane and on a line they are metres, as [`Layout`] says.
use super::positions::{standard, to_unit_sphere};
use crate::error::{Kind, Problem, Result};
use crate::recipe::{Along, Channels, Corner, Grid, Order, Positions, Probe};
use crate::recording::{Layout, Recording};

/// Layout and positions of every channel of the recording, in file order.
pub fn placed(recording: &Recording, choices: &Channels) -> (Layout, Vec<Option<[f64; 3]>>) {
    match &choices.positions {
        Some(Positions::Grid(grid)) => (Layout::Plane, on_grid(recording, choices, grid)),
        Some(Positions::Probe(probe)) => (Layout::Line, on_probe(recording, choices, probe)),
        Some(Positions::At(places)) => {
            let given = recording.channels.iter().map(|channel| {
                let place = places.get(&channel.name)?;
                Some([
                    *place.first()?,
                    *place.get(1)?,
                    place.get(2).copied().unwrap_or(0.0),
                ])
            });
            let given: Vec<Option<[f64; 3]>> = given.collect();
            if places.values().any(|place| place.len() == 3) {
                (Layout::Head, on_head(given, |_| None))
            } else {
                (Layout::Plane, given)
            }
        }
        None => {
            let given = recording.channels.iter().map(|c| c.position).collect();
            let places = match recording.layout {
                Layout::Head => on_head(given, |i| standard(&recording.channels[i].name)),
                _ => given,
            };
            (recording.layout.clone(), places)
        }
    }
}

/// Refuses positions that none of the recording's channels take, and grids and probes too small for theirs.
///
/// # Errors
/// `Contrast`, with the place in the recipe.
pub fn check(recording: &Recording, choices: &Channels) -> Result<()> {
    let nobody = |path: &str, expected: String| {
        Problem::new(
            Kind::Contrast,
            "the positions fit none of the recording's channels",
            "correct the names; capitals count",
        )
        .at(format!("recipe, channels.positions.{path}"))
        .expected_found(expected, "none")
    };
    let (path, prefix, most) = match &choices.positions {
        None => return Ok(()),
        Some(Positions::At(places)) => {
            let any = recording
                .channels
                .iter()
                .any(|c| places.contains_key(&c.name));
            return if any {
                Ok(())
            } else {
                Err(nobody("at", "the name of a channel".into()))
            };
        }
        Some(Positions::Grid(g)) => ("grid", &g.prefix, g.rows.saturating_mul(g.columns)),
        Some(Positions::Probe(p)) => ("probe", &p.prefix, usize::MAX),
    };
    let numbers = numbered(recording, choices, prefix.as_deref());
    let count = numbers.iter().flatten().count();
    let expected = || {
        format!(
            "channels called {}1, {0}2, …",
            prefix.as_deref().unwrap_or("")
        )
    };
    if count == 0 {
        return Err(nobody(path, expected()));
    }
    let last = numbers.iter().flatten().copied().max().unwrap_or(0);
    if last >= most {
        return Err(Problem::new(
            Kind::Contrast,
            "the grid has fewer places than its channels need",
            "give it more rows or columns, or the prefix of the channels that belong to it",
        )
        .at("recipe, channels.positions.grid")
        .expected_found(format!("at least {} places", last + 1), most));
    }
    Ok(())
}

/// Directions from the centre of the head; by name where nothing is given.
fn on_head(
    given: Vec<Option<[f64; 3]>>,
    by_name: impl Fn(usize) -> Option<[f64; 3]>,
) -> Vec<Option<[f64; 3]>> {
    let known: Vec<[f64; 3]> = given.iter().flatten().copied().collect();
    let mut placed = to_unit_sphere(&known).into_iter();
    let place = |(i, given): (usize, Option<[f64; 3]>)| match given {
        Some(_) => placed.next().flatten(),
        None => by_name(i),
    };
    given.into_iter().enumerate().map(place).collect()
}

/// The number of each channel on its grid or probe, from 0: what stands behind the prefix, or its place among the analysed channels.
fn numbered(recording: &Recording, choices: &Channels, prefix: Option<&str>) -> Vec<Option<usize>> {
    let mut next = 0;
    let number = |name: &String| match prefix {
        Some(prefix) => {
            let digits = name.strip_prefix(prefix)?;
            let digits = digits.trim_start_matches([' ', '_', '-']);
            digits.parse::<usize>().ok()?.checked_sub(1)
        }
        None => {
            let aside = recording.about.aside.contains_key(name) && !choices.keep.contains(name);
            if aside {
                return None;
            }
            next += 1;
            Some(next - 1)
        }
    };
    recording
        .channels
        .iter()
        .map(|c| &c.name)
        .map(number)
        .collect()
}

fn on_grid(recording: &Recording, choices: &Channels, grid: &Grid) -> Vec<Option<[f64; 3]>> {
    let (rows, columns) = (grid.rows.max(1), grid.columns.max(1));
    let place = |number: usize| {
        if number >= rows.saturating_mul(columns) {
            return None;
        }
        let (row, column) = match grid.along {
            Along::Rows => (number / columns, number % columns),
            Along::Columns => (number % rows, number / rows),
        };
        let (row, column) = match grid.first {
            Corner::TopLeft => (row, column),
            Corner::TopRight => (row, columns - 1 - column),
            Corner::BottomLeft => (rows - 1 - row, column),
            Corner::BottomRight => (rows - 1 - row, columns - 1 - column),
        };
        let step = grid.spacing_mm * 1e-3;
        Some([column as f64 * step, (rows - 1 - row) as f64 * step, 0.0])
    };
    let numbers = numbered(recording, choices, grid.prefix.as_deref());
    numbers.into_iter().map(|n| n.and_then(place)).collect()
}

fn on_probe(recording: &Recording, choices: &Channels, probe: &Probe) -> Vec<Option<[f64; 3]>> {
    let numbers = numbered(recording, choices, probe.prefix.as_deref());
    let last = numbers.iter().flatten().copied().max().unwrap_or(0);
    let place = |number: usize| {
        let steps = match probe.order {
            Order::TopDown => number,
            Order::BottomUp => last - number,
        };
        [0.0, 0.0, -(steps as f64) * probe.spacing_um * 1e-6]
    };
    numbers.into_iter().map(|n| n.map(place)).collect()
}
