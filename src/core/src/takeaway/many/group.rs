//! What recordings say together.
//!
//! # Patterns
//! Over the channels that all share, each pattern is brought to length 1 (a noisier recording has larger units of component, which
//! is no reason to weigh it differently) and given the sign that agrees with the principal direction of them all: the unit vector v
//! that maximises Σ (aᵢ·v)². The group's pattern is their mean; a length near 1 says that they are alike. A recording's likeness is
//! the |cosine| with the mean of the *others*.
//!
//! # Curves
//! Spectra are averaged as decibels (a geometric mean of densities), courses as decibels, averages with the pattern's sign. Intervals
//! are percentile bootstrap intervals over recordings (2,000 samples). Where recordings have different grids, all are interpolated
//! linearly to the coarsest one, over the range that all share.
use super::row::{Portrait, Row};
use crate::analysis::blank;
use crate::describe::bootstrap::means;
use crate::evidence::signflip::{SignFlip, sign_flip};
use crate::recipe::{Measure, Recipe};
use crate::recording::Recording;
use crate::sheet::{
    ChannelCard, ChannelState, Component, Course, End, PreparationCard, Sheet, Spectra,
    TypicalRatio,
};
use nalgebra::DMatrix;
use serde::Serialize;
use std::collections::BTreeSet;

/// Bootstrap samples of the group's curves.
const SAMPLES: usize = 2000;
/// Fewest recordings that make a group.
const FEWEST: usize = 2;
/// A likeness under this is said.
const UNLIKE: f64 = 0.5;

/// What recordings say together.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Group {
    /// The recipe that all answer.
    pub recipe: Recipe,
    /// The first stronger components.
    pub stronger: Option<GroupEnd>,
    /// The first weaker components.
    pub weaker: Option<GroupEnd>,
}

/// The first components of one end.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct GroupEnd {
    /// Which end.
    pub end: End,
    /// Recordings that have such a component.
    pub recordings: usize,
    /// Test of their held-out log ratios in the recipe's measure.
    pub test: Option<SignFlip>,
    /// Channels that all share, in the order of the first recording.
    pub channels: Vec<String>,
    /// Where they lie on the unit sphere, by the first recording that says so.
    pub positions: Vec<Option<[f64; 3]>>,
    /// Mean of the patterns at length 1, signs aligned.
    pub pattern: Vec<f64>,
    /// Length of `pattern`: 1 where all are alike.
    pub agreement: f64,
    /// |cosine| of each recording's pattern with the mean of the others, one entry a row of the table.
    pub likeness: Vec<Option<f64>>,
    /// Geometric means of the densities.
    pub spectra: Option<Spectra>,
    /// Mean power (dB) and mean average around the event.
    pub course: Option<Course>,
}

impl Group {
    /// The group as a sheet, so that its figures are drawn like those of one recording.
    pub fn sheet(&self) -> Sheet {
        let mut sheet = blank(&Recording::default(), &self.recipe);
        let ends = [&self.stronger, &self.weaker];
        let Some(first) = ends.into_iter().flatten().next() else {
            return sheet;
        };
        sheet.preparation = Some(PreparationCard {
            rate_hz: 0.0,
            channels: first.channels.clone(),
            rank: 0,
            longest_filter_s: 0.0,
            filters: Vec::new(),
            before_filters: Vec::new(),
            ranks: Vec::new(),
            response: None,
        });
        let cards = first.channels.iter().zip(&first.positions);
        sheet.channels = cards
            .map(|(name, position)| ChannelCard {
                name: name.clone(),
                unit: String::new(),
                sd: None,
                mains_db: None,
                mains_hz: None,
                state: ChannelState::Used,
                position: *position,
            })
            .collect();
        let fastest = ends
            .into_iter()
            .flatten()
            .filter_map(|e| e.spectra.as_ref()?.hz.last().copied());
        let top = fastest.fold(0.0, f64::max);
        if let Some(card) = &mut sheet.preparation {
            card.rate_hz = 2.0 * top;
        }
        let component = |end: &GroupEnd| Component {
            typical: TypicalRatio {
                fitted: end.test.as_ref().map_or(f64::NAN, |t| t.ratio),
                held_out: end.test.as_ref().map(|t| t.ratio),
                interval: end.test.as_ref().and_then(|t| t.interval),
            },
            p: end.test.as_ref().and_then(|t| t.p),
            pattern: end.pattern.clone(),
            peak_hz: end
                .spectra
                .as_ref()
                .and_then(|s| crate::describe::spectra::peak_hz(s, end.end)),
            spectra: end.spectra.clone(),
            course: end.course.clone(),
            ..Component::default()
        };
        sheet.stronger = self.stronger.iter().map(component).collect();
        sheet.weaker = self.weaker.iter().map(component).collect();
        sheet
    }
}

