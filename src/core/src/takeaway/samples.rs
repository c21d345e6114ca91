//! A whole recording as CSV and NPY. EDF+ and BDF+ are written by [`crate::recording::edf`]. None of them names a person.
use super::cells::{number, safe_text};
use super::written;
use crate::error::Result;
use crate::recording::Recording;

/// `time_s` and a column a channel, `Fz (µV)`, a row a sample. Each number is the shortest that reads back to the same 32 bits; what is no
/// number is an empty cell. Times are on the file's clock, so that a gap is a jump; events are not written.
pub fn recording_csv(recording: &Recording) -> Result<String> {
    let mut writer = csv::WriterBuilder::new().from_writer(Vec::new());
    let names = recording.channels.iter().map(|c| match c.unit.as_str() {
        "" => safe_text(&c.name),
        unit => safe_text(&format!("{} ({unit})", c.name)),
    });
    let header = ["time_s".to_owned()].into_iter().chain(names);
    writer.write_record(header).map_err(written)?;
    for stretch in &recording.stretches {
        for k in 0..stretch.count {
            let time_s = stretch.onset_s + k as f64 / recording.rate_hz;
            writer.write_field(number(time_s)).map_err(written)?;
            for samples in &recording.samples {
                let value = samples.get(stretch.first + k).copied();
                let value = value.filter(|x| x.is_finite());
                let cell = value.map(|x| x.to_string()).unwrap_or_default();
                writer.write_field(cell).map_err(written)?;
            }
            writer.write_record(None::<&[u8]>).map_err(written)?;
        }
    }
    String::from_utf8(writer.into_inner().map_err(written)?).map_err(written)
}

/// `channels × samples`, f32, row after row, as a NumPy array file. Rate, unit, names, gaps and events are not in it.
pub fn recording_npy(recording: &Recording) -> Result<Vec<u8>> {
    super::series::matrix_npy(&recording.samples)
}
