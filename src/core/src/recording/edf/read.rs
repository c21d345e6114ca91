//! From an EDF file's header to a recording: which signals, how many records, decoding slice after slice.
mod flow;

use super::annotations;
use super::codes::Codes;
use super::header::{self, Header, Scale, Signal, Variant, Width, damaged};
use super::records;
use crate::error::Result;
use crate::recording::budget::Budget;
use crate::recording::large::Flowing;
use crate::recording::names::{counted, name_apart, opened_before};
use crate::recording::opening::{OpenOptions, Reader};
use crate::recording::units::Unit;
use crate::recording::{Channel, Event, OtherChannel, Recording, Source, Stretch};
use std::collections::BTreeMap;

/// Bytes read at once, in whole records and at least one.
const SLICE_BYTES: u64 = 8 << 20;

/// One analysed signal.
struct Column {
    offset: usize,
    bytes: usize,
    scale: Scale,
    samples: Vec<f32>,
}

struct EdfReader {
    header: Header,
    options: OpenOptions,
    /// Records to read, and read.
    records: u64,
    done: u64,
    slice: Vec<u8>,
    rate_hz: f64,
    /// Samples a record of every analysed signal.
    samples: u64,
    columns: Vec<Column>,
    codes: Vec<Codes>,
    channels: Vec<Channel>,
    others: Vec<OtherChannel>,
    events: Vec<Event>,
    stretches: Vec<Stretch>,
    notes: Notes,
    warnings: Vec<String>,
    /// The samples are handed on instead of kept.
    flows: bool,
}

/// What is said once however often it happens: how many, and where first.
#[derive(Default)]
struct Notes {
    broken: (u64, String),
    untimed: (u64, String),
    off_time: (u64, String),
}

fn note(slot: &mut (u64, String), place: impl FnOnce() -> String) {
    if slot.0 == 0 {
        slot.1 = place();
    }
    slot.0 += 1;
}

pub(super) fn begin(
    width: Width,
    source: &mut dyn Source,
    options: &OpenOptions,
    budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    let mut header = header::read(source, width, budget)?;
    let mut warnings = std::mem::take(&mut header.warnings);
    let samples = commonest(&header)?;
    let records = records::count(&header, source.len(), options, &mut warnings)?;
    if header.variant != Variant::Plain && !header.signals.iter().any(|s| s.is_text) {
        warnings.push(without_text(&header)?);
    }
    let analysed = |s: &&Signal| s.scale.is_ok() && s.samples == samples;
    let many = header.signals.iter().filter(analysed).count() as u64;
    let whole = (records.saturating_mul(samples)).saturating_mul(many * size_of::<f32>() as u64);
    let flows = budget.flows(whole);
    let slice_bytes = if flows {
        SLICE_BYTES.min(budget.share(8))
    } else {
        SLICE_BYTES
    };
    let slice_records = (slice_bytes / header.record_bytes).clamp(1, records);
    // Samples that flow are handed on after every slice.
    let kept = if flows { slice_records } else { records };
    let rate = |samples: u64| samples as f64 / header.record_s;
    let rate_hz = rate(samples);
    let (mut columns, mut channels, mut others) = (Vec::new(), Vec::new(), Vec::new());
    for (index, signal) in header.signals.iter().enumerate() {
        match (&signal.scale, signal.samples == samples) {
            (Ok(scale), true) => {
                let count = kept.saturating_mul(samples);
                columns.push(Column {
                    offset: signal.offset as usize,
                    bytes: (width.bytes() * signal.samples) as usize,
                    scale: *scale,
                    samples: budget.vec(count, "its samples")?,
                });
                channels.push(channel(signal, index));
            }
            _ if signal.is_text => {}
            (scale, _) => {
                let reason = match scale {
                    Err(reason) => reason.clone(),
                    Ok(_) if signal.samples == 0 => "it has no samples".to_owned(),
                    Ok(_) => format!(
                        "sampled at {} Hz, most channels at {rate_hz} Hz",
                        rate(signal.samples)
                    ),
                };
                if scale.is_err() && !signal.is_codes {
                    warnings.push(format!(
                        "Channel {} \"{}\" cannot be used: {reason}.",
                        index + 1,
                        signal.label
                    ));
                }
                others.push(OtherChannel {
                    name: signal.label.clone(),
                    unit: signal.unit.clone(),
                    rate_hz: rate(signal.samples),
                    reason,
                });
            }
        }
    }
    let codes = header.signals.iter().filter(|s| s.is_codes);
    let codes = codes.map(|s| Codes::new(s, header.record_s)).collect();
    name_apart(&mut channels, &mut warnings);
    let mut slice = budget.vec(slice_records * header.record_bytes, "a slice of it")?;
    slice.resize((slice_records * header.record_bytes) as usize, 0);
    let start = Stretch {
        first: 0,
        count: 0,
        onset_s: 0.0,
    };
    let stretches = match header.variant {
        Variant::Plain => vec![start],
        _ => Vec::new(),
    };
    Ok(Box::new(EdfReader {
        options: options.clone(),
        records,
        done: 0,
        slice,
        rate_hz,
        samples,
        columns,
        codes,
        channels,
        others,
        events: Vec::new(),
        stretches,
        notes: Notes::default(),
        warnings,
        header,
        flows,
    }))
}

