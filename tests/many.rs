//! Many channels: the basis between pixels and kept dimensions against the dense path, and against what is known of the planted data.
//!
//! The dense path makes the covariance of all channels and takes its leading eigenvectors; with 1,000 channels both can be computed.
use nalgebra::DMatrix;
use teasel_core::contrast::basis::{Basis, Channels, Finding, MOST_FRAMES};
use teasel_core::contrast::fit::{Ends, Labels, Method, fit};
use teasel_core::contrast::linalg::{abs_cosine, pack, packed_len, unpack};
use teasel_core::contrast::read::Reader;
use teasel_core::contrast::space::{Covariances, pooled};
use teasel_core::contrast::windows::Window;
use teasel_core::evidence::heldout::Ground;
use teasel_core::recipe::{Measure, Shrink};
use teasel_tests::{Lcg, close};

const CHANNELS: usize = 1000;
const SOURCES: usize = 12;
const KEPT: usize = 12;

struct Held<'a>(&'a [Vec<f32>]);

impl Channels for Held<'_> {
    fn count(&self) -> usize {
        self.0.len()
    }
    fn samples(&self, channel: usize) -> &[f32] {
        &self.0[channel]
    }
}

/// Twelve sources over 1,000 channels with a little noise; source 3 is stronger in signal windows, source 7 weaker.
fn planted(trials: usize, count: usize) -> (Vec<Vec<f32>>, Vec<Window>) {
    let mut random = Lcg(5);
    let mixing: Vec<Vec<f64>> = (0..SOURCES)
        .map(|_| (0..CHANNELS).map(|_| random.normal12()).collect())
        .collect();
    let samples = 2 * trials * count;
    let mut sources = vec![vec![0.0; samples]; SOURCES];
    for (s, course) in sources.iter_mut().enumerate() {
        let size = 8.0 / (1.0 + s as f64);
        for (t, x) in course.iter_mut().enumerate() {
            let signal = (t / count).is_multiple_of(2);
            let gain = match (s, signal) {
                (3, true) | (7, false) => 1.6,
                _ => 1.0,
            };
            *x = size * gain * random.normal12();
        }
    }
    let channels = (0..CHANNELS)
        .map(|c| {
            (0..samples)
                .map(|t| {
                    let sum: f64 = (0..SOURCES).map(|s| mixing[s][c] * sources[s][t]).sum();
                    (100.0 + sum + 0.05 * random.normal12()) as f32
                })
                .collect()
        })
        .collect();
    let windows = (0..2 * trials)
        .map(|k| Window {
            first: k * count,
            count,
            signal: k % 2 == 0,
            trial: k / 2,
            onset_s: k as f64,
        })
        .collect();
    (channels, windows)
}

fn found(samples: &[Vec<f32>], windows: &[Window], wanted: usize) -> (Basis, Vec<Vec<f32>>) {
    let mut finding = Finding::new(samples.len(), samples[0].len(), windows, wanted);
    let mut last = 0;
    while !finding.finished() {
        finding.step(&Held(samples));
        let (done, of) = finding.progress();
        assert!(done >= last && done <= of);
        last = done;
    }
    finding.finish()
}

fn covariances(samples: &[Vec<f32>], windows: &[Window]) -> Covariances {
    let mut all = Covariances::default();
    let reader = Reader {
        signal: samples,
        reference: samples,
        lag: 0,
    };
    for window in windows {
        all.push(&reader, window, false);
    }
    all
}

/// Eigenvalues, both ends and the filters of their first directions.
fn fitted(
    all: &Covariances,
    windows: &[Window],
    measure: Measure,
) -> (Vec<f64>, Ends, Vec<Vec<f64>>) {
    let mut ground = Ground::new(all, KEPT, vec![true; windows.len()]);
    while ground.space.push_next(all) {}
    while ground.push_log(KEPT, 0.1) {}
    let method = Method {
        measure,
        shrink: Shrink::Number(0.1),
        components: 1,
        folds: 5,
    };
    let signal: Vec<bool> = windows.iter().map(|w| w.signal).collect();
    let labels = Labels {
        signal: &signal,
        train: &ground.train,
    };
    let ends = fit(ground.view(&all.weights, KEPT), labels, &method).unwrap();
    let filters = [&ends.stronger[0], &ends.weaker[0]]
        .map(|d| ground.space.filter(&d.u))
        .to_vec();
    (ground.space.eigenvalues[..KEPT].to_vec(), ends, filters)
}

