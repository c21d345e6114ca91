//! Positions of electrodes: `*_electrodes.tsv` with `*_coordsystem.json` as BIDS describes them, or a table of name, x, y and perhaps z.
//!
//! # Axis order
//! What is kept has x to the right, y to the front and z up. Where the coordinate file gives the landmarks (nasion, and the points before both
//! ears) they decide; else, where at least six channels have standard names, the turn about the vertical that agrees with those names; else the
//! coordinates are taken as they stand, and a warning says so.
//!
//! # Which layout
//! Electrodes with a z lie on a head, unless a side file says that they are on or in the brain: those lie on a line or a plane where they do to
//! within a tenth and a fifth of its extent (common practice, no source), and have no map otherwise. Electrodes without a z lie on a plane.
use super::facts::Coordinates;
use super::table::{Header, Table, broken};
use crate::describe::positions::standard;
use crate::error::Result;
use crate::recording::{Layout, Recording, SideFile};

const WHAT: &str = "the table of electrodes";
/// Names that columns may have.
const NAMES: [&str; 5] = ["name", "channel", "label", "electrode", "contact"];
/// A second extent below this share of the first is a line.
const LINE: f64 = 0.1;
/// A third extent below this share of the second is a plane.
const PLANE: f64 = 0.2;
/// Standard names needed to judge the axes by.
const FEWEST_NAMES: usize = 6;

/// Columns of a table of positions.
struct Columns {
    name: Option<usize>,
    x: usize,
    y: usize,
    z: Option<usize>,
}

impl Columns {
    /// By their names; a table that names none is name, x, y, z, or x, y, z in the order of the channels.
    fn find(table: &Table<'_>) -> Option<Columns> {
        let unnamed = |k: usize| {
            table
                .columns
                .get(k)
                .is_some_and(|c| *c == format!("column {}", k + 1))
        };
        if (0..table.columns.len()).all(unnamed) {
            return match table.columns.len() {
                2 => Some(Columns {
                    name: None,
                    x: 0,
                    y: 1,
                    z: None,
                }),
                3 => Some(Columns {
                    name: Some(0),
                    x: 1,
                    y: 2,
                    z: None,
                }),
                4 => Some(Columns {
                    name: Some(0),
                    x: 1,
                    y: 2,
                    z: Some(3),
                }),
                _ => None,
            };
        }
        Some(Columns {
            name: table.column(&NAMES),
            x: table.column(&["x"])?,
            y: table.column(&["y"])?,
            z: table.column(&["z"]),
        })
    }
}

/// Whether the head of a table is one of positions: x and y named, or a name and two or three numbers without names of columns.
pub(super) fn looks_like(side: &SideFile, channels: &[&str]) -> bool {
    let Ok(mut table) = Table::open(side, Header::Maybe, WHAT) else {
        return false;
    };
    let Some(columns) = Columns::find(&table) else {
        return false;
    };
    if table.column(&["x"]).is_some() {
        return true;
    }
    let (mut rows, mut known) = (0, 0);
    while let Ok(Some(row)) = table.next() {
        rows += 1;
        let label = columns.name.and_then(|c| row.text(c)).unwrap_or_default();
        known += usize::from(channels.iter().any(|c| super::alike(c, &label)));
    }
    match columns.name {
        Some(_) => known * 2 > rows,
        None => rows == channels.len(),
    }
}

/// Uses a table of positions.
pub(super) fn apply(
    recording: &mut Recording,
    side: &SideFile,
    system: Option<&Coordinates>,
) -> Result<()> {
    let placed = read(recording, side).map_err(|p| p.in_file(side.name.as_str()))?;
    if placed.iter().all(Option::is_none) {
        recording.warnings.push(format!(
            "{} was not used: it gives none of the recording's channels a position.",
            side.name
        ));
        return Ok(());
    }
    let none = Coordinates::default();
    let system = system.unwrap_or(&none);
    place(recording, &placed, system, &side.name);
    recording.about.positions = Some(side.name.clone());
    recording.side_files.push(side.name.clone());
    Ok(())
}

/// For each channel x, y and, where it is given, z, as they stand in the table.
type Placed = Vec<Option<(f64, f64, Option<f64>)>>;