/// Samples a record that most usable signals have; of two equally frequent the larger.
fn commonest(header: &Header) -> Result<u64> {
    let mut counts = BTreeMap::<u64, usize>::new();
    for signal in &header.signals {
        if signal.scale.is_ok() && signal.samples > 0 {
            *counts.entry(signal.samples).or_default() += 1;
        }
    }
    counts
        .into_iter()
        .max_by_key(|&(samples, count)| (count, samples))
        .map(|(samples, _)| samples)
        .ok_or_else(|| {
            let first = header.signals.iter().find(|s| !s.is_text);
            let (label, reason) = first.map_or(("", String::new()), |s| {
                let reason = s.scale.as_ref().err().cloned();
                (&s.label, reason.unwrap_or("it has no samples".to_owned()))
            });
            damaged("no channel can be used")
                .at(format!(
                    "file header, channel \"{label}\", limits and samples"
                ))
                .expected_found(
                    "digital and physical limits that differ, and samples",
                    reason,
                )
        })
}

/// An EDF+ file without an annotation signal has no clock: that matters only where there may be gaps.
fn without_text(header: &Header) -> Result<String> {
    let name = header.width.name();
    if header.variant == Variant::Discontinuous {
        return Err(damaged("the records' onsets are missing")
            .at("file header, labels, byte 256")
            .expected_found("a signal \"EDF Annotations\" in EDF+D", "none"));
    }
    Ok(format!(
        "The file calls itself {name}+C but has no annotation signal: it was read as plain {name}."
    ))
}

fn channel(signal: &Signal, index: usize) -> Channel {
    Channel {
        name: match signal.label.as_str() {
            "" => format!("channel {}", index + 1),
            label => label.to_owned(),
        },
        unit: Unit::of(&signal.unit).name,
        position: None,
    }
}

fn decode(width: Width, bytes: &[u8], scale: Scale, out: &mut Vec<f32>) {
    match width {
        Width::Two => {
            let (pairs, _) = bytes.as_chunks::<2>();
            out.extend(
                pairs
                    .iter()
                    .map(|&pair| scale.value(i16::from_le_bytes(pair).into())),
            );
        }
        Width::Three => {
            let (triples, _) = bytes.as_chunks::<3>();
            // The three bytes on top of the four keep their sign on the way down.
            out.extend(
                triples
                    .iter()
                    .map(|&[a, b, c]| scale.value(i32::from_le_bytes([0, a, b, c]) >> 8)),
            );
        }
    }
}

