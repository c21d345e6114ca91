//! Electrode positions of the 10–20, 10–10 and 10–05 systems on the unit sphere.
//!
//! Computed from the published construction (Oostenveld & Praamstra 2001, *Clin. Neurophysiol.* 112:713–719), carried over to a sphere:
//!
//! * The midline runs from nasion (`Nz`, 0 %) over the vertex (`Cz`, 50 %) to inion (`Iz`, 100 %) in steps of 5 %. `Fpz` (10 %)
//!   and `Oz` (90 %) lie on the equator, so that 5 % are 11.25° and `Nz` and `Iz` lie 22.5° below it.
//! * Each half of the circumference at the level Fpz–T7–Oz–T8 (the equator) is divided in steps of 5 % = 9°.
//! * Every coronal contour is the circle through its two points of the circumference and its point of the midline; each half of it
//!   is divided in eight equal parts (`F7 F7h F5 F5h F3 F3h F1 F1h Fz`).
//! * The rows 9h and 9 (`T9h`, `T9` …, and likewise `NFp` and `N` before, `OI` and `I` behind) lie 11.25° and 22.5° below the
//!   equator, where the circumference Nz–T9–Iz is divided as the upper one is.
//!
//! `A1`, `A2` (ear lobes) and `M1`, `M2` (mastoids) are no part of that system. They stand a further 11.25° below `T9`, `T10` and
//! `TP9`, `TP10`: common practice, no source.
//!
//! # Axis order
//! x to the right ear, y to the nasion, z up.
use std::collections::HashMap;
use std::f64::consts::PI;
use std::sync::OnceLock;

/// 5 % of the midline from nasion to inion, and of the descent below the equator.
const FIVE_PERCENT: f64 = PI / 16.0;

/// Coronal contours: prefix near the midline, prefix near and below the circumference, percent of the midline.
const CONTOURS: [(&str, &str, f64); 15] = [
    ("AFP", "AFP", 15.0),
    ("AF", "AF", 20.0),
    ("AFF", "AFF", 25.0),
    ("F", "F", 30.0),
    ("FFC", "FFT", 35.0),
    ("FC", "FT", 40.0),
    ("FCC", "FTT", 45.0),
    ("C", "T", 50.0),
    ("CCP", "TTP", 55.0),
    ("CP", "TP", 60.0),
    ("CPP", "TPP", 65.0),
    ("P", "P", 70.0),
    ("PPO", "PPO", 75.0),
    ("PO", "PO", 80.0),
    ("POO", "POO", 85.0),
];

/// Rows before the first and behind the last contour: prefix, whether behind, steps of 11.25° below the equator.
const ENDS: [(&str, bool, f64); 6] = [
    ("FP", false, 0.0),
    ("NFP", false, 1.0),
    ("N", false, 2.0),
    ("O", true, 0.0),
    ("OI", true, 1.0),
    ("I", true, 2.0),
];

/// What may stand behind an electrode's name as its reference without making the channel bipolar.
const REFERENCES: [&str; 24] = [
    "REF", "REF1", "REF2", "R", "A1", "A2", "M1", "M2", "A1A2", "M1M2", "A1+A2", "M1+M2", "A12",
    "AR", "AA", "AV", "AVG", "AVE", "AVR", "CAR", "LE", "LER", "LM", "NOSE",
];

/// The same place under an older name.
const OLD_NAMES: [(&str, &str); 4] = [("T3", "T7"), ("T4", "T8"), ("T5", "P7"), ("T6", "P8")];

/// Position of a standard electrode name (any case; `T3`, `T4`, `T5`, `T6` as the old names of `T7`, `T8`, `P7`, `P8`):
/// x to the right ear, y to the nasion, z up.
///
/// Labels as they stand in recordings are understood: `EEG Fz-REF`, `EEG FP1-A1`, `Fz-Ref`, `Fc5.`. A difference of two
/// electrodes (`C3-C4`) has no position.
pub fn standard(name: &str) -> Option<[f64; 3]> {
    let label = name.trim().trim_end_matches('.').to_uppercase();
    if let Some(found) = electrode(&label) {
        return Some(found);
    }
    let label = label.strip_prefix("EEG").map_or(label.as_str(), |rest| {
        rest.trim_start_matches([' ', '_', ':', '-'])
    });
    let (first, second) = match label.find(['-', '–', '/', '_', ' ']) {
        Some(at) => (
            &label[..at],
            label[at..].trim_matches(['-', '–', '/', '_', ' ', '.', '(', ')']),
        ),
        None => (label, ""),
    };
    let plain = second.is_empty() || REFERENCES.contains(&second);
    let ears_apart = is_ear(first) && is_ear(second);
    (plain && !ears_apart).then(|| electrode(first)).flatten()
}

