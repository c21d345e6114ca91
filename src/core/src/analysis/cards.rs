//! From what was computed to what the sheet says.
use super::work::Work;
use crate::contrast::basis::Basis;
use crate::contrast::fit::{Direction, Ends};
use crate::contrast::linalg::{abs_cosine, packed_len, quadratic};
use crate::contrast::space::Space;
use crate::contrast::windows::Exchange;
use crate::describe::placing::placed;
use crate::evidence::bootstrap::generator;
use crate::evidence::dimensions::outstanding;
use crate::evidence::heldout::{
    Design, Ground, Scores, best_of, fill, log_total, log_typical, pair_log_ratios, score_into,
    total_ratio, typical_ratio, variances,
};
use crate::evidence::permute::{STREAM_DIRECTION, null_hypothesis, p_value};
use crate::prepare::{Prepared, Quality};
use crate::recipe::{Keep, KeepWord, Measure, Recipe};
use crate::recording::Recording;
use crate::sheet::{
    BasisCard, ChannelCard, ChannelState, Comparator, ComparatorKind, Component, CompressionCard,
    End, FoldCard, Permutation, PrincipalCard, RankStep, RecordingCard, Sheet, Step, TotalRatio,
    TrialScore, TypicalRatio, WindowPower,
};
use nalgebra::DMatrix;
use rand_chacha::rand_core::Rng;
use std::collections::BTreeMap;

/// Bins of the envelope of the whole recording.
const ENVELOPE_BINS: usize = 444;
/// Typical and total ratio are said to disagree beyond this factor.
const DISAGREEMENT: f64 = 1.5;

/// What a changed recipe made stale.
pub(super) struct Stale {
    pub preparation: bool,
    pub windows: bool,
    pub method: bool,
    pub evidence: bool,
    pub curve: bool,
}

/// A sheet that knows the recording alone.
pub(super) fn begin(recording: &Recording, recipe: &Recipe) -> Sheet {
    let mut onsets: BTreeMap<String, Vec<f64>> = BTreeMap::new();
    for event in &recording.events {
        onsets
            .entry(event.label.clone())
            .or_default()
            .push(event.onset_s);
    }
    Sheet {
        recording: RecordingCard {
            name: recording.name.clone(),
            format: recording.format.clone(),
            rate_hz: recording.rate_hz,
            duration_s: recording.duration_s(),
            stretches: recording.stretches.clone(),
            others: recording.others.clone(),
            events: onsets
                .iter()
                .map(|(label, times)| (label.clone(), times.len()))
                .collect(),
            event_onsets_s: onsets,
            layout: placed(recording, &recipe.channels).0,
            about: recording.about.clone(),
            side_files: recording.side_files.clone(),
            warnings: recording.warnings.clone(),
            envelope: envelope(recording),
        },
        recipe: recipe.clone(),
        channels: Vec::new(),
        movie: None,
        quality: None,
        preparation: None,
        windows: None,
        rejection: None,
        compression: None,
        dimensions: None,
        principal: Vec::new(),
        curve: None,
        shrinkage: None,
        leading: End::default(),
        stronger: Vec::new(),
        weaker: Vec::new(),
        compare: Vec::new(),
        permutation: None,
        folds: Vec::new(),
        held_back: None,
        warnings: recording.warnings.clone(),
    }
}

/// Root mean square over channels of each bin's standard deviation.
fn envelope(recording: &Recording) -> Vec<f64> {
    let n = recording.sample_count();
    let bins = ENVELOPE_BINS.min(n);
    // A product of two counts outgrows the 32 bits of a browser's usize.
    let at = |b: usize| (b as u64 * n as u64 / bins as u64) as usize;
    let mut out = vec![0.0; bins];
    let mut counted = 0usize;
    for channel in &recording.samples {
        let finite = channel.iter().all(|x| x.is_finite());
        if !finite {
            continue;
        }
        counted += 1;
        let mean = channel.iter().map(|x| f64::from(*x)).sum::<f64>() / n.max(1) as f64;
        for (b, bin) in out.iter_mut().enumerate() {
            let part = &channel[at(b)..at(b + 1)];
            *bin += part
                .iter()
                .map(|x| (f64::from(*x) - mean).powi(2))
                .sum::<f64>()
                / part.len().max(1) as f64;
        }
    }
    out.iter_mut()
        .for_each(|x| *x = (*x / counted.max(1) as f64).sqrt());
    out
}

/// Marks used channels that the comparison doubts, unless the recipe says that they were looked at and kept.
pub(super) fn doubt(cards: &mut [ChannelCard], quality: Option<&Quality>, recipe: &Recipe) {
    let Some(quality) = quality else { return };
    for (card, found) in cards.iter_mut().zip(&quality.card.channels) {
        if let (ChannelState::Used, Some(first)) = (&card.state, found.doubts.first())
            && !recipe.channels.keep.contains(&card.name)
        {
            card.state = ChannelState::NeedsALook(first.reason.clone());
        }
    }
}

