//! The two measures: from whitened covariances and labels to directions.
//!
//! A [`Direction`] u lives in the whitened space; its filter is w = V diag(e)^(−1/2) u ([`Space::filter`]) and its variance in
//! window k is uᵀ C_k u. That holds for both measures: a generalised eigenvector w_V in V_C coordinates is u = diag(e)^(1/2) w_V.
use super::linalg::{
    Packed, add_scaled, eigenvalues, eigh, generalised_eigh, gram, packed_len, unpack,
};
use super::space::{Space, pooled};
use crate::recipe::{Measure, Shrink, ShrinkWord};
use nalgebra::DMatrix;

/// ρ of the typical measure unless told otherwise.
pub const RHO: f64 = 0.1;
/// Candidates of γ for the total measure.
pub const GAMMAS: [f64; 6] = [0.0, 1e-3, 1e-2, 3e-2, 0.1, 0.3];

/// A direction in the whitened space and the statistic it was ordered by.
#[derive(Debug, Clone, PartialEq)]
pub struct Direction {
    /// Coordinates in the leading C whitened dimensions.
    pub u: Vec<f64>,
    /// As a factor: exp δ (typical), or λ (total; 1/λ of the exchanged problem at the weaker end).
    pub statistic: f64,
}

/// Both ends of one fit.
#[derive(Debug, Clone, PartialEq)]
pub struct Ends {
    /// By falling statistic.
    pub stronger: Vec<Direction>,
    /// By rising statistic.
    pub weaker: Vec<Direction>,
    /// ρ or γ used.
    pub shrinkage: f64,
}

/// What the fits of one analysis share.
#[derive(Debug, Clone, Copy)]
pub struct Method {
    /// Which measure orders.
    pub measure: Measure,
    /// How it is shrunk.
    pub shrink: Shrink,
    /// Directions wanted at each end.
    pub components: usize,
    /// K, for the inner folds of γ.
    pub folds: usize,
}

impl Method {
    /// ρ, where the measure is typical.
    pub fn rho(&self) -> f64 {
        match self.shrink {
            Shrink::Number(rho) => rho,
            Shrink::Word(_) => RHO,
        }
    }
}

/// The labels of one arrangement, restricted to the windows that are fitted to.
#[derive(Debug, Clone, Copy)]
pub struct Labels<'a> {
    /// Which windows count as signal.
    pub signal: &'a [bool],
    /// Which windows are fitted to.
    pub train: &'a [bool],
}

/// What a fit reads of a space.
#[derive(Debug, Clone, Copy)]
pub struct View<'a> {
    /// The whitened space.
    pub space: &'a Space,
    /// n_k − 1 of every window.
    pub weights: &'a [f64],
    /// Logarithms of the shrunk covariances at this C, for the windows in `train` (typical measure).
    pub logs: &'a [Packed],
    /// Σ‖y‖⁴ over the samples of each window, for C = 1, 2, … (Ledoit–Wolf).
    pub fourth: &'a [Vec<f64>],
    /// C.
    pub keep: usize,
}

/// D = mean_S L − mean_R L over the training windows, packed.
pub fn mean_log_difference(logs: &[Packed], labels: Labels<'_>, keep: usize) -> Packed {
    let mut d = vec![0.0; packed_len(keep)];
    let count = |side: bool| {
        (0..logs.len())
            .filter(|k| labels.train[*k] && labels.signal[*k] == side)
            .count()
    };
    let (ns, nr) = (count(true).max(1) as f64, count(false).max(1) as f64);
    for (k, log) in logs.iter().enumerate().filter(|(k, _)| labels.train[*k]) {
        add_scaled(
            &mut d,
            log,
            if labels.signal[k] {
                1.0 / ns
            } else {
                -1.0 / nr
            },
        );
    }
    d
}

/// Pooled signal and reference covariances of the training windows in V_C coordinates (not whitened).
fn sides(view: View<'_>, labels: Labels<'_>) -> (DMatrix<f64>, DMatrix<f64>) {
    let len = packed_len(view.keep);
    let side = |signal: bool| {
        let packed = if signal && !view.space.courses.is_empty() {
            repeated(view, labels)
        } else {
            pooled(&view.space.covariances, view.weights, len, |k| {
                labels.train[k] && labels.signal[k] == signal
            })
        };
        let mut full = unpack(&packed, view.keep);
        for i in 0..view.keep {
            for j in 0..view.keep {
                full[(i, j)] *= (view.space.eigenvalues[i] * view.space.eigenvalues[j]).sqrt();
            }
        }
        full
    };
    (side(true), side(false))
}