/// A position on the plane: azimuthal equidistant about the vertex, radius 1 at the equator (the circle of Fpz, T7, Oz, T8).
/// The vector need not have length 1; the point opposite the vertex, radius 2, is put behind.
pub fn flat(position: [f64; 3]) -> [f64; 2] {
    let [x, y, z] = position;
    let level = x.hypot(y);
    let radius = level.atan2(z) / (PI / 2.0);
    if level > 0.0 {
        [radius * x / level, radius * y / level]
    } else {
        [0.0, -radius]
    }
}

/// The inverse of [`flat`].
pub fn sphere(flat: [f64; 2]) -> [f64; 3] {
    let [x, y] = flat;
    let radius = x.hypot(y);
    let angle = radius * PI / 2.0;
    let scale = if radius > 0.0 {
        angle.sin() / radius
    } else {
        0.0
    };
    [x * scale, y * scale, angle.cos()]
}

/// Positions as directions from the centre of the head.
///
/// Positions of length 1 (within 0.1 %) are kept. Otherwise the centre is that of the sphere that fits them best (linear least squares on
/// |p|² = 2 p·c + k), if there are at least 8, the sphere fits (root mean square distance at most 15 % of its radius) and its centre
/// lies within a radius of the origin; else the origin. A position at the centre has no direction: `None`.
pub fn to_unit_sphere(positions: &[[f64; 3]]) -> Vec<Option<[f64; 3]>> {
    let length = |p: &[f64; 3]| p.iter().map(|v| v * v).sum::<f64>().sqrt();
    let unit_already = positions.iter().all(|p| (length(p) - 1.0).abs() < 1e-3);
    let centre = if unit_already {
        None
    } else {
        fitted_centre(positions)
    }
    .unwrap_or([0.0; 3]);
    positions
        .iter()
        .map(|p| {
            let away = [p[0] - centre[0], p[1] - centre[1], p[2] - centre[2]];
            let distance = length(&away);
            (distance.is_finite() && distance > 0.0).then(|| away.map(|v| v / distance))
        })
        .collect()
}

fn fitted_centre(positions: &[[f64; 3]]) -> Option<[f64; 3]> {
    let n = positions.len();
    if n < 8 || positions.iter().flatten().any(|v| !v.is_finite()) {
        return None;
    }
    // Scaled by the largest coordinate, so that metres and millimetres give the same equations.
    let scale = positions
        .iter()
        .flatten()
        .fold(0.0, |most: f64, v| v.abs().max(most));
    let at = |i: usize, j: usize| positions[i][j] / scale;
    let system = nalgebra::DMatrix::from_fn(n, 4, |i, j| if j < 3 { 2.0 * at(i, j) } else { 1.0 });
    let right = nalgebra::DVector::from_fn(n, |i, _| (0..3).map(|j| at(i, j).powi(2)).sum::<f64>());
    let fit = system.svd(true, true).solve(&right, 1e-9).ok()?;
    let centre = [fit[0], fit[1], fit[2]];
    let shift = centre.iter().map(|v| v * v).sum::<f64>();
    let radius = (fit[3] + shift).sqrt();
    let off = |i: usize| {
        let distance = (0..3)
            .map(|j| (at(i, j) - centre[j]).powi(2))
            .sum::<f64>()
            .sqrt();
        (distance - radius).powi(2)
    };
    let misfit = ((0..n).map(off).sum::<f64>() / n as f64).sqrt();
    (misfit <= 0.15 * radius && shift.sqrt() <= radius).then(|| centre.map(|v| v * scale))
}

fn is_ear(label: &str) -> bool {
    matches!(label, "A1" | "A2" | "M1" | "M2")
}

fn electrode(upper: &str) -> Option<[f64; 3]> {
    static TABLE: OnceLock<HashMap<String, [f64; 3]>> = OnceLock::new();
    TABLE.get_or_init(table).get(upper).copied()
}

/// All names in capitals.
fn table() -> HashMap<String, [f64; 3]> {
    let mut all = HashMap::new();
    for (medial, lateral, percent) in CONTOURS {
        add_contour(&mut all, medial, lateral, percent);
    }
    for (prefix, behind, below) in ENDS {
        let turn = |degrees: f64| if behind { 180.0 - degrees } else { degrees };
        all.insert(format!("{prefix}Z"), around(turn(0.0), below));
        add_pair(&mut all, prefix, "1H", "2H", around(turn(9.0), below));
        add_pair(&mut all, prefix, "1", "2", around(turn(18.0), below));
    }
    add_pair(&mut all, "A", "1", "2", around(90.0, 3.0));
    add_pair(&mut all, "M", "1", "2", around(108.0, 3.0));
    for (old, new) in OLD_NAMES {
        if let Some(&place) = all.get(new) {
            all.insert(old.to_owned(), place);
        }
    }
    all
}

