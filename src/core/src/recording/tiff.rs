//! TIFF and BigTIFF stacks as movies: one page a frame.
//!
//! Format: TIFF revision 6.0 (1992), with the 64-bit offsets of BigTIFF. Pages are decoded by the `tiff` crate: strips and tiles, stored, LZW, Deflate
//! or PackBits, with or without a predictor; grey values of 8, 16 or 32 bits or floating point. The chain of pages is walked here, so that a
//! page can be decoded by itself: the decoder is shown a file whose first page is the wanted one.
use super::Source;
use super::array::{CHANNEL_BYTES, columns, pixels};
use super::budget::Budget;
use super::given::Asking;
use super::opening::{Format, OpenOptions, Reader};
use super::seek::Seeking;
use super::units::Unit;
use super::{Layout, Recording, Stretch};
use crate::error::{Kind, Problem, Result};
use tiff::ColorType;
use tiff::decoder::{Decoder, DecodingResult, Limits};

/// Pages walked a step.
const WALK_PAGES: usize = 512;
/// Decoded bytes a step.
const SLICE_BYTES: usize = 4 << 20;

pub(super) const FORMAT: Format = Format {
    name: "TIFF",
    score: |head| match head {
        [b'I', b'I', 42 | 43, 0, ..] | [b'M', b'M', 0, 42 | 43, ..] => 90,
        _ => 0,
    },
    begin,
};

/// How offsets are written in this file.
#[derive(Debug, Clone, Copy)]
struct Layer {
    big_endian: bool,
    big: bool,
}

impl Layer {
    /// A whole number of `N` bytes.
    fn number<const N: usize>(self, bytes: [u8; N]) -> u64 {
        let value = |n: u64, b: &u8| n << 8 | u64::from(*b);
        if self.big_endian {
            bytes.iter().fold(0, value)
        } else {
            bytes.iter().rev().fold(0, value)
        }
    }

    /// The file's first bytes, as if its first page stood at `page`.
    fn beginning(self, page: u64) -> Vec<u8> {
        let order = if self.big_endian { b"MM" } else { b"II" };
        let mut out = order.to_vec();
        let mut put = |value: u64, bytes: usize| {
            let all = value.to_be_bytes();
            let part = all[8 - bytes..].iter();
            if self.big_endian {
                out.extend(part);
            } else {
                out.extend(part.rev());
            }
        };
        if self.big {
            put(43, 2);
            put(8, 2);
            put(0, 2);
            put(page, 8);
        } else {
            put(42, 2);
            put(page, 4);
        }
        out
    }

    /// Where the page after the one at `page` stands; 0 after the last.
    fn next(self, source: &mut dyn Source, page: u64) -> Result<u64> {
        let (head, entry) = if self.big { (8, 20) } else { (2, 12) };
        let mut count = [0; 8];
        source
            .read_at(page, &mut count[..head])
            .map_err(|_| outside(page))?;
        let count = match self.big {
            true => self.number(count),
            false => self.number([count[0], count[1]]),
        };
        let after = count
            .checked_mul(entry)
            .and_then(|bytes| bytes.checked_add(page + head as u64))
            .filter(|after| *after < source.len())
            .ok_or_else(|| outside(page))?;
        let mut next = [0; 8];
        let bytes = if self.big { 8 } else { 4 };
        source
            .read_at(after, &mut next[..bytes])
            .map_err(|_| outside(after))?;
        Ok(match self.big {
            true => self.number(next),
            false => self.number([next[0], next[1], next[2], next[3]]),
        })
    }
}

fn outside(at: u64) -> Problem {
    Problem::new(
        Kind::Damaged,
        "the TIFF stack is damaged",
        "copy it again from where it was written",
    )
    .at(format!("byte {at}"))
    .expected_found("a page", "none, or one that reaches beyond the end")
}

struct TiffReader {
    layer: Layer,
    height: u32,
    width: u32,
    /// Where every page stands, as far as walked.
    pages: Vec<u64>,
    walked: bool,
    done: usize,
    samples: Vec<Vec<f32>>,
    rate_hz: f64,
    unit: Unit,
}