/// Channels and rank after each step of the preparation.
pub(super) fn ranks(work: &mut Work) {
    let (Some(prepared), Some(ground)) = (&work.prepared, &work.ground) else {
        return;
    };
    // Where only islands are in memory, channels are not compared, and the ranks before the filters are not known.
    let quality = work.quality.as_ref();
    let steps = prepared.steps.iter().filter_map(|step| {
        Some(RankStep {
            step: step.step,
            channels: step.matrix.nrows(),
            rank: quality?.rank(&step.matrix)?,
            why: step.why.clone(),
        })
    });
    let samples: f64 = work.covariances.weights.iter().sum();
    let last = RankStep {
        step: Step::Filter,
        channels: prepared.channels.len(),
        rank: ground.space.rank,
        why: format!(
            "Filters take no channel away; this is what the channels span inside the windows, over {samples} samples about their windows’ means. C can be no larger."
        ),
    };
    let ranks: Vec<RankStep> = steps.chain(std::iter::once(last)).collect();
    if let Some(card) = &mut work.sheet.preparation {
        card.ranks = ranks;
    }
}

/// A principal dimension: `row` of the whitening and its course over all prepared samples.
pub(super) fn principal(
    space: &Space,
    basis: Option<&Basis>,
    at: usize,
    row: &[f64],
    course: &[f64],
) -> PrincipalCard {
    let value = space.eigenvalues[at];
    let inside: f64 = space.eigenvalues.iter().filter(|e| **e > 0.0).sum();
    let all = basis.map_or(inside, |b| b.total);
    let row = basis.map_or_else(|| row.to_vec(), |b| b.lift(row));
    let largest = row
        .iter()
        .copied()
        .fold(0.0_f64, |m, x| if x.abs() > m.abs() { x } else { m });
    let sign = if largest < 0.0 { -1.0 } else { 1.0 };
    let n = course.len();
    let mean = course.iter().sum::<f64>() / n.max(1) as f64;
    let bins = ENVELOPE_BINS.min(n);
    let at = |b: usize| (b as u64 * n as u64 / bins as u64) as usize;
    let bin = |b: usize| {
        let part = &course[at(b)..at(b + 1)];
        part.iter()
            .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), x| {
                let x = sign * (x - mean);
                (low.min(x), high.max(x))
            })
    };
    let ends: Vec<(f64, f64)> = (0..bins).map(bin).collect();
    PrincipalCard {
        share: value / all,
        pattern: row.iter().map(|w| sign * w * value).collect(),
        low: ends.iter().map(|e| e.0 as f32).collect(),
        high: ends.iter().map(|e| e.1 as f32).collect(),
    }
}

/// Takes back what no longer holds.
pub(super) fn forget(sheet: &mut Sheet, recipe: &Recipe, stale: &Stale) {
    sheet.recipe = recipe.clone();
    if stale.preparation {
        sheet.channels.clear();
        sheet.preparation = None;
    }
    if stale.windows {
        sheet.windows = None;
        sheet.rejection = None;
        sheet.dimensions = None;
        sheet.principal.clear();
    }
    if stale.method {
        sheet.warnings = sheet.recording.warnings.clone();
        sheet.compression = None;
        sheet.shrinkage = None;
        sheet.stronger.clear();
        sheet.weaker.clear();
    }
    if stale.evidence {
        sheet.compare.clear();
        sheet.permutation = None;
        sheet.folds.clear();
        for c in sheet.stronger.iter_mut().chain(&mut sheet.weaker) {
            c.p = None;
            c.typical.held_out = None;
            c.typical.interval = None;
            c.total.held_out = None;
            c.total.folds.clear();
            c.trials.clear();
        }
    }
    if stale.evidence {
        sheet.held_back = None;
    }
    if stale.curve {
        sheet.curve = None;
    }
    if let (Some(_), Some(_)) = (&sheet.curve, &sheet.compression) {
        guides(sheet);
    }
}

/// The filter of a direction with wᵀRw = 1, its pattern by Haufe et al. 2014 with the largest entry positive, both in prepared channels.
fn filter_and_pattern(
    ground: &Ground,
    direction: &Direction,
    weights: &[f64],
    signal: &[bool],
    basis: Option<&Basis>,
) -> (Vec<f64>, Vec<f64>) {
    let space = &ground.space;
    let reference = {
        let (mut sum, mut total) = (0.0, 0.0);
        for k in (0..weights.len()).filter(|k| !signal[*k] && ground.train[*k]) {
            sum += weights[k] * quadratic(&space.covariances[k], &direction.u);
            total += weights[k];
        }
        sum / total
    };
    let scale = 1.0 / reference.sqrt();
    let u: Vec<f64> = direction.u.iter().map(|x| x * scale).collect();
    let mut filter = space.filter(&u);
    let mut pattern = pattern(space, &filter);
    if let Some(basis) = basis {
        filter = basis.lift(&filter);
        pattern = basis.lift(&pattern);
    }
    let largest = pattern
        .iter()
        .copied()
        .fold(0.0f64, |m, x| if x.abs() > m.abs() { x } else { m });
    if largest < 0.0 {
        filter.iter_mut().chain(&mut pattern).for_each(|x| *x = -*x);
    }
    (filter, pattern)
}

/// a = P w / (wᵀPw).
fn pattern(space: &Space, filter: &[f64]) -> Vec<f64> {
    let mut product = times(&space.pooled, filter);
    let power: f64 = product.iter().zip(filter).map(|(a, b)| a * b).sum();
    product.iter_mut().for_each(|x| *x /= power);
    product
}

