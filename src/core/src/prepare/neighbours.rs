//! Where channels lie to each other: estimates of one from the others, and who is whose neighbour.
//!
//! * On a head: spherical splines, m = 4, λ = 1e-5 (Perrin, Pernier, Bertrand & Echallier 1989).
//! * On a plane, on a shaft, in a picture: inverse squared distance over the nearest channels (Shepard 1968, *Proc. 23rd ACM Nat. Conf.*
//!   517–524), 8 of them on a surface, 4 on a line.
//!
//! Weights of an estimate sum to 1 either way, so what all channels share passes unchanged.
use crate::describe::spline::Spline;
use crate::error::{Kind, Problem, Result};
use crate::recording::{Layout, Recording};
use crate::sheet::ChannelCard;
use nalgebra::DMatrix;

/// Places of all recorded channels.
#[derive(Debug, Clone)]
pub(super) struct Places {
    at: Vec<Option<[f64; 3]>>,
    /// Nearest channels that an estimate is made of; `None` on a head.
    nearest: Option<usize>,
}

impl Places {
    /// The cards' positions, which the recipe may have told: directions on a head, metres elsewhere. Pixels lie where the picture has them.
    pub(super) fn of(recording: &Recording, cards: &[ChannelCard]) -> Self {
        if let Layout::Frames { width, pixels, .. } = &recording.layout {
            let width = f64::from((*width).max(1));
            let place = |p: &u32| {
                let p = f64::from(*p);
                Some([p % width, (p / width).floor(), 0.0])
            };
            return Places {
                at: pixels.iter().map(place).collect(),
                nearest: Some(8),
            };
        }
        let at: Vec<Option<[f64; 3]>> = cards.iter().map(|c| c.position).collect();
        let all = |holds: fn(&[f64; 3]) -> bool| at.iter().flatten().all(holds);
        let nearest = if all(|p| (p.iter().map(|v| v * v).sum::<f64>() - 1.0).abs() < 1e-6) {
            None
        } else if all(|p| p[0] == 0.0 && p[1] == 0.0) {
            Some(4)
        } else {
            Some(8)
        };
        Places { at, nearest }
    }

    /// How an estimate is made, in words.
    pub(super) fn method(&self) -> &'static str {
        match self.nearest {
            None => "spherical splines",
            Some(_) => "inverse squared distance",
        }
    }

    /// The place of a channel, where it is known.
    pub(super) fn get(&self, channel: usize) -> Option<[f64; 3]> {
        self.at.get(channel).copied().flatten()
    }

    /// Weights of the estimates of `targets` from `sources`, both with known places: `targets × sources`.
    pub(super) fn weights(&self, targets: &[usize], sources: &[usize]) -> Result<DMatrix<f64>> {
        let of = |list: &[usize]| -> Vec<[f64; 3]> {
            list.iter().filter_map(|c| self.get(*c)).collect()
        };
        let (wanted, known) = (of(targets), of(sources));
        match self.nearest {
            None => Ok(Spline::new(&known, 4, 1e-5)?.matrix(&wanted)),
            Some(_) if known.is_empty() => Err(Problem::new(
                Kind::Contrast,
                "no channel with a known place is left to estimate from",
                "interpolate fewer channels, or add a file with positions",
            )),
            Some(count) => {
                let mut weights = DMatrix::zeros(wanted.len(), known.len());
                for (i, place) in wanted.iter().enumerate() {
                    for (j, weight) in shepard(*place, &known, count, None) {
                        weights[(i, j)] = weight;
                    }
                }
                Ok(weights)
            }
        }
    }

    /// Weights of the estimate of each of `channels` (all with known places) from the others among them.
    pub(super) fn leave_one_out(&self, channels: &[usize]) -> Result<DMatrix<f64>> {
        let known: Vec<[f64; 3]> = channels.iter().filter_map(|c| self.get(*c)).collect();
        let Some(count) = self.nearest else {
            return Ok(Spline::new(&known, 4, 1e-5)?.leave_one_out());
        };
        let mut weights = DMatrix::zeros(known.len(), known.len());
        for (i, place) in known.iter().enumerate() {
            for (j, weight) in shepard(*place, &known, count, Some(i)) {
                weights[(i, j)] = weight;
            }
        }
        Ok(weights)
    }

    /// The edges of the shortest tree that joins `channels` (Prim 1957, *Bell Syst. Tech. J.* 36:1389–1401), each as positions in that list, the
    /// earlier channel first, in order of the first. `None` where a place is not known.
    pub(super) fn tree(&self, channels: &[usize]) -> Option<Vec<[usize; 2]>> {
        let places = channels
            .iter()
            .map(|c| self.get(*c))
            .collect::<Option<Vec<_>>>()?;
        let n = places.len();
        let mut near = vec![(f64::INFINITY, 0usize); n];
        let mut inside = vec![false; n];
        let mut edges = Vec::with_capacity(n.saturating_sub(1));
        let mut at = 0;
        for _ in 1..n {
            inside[at] = true;
            for k in (0..n).filter(|k| !inside[*k]) {
                let d = squared(places[at], places[k]);
                if d < near[k].0 {
                    near[k] = (d, at);
                }
            }
            let outside = (0..n).filter(|k| !inside[*k]);
            at = outside.min_by(|a, b| near[*a].0.total_cmp(&near[*b].0))?;
            let from = near[at].1;
            edges.push([from.min(at), from.max(at)]);
        }
        edges.sort_unstable();
        Some(edges)
    }
}

