//! Teasel's drawings over any plotters backend: the same code on the page's canvas and in SVG.
//!
//! A [`Figure`] is plain data made from a [`Sheet`] ([`from_sheet`], by one of the [`names`]) or from a recording
//! ([`traces`]); [`draw`] puts it on a drawing area, [`svg`] writes it as a file, [`table`] gives the numbers behind it.
//!
//! `look` scheme and scale · `inks` colours · `fine` coordinates between pixels · `pen` lines and words · `axis`, `frame` ticks,
//! grids, plot boxes · `text` widths, shortening, numbers · `places` room for names · `ground` what channels lie on · `topography` filled bands ·
//! `catalogue` which figures a sheet gives · `svg`, `table` files · one room for each family of figures.
//!
//! # Units
//! Sizes are CSS pixels, from the upper left corner. Data keep the units of the sheet.
mod alike;
mod axis;
mod beside;
mod catalogue;
mod channels;
mod channels_map;
mod course;
mod eigenvalues;
mod estimate;
mod filters;
mod fine;
mod frame;
mod ground;
mod group;
mod head;
mod inks;
mod keep;
mod kept;
mod look;
mod map;
mod nan;
mod overview;
mod pen;
mod places;
mod principal;
mod ratio;
mod recorder;
mod scores;
mod sizes;
mod spectrum;
mod svg;
mod table;
mod text;
mod topography;
mod traces;
mod trials;
mod weights;

#[cfg(test)]
mod sample;
#[cfg(test)]
mod tests;

pub use catalogue::{from_sheet, names};
pub use fine::Fine;
pub use frame::PlotBox;
pub use ground::Ground;
pub use group::group_figures;
pub use look::{FACE, Look, Scheme};
pub use pen::Drawn;
pub use sizes::{report_width, stands_alone};
pub use svg::svg;
pub use table::{Table, csv};
pub use traces::traces;

use plotters::coord::Shift;
use plotters::drawing::DrawingArea;
use plotters_backend::DrawingBackend;
use serde::{Deserialize, Serialize};
#[cfg(doc)]
use teasel_core::sheet::Sheet;

/// What every family of figures can do.
pub(crate) trait Plot {
    fn draw<DB: DrawingBackend>(&self, pen: &pen::Pen<DB>) -> Drawn<DB>;
    fn height(&self, width: u32) -> u32;
    fn plot_box(&self, _width: f64, _height: f64) -> Option<PlotBox> {
        None
    }
    fn table(&self) -> Table;
    /// One sentence for those who cannot see it.
    fn spoken(&self) -> String;
}

macro_rules! figures {
    ($($(#[$doc:meta])* $name:ident($data:path),)*) => {
        /// Plain data for one drawing.
        #[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
        #[serde(tag = "figure", rename_all = "kebab-case")]
        pub enum Figure { $($(#[$doc])* $name($data),)* }

        macro_rules! each {
            ($figure:expr, $data_name:ident => $body:expr) => {
                match $figure { $(Figure::$name($data_name) => $body,)* }
            };
        }
    };
}

figures! {
    /// The envelope of the whole recording over lanes of its events.
    Overview(overview::Overview),
    /// Channels over seconds.
    Traces(traces::Traces),
    /// Channels on the head seen from above.
    ChannelsMap(channels_map::ChannelsMap),
    /// Standard deviation and mains excess of every channel.
    Channels(channels::Channels),
    /// Power or average around an event, with the windows.
    Course(course::Course),
    /// Variance of every dimension.
    Eigenvalues(eigenvalues::Eigenvalues),
    /// What the filters let pass.
    Filters(filters::Filters),
    /// The first dimensions of the compression and their courses.
    Principal(principal::Principal),
    /// Fitted and held-out ratio against C.
    Keep(keep::Keep),
    /// A pattern on the head.
    Map(map::Map),
    /// The largest weights of a filter.
    Weights(weights::Weights),
    /// Spectra in signal and reference windows.
    Spectrum(spectrum::Spectrum),
    /// Single trials around the event.
    Trials(trials::Trials),
    /// One ratio on the shared axis, or the axis itself.
    Ratio(ratio::Row),
    /// The same held-out measure for what one would have used otherwise.
    Beside(beside::Beside),
    /// The permutation test.
    Alike(alike::Alike),
    /// Held-out ratio of every trial.
    Scores(scores::Scores),
}

/// Draws a figure over the whole of an area, whose size in CSS pixels is its size divided by `scale × fine` of the look.
///
/// # Errors
/// Those of the backend.
pub fn draw<DB: DrawingBackend>(
    figure: &Figure,
    area: &DrawingArea<DB, Shift>,
    look: &Look,
) -> Drawn<DB> {
    recorder::through(area, |area| {
        let pen = pen::Pen::new(area, look);
        each!(figure, data => data.draw(&pen))
    })
}

/// Natural height in CSS pixels for a width.
pub fn height(figure: &Figure, width: u32) -> u32 {
    each!(figure, data => data.height(width))
}

/// Where the plot lies in the figure at this size, so that something can be laid over it; `None` where there are no axes.
pub fn plot_box(figure: &Figure, width: u32, height: u32) -> Option<PlotBox> {
    each!(figure, data => data.plot_box(f64::from(width), f64::from(height)))
}

/// The numbers behind a figure.
pub fn table(figure: &Figure) -> Table {
    each!(figure, data => data.table())
}

/// What the figure shows, in one sentence, for those who cannot see it.
pub fn spoken(figure: &Figure) -> String {
    text::clean(&each!(figure, data => data.spoken()))
}
