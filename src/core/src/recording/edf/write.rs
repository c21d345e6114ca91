//! Writing a recording as EDF+ with 16 bits or BDF+ with 24, its events as annotations.
use super::header::{Scale, Width};
use crate::error::{Kind, Problem, Result};
use crate::recording::units::to_microvolts;
use crate::recording::{Event, Recording};

/// Steps that a channel's samples may be multiples of; such a channel is written without loss.
const STEPS: [&str; 6] = ["1", "0.1", "0.01", "0.001", "0.0001", "0.00001"];
/// A record lasts at most this long.
const LONGEST_RECORD_S: f64 = 10.0;

/// The identity fields of the header. By default they name nobody, as the standard writes it: `X X X X`.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Identity {
    /// Patient field, at most 80 ASCII characters.
    pub patient: String,
    /// Recording field, at most 80 ASCII characters.
    pub recording: String,
}

impl Default for Identity {
    fn default() -> Self {
        Identity {
            patient: "X X X X".to_owned(),
            recording: "Startdate X X X X".to_owned(),
        }
    }
}

/// The bytes of an EDF+C file, or EDF+D where the recording has gaps; dated 1 January 1985, midnight.
///
/// A channel whose samples all are multiples of 1, 0.1, … 0.00001 and span no more than 65,536 of them is written without loss;
/// any other is rounded to a 65,535th of its range. Records last a second where the rate is whole and the stretches are whole
/// seconds, otherwise the nearest time that fits. Names keep 16 ASCII characters. `others` are not written.
///
/// # Errors
/// `Unsupported` for a recording that EDF cannot hold: no sample, values that are not numbers or need more than 8 characters,
/// a rate that no record length expresses.
pub fn write(recording: &Recording, identity: &Identity) -> Result<Vec<u8>> {
    write_wide(Width::Two, recording, identity)
}

/// The bytes of a BDF+C file, or BDF+D where the recording has gaps: [`write`] with 24 bits a sample.
///
/// A channel whose samples all are multiples of 1 (of at most 8,388,607 of them) or of 0.1, … 0.00001 (of at most 999,999) is written
/// without loss; any other is rounded to a 16,777,215th of its range.
///
/// # Errors
/// As [`write`].
pub fn write_24_bit(recording: &Recording, identity: &Identity) -> Result<Vec<u8>> {
    write_wide(Width::Three, recording, identity)
}

fn write_wide(width: Width, recording: &Recording, identity: &Identity) -> Result<Vec<u8>> {
    check(width, recording)?;
    let record = Record::plan(recording)?;
    let columns: Vec<Limits> = recording
        .channels
        .iter()
        .zip(&recording.samples)
        .map(|(channel, samples)| Limits::of(width, &channel.name, samples))
        .collect::<Result<_>>()?;
    let lists = lists(recording, &record);
    let text_bytes = lists.iter().map(Vec::len).max().unwrap_or(0).max(16);
    let text_bytes = text_bytes.next_multiple_of(width.bytes() as usize);

    let mut out = Vec::new();
    header(
        &mut out, width, recording, identity, &record, &columns, text_bytes,
    )?;
    for (index, list) in lists.iter().enumerate() {
        let part = index * record.samples..(index + 1) * record.samples;
        for (column, samples) in columns.iter().zip(&recording.samples) {
            let bytes = width.bytes() as usize;
            for &x in &samples[part.clone()] {
                out.extend(&column.digital(x).to_le_bytes()[..bytes]);
            }
        }
        out.extend(list);
        out.resize(out.len() + text_bytes - list.len(), 0);
    }
    Ok(out)
}

fn cannot(what: impl Into<String>) -> Problem {
    Problem::new(
        Kind::Unsupported,
        what,
        "export the numbers in another form",
    )
}

fn check(width: Width, recording: &Recording) -> Result<()> {
    let name = width.name();
    if recording.sample_count() == 0 || recording.stretches.is_empty() {
        return Err(cannot(format!(
            "a recording without samples cannot be written as {name}"
        )));
    }
    let bad = recording
        .samples
        .iter()
        .position(|samples| !samples.iter().all(|x| x.is_finite()));
    match bad {
        Some(index) => Err(cannot(format!(
            "channel \"{}\" holds values that are not numbers, which {name} cannot hold",
            recording.channels[index].name
        ))),
        None => Ok(()),
    }
}

/// How long every record is.
struct Record {
    samples: usize,
    duration: String,
    duration_s: f64,
}