fn begin(
    source: &mut dyn Source,
    options: &OpenOptions,
    budget: &mut Budget,
) -> Result<Box<dyn Reader>> {
    let mut head = [0; 16];
    let bytes = source.len().min(16) as usize;
    source.read_at(0, &mut head[..bytes])?;
    let layer = Layer {
        big_endian: head[0] == b'M',
        big: head[2] == 43 || head[3] == 43,
    };
    let first = if layer.big {
        let mut offset = [0; 8];
        offset.copy_from_slice(&head[8..16]);
        layer.number(offset)
    } else {
        layer.number([head[4], head[5], head[6], head[7]])
    };
    let mut decoder = decoder(source, layer, first, 0)?;
    let (width, height) = decoder.dimensions().map_err(|e| broken(0, &e))?;
    let whole_numbers = match decoder.colortype().map_err(|e| broken(0, &e))? {
        ColorType::Gray(8 | 16 | 32 | 64) => true,
        other => {
            return Err(Problem::new(
                Kind::Unsupported,
                "the pictures are not plain grey values",
                "save the stack with one grey value of 8, 16 or 32 bits a pixel",
            )
            .at("page 1")
            .expected_found("grey values", format!("{other:?}")));
        }
    };
    drop(decoder);
    let count = u64::from(width) * u64::from(height);
    if count < 2 {
        return Err(Problem::new(
            Kind::Unsupported,
            "the pictures have fewer than two pixels",
            "open a movie",
        )
        .at("page 1")
        .expected_found("at least 2 pixels", count));
    }
    // One frame, in its widest form, and the pixels' names: refuses claimed sizes before anything is read.
    budget.draw(count.saturating_mul(8 + CHANNEL_BYTES), "its pictures")?;
    let mut asking = Asking::new(&options.given);
    let rate_hz = asking.rate("frames");
    let unit = asking.unit(whole_numbers.then_some("counts"));
    asking.settle(&format!("a stack of {height} × {width} pixels"))?;
    let (Some(rate_hz), Some(unit)) = (rate_hz, unit) else {
        return Err(outside(first));
    };
    Ok(Box::new(TiffReader {
        layer,
        height,
        width,
        pages: vec![first],
        walked: false,
        done: 0,
        samples: Vec::new(),
        rate_hz,
        unit,
    }))
}

fn decoder<'a>(
    source: &'a mut dyn Source,
    layer: Layer,
    page: u64,
    index: usize,
) -> Result<Decoder<Seeking<'a>>> {
    let mut limits = Limits::default();
    let bytes = usize::try_from(source.len()).unwrap_or(usize::MAX);
    let most = bytes.saturating_mul(64).saturating_add(1 << 20);
    limits.decoding_buffer_size = limits.decoding_buffer_size.min(most);
    limits.intermediate_buffer_size = limits.intermediate_buffer_size.min(most);
    let over = Seeking::laid_over(source, layer.beginning(page));
    Ok(Decoder::new(over)
        .map_err(|e| broken(index, &e))?
        .with_limits(limits))
}

fn broken(page: usize, cause: &tiff::TiffError) -> Problem {
    let place = format!("page {}", page + 1);
    match cause {
        tiff::TiffError::UnsupportedError(what) => Problem::new(
            Kind::Unsupported,
            "the TIFF stack uses a part of the format that Teasel does not read",
            "save it stored, or with LZW, Deflate or PackBits, as grey values",
        )
        .at(place)
        .expected_found("a page that can be read", what),
        tiff::TiffError::LimitsExceeded => Problem::new(
            Kind::TooLarge,
            "a page asks for more memory than a file of its size can need",
            "check the file with the program that wrote it",
        )
        .at(place),
        other => Problem::new(
            Kind::Damaged,
            "the TIFF stack is damaged",
            "copy it again from where it was written",
        )
        .at(place)
        .expected_found("a page that can be decoded", other),
    }
}

impl TiffReader {
    fn pixels(&self) -> usize {
        self.height as usize * self.width as usize
    }

    fn walk(&mut self, source: &mut dyn Source, budget: &mut Budget) -> Result<()> {
        budget.draw(8 * WALK_PAGES as u64, "its pages")?;
        // A chain of pages longer than the file can hold runs in a circle.
        let most = source.len() / if self.layer.big { 36 } else { 18 } + 1;
        for _ in 0..WALK_PAGES {
            let Some(&last) = self.pages.last() else {
                break;
            };
            match self.layer.next(source, last)? {
                0 => {
                    self.walked = true;
                    let frames = self.pages.len() as u64;
                    if frames < 2 {
                        return Err(Problem::new(
                            Kind::Unsupported,
                            "this is one picture, not a movie",
                            "open a stack with one page a frame",
                        )
                        .at("page 1")
                        .expected_found("at least 2 pages", frames));
                    }
                    self.samples = columns(self.pixels() as u64, frames, budget)?;
                    break;
                }
                next if self.pages.len() as u64 >= most => return Err(outside(next)),
                next => self.pages.push(next),
            }
        }
        Ok(())
    }