/// Compression and fitted components, right after the fit.
pub(super) fn solved(work: &mut Work, recipe: &Recipe) {
    let (Some(ground), Some(design), Some(ends), Some(prepared), Some(keep), Some(selection)) = (
        &work.ground,
        &work.design,
        &work.ends,
        &work.prepared,
        work.keep,
        &work.selection,
    ) else {
        return;
    };
    let weights = &work.covariances.weights;
    let component = |d: &Direction| -> Component {
        let (filter, pattern) =
            filter_and_pattern(ground, d, weights, &design.signal, work.basis.as_ref());
        let v = variances(&ground.space, &d.u, &design.signal);
        let largest = (0..pattern.len()).fold(0, |best, i| {
            if pattern[i].abs() > pattern[best].abs() {
                i
            } else {
                best
            }
        });
        Component {
            typical: TypicalRatio {
                fitted: fitted_typical(&v, design),
                held_out: None,
                interval: None,
            },
            total: TotalRatio {
                fitted: log_total(&v, weights, design, |_| true).exp(),
                held_out: None,
                folds: Vec::new(),
            },
            p: None,
            filter_raw: prepared.raw(&filter, work.sheet.channels.len()),
            largest_at: prepared.channels[largest].clone(),
            filter,
            pattern,
            peak_hz: None,
            powers: window_powers(&v, weights, design, selection),
            ..Component::default()
        }
    };
    let (stronger, weaker) = reported(ends);
    work.sheet.stronger = stronger.iter().map(component).collect();
    work.sheet.weaker = weaker.iter().map(component).collect();
    work.sheet.leading = leading(ends, design.exchange);
    work.sheet.shrinkage = Some(ends.shrinkage);
    let eigenvalues = ground.space.eigenvalues.clone();
    let inside: f64 = eigenvalues.iter().filter(|e| **e > 0.0).sum();
    let all = work.basis.as_ref().map_or(inside, |b| b.total);
    let share = eigenvalues[..keep].iter().sum::<f64>() / all;
    let basis = work.basis.as_ref().map(|b| BasisCard {
        dimensions: b.rows.nrows(),
        total: b.total,
        left_out: (1.0 - inside / b.total).max(0.0),
        outside: b.outside,
        exact: b.exact,
    });
    work.sheet.compression = Some(CompressionCard {
        kept: keep,
        rank: ground.space.rank,
        eigenvalues,
        share,
        basis,
        guides: BTreeMap::new(),
    });
    if let Some(card) = &mut work.sheet.preparation {
        card.rank = ground.space.rank;
        if let Some(last) = card.ranks.last_mut() {
            last.rank = ground.space.rank;
        }
    }
    guides(&mut work.sheet);
    work.sheet.warnings = warnings(work, recipe);
}

/// Variances of a component in every used window, scaled so that their mean over reference windows is 1.
fn window_powers(
    variances: &[f64],
    weights: &[f64],
    design: &Design,
    selection: &crate::contrast::windows::Selection,
) -> Vec<WindowPower> {
    let reference = (0..variances.len()).filter(|k| !design.signal[*k]);
    let (sum, total) = reference.fold((0.0, 0.0), |(s, t), k| {
        (s + weights[k] * variances[k], t + weights[k])
    });
    let windows = selection.windows.iter().zip(variances);
    windows
        .map(|(window, variance)| WindowPower {
            signal: window.signal,
            trial: window.trial,
            onset_s: window.onset_s,
            power: variance * total / sum,
        })
        .collect()
}

/// 95 % intervals of a component's pattern over trials, its filter held fixed: a* = Σ nₖ Cₖ w / Σ nₖ wᵀCₖw over trials drawn with
/// replacement, both windows of a pair together (Efron & Tibshirani 1993). Empty without bootstrap samples.
pub(super) fn pattern_interval(
    covariances: &crate::contrast::space::Covariances,
    design: &Design,
    filter: &[f64],
    samples: usize,
    seed: u64,
) -> Vec<[f64; 2]> {
    let m = filter.len();
    let windows = covariances.packed.len();
    let whole = covariances.packed.iter().all(|c| c.len() == packed_len(m));
    if samples == 0 || windows < 2 || !whole {
        return Vec::new();
    }
    let unit = |k: usize| if design.paired { design.trial[k] } else { k };
    let units = (0..windows).map(unit).max().map_or(0, |last| last + 1);
    // One row a unit: Σ n C w, and in the last column Σ n wᵀCw.
    let mut rows = DMatrix::zeros(units, m + 1);
    for k in 0..windows {
        let weight = covariances.weights[k];
        let product = times(&covariances.packed[k], filter);
        let power: f64 = product.iter().zip(filter).map(|(a, b)| a * b).sum();
        let mut row = rows.row_mut(unit(k));
        for (into, x) in row.iter_mut().zip(product.iter().chain([&power])) {
            *into += weight * x;
        }
    }
    let mut drawn = crate::describe::bootstrap::counts(units, samples, seed) * rows;
    for mut row in drawn.row_iter_mut() {
        let power = row[m];
        row.iter_mut().for_each(|x| *x /= power);
    }
    let mut drawn = drawn.columns(0, m).into_owned();
    let [low, high] = crate::describe::bootstrap::intervals(&mut drawn);
    low.into_iter().zip(high).map(|(l, h)| [l, h]).collect()
}

