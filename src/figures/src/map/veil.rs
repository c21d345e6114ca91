//! What cannot be told from zero is subdued: stripes of the ground lie over it.
use super::Map;
use crate::inks::see_through;
use crate::pen::{Drawn, Pen, Point};
use plotters_backend::DrawingBackend;

/// From one stripe to the next in CSS pixels.
const STRIPE: f64 = 3.0;
/// How finely a stripe's ends are found.
const STEP: f64 = 1.5;

impl Map {
    /// Whether a channel's interval includes zero, channel by channel; all false where intervals are not known.
    pub(super) fn doubtful(&self) -> Vec<bool> {
        (0..self.values.len())
            .map(|i| {
                self.interval
                    .get(i)
                    .is_some_and(|[low, high]| *low <= 0.0 && *high >= 0.0)
            })
            .collect()
    }

    pub(super) fn veil<DB: DrawingBackend>(
        &self,
        pen: &Pen<DB>,
        centre: Point,
        r: f64,
    ) -> Drawn<DB> {
        let doubtful = self.doubtful();
        if !doubtful.contains(&true) {
            return Ok(());
        }
        let known: Vec<([f64; 2], bool)> = (0..self.places.len())
            .filter_map(|i| Some((self.places[i]?, *doubtful.get(i)?)))
            .collect();
        // Channels vote by the fourth power of their nearness.
        let hidden = |x: f64, y: f64| {
            let votes = known.iter().map(|([cx, cy], doubt)| {
                let away = ((x - cx).powi(2) + (y - cy).powi(2)).max(1e-9);
                if *doubt {
                    away.powi(-2)
                } else {
                    -away.powi(-2)
                }
            });
            votes.sum::<f64>() > 0.0
        };
        let color = see_through(pen.inks.plate, 0.78);
        // Short of the outline, which belongs to the head.
        let r = r - 1.5;
        let rows = (r / STRIPE) as i32;
        for row in -rows..=rows {
            let y = f64::from(row) * STRIPE;
            let half = (r * r - y * y).max(0.0).sqrt();
            let columns = (2.0 * half / STEP) as i32;
            let at = |c: i32| -half + f64::from(c) * STEP;
            let mut from = None;
            for c in 0..=columns {
                let inside = c < columns && hidden(at(c) / r * self.radius, -y / r * self.radius);
                match (inside, from) {
                    (true, None) => from = Some(at(c)),
                    (false, Some(start)) => {
                        let y = centre.1 + y;
                        pen.across(centre.0 + start, centre.0 + at(c), y, color, 1.5)?;
                        from = None;
                    }
                    _ => {}
                }
            }
        }
        Ok(())
    }
}
