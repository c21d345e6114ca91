//! Held-out ratios over contiguous folds, with the comparators on the same windows.
use super::bootstrap::{generator, mean_interval};
use crate::contrast::fit::{
    Ends, Labels, Method, View, fit, inner_folds, log_total as fit_log_total,
};
use crate::contrast::linalg::{Packed, log_shrunk, quadratic};
use crate::contrast::read::Reader;
use crate::contrast::space::{Covariances, Space};
use crate::contrast::windows::{Exchange, Window};
use crate::recipe::Measure;
use crate::sheet::{End, TotalRatio, TypicalRatio};
use std::collections::BTreeMap;

/// Which windows, which labels, which folds: everything about a selection that evidence needs.
#[derive(Debug, Clone)]
pub struct Design {
    /// Both sides tied to the same event.
    pub paired: bool,
    /// What the null hypothesis exchanges.
    pub exchange: Exchange,
    /// Signal (or reference) of every window.
    pub signal: Vec<bool>,
    /// Pair of every window, or its index within its side.
    pub trial: Vec<usize>,
    /// Fold of every window.
    pub fold: Vec<usize>,
    /// K.
    pub folds: usize,
}

impl Design {
    /// Windows that are fitted to when fold `f` is left out.
    pub fn train(&self, f: usize) -> Vec<bool> {
        self.fold.iter().map(|x| *x != f).collect()
    }
    /// Pairs (paired), or windows of the side.
    pub fn count(&self, signal: bool) -> usize {
        self.signal.iter().filter(|s| **s == signal).count()
    }
}

/// A space with what fits in it need: made from some windows (`train`), holding the covariances of all.
///
/// One ground is made from all windows, and one from the training windows of each fold.
#[derive(Debug, Clone)]
pub struct Ground {
    /// The space.
    pub space: Space,
    /// Windows that it was made from.
    pub train: Vec<bool>,
    /// For each C asked for: logarithms of the training windows' shrunk covariances (typical measure); empty for windows that are
    /// only tested.
    pub logs: BTreeMap<usize, Vec<Packed>>,
    /// Σ‖y‖⁴ over the samples of each window, for C = 1, 2, … (Ledoit–Wolf); empty unless asked for.
    pub fourth: Vec<Vec<f64>>,
}

impl Ground {
    /// The ground of the windows in `train`, of at most `limit` dimensions.
    pub fn new(all: &Covariances, limit: usize, train: Vec<bool>) -> Self {
        let space = Space::new(all, limit, |k| train[k]);
        Ground {
            space,
            train,
            logs: BTreeMap::new(),
            fourth: Vec::new(),
        }
    }
    /// What a fit at C = `keep` reads; C is cut to the space's dimensions.
    pub fn view<'a>(&'a self, weights: &'a [f64], keep: usize) -> View<'a> {
        let keep = keep.min(self.space.dimensions());
        let logs = self.logs.get(&keep).map_or(&[][..], Vec::as_slice);
        View {
            space: &self.space,
            weights,
            logs,
            fourth: &self.fourth,
            keep,
        }
    }
    /// Adds the logarithm of the next window at C = `keep`; false when all are there.
    pub fn push_log(&mut self, keep: usize, rho: f64) -> bool {
        let keep = keep.min(self.space.dimensions());
        let logs = self.logs.entry(keep).or_default();
        let k = logs.len();
        let Some(covariance) = self.space.covariances.get(k) else {
            return false;
        };
        logs.push(if self.train[k] {
            log_shrunk(covariance, keep, rho)
        } else {
            Vec::new()
        });
        true
    }
    /// Adds Σ‖y‖⁴ of the next window's samples; false when all are there.
    pub fn push_fourth(&mut self, reader: &Reader<'_>, windows: &[Window]) -> bool {
        let Some(window) = windows.get(self.fourth.len()) else {
            return false;
        };
        let dimensions = self.space.dimensions();
        let mut square = vec![0.0; reader.values(window)];
        let mut out = Vec::with_capacity(dimensions);
        for i in 0..dimensions {
            // One row of Vᵀ x: the whitening row times the root of its eigenvalue.
            let scale = self.space.eigenvalues[i].sqrt();
            let weights: Vec<f64> = self
                .space
                .whitening
                .row(i)
                .iter()
                .map(|w| w * scale)
                .collect();
            let y = project(&weights, reader, window);
            for (s, y) in square.iter_mut().zip(&y) {
                *s += y * y;
            }
            out.push(square.iter().map(|s| s * s).sum());
        }
        self.fourth.push(out);
        true
    }
}