/// A packed symmetric matrix times a vector.
fn times(packed: &[f64], vector: &[f64]) -> Vec<f64> {
    let m = vector.len();
    let mut product = vec![0.0; m];
    for i in 0..m {
        for j in 0..=i {
            let x = packed[packed_len(i) + j];
            product[i] += x * vector[j];
            if i != j {
                product[j] += x * vector[i];
            }
        }
    }
    product
}

/// The fitted ratio in a typical trial; not a number where the kind has none.
fn fitted_typical(variances: &[f64], design: &Design) -> f64 {
    if design.exchange == Exchange::Flip {
        f64::NAN
    } else {
        log_typical(variances, design).exp()
    }
}

/// What signal variances were divided by, where the kind scales them to the average channel.
pub(super) fn filter_level(work: &Work, recipe: &Recipe) -> f64 {
    if super::work::levelled(recipe) {
        work.average_ratio
    } else {
        1.0
    }
}

/// Those directions of a fit that lie on their own side of 1.
pub(super) fn reported(ends: &Ends) -> (&[Direction], &[Direction]) {
    let up = ends
        .stronger
        .iter()
        .take_while(|d| d.statistic > 1.0)
        .count();
    let down = ends.weaker.iter().take_while(|d| d.statistic < 1.0).count();
    (&ends.stronger[..up], &ends.weaker[..down])
}

/// The end whose first direction departs farther from 1. Of what repeats it is the stronger one: that something repeats less than chance
/// is no answer to the question.
fn leading(ends: &Ends, exchange: Exchange) -> End {
    let far = |list: &[Direction]| list.first().map_or(0.0, |d| d.statistic.ln().abs());
    let (up, down) = reported(ends);
    let repeats = exchange == Exchange::Flip && !up.is_empty();
    if far(down) > far(up) && !repeats {
        End::Weaker
    } else {
        End::Stronger
    }
}

/// The first direction of the leading end.
pub(super) fn leading_direction(ends: &Ends, leading: End) -> Option<&Direction> {
    match leading {
        End::Stronger => ends.stronger.first(),
        End::Weaker => ends.weaker.first(),
    }
}

/// Numbers of dimensions other rules would keep.
pub(super) fn guides(sheet: &mut Sheet) {
    let Some(card) = &mut sheet.compression else {
        return;
    };
    let inside: f64 = card.eigenvalues.iter().filter(|e| **e > 0.0).sum();
    let all = card.basis.map_or(inside, |b| b.total);
    let mut sum = 0.0;
    let share_95 = card.eigenvalues.iter().take_while(|e| {
        let before = sum < 0.95 * all;
        sum += **e;
        before
    });
    let share_95 = share_95.count().max(2).min(card.rank);
    // A basis may end before.
    if inside >= 0.95 * all {
        card.guides.insert("share_95".into(), share_95);
    }
    if let Some(found) = &sheet.dimensions {
        let above = |limit: f64| {
            let values = card.eigenvalues.iter().take(card.rank);
            values.filter(|e| **e > limit).count()
        };
        let parallel = outstanding(&found.correlation, &found.surrogate_95);
        card.guides.insert("parallel_analysis".into(), parallel);
        let rules = [
            ("noise_edge", found.noise_edge),
            ("hard_threshold", found.hard_threshold),
        ];
        for (name, limit) in rules {
            if let Some(limit) = limit {
                card.guides.insert(name.into(), above(limit));
            }
        }
    }
    let Some(curve) = &sheet.curve else { return };
    // Held-out log ratios in the direction of the leading end.
    let sign = if sheet.leading == End::Stronger {
        1.0
    } else {
        -1.0
    };
    let worth: Vec<f64> = curve.held_out.iter().map(|x| sign * x.ln()).collect();
    let Some(peak) = (0..worth.len()).max_by(|a, b| worth[*a].total_cmp(&worth[*b]).then(b.cmp(a)))
    else {
        return;
    };
    let bar = worth[peak] - curve.log_se[peak];
    let simplest = (0..=peak).find(|i| worth[*i] >= bar).unwrap_or(peak);
    card.guides.insert("held_out_peak".into(), curve.keep[peak]);
    card.guides
        .insert("one_standard_error".into(), curve.keep[simplest]);
}