fn read(recording: &mut Recording, side: &SideFile) -> Result<Placed> {
    let mut table = Table::open(side, Header::Maybe, WHAT)?;
    let columns = Columns::find(&table).ok_or_else(|| {
        broken("the table of electrodes has no columns of coordinates")
            .at("line 1")
            .expected_found(
                "columns named name, x, y and perhaps z",
                table.columns.join(", "),
            )
    })?;
    let mut placed: Placed = vec![None; recording.channels.len()];
    let (mut unknown, mut twice, mut index) = (0, 0, 0);
    while let Some(row) = table.next()? {
        let at = match columns.name {
            Some(name) => row
                .text(name)
                .and_then(|label| super::channel_named(recording, &label)),
            None => Some(index).filter(|i| *i < placed.len()),
        };
        index += 1;
        let coordinate = |column: usize| row.number(column, "a coordinate, or n/a");
        let (x, y) = (coordinate(columns.x)?, coordinate(columns.y)?);
        let z = columns.z.map(coordinate).transpose()?.flatten();
        match (at, x.zip(y)) {
            (None, _) => unknown += 1,
            (Some(at), Some((x, y))) if placed[at].is_none() => placed[at] = Some((x, y, z)),
            (Some(_), Some(_)) => twice += 1,
            (Some(_), None) => {}
        }
    }
    if unknown > 0 && placed.iter().any(Option::is_some) {
        recording.warnings.push(format!(
            "{unknown} rows of {} belong to none of the recording's channels.",
            side.name
        ));
    }
    if twice > 0 {
        recording.warnings.push(format!(
            "{} places {twice} channels twice; the first row of each counts.",
            side.name
        ));
    }
    Ok(placed)
}

fn place(recording: &mut Recording, placed: &Placed, system: &Coordinates, file: &str) {
    let deep = placed
        .iter()
        .flatten()
        .any(|p| p.2.is_some_and(|z| z != 0.0));
    let kinds = &recording.about.kinds;
    let inside = system.inside
        || kinds
            .values()
            .any(|k| matches!(k.as_str(), "ECOG" | "SEEG" | "DBS"));
    let unit_m = system.unit_m.unwrap_or(1e-3);
    let at = |p: &(f64, f64, Option<f64>)| [p.0, p.1, p.2.unwrap_or(0.0)].map(|v| v * unit_m);
    let mut all: Vec<Option<[f64; 3]>> = placed.iter().map(|p| p.as_ref().map(at)).collect();
    if !deep {
        // Rows of a picture count downwards.
        if system.pixels {
            all.iter_mut().flatten().for_each(|p| p[1] = -p[1]);
        }
        recording.layout = Layout::Plane;
    } else if inside {
        arrange(recording, &mut all, file);
    } else {
        let marks = system.landmarks.map(|m| m.map(|p| p.map(|v| v * unit_m)));
        let known = turn(recording, &mut all, marks);
        if !known {
            recording.warnings.push(format!(
                "{file} does not say which way its axes point; x is taken as right, y as front and z as up."
            ));
        }
        recording.layout = Layout::Head;
    }
    for (channel, place) in recording.channels.iter_mut().zip(all) {
        channel.position = place;
    }
}

/// Turns positions so that x points right, y to the front and z up; whether it is known that they now do.
fn turn(recording: &Recording, all: &mut [Option<[f64; 3]>], marks: Option<[[f64; 3]; 3]>) -> bool {
    if let Some((origin, axes)) = marks.and_then(frame) {
        for place in all.iter_mut().flatten() {
            let away = minus(*place, origin);
            *place = axes.map(|axis| dot(axis, away));
        }
        return true;
    }
    // By the names: quarter turns about the vertical, of which the one that agrees best is taken.
    let mut agreement = [0.0; 4];
    let centre = mean(all.iter().flatten().copied());
    let mut named = 0;
    for (channel, place) in recording.channels.iter().zip(all.iter()) {
        let (Some(wanted), Some(place)) = (standard(&channel.name), place) else {
            continue;
        };
        named += 1;
        let mut away = minus(*place, centre);
        for sum in &mut agreement {
            *sum += dot(wanted, away);
            away = quarter(away);
        }
    }
    if named < FEWEST_NAMES {
        return false;
    }
    let best = (0..4)
        .max_by(|a, b| agreement[*a].total_cmp(&agreement[*b]))
        .unwrap_or(0);
    for place in all.iter_mut().flatten() {
        for _ in 0..best {
            *place = quarter(*place);
        }
    }
    true
}

/// A quarter turn about the vertical against the clock.
fn quarter([x, y, z]: [f64; 3]) -> [f64; 3] {
    [-y, x, z]
}