/// Both ways of finding the basis give the dense result.
fn equals_dense(trials: usize, count: usize, exact: bool) {
    let (samples, windows) = planted(trials, count);
    let (basis, reduced) = found(&samples, &windows, 60);
    assert_eq!(basis.exact, exact);
    let dense = covariances(&samples, &windows);
    let small = covariances(&reduced, &windows);
    for measure in [Measure::Typical, Measure::Total] {
        let (values, ends, filters) = fitted(&dense, &windows, measure);
        let (near, near_ends, inner) = fitted(&small, &windows, measure);
        for (a, b) in values.iter().zip(&near) {
            close("eigenvalue", *b, *a, 1e-6 * a);
        }
        let pairs = [
            (&ends.stronger[0], &near_ends.stronger[0]),
            (&ends.weaker[0], &near_ends.weaker[0]),
        ];
        for (a, b) in pairs {
            close("statistic", b.statistic, a.statistic, 1e-6 * a.statistic);
        }
        for (a, b) in filters.iter().zip(&inner) {
            let lifted = basis.lift(b);
            assert!(1.0 - abs_cosine(a, &lifted) < 1e-6);
            // And down again: the filter lies in the basis.
            assert!(1.0 - abs_cosine(&basis.lower(&lifted), b) < 1e-9);
        }
    }
    // Rows are orthonormal, and the whole variance is known without the matrix.
    let overlap = &basis.rows * basis.rows.transpose();
    let identity = DMatrix::<f64>::identity(basis.rows.nrows(), basis.rows.nrows());
    assert!((overlap - identity).amax() < 1e-10);
    let p = dense.pooled(|_| true);
    let total: f64 = (0..CHANNELS).map(|i| p[packed_len(i) + i]).sum();
    close("total", basis.total, total, 1e-9 * total);
    for (k, single) in basis.singles.iter().enumerate().step_by(7) {
        let own = dense.packed[k][packed_len(11) + 11];
        close("single", f64::from(single[11]), own, 1e-6 * own);
    }
    // No direction outside holds more than the bound says, and the bound says something.
    let full = unpack(&p, CHANNELS);
    let inside = basis.rows.transpose() * &basis.rows;
    let away = DMatrix::<f64>::identity(CHANNELS, CHANNELS) - inside;
    let rest = &away * full * &away;
    let mut v = DMatrix::from_fn(CHANNELS, 1, |i, _| ((i * 37 % 101) as f64 - 50.0) / 50.0);
    let mut most = 0.0;
    for _ in 0..60 {
        v = &rest * &v;
        most = v.norm();
        v /= most;
    }
    assert!(
        basis.outside >= most * (1.0 - 1e-6),
        "{} against {most}",
        basis.outside
    );
    assert!(
        basis.outside < 100.0 * most,
        "{} against {most}",
        basis.outside
    );
    assert!(basis.outside < 0.01 * p[0], "{}", basis.outside);
}

#[test]
fn a_basis_from_the_frames_gives_the_dense_result() {
    assert_eq!(2 * 12 * 40, 960);
    equals_dense(12, 40, true);
}

#[test]
fn a_basis_from_the_range_finder_gives_the_dense_result() {
    const { assert!(2 * 14 * 50 > MOST_FRAMES) };
    equals_dense(14, 50, false);
}

/// Fewer samples than dimensions wanted: the basis has their rank and leaves nothing out.
#[test]
fn few_frames() {
    let (samples, windows) = planted(3, 8);
    let (basis, reduced) = found(&samples, &windows, 200);
    assert_eq!(basis.rows.nrows(), 6 * 7);
    assert_eq!(reduced.len(), 42);
    let small = covariances(&reduced, &windows);
    let p = pooled(&small.packed, &small.weights, packed_len(42), |_| true);
    let inside: f64 = unpack(&p, 42).trace();
    close("left out", inside, basis.total, 1e-6 * basis.total);
    assert_eq!(pack(&unpack(&p, 42)).len(), p.len());
}