/// Number of trials times the covariance of their signed average, whitened and packed: the average's power in units of what is
/// left of as many trials that share nothing (de Cheveigné & Simon 2008).
fn repeated(view: View<'_>, labels: Labels<'_>) -> Packed {
    let (n, c) = (view.space.dimensions(), view.keep);
    let stride = c.next_multiple_of(4);
    let trials: Vec<usize> = (0..view.space.courses.len())
        .filter(|t| labels.train[2 * t])
        .collect();
    let samples = view.space.courses.first().map_or(0, |z| z.len() / n);
    let mut sum = vec![0.0; stride * samples];
    for t in &trials {
        let sign = if labels.signal[2 * t] { 1.0 } else { -1.0 };
        let rows = view.space.courses[*t].chunks_exact(n);
        for (into, row) in sum.chunks_exact_mut(stride).zip(rows) {
            add_scaled(into, &row[..c], sign);
        }
    }
    let scale = 1.0 / (trials.len().max(1) as f64 * (samples.max(2) - 1) as f64);
    let mut packed = gram(&sum, c, stride);
    packed.iter_mut().for_each(|x| *x *= scale);
    packed
}

fn shrunk(a: &DMatrix<f64>, gamma: f64) -> DMatrix<f64> {
    let c = a.nrows();
    let mean = a.trace() / c as f64;
    let mut out = a * (1.0 - gamma);
    for i in 0..c {
        out[(i, i)] += gamma * mean;
    }
    out
}

/// Both ends in the chosen measure. `None` where the shrunk covariance is not positive definite.
pub fn fit(view: View<'_>, labels: Labels<'_>, method: &Method) -> Option<Ends> {
    match method.measure {
        Measure::Typical => Some(typical(view, labels, method)),
        Measure::Total => {
            let gamma = gamma(view, labels, method);
            total(view, labels, gamma, method.components)
        }
    }
}

fn typical(view: View<'_>, labels: Labels<'_>, method: &Method) -> Ends {
    let d = mean_log_difference(view.logs, labels, view.keep);
    let (values, vectors) = eigh(&unpack(&d, view.keep));
    let wanted = method.components.min(view.keep);
    let direction = |i: usize| Direction {
        u: vectors.column(i).iter().copied().collect(),
        statistic: values[i].exp(),
    };
    Ends {
        stronger: (0..wanted).map(direction).collect(),
        weaker: (0..wanted).map(|i| direction(view.keep - 1 - i)).collect(),
        shrinkage: method.rho(),
    }
}

/// The statistic of the average direction: exp of the mean δ (typical), 1 (total, whose sides are brought to one level before).
pub fn centre(view: View<'_>, labels: Labels<'_>, measure: Measure) -> f64 {
    match measure {
        Measure::Typical => {
            let d = mean_log_difference(view.logs, labels, view.keep);
            let trace: f64 = (0..view.keep).map(|i| d[packed_len(i) + i]).sum();
            (trace / view.keep as f64).exp()
        }
        Measure::Total => 1.0,
    }
}

/// Largest and smallest statistic alone, for permutations.
pub fn extremes(view: View<'_>, labels: Labels<'_>, method: &Method) -> Option<(f64, f64)> {
    match method.measure {
        Measure::Typical => {
            let d = mean_log_difference(view.logs, labels, view.keep);
            let values = eigenvalues(&unpack(&d, view.keep));
            Some((values.first()?.exp(), values.last()?.exp()))
        }
        Measure::Total => {
            let ends = total(view, labels, gamma(view, labels, method), 1)?;
            Some((
                ends.stronger.first()?.statistic,
                ends.weaker.first()?.statistic,
            ))
        }
    }
}

fn total(view: View<'_>, labels: Labels<'_>, gamma: f64, components: usize) -> Option<Ends> {
    let (s, r) = sides(view, labels);
    let (up, up_vectors) = generalised_eigh(&s, &shrunk(&r, gamma))?;
    let (down, down_vectors) = generalised_eigh(&r, &shrunk(&s, gamma))?;
    let wanted = components.min(view.keep);
    let direction = |vectors: &DMatrix<f64>, i: usize, statistic: f64| Direction {
        u: vectors
            .column(i)
            .iter()
            .zip(&view.space.eigenvalues)
            .map(|(w, e)| w * e.sqrt())
            .collect(),
        statistic,
    };
    Some(Ends {
        stronger: (0..wanted)
            .map(|i| direction(&up_vectors, i, up[i]))
            .collect(),
        weaker: (0..wanted)
            .map(|i| direction(&down_vectors, i, 1.0 / down[i]))
            .collect(),
        shrinkage: gamma,
    })
}

/// γ by the recipe's rule.
fn gamma(view: View<'_>, labels: Labels<'_>, method: &Method) -> f64 {
    match method.shrink {
        Shrink::Number(gamma) => gamma,
        Shrink::Word(ShrinkWord::Auto) => inner_gamma(view, labels, method),
        Shrink::Word(ShrinkWord::LedoitWolf) => ledoit_wolf(view, labels),
        Shrink::Word(ShrinkWord::Oas) => oas(view, labels),
    }
}

