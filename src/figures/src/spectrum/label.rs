//! Names of the two curves, where they stand clear of both.
use super::Spectrum;
use crate::frame::Frame;
use crate::pen::{Drawn, LABEL, Pen, Point, Word};
use crate::text;
use plotters_backend::DrawingBackend;

impl Spectrum {
    /// Writes a curve's name where it stands clear of both bands and nearest to its own curve.
    pub(super) fn name<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        said: &str,
        own: &[f64],
        taken: &mut Vec<[f64; 4]>,
        word: Word,
    ) -> Drawn<DB> {
        let wide = text::bold_width(said, LABEL) + 14.0;
        let upper = max_of(
            &self.signal_high,
            &self.reference_high,
            &self.signal,
            &self.reference,
        );
        let lower = upper_of_negative(
            &self.signal_low,
            &self.reference_low,
            &self.signal,
            &self.reference,
        );
        let mut best: Option<(f64, Point)> = None;
        let steps = ((frame.right - frame.left - wide) / 6.0).max(1.0) as usize;
        for k in 0..=steps {
            let x0 = frame.left + 4.0 + 6.0 * k as f64;
            let x1 = x0 + wide;
            if x1 > frame.right {
                break;
            }
            let under: Vec<usize> = (0..self.hz.len())
                .filter(|i| (x0..=x1).contains(&frame.px(self.hz[*i])))
                .collect();
            let own_y = under
                .iter()
                .map(|i| frame.py_inside(own[*i]))
                .filter(|y| y.is_finite());
            let (sum, n) = own_y.fold((0.0, 0.0), |(s, n), y| (s + y, n + 1.0));
            if n == 0.0 {
                continue;
            }
            let top = under
                .iter()
                .map(|i| frame.py_inside(upper[*i]))
                .fold(f64::INFINITY, f64::min);
            let bottom = under
                .iter()
                .map(|i| frame.py_inside(lower[*i]))
                .fold(f64::NEG_INFINITY, f64::max);
            for y in [top - 9.0, bottom + 9.0] {
                let mine = [x0, y - 8.0, x1, y + 8.0];
                let inside = mine[1] > frame.top - 4.0 && mine[3] < frame.bottom;
                let apart = taken.iter().all(|o| {
                    mine[0] >= o[2] || o[0] >= mine[2] || mine[1] >= o[3] || o[1] >= mine[3]
                });
                let cost = (y - sum / n).abs() - 0.004 * x0;
                if inside && apart && best.is_none_or(|(c, _)| cost < c) {
                    best = Some((cost, (x0 + 4.0, y)));
                }
            }
        }
        if let Some((_, at)) = best {
            taken.push([at.0 - 4.0, at.1 - 8.0, at.0 + wide, at.1 + 8.0]);
            pen.word(said, at, word)?;
        }
        Ok(())
    }
}

fn max_of(a: &[f64], b: &[f64], c: &[f64], d: &[f64]) -> Vec<f64> {
    let at = |v: &[f64], i: usize| {
        v.get(i)
            .copied()
            .filter(|x| x.is_finite())
            .unwrap_or(f64::NEG_INFINITY)
    };
    (0..c.len())
        .map(|i| at(a, i).max(at(b, i)).max(at(c, i)).max(at(d, i)))
        .collect()
}

fn upper_of_negative(a: &[f64], b: &[f64], c: &[f64], d: &[f64]) -> Vec<f64> {
    let minus = |v: &[f64]| v.iter().map(|x| -x).collect::<Vec<_>>();
    minus(&max_of(&minus(a), &minus(b), &minus(c), &minus(d)))
}