/// Held-out ratios of the components and of the comparators, stability, folds.
pub(super) fn held_out(work: &mut Work, recipe: &Recipe) {
    let (Some(ground), Some(design), Some(prepared), Some(keep), Some(selection)) = (
        &work.ground,
        &work.design,
        &work.prepared,
        work.keep,
        &work.selection,
    ) else {
        return;
    };
    let weights = &work.covariances.weights;
    let (count, seed) = (recipe.evidence.bootstrap, recipe.evidence.seed);
    let patterns: Vec<[Vec<Vec<f64>>; 2]> = work
        .folds
        .iter()
        .zip(&work.fits)
        .map(|(g, f)| {
            [&f.ends.stronger, &f.ends.weaker].map(|end| {
                end.iter()
                    .map(|d| {
                        filter_and_pattern(g, d, weights, &design.signal, work.basis.as_ref()).1
                    })
                    .collect()
            })
        })
        .collect();
    let pairs = [&work.sheet.stronger, &work.sheet.weaker]
        .into_iter()
        .enumerate()
        .flat_map(|(end, list)| turning(list, &patterns, end, recipe.measure))
        .collect::<Vec<String>>();
    let blank = || vec![f64::NAN; weights.len()];
    let mut leading: Option<Scores> = None;
    for (end, components) in [&mut work.sheet.stronger, &mut work.sheet.weaker]
        .into_iter()
        .enumerate()
    {
        for (rank, component) in components.iter_mut().enumerate() {
            let mut scores = blank();
            for (f, (g, fit)) in work.folds.iter().zip(&work.fits).enumerate() {
                let list = if end == 0 {
                    &fit.ends.stronger
                } else {
                    &fit.ends.weaker
                };
                if let Some(d) = list.get(rank).or(list.last()) {
                    score_into(&mut scores, g, weights, design, f, &d.u);
                }
            }
            component.typical =
                typical_ratio(component.typical.fitted, Some(&scores), design, count, seed);
            component.total = total_ratio(component.total.fitted, Some(&scores), weights, design);
            component.trials = trial_scores(&scores, design, selection);
            let cosines: Vec<Vec<f64>> = patterns
                .iter()
                .map(|p| {
                    p[end]
                        .iter()
                        .map(|a| abs_cosine(a, &component.pattern))
                        .collect()
                })
                .collect();
            let mut own: Vec<f64> = cosines
                .iter()
                .filter_map(|c| c.get(rank).copied())
                .collect();
            own.sort_by(f64::total_cmp);
            component.stability = Some(crate::evidence::bootstrap::quantile(&own, 0.5));
            component.places_changed = Some(
                cosines
                    .iter()
                    .filter(|c| c.iter().any(|x| c.get(rank).is_none_or(|own| x > own)))
                    .count(),
            );
            if rank == 0 && (end == 0) == (work.sheet.leading == End::Stronger) {
                leading = Some(scores);
            }
        }
    }
    work.sheet.folds = leading.map_or_else(Vec::new, |scores| fold_cards(&scores, weights, design));
    work.sheet.compare = comparators(work_parts(ground, design, prepared, keep), work, recipe);
    work.sheet.warnings = warnings(work, recipe);
    work.sheet.warnings.extend(pairs);
}

/// Ratios nearer to each other than this factor leave their components free to turn into one another.
const NEAR: f64 = 1.1;
/// Likeness of a plane that is the same over folds, and of a pattern that is not.
const SAME_PLANE: f64 = 0.9;
const NOT_SAME: f64 = 0.8;

/// Says which neighbours of one end share a plane that is stable over folds while they are not: single components of such a pair
/// mean little. Medians over folds; of planes the cosine of the larger principal angle (Björck & Golub 1973).
fn turning(
    list: &[Component],
    patterns: &[[Vec<Vec<f64>>; 2]],
    end: usize,
    measure: Measure,
) -> Vec<String> {
    let fitted = |c: &Component| match measure {
        Measure::Typical => c.typical.fitted,
        Measure::Total => c.total.fitted,
    };
    let median = |mut values: Vec<f64>| {
        values.sort_by(f64::total_cmp);
        crate::evidence::bootstrap::quantile(&values, 0.5)
    };
    let mut out = Vec::new();
    for (j, pair) in list.windows(2).enumerate() {
        let near = (fitted(&pair[0]) / fitted(&pair[1])).ln().abs() < NEAR.ln();
        let folds: Vec<&Vec<Vec<f64>>> = patterns
            .iter()
            .map(|p| &p[end])
            .filter(|p| p.len() > j + 1)
            .collect();
        if !near || folds.is_empty() {
            continue;
        }
        let single = [0, 1].map(|i| {
            let of = |p: &&Vec<Vec<f64>>| abs_cosine(&p[j + i], &pair[i].pattern);
            median(folds.iter().map(of).collect())
        });
        let own = [&pair[0].pattern[..], &pair[1].pattern[..]];
        let plane = |p: &&Vec<Vec<f64>>| plane_likeness(own, [&p[j], &p[j + 1]]);
        let plane = median(folds.iter().map(plane).collect());
        let alone = single[0].min(single[1]);
        if plane >= SAME_PLANE && alone < NOT_SAME {
            let name = if end == 0 {
                "Components"
            } else {
                "Weaker components"
            };
            out.push(format!(
                "{name} {} and {} have nearly the same ratio ({:.2} and {:.2}) and turn into one another from fold to fold: their patterns stay {alone:.2} alike, the plane they span {plane:.2}. Read them as a pair.",
                j + 1,
                j + 2,
                fitted(&pair[0]),
                fitted(&pair[1])
            ));
        }
    }
    out
}

/// Cosine of the larger principal angle between two planes.
fn plane_likeness(a: [&[f64]; 2], b: [&[f64]; 2]) -> f64 {
    let dot = |x: &[f64], y: &[f64]| x.iter().zip(y).map(|(x, y)| x * y).sum::<f64>();
    let basis = |v: [&[f64]; 2]| -> [Vec<f64>; 2] {
        let unit = |x: Vec<f64>| {
            let norm = dot(&x, &x).sqrt();
            x.into_iter().map(|x| x / norm).collect::<Vec<f64>>()
        };
        let first = unit(v[0].to_vec());
        let along = dot(&first, v[1]);
        let rest = v[1].iter().zip(&first).map(|(y, f)| y - along * f);
        [first.clone(), unit(rest.collect())]
    };
    let (a, b) = (basis(a), basis(b));
    let m = [
        [dot(&a[0], &b[0]), dot(&a[0], &b[1])],
        [dot(&a[1], &b[0]), dot(&a[1], &b[1])],
    ];
    // Smaller singular value of a 2×2 matrix: from the sum of squares and the determinant.
    let squares: f64 = m.iter().flatten().map(|x| x * x).sum();
    let determinant = m[0][0] * m[1][1] - m[0][1] * m[1][0];
    let root = (squares * squares - 4.0 * determinant * determinant)
        .max(0.0)
        .sqrt();
    ((squares - root) / 2.0).max(0.0).sqrt()
}