impl GroupEnd {
    /// How much, how sure.
    pub(super) fn sentence(&self) -> String {
        let side = match self.end {
            End::Stronger => "Stronger",
            End::Weaker => "Weaker",
        };
        let Some(test) = &self.test else {
            return format!("{side} component 1: no recording has a held-out ratio.");
        };
        let sure = match test.p {
            Some(p) => format!(
                ", p = {} by sign flips over recordings",
                crate::takeaway::words::p_value(p)
            ),
            None => String::new(),
        };
        let bounds = test.interval.map_or(String::new(), |i| {
            format!(" ({})", crate::takeaway::words::interval(i))
        });
        format!(
            "{side} component 1: held-out {}{bounds} as the geometric mean of {} recordings, {} of them on this side of 1{sure}.",
            crate::takeaway::words::factor(test.ratio),
            test.recordings,
            test.own_side
        )
    }

    /// What to doubt.
    pub(super) fn doubt(&self) -> Option<String> {
        let unlike = self.likeness.iter().flatten().filter(|x| **x < UNLIKE);
        let side = match self.end {
            End::Stronger => "stronger",
            End::Weaker => "weaker",
        };
        match unlike.count() {
            0 => None,
            n => Some(format!(
                "In {n} of {} recordings the first {side} component's pattern is unlike that of the others (|cosine| under {UNLIKE}): it may be another source there.",
                self.recordings
            )),
        }
    }
}

/// The group of the rows that have a result; what hinders it is noted.
pub(super) fn group(rows: &[Row], notes: &mut Vec<String>) -> Option<Group> {
    let recipes: Vec<&Recipe> = rows.iter().filter_map(|r| r.recipe.as_ref()).collect();
    let recipe = *recipes.first()?;
    let others = recipes.iter().filter(|r| ***r != *recipe).count();
    if others > 0 {
        notes.push(format!(
            "{others} of {} results answer another recipe than the first: there is no group until all answer one.",
            recipes.len()
        ));
        return None;
    }
    if recipes.len() < FEWEST {
        notes.push("One recording with a result makes no group.".into());
        return None;
    }
    let stronger: Vec<Option<&Portrait>> = rows.iter().map(|r| r.stronger.as_ref()).collect();
    let weaker: Vec<Option<&Portrait>> = rows.iter().map(|r| r.weaker.as_ref()).collect();
    // Both ends share their channels, so that both are drawn on one head.
    let channels = shared(stronger.iter().chain(&weaker).copied().flatten());
    if channels.len() < 2 {
        notes.push(
            "The recordings share fewer than two channels: there are no patterns of the group."
                .into(),
        );
    }
    let all = stronger.iter().chain(&weaker).flatten();
    let most = all.map(|p| p.channels.len()).max().unwrap_or(0);
    if channels.len() < most {
        notes.push(format!(
            "Patterns of the group stand on the {} channels that all recordings share; the largest has {most}.",
            channels.len()
        ));
    }
    let seed = recipe.evidence.seed;
    let group = Group {
        recipe: recipe.clone(),
        stronger: end(
            End::Stronger,
            &stronger,
            &channels,
            recipe.measure,
            seed,
            notes,
        ),
        weaker: end(End::Weaker, &weaker, &channels, recipe.measure, seed, notes),
    };
    (group.stronger.is_some() || group.weaker.is_some()).then_some(group)
}

/// Names that every portrait has, in the order of the first, each once.
fn shared<'a>(portraits: impl Iterator<Item = &'a Portrait>) -> Vec<String> {
    let mut names: Option<Vec<String>> = None;
    for portrait in portraits {
        let mine: BTreeSet<&str> = portrait.channels.iter().map(String::as_str).collect();
        let kept = match names {
            None => {
                let mut seen = BTreeSet::new();
                let first = portrait.channels.iter();
                first.filter(|n| seen.insert(n.as_str())).cloned().collect()
            }
            Some(names) => names
                .into_iter()
                .filter(|n| mine.contains(n.as_str()))
                .collect(),
        };
        names = Some(kept);
    }
    names.unwrap_or_default()
}

