//! The permutation test with the maximum statistic (Nichols & Holmes 2002), p = (b+1)/(m+1) (Phipson & Smyth 2010).
//!
//! * Paired: the two sides of a trial are swapped or not, each with probability ½; where there are no more arrangements than
//!   asked for, every one is taken once and p = b/2ⁿ (the observed one is among them).
//! * What repeats: the sign of each trial is turned or not, likewise.
//! * Spans: the labels of all pieces move along the row of pieces together; there are as many arrangements as pieces (fewer where
//!   the labels repeat themselves), and all are taken once where no more were asked for.
//! * Bands and slow changes: the two sides of a segment are swapped after the signal side was scaled to the level of the reference
//!   side over all directions, so that what is tested is whether directions differ from one another.
//! * Unpaired: the labels are shuffled over all windows of both sides; for `keep: "best"` within each fold, so that the folds keep
//!   their make-up.
//!
//! Arrangement number i depends on the seed and i alone, so any division of the work gives the same numbers.
use super::bootstrap::{below, generator};
use super::heldout::Design;
use crate::contrast::windows::Exchange;
use rand_chacha::rand_core::Rng;

/// Stream of the bootstrap of held-out ratios.
pub const STREAM_BOOTSTRAP: u64 = 1;
/// Stream of the bootstrap of spectra and courses.
pub const STREAM_DESCRIBE: u64 = 2;
/// Stream of the random direction beside the components (3 draws windows, in `contrast::windows`).
pub const STREAM_DIRECTION: u64 = 4;
/// Arrangement i uses stream `STREAM_ARRANGEMENTS + i`.
const STREAM_ARRANGEMENTS: u64 = 1 << 32;
/// Slack of the comparison "as large", relative: rounding must not break ties.
const TIE: f64 = 1e-9;

/// How many arrangements will be looked at, whether they are all there are, and how many distinct ones exist (where that is known).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Plan {
    /// Arrangements to compute.
    pub count: usize,
    /// They are all there are.
    pub exact: bool,
    /// Distinct ones, up to 2^53.
    pub distinct: Option<f64>,
}

/// Plans `asked` arrangements.
pub fn plan(design: &Design, asked: usize) -> Plan {
    let n = design.count(true);
    let distinct = match design.exchange {
        Exchange::Swap | Exchange::Level => 2f64.powi(n.min(2000) as i32),
        // Turning every trial changes nothing.
        Exchange::Flip => 2f64.powi(n.clamp(1, 2000) as i32 - 1),
        Exchange::Shift => period(&design.signal) as f64,
        Exchange::Shuffle => binomial(design.signal.len(), n),
    };
    let enumerable = !matches!(design.exchange, Exchange::Shuffle);
    let exact = enumerable && asked > 0 && distinct <= asked as f64;
    Plan {
        count: if exact { distinct as usize } else { asked },
        exact,
        distinct: (distinct <= 2f64.powi(53)).then_some(distinct),
    }
}

/// After how many steps along the row the labels look the same again.
fn period(labels: &[bool]) -> usize {
    let n = labels.len();
    let same = |p: usize| (0..n).all(|k| labels[k] == labels[(k + p) % n]);
    (1..=n)
        .find(|p| n.is_multiple_of(*p) && same(*p))
        .unwrap_or(n)
        .max(1)
}

fn binomial(n: usize, k: usize) -> f64 {
    (0..k.min(n - k))
        .fold(1.0, |product: f64, i| {
            product * (n - i) as f64 / (i + 1) as f64
        })
        .round()
}

/// The labels of arrangement `i`.
pub fn arrangement(
    design: &Design,
    plan: Plan,
    within_folds: bool,
    seed: u64,
    i: usize,
) -> Vec<bool> {
    if design.exchange == Exchange::Shift {
        let n = design.signal.len();
        let by = if plan.exact {
            i
        } else {
            below(&mut generator(seed, STREAM_ARRANGEMENTS + i as u64), n)
        };
        return (0..n).map(|k| design.signal[(k + by) % n]).collect();
    }
    if design.paired {
        let swap: Vec<bool> = if plan.exact {
            (0..design.count(true)).map(|t| i >> t & 1 == 1).collect()
        } else {
            let mut rng = generator(seed, STREAM_ARRANGEMENTS + i as u64);
            let mut bits = 0u64;
            (0..design.count(true))
                .map(|t| {
                    if t % 64 == 0 {
                        bits = rng.next_u64();
                    }
                    bits >> (t % 64) & 1 == 1
                })
                .collect()
        };
        return design
            .signal
            .iter()
            .zip(&design.trial)
            .map(|(s, t)| *s != swap[*t])
            .collect();
    }
    let mut rng = generator(seed, STREAM_ARRANGEMENTS + i as u64);
    let mut labels = design.signal.clone();
    let groups = if within_folds { design.folds } else { 1 };
    for g in 0..groups {
        let members: Vec<usize> = (0..labels.len())
            .filter(|k| !within_folds || design.fold[*k] == g)
            .collect();
        for a in (1..members.len()).rev() {
            labels.swap(members[a], members[below(&mut rng, a + 1)]);
        }
    }
    labels
}