fn squared(a: [f64; 3], b: [f64; 3]) -> f64 {
    (0..3).map(|k| (a[k] - b[k]).powi(2)).sum()
}

/// The nearest `count` of `known` but `without`, with weights by inverse squared distance; a channel in the very place alone.
fn shepard(
    place: [f64; 3],
    known: &[[f64; 3]],
    count: usize,
    without: Option<usize>,
) -> Vec<(usize, f64)> {
    let mut far: Vec<(usize, f64)> = (0..known.len())
        .filter(|j| Some(*j) != without)
        .map(|j| (j, squared(place, known[j])))
        .collect();
    far.sort_by(|a, b| a.1.total_cmp(&b.1));
    far.truncate(count);
    if let Some((j, _)) = far.first().filter(|(_, d)| *d == 0.0) {
        return vec![(*j, 1.0)];
    }
    let sum: f64 = far.iter().map(|(_, d)| 1.0 / d).sum();
    far.iter().map(|(j, d)| (*j, 1.0 / d / sum)).collect()
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a panic is the failure of a test")]
    use super::*;

    fn line(depths: &[f64]) -> Places {
        Places {
            at: depths.iter().map(|z| Some([0.0, 0.0, -z])).collect(),
            nearest: Some(4),
        }
    }

    #[test]
    fn on_a_shaft_the_tree_joins_contacts_in_order_of_depth() {
        let places = line(&[0.0, 3.0, 1.0, 2.0]);
        let tree = places.tree(&[0, 1, 2, 3]);
        assert_eq!(tree, Some(vec![[0, 2], [1, 3], [2, 3]]));
    }

    #[test]
    fn an_estimate_on_a_line_weighs_by_inverse_squared_distance() {
        let places = line(&[0.0, 1.0, 3.0]);
        let weights = places.weights(&[1], &[0, 2]).unwrap();
        // 1/1² and 1/2² over their sum.
        assert!((weights[(0, 0)] - 0.8).abs() < 1e-15);
        assert!((weights[(0, 1)] - 0.2).abs() < 1e-15);
    }

    #[test]
    fn leaving_each_out_of_one_spline_is_the_spline_of_the_others() {
        let names = ["Fz", "Cz", "Pz", "C3", "C4", "F3", "P4"];
        let at: Vec<_> = names
            .iter()
            .map(|n| crate::describe::positions::standard(n))
            .collect();
        let places = Places { at, nearest: None };
        let all: Vec<usize> = (0..names.len()).collect();
        let whole = places.leave_one_out(&all).unwrap();
        for i in 0..names.len() {
            let others: Vec<usize> = all.iter().copied().filter(|j| *j != i).collect();
            let row = places.weights(&[i], &others).unwrap();
            for (k, j) in others.iter().enumerate() {
                assert!((whole[(i, *j)] - row[(0, k)]).abs() < 1e-10, "{i} {j}");
            }
        }
    }
}