impl Reader for EdfReader {
    fn step(&mut self, source: &mut dyn Source, budget: &mut Budget) -> Result<(u64, u64)> {
        let mut slice = std::mem::take(&mut self.slice);
        let read = self.read_slice(&mut slice, source, budget);
        self.slice = slice;
        read?;
        let end = |records: u64| self.header.bytes + records * self.header.record_bytes;
        Ok((end(self.done), end(self.records)))
    }

    fn flowing(&mut self) -> Option<&mut dyn Flowing> {
        if self.flows { Some(self) } else { None }
    }

    fn start_s(&self) -> Option<f64> {
        self.header.start_s
    }

    fn finish(mut self: Box<Self>) -> Result<Recording> {
        self.warn_of_notes();
        if self.flows {
            self.columns.clear();
        }
        Ok(Recording {
            name: String::new(),
            format: format!(
                "{}{}",
                self.header.width.name(),
                self.header.variant.suffix()
            ),
            rate_hz: self.rate_hz,
            channels: self.channels,
            others: self.others,
            samples: self.columns.into_iter().map(|c| c.samples).collect(),
            layout: crate::recording::Layout::Head,
            stretches: self.stretches,
            events: self.events,
            about: crate::recording::About {
                start: self.header.start.clone(),
                ..crate::recording::About::default()
            },
            side_files: Vec::new(),
            warnings: self.warnings,
        })
    }
}

impl EdfReader {
    fn read_slice(
        &mut self,
        slice: &mut [u8],
        source: &mut dyn Source,
        budget: &mut Budget,
    ) -> Result<()> {
        let record_bytes = self.header.record_bytes as usize;
        let left = usize::try_from(self.records - self.done).unwrap_or(usize::MAX);
        let records = (slice.len() / record_bytes).min(left);
        let bytes = &mut slice[..records * record_bytes];
        source.read_at(
            self.header.bytes + self.done * self.header.record_bytes,
            bytes,
        )?;
        let mut good = 0;
        for record in bytes.chunks_exact(record_bytes) {
            let index = self.done + good as u64;
            if let Err(problem) = self.keep_time(record, index, budget) {
                if !(problem.salvage.is_some() && self.options.salvage) {
                    return Err(problem);
                }
                let warning = opened_before(&problem, index, "whole record");
                self.warnings.push(warning);
                self.records = index;
                break;
            }
            good += 1;
        }
        for column in &mut self.columns {
            let place = column.offset..column.offset + column.bytes;
            for record in bytes[..good * record_bytes].chunks_exact(record_bytes) {
                decode(
                    self.header.width,
                    &record[place.clone()],
                    column.scale,
                    &mut column.samples,
                );
            }
        }
        self.done += good as u64;
        Ok(())
    }

    /// Reads a record's annotations and puts the record on the clock.
    fn keep_time(&mut self, record: &[u8], index: u64, budget: &mut Budget) -> Result<()> {
        let mut onset_s = None;
        let mut events = Vec::new();
        let mut first_text = true;
        for signal in self.header.signals.iter().filter(|s| s.is_text) {
            let from = signal.offset as usize;
            let lists = annotations::read(
                &record[from..from + (self.header.width.bytes() * signal.samples) as usize],
                budget,
            )?;
            if first_text {
                onset_s = lists.record_onset_s;
                first_text = false;
            }
            if let Some(at) = lists.first_broken {
                let place = || self.header.place(index, signal.offset + at as u64);
                note(&mut self.notes.broken, place);
                self.notes.broken.0 += lists.broken - 1;
            }
            events.extend(lists.events);
        }
        match self.header.variant {
            Variant::Plain => self.extend(),
            Variant::Continuous => self.continue_at(onset_s, index),
            Variant::Discontinuous => self.join_at(onset_s, index, budget)?,
        }
        self.events.extend(events);
        let onset_s = self.stretches.last().map_or(0.0, |stretch| {
            let before = stretch.count as f64 - self.samples as f64;
            stretch.onset_s + before / self.rate_hz
        });
        for codes in &mut self.codes {
            codes.read(record, onset_s, &mut self.events, budget)?;
        }
        Ok(())
    }