/// wᵀX over one window about its own mean.
pub fn project(weights: &[f64], reader: &Reader<'_>, window: &Window) -> Vec<f64> {
    let mut out = vec![0.0; reader.values(window)];
    let mut part = Vec::with_capacity(window.count);
    for (c, w) in weights.iter().enumerate() {
        reader.channel(window, c, &mut part);
        for (y, x) in out.iter_mut().zip(&part) {
            *y += w * f64::from(*x);
        }
    }
    let mean = out.iter().sum::<f64>() / out.len() as f64;
    out.iter_mut().for_each(|y| *y -= mean);
    out
}

/// Variance of every window under directions that never saw it.
pub type Scores = Vec<f64>;

/// What one fold chose on its training windows.
#[derive(Debug, Clone)]
pub struct FoldFit {
    /// C it was fitted at.
    pub keep: usize,
    /// The fold's own fit.
    pub ends: Ends,
    /// Index of the best kept principal component on the training windows, from 0.
    pub best_pc: usize,
    /// Index of the best channel on the training windows.
    pub best_channel: usize,
}

/// Fits one ground at C = `keep` and chooses its comparators on its training windows.
pub fn fit_ground(
    ground: &Ground,
    keep: usize,
    all: &Covariances,
    design: &Design,
    method: &Method,
    end: End,
) -> Option<FoldFit> {
    let labels = Labels {
        signal: &design.signal,
        train: &ground.train,
    };
    let view = ground.view(&all.weights, keep);
    let ends = fit(view, labels, method)?;
    let train = |k: usize| ground.train[k];
    let best_pc = best_of(
        end,
        view.keep,
        |i| ground.space.component_variances(i, &design.signal, train),
        &all.weights,
        design,
        &ground.train,
        method.measure,
    );
    let best_channel = best_of(
        end,
        all.channels,
        |i| all.channel_variances(i, &design.signal, train),
        &all.weights,
        design,
        &ground.train,
        method.measure,
    );
    Some(FoldFit {
        keep: view.keep,
        ends,
        best_pc,
        best_channel,
    })
}

/// C for `keep: "best"`: over inner folds of the training windows of `ground`, the smallest C whose separation (held-out log ratio of the
/// first stronger direction minus that of the first weaker one) is
/// within one standard error (over inner folds) of the best (Breiman, Friedman, Olshen & Stone 1984, sec. 3.4.3). The space stays
/// that of all training windows: it is blind to the labels. `grid` ascending, with logarithms ready.
pub fn choose_keep(
    ground: &Ground,
    grid: &[usize],
    weights: &[f64],
    signal: &[bool],
    method: &Method,
) -> usize {
    let inner = inner_folds(
        Labels {
            signal,
            train: &ground.train,
        },
        method.folds,
    );
    let folds = inner.iter().filter_map(|f| *f).max().map_or(0, |f| f + 1);
    let mut curve = Vec::new();
    for &keep in grid {
        let view = ground.view(weights, keep);
        let scores: Option<Vec<f64>> = (0..folds)
            .map(|f| {
                let train: Vec<bool> = inner.iter().map(|x| x.is_some_and(|x| x != f)).collect();
                let test: Vec<bool> = inner.iter().map(|x| *x == Some(f)).collect();
                let ends = fit(
                    view,
                    Labels {
                        signal,
                        train: &train,
                    },
                    &Method {
                        components: 1,
                        ..*method
                    },
                )?;
                let log = |u: &[f64]| match method.measure {
                    Measure::Total => fit_log_total(view, signal, &test, u),
                    Measure::Typical => log_typical_of(view, signal, &test, u),
                };
                Some(log(&ends.stronger.first()?.u) - log(&ends.weaker.first()?.u))
            })
            .collect();
        curve.push(scores.map(|s| mean_and_error_of(&s)));
    }
    let best = curve
        .iter()
        .flatten()
        .copied()
        .max_by(|a, b| a.0.total_cmp(&b.0));
    let Some((best, error)) = best else {
        return grid.first().copied().unwrap_or(2);
    };
    grid.iter()
        .zip(&curve)
        .find(|(_, c)| c.is_some_and(|(mean, _)| mean >= best - error))
        .map_or(2, |(keep, _)| *keep)
}

fn log_typical_of(view: View<'_>, signal: &[bool], of: &[bool], u: &[f64]) -> f64 {
    let (mut sums, mut counts) = ([0.0; 2], [0usize; 2]);
    for k in (0..of.len()).filter(|k| of[*k]) {
        let side = usize::from(signal[k]);
        sums[side] += quadratic(&view.space.covariances[k], u).ln();
        counts[side] += 1;
    }
    sums[1] / counts[1] as f64 - sums[0] / counts[0] as f64
}