impl Record {
    /// The length nearest to a second that divides every stretch and that 8 characters express.
    fn plan(recording: &Recording) -> Result<Record> {
        let common = recording.stretches.iter().fold(0, |g, s| gcd(g, s.count));
        let longest = (recording.rate_hz * LONGEST_RECORD_S) as usize;
        (1..=common.min(longest))
            .filter(|samples| common.is_multiple_of(*samples))
            .filter_map(|samples| {
                let duration_s = samples as f64 / recording.rate_hz;
                let duration = shortest(duration_s)?;
                let exact = samples as f64 / duration.parse::<f64>().ok()? == recording.rate_hz;
                exact.then_some(Record {
                    samples,
                    duration,
                    duration_s,
                })
            })
            .min_by(|a, b| {
                let away = |r: &Record| r.duration_s.ln().abs();
                away(a).total_cmp(&away(b))
            })
            .ok_or_else(|| {
                cannot(format!(
                    "no record length in 8 characters gives {} Hz",
                    recording.rate_hz
                ))
            })
    }
}

fn gcd(a: usize, b: usize) -> usize {
    if b == 0 { a } else { gcd(b, a % b) }
}

/// A number in at most 8 characters, `None` where that loses digits.
fn shortest(x: f64) -> Option<String> {
    let text = x.to_string();
    (text.len() <= 8).then_some(text)
}

/// The limits of one channel, as written.
struct Limits {
    physical: [String; 2],
    digital: [i32; 2],
    scale: Scale,
}

impl Limits {
    fn of(width: Width, name: &str, samples: &[f32]) -> Result<Limits> {
        let (low, high) = samples
            .iter()
            .fold((f32::MAX, f32::MIN), |(low, high), &x| {
                (low.min(x), high.max(x))
            });
        if let Some(limits) = STEPS
            .iter()
            .find_map(|step| Limits::of_step(width, step, low, high, samples))
        {
            return Ok(limits);
        }
        let high = if high > low { high } else { low + 1.0 };
        let low = outward(f64::from(low), f64::floor);
        let high = outward(f64::from(high), f64::ceil);
        match (low, high) {
            (Some(low), Some(high)) if low != high => Ok(Limits::new([low, high], width.limits())),
            _ => Err(cannot(format!(
                "the values of channel \"{name}\" do not fit into the 8 characters that {} gives its limits",
                width.name()
            ))),
        }
    }

    /// The widest digital range whose limits at one step take 8 characters, where every sample is a multiple of that step.
    fn of_step(width: Width, step: &str, low: f32, high: f32, samples: &[f32]) -> Option<Limits> {
        let per_unit = 1.0 / step.parse::<f64>().ok()?;
        let decimals = step.len().saturating_sub(2);
        let limit = |digital: i32| format!("{:.decimals$}", f64::from(digital) / per_unit);
        let fits = |digital: &[i32; 2]| digital.iter().all(|d| limit(*d).len() <= 8);
        let digital = [width.limits(), [-999_999, 999_999]]
            .into_iter()
            .find(fits)?;
        let limits = Limits::new(digital.map(limit), digital);
        let exact = |x: f32| limits.scale.value(limits.digital(x)) == x;
        (exact(low) && exact(high) && samples.iter().all(|&x| exact(x))).then_some(limits)
    }

    fn new(physical: [String; 2], digital: [i32; 2]) -> Limits {
        let numbers = [0, 1].map(|i| physical[i].parse().unwrap_or(f64::NAN));
        Limits {
            scale: Scale::from_limits(numbers, digital.map(f64::from), 1.0),
            physical,
            digital,
        }
    }

    fn digital(&self, x: f32) -> i32 {
        let digital = ((f64::from(x) - self.scale.offset) / self.scale.gain).round();
        (digital as i32).clamp(self.digital[0], self.digital[1])
    }
}

/// The nearest number outside `x` that 8 characters hold; `round` is floor or ceil.
fn outward(x: f64, round: fn(f64) -> f64) -> Option<String> {
    let plain = (0..=6_usize).rev().find_map(|decimals| {
        let shift = 10_f64.powi(decimals as i32);
        let text = format!("{:.decimals$}", round(x * shift) / shift);
        (text.len() <= 8).then_some(text)
    });
    if x == 0.0 || x.abs() >= 0.01 {
        return plain;
    }
    let exponent = x.abs().log10().floor() as i32;
    (0..=3_usize).rev().find_map(|decimals| {
        let shift = 10_f64.powi(decimals as i32 - exponent);
        let text = format!(
            "{:.decimals$}e{exponent}",
            round(x * shift) / 10_f64.powi(decimals as i32)
        );
        (text.len() <= 8).then_some(text)
    })
}