fn end(
    which: End,
    rows: &[Option<&Portrait>],
    channels: &[String],
    measure: Measure,
    seed: u64,
    notes: &mut Vec<String>,
) -> Option<GroupEnd> {
    let there: Vec<&Portrait> = rows.iter().copied().flatten().collect();
    if there.len() < FEWEST {
        return None;
    }
    let logs: Vec<f64> = there
        .iter()
        .filter_map(|p| p.held_out)
        .map(f64::ln)
        .filter(|x| x.is_finite())
        .collect();
    if logs.len() < there.len() {
        let word = match measure {
            Measure::Typical => "typical",
            Measure::Total => "total",
        };
        notes.push(format!(
            "{} recordings have too few windows for a held-out {word} ratio and take no part in the test of the group.",
            there.len() - logs.len()
        ));
    }
    let patterns: Vec<Vec<f64>> = there.iter().map(|p| unit_pattern(p, channels)).collect();
    let signs = signs(&patterns);
    let (pattern, agreement) = mean_pattern(&patterns, &signs);
    let turned = upright(&pattern);
    let mut alike = likenesses(&patterns, &signs).into_iter();
    let likeness = rows
        .iter()
        .map(|p| p.and_then(|_| alike.next().flatten()))
        .collect();
    let signs: Vec<f64> = signs.iter().map(|s| s * turned).collect();
    let position = |name: &String| {
        there.iter().find_map(|p| {
            let at = p.channels.iter().position(|c| c == name)?;
            p.positions[at]
        })
    };
    let mut regridded = false;
    let spectra = spectra(&there, seed, &mut regridded);
    let course = course(&there, &signs, seed, &mut regridded);
    if regridded {
        let note =
            "Recordings differ in rate or window: their curves were brought to the coarsest grid."
                .to_string();
        if !notes.contains(&note) {
            notes.push(note);
        }
    }
    Some(GroupEnd {
        end: which,
        recordings: there.len(),
        test: sign_flip(&logs, which == End::Stronger, seed),
        positions: channels.iter().map(position).collect(),
        channels: channels.to_vec(),
        pattern: pattern.iter().map(|x| x * turned).collect(),
        agreement,
        likeness,
        spectra,
        course,
    })
}

fn unit_pattern(portrait: &Portrait, channels: &[String]) -> Vec<f64> {
    let value = |name: &String| {
        let at = portrait.channels.iter().position(|c| c == name);
        at.map_or(0.0, |at| portrait.pattern[at])
    };
    let values: Vec<f64> = channels.iter().map(value).collect();
    let length = dot(&values, &values).sqrt();
    let scale = if length > 0.0 && length.is_finite() {
        1.0 / length
    } else {
        0.0
    };
    values
        .iter()
        .map(|x| if x.is_finite() { x * scale } else { 0.0 })
        .collect()
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

/// The sign of each pattern along the principal direction of all (power iteration from the pattern that is most like the others).
fn signs(patterns: &[Vec<f64>]) -> Vec<f64> {
    let worth = |a: &Vec<f64>| patterns.iter().map(|b| dot(a, b).powi(2)).sum::<f64>();
    let start = patterns.iter().max_by(|a, b| worth(a).total_cmp(&worth(b)));
    let Some(mut v) = start.cloned() else {
        return Vec::new();
    };
    for _ in 0..200 {
        let mut next = vec![0.0; v.len()];
        for a in patterns {
            let along = dot(a, &v);
            next.iter_mut().zip(a).for_each(|(n, x)| *n += along * x);
        }
        let length = dot(&next, &next).sqrt();
        if length <= 0.0 {
            break;
        }
        next.iter_mut().for_each(|x| *x /= length);
        let moved = 1.0 - dot(&next, &v).abs();
        v = next;
        if moved < 1e-15 {
            break;
        }
    }
    let sign = |a: &Vec<f64>| if dot(a, &v) < 0.0 { -1.0 } else { 1.0 };
    patterns.iter().map(sign).collect()
}

fn mean_pattern(patterns: &[Vec<f64>], signs: &[f64]) -> (Vec<f64>, f64) {
    let mut mean = vec![0.0; patterns.first().map_or(0, Vec::len)];
    for (a, s) in patterns.iter().zip(signs) {
        mean.iter_mut().zip(a).for_each(|(m, x)| *m += s * x);
    }
    mean.iter_mut().for_each(|m| *m /= patterns.len() as f64);
    let length = dot(&mean, &mean).sqrt();
    (mean, length)
}

/// −1 where the entry of largest magnitude is negative.
fn upright(pattern: &[f64]) -> f64 {
    let largest = pattern
        .iter()
        .fold(0.0_f64, |m, x| if x.abs() > m.abs() { *x } else { m });
    if largest < 0.0 { -1.0 } else { 1.0 }
}

/// |cosine| of each pattern with the mean of the others.
fn likenesses(patterns: &[Vec<f64>], signs: &[f64]) -> Vec<Option<f64>> {
    let sum = |k: usize| {
        let mut sum = vec![0.0; patterns[k].len()];
        for (j, (a, s)) in patterns.iter().zip(signs).enumerate() {
            if j != k {
                sum.iter_mut().zip(a).for_each(|(m, x)| *m += s * x);
            }
        }
        sum
    };
    (0..patterns.len())
        .map(|k| {
            let others = sum(k);
            let length = dot(&others, &others).sqrt() * dot(&patterns[k], &patterns[k]).sqrt();
            (length > 0.0).then(|| (dot(&patterns[k], &others) / length).abs().min(1.0))
        })
        .collect()
}

/// The coarsest of several grids, over the range that all share; the second value says whether any differs from it.
fn common_grid(grids: &[&[f64]]) -> Option<(Vec<f64>, bool)> {
    let step = |g: &[f64]| (g[g.len() - 1] - g[0]) / (g.len() - 1) as f64;
    if grids.iter().any(|g| g.len() < 2) {
        return None;
    }
    let coarsest = grids.iter().max_by(|a, b| step(a).total_cmp(&step(b)))?;
    let from = grids.iter().map(|g| g[0]).fold(f64::NEG_INFINITY, f64::max);
    let to = grids
        .iter()
        .map(|g| g[g.len() - 1])
        .fold(f64::INFINITY, f64::min);
    let room = 1e-9 * (to - from).abs();
    let inside = coarsest.iter().copied();
    let grid: Vec<f64> = inside
        .filter(|x| *x >= from - room && *x <= to + room)
        .collect();
    let differs = grids.iter().any(|g| **g != *grid);
    (grid.len() > 1).then_some((grid, differs))
}

/// Linear between neighbours.
fn at(x: &[f64], y: &[f64], where_: f64) -> f64 {
    let above = x.partition_point(|v| *v < where_);
    let value = |k: usize| y.get(k).copied().unwrap_or(f64::NAN);
    match above {
        _ if x.get(above) == Some(&where_) => value(above),
        0 => value(0),
        n if n == x.len() => value(n - 1),
        n => {
            let share = (where_ - x[n - 1]) / (x[n] - x[n - 1]);
            value(n - 1) + share * (value(n) - value(n - 1))
        }
    }
}

/// One row a recording.
fn stacked<'a>(curves: impl Iterator<Item = (&'a [f64], Vec<f64>)>, grid: &[f64]) -> DMatrix<f64> {
    let rows: Vec<Vec<f64>> = curves
        .map(|(x, y)| grid.iter().map(|g| at(x, &y, *g)).collect())
        .collect();
    DMatrix::from_fn(rows.len(), grid.len(), |r, c| rows[r][c])
}

