//! Spans of time, and the pieces they are cut into.
//!
//! Spans are half-open, [from, to), in samples of the recording's clock: from = round(t0·f), to = round(t1·f), halves away from
//! zero. What lies in a gap, in a span marked not to be used or in the share that is locked away is taken off before cutting, so
//! that no piece touches it. Each remaining run is cut into whole pieces from its start; what is left at its end is not used.
use crate::recording::{Event, Stretch};

/// Half-open runs of clock samples, in order, none touching the next.
pub type Runs = Vec<[i64; 2]>;

/// Sorts, drops empty runs and joins those that touch.
pub fn merged(mut runs: Runs) -> Runs {
    runs.retain(|r| r[0] < r[1]);
    runs.sort_unstable();
    let mut out: Runs = Vec::with_capacity(runs.len());
    for run in runs {
        match out.last_mut() {
            Some(last) if run[0] <= last[1] => last[1] = last[1].max(run[1]),
            _ => out.push(run),
        }
    }
    out
}

/// What lies in both; `a` and `b` merged.
pub fn both(a: &[[i64; 2]], b: &[[i64; 2]]) -> Runs {
    let (mut i, mut j, mut out) = (0, 0, Runs::new());
    while let (Some(x), Some(y)) = (a.get(i), b.get(j)) {
        let run = [x[0].max(y[0]), x[1].min(y[1])];
        if run[0] < run[1] {
            out.push(run);
        }
        if x[1] < y[1] { i += 1 } else { j += 1 }
    }
    out
}

/// What lies in `a` and not in `b`; both merged.
pub fn without(a: &[[i64; 2]], b: &[[i64; 2]]) -> Runs {
    let (mut out, mut j) = (Runs::new(), 0);
    for run in a {
        let mut from = run[0];
        while b.get(j).is_some_and(|cut| cut[1] <= from) {
            j += 1;
        }
        for cut in b[j..].iter().take_while(|cut| cut[0] < run[1]) {
            if from < cut[0] {
                out.push([from, cut[0]]);
            }
            from = from.max(cut[1]);
        }
        if from < run[1] {
            out.push([from, run[1]]);
        }
    }
    out
}

/// Spans in seconds as runs.
pub fn runs(spans: &[[f64; 2]], rate_hz: f64) -> Runs {
    // Beyond this no recording reaches, and a float no longer counts samples.
    let clock = |s: f64| (s * rate_hz).round().clamp(-1e15, 1e15) as i64;
    merged(spans.iter().map(|s| s.map(clock)).collect())
}

/// Spans of the annotations that last and carry this label or pattern.
pub fn labelled(label: &str, events: &[Event]) -> Vec<[f64; 2]> {
    super::windows::named(label, events)
        .filter(|e| e.duration_s > 0.0)
        .map(|e| [e.onset_s, e.onset_s + e.duration_s])
        .collect()
}

/// Whole pieces of `count` samples of runs that lie inside stretches: index of the first sample, and its time on the clock.
pub fn cut(
    runs: &[[i64; 2]],
    stretches: &[Stretch],
    rate_hz: f64,
    count: usize,
) -> Vec<(usize, f64)> {
    let mut out = Vec::new();
    for stretch in stretches {
        let start = (stretch.onset_s * rate_hz).round() as i64;
        for run in both(runs, &[[start, start + stretch.count as i64]]) {
            let whole = (run[1] - run[0]) / count as i64;
            out.extend((0..whole).map(|i| {
                let at = run[0] + i * count as i64;
                (stretch.first + (at - start) as usize, at as f64 / rate_hz)
            }));
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn runs_are_joined_cut_and_subtracted() {
        let a = merged(vec![[5, 9], [0, 3], [3, 4], [9, 9]]);
        assert_eq!(a, [[0, 4], [5, 9]]);
        assert_eq!(both(&a, &[[2, 6], [8, 20]]), [[2, 4], [5, 6], [8, 9]]);
        assert_eq!(without(&a, &[[-2, 1], [3, 6], [8, 9]]), [[1, 3], [6, 8]]);
        assert_eq!(
            without(&[[0, 10]], &[[2, 3], [5, 6]]),
            [[0, 2], [3, 5], [6, 10]]
        );
    }

    #[test]
    fn pieces_stay_inside_their_stretch() {
        let stretches = [
            Stretch {
                first: 0,
                count: 50,
                onset_s: 0.0,
            },
            Stretch {
                first: 50,
                count: 50,
                onset_s: 7.0,
            },
        ];
        // 10 Hz: the span covers clock samples 30 to 100; the stretches hold 0 to 50 and 70 to 120.
        let pieces = cut(&runs(&[[3.0, 10.0]], 10.0), &stretches, 10.0, 15);
        assert_eq!(pieces, [(30, 3.0), (50, 7.0), (65, 8.5)]);
    }
}
