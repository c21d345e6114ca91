//! The header of an EDF or BDF file: fixed ASCII fields, each checked before anything is believed.
use crate::error::{Kind, Problem, Result};
use crate::recording::Source;
use crate::recording::budget::Budget;
use crate::recording::names::counted;
use crate::recording::units::to_microvolts;
use std::ops::RangeInclusive;

/// Bytes of the fixed part, and of each signal's part.
pub(super) const PART: u64 = 256;
/// Label of the signal that holds trigger codes, in BDF; compared without regard to case.
const CODES_LABEL: &str = "Status";
/// Durations of a record that 8 digits write without an exponent.
const SHORTEST_TO_LONGEST_S: RangeInclusive<f64> = 1e-6..=99_999_999.0;
/// Widths of a signal's ten fields, in file order.
const WIDTHS: [usize; 10] = [16, 80, 8, 8, 8, 8, 8, 80, 8, 32];

/// How wide a sample is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Width {
    /// EDF: 16 bits.
    Two,
    /// BDF: 24 bits.
    Three,
}

impl Width {
    pub(super) fn bytes(self) -> u64 {
        match self {
            Width::Two => 2,
            Width::Three => 3,
        }
    }
    /// The name of the format without its variant.
    pub(super) fn name(self) -> &'static str {
        match self {
            Width::Two => "EDF",
            Width::Three => "BDF",
        }
    }
    /// Label of a signal that holds text.
    pub(super) fn text_label(self) -> &'static str {
        match self {
            Width::Two => "EDF Annotations",
            Width::Three => "BDF Annotations",
        }
    }
    /// The least and the greatest number that fits.
    pub(super) fn limits(self) -> [i32; 2] {
        match self {
            Width::Two => [i16::MIN.into(), i16::MAX.into()],
            Width::Three => [-(1 << 23), (1 << 23) - 1],
        }
    }
}

/// What the reserved field says.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Variant {
    Plain,
    Continuous,
    Discontinuous,
}

impl Variant {
    /// What follows the format's name.
    pub(super) fn suffix(self) -> &'static str {
        match self {
            Variant::Plain => "",
            Variant::Continuous => "+C",
            Variant::Discontinuous => "+D",
        }
    }
}

/// One signal of the header.
#[derive(Debug, Clone)]
pub(super) struct Signal {
    pub(super) label: String,
    /// As in the file.
    pub(super) unit: String,
    /// Holds annotations.
    pub(super) is_text: bool,
    /// Holds trigger codes.
    pub(super) is_codes: bool,
    /// Samples a record.
    pub(super) samples: u64,
    /// First byte in a record.
    pub(super) offset: u64,
    /// From digital to physical, or why that cannot be had.
    pub(super) scale: std::result::Result<Scale, String>,
}

/// `physical = digital · gain + offset`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Scale {
    pub(super) gain: f64,
    pub(super) offset: f64,
}

impl Scale {
    /// From the four limits; `factor` brings the unit to the one wanted.
    pub(super) fn from_limits(physical: [f64; 2], digital: [f64; 2], factor: f64) -> Self {
        let gain = (physical[1] - physical[0]) / (digital[1] - digital[0]);
        let offset = physical[1] - gain * digital[1];
        // Digital 0 of symmetric limits is 0, not the rounding error of their difference.
        let is_rounding = offset.abs() < 1e-9 * gain.abs();
        Scale {
            gain: gain * factor,
            offset: if is_rounding { 0.0 } else { offset * factor },
        }
    }
    pub(super) fn value(self, digital: i32) -> f32 {
        (f64::from(digital) * self.gain + self.offset) as f32
    }
}

/// Everything the header says.
#[derive(Debug, Clone)]
pub(super) struct Header {
    pub(super) width: Width,
    pub(super) variant: Variant,
    /// Date and time of the start, in seconds since the beginning of 1985; `None` where they are none.
    pub(super) start_s: Option<f64>,
    pub(super) bytes: u64,
    /// `None` where the header says −1: not known when it was written.
    pub(super) records: Option<u64>,
    pub(super) record_s: f64,
    /// Time of day of the start, `22:13:05`.
    pub(super) start: Option<String>,
    pub(super) record_bytes: u64,
    pub(super) signals: Vec<Signal>,
    pub(super) warnings: Vec<String>,
}