fn spectra(there: &[&Portrait], seed: u64, regridded: &mut bool) -> Option<Spectra> {
    let all: Vec<&Spectra> = there.iter().filter_map(|p| p.spectra.as_ref()).collect();
    if all.len() < FEWEST {
        return None;
    }
    let grids: Vec<&[f64]> = all.iter().map(|s| s.hz.as_slice()).collect();
    let (hz, differs) = common_grid(&grids)?;
    *regridded |= differs;
    let side = |pick: fn(&Spectra) -> &Vec<f64>, seed: u64| {
        let logs = |s: &Spectra| pick(s).iter().map(|x| x.max(1e-300).ln()).collect();
        let rows = stacked(all.iter().map(|s| (s.hz.as_slice(), logs(s))), &hz);
        means(&rows, SAMPLES, seed).map(|v| v.into_iter().map(f64::exp).collect::<Vec<f64>>())
    };
    let [signal, signal_low, signal_high] = side(|s| &s.signal, seed);
    let [reference, reference_low, reference_high] = side(|s| &s.reference, seed);
    Some(Spectra {
        hz,
        signal,
        signal_low,
        signal_high,
        reference,
        reference_low,
        reference_high,
        segment: all.iter().map(|s| s.segment).min().unwrap_or(0),
    })
}

fn course(there: &[&Portrait], signs: &[f64], seed: u64, regridded: &mut bool) -> Option<Course> {
    let all: Vec<(&Course, f64)> = there
        .iter()
        .zip(signs)
        .filter_map(|(p, s)| Some((p.course.as_ref()?, *s)))
        .collect();
    let (first, _) = all.first().filter(|_| all.len() >= FEWEST)?;
    let grids: Vec<&[f64]> = all.iter().map(|(c, _)| c.t_s.as_slice()).collect();
    let (t_s, differs) = common_grid(&grids)?;
    *regridded |= differs;
    let power = stacked(
        all.iter()
            .map(|(c, _)| (c.t_s.as_slice(), c.mean_db.clone())),
        &t_s,
    );
    let average = stacked(
        all.iter().map(|(c, s)| {
            let signed = c.average.iter().map(|x| s * x).collect();
            (c.t_s.as_slice(), signed)
        }),
        &t_s,
    );
    let [mean_db, low_db, high_db] = means(&power, SAMPLES, seed);
    let [average, average_low, average_high] = means(&average, SAMPLES, seed);
    Some(Course {
        event: first.event.clone(),
        mean_db,
        low_db,
        high_db,
        average,
        average_low,
        average_high,
        smoothing_s: first.smoothing_s,
        trials: all.iter().map(|(c, _)| c.trials).sum(),
        t_s,
    })
}