    fn extend(&mut self) {
        if let Some(stretch) = self.stretches.last_mut() {
            stretch.count += self.samples as usize;
        }
    }

    fn start(&mut self, onset_s: f64) {
        let first = self.stretches.last().map_or(0, |s| s.first + s.count);
        self.stretches.push(Stretch {
            first,
            count: self.samples as usize,
            onset_s,
        });
    }

    /// Seconds by which a record starts after the end of the stretch before it, on that stretch's own clock; 0 within half a sample.
    fn gap_s(&self, onset_s: f64) -> f64 {
        let ends_s = self
            .stretches
            .last()
            .map_or(onset_s, |s| s.onset_s + s.count as f64 / self.rate_hz);
        let half_sample_s = 0.5 / self.rate_hz * (1.0 + 1e-6);
        match onset_s - ends_s {
            gap if gap.abs() <= half_sample_s => 0.0,
            gap => gap,
        }
    }

    /// Continuous: one stretch, whatever the later records say of their time.
    fn continue_at(&mut self, onset_s: Option<f64>, index: u64) {
        let has_text = self.header.signals.iter().any(|s| s.is_text);
        if onset_s.is_none() && has_text {
            let place = || self.header.place(index, 0);
            note(&mut self.notes.untimed, place);
        }
        if index == 0 {
            return self.start(onset_s.unwrap_or(0.0));
        }
        if onset_s.is_some_and(|onset_s| self.gap_s(onset_s) != 0.0) {
            note(&mut self.notes.off_time, || self.header.place(index, 0));
        }
        self.extend();
    }

    /// Discontinuous: a new stretch after a gap.
    fn join_at(&mut self, onset_s: Option<f64>, index: u64, budget: &mut Budget) -> Result<()> {
        let text = self.header.signals.iter().find(|s| s.is_text);
        let damage = |expected: String, found: String| {
            let problem = damaged("a record's onset cannot be right")
                .at(self.header.place(index, text.map_or(0, |s| s.offset)))
                .expected_found(expected, found);
            records::salvageable(problem, &self.header, index)
        };
        let Some(onset_s) = onset_s else {
            let expected = "the record's onset as its first annotation".to_owned();
            return Err(damage(expected, "none that can be read".to_owned()));
        };
        let gap_s = self.gap_s(onset_s);
        if gap_s < 0.0 {
            let expected = format!(
                "{} s or later, where the record before it ends",
                onset_s - gap_s
            );
            return Err(damage(expected, format!("{onset_s} s")));
        }
        if self.stretches.is_empty() || gap_s > 0.0 {
            budget.draw(2 * size_of::<Stretch>() as u64, "its gaps")?;
            self.start(onset_s);
        } else {
            self.extend();
        }
        Ok(())
    }

    fn warn_of_notes(&mut self) {
        let Notes {
            broken,
            untimed,
            off_time,
        } = &self.notes;
        if broken.0 > 0 {
            self.warnings.push(format!(
                "{} could not be read and {} left out; the first stands in {}.",
                counted(broken.0, "annotation"),
                if broken.0 == 1 { "was" } else { "were" },
                broken.1
            ));
        }
        if untimed.0 > 0 {
            self.warnings.push(format!(
                "{} without an onset of their own were taken to follow the one before; the first is {}.",
                counted(untimed.0, "record"),
                untimed.1
            ));
        }
        let name = self.header.width.name();
        if off_time.0 > 0 {
            self.warnings.push(format!(
                "The file calls itself continuous ({name}+C), but {} say they start elsewhere than where the one before ends; they were taken as continuous. If its pauses are real, later events lie beside their samples: such a file should be {name}+D. The first is {}.",
                counted(off_time.0, "record"),
                off_time.1
            ));
        }
        if self.stretches.len() > 1 {
            self.warnings.push(format!(
                "The recording has {}; no window and no filter crosses one.",
                counted(self.stretches.len() as u64 - 1, "gap")
            ));
        }
    }
}
