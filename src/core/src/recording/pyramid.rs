//! Smallest and largest values of equal bins at several bin sizes, so that hours can be drawn without touching every sample.
//!
//! # Bins
//! Bin b at size s holds the samples b·s … b·s + s − 1 of one channel, counted over the whole recording whatever its gaps; the last
//! bin may hold fewer. Sizes are base, 4·base, 16·base, …, until one bin holds everything. Values that are not numbers are passed
//! over; a bin without any number is `[NaN, NaN]`.
//!
//! # Cost
//! One pass over the samples; 2·4/(3·base) of their number is kept.

/// How much larger the bins of the next level are.
pub const STEP: usize = 4;
/// Samples a bin at the lowest level of a recording in memory: finer bins are read from the samples themselves.
pub const BASE: usize = 64;

/// The smallest and the largest value of a bin.
pub type Ends = [f32; 2];

const NOTHING: Ends = [f32::NAN; 2];

/// One channel's bins; samples come by [`Pyramid::push`].
#[derive(Debug, Clone)]
pub struct Pyramid {
    base: usize,
    /// Bins of `base`, of `STEP·base`, …; the levels above the first are made by [`Pyramid::close`].
    levels: Vec<Vec<Ends>>,
    /// The bin at work, and the samples in it.
    open: Ends,
    held: usize,
}

impl Pyramid {
    /// An empty one. `base` is at least 1.
    pub fn new(base: usize) -> Self {
        Pyramid {
            base: base.max(1),
            levels: vec![Vec::new()],
            open: NOTHING,
            held: 0,
        }
    }

    /// All levels of these samples.
    pub fn of(samples: &[f32], base: usize) -> Self {
        let mut pyramid = Pyramid::new(base);
        pyramid.push(samples);
        pyramid.close();
        pyramid
    }

    /// Adds the samples that follow.
    pub fn push(&mut self, mut samples: &[f32]) {
        while !samples.is_empty() {
            let (now, rest) = samples.split_at(samples.len().min(self.base - self.held));
            self.open = wider(self.open, ends(now));
            self.held += now.len();
            if self.held == self.base {
                self.shut();
            }
            samples = rest;
        }
    }

    /// Ends the last bin and makes the levels above.
    pub fn close(&mut self) {
        if self.held > 0 {
            self.shut();
        }
        self.levels.truncate(1);
        while let Some(last) = self.levels.last().filter(|l| l.len() > 1) {
            let next = last
                .chunks(STEP)
                .map(|part| part.iter().copied().fold(NOTHING, wider))
                .collect();
            self.levels.push(next);
        }
    }

    fn shut(&mut self) {
        self.levels[0].push(self.open);
        self.open = NOTHING;
        self.held = 0;
    }

    /// The bins of one size; `None` for a size that is below the base or no level.
    pub fn level(&self, size: usize) -> Option<&[Ends]> {
        let mut at = self.base;
        let mut levels = self.levels.iter();
        loop {
            let level = levels.next()?;
            if at == size {
                return Some(level);
            }
            at = at.checked_mul(STEP)?;
        }
    }
}

/// The smallest and the largest number among these.
pub fn ends(samples: &[f32]) -> Ends {
    // Comparisons with what is not a number are false, so it is passed over.
    const LANES: usize = 8;
    let (mut low, mut high) = ([f32::INFINITY; LANES], [f32::NEG_INFINITY; LANES]);
    let (whole, rest) = samples.as_chunks::<LANES>();
    let mut take = |i: usize, v: f32| {
        low[i] = if v < low[i] { v } else { low[i] };
        high[i] = if v > high[i] { v } else { high[i] };
    };
    for part in whole {
        for (i, v) in part.iter().enumerate() {
            take(i, *v);
        }
    }
    for (i, v) in rest.iter().enumerate() {
        take(i, *v);
    }
    let low = low.into_iter().fold(f32::INFINITY, f32::min);
    let high = high.into_iter().fold(f32::NEG_INFINITY, f32::max);
    if low <= high { [low, high] } else { NOTHING }
}

/// What holds both.
fn wider(a: Ends, b: Ends) -> Ends {
    // `min` and `max` of a number and what is none are the number.
    [a[0].min(b[0]), a[1].max(b[1])]
}

#[cfg(test)]
mod tests {
    use super::*;

    fn noise(count: usize) -> Vec<f32> {
        let mut state = 7u64;
        let mut next = || {
            state = state
                .wrapping_mul(6364136223846793005)
                .wrapping_add(1442695040888963407);
            (state >> 40) as f32 / 65536.0 - 128.0
        };
        (0..count).map(|_| next()).collect()
    }

    #[test]
    fn every_level_holds_what_the_samples_hold() {
        for count in [0, 1, 3, 4, 5, 63, 64, 65, 1000, 4097] {
            let samples = noise(count);
            let pyramid = Pyramid::of(&samples, 4);
            let mut size = 4;
            while let Some(level) = pyramid.level(size) {
                let plain: Vec<Ends> = samples.chunks(size).map(ends).collect();
                assert_eq!(level, plain, "{count} samples, bins of {size}");
                size *= STEP;
            }
            assert!(size >= count, "the top holds everything");
        }
    }

    #[test]
    fn pieces_of_any_length_give_the_same_bins() {
        let samples = noise(5000);
        let whole = Pyramid::of(&samples, 16);
        let mut pieces = Pyramid::new(16);
        let mut from = 0;
        for length in (1..).step_by(7) {
            let to = (from + length).min(samples.len());
            pieces.push(&samples[from..to]);
            from = to;
            if from == samples.len() {
                break;
            }
        }
        pieces.close();
        assert_eq!(pieces.levels, whole.levels);
    }

    #[test]
    fn what_is_not_a_number_is_passed_over() {
        assert_eq!(ends(&[f32::NAN, 2.0, -1.0, f32::NAN]), [-1.0, 2.0]);
        let blank = Pyramid::of(&[f32::NAN; 8], 4);
        assert!(blank.level(4).is_some_and(|l| l[1][0].is_nan()));
        let half = Pyramid::of(&[1.0, 1.0, f32::NAN, f32::NAN], 2);
        assert_eq!(half.level(8), Some(&[[1.0, 1.0]][..]));
    }

    #[test]
    fn sizes_between_levels_are_no_level() {
        let pyramid = Pyramid::of(&noise(100), 4);
        assert!(pyramid.level(1).is_none());
        assert!(pyramid.level(8).is_none());
        assert!(pyramid.level(1 << 40).is_none());
    }
}