impl Header {
    /// Where a byte of a record belongs: `record 12, channel "Fz", byte 40960`.
    pub(super) fn place(&self, record: u64, byte_in_record: u64) -> String {
        let byte = self.bytes + record * self.record_bytes + byte_in_record;
        match self.signal_at(byte_in_record) {
            Some(signal) => format!(
                "record {}, channel \"{}\", byte {byte}",
                record + 1,
                signal.label
            ),
            None => format!("record {}, byte {byte}", record + 1),
        }
    }
    /// The signal that holds a byte of a record.
    pub(super) fn signal_at(&self, byte_in_record: u64) -> Option<&Signal> {
        self.signals.iter().find(|s| {
            (s.offset..s.offset + self.width.bytes() * s.samples).contains(&byte_in_record)
        })
    }
}

/// Reads and checks the header.
pub(super) fn read(source: &mut dyn Source, width: Width, budget: &mut Budget) -> Result<Header> {
    let mut fixed = [0; PART as usize];
    if source.len() < PART {
        return Err(damaged("the file ends within its header")
            .at(format!("file header, byte {}", source.len()))
            .expected_found("at least 256 bytes", format!("{} bytes", source.len())));
    }
    source.read_at(0, &mut fixed)?;
    let mut warnings = Vec::new();
    let place = |what: &str, byte: usize| format!("file header, {what}, byte {byte}");

    let count_place = place("number of signals", 252);
    let signals = whole(&fixed[252..256], &count_place)?;
    if signals < 1 {
        return Err(damaged("the header lists no signal")
            .at(count_place)
            .expected_found("at least 1 signal", signals));
    }
    let signals = signals as u64;
    let bytes = PART * (1 + signals);
    let length_place = place("length of the header", 184);
    let stated = whole(&fixed[184..192], &length_place)?;
    if stated != bytes as i64 {
        return Err(
            damaged("the header's length does not fit its number of signals")
                .at(length_place)
                .expected_found(
                    format!("{bytes} bytes for {}", counted(signals, "signal")),
                    format!("{stated} bytes"),
                ),
        );
    }
    if source.len() < bytes {
        return Err(damaged("the file ends within its header")
            .at(format!("file header, byte {}", source.len()))
            .expected_found(
                format!("{bytes} bytes for {}", counted(signals, "signal")),
                format!("{} bytes", source.len()),
            ));
    }
    let variant = variant(width, &fixed[192..236])?;
    let records_place = place("number of records", 236);
    let records = match whole(&fixed[236..244], &records_place)? {
        -1 => None,
        n if n >= 0 => Some(n as u64),
        n => {
            return Err(damaged("the number of records is negative")
                .at(records_place)
                .expected_found("0 or more, or -1 for not known", n));
        }
    };
    let record_s = real(
        &fixed[244..252],
        &place("duration of a record", 244),
        &mut warnings,
    )?;

    budget.draw(3 * bytes, "its header")?;
    let mut rest = vec![0; (bytes - PART) as usize];
    source.read_at(PART, &mut rest)?;
    let mut header = Header {
        width,
        variant,
        start_s: start_s(&fixed[168..184]),
        bytes,
        records,
        record_s,
        start: time_of_day(&fixed[176..184]),
        record_bytes: 0,
        signals: Vec::with_capacity(signals as usize),
        warnings,
    };
    for index in 0..signals as usize {
        let fields = fields(&rest, signals as usize, index);
        let signal = signal(&mut header, index, &fields)?;
        header.record_bytes = header
            .record_bytes
            .saturating_add(width.bytes() * signal.samples);
        header.signals.push(signal);
    }
    check_duration(&header)?;
    Ok(header)
}