/// The annotation lists of every record: first its onset, then events in their order, as evenly as they fit.
fn lists(recording: &Recording, record: &Record) -> Vec<Vec<u8>> {
    let mut lists: Vec<Vec<u8>> = recording
        .stretches
        .iter()
        .flat_map(|stretch| {
            let onset = |k: usize| stretch.onset_s + k as f64 * record.duration_s;
            (0..stretch.count / record.samples)
                .map(move |k| format!("{:+}\x14\x14\0", onset(k)).into_bytes())
        })
        .collect();
    let texts: Vec<Vec<u8>> = recording.events.iter().map(list).collect();
    let longest = texts.iter().map(Vec::len).max().unwrap_or(0);
    let room = longest + texts.iter().map(Vec::len).sum::<usize>() / lists.len();
    let (mut index, mut used) = (0, 0);
    for text in texts {
        if used + text.len() > room && index + 1 < lists.len() {
            index += 1;
            used = 0;
        }
        used += text.len();
        lists[index].extend(text);
    }
    lists
}

fn list(event: &Event) -> Vec<u8> {
    let duration = match event.duration_s {
        d if d > 0.0 => format!("\x15{d}"),
        _ => String::new(),
    };
    let label: String = event
        .label
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    let label = match label.trim() {
        "" => "event",
        label => label,
    };
    format!("{:+}{duration}\x14{label}\x14\0", event.onset_s).into_bytes()
}

fn header(
    out: &mut Vec<u8>,
    width: Width,
    recording: &Recording,
    identity: &Identity,
    record: &Record,
    columns: &[Limits],
    text_bytes: usize,
) -> Result<()> {
    let signals = columns.len() + 1;
    if signals > 9999 {
        return Err(cannot(format!(
            "{signals} signals are more than {} can list (9999)",
            width.name()
        )));
    }
    let kind = match recording.stretches.len() {
        1 => "+C",
        _ => "+D",
    };
    let kind = format!("{}{kind}", width.name());
    let records = recording.sample_count() / record.samples;
    match width {
        Width::Two => field(out, "0", 8),
        Width::Three => out.extend(b"\xffBIOSEMI"),
    }
    field(out, &identity.patient, 80);
    field(out, &identity.recording, 80);
    field(out, "01.01.85", 8);
    field(out, "00.00.00", 8);
    field(out, &(256 * (1 + signals)).to_string(), 8);
    field(out, &kind, 44);
    field(out, &records.to_string(), 8);
    field(out, &record.duration, 8);
    field(out, &signals.to_string(), 4);

    let mut each = |width: usize, value: &dyn Fn(usize) -> String, of_text: &str| {
        for index in 0..columns.len() {
            field(out, &value(index), width);
        }
        field(out, of_text, width);
    };
    let channels = &recording.channels;
    let samples = record.samples.to_string();
    each(16, &|i| channels[i].name.clone(), width.text_label());
    each(80, &|_| String::new(), "");
    each(8, &|i| unit(&channels[i].unit), "");
    each(8, &|i| columns[i].physical[0].clone(), "-1");
    each(8, &|i| columns[i].physical[1].clone(), "1");
    let [least, most] = width.limits().map(|d| d.to_string());
    each(8, &|i| columns[i].digital[0].to_string(), &least);
    each(8, &|i| columns[i].digital[1].to_string(), &most);
    each(80, &|_| String::new(), "");
    each(
        8,
        &|_| samples.clone(),
        &(text_bytes / width.bytes() as usize).to_string(),
    );
    each(32, &|_| String::new(), "");
    Ok(())
}

fn unit(unit: &str) -> String {
    match to_microvolts(unit) {
        Some(1.0) => "uV".to_owned(),
        _ => unit.to_owned(),
    }
}

/// A field of ASCII, cut or filled with spaces to its width.
fn field(out: &mut Vec<u8>, text: &str, width: usize) {
    let ascii = text.chars().map(|c| match c {
        ' '..='~' => c as u8,
        _ => b'?',
    });
    let start = out.len();
    out.extend(ascii.take(width));
    out.resize(start + width, b' ');
}