/// p of an observed statistic against those of the arrangements; `larger`: large values count against the null.
pub fn p_value(observed: f64, null: &[f64], exact: bool, larger: bool) -> f64 {
    let slack = TIE * observed.abs();
    let hits = null
        .iter()
        .filter(|x| {
            if larger {
                **x >= observed - slack
            } else {
                **x <= observed + slack
            }
        })
        .count();
    if exact {
        hits as f64 / null.len() as f64
    } else {
        (hits + 1) as f64 / (null.len() + 1) as f64
    }
}

/// The null hypothesis in a sentence.
pub fn null_hypothesis(exchange: Exchange) -> &'static str {
    match exchange {
        Exchange::Swap => {
            "Within a trial the signal and the reference window are exchangeable: swapping them changes nothing but chance."
        }
        Exchange::Shuffle => {
            "The two kinds of events are exchangeable: which window carries which label is a matter of chance."
        }
        Exchange::Shift => {
            "What the recording does has nothing to do with when the spans lie: moving all labels along it together changes nothing but chance."
        }
        Exchange::Flip => {
            "Nothing repeats: what a trial holds has nothing to do with the other trials, so turning the sign of any of them changes nothing but chance."
        }
        Exchange::Level => {
            "Every direction in channel space has the same spectrum but for its size: once both sides of a segment are brought to one level over all directions, swapping them changes nothing but chance."
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn paired(n: usize) -> Design {
        Design {
            paired: true,
            exchange: Exchange::Swap,
            signal: [true, false].repeat(n),
            trial: (0..2 * n).map(|k| k / 2).collect(),
            fold: vec![0; 2 * n],
            folds: 1,
        }
    }

    #[test]
    fn exact_enumeration_takes_every_arrangement_once_and_the_observed_first() {
        let design = paired(4);
        let plan = plan(&design, 100);
        assert_eq!(
            plan,
            Plan {
                count: 16,
                exact: true,
                distinct: Some(16.0)
            }
        );
        let mut all: Vec<Vec<bool>> = (0..16)
            .map(|i| arrangement(&design, plan, false, 1, i))
            .collect();
        assert_eq!(all[0], design.signal);
        all.sort();
        all.dedup();
        assert_eq!(all.len(), 16);
    }

    #[test]
    fn labels_of_spans_move_along_the_row_together() {
        let signal = vec![true, true, false, false, false, true];
        let design = Design {
            paired: false,
            exchange: Exchange::Shift,
            signal: signal.clone(),
            trial: vec![0, 1, 0, 1, 2, 2],
            fold: vec![0; 6],
            folds: 1,
        };
        let plan = plan(&design, 50);
        assert_eq!((plan.count, plan.exact), (6, true));
        let all: Vec<Vec<bool>> = (0..6)
            .map(|i| arrangement(&design, plan, false, 1, i))
            .collect();
        assert_eq!(all[0], signal);
        assert_eq!(all[2], [false, false, false, true, true, true]);
        assert_eq!(period(&[true, false, true, false]), 2);
    }

    #[test]
    fn p_counts_ties_and_the_observed_arrangement() {
        // Phipson & Smyth 2010: b of m as large gives (b+1)/(m+1).
        assert_eq!(p_value(3.0, &[1.0, 3.0, 5.0, 2.0], false, true), 3.0 / 5.0);
        assert_eq!(p_value(0.5, &[1.0, 0.4, 0.5], false, false), 3.0 / 4.0);
        assert_eq!(p_value(9.0, &[9.0, 1.0, 1.0, 1.0], true, true), 0.25);
    }

    #[test]
    fn shuffles_keep_the_counts_and_within_folds_each_folds_counts() {
        let design = Design {
            paired: false,
            exchange: Exchange::Shuffle,
            signal: vec![true, true, false, true, false, false, true, false],
            trial: vec![0, 1, 0, 2, 1, 2, 3, 3],
            fold: vec![0, 0, 0, 0, 1, 1, 1, 1],
            folds: 2,
        };
        assert_eq!(plan(&design, 10).distinct, Some(70.0));
        let mut moved = false;
        for i in 0..20 {
            let labels = arrangement(&design, plan(&design, 10), true, 3, i);
            for f in 0..2 {
                let count = |l: &[bool]| (0..8).filter(|k| design.fold[*k] == f && l[*k]).count();
                assert_eq!(count(&labels), count(&design.signal));
            }
            moved |= labels != design.signal;
        }
        assert!(moved);
    }
}