    fn decode(&mut self, source: &mut dyn Source) -> Result<()> {
        let pixels = self.pixels();
        let frames = (SLICE_BYTES / (4 * pixels)).max(1);
        let frames = frames.min(self.pages.len() - self.done);
        let mut rows: Vec<f32> = Vec::with_capacity(frames * pixels);
        for page in self.done..self.done + frames {
            let mut decoder = decoder(source, self.layer, self.pages[page], page)?;
            let size = decoder.dimensions().map_err(|e| broken(page, &e))?;
            if size != (self.width, self.height) {
                return Err(Problem::new(
                    Kind::Unsupported,
                    "the pages differ in size",
                    "save the movie alone, one page a frame",
                )
                .at(format!("page {}", page + 1))
                .expected_found(
                    format!("{} × {} pixels", self.height, self.width),
                    format!("{} × {}", size.1, size.0),
                ));
            }
            let picture = decoder.read_image().map_err(|e| broken(page, &e))?;
            append(&mut rows, &picture);
            if rows.len() != (page + 1 - self.done) * pixels {
                return Err(Problem::new(
                    Kind::Unsupported,
                    "a page holds more than one value a pixel",
                    "save the stack with one grey value a pixel",
                )
                .at(format!("page {}", page + 1))
                .expected_found(pixels, rows.len() - (page - self.done) * pixels));
            }
        }
        let factor = self.unit.factor as f32;
        for (pixel, out) in self.samples.iter_mut().enumerate() {
            out.extend(rows.iter().skip(pixel).step_by(pixels).map(|x| factor * x));
        }
        self.done += frames;
        Ok(())
    }
}

fn append(rows: &mut Vec<f32>, picture: &DecodingResult) {
    match picture {
        DecodingResult::U8(v) => rows.extend(v.iter().map(|x| f32::from(*x))),
        DecodingResult::I8(v) => rows.extend(v.iter().map(|x| f32::from(*x))),
        DecodingResult::U16(v) => rows.extend(v.iter().map(|x| f32::from(*x))),
        DecodingResult::I16(v) => rows.extend(v.iter().map(|x| f32::from(*x))),
        DecodingResult::U32(v) => rows.extend(v.iter().map(|x| *x as f32)),
        DecodingResult::I32(v) => rows.extend(v.iter().map(|x| *x as f32)),
        DecodingResult::U64(v) => rows.extend(v.iter().map(|x| *x as f32)),
        DecodingResult::I64(v) => rows.extend(v.iter().map(|x| *x as f32)),
        DecodingResult::F16(v) => rows.extend(v.iter().map(|x| x.to_f32())),
        DecodingResult::F32(v) => rows.extend(v),
        DecodingResult::F64(v) => rows.extend(v.iter().map(|x| *x as f32)),
    }
}

impl Reader for TiffReader {
    fn step(&mut self, source: &mut dyn Source, budget: &mut Budget) -> Result<(u64, u64)> {
        if self.walked {
            self.decode(source)?;
        } else {
            self.walk(source, budget)?;
        }
        let frame = 4 * self.pixels() as u64;
        let all = self.pages.len() as u64 * frame;
        let done = self.done as u64 * frame;
        Ok((
            done,
            if self.walked {
                all
            } else {
                all.max(source.len())
            },
        ))
    }

    fn finish(self: Box<Self>) -> Result<Recording> {
        let (height, width) = (self.height, self.width);
        Ok(Recording {
            name: String::new(),
            format: if self.layer.big { "BigTIFF" } else { "TIFF" }.to_owned(),
            rate_hz: self.rate_hz,
            channels: pixels(height, width, &self.unit.name),
            others: Vec::new(),
            samples: self.samples,
            layout: Layout::Frames {
                height,
                width,
                pixels: (0..height * width).collect(),
            },
            stretches: vec![Stretch {
                first: 0,
                count: self.done,
                onset_s: 0.0,
            }],
            events: Vec::new(),
            about: crate::recording::About::default(),
            side_files: Vec::new(),
            warnings: Vec::new(),
        })
    }
}