/// Origin and axes from nasion, left and right: x from left to right, y towards the nasion, z up.
fn frame([nasion, left, right]: [[f64; 3]; 3]) -> Option<([f64; 3], [[f64; 3]; 3])> {
    let origin = mean([left, right].into_iter());
    let x = unit(minus(right, left))?;
    let front = minus(nasion, origin);
    let along = dot(front, x);
    let y = unit([0, 1, 2].map(|k| front[k] - along * x[k]))?;
    let z = [
        x[1] * y[2] - x[2] * y[1],
        x[2] * y[0] - x[0] * y[2],
        x[0] * y[1] - x[1] * y[0],
    ];
    Some((origin, [x, y, z]))
}

/// Electrodes on or in the brain: on a line or a plane where they lie on one, without a map otherwise.
fn arrange(recording: &mut Recording, all: &mut [Option<[f64; 3]>], file: &str) {
    // A plane without places has no map; names mean nothing here, whatever they look like.
    recording.layout = Layout::Plane;
    let known: Vec<[f64; 3]> = all.iter().flatten().copied().collect();
    let Some((centre, axes, extents)) = principal(&known) else {
        all.iter_mut().for_each(|p| *p = None);
        return;
    };
    let along = |p: &[f64; 3], k: usize| dot(minus(*p, centre), axes[k]);
    if extents[1] <= LINE * extents[0] {
        recording.layout = Layout::Line;
        let first = along(&known[0], 0);
        let far = known
            .iter()
            .map(|p| along(p, 0) - first)
            .fold(0.0, |m: f64, v| if v.abs() > m.abs() { v } else { m });
        for place in all.iter_mut().flatten() {
            *place = [0.0, 0.0, -(along(place, 0) - first) * far.signum()];
        }
        recording.warnings.push(format!(
            "The contacts of {file} lie on a line; their depth is counted from the first."
        ));
    } else if extents[2] <= PLANE * extents[1] {
        for place in all.iter_mut().flatten() {
            *place = [along(place, 0), along(place, 1), 0.0];
        }
    } else {
        all.iter_mut().for_each(|p| *p = None);
        recording.warnings.push(format!(
            "The electrodes of {file} lie neither on a line nor on a plane: there is no map, and patterns stand in order of size."
        ));
    }
}

/// Centre, axes by falling extent, and the extents (root mean squares).
type Principal = ([f64; 3], [[f64; 3]; 3], [f64; 3]);

/// Where points lie and how far they spread. Each axis points to where its largest entry is positive.
fn principal(points: &[[f64; 3]]) -> Option<Principal> {
    if points.len() < 2 {
        return None;
    }
    let centre = mean(points.iter().copied());
    let scatter = nalgebra::Matrix3::from_fn(|i, j| {
        let product = |p: &[f64; 3]| (p[i] - centre[i]) * (p[j] - centre[j]);
        points.iter().map(product).sum::<f64>() / points.len() as f64
    });
    let eigen = scatter.symmetric_eigen();
    let mut order = [0, 1, 2];
    order.sort_by(|a, b| eigen.eigenvalues[*b].total_cmp(&eigen.eigenvalues[*a]));
    let axes = order.map(|k| {
        let axis = [0, 1, 2].map(|i| eigen.eigenvectors[(i, k)]);
        let largest = axis
            .iter()
            .copied()
            .fold(0.0, |m: f64, v| if v.abs() > m.abs() { v } else { m });
        axis.map(|v| v * largest.signum())
    });
    let extents = order.map(|k| eigen.eigenvalues[k].max(0.0).sqrt());
    (extents[0] > 0.0).then_some((centre, axes, extents))
}

fn dot(a: [f64; 3], b: [f64; 3]) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

fn minus(a: [f64; 3], b: [f64; 3]) -> [f64; 3] {
    [a[0] - b[0], a[1] - b[1], a[2] - b[2]]
}

fn unit(v: [f64; 3]) -> Option<[f64; 3]> {
    let length = dot(v, v).sqrt();
    (length > 1e-9).then(|| v.map(|x| x / length))
}

fn mean(points: impl Iterator<Item = [f64; 3]>) -> [f64; 3] {
    let (mut sum, mut count) = ([0.0; 3], 0usize);
    for p in points {
        (0..3).for_each(|k| sum[k] += p[k]);
        count += 1;
    }
    sum.map(|v| v / count.max(1) as f64)
}
