//! The whole recording: how large its channels are over time, and when its events happened.
use crate::axis::{Axis, range};
use crate::frame::{Frame, LEFT, PlotBox, RIGHT};
use crate::pen::{At, Drawn, Pen, TICK, Word};
use crate::table::{Table, cell};
use crate::{Plot, nan, text};
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
use teasel_core::sheet::Sheet;

/// Lanes shown at most; the labels with the most events come first.
const LANES: usize = 6;
const LANE: f64 = 17.0;
const TOP: f64 = 26.0;
const ENVELOPE: f64 = 62.0;

/// See [`crate::Figure::Overview`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Overview {
    /// Root mean square over channels in each bin.
    #[serde(with = "nan")]
    pub envelope: Vec<f64>,
    /// Start and end of each bin on the file's clock; a bin that spans a gap is cut at it.
    pub bins: Vec<[f64; 2]>,
    /// Unit of the envelope.
    pub unit: String,
    /// Gaps on the file's clock.
    pub gaps: Vec<[f64; 2]>,
    /// End of the recording on its clock.
    pub end_s: f64,
    /// Events by label.
    pub lanes: Vec<Lane>,
    /// Labels that found no lane.
    pub more: usize,
}

/// The events of one label.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Lane {
    /// Label.
    pub label: String,
    /// Onsets.
    pub onsets_s: Vec<f64>,
}

impl Overview {
    pub(crate) fn of(sheet: &Sheet) -> Option<Self> {
        let card = &sheet.recording;
        let total: usize = card.stretches.iter().map(|s| s.count).sum();
        let rate = card.rate_hz;
        if card.envelope.is_empty() || total == 0 || rate <= 0.0 || !rate.is_finite() {
            return None;
        }
        let end = |s: &teasel_core::recording::Stretch| s.onset_s + s.count as f64 / rate;
        let clock = |sample: usize, start: bool| {
            let inside = |s: &&teasel_core::recording::Stretch| {
                let last = s.first + s.count;
                if start { sample < last } else { sample <= last }
            };
            let stretch = card.stretches.iter().find(inside);
            stretch.map_or(0.0, |s| {
                s.onset_s + sample.saturating_sub(s.first) as f64 / rate
            })
        };
        let n = card.envelope.len();
        let bins = (0..n)
            .map(|i| {
                [
                    clock(i * total / n, true),
                    clock((i + 1) * total / n, false),
                ]
            })
            .collect();
        let gaps = card
            .stretches
            .windows(2)
            .map(|s| [end(&s[0]), s[1].onset_s]);
        let mut lanes: Vec<Lane> = card
            .event_onsets_s
            .iter()
            .map(|(label, onsets)| Lane {
                label: label.clone(),
                onsets_s: onsets.iter().copied().filter(|t| t.is_finite()).collect(),
            })
            .collect();
        let named = sheet.recipe.contrast.around();
        let asked = |lane: &Lane| named.iter().any(|w| w.labels().any(|l| l == lane.label));
        lanes.sort_by_key(|lane| (!asked(lane), std::cmp::Reverse(lane.onsets_s.len())));
        let more = lanes.len().saturating_sub(LANES);
        lanes.truncate(LANES);
        Some(Overview {
            envelope: card.envelope.clone(),
            bins,
            unit: sheet
                .channels
                .first()
                .map_or(String::new(), |c| c.unit.clone()),
            gaps: gaps.filter(|g| g[1] - g[0] > 1e-6).collect(),
            end_s: card.stretches.last().map_or(0.0, end),
            lanes,
            more,
        })
    }

    fn frame(&self, width: f64) -> Frame {
        let top = range(&self.envelope).map_or(1.0, |(_, high)| high);
        Frame {
            left: LEFT,
            right: width - RIGHT,
            top: TOP,
            bottom: TOP + ENVELOPE,
            x: Axis::linear(0.0, self.end_s),
            y: Axis::linear(0.0, top * 1.04),
        }
    }

