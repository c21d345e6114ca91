//! Trigger codes of BDF's status channel (common practice, no source).
use super::header::Signal;
use crate::error::Result;
use crate::recording::Event;
use crate::recording::budget::Budget;

/// What an event costs beside its label, twice where a growing list doubles.
const EVENT_BYTES: u64 = 2 * size_of::<Event>() as u64 + 24;

/// One signal of trigger codes, with the code before.
pub(super) struct Codes {
    offset: usize,
    samples: usize,
    rate_hz: f64,
    before: Option<u16>,
}

impl Codes {
    pub(super) fn new(signal: &Signal, record_s: f64) -> Codes {
        Codes {
            offset: signal.offset as usize,
            samples: signal.samples as usize,
            rate_hz: signal.samples as f64 / record_s,
            before: None,
        }
    }

    /// Adds an event wherever a bit of the low 16 rises in a record that starts at `onset_s`.
    pub(super) fn read(
        &mut self,
        record: &[u8],
        onset_s: f64,
        events: &mut Vec<Event>,
        budget: &mut Budget,
    ) -> Result<()> {
        let part = &record[self.offset..self.offset + 3 * self.samples];
        let (triples, _) = part.as_chunks::<3>();
        for (index, &[low, high, _]) in triples.iter().enumerate() {
            let code = u16::from_le_bytes([low, high]);
            let before = self.before.replace(code).unwrap_or(code);
            if code & !before != 0 {
                budget.draw(EVENT_BYTES, "its trigger codes")?;
                events.push(Event {
                    onset_s: onset_s + index as f64 / self.rate_hz,
                    duration_s: 0.0,
                    label: code.to_string(),
                });
            }
        }
        Ok(())
    }
}