fn add_contour(all: &mut HashMap<String, [f64; 3]>, medial: &str, lateral: &str, percent: f64) {
    // Both scales meet in their names: AFz stands at 20 % of the midline, AF7 at 20 % of the half circumference from Fpz to Oz.
    let azimuth = percent * 1.8;
    let from_vertex = (50.0 - percent) / 5.0 * FIVE_PERCENT;
    let top = [0.0, from_vertex.sin(), from_vertex.cos()];
    let side = around(azimuth, 0.0);
    all.insert(format!("{medial}Z"), top);
    let steps = [
        (medial, "1H", "2H"),
        (medial, "1", "2"),
        (medial, "3H", "4H"),
        (medial, "3", "4"),
        (medial, "5H", "6H"),
        (medial, "5", "6"),
        (lateral, "7H", "8H"),
        (lateral, "7", "8"),
    ];
    for (step, (prefix, left, right)) in steps.into_iter().enumerate() {
        add_pair(
            all,
            prefix,
            left,
            right,
            on_contour(top, side, (step + 1) as f64 / 8.0),
        );
    }
    add_pair(all, lateral, "9H", "10H", around(azimuth, 1.0));
    add_pair(all, lateral, "9", "10", around(azimuth, 2.0));
}

/// A left place and its mirror image.
fn add_pair(
    all: &mut HashMap<String, [f64; 3]>,
    prefix: &str,
    left: &str,
    right: &str,
    place: [f64; 3],
) {
    let [x, y, z] = place;
    all.insert(format!("{prefix}{left}"), place);
    all.insert(format!("{prefix}{right}"), [-x, y, z]);
}

/// On the left, `degrees` from the front, `below` steps of 11.25° under the equator.
fn around(degrees: f64, below: f64) -> [f64; 3] {
    let azimuth = degrees.to_radians();
    let latitude = -below * FIVE_PERCENT;
    [
        -azimuth.sin() * latitude.cos(),
        azimuth.cos() * latitude.cos(),
        latitude.sin(),
    ]
}

/// The point a `share` of the way from `top` (0, on the midline) to `side` (1), along the circle through both and `side`'s mirror image.
fn on_contour(top: [f64; 3], side: [f64; 3], share: f64) -> [f64; 3] {
    // The circle lies in a plane that contains the x axis' direction; `down` points within that plane from the top to the line between the sides.
    let (dy, dz) = (side[1] - top[1], side[2] - top[2]);
    let height = dy.hypot(dz);
    let down = [dy / height, dz / height];
    let half_width = -side[0];
    // From a chord of half width w at depth d below the top: radius r = (w² + d²) / 2d.
    let radius = (half_width * half_width + height * height) / (2.0 * height);
    let whole = half_width.atan2(radius - height);
    let angle = share * whole;
    let depth = radius * (1.0 - angle.cos());
    [
        -radius * angle.sin(),
        top[1] + down[0] * depth,
        top[2] + down[1] * depth,
    ]
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a failed look-up is a failed check")]
    use super::*;

    fn distance(a: [f64; 3], b: [f64; 3]) -> f64 {
        (0..3).map(|i| (a[i] - b[i]).powi(2)).sum::<f64>().sqrt()
    }

    #[test]
    fn every_position_lies_on_the_sphere_and_stands_alone() {
        let all: Vec<(String, [f64; 3])> = table()
            .into_iter()
            .filter(|(name, _)| !OLD_NAMES.iter().any(|(old, _)| old == name))
            .collect();
        // 15 contours of 21 places, 6 rows of 5, ears and mastoids.
        assert_eq!(all.len(), 15 * 21 + 6 * 5 + 4);
        for (i, (name, place)) in all.iter().enumerate() {
            let length = place.iter().map(|v| v * v).sum::<f64>().sqrt();
            assert!((length - 1.0).abs() < 1e-14, "{name}: {length}");
            for (other, there) in &all[..i] {
                assert!(
                    distance(*place, *there) > 0.02,
                    "{name} and {other} coincide"
                );
            }
        }
    }

    #[test]
    fn contours_are_divided_equally() {
        let at = |name| standard(name).unwrap();
        for row in [
            ["F7", "F5", "F3", "F1", "Fz", "F2", "F4", "F6", "F8"],
            ["T7", "C5", "C3", "C1", "Cz", "C2", "C4", "C6", "T8"],
        ] {
            let first = distance(at(row[0]), at(row[1]));
            for pair in row.windows(2) {
                assert!(
                    (distance(at(pair[0]), at(pair[1])) - first).abs() < 1e-14,
                    "{pair:?}"
                );
            }
        }
        assert!(distance(at("C3"), [-(0.5f64.sqrt()), 0.0, 0.5f64.sqrt()]) < 1e-15);
        assert!(distance(at("Fz"), [0.0, 0.5f64.sqrt(), 0.5f64.sqrt()]) < 1e-15);
    }

    #[test]
    fn flat_and_sphere_are_inverse() {
        for (name, place) in table() {
            assert!(distance(sphere(flat(place)), place) < 1e-14, "{name}");
        }
        assert_eq!(flat([0.0, 0.0, 1.0]), [0.0, 0.0]);
        assert_eq!(flat([0.0, 0.0, -1.0]), [0.0, -2.0]);
    }
}