/// `22.13.05` as `22:13:05`; `None` where it is no time, and at midnight, which stands for a time that was taken out.
fn time_of_day(field: &[u8]) -> Option<String> {
    let text = std::str::from_utf8(field).ok()?;
    let parts: Vec<u8> = text
        .split(['.', ':'])
        .map(|part| part.trim().parse().ok())
        .collect::<Option<_>>()?;
    match parts[..] {
        [0, 0, 0] => None,
        [h, m, s] if h < 24 && m < 60 && s < 60 => Some(format!("{h:02}:{m:02}:{s:02}")),
        _ => None,
    }
}

/// A field of a signal and its first byte in the file.
type Field<'a> = (&'a [u8], u64);

fn fields(rest: &[u8], signals: usize, index: usize) -> [Field<'_>; 10] {
    let mut start = 0;
    WIDTHS.map(|width| {
        let from = start + index * width;
        start += signals * width;
        (&rest[from..from + width], PART + from as u64)
    })
}

fn signal(header: &mut Header, index: usize, fields: &[Field<'_>; 10]) -> Result<Signal> {
    let label = text(fields[0].0);
    let place = |what: &str, field: Field<'_>| {
        format!(
            "file header, channel {} \"{label}\", {what}, byte {}",
            index + 1,
            field.1
        )
    };
    let samples_place = place("samples a record", fields[8]);
    let samples = whole(fields[8].0, &samples_place)?;
    if samples < 0 {
        return Err(damaged("a channel's number of samples is negative")
            .at(samples_place)
            .expected_found("1 sample a record or more", samples));
    }
    let is_text = header.variant != Variant::Plain && label == header.width.text_label();
    let is_codes = header.width == Width::Three && label.eq_ignore_ascii_case(CODES_LABEL);
    let unit = text(fields[2].0);
    let scale = if is_text {
        Err("it holds annotations".to_owned())
    } else if is_codes {
        Err("it holds trigger codes".to_owned())
    } else {
        let mut limit = |what, field: usize| {
            real(
                fields[field].0,
                &place(what, fields[field]),
                &mut header.warnings,
            )
        };
        let physical = [limit("physical minimum", 3)?, limit("physical maximum", 4)?];
        let digital = [
            whole(fields[5].0, &place("digital minimum", fields[5]))?,
            whole(fields[6].0, &place("digital maximum", fields[6]))?,
        ];
        scale(header.width, physical, digital, &unit)
    };
    Ok(Signal {
        is_text,
        is_codes,
        unit,
        samples: samples as u64,
        offset: header.record_bytes,
        scale,
        label,
    })
}

fn scale(
    width: Width,
    physical: [f64; 2],
    digital: [i64; 2],
    unit: &str,
) -> std::result::Result<Scale, String> {
    if digital[0] >= digital[1] {
        return Err(format!(
            "its digital maximum should be above its digital minimum {} and is {}",
            digital[0], digital[1]
        ));
    }
    if physical[0] == physical[1] {
        return Err(format!(
            "its physical limits should differ and are both {}",
            physical[0]
        ));
    }
    let factor = to_microvolts(unit).unwrap_or(1.0);
    let scale = Scale::from_limits(physical, digital.map(|d| d as f64), factor);
    if !width.limits().iter().all(|d| scale.value(*d).is_finite()) {
        return Err(format!(
            "its limits {} and {} are too far apart for numbers of 32 bits",
            physical[0], physical[1]
        ));
    }
    Ok(scale)
}

fn check_duration(header: &Header) -> Result<()> {
    let ordinary = header.signals.iter().any(|s| !s.is_text && !s.is_codes);
    if !ordinary {
        return Err(Problem::new(
            Kind::Unsupported,
            "the file holds annotations and no signal",
            "open the recording that the annotations belong to",
        )
        .at("file header, labels, byte 256")
        .expected_found("at least 1 signal", "annotations only"));
    }
    if !SHORTEST_TO_LONGEST_S.contains(&header.record_s) {
        return Err(damaged("a record cannot last that long")
            .at("file header, duration of a record, byte 244")
            .expected_found(
                "more than 0 s, from 0.000001 s to 99999999 s",
                format!("{} s", header.record_s),
            ));
    }
    if header.record_bytes == 0 {
        return Err(damaged("no channel has a sample")
            .at("file header, samples a record")
            .expected_found("1 sample a record or more", 0));
    }
    Ok(())
}