fn trial_scores(
    scores: &Scores,
    design: &Design,
    selection: &crate::contrast::windows::Selection,
) -> Vec<TrialScore> {
    if !design.paired || design.exchange == Exchange::Flip {
        return Vec::new();
    }
    let logs = pair_log_ratios(scores, design);
    selection
        .windows
        .iter()
        .enumerate()
        .filter(|(_, w)| w.signal)
        .map(|(k, w)| TrialScore {
            onset_s: w.onset_s,
            fold: design.fold[k],
            log_ratio: logs[w.trial],
        })
        .collect()
}

fn fold_cards(scores: &Scores, weights: &[f64], design: &Design) -> Vec<FoldCard> {
    // What repeats has no typical ratio: its folds are told by the total one.
    let repeated = if design.exchange == Exchange::Flip {
        total_ratio(1.0, Some(scores), weights, design).folds
    } else {
        Vec::new()
    };
    (0..design.folds)
        .map(|f| {
            let inside: Scores = scores
                .iter()
                .zip(&design.fold)
                .map(|(v, x)| if *x == f { *v } else { f64::NAN })
                .collect();
            let trials = (0..scores.len())
                .filter(|k| design.fold[*k] == f && (design.signal[*k] || !design.paired))
                .count();
            let ratio = repeated
                .get(f)
                .copied()
                .unwrap_or_else(|| log_typical(&inside, design).exp());
            FoldCard { trials, ratio }
        })
        .collect()
}

/// The parts of the work that comparators read.
struct Parts<'a> {
    ground: &'a Ground,
    design: &'a Design,
    prepared: &'a Prepared,
    keep: usize,
}

fn work_parts<'a>(
    ground: &'a Ground,
    design: &'a Design,
    prepared: &'a Prepared,
    keep: usize,
) -> Parts<'a> {
    Parts {
        ground,
        design,
        prepared,
        keep,
    }
}

/// A direction drawn at random in the kept whitened space: independent values of mean 0 and variance 1 (each the sum of twelve
/// uniform numbers less 6).
fn random_direction(keep: usize, seed: u64) -> Vec<f64> {
    let mut rng = generator(seed, STREAM_DIRECTION);
    let mut uniform = || (rng.next_u64() >> 11) as f64 * 2f64.powi(-53);
    (0..keep)
        .map(|_| (0..12).map(|_| uniform()).sum::<f64>() - 6.0)
        .collect()
}

/// Principal components, channels, the channels' mean and a random direction, on the same held-out windows.
fn comparators(parts: Parts<'_>, work: &Work, recipe: &Recipe) -> Vec<Comparator> {
    let Parts {
        ground,
        design,
        prepared,
        keep,
    } = parts;
    let all = &work.covariances;
    let weights = &all.weights;
    let everything = vec![true; weights.len()];
    let shares: f64 = ground.space.eigenvalues.iter().filter(|e| **e > 0.0).sum();
    let signal = &design.signal;
    let of_pc = |g: &Ground, i: usize, of: &dyn Fn(usize) -> bool| {
        g.space.component_variances(i, signal, of)
    };
    let of_channel = |i: usize, of: &dyn Fn(usize) -> bool| all.channel_variances(i, signal, of);
    let best_pc = best_of(
        work.sheet.leading,
        keep,
        |i| of_pc(ground, i, &|_| true),
        weights,
        design,
        &everything,
        recipe.measure,
    );
    let best_channel = best_of(
        work.sheet.leading,
        all.candidates(),
        |i| of_channel(i, &|_| true),
        weights,
        design,
        &everything,
        recipe.measure,
    );
    // Dimensions of a basis are no channels.
    let single = work.basis.is_none() || !all.singles.is_empty();
    let of_mean = |of: &dyn Fn(usize) -> bool| all.mean_variances(signal, of);
    let drawn = random_direction(keep, recipe.evidence.seed);
    let of_drawn = |g: &Ground, of: &dyn Fn(usize) -> bool| {
        let kept = drawn.len().min(g.space.dimensions());
        g.space.variances(&drawn[..kept], signal, of)
    };
    let make = |kind: ComparatorKind, fitted: Vec<f64>, chosen_in: &dyn Fn(usize) -> usize| {
        let mut scores = vec![f64::NAN; weights.len()];
        for (f, g) in work.folds.iter().enumerate() {
            let i = chosen_in(f);
            fill(&mut scores, weights, design, f, |of| match kind {
                ComparatorKind::BestChannel => of_channel(i, of),
                ComparatorKind::FirstPc | ComparatorKind::BestPc => of_pc(g, i, of),
                ComparatorKind::MeanOfChannels => of_mean(of),
                ComparatorKind::RandomDirection => of_drawn(g, of),
            });
        }
        let (count, seed) = (recipe.evidence.bootstrap, recipe.evidence.seed);
        Comparator {
            kind,
            chosen: None,
            chosen_in_folds: None,
            share: None,
            typical: typical_ratio(
                fitted_typical(&fitted, design),
                Some(&scores),
                design,
                count,
                seed,
            ),
            total: total_ratio(
                log_total(&fitted, weights, design, |_| true).exp(),
                Some(&scores),
                weights,
                design,
            ),
        }
    };
    let share_of = |i: usize| Some(ground.space.eigenvalues[i] / shares);
    let (pc, pc_folds) = most_frequent(work.fits.iter().map(|f| f.best_pc));
    let (channel, channel_folds) = most_frequent(work.fits.iter().map(|f| f.best_channel));
    let mut found = vec![
        Comparator {
            chosen: Some((pc + 1).to_string()),
            chosen_in_folds: Some(pc_folds),
            share: share_of(pc),
            ..make(
                ComparatorKind::BestPc,
                of_pc(ground, best_pc, &|_| true),
                &|f| work.fits[f].best_pc,
            )
        },
        Comparator {
            chosen: Some(prepared.channels[channel].clone()),
            chosen_in_folds: Some(channel_folds),
            ..make(
                ComparatorKind::BestChannel,
                of_channel(best_channel, &|_| true),
                &|f| work.fits[f].best_channel,
            )
        },
        Comparator {
            chosen: Some("1".into()),
            share: share_of(0),
            ..make(ComparatorKind::FirstPc, of_pc(ground, 0, &|_| true), &|_| 0)
        },
        make(ComparatorKind::MeanOfChannels, of_mean(&|_| true), &|_| 0),
        make(
            ComparatorKind::RandomDirection,
            of_drawn(ground, &|_| true),
            &|_| 0,
        ),
    ];
    // Dimensions of a basis are no channels.
    let whole = work.basis.is_none();
    found.retain(|c| match c.kind {
        ComparatorKind::BestChannel => single,
        ComparatorKind::MeanOfChannels => whole,
        _ => true,
    });
    found
}

