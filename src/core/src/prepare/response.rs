//! The magnitude response of the filters: H(f) = h₀ + 2 Σ hₖ cos(2πkf/f_s) for taps symmetric about h₀ (Oppenheim & Schafer, *Discrete-Time
//! Signal Processing*, linear-phase systems of type I).
use super::fir::{Design, Request};
use crate::sheet::{Response, ResponseEdge};
use std::f64::consts::PI;

/// Points between the lowest frequency shown and half the rate, by equal factors.
const POINTS: usize = 300;
/// Points across each transition.
const ACROSS: usize = 24;
/// Nothing is shown below.
const FLOOR_DB: f64 = -120.0;

/// The response of `taps` (odd in number, symmetric), drawn finest where `designs` change; `None` without a filter.
pub(super) fn response(taps: &[f64], designs: &[Design], rate_hz: f64) -> Option<Response> {
    if designs.is_empty() {
        return None;
    }
    let edges: Vec<ResponseEdge> = designs.iter().flat_map(edges).collect();
    let nyquist = rate_hz / 2.0;
    let lowest = edges.iter().map(|e| e.pass_hz / 8.0).fold(0.5, f64::min);
    let mut hz: Vec<f64> = (0..=POINTS)
        .map(|i| lowest * (nyquist / lowest).powf(i as f64 / POINTS as f64))
        .collect();
    for edge in &edges {
        let step = 2.0 * edge.transition_hz / ACROSS as f64;
        let from = edge.half_hz - edge.transition_hz;
        hz.extend((0..=ACROSS).map(|i| from + i as f64 * step));
    }
    hz.retain(|f| *f >= lowest && *f <= nyquist);
    hz.sort_by(f64::total_cmp);
    hz.dedup_by(|a, b| (*a - *b).abs() < 1e-9 * nyquist);
    let db = |f: &f64| (20.0 * gain(taps, f / rate_hz).abs().log10()).max(FLOOR_DB);
    Some(Response {
        db: hz.iter().map(db).collect(),
        hz,
        edges,
        reach_s: (taps.len() / 2) as f64 / rate_hz,
    })
}

/// H at `f` cycles a sample; cosines by their recurrence cos (k+1)x = 2 cos x cos kx − cos (k−1)x.
fn gain(taps: &[f64], f: f64) -> f64 {
    let middle = taps.len() / 2;
    let step = (2.0 * PI * f).cos();
    let (mut before, mut now) = (1.0, step);
    let mut sum = taps[middle];
    for tap in &taps[middle + 1..] {
        sum += 2.0 * tap * now;
        (before, now) = (now, 2.0 * step * now - before);
    }
    sum
}

fn edges(design: &Design) -> Vec<ResponseEdge> {
    let half = design.transition_hz / 2.0;
    let edge = |pass_hz: f64, half_hz: f64| ResponseEdge {
        pass_hz,
        half_hz,
        transition_hz: design.transition_hz,
    };
    match design.request {
        Request::HighPass(hz) => vec![edge(hz, hz - half)],
        Request::LowPass(hz) => vec![edge(hz, hz + half)],
        Request::Notch(hz) => vec![edge(hz - 2.0, hz - 1.0), edge(hz + 2.0, hz + 1.0)],
    }
}
