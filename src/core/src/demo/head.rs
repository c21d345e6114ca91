//! A round head: where the channels sit on it, and how a current dipole inside appears on them.
//!
//! Axes: x to the right ear, y to the nose, z up; the head is the unit sphere.

/// A point or a direction.
pub(super) type Vec3 = [f64; 3];

/// The channels: name, degrees down from the vertex, degrees from the nose (to the right positive).
/// Rounded from the angles that the 10–20 and 10–10 systems give on a sphere.
pub(super) const CHANNELS: [(&str, f64, f64); 32] = [
    ("Fp1", 90.0, -18.0),
    ("Fp2", 90.0, 18.0),
    ("AF3", 74.0, -23.0),
    ("AF4", 74.0, 23.0),
    ("F7", 90.0, -54.0),
    ("F3", 60.0, -39.0),
    ("Fz", 45.0, 0.0),
    ("F4", 60.0, 39.0),
    ("F8", 90.0, 54.0),
    ("FC5", 69.0, -69.0),
    ("FC1", 31.0, -44.0),
    ("FC2", 31.0, 44.0),
    ("FC6", 69.0, 69.0),
    ("T7", 90.0, -90.0),
    ("C3", 45.0, -90.0),
    ("Cz", 0.0, 0.0),
    ("C4", 45.0, 90.0),
    ("T8", 90.0, 90.0),
    ("CP5", 69.0, -111.0),
    ("CP1", 31.0, -136.0),
    ("CP2", 31.0, 136.0),
    ("CP6", 69.0, 111.0),
    ("P7", 90.0, -126.0),
    ("P3", 60.0, -141.0),
    ("Pz", 45.0, 180.0),
    ("P4", 60.0, 141.0),
    ("P8", 90.0, 126.0),
    ("PO3", 74.0, -157.0),
    ("PO4", 74.0, 157.0),
    ("O1", 90.0, -162.0),
    ("Oz", 90.0, 180.0),
    ("O2", 90.0, 162.0),
];

/// The two ears, whose mean is the reference.
const EARS: [(f64, f64); 2] = [(112.0, -100.0), (112.0, 100.0)];

/// The point `radius` from the centre towards the given angles.
pub(super) fn point(radius: f64, down_deg: f64, round_deg: f64) -> Vec3 {
    let (down, round) = (down_deg.to_radians(), round_deg.to_radians());
    [
        radius * down.sin() * round.sin(),
        radius * down.sin() * round.cos(),
        radius * down.cos(),
    ]
}

/// A dipole: where it sits, and its moment.
#[derive(Debug, Clone, Copy)]
pub(super) struct Dipole {
    pub(super) at: Vec3,
    pub(super) moment: Vec3,
}

impl Dipole {
    /// Pointing away from the centre.
    pub(super) fn outward(at: Vec3) -> Self {
        Dipole { at, moment: at }
    }

    /// Potential at `r` in an unbounded conductor, up to a factor: m·(r−p)/|r−p|³.
    fn potential(&self, r: Vec3) -> f64 {
        let d = [0, 1, 2].map(|i| r[i] - self.at[i]);
        let square: f64 = d.iter().map(|x| x * x).sum();
        let along: f64 = d.iter().zip(self.moment).map(|(x, m)| x * m).sum();
        along / (square * square.sqrt())
    }
}

/// How dipoles that act together appear on the channels against the ears; the largest entry is 1.
pub(super) fn pattern(dipoles: &[Dipole]) -> Vec<f64> {
    let seen = |r: Vec3| dipoles.iter().map(|d| d.potential(r)).sum::<f64>();
    let reference = EARS
        .map(|(down, round)| seen(point(1.0, down, round)))
        .iter()
        .sum::<f64>()
        / 2.0;
    let mut weights: Vec<f64> = CHANNELS
        .iter()
        .map(|&(_, down, round)| seen(point(1.0, down, round)) - reference)
        .collect();
    let largest = weights.iter().fold(
        0.0,
        |best: f64, w| if w.abs() > best.abs() { *w } else { best },
    );
    weights.iter_mut().for_each(|w| *w /= largest);
    weights
}