/// The value met most often (the smallest of equals), and how often.
fn most_frequent(values: impl Iterator<Item = usize>) -> (usize, usize) {
    let mut counts: BTreeMap<usize, usize> = BTreeMap::new();
    values.for_each(|v| *counts.entry(v).or_default() += 1);
    counts.into_iter().fold(
        (0, 0),
        |best, (v, n)| if n > best.1 { (v, n) } else { best },
    )
}

/// The permutation test and every component's p.
pub(super) fn permuted(work: &mut Work, recipe: &Recipe) {
    let (Some(plan), Some(design), Some((ends, level))) =
        (work.plan, &work.design, work.observed(recipe))
    else {
        return;
    };
    // Where both sides were brought to one level the null is about the average direction: told as ratios of the recording.
    let null = work.null.iter().map(|(l, s)| (l * level, s * level));
    let (largest, smallest): (Vec<f64>, Vec<f64>) = null.unzip();
    let told = |list: &[Direction]| list.iter().map(|d| d.statistic * level).collect();
    let mut observed_stronger: Vec<f64> = told(&ends.stronger);
    let mut observed_weaker: Vec<f64> = told(&ends.weaker);
    observed_stronger.truncate(work.sheet.stronger.len());
    observed_weaker.truncate(work.sheet.weaker.len());
    let test = |observed: f64, null: &[f64], larger| {
        (!null.is_empty()).then(|| p_value(observed, null, plan.exact, larger))
    };
    for (component, x) in work.sheet.stronger.iter_mut().zip(&observed_stronger) {
        component.p = test(*x, &largest, true);
    }
    for (component, x) in work.sheet.weaker.iter_mut().zip(&observed_weaker) {
        component.p = test(*x, &smallest, false);
    }
    work.sheet.permutation = Some(Permutation {
        measure: recipe.measure,
        asked: recipe.evidence.permutations,
        done: work.null.len(),
        distinct: plan.distinct,
        exact: plan.exact,
        null: null_hypothesis(design.exchange).into(),
        largest,
        smallest,
        observed_stronger,
        observed_weaker,
    });
}