/// The candidate with the best separation on inner folds: mean over folds of the log total ratio of the first stronger
/// direction minus that of the first weaker one, each on windows left out of its fit. The first of equals wins.
fn inner_gamma(view: View<'_>, labels: Labels<'_>, method: &Method) -> f64 {
    let inner = inner_folds(labels, method.folds);
    let folds = inner.iter().filter_map(|f| *f).max().map_or(0, |f| f + 1);
    let mut best = (f64::NEG_INFINITY, GAMMAS[2]);
    let parts: Vec<(Vec<bool>, Vec<bool>)> = (0..folds)
        .map(|f| {
            (
                inner.iter().map(|x| x.is_some_and(|x| x != f)).collect(),
                inner.iter().map(|x| *x == Some(f)).collect(),
            )
        })
        .collect();
    for gamma in GAMMAS {
        let mut score = 0.0;
        for (train, test) in &parts {
            let Some(ends) = total(view, Labels { train, ..labels }, gamma, 1) else {
                score = f64::NEG_INFINITY;
                break;
            };
            score += log_total(view, labels.signal, test, &ends.stronger[0].u)
                - log_total(view, labels.signal, test, &ends.weaker[0].u);
        }
        if score > best.0 {
            best = (score, gamma);
        }
    }
    best.1
}

/// Contiguous folds of the training windows, each side apart, in the order they stand.
pub fn inner_folds(labels: Labels<'_>, folds: usize) -> Vec<Option<usize>> {
    let mut out = vec![None; labels.signal.len()];
    let count = |side: bool| {
        (0..labels.signal.len())
            .filter(|k| labels.train[*k] && labels.signal[*k] == side)
            .count()
    };
    // Every inner fold tests both sides.
    let folds = folds.min(count(true)).min(count(false));
    for side in [true, false] {
        let members: Vec<usize> = (0..out.len())
            .filter(|k| labels.train[*k] && labels.signal[*k] == side)
            .collect();
        for (k, f) in members
            .iter()
            .zip(super::windows::contiguous_folds(members.len(), folds))
        {
            out[*k] = Some(f);
        }
    }
    out
}

/// log(uᵀSu / uᵀRu) over the windows in `of`.
pub fn log_total(view: View<'_>, signal: &[bool], of: &[bool], u: &[f64]) -> f64 {
    let mut sums = [0.0; 2];
    let mut weights = [0.0; 2];
    let variances = view.space.variances(u, signal, |k| of[k]);
    for k in (0..of.len()).filter(|k| of[*k]) {
        let side = usize::from(signal[k]);
        sums[side] += view.weights[k] * variances[k];
        weights[side] += view.weights[k];
    }
    (sums[1] / weights[1]).ln() - (sums[0] / weights[0]).ln()
}

/// Ledoit & Wolf (2004) as scikit-learn computes it on centred samples: β/δ of the reference windows' samples.
fn ledoit_wolf(view: View<'_>, labels: Labels<'_>) -> f64 {
    let (_, r) = sides(view, labels);
    let reference = |k: &usize| labels.train[*k] && !labels.signal[*k];
    let windows: Vec<usize> = (0..view.weights.len()).filter(reference).collect();
    let n: f64 = windows.iter().map(|k| view.weights[*k] + 1.0).sum();
    let divided: f64 = windows.iter().map(|k| view.weights[*k]).sum();
    let fourth: f64 = windows.iter().map(|k| view.fourth[*k][view.keep - 1]).sum();
    ledoit_wolf_of(&(r * (divided / n)), fourth, n)
}

/// The shrinkage of a covariance (divided by n) of n centred samples with Σ‖x‖⁴ = `fourth`.
pub fn ledoit_wolf_of(covariance: &DMatrix<f64>, fourth: f64, n: f64) -> f64 {
    let p = covariance.nrows() as f64;
    let square = covariance.norm_squared();
    let mean = covariance.trace() / p;
    let beta = (fourth / n - square) / (p * n);
    let delta = (square - 2.0 * mean * covariance.trace() + p * mean * mean) / p;
    if beta.min(delta) <= 0.0 || delta == 0.0 {
        0.0
    } else {
        beta.min(delta) / delta
    }
}

/// Oracle approximating shrinkage as scikit-learn computes it (Chen, Wiesel, Eldar & Hero 2010, eq. 23 without its 2/p terms).
fn oas(view: View<'_>, labels: Labels<'_>) -> f64 {
    let (_, r) = sides(view, labels);
    let n: f64 = (0..view.weights.len())
        .filter(|k| labels.train[*k] && !labels.signal[*k])
        .map(|k| view.weights[k] + 1.0)
        .sum();
    oas_of(&r, n)
}

/// The shrinkage of a covariance of n centred samples.
pub fn oas_of(covariance: &DMatrix<f64>, n: f64) -> f64 {
    let p = covariance.nrows() as f64;
    let alpha = covariance.norm_squared() / (p * p);
    let mu = (covariance.trace() / p).powi(2);
    let denominator = (n + 1.0) * (alpha - mu / p);
    if denominator == 0.0 {
        1.0
    } else {
        ((alpha + mu) / denominator).min(1.0)
    }
}