/// Mean and its standard error.
fn mean_and_error_of(values: &[f64]) -> (f64, f64) {
    let n = values.len() as f64;
    let mean = values.iter().sum::<f64>() / n;
    (
        mean,
        (values.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / (n - 1.0) / n).sqrt(),
    )
}

/// Index of the candidate with the largest ratio by `measure` on the windows in `of` (the smallest, at the weaker end); the
/// first of equals. `variances` gives a candidate's variance in every window, NaN outside `of`.
pub fn best_of(
    end: End,
    candidates: usize,
    variances: impl Fn(usize) -> Vec<f64>,
    weights: &[f64],
    design: &Design,
    of: &[bool],
    measure: Measure,
) -> usize {
    let mut best = (f64::NEG_INFINITY, 0);
    for i in 0..candidates {
        let variances = variances(i);
        let ratio = match measure {
            Measure::Typical => log_typical(&variances, design),
            Measure::Total => log_total(&variances, weights, design, |k| of[k]),
        };
        let worth = match end {
            End::Stronger => ratio,
            End::Weaker => -ratio,
        };
        if worth > best.0 {
            best = (worth, i);
        }
    }
    best.1
}

/// Mean log variance in signal minus that in reference, over the windows that are numbers.
pub fn log_typical(variances: &[f64], design: &Design) -> f64 {
    let (mut sums, mut counts) = ([0.0; 2], [0usize; 2]);
    for (v, s) in variances
        .iter()
        .zip(&design.signal)
        .filter(|(v, _)| !v.is_nan())
    {
        sums[usize::from(*s)] += v.ln();
        counts[usize::from(*s)] += 1;
    }
    sums[1] / counts[1] as f64 - sums[0] / counts[0] as f64
}

/// Log of the ratio of pooled variances over the windows in `of`.
pub fn log_total(
    variances: &[f64],
    weights: &[f64],
    design: &Design,
    of: impl Fn(usize) -> bool,
) -> f64 {
    let (mut sums, mut total) = ([0.0; 2], [0.0; 2]);
    for k in (0..weights.len()).filter(|k| of(*k)) {
        let side = usize::from(design.signal[k]);
        sums[side] += weights[k] * variances[k];
        total[side] += weights[k];
    }
    (sums[1] / total[1]).ln() - (sums[0] / total[0]).ln()
}

/// Variances of all windows under a direction of a space.
pub fn variances(space: &Space, u: &[f64], signal: &[bool]) -> Vec<f64> {
    space.variances(u, signal, |_| true)
}

/// Variances of the tested windows of fold `f` under `u`, written into `into`; u is first scaled so that the training reference
/// variance is 1, which makes folds comparable.
pub fn score_into(
    into: &mut Scores,
    fold: &Ground,
    weights: &[f64],
    design: &Design,
    f: usize,
    u: &[f64],
) {
    fill(into, weights, design, f, |of| {
        fold.space.variances(u, &design.signal, of)
    });
}

/// As [`score_into`] for any variances: of the windows that a test names, NaN elsewhere.
pub fn fill(
    into: &mut Scores,
    weights: &[f64],
    design: &Design,
    f: usize,
    variances: impl Fn(&dyn Fn(usize) -> bool) -> Vec<f64>,
) {
    let train = variances(&|k| design.fold[k] != f);
    let (mut sum, mut total) = (0.0, 0.0);
    for k in (0..weights.len()).filter(|k| design.fold[*k] != f && !design.signal[*k]) {
        sum += weights[k] * train[k];
        total += weights[k];
    }
    let scale = sum / total;
    let test = variances(&|k| design.fold[k] == f);
    for k in (0..weights.len()).filter(|k| design.fold[*k] == f) {
        into[k] = test[k] / scale;
    }
}

/// Log ratio of every pair (paired): held-out variances in, one number a pair out, in order of time.
pub fn pair_log_ratios(scores: &Scores, design: &Design) -> Vec<f64> {
    let mut out = vec![0.0; design.count(true)];
    for (k, v) in scores.iter().enumerate() {
        out[design.trial[k]] += if design.signal[k] { v.ln() } else { -v.ln() };
    }
    out
}

/// Log variances of one side's windows.
fn side_logs(scores: &Scores, design: &Design, signal: bool) -> Vec<f64> {
    let of_side = scores
        .iter()
        .zip(&design.signal)
        .filter(|(_, s)| **s == signal);
    of_side.map(|(v, _)| v.ln()).collect()
}

