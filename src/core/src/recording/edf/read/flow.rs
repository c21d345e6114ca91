//! A file whose samples are handed through, and read again in pieces.
use super::{EdfReader, SLICE_BYTES, decode};
use crate::error::Result;
use crate::recording::edf::header::{Scale, Width};
use crate::recording::large::{Flowing, Pieces};
use crate::recording::{Source, Stretch};

impl Flowing for EdfReader {
    fn expected(&self) -> usize {
        usize::try_from(self.records * self.samples).unwrap_or(usize::MAX)
    }
    fn channels(&self) -> usize {
        self.columns.len()
    }
    fn stretches(&self) -> &[Stretch] {
        &self.stretches
    }
    fn drain(&mut self, take: &mut dyn FnMut(usize, &[f32])) {
        for (channel, column) in self.columns.iter_mut().enumerate() {
            take(channel, &column.samples);
            column.samples.clear();
        }
    }
    fn pieces(&self) -> Box<dyn Pieces> {
        Box::new(EdfPieces {
            width: self.header.width,
            first_byte: self.header.bytes,
            record_bytes: self.header.record_bytes as usize,
            samples: self.samples as usize,
            columns: (self.columns.iter())
                .map(|c| (c.offset, c.bytes, c.scale))
                .collect(),
        })
    }
}

/// Where every sample lies.
struct EdfPieces {
    width: Width,
    first_byte: u64,
    record_bytes: usize,
    /// Samples a record of each channel.
    samples: usize,
    /// Offset in the record, bytes, scale.
    columns: Vec<(usize, usize, Scale)>,
}

impl Pieces for EdfPieces {
    fn read(
        &self,
        source: &mut dyn Source,
        wanted: &[bool],
        first: usize,
        count: usize,
        out: &mut [Vec<f32>],
    ) -> Result<()> {
        let end = first + count;
        let at_once = (SLICE_BYTES as usize / self.record_bytes).max(1);
        let mut record = first / self.samples;
        let last = end.div_ceil(self.samples);
        let mut bytes = Vec::new();
        while record < last {
            let records = at_once.min(last - record);
            bytes.resize(records * self.record_bytes, 0);
            let offset = self.first_byte + record as u64 * self.record_bytes as u64;
            source.read_at(offset, &mut bytes)?;
            for (channel, (offset, length, scale)) in self.columns.iter().enumerate() {
                if !wanted.get(channel).is_some_and(|w| *w) {
                    continue;
                }
                let Some(samples) = out.get_mut(channel) else {
                    continue;
                };
                let each = length / self.samples;
                for (i, data) in bytes.chunks_exact(self.record_bytes).enumerate() {
                    let begins = (record + i) * self.samples;
                    let from = first.saturating_sub(begins).min(self.samples);
                    let to = end.saturating_sub(begins).min(self.samples);
                    if from < to {
                        let part = &data[offset + from * each..offset + to * each];
                        decode(self.width, part, *scale, samples);
                    }
                }
            }
            record += records;
        }
        Ok(())
    }
}