/// Everything a careful reader should know, the most important first.
fn warnings(work: &Work, recipe: &Recipe) -> Vec<String> {
    let mut out = Vec::new();
    let sheet = &work.sheet;
    let repetitions = sheet.repetitions();
    if repetitions < crate::evidence::FEWEST {
        let unit = if sheet.windows.as_ref().is_some_and(|w| w.paired) {
            "pairs of windows"
        } else {
            "windows a side"
        };
        out.push(format!(
            "{repetitions} {unit}: enough to look, too few to test. Held-out ratios and p are withheld until there are {}.",
            crate::evidence::FEWEST
        ));
    }
    if let Some(why) = recipe.p_withheld() {
        out.push(format!("{}{}.", why[..1].to_uppercase(), &why[1..]));
    }
    if let (Keep::Number(asked), Some(keep), Some(ground)) = (recipe.keep, work.keep, &work.ground)
        && asked > keep
    {
        let rank = ground.space.rank;
        out.push(format!(
            "C = {asked} was asked for; the channels span {rank} dimensions, so {keep} are kept."
        ));
    }
    if recipe.keep == Keep::Word(KeepWord::Best)
        && let Some(keep) = work.keep
    {
        out.push(format!("C = {keep} was chosen by the labels; the choice is repeated in every fold and every permutation."));
    }
    if let (Some(prepared), Some(ground)) = (&work.prepared, &work.ground)
        && work.basis.is_none()
        && ground.space.rank < prepared.channels.len()
    {
        out.push(format!(
            "The rank is {} with {} channels: the rest are combinations of others (an average reference, an interpolated or a copied channel).",
            ground.space.rank,
            prepared.channels.len()
        ));
    }
    if let (Some(card), Some(prepared)) = (&sheet.compression, &work.prepared)
        && let Some(basis) = card.basis
    {
        let last = card.eigenvalues.get(card.kept.saturating_sub(1));
        let bound = if basis.exact {
            ""
        } else {
            ", but for one chance in 10^10"
        };
        out.push(format!(
            "{} channels are first brought to a basis of {} dimensions: {:.1} % of their variance lies outside it, and no direction there \
             holds more than {:.3} % of it{bound} (dimension {} holds {:.3} %). The basis is made once from the windows of all folds, blind to their sides.",
            prepared.channels.len(),
            basis.dimensions,
            100.0 * basis.left_out,
            100.0 * basis.outside / basis.total,
            card.kept,
            100.0 * last.copied().unwrap_or(0.0) / basis.total,
        ));
    }
    out.extend(disagreement(work));
    if let Some(selection) = &work.selection {
        out.extend(selection.warnings.iter().cloned());
    }
    if let Some(prepared) = &work.prepared {
        out.extend(prepared.warnings.iter().cloned());
        out.extend(edge_warning(prepared, recipe));
        out.extend(mirrored_warning(work, prepared));
    }
    out.extend(sheet.recording.warnings.iter().cloned());
    out
}

/// Where a few large windows decide between the two measures, says how many.
fn disagreement(work: &Work) -> Option<String> {
    if !work.sheet.recipe.contrast.allows(Measure::Typical) {
        return None;
    }
    let component = work.sheet.first()?;
    let typical = component
        .typical
        .held_out
        .unwrap_or(component.typical.fitted);
    let total = component.total.held_out.unwrap_or(component.total.fitted);
    let factor = total / typical;
    if factor < DISAGREEMENT && factor > 1.0 / DISAGREEMENT {
        return None;
    }
    let (ground, design, ends) = (
        work.ground.as_ref()?,
        work.design.as_ref()?,
        work.ends.as_ref()?,
    );
    let v = variances(
        &ground.space,
        &leading_direction(ends, work.sheet.leading)?.u,
        &design.signal,
    );
    let side = factor > 1.0;
    let mut powers: Vec<f64> = v
        .iter()
        .zip(&design.signal)
        .filter(|(_, s)| **s == side)
        .map(|(v, _)| *v)
        .collect();
    powers.sort_by(|a, b| b.total_cmp(a));
    let half = 0.5 * powers.iter().sum::<f64>();
    let mut sum = 0.0;
    let few = powers.iter().take_while(|p| {
        let before = sum < half;
        sum += **p;
        before
    });
    let few = few.count();
    let which = if side { "signal" } else { "reference" };
    Some(format!(
        "The measures disagree on component 1: {typical:.2}× in a typical trial, {total:.2}× over all power. Half of its power on the {which} side lies in {few} of {} windows; look at them first.",
        powers.len()
    ))
}

/// Says when a window is short against the longest filter.
fn edge_warning(prepared: &Prepared, recipe: &Recipe) -> Option<String> {
    let (signal, reference) = recipe.contrast.event_windows()?;
    let shortest = (signal.to_s - signal.from_s).min(reference.to_s - reference.from_s);
    let filter = prepared.card.longest_filter_s;
    (filter > 5.0 * shortest).then(|| {
        format!("The longest filter spans {filter:.2} s, the shorter windows {shortest:.2} s: what happens beside a window reaches into it.")
    })
}

/// Says how many windows lie where the filters see mirrored samples.
fn mirrored_warning(work: &Work, prepared: &Prepared) -> Option<String> {
    let reach_s = prepared.card.response.as_ref()?.reach_s;
    let reach = (reach_s * prepared.rate_hz).round() as usize;
    let windows = &work.selection.as_ref()?.windows;
    let near = |w: &&crate::contrast::windows::Window| {
        prepared.stretches.iter().any(|s| {
            let (first, end) = (s.first, s.first + s.count);
            w.first >= first
                && w.first + w.count <= end
                && (w.first - first < reach || end - w.first - w.count < reach)
        })
    };
    let count = windows.iter().filter(near).count();
    (count > 0).then(|| {
        format!(
            "{count} of {} windows lie within {reach_s:.2} s of the start, the end or a gap, where the filters reach into mirrored samples.",
            windows.len()
        )
    })
}

#[cfg(test)]
mod tests {
    use super::plane_likeness;

    #[test]
    fn planes_are_compared_by_their_larger_angle() {
        let (x, y) = ([1.0, 0.0, 0.0], [0.0, 1.0, 0.0]);
        // The same plane under another basis; then turned by 30° about x: cos 30°.
        let turned = [0.6, -0.8, 0.0];
        let other = [2.0, 1.0, 0.0];
        assert!((plane_likeness([&x, &y], [&turned, &other]) - 1.0).abs() < 1e-12);
        let tilted = [0.0, 0.75f64.sqrt(), 0.5];
        assert!((plane_likeness([&x, &y], [&x, &tilted]) - 0.75f64.sqrt()).abs() < 1e-12);
    }
}
