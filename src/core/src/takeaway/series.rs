//! Time courses and matrices as CSV and NPY.
use super::cells::{number, safe_text};
use super::written;
use crate::error::Result;
use crate::recording::Stretch;
use npyz::WriterBuilder;

/// Named time courses of one sampling rate.
#[derive(Debug, Clone, PartialEq)]
pub struct Series {
    /// `stronger 1`, `stronger 2`, …, `weaker 1`, ….
    pub names: Vec<String>,
    /// `components × samples`, in units of the component (its variance is 1 in the reference windows it was fitted to).
    pub values: Vec<Vec<f64>>,
    /// Sampling rate.
    pub rate_hz: f64,
    /// Unbroken runs of the recording as recorded, at `recorded_hz`.
    pub stretches: Vec<Stretch>,
    /// Sampling rate of the recording.
    pub recorded_hz: f64,
}

impl Series {
    /// Samples a component.
    pub fn sample_count(&self) -> usize {
        self.values.first().map_or(0, Vec::len)
    }

    /// Time of every sample on the file's clock, in seconds. Every stretch keeps its onset; after resampling a stretch has
    /// ⌈count × new rate / old rate⌉ samples.
    pub fn times_s(&self) -> Vec<f64> {
        let ratio = self.rate_hz / self.recorded_hz;
        let mut times = Vec::with_capacity(self.sample_count());
        for (at, stretch) in self.stretches.iter().enumerate() {
            let last = at + 1 == self.stretches.len();
            let left = self.sample_count() - times.len().min(self.sample_count());
            let count = if last {
                left
            } else {
                // The slack keeps a whole number whole.
                ((stretch.count as f64 * ratio - 1e-9).ceil() as usize).min(left)
            };
            times.extend((0..count).map(|k| stretch.onset_s + k as f64 / self.rate_hz));
        }
        times.extend((times.len()..self.sample_count()).map(|k| k as f64 / self.rate_hz));
        times
    }
}

/// `time_s` and one column a component, one row a sample, in full double precision.
pub fn series_csv(series: &Series) -> Result<String> {
    let header = ["time_s".to_string()]
        .into_iter()
        .chain(series.names.iter().map(|n| safe_text(&column(n))));
    let mut writer = csv::WriterBuilder::new().from_writer(Vec::new());
    writer.write_record(header).map_err(written)?;
    for (k, t) in series.times_s().into_iter().enumerate() {
        writer.write_field(number(t)).map_err(written)?;
        for values in &series.values {
            let value = values.get(k).copied().unwrap_or(f64::NAN);
            writer.write_field(number(value)).map_err(written)?;
        }
        writer.write_record(None::<&[u8]>).map_err(written)?;
    }
    String::from_utf8(writer.into_inner().map_err(written)?).map_err(written)
}

/// A component's name as a column: `stronger 1` → `stronger_1`.
pub(super) fn column(name: &str) -> String {
    name.replace(' ', "_")
}

/// `components × samples`, f64, row after row, as a NumPy array file.
pub fn series_npy(series: &Series) -> Result<Vec<u8>> {
    matrix_npy(&series.values)
}

/// A matrix of equally long rows as a NumPy array file of f64.
pub(super) fn matrix_npy(rows: &[Vec<f64>]) -> Result<Vec<u8>> {
    let columns = rows.first().map_or(0, Vec::len);
    let mut bytes = Vec::with_capacity(128 + rows.len() * columns * 8);
    let mut writer = npyz::WriteOptions::new()
        .default_dtype()
        .shape(&[rows.len() as u64, columns as u64])
        .writer(&mut bytes)
        .begin_nd()
        .map_err(written)?;
    for row in rows {
        writer.extend(row.iter().copied()).map_err(written)?;
    }
    writer.finish().map_err(written)?;
    Ok(bytes)
}
