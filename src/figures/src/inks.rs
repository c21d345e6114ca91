//! Colours of both schemes, and the steps of their ramps.
use crate::look::Scheme;
use plotters::style::RGBAColor;

/// Eleven steps, symmetric about the middle one.
pub(crate) type Ramp = [RGBAColor; 11];

/// The colours of one scheme.
#[derive(Clone, Copy)]
pub(crate) struct Inks {
    pub plate: RGBAColor,
    pub wash: RGBAColor,
    pub ink: RGBAColor,
    pub slate: RGBAColor,
    pub line: RGBAColor,
    pub rule: RGBAColor,
    pub signal: RGBAColor,
    pub reference: RGBAColor,
    pub signal_wash: RGBAColor,
    pub reference_wash: RGBAColor,
    /// Ochre (less) to purple (more).
    pub image: Ramp,
    /// Slate (negative) to purple (positive).
    pub stronger: Ramp,
    /// Slate (negative) to ochre (positive).
    pub weaker: Ramp,
}

const fn hex(rgb: u32) -> RGBAColor {
    RGBAColor((rgb >> 16) as u8, (rgb >> 8) as u8, rgb as u8, 1.0)
}

const fn ramp(low: [u32; 5], middle: u32, high: [u32; 5]) -> Ramp {
    let mut all = [hex(middle); 11];
    let mut i = 0;
    while i < 5 {
        all[i] = hex(low[i]);
        all[i + 6] = hex(high[i]);
        i += 1;
    }
    all
}

const PURPLE: [u32; 5] = [0xDED6EC, 0xC1B2DA, 0xA18BC6, 0x8064B0, 0x5E3C99];
const OCHRE: [u32; 5] = [0xF1D5BC, 0xE2AF85, 0xD08D54, 0xBD6E28, 0xA85206];
const OCHRE_FALLING: [u32; 5] = [0xA85206, 0xBD6E28, 0xD08D54, 0xE2AF85, 0xF1D5BC];
const SLATE_FALLING: [u32; 5] = [0x3C4A57, 0x5D6A76, 0x838E98, 0xABB3BA, 0xD4D8DB];
const MIDDLE: u32 = 0xFBFAF8;

const LIGHT: Inks = Inks {
    plate: hex(0xFFFFFF),
    wash: hex(0xF3F1EB),
    ink: hex(0x22303C),
    slate: hex(0x54616D),
    line: hex(0x7B8791),
    rule: hex(0xDDDAD2),
    signal: hex(0x5E3C99),
    reference: hex(0xB35806),
    signal_wash: hex(0xEDE8F6),
    reference_wash: hex(0xF8ECDD),
    image: ramp(OCHRE_FALLING, MIDDLE, PURPLE),
    stronger: ramp(SLATE_FALLING, MIDDLE, PURPLE),
    weaker: ramp(SLATE_FALLING, MIDDLE, OCHRE),
};

const DARK_PURPLE: [u32; 5] = [0x37334A, 0x524A70, 0x706399, 0x9180C2, 0xB9A3E6];
const DARK_OCHRE: [u32; 5] = [0x4C3A2C, 0x78502E, 0xA06530, 0xC27733, 0xE08A36];
const DARK_OCHRE_FALLING: [u32; 5] = [0xE08A36, 0xC27733, 0xA06530, 0x78502E, 0x4C3A2C];
const DARK_SLATE_FALLING: [u32; 5] = [0xB4BDC5, 0x949EA7, 0x747E87, 0x555F68, 0x3A434B];
const DARK_MIDDLE: u32 = 0x262B31;

const DARK: Inks = Inks {
    plate: hex(0x1A1F24),
    wash: hex(0x20262C),
    ink: hex(0xE7E4DD),
    slate: hex(0xA6B0B8),
    line: hex(0x7D8892),
    rule: hex(0x323A42),
    signal: hex(0xB9A3E6),
    reference: hex(0xE59A4F),
    signal_wash: hex(0x2B2540),
    reference_wash: hex(0x37281A),
    image: ramp(DARK_OCHRE_FALLING, DARK_MIDDLE, DARK_PURPLE),
    stronger: ramp(DARK_SLATE_FALLING, DARK_MIDDLE, DARK_PURPLE),
    weaker: ramp(DARK_SLATE_FALLING, DARK_MIDDLE, DARK_OCHRE),
};

impl Inks {
    pub(crate) fn of(scheme: Scheme) -> Inks {
        match scheme {
            Scheme::Light => LIGHT,
            Scheme::Dark => DARK,
        }
    }

    /// Ground of an area or a bar without a side.
    pub(crate) fn area(&self) -> RGBAColor {
        mix(self.line, self.plate, 0.38)
    }

    /// Band about a curve without a side.
    pub(crate) fn band(&self) -> RGBAColor {
        see_through(self.ink, 0.14)
    }

    /// The ink, light or dark, that reads best on `ground`.
    pub(crate) fn on(&self, ground: RGBAColor) -> RGBAColor {
        let far = |c: RGBAColor| (light(c) - light(ground)).abs();
        if far(self.ink) > far(self.plate) {
            self.ink
        } else {
            self.plate
        }
    }
}

/// `share` of one colour, the rest of another.
pub(crate) fn mix(of: RGBAColor, with: RGBAColor, share: f64) -> RGBAColor {
    let part = |a: u8, b: u8| (f64::from(a) * share + f64::from(b) * (1.0 - share)).round() as u8;
    RGBAColor(
        part(of.0, with.0),
        part(of.1, with.1),
        part(of.2, with.2),
        1.0,
    )
}

/// A colour that lets what lies below shine through.
pub(crate) fn see_through(color: RGBAColor, share: f64) -> RGBAColor {
    RGBAColor(color.0, color.1, color.2, share)
}

/// Relative lightness as the eye weighs the channels, 0…1 (the square root stands for the eye's response).
fn light(c: RGBAColor) -> f64 {
    let part = |v: u8| (f64::from(v) / 255.0).powf(2.2);
    (0.2126 * part(c.0) + 0.7152 * part(c.1) + 0.0722 * part(c.2)).sqrt()
}

/// Step of a value in a ramp that runs from `-limit` to `limit`.
pub(crate) fn step(value: f64, limit: f64) -> usize {
    if !value.is_finite() || limit <= 0.0 {
        return 5;
    }
    (((value / limit + 1.0) / 2.0 * 11.0).floor()).clamp(0.0, 10.0) as usize
}