/// Typical ratio from held-out variances with its bootstrap interval.
pub fn typical_ratio(
    fitted: f64,
    scores: Option<&Scores>,
    design: &Design,
    bootstrap: usize,
    seed: u64,
) -> TypicalRatio {
    let Some(scores) = scores.filter(|_| design.exchange != Exchange::Flip) else {
        return TypicalRatio {
            fitted,
            held_out: None,
            interval: None,
        };
    };
    let mut rng = generator(seed, super::permute::STREAM_BOOTSTRAP);
    let (held_out, interval) = if design.paired {
        let logs = pair_log_ratios(scores, design);
        (
            logs.iter().sum::<f64>() / logs.len() as f64,
            mean_interval(&logs, &[], bootstrap, &mut rng),
        )
    } else {
        let side = |signal| side_logs(scores, design, signal);
        (
            log_typical(scores, design),
            mean_interval(&side(true), &side(false), bootstrap, &mut rng),
        )
    };
    TypicalRatio {
        fitted,
        held_out: Some(held_out.exp()),
        interval: interval.map(|i| i.map(f64::exp)),
    }
}

/// What is left where less than nothing repeats: a held-out ratio has to stay above 0 to have a logarithm.
const LEAST_REPEATED: f64 = 1e-3;

/// What repeats: a fold of K_f trials with ratio λ_f has ρ_f = (λ_f − 1)/(K_f − 1), the mean correlation of two trials in units of a
/// trial's power; over all K trials that is a ratio of 1 + (K − 1)ρ, which can be compared with the fitted one. Gives each fold's,
/// and that of the mean ρ with its standard error over folds.
fn repeated_folds(scores: &Scores, weights: &[f64], design: &Design) -> (Vec<f64>, f64, f64) {
    let all = design.count(true) as f64;
    let shares: Vec<f64> = (0..design.folds)
        .map(|f| {
            let trials = (0..weights.len()).filter(|k| design.fold[*k] == f && design.signal[*k]);
            let trials = trials.count().max(2) as f64;
            let ratio = log_total(scores, weights, design, |k| design.fold[k] == f).exp();
            (ratio - 1.0) / (trials - 1.0)
        })
        .collect();
    let (mean, error) = mean_and_error_of(&shares);
    let ratio = |share: f64| (1.0 + (all - 1.0) * share).max(LEAST_REPEATED);
    let folds = shares.iter().map(|s| ratio(*s)).collect();
    (folds, ratio(mean), (all - 1.0) * error)
}

/// Total ratio from held-out variances: geometric mean over folds.
pub fn total_ratio(
    fitted: f64,
    scores: Option<&Scores>,
    weights: &[f64],
    design: &Design,
) -> TotalRatio {
    let Some(scores) = scores else {
        return TotalRatio {
            fitted,
            held_out: None,
            folds: Vec::new(),
        };
    };
    if design.exchange == Exchange::Flip {
        let (folds, held_out, _) = repeated_folds(scores, weights, design);
        return TotalRatio {
            fitted,
            held_out: Some(held_out),
            folds,
        };
    }
    let logs: Vec<f64> = (0..design.folds)
        .map(|f| log_total(scores, weights, design, |k| design.fold[k] == f))
        .collect();
    TotalRatio {
        fitted,
        held_out: Some((logs.iter().sum::<f64>() / logs.len() as f64).exp()),
        folds: logs.iter().map(|l| l.exp()).collect(),
    }
}

/// The mean of the per-trial log ratio and its standard error over trials (typical), or over folds (total).
pub fn mean_and_error(
    scores: &Scores,
    weights: &[f64],
    design: &Design,
    measure: Measure,
) -> (f64, f64) {
    let error = |values: &[f64]| mean_and_error_of(values).1;
    match measure {
        Measure::Typical if design.paired => (
            log_typical(scores, design),
            error(&pair_log_ratios(scores, design)),
        ),
        Measure::Typical => {
            let side = |signal| side_logs(scores, design, signal);
            (
                log_typical(scores, design),
                error(&side(true)).hypot(error(&side(false))),
            )
        }
        Measure::Total if design.exchange == Exchange::Flip => {
            let (_, ratio, error) = repeated_folds(scores, weights, design);
            (ratio.ln(), error / ratio)
        }
        Measure::Total => {
            let logs: Vec<f64> = (0..design.folds)
                .map(|f| log_total(scores, weights, design, |k| design.fold[k] == f))
                .collect();
            mean_and_error_of(&logs)
        }
    }
}
