//! Is a component's effect there in most recordings? A sign-flip permutation test over recordings.
//!
//! # Null hypothesis
//! The held-out log ratio of a recording is as likely to be x as −x: its filters, fitted on other windows, find no more variance on
//! one side than on the other. Under it the sign of every recording's log ratio may be flipped (Fisher 1935, *The Design of
//! Experiments*, section 21; Nichols & Holmes 2002). The statistic is the mean log ratio; large values count against the null for the
//! stronger end, small ones for the weaker: the end was chosen before, so the test has one side.
//!
//! With few recordings every arrangement is taken once, p = b/2ⁿ with the observed one among them; else m are drawn and
//! p = (b+1)/(m+1) (Phipson & Smyth 2010). Under five recordings p cannot reach 0.05 and is withheld.
use super::bootstrap::{generator, quantile};
use super::permute::p_value;
use rand_chacha::rand_core::Rng;
use serde::{Deserialize, Serialize};

/// Under this many recordings p is withheld: 2⁻⁴ is above 0.05.
pub const FEWEST_RECORDINGS: usize = 5;
/// Arrangements drawn where there are too many to take all.
const DRAWN: usize = 9999;
/// Recordings up to which every arrangement is taken.
const EXACT_UP_TO: usize = 13;
/// Bootstrap samples of the interval of the mean.
const SAMPLES: usize = 2000;
/// Stream of the drawn signs.
const STREAM_SIGNS: u64 = 3;
/// Stream of the interval.
const STREAM_INTERVAL: u64 = 4;

/// What the test says.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SignFlip {
    /// Recordings with a held-out ratio.
    pub recordings: usize,
    /// Geometric mean of their held-out ratios.
    pub ratio: f64,
    /// 95 % bootstrap interval of `ratio` over recordings; `None` under five of them.
    pub interval: Option<[f64; 2]>,
    /// How many lie on the end's own side of 1.
    pub own_side: usize,
    /// One-sided p; `None` under five recordings.
    pub p: Option<f64>,
    /// Arrangements looked at, the observed one among them.
    pub arrangements: usize,
    /// They are all there are.
    pub exact: bool,
    /// The null hypothesis in a sentence.
    pub null: String,
}

/// The test of natural logs of held-out ratios, one a recording; `larger`: large values count against the null. `None` without any.
pub fn sign_flip(logs: &[f64], larger: bool, seed: u64) -> Option<SignFlip> {
    let n = logs.len();
    if n == 0 {
        return None;
    }
    let mean = |signed: f64| signed / n as f64;
    let observed = mean(logs.iter().sum());
    let exact = n <= EXACT_UP_TO;
    let sums: Vec<f64> = if exact {
        (0..1_usize << n)
            .map(|bits| flipped(logs, |k| bits >> k & 1 == 1))
            .map(mean)
            .collect()
    } else {
        let mut rng = generator(seed, STREAM_SIGNS);
        let mut bits = 0_u64;
        (0..DRAWN)
            .map(|_| {
                let sum = flipped(logs, |k| {
                    if k.is_multiple_of(64) {
                        bits = rng.next_u64();
                    }
                    bits >> (k % 64) & 1 == 1
                });
                mean(sum)
            })
            .collect()
    };
    let enough = n >= FEWEST_RECORDINGS;
    Some(SignFlip {
        recordings: n,
        ratio: observed.exp(),
        interval: enough.then(|| interval(logs, seed)),
        own_side: logs
            .iter()
            .filter(|x| if larger { **x > 0.0 } else { **x < 0.0 })
            .count(),
        p: enough.then(|| p_value(observed, &sums, exact, larger)),
        arrangements: sums.len() + usize::from(!exact),
        exact,
        null: "in each recording the held-out log ratio is as likely to lie above 0 as equally far below it".into(),
    })
}

fn flipped(logs: &[f64], mut flip: impl FnMut(usize) -> bool) -> f64 {
    let signed = logs
        .iter()
        .enumerate()
        .map(|(k, x)| if flip(k) { -x } else { *x });
    signed.sum()
}

fn interval(logs: &[f64], seed: u64) -> [f64; 2] {
    let mut rng = generator(seed, STREAM_INTERVAL);
    let mut means: Vec<f64> = (0..SAMPLES)
        .map(|_| {
            let sum: f64 = (0..logs.len())
                .map(|_| logs[super::bootstrap::below(&mut rng, logs.len())])
                .sum();
            sum / logs.len() as f64
        })
        .collect();
    means.sort_by(f64::total_cmp);
    [quantile(&means, 0.025).exp(), quantile(&means, 0.975).exp()]
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "tests")]
    use super::*;

    #[test]
    fn few_recordings_are_counted_out_by_hand() {
        // All five on one side: only the observed arrangement reaches its own mean, 1 of 32.
        let all = sign_flip(&[0.1, 0.2, 0.3, 0.4, 0.5], true, 1).unwrap();
        assert_eq!((all.p, all.exact), (Some(1.0 / 32.0), true));
        // The smallest one turned: {0.1 up or down} with the rest up reach 1.3 of ±: 2 of 32.
        let one = sign_flip(&[-0.1, 0.2, 0.3, 0.4, 0.5], true, 1).unwrap();
        assert_eq!((one.p, one.own_side), (Some(2.0 / 32.0), 4));
        // The weaker end is the mirror image.
        let weaker = sign_flip(&[0.1, -0.2, -0.3, -0.4, -0.5], false, 1).unwrap();
        assert_eq!(weaker.p, one.p);
        assert!((one.ratio.ln() - 0.26).abs() < 1e-15);
    }

    #[test]
    fn under_five_recordings_there_is_no_p() {
        let few = sign_flip(&[0.5; 4], true, 1).unwrap();
        assert_eq!((few.p, few.interval), (None, None));
        assert_eq!(sign_flip(&[], true, 1), None);
    }

    #[test]
    fn drawn_arrangements_come_near_the_normal_law_and_depend_on_the_seed_alone() {
        // Twenty equal magnitudes, 15 up and 5 down: P(Bin(20, ½) ≥ 15) = 21700/2^20.
        let logs: Vec<f64> = (0..20).map(|k| if k < 5 { -1.0 } else { 1.0 }).collect();
        let p = sign_flip(&logs, true, 7).unwrap();
        let truth = 21700.0 / 1_048_576.0;
        // Four standard errors of 9,999 draws.
        let room = 4.0 * (truth * (1.0 - truth) / 9999.0_f64).sqrt();
        assert!((p.p.unwrap() - truth).abs() < room, "{:?}", p.p);
        assert_eq!(p, sign_flip(&logs, true, 7).unwrap());
        assert_eq!((p.arrangements, p.exact), (10_000, false));
    }
}
