//! Types of numbers, and how they are decoded.

/// Type of an array's numbers.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(in crate::recording) enum Number {
    I8,
    U8,
    I16,
    U16,
    I32,
    U32,
    I64,
    U64,
    F32,
    F64,
}

impl Number {
    /// Bytes of one.
    pub(in crate::recording) fn bytes(self) -> usize {
        match self {
            Number::I8 | Number::U8 => 1,
            Number::I16 | Number::U16 => 2,
            Number::I32 | Number::U32 | Number::F32 => 4,
            Number::I64 | Number::U64 | Number::F64 => 8,
        }
    }

    /// Whether it has no fraction.
    pub(in crate::recording) fn is_whole(self) -> bool {
        !matches!(self, Number::F32 | Number::F64)
    }

    /// Decodes `count` numbers, `step` numbers apart, times `factor`.
    pub(in crate::recording) fn decode(
        self,
        big_endian: bool,
        bytes: &[u8],
        step: usize,
        count: usize,
        factor: f64,
        out: &mut Vec<f32>,
    ) {
        macro_rules! every {
            ($kind:ty) => {
                if big_endian {
                    every(bytes, step, count, out, |b| {
                        (factor * <$kind>::from_be_bytes(b) as f64) as f32
                    })
                } else {
                    every(bytes, step, count, out, |b| {
                        (factor * <$kind>::from_le_bytes(b) as f64) as f32
                    })
                }
            };
        }
        match self {
            Number::I8 => every!(i8),
            Number::U8 => every!(u8),
            Number::I16 => every!(i16),
            Number::U16 => every!(u16),
            Number::I32 => every!(i32),
            Number::U32 => every!(u32),
            Number::I64 => every!(i64),
            Number::U64 => every!(u64),
            Number::F32 => every!(f32),
            Number::F64 => every!(f64),
        }
    }
}

fn every<const N: usize>(
    bytes: &[u8],
    step: usize,
    count: usize,
    out: &mut Vec<f32>,
    value: impl Fn([u8; N]) -> f32,
) {
    let (numbers, _) = bytes.as_chunks::<N>();
    out.extend(numbers.iter().step_by(step).take(count).map(|b| value(*b)));
}