fn variant(width: Width, reserved: &[u8]) -> Result<Variant> {
    let plus = reserved
        .strip_prefix(width.name().as_bytes())
        .and_then(|rest| rest.strip_prefix(b"+"));
    match plus {
        Some([b'C', ..]) => Ok(Variant::Continuous),
        Some([b'D', ..]) => Ok(Variant::Discontinuous),
        Some(_) => {
            let name = width.name();
            Err(damaged(&format!("the kind of {name}+ is not known"))
                .at("file header, reserved field, byte 192")
                .expected_found(format!("{name}+C or {name}+D"), quoted(&reserved[..5])))
        }
        None => Ok(Variant::Plain),
    }
}

/// `dd.mm.yyhh.mm.ss` as seconds since the beginning of 1985; years from 85 on are of the last century (the standard's rule).
fn start_s(field: &[u8]) -> Option<f64> {
    let number = |at: usize| -> Option<i64> {
        std::str::from_utf8(field.get(at..at + 2)?)
            .ok()?
            .parse()
            .ok()
    };
    let [day, month, year, hour, minute, second] = [0, 3, 6, 8, 11, 14].map(number);
    let (day, month, year) = (day?, month?, year?);
    if !(1..=31).contains(&day) || !(1..=12).contains(&month) {
        return None;
    }
    // Whole days by a calendar that begins its year in March, so that the leap day comes last.
    let year = year + if year >= 85 { 1900 } else { 2000 };
    let (year, month) = if month > 2 {
        (year, month - 3)
    } else {
        (year - 1, month + 9)
    };
    let days = |year: i64| 365 * year + year / 4 - year / 100 + year / 400;
    let day_of_year = (153 * month + 2) / 5 + day - 1;
    let begin = days(1984) + (153 * 10 + 2) / 5;
    let seconds = ((days(year) + day_of_year - begin) * 24 + hour?) * 3600 + minute? * 60 + second?;
    Some(seconds as f64)
}

/// A field as text: UTF-8 where it is, otherwise Latin-1; control characters become spaces; trimmed.
fn text(field: &[u8]) -> String {
    let text = match std::str::from_utf8(field) {
        Ok(text) => text.to_owned(),
        Err(_) => field.iter().map(|&b| b as char).collect(),
    };
    let clean: String = text
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    clean.trim().to_owned()
}

/// Spaces stand around numbers; some writers end them with NUL.
fn number(field: &[u8]) -> &str {
    std::str::from_utf8(field)
        .unwrap_or("")
        .trim_matches([' ', '\0'])
}

fn whole(field: &[u8], place: &str) -> Result<i64> {
    number(field).parse().map_err(|_| {
        damaged("a number in the header cannot be read")
            .at(place)
            .expected_found("a whole number", quoted(field))
    })
}

fn real(field: &[u8], place: &str, warnings: &mut Vec<String>) -> Result<f64> {
    let written = number(field);
    let (value, comma) = match written.parse::<f64>() {
        Ok(value) => (value, false),
        Err(_) => (
            written.replacen(',', ".", 1).parse().unwrap_or(f64::NAN),
            true,
        ),
    };
    if !value.is_finite() {
        return Err(damaged("a number in the header cannot be read")
            .at(place)
            .expected_found("a number", quoted(field)));
    }
    if comma {
        warnings.push(format!(
            "A number in the header has a comma for its decimal point and was read as {value} ({place})."
        ));
    }
    Ok(value)
}

fn quoted(field: &[u8]) -> String {
    format!("\"{}\"", field.trim_ascii().escape_ascii())
}

pub(super) fn damaged(what: &str) -> Problem {
    Problem::new(
        Kind::Damaged,
        what,
        "copy the file again from where it was recorded, or write it anew with the program that made it",
    )
}
