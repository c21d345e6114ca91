//! A held-out ratio as a point with its interval.
use crate::frame::Frame;
use crate::pen::{Drawn, Pen};
use crate::weights::End;
use crate::{nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::recipe::Measure;
use teasel_core::sheet::{TotalRatio, TypicalRatio};

/// A held-out ratio.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Estimate {
    /// The ratio, where it is not withheld.
    pub ratio: Option<f64>,
    /// 95 % interval.
    pub interval: Option<[f64; 2]>,
    /// Each fold's ratio.
    #[serde(with = "nan")]
    pub folds: Vec<f64>,
}

impl Estimate {
    pub(crate) fn of(measure: Measure, typical: &TypicalRatio, total: &TotalRatio) -> Self {
        let good = |v: f64| v.is_finite() && v > 0.0;
        match measure {
            Measure::Typical => Estimate {
                ratio: typical.held_out.filter(|v| good(*v)),
                interval: typical.interval.filter(|i| i.iter().all(|v| good(*v))),
                folds: Vec::new(),
            },
            Measure::Total => Estimate {
                ratio: total.held_out.filter(|v| good(*v)),
                interval: None,
                folds: total.folds.clone(),
            },
        }
    }

    pub(crate) fn crosses_one(&self) -> bool {
        self.interval
            .is_some_and(|[low, high]| low <= 1.0 && high >= 1.0)
    }

    pub(crate) fn ends(&self) -> impl Iterator<Item = f64> + '_ {
        self.ratio
            .into_iter()
            .chain(self.interval.into_iter().flatten())
    }

    pub(crate) fn spoken(&self) -> String {
        let interval = self.interval.map_or(String::new(), |[a, b]| {
            format!(", interval {}–{}", text::number(a, 2), text::number(b, 2))
        });
        match self.ratio {
            Some(ratio) => format!("held-out ratio {}{interval}", text::factor(ratio)),
            None => "held-out ratio withheld".to_owned(),
        }
    }

    pub(crate) fn draw<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        y: f64,
        side: Option<End>,
        hollow: bool,
    ) -> Drawn<DB> {
        let inks = pen.inks;
        let ink = side.map_or(inks.ink, |end| end.ink(&inks));
        let Some(ratio) = self.ratio else {
            return Ok(());
        };
        let x = |v: f64| frame.px_inside(v);
        if let Some([low, high]) = self.interval {
            let line = if hollow { inks.line } else { ink };
            pen.across(x(low), x(high), y, line, 2.0)?;
        }
        if hollow {
            pen.ring((x(ratio), y), 4.5, inks.ink, 1.8, inks.plate)
        } else {
            pen.dot((x(ratio), y), 5.0, ink)
        }
    }

    pub(crate) fn ticks<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        frame: &Frame,
        y: f64,
    ) -> Drawn<DB> {
        for fold in self.folds.iter().filter(|f| f.is_finite() && **f > 0.0) {
            let x = frame.px_inside(*fold);
            pen.down(x, y, y + 6.0, pen.inks.slate, 1.0)?;
        }
        Ok(())
    }
}

/// ¼ to 4, and further by equal factors at both ends where a ratio or an interval asks for it.
pub(crate) fn shared(values: impl Iterator<Item = f64>) -> [f64; 2] {
    let far = values
        .map(|v| v.ln().abs())
        .filter(|v| v.is_finite())
        .fold(0.0, f64::max);
    let doublings = (far / std::f64::consts::LN_2 - 1e-9).ceil().clamp(2.0, 8.0);
    [(-doublings).exp2(), doublings.exp2()]
}