    fn clock_axis<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let most = ((frame.right - frame.left) / 62.0).max(2.0);
        let steps = [
            1.0, 2.0, 5.0, 10.0, 15.0, 30.0, 60.0, 120.0, 300.0, 600.0, 900.0, 1800.0, 3600.0,
            7200.0, 10800.0, 21600.0, 43200.0, 86400.0,
        ];
        let step = steps.into_iter().find(|s| self.end_s / s <= most);
        let step = step.unwrap_or(86400.0 * (self.end_s / 86400.0 / most).ceil().max(1.0));
        let word = Word::new(TICK, pen.inks.slate).at(At::Middle);
        let long = self.end_s >= 3600.0 && step >= 60.0;
        for i in 0..=(self.end_s / step + 1e-9) as usize {
            let x = frame.px(i as f64 * step);
            pen.down(x, TOP - 10.0, TOP - 5.0, pen.inks.line, 1.0)?;
            let said = text::clock(i as f64 * step, long);
            let half = text::width(&said, TICK) / 2.0;
            pen.word(&said, (x.min(pen.w - half), 8.0), word)?;
        }
        Ok(())
    }

    /// The envelope as one surface for each unbroken run.
    fn hill<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let mut run: Vec<(f64, f64)> = Vec::new();
        for (i, (bin, size)) in self.bins.iter().zip(&self.envelope).enumerate() {
            let whole = size.is_finite();
            if whole {
                let y = frame.py_inside(*size);
                if run.is_empty() {
                    run.push((frame.px(bin[0]), frame.bottom));
                    run.push((frame.px(bin[0]), y));
                }
                run.push((frame.px((bin[0] + bin[1]) / 2.0), y));
            }
            let next = self.bins.get(i + 1);
            if !whole || next.is_none_or(|n| n[0] > bin[1] + 1e-6) {
                if let Some(&(_, y)) = run.last() {
                    run.push((frame.px(bin[1]), y));
                    run.push((frame.px(bin[1]), frame.bottom));
                }
                pen.polygon(&run, pen.inks.area())?;
                run.clear();
            }
        }
        Ok(())
    }

    fn events<DB: DrawingBackend>(&self, pen: &Pen<DB>, frame: &Frame) -> Drawn<DB> {
        let word = Word::new(TICK, pen.inks.slate).at(At::Right);
        for (i, lane) in self.lanes.iter().enumerate() {
            let y = frame.bottom + 12.0 + LANE * i as f64;
            pen.name(&lane.label, (LEFT - 9.0, y), LEFT - 12.0, word)?;
            for onset in &lane.onsets_s {
                let x = frame.px(*onset);
                match i {
                    0 => pen.down(x, y - 6.0, y + 6.0, pen.inks.ink, 2.0)?,
                    1 => pen.ring((x, y), 3.0, pen.inks.ink, 1.4, pen.inks.plate)?,
                    2 => pen.down(x, y - 3.0, y + 3.0, pen.inks.line, 1.5)?,
                    3 => pen.cross((x, y), 2.5, pen.inks.line)?,
                    4 => pen.dot((x, y), 2.0, pen.inks.line)?,
                    _ => pen.ring((x, y), 2.0, pen.inks.line, 1.0, pen.inks.plate)?,
                }
            }
        }
        if self.more > 0 {
            let y = frame.bottom + 12.0 + LANE * self.lanes.len() as f64;
            let said = format!("and {}", text::count(self.more, "more label"));
            pen.word(&said, (LEFT, y), Word::new(TICK, pen.inks.slate))?;
        }
        Ok(())
    }
}

impl Plot for Overview {
    fn draw<DB: DrawingBackend>(&self, pen: &Pen<DB>) -> Drawn<DB> {
        let frame = self.frame(pen.w);
        let word = Word::new(TICK, pen.inks.slate).at(At::Right);
        pen.word("mean", (LEFT - 9.0, frame.bottom - 21.0), word)?;
        pen.word("size", (LEFT - 9.0, frame.bottom - 6.0), word)?;
        let ticks = frame.y.ticks(6);
        let clear = |t: &f64| *t > 0.0 && frame.py(*t) < frame.bottom - 34.0;
        if let Some(size) = ticks.into_iter().find(clear) {
            let y = frame.py(size);
            pen.across(frame.left, frame.right, y, pen.inks.rule, 1.0)?;
            let said = format!("{} {}", text::short(size), self.unit);
            pen.name(&said, (LEFT - 9.0, y), LEFT - 12.0, word)?;
        }
        self.hill(pen, &frame)?;
        let lanes_end = frame.bottom + 4.0 + LANE * self.lanes.len() as f64;
        for gap in &self.gaps {
            let (x0, x1) = (frame.px(gap[0]), frame.px(gap[1]));
            let x1 = x1.max(x0 + 4.0).min(frame.right);
            pen.hatch((x0, frame.top), (x1, lanes_end), pen.inks.line)?;
        }
        pen.across(frame.left, frame.right, frame.bottom, pen.inks.line, 1.0)?;
        self.clock_axis(pen, &frame)?;
        self.events(pen, &frame)
    }

    fn height(&self, _width: u32) -> u32 {
        let lanes = self.lanes.len() + usize::from(self.more > 0);
        (TOP + ENVELOPE + 6.0 + LANE * lanes as f64) as u32
    }

    fn plot_box(&self, width: f64, height: f64) -> Option<PlotBox> {
        let frame = self.frame(width);
        Some(PlotBox {
            bottom: height.max(frame.bottom),
            ..frame.plot_box()
        })
    }

    fn table(&self) -> Table {
        let size = format!("mean_size_{}", self.unit);
        let mut table = Table::new(&["from_s", "to_s", &size]);
        for (bin, value) in self.bins.iter().zip(&self.envelope) {
            table.row([cell(bin[0]), cell(bin[1]), cell(*value)]);
        }
        table
    }

    fn spoken(&self) -> String {
        let lanes: Vec<String> = self
            .lanes
            .iter()
            .map(|lane| format!("{} {}", lane.onsets_s.len(), lane.label))
            .collect();
        let minutes = text::clock(self.end_s, self.end_s >= 3600.0);
        format!(
            "Mean size of the channels over the whole recording of {minutes}, with its events: {}.",
            if lanes.is_empty() {
                "none".to_owned()
            } else {
                lanes.join(", ")
            }
        )
    }
}
