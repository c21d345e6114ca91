//! Time courses and matrices as CSV and NPY.
use super::cells::{number, safe_text};
use super::written;
use crate::analysis::Series;
use crate::error::Result;
use npyz::WriterBuilder;

/// Time of every sample on the file's clock, in seconds: every stretch starts at its own onset.
fn times_s(series: &Series) -> Vec<f64> {
    series
        .stretches
        .iter()
        .flat_map(|s| (0..s.count).map(|k| s.onset_s + k as f64 / series.rate_hz))
        .collect()
}

/// `time_s` and one column a component, one row a sample, in full double precision.
pub fn series_csv(series: &Series) -> Result<String> {
    let header = ["time_s".to_string()]
        .into_iter()
        .chain(series.names.iter().map(|n| safe_text(&column(n))));
    let mut writer = csv::WriterBuilder::new().from_writer(Vec::new());
    writer.write_record(header).map_err(written)?;
    for (k, t) in times_s(series).into_iter().enumerate() {
        writer.write_field(number(t)).map_err(written)?;
        for values in &series.samples {
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
    matrix_npy(&series.samples)
}

/// A matrix of equally long rows, one after the other, as a NumPy array file.
pub(super) fn matrix_npy<T: npyz::AutoSerialize + Copy>(rows: &[Vec<T>]) -> Result<Vec<u8>> {
    let columns = rows.first().map_or(0, Vec::len);
    let mut bytes = Vec::with_capacity(128 + rows.len() * columns * size_of::<T>());
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
