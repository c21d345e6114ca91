//! What is computed, in which order, and what a change of the recipe makes stale.
use super::islands::{Standing, moved};
use super::portrait::Portraits;
use super::{Progress, Series, Stage, cards};
use crate::contrast::band::Banding;
use crate::contrast::basis::{Basis, Channels, Finding, SPARE};
use crate::contrast::fit::{Ends, Labels, Method, centre, extremes, fit};
use crate::contrast::read::Reader;
use crate::contrast::reject::{judge, measure, relative_size};
use crate::contrast::space::Covariances;
use crate::contrast::windows::{Exchange, Selection, Window, check, lag_samples, select};
use crate::describe::placing::placed;
use crate::error::{Kind, Problem, Result};
use crate::evidence::FEWEST;
use crate::evidence::dimensions::Counting;
use crate::evidence::heldout::{
    Design, FoldFit, Ground, Scores, choose_keep, fit_ground, log_total, log_typical,
    mean_and_error, score_into, variances,
};
use crate::evidence::permute::{Plan, arrangement, plan};
use crate::prepare::{Comparing, Prepared, Preparing, Quality, inspect};
use crate::recipe::{BandReference, Contrast, Keep, KeepWord, Measure, Recipe, Shrink, ShrinkWord};
use crate::recording::Recording;
use crate::sheet::{ChannelCard, End, KeepCurve, RejectionEffect, Sheet};
use std::borrow::Cow;
use std::collections::BTreeMap;

/// Largest C of `keep: "auto"`.
const AUTO_LIMIT: usize = 150;
/// Dimensions of the compression that are shown.
const PRINCIPAL: usize = 6;
/// Floating-point operations of one bite: about 20 ms in a browser.
const BITE: f64 = 2e7;
/// Values of C that `keep: "best"` chooses from go no further.
const BEST_LIMIT: usize = 64;

/// Everything computed so far.
#[derive(Debug)]
pub(super) struct Work {
    pub(super) sheet: Sheet,
    cards: Option<Vec<ChannelCard>>,
    /// What is known of the whole where only islands of it are in memory.
    standing: Option<Standing>,
    /// The comparison of the recorded channels while it is at work; what it gave holds for every recipe.
    comparing: Option<Comparing>,
    pub(super) quality: Option<Quality>,
    preparing: Option<Preparing>,
    pub(super) prepared: Option<Prepared>,
    pub(super) selection: Option<Selection>,
    /// A basis of many channels in the making, and made: `prepared` then holds the samples in it, and these are the channels' own.
    finding: Option<Finding>,
    pub(super) basis: Option<Basis>,
    pixels: Vec<Vec<f32>>,
    /// The filtered recording of a band contrast.
    bands: Option<Banding>,
    pub(super) covariances: Covariances,
    pub(super) ground: Option<Ground>,
    /// C in force, once known.
    pub(super) keep: Option<usize>,
    pub(super) design: Option<Design>,
    pub(super) ends: Option<Ends>,
    /// Components described without intervals, for a first look: the first of each end.
    sketched: usize,
    described: usize,
    pub(super) folds: Vec<Ground>,
    pub(super) fits: Vec<FoldFit>,
    summarised: bool,
    pub(super) plan: Option<Plan>,
    pub(super) null: Vec<(f64, f64)>,
    level: Option<Level>,
    /// The average channel's ratio, where the signal side was scaled to it.
    pub(super) average_ratio: f64,
    curve: CurveWork,
    pub(super) portraits: Portraits,
    /// The criteria of `drop_windows` have been looked at.
    rejected: bool,
    effect: Option<EffectWork>,
    counting: Option<Counting>,
    /// The principal course at work, as far as it is.
    course: Vec<f64>,
    course_done: usize,
}

/// Every window as it was before some were dropped, to say what that did to the ratio.
#[derive(Debug)]
struct EffectWork {
    covariances: Covariances,
    windows: Vec<Window>,
    ground: Option<Ground>,
}

/// Both sides of the segments at one level, which is what a test of bands and slow changes exchanges.
#[derive(Debug)]
struct Level {
    covariances: Covariances,
    ground: Ground,
    /// The average channel's ratio before.
    ratio: f64,
}

/// The ratio against C as far as it is.
#[derive(Debug, Default)]
struct CurveWork {
    /// Fitted ratio, held-out ratio and standard error of its log, at every C that is done; `None` where the fit is singular.
    points: BTreeMap<usize, Option<[f64; 3]>>,
    /// Fitted ratio at the value of C in work.
    fitted: f64,
    /// Held-out variances at the value of C in work, over the folds done.
    scores: Scores,
    /// 0: the whole; f + 1: fold f.
    part: usize,
    /// The end that it is about.
    end: End,
    /// The sheet holds the curve for the C in force.
    shown: bool,
}

/// The next thing to do.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Task {
    Inspect,
    Prepare,
    Select,
    Compress,
    Band,
    Covariances,
    Reject,
    Ground,
    Keep,
    Logs,
    Solve,
    Sketch,
    Compare,
    Ranks,
    Describe,
    FoldGround(usize),
    FoldLogs(usize),
    FoldFit(usize),
    Summarise,
    Permute,
    Open,
    Curve,
    Portrait,
    Effect,
    Principal,
    Dimensions,
    Nothing,
}

/// Most dimensions that a space holds.
fn limit(recipe: &Recipe) -> usize {
    match recipe.keep {
        Keep::Number(keep) => keep.max(AUTO_LIMIT),
        Keep::Word(_) => AUTO_LIMIT,
    }
}

fn bites(per_unit: f64) -> usize {
    (BITE / per_unit.max(1.0)).clamp(1.0, 4096.0) as usize
}

/// Operations of one matrix logarithm, roughly.
fn log_cost(n: usize) -> f64 {
    14.0 * (n as f64).powi(3) + 2000.0
}

impl Work {
    /// On islands of a recording whose samples stay in the file.
    pub(super) fn on_islands(recording: &Recording, recipe: &Recipe, standing: Standing) -> Self {
        let mut work = Work::new(recording, recipe);
        work.sheet.warnings = standing.card.warnings.clone();
        work.sheet.recording = standing.card.clone();
        work.sheet.channels = standing.cards.clone();
        work.cards = Some(standing.cards.clone());
        work.standing = Some(standing);
        work
    }

    pub(super) fn new(recording: &Recording, recipe: &Recipe) -> Self {
        Work {
            sheet: cards::begin(recording, recipe),
            cards: None,
            standing: None,
            comparing: None,
            quality: None,
            preparing: None,
            prepared: None,
            selection: None,
            finding: None,
            basis: None,
            pixels: Vec::new(),
            bands: None,
            covariances: Covariances::default(),
            ground: None,
            keep: None,
            design: None,
            ends: None,
            sketched: 0,
            described: 0,
            folds: Vec::new(),
            fits: Vec::new(),
            summarised: false,
            plan: None,
            null: Vec::new(),
            level: None,
            average_ratio: 1.0,
            curve: CurveWork::default(),
            portraits: Portraits::default(),
            rejected: false,
            effect: None,
            counting: None,
            course: Vec::new(),
            course_done: 0,
        }
    }

    /// Drops what a changed recipe makes stale; refuses what cannot be begun.
    pub(super) fn change(
        &mut self,
        recording: &Recording,
        old: &Recipe,
        new: &Recipe,
    ) -> Result<()> {
        let preparation = old.channels != new.channels || old.filter != new.filter;
        if preparation {
            // Refuse before anything is dropped.
            let mut cards = inspect(recording, new);
            cards::doubt(&mut cards, self.quality.as_ref(), new);
            let preparing = Preparing::new(recording, &cards, new)?;
            self.cards = Some(cards);
            self.preparing = Some(preparing);
            self.prepared = None;
        } else if let Some(prepared) = &self.prepared {
            check(&new.contrast, &recording.events, prepared.rate_hz)?;
        }
        let drawn =
            old.evidence.seed != new.evidence.seed && new.contrast.around().iter().any(|w| w.equal);
        let windows = preparation
            || drawn
            || old.contrast != new.contrast
            || old.drop_windows != new.drop_windows
            || old.not_used != new.not_used
            || locked_share(old) != locked_share(new);
        let spaces = limit(old) != limit(new);
        if windows || spaces && self.basis.is_some() {
            self.leave_basis();
            self.selection = None;
            self.bands = None;
            self.covariances = Covariances::default();
            self.rejected = false;
            self.counting = None;
            self.course.clear();
            self.ground = None;
            self.folds.clear();
        }
        if old.hold_back != new.hold_back {
            self.sheet.held_back = None;
        }
        if old.evidence.seed != new.evidence.seed {
            self.counting = None;
            self.sheet.dimensions = None;
        }
        let method = windows
            || old.measure != new.measure
            || old.shrink != new.shrink
            || old.keep != new.keep
            || old.components != new.components;
        let folds = old.evidence.folds != new.evidence.folds;
        if method {
            self.effect_stale();
        }
        if method || folds {
            let logs_hold = !windows && old.shrink == new.shrink && old.measure == new.measure;
            if !logs_hold {
                self.ground
                    .iter_mut()
                    .chain(&mut self.folds)
                    .for_each(|g| g.logs.clear());
            }
            self.keep = None;
            self.ends = None;
            self.sketched = 0;
            self.described = 0;
        }
        if spaces {
            self.ground = None;
        }
        if folds || spaces {
            self.folds.clear();
        }
        if old.keep != new.keep {
            // Only the logarithms of the C in force are kept, or dragging it would fill the memory.
            self.ground
                .iter_mut()
                .chain(&mut self.folds)
                .for_each(|g| g.logs.clear());
        }
        if windows || folds {
            self.design = None;
        }
        let evidence = old.evidence != new.evidence;
        if method || evidence {
            self.fits.clear();
            self.summarised = false;
            self.plan = None;
            self.null.clear();
            self.level = None;
        }
        if old.spectrum != new.spectrum {
            self.described = 0;
        }
        if evidence && old.evidence.bootstrap != new.evidence.bootstrap
            || old.evidence.seed != new.evidence.seed
        {
            self.described = 0;
        }
        // What is known of the curve does not depend on the C in force, the choice of its points does.
        self.curve.part = 0;
        self.curve.shown = false;
        let curve_holds = !windows
            && !folds
            && old.measure == new.measure
            && old.shrink == new.shrink
            && limit(old) == limit(new);
        if !curve_holds {
            self.curve = CurveWork::default();
        }
        cards::forget(
            &mut self.sheet,
            new,
            &cards::Stale {
                preparation,
                windows,
                method,
                evidence: method || evidence,
                curve: !curve_holds,
            },
        );
        if preparation {
            self.sheet.channels = self.cards.clone().unwrap_or_default();
            self.sheet.recording.layout = placed(recording, &new.channels).0;
        }
        Ok(())
    }

    /// What the windows are read from.
    pub(super) fn reader<'a>(&'a self, prepared: &'a Prepared, recipe: &Recipe) -> Reader<'a> {
        reader(prepared, self.bands.as_ref(), recipe)
    }

    /// What was dropped stays dropped; the ratio with every window has to be worked out again.
    fn effect_stale(&mut self) {
        if !self.rejected {
            self.effect = None;
        }
        if let Some(effect) = &mut self.effect {
            effect.ground = None;
        }
        if let Some(card) = &mut self.sheet.rejection {
            card.effect = None;
        }
    }

    fn enough(&self) -> bool {
        self.selection
            .as_ref()
            .is_some_and(|s| s.repetitions() >= FEWEST)
    }

    fn method(&self, recipe: &Recipe) -> Method {
        Method {
            measure: recipe.measure,
            shrink: recipe.shrink,
            components: recipe.components,
            folds: recipe.evidence.folds,
        }
    }

    fn next(&self, recipe: &Recipe) -> Task {
        if self.cards.is_none() {
            return Task::Inspect;
        }
        if self.prepared.is_none() {
            return Task::Prepare;
        }
        let Some(selection) = &self.selection else {
            return Task::Select;
        };
        let windows = selection.windows.len();
        if self.basis.is_none() && self.prepared.as_ref().is_some_and(Prepared::many) {
            return Task::Compress;
        }
        if let Contrast::Band { .. } = recipe.contrast
            && (self.bands.as_ref()).is_none_or(|b| b.signal.len() < prepared_channels(self))
        {
            return Task::Band;
        }
        if self.covariances.packed.len() < windows {
            return Task::Covariances;
        }
        if !self.rejected && !recipe.drop_windows.is_empty() {
            return Task::Reject;
        }
        let Some(ground) = self.ground.as_ref().filter(|g| self.whole(g, recipe)) else {
            return Task::Ground;
        };
        let Some(keep) = self.keep else {
            return Task::Keep;
        };
        if !logs_ready(ground, keep, recipe) {
            return Task::Logs;
        }
        if self.ends.is_none() {
            return Task::Solve;
        }
        let (up, down) = (self.sheet.stronger.len(), self.sheet.weaker.len());
        if self.sketched < up.min(1) + down.min(1) {
            return Task::Sketch;
        }
        // Channels are compared over all samples. Pixels have no contacts that could be bad, and too many neighbours to be compared.
        let judged = self.sheet.movie.is_none();
        if judged && self.quality.is_none() && self.standing.is_none() {
            return Task::Compare;
        }
        let preparation = self.sheet.preparation.as_ref();
        if judged && preparation.is_some_and(|p| p.ranks.is_empty()) {
            return Task::Ranks;
        }
        if self.described < up + down {
            return Task::Describe;
        }
        if !self.enough() {
            return self.last(ground, recipe);
        }
        let folds = self.design.as_ref().map_or(0, |d| d.folds);
        if self.fits.len() < folds {
            let f = self.fits.len();
            let Some(fold) = self.folds.get(f).filter(|g| self.whole(g, recipe)) else {
                return Task::FoldGround(f);
            };
            return if self
                .grid_for(fold, keep, recipe)
                .iter()
                .all(|c| logs_ready(fold, *c, recipe))
            {
                Task::FoldFit(f)
            } else {
                Task::FoldLogs(f)
            };
        }
        if !self.summarised {
            return Task::Summarise;
        }
        let untested = recipe.p_withheld().is_none();
        if untested && self.plan.is_none_or(|p| self.null.len() < p.count) {
            return Task::Permute;
        }
        if recipe.hold_back.is_some_and(|h| h.open) && self.sheet.held_back.is_none() {
            return Task::Open;
        }
        if !self.curve.shown {
            Task::Curve
        } else {
            self.last(ground, recipe)
        }
    }

    /// What nothing else waits for.
    fn last(&self, ground: &Ground, recipe: &Recipe) -> Task {
        let all = self.sheet.stronger.len() + self.sheet.weaker.len();
        let wanted = PRINCIPAL.min(ground.space.dimensions());
        let effect = self.sheet.rejection.as_ref().and_then(|r| r.effect);
        if self.effect.is_some() && effect.is_none() {
            Task::Effect
        } else if self.standing.is_none() && self.sheet.principal.len() < wanted {
            Task::Principal
        } else if self.sheet.dimensions.is_none() && self.basis.is_none() && self.counts_samples() {
            Task::Dimensions
        } else if self.portraits.done < all && recipe.contrast.event_windows().is_some() {
            Task::Portrait
        } else {
            Task::Nothing
        }
    }

    /// Whether the covariances are those of the prepared samples, so that rules about samples speak of them.
    fn counts_samples(&self) -> bool {
        (self.selection.as_ref()).is_some_and(|s| s.exchange.labels_alone())
    }

    /// Whether a ground holds all its windows.
    fn whole(&self, ground: &Ground, recipe: &Recipe) -> bool {
        let windows = self.covariances.packed.len();
        ground.space.covariances.len() == windows
            && (!wants_fourth(recipe) || ground.fourth.len() == windows)
    }

    pub(super) fn finished(&self, recipe: &Recipe) -> bool {
        self.next(recipe) == Task::Nothing
    }

    pub(super) fn step(&mut self, recording: &Recording, recipe: &Recipe) -> Result<Progress> {
        let task = self.next(recipe);
        match task {
            Task::Inspect => {
                let mut found = inspect(recording, recipe);
                cards::doubt(&mut found, self.quality.as_ref(), recipe);
                self.sheet.channels = found.clone();
                self.cards = Some(found);
                Ok(progress(
                    Stage::Preparing,
                    0,
                    recording.channels.len() as u64,
                    true,
                ))
            }
            Task::Prepare => self.prepare(recording, recipe),
            Task::Select => {
                let Some(prepared) = &self.prepared else {
                    return Err(lost());
                };
                let standing = self.standing.as_ref();
                let selection = select(
                    recipe,
                    &recording.events,
                    standing.map_or(&prepared.stretches, |s| &s.whole),
                    prepared.rate_hz,
                )?;
                let selection = match standing {
                    Some(s) => moved(selection, &s.islands).ok_or_else(lost)?,
                    None => selection,
                };
                self.sheet.windows = Some(selection.card.clone());
                let channels = match prepared.many() {
                    true => limit(recipe) + SPARE,
                    false => prepared.samples.len(),
                };
                afford(channels, selection.windows.len(), recipe)?;
                let all = selection.windows.len() as u64;
                self.selection = Some(selection);
                Ok(progress(Stage::Windows, 0, all, true))
            }
            Task::Compress => self.compress(recording, recipe),
            Task::Band => self.push_band(recipe),
            Task::Covariances => self.push_covariances(recipe),
            Task::Reject => self.reject(recipe),
            Task::Ground => self.push_ground(recipe),
            Task::Keep => self.choose_keep(recipe),
            Task::Logs => {
                let keep = self.keep.unwrap_or(2);
                let rho = self.method(recipe).rho();
                let Some(ground) = &mut self.ground else {
                    return Err(lost());
                };
                let done = push_logs(ground, keep, rho);
                Ok(progress(
                    Stage::Fitting,
                    done,
                    self.covariances.packed.len() as u64,
                    false,
                ))
            }
            Task::Solve => self.solve(recipe),
            Task::Sketch => {
                super::describing::describe(self, recording, recipe, self.sketched, 0)?;
                self.sketched += 1;
                let firsts = self.sheet.stronger.len().min(1) + self.sheet.weaker.len().min(1);
                Ok(self.fitted(self.sketched == firsts))
            }
            Task::Compare => Ok(self.compare(recording, recipe)),
            Task::Ranks => {
                cards::ranks(self);
                Ok(self.fitted(true))
            }
            Task::Describe => {
                super::describing::describe(
                    self,
                    recording,
                    recipe,
                    self.described,
                    recipe.evidence.bootstrap,
                )?;
                self.described += 1;
                let all = self.sheet.stronger.len() + self.sheet.weaker.len();
                Ok(self.fitted(self.described == all))
            }
            Task::FoldGround(f) => self.push_fold_ground(f, recipe),
            Task::FoldLogs(f) => {
                let rho = self.method(recipe).rho();
                let keep = self.keep.unwrap_or(2);
                let grid = self.grid_for(&self.folds[f], keep, recipe);
                let fold = &mut self.folds[f];
                if let Some(c) = grid.into_iter().find(|c| !logs_ready(fold, *c, recipe)) {
                    push_logs(fold, c, rho);
                }
                Ok(self.fold_progress(f, 2))
            }
            Task::FoldFit(f) => self.fit_fold(f, recipe),
            Task::Summarise => {
                cards::held_out(self, recipe);
                self.summarised = true;
                let folds = self.folds.len() as u64;
                Ok(progress(Stage::HeldOut, 3 * folds, 3 * folds, true))
            }
            Task::Permute => self.permute(recipe),
            Task::Open => {
                self.sheet.held_back = Some(super::opened::open(self, recording, recipe)?);
                Ok(progress(Stage::Permuting, 1, 1, true))
            }
            Task::Curve => self.curve(recipe),
            Task::Portrait => {
                let before = self.portraits.done;
                let (done, of) = self.portrait(recording, recipe, BITE);
                let news = self.portraits.done > before;
                Ok(progress(Stage::Picturing, done, of, news))
            }
            Task::Effect => self.rejection_effect(recipe),
            Task::Principal => self.principal(),
            Task::Dimensions => self.count_dimensions(recipe),
            Task::Nothing => Ok(progress(Stage::Done, 1, 1, false)),
        }
    }

    fn prepare(&mut self, recording: &Recording, recipe: &Recipe) -> Result<Progress> {
        if self.preparing.is_none() {
            let cards = self.cards.as_deref().unwrap_or_default();
            self.preparing = Some(Preparing::new(recording, cards, recipe)?);
        }
        let Some(preparing) = &mut self.preparing else {
            return Err(lost());
        };
        let more = preparing.step(recording);
        let (done, of) = preparing.progress();
        if more && done < of {
            return Ok(progress(Stage::Preparing, done as u64, of as u64, false));
        }
        let Some(prepared) = self.preparing.take().and_then(Preparing::finish) else {
            return Err(lost());
        };
        self.sheet.preparation = Some(prepared.card.clone());
        self.prepared = Some(prepared);
        Ok(progress(Stage::Preparing, of as u64, of as u64, true))
    }

    /// Finds the basis that stands in for many channels; from then on `prepared` holds the samples in it.
    fn compress(&mut self, recording: &Recording, recipe: &Recipe) -> Result<Progress> {
        let (Some(prepared), Some(selection)) = (&mut self.prepared, &self.selection) else {
            return Err(lost());
        };
        let samples = prepared.stretches.iter().map(|s| s.count).sum();
        let finding = self.finding.get_or_insert_with(|| {
            let wanted = limit(recipe) + SPARE;
            Finding::new(prepared.channels.len(), samples, &selection.windows, wanted)
        });
        finding.step(&Pixels {
            prepared,
            recording,
        });
        let (done, of) = finding.progress();
        if let Some(finding) = self.finding.take_if(|f| f.finished()) {
            let (basis, reduced) = finding.finish();
            if !basis.total.is_finite() {
                return Err(not_numbers());
            }
            self.pixels = std::mem::replace(&mut prepared.samples, reduced);
            self.basis = Some(basis);
        }
        Ok(progress(Stage::Windows, done, of, false))
    }

    /// Samples of prepared channel `index`, also where a basis stands in for the channels.
    pub(super) fn channel<'a>(
        &'a self,
        recording: &'a Recording,
        index: usize,
    ) -> Option<&'a [f32]> {
        let prepared = self.prepared.as_ref()?;
        match self.basis.is_some() {
            false if index < prepared.channels.len() => Some(prepared.of_channel(recording, index)),
            false => None,
            true => match self.pixels.get(index) {
                Some(samples) if !samples.is_empty() => Some(samples),
                _ => {
                    let at = *prepared.mixing.channels.get(index)?;
                    recording.samples.get(at).map(Vec::as_slice)
                }
            },
        }
    }

    /// The components' filters for the samples that `prepared` holds.
    pub(super) fn inner_filters(&self) -> impl Iterator<Item = Cow<'_, [f64]>> {
        let components = self.sheet.stronger.iter().chain(&self.sheet.weaker);
        components.map(|c| inner(&self.basis, &c.filter))
    }

    /// Puts the channels' own samples back.
    fn leave_basis(&mut self) {
        self.finding = None;
        if self.basis.take().is_some() {
            let pixels = std::mem::take(&mut self.pixels);
            if let Some(prepared) = &mut self.prepared {
                prepared.samples = pixels;
            }
        }
    }

    /// Filters the next channel of a band contrast.
    fn push_band(&mut self, recipe: &Recipe) -> Result<Progress> {
        let (
            Some(prepared),
            Contrast::Band {
                centre_hz,
                half_width_hz,
                reference,
                ..
            },
        ) = (&self.prepared, &recipe.contrast)
        else {
            return Err(lost());
        };
        let mut bands = match self.bands.take() {
            Some(bands) => bands,
            None => Banding::new(prepared, *centre_hz, *half_width_hz, *reference)?,
        };
        bands.step(prepared);
        let done = bands.signal.len() as u64;
        self.bands = Some(bands);
        Ok(progress(
            Stage::Windows,
            done,
            prepared.samples.len() as u64,
            false,
        ))
    }

    fn push_covariances(&mut self, recipe: &Recipe) -> Result<Progress> {
        let (Some(prepared), Some(selection)) = (&self.prepared, &self.selection) else {
            return Err(lost());
        };
        let reader = reader(prepared, self.bands.as_ref(), recipe);
        let first = self.covariances.packed.len();
        let all = selection.windows.len();
        if first == 0 && !selection.exchange.labels_alone() {
            // Rounding noise is that of the samples before they are filtered or subtracted.
            self.covariances.largest_mean_square = largest_mean_square(&prepared.samples);
        }
        let courses = selection.exchange == Exchange::Flip;
        push_windows(&mut self.covariances, &reader, &selection.windows, courses);
        if self.covariances.packed[first..]
            .iter()
            .flatten()
            .any(|x| !x.is_finite())
        {
            return Err(not_numbers());
        }
        let done = self.covariances.packed.len();
        if done == all {
            self.design = None;
            // Other kinds compare what was made of the samples, not the samples.
            if let (Some(basis), Contrast::Windows { .. } | Contrast::Spans { .. }) =
                (&mut self.basis, &recipe.contrast)
            {
                self.covariances.singles = std::mem::take(&mut basis.singles);
            }
            self.drop_flat()?;
            if let (true, Some(selection)) = (levelled(recipe), &self.selection) {
                let sides = selection.sides();
                self.average_ratio = self.covariances.total_level(&sides);
                self.covariances.scale_signal(&sides, self.average_ratio);
            }
        }
        Ok(progress(Stage::Windows, done as u64, all as u64, false))
    }

    /// Leaves out windows that hold nothing: a variance of zero has no logarithm, and one flat window would decide a mean of logs.
    fn drop_flat(&mut self) -> Result<()> {
        let Some(selection) = &mut self.selection else {
            return Err(lost());
        };
        let flat = self.covariances.flat();
        if flat.iter().any(|f| *f) {
            let kept = selection.drop_flat(&flat);
            self.covariances.keep_only(&kept);
            self.sheet.windows = Some(selection.card.clone());
            selection.enough()?;
        }
        Ok(())
    }

    /// Leaves out the windows that the recipe's criteria name, and keeps what is needed to say what that did.
    fn reject(&mut self, recipe: &Recipe) -> Result<Progress> {
        let (Some(prepared), Some(selection)) = (&self.prepared, &mut self.selection) else {
            return Err(lost());
        };
        let windows = selection.windows.clone();
        let measures: Vec<[f64; 3]> = windows
            .iter()
            .map(|w| measure(&prepared.samples, w))
            .collect();
        let sizes = match recipe.drop_windows.covariance {
            Some(_) => relative_size(&self.covariances),
            None => Vec::new(),
        };
        let (mut card, why) = judge(
            &recipe.drop_windows,
            &measures,
            &sizes,
            &windows,
            &prepared.unit,
        );
        self.effect = None;
        if why.iter().any(Option::is_some) {
            let mut smaller = selection.clone();
            let kept = smaller.drop_for(&why);
            smaller.enough()?;
            self.effect = Some(EffectWork {
                covariances: self.covariances.clone(),
                windows,
                ground: None,
            });
            *selection = smaller;
            self.covariances.keep_only(&kept);
            self.sheet.windows = Some(selection.card.clone());
            self.design = None;
        }
        card.windows[1] = selection.windows.len();
        self.sheet.rejection = Some(card);
        self.rejected = true;
        let all = self.covariances.packed.len() as u64;
        Ok(progress(Stage::Windows, all, all, true))
    }

    /// The fitted ratio with every window, beside the one without the dropped windows.
    fn rejection_effect(&mut self, recipe: &Recipe) -> Result<Progress> {
        let limit = limit(recipe);
        let method = Method {
            components: 1,
            ..self.method(recipe)
        };
        let (Some(effect), Some(prepared), Some(selection), Some(keep)) =
            (&mut self.effect, &self.prepared, &self.selection, self.keep)
        else {
            return Err(lost());
        };
        let all = effect.windows.len();
        let ground = effect
            .ground
            .get_or_insert_with(|| Ground::new(&effect.covariances, limit, vec![true; all]));
        let fourth = wants_fourth(recipe);
        if ground.space.covariances.len() < all || (fourth && ground.fourth.len() < all) {
            let reader = reader(prepared, self.bands.as_ref(), recipe);
            let also = fourth.then_some((&reader, &effect.windows[..]));
            let done = push_space(ground, &effect.covariances, also);
            return Ok(progress(Stage::Curve, done as u64, 2 * all as u64, false));
        }
        if !logs_ready(ground, keep, recipe) {
            let done = push_logs(ground, keep, method.rho());
            return Ok(progress(
                Stage::Curve,
                all as u64 + done,
                2 * all as u64,
                false,
            ));
        }
        let design = Design {
            paired: selection.paired,
            exchange: selection.exchange,
            signal: effect.windows.iter().map(|w| w.signal).collect(),
            trial: effect.windows.iter().map(|w| w.trial).collect(),
            fold: vec![0; all],
            folds: 1,
        };
        let labels = Labels {
            signal: &design.signal,
            train: &ground.train,
        };
        let weights = &effect.covariances.weights;
        let ends = fit(ground.view(weights, keep), labels, &method);
        let u = ends
            .as_ref()
            .and_then(|e| cards::leading_direction(e, self.sheet.leading))
            .map(|d| &d.u);
        let before = u.map_or([f64::NAN; 2], |u| {
            let v = variances(&ground.space, u, &design.signal);
            let total = log_total(&v, weights, &design, |_| true);
            [log_typical(&v, &design).exp(), total.exp()]
        });
        let after = self
            .sheet
            .first()
            .map_or([f64::NAN; 2], |c| [c.typical.fitted, c.total.fitted]);
        if let Some(card) = &mut self.sheet.rejection {
            card.effect = Some(RejectionEffect {
                typical: [before[0], after[0]],
                total: [before[1], after[1]],
            });
        }
        effect.ground = None;
        Ok(progress(Stage::Curve, 2 * all as u64, 2 * all as u64, true))
    }

    /// The next bite of the comparison of the recorded channels.
    fn compare(&mut self, recording: &Recording, recipe: &Recipe) -> Progress {
        let cards = self.cards.get_or_insert_default();
        let comparing = self
            .comparing
            .get_or_insert_with(|| Comparing::new(recording, cards));
        if comparing.step(recording) {
            return self.fitted(false);
        }
        self.quality = self.comparing.take().and_then(Comparing::finish);
        cards::doubt(cards, self.quality.as_ref(), recipe);
        self.sheet.channels = cards.clone();
        self.sheet.quality = self.quality.as_ref().map(|q| q.card.clone());
        self.fitted(true)
    }

    /// The next bite of the next principal course.
    fn principal(&mut self) -> Result<Progress> {
        let (Some(ground), Some(prepared)) = (&self.ground, &self.prepared) else {
            return Err(lost());
        };
        let at = self.sheet.principal.len();
        let of = PRINCIPAL.min(ground.space.dimensions()) as u64;
        let all = prepared.samples.first().map_or(0, Vec::len);
        if self.course.len() != all {
            self.course = vec![0.0; all];
            self.course_done = 0;
        }
        let row: Vec<f64> = ground.space.whitening.row(at).iter().copied().collect();
        let end = all.min(self.course_done + (BITE / prepared.samples.len() as f64) as usize + 1);
        super::describing::add_projection(&mut self.course, prepared, &row, self.course_done, end);
        self.course_done = end;
        if end == all {
            let course = std::mem::take(&mut self.course);
            let card = cards::principal(&ground.space, self.basis.as_ref(), at, &row, &course);
            self.sheet.principal.push(card);
        }
        Ok(progress(
            Stage::Curve,
            at as u64,
            of,
            end == all && at as u64 + 1 == of,
        ))
    }

    /// The next surrogate of the parallel analysis.
    fn count_dimensions(&mut self, recipe: &Recipe) -> Result<Progress> {
        let (Some(prepared), Some(selection), Some(ground)) =
            (&self.prepared, &self.selection, &self.ground)
        else {
            return Err(lost());
        };
        let counting = self.counting.get_or_insert_with(|| {
            Counting::new(&prepared.samples, &selection.windows, recipe.evidence.seed)
        });
        let more = counting.step(&prepared.samples);
        let (done, of) = counting.progress(prepared.samples.len());
        if !more {
            let values = &ground.space.eigenvalues[..ground.space.rank];
            self.sheet.dimensions = Some(counting.card(values));
            self.counting = None;
            cards::guides(&mut self.sheet);
        }
        Ok(progress(Stage::Curve, done as u64, of as u64, !more))
    }

    fn push_ground(&mut self, recipe: &Recipe) -> Result<Progress> {
        let limit = limit(recipe);
        let all = self.covariances.packed.len();
        if self.ground.is_none() {
            let ground = Ground::new(&self.covariances, limit, vec![true; all]);
            if ground.space.dimensions() < 2 {
                return Err(Problem::new(
                    Kind::Contrast,
                    "the channels span fewer than two dimensions in these windows",
                    "use more channels, or longer windows",
                )
                .at("compression")
                .expected_found("a rank of at least 2", ground.space.dimensions()));
            }
            self.ground = Some(ground);
        }
        let (Some(ground), Some(prepared), Some(selection)) =
            (&mut self.ground, &self.prepared, &self.selection)
        else {
            return Err(lost());
        };
        let reader = reader(prepared, self.bands.as_ref(), recipe);
        let done = push_space(
            ground,
            &self.covariances,
            wants_fourth(recipe).then_some((&reader, &selection.windows[..])),
        );
        Ok(progress(Stage::Fitting, done as u64 / 2, all as u64, false))
    }

    /// C by the recipe's rule.
    fn choose_keep(&mut self, recipe: &Recipe) -> Result<Progress> {
        let all = self.covariances.packed.len() as u64;
        let method = self.method(recipe);
        if self.design.is_none() {
            let Some(selection) = &self.selection else {
                return Err(lost());
            };
            let fold = selection.folds(recipe.evidence.folds);
            let folds = fold.iter().max().map_or(0, |f| f + 1);
            self.design = Some(Design {
                paired: selection.paired,
                exchange: selection.exchange,
                signal: selection.sides(),
                trial: selection.windows.iter().map(|w| w.trial).collect(),
                fold,
                folds,
            });
        }
        let (Some(ground), Some(design)) = (&mut self.ground, &self.design) else {
            return Err(lost());
        };
        let dimensions = ground.space.dimensions();
        self.keep = match recipe.keep {
            Keep::Number(keep) => Some(keep.min(dimensions)),
            Keep::Word(KeepWord::Auto) => Some(dimensions.min(AUTO_LIMIT)),
            Keep::Word(KeepWord::Best) => {
                let grid = best_grid(dimensions);
                if let Some(c) = grid.iter().find(|c| !logs_ready(ground, **c, recipe)) {
                    push_logs(ground, *c, method.rho());
                    return Ok(progress(Stage::Fitting, all / 2, all, false));
                }
                Some(choose_keep(
                    ground,
                    &grid,
                    &self.covariances.weights,
                    &design.signal,
                    &method,
                ))
            }
        };
        Ok(progress(Stage::Fitting, all / 2, all, false))
    }

    fn solve(&mut self, recipe: &Recipe) -> Result<Progress> {
        let method = self.method(recipe);
        let (Some(ground), Some(design), Some(keep)) = (&self.ground, &self.design, self.keep)
        else {
            return Err(lost());
        };
        let labels = Labels {
            signal: &design.signal,
            train: &ground.train,
        };
        let ends = fit(
            ground.view(&self.covariances.weights, keep),
            labels,
            &method,
        )
        .ok_or_else(|| {
            Problem::new(
                Kind::Contrast,
                "the reference covariance cannot be inverted",
                "choose shrink \"auto\" or a number above 0, or keep fewer dimensions",
            )
            .at("total measure")
            .expected_found(
                "a positive definite covariance",
                format!("a singular one at C = {keep}, shrink {:?}", recipe.shrink),
            )
        })?;
        self.ends = Some(ends);
        self.portraits = Portraits::default();
        cards::solved(self, recipe);
        let all = self.covariances.packed.len() as u64;
        Ok(progress(Stage::Fitting, all, all, false))
    }

    /// Progress of the fitting stage once everything is fitted.
    fn fitted(&self, news: bool) -> Progress {
        let all = self.covariances.packed.len() as u64;
        progress(Stage::Fitting, all, all, news)
    }

    fn fold_progress(&self, f: usize, part: u64) -> Progress {
        let folds = self.design.as_ref().map_or(0, |d| d.folds) as u64;
        progress(Stage::HeldOut, 3 * f as u64 + part, 3 * folds, false)
    }

    fn push_fold_ground(&mut self, f: usize, recipe: &Recipe) -> Result<Progress> {
        let limit = limit(recipe);
        let (Some(design), Some(prepared), Some(selection)) =
            (&self.design, &self.prepared, &self.selection)
        else {
            return Err(lost());
        };
        if self.folds.len() <= f {
            let ground = Ground::new(&self.covariances, limit, design.train(f));
            if ground.space.dimensions() < 2 {
                return Err(flat_fold(f, ground.space.dimensions()));
            }
            self.folds.push(ground);
        }
        let reader = reader(prepared, self.bands.as_ref(), recipe);
        push_space(
            &mut self.folds[f],
            &self.covariances,
            wants_fourth(recipe).then_some((&reader, &selection.windows[..])),
        );
        Ok(self.fold_progress(f, 1))
    }

    /// Values of C whose logarithms a fold needs before its fit.
    fn grid_for(&self, fold: &Ground, keep: usize, recipe: &Recipe) -> Vec<usize> {
        match recipe.keep {
            Keep::Word(KeepWord::Best) => best_grid(fold.space.dimensions()),
            _ => vec![keep.min(fold.space.dimensions())],
        }
    }

    fn fit_fold(&mut self, f: usize, recipe: &Recipe) -> Result<Progress> {
        let method = self.method(recipe);
        let (Some(design), Some(keep)) = (&self.design, self.keep) else {
            return Err(lost());
        };
        let fold = &self.folds[f];
        let keep = match recipe.keep {
            Keep::Word(KeepWord::Best) => choose_keep(
                fold,
                &self.grid_for(fold, keep, recipe),
                &self.covariances.weights,
                &design.signal,
                &method,
            ),
            _ => keep.min(fold.space.dimensions()),
        };
        let fitted = fit_ground(
            fold,
            keep,
            &self.covariances,
            design,
            &method,
            self.sheet.leading,
        )
        .ok_or_else(|| singular_fold(f))?;
        self.fits.push(fitted);
        Ok(self.fold_progress(f, 3))
    }

    fn permute(&mut self, recipe: &Recipe) -> Result<Progress> {
        let method = self.method(recipe);
        let (Some(ground), Some(design), Some(keep)) = (&self.ground, &self.design, self.keep)
        else {
            return Err(lost());
        };
        let plan = *self
            .plan
            .get_or_insert_with(|| plan(design, recipe.evidence.permutations));
        let best = recipe.keep == Keep::Word(KeepWord::Best);
        let grid = if best {
            best_grid(ground.space.dimensions())
        } else {
            Vec::new()
        };
        let levelled = design.exchange == Exchange::Level;
        if levelled {
            let needed = if best { grid.clone() } else { vec![keep] };
            if !self.push_level(recipe, &needed)? {
                let of = plan.count as u64;
                return Ok(progress(Stage::Permuting, 0, of, false));
            }
        }
        let (Some(ground), Some(design)) = (&self.ground, &self.design) else {
            return Err(lost());
        };
        let (ground, weights) = match &self.level {
            Some(level) => (&level.ground, &level.covariances.weights),
            None => (ground, &self.covariances.weights),
        };
        let averaged = ground.space.courses.iter().map(Vec::len).sum::<usize>();
        let bite = bites(
            permutation_cost(keep, weights.len(), &grid, &method)
                + averaged as f64 * (1.0 + method.folds as f64),
        );
        let first = self.null.len();
        for i in first..plan.count.min(first + bite) {
            let signal = arrangement(design, plan, best, recipe.evidence.seed, i);
            let c = if best {
                choose_keep(ground, &grid, weights, &signal, &method)
            } else {
                keep
            };
            let labels = Labels {
                signal: &signal,
                train: &ground.train,
            };
            let view = ground.view(weights, c);
            let found = extremes(view, labels, &method).unwrap_or((f64::INFINITY, 0.0));
            let middle = if levelled {
                centre(view, labels, method.measure)
            } else {
                1.0
            };
            self.null.push((found.0 / middle, found.1 / middle));
        }
        let finished = self.null.len() >= plan.count;
        if finished {
            cards::permuted(self, recipe);
        }
        Ok(progress(
            Stage::Permuting,
            self.null.len() as u64,
            plan.count as u64,
            finished,
        ))
    }

    /// What the arrangements are compared with: the fit as it is, or, where both sides are brought to one level, the fit there about
    /// its average direction, and the ratio of that average direction.
    pub(super) fn observed(&self, recipe: &Recipe) -> Option<(Ends, f64)> {
        let (Some(level), Some(design)) = (&self.level, &self.design) else {
            return Some((self.ends.clone()?, 1.0));
        };
        let labels = Labels {
            signal: &design.signal,
            train: &level.ground.train,
        };
        let method = self.method(recipe);
        let view = level.ground.view(&level.covariances.weights, self.keep?);
        let mut ends = fit(view, labels, &method)?;
        let middle = centre(view, labels, method.measure);
        for direction in ends.stronger.iter_mut().chain(&mut ends.weaker) {
            direction.statistic /= middle;
        }
        Some((ends, middle * level.ratio))
    }

    /// A bite of the levelled ground; whether it is whole.
    fn push_level(&mut self, recipe: &Recipe, grid: &[usize]) -> Result<bool> {
        let rho = self.method(recipe).rho();
        let (Some(prepared), Some(selection)) = (&self.prepared, &self.selection) else {
            return Err(lost());
        };
        let all = selection.windows.len();
        let level = self.level.get_or_insert_with(|| {
            let mut covariances = self.covariances.clone();
            let sides = selection.sides();
            let ratio = match recipe.measure {
                Measure::Typical => covariances.typical_level(&sides),
                Measure::Total => covariances.total_level(&sides),
            };
            covariances.scale_signal(&sides, ratio);
            let ground = Ground::new(&covariances, limit(recipe), vec![true; all]);
            Level {
                covariances,
                ground,
                ratio,
            }
        });
        let fourth = wants_fourth(recipe);
        let whole = level.ground.space.covariances.len() == all
            && (!fourth || level.ground.fourth.len() == all);
        if !whole {
            let reader = reader(prepared, self.bands.as_ref(), recipe);
            push_space(
                &mut level.ground,
                &level.covariances,
                fourth.then_some((&reader, &selection.windows[..])),
            );
            return Ok(false);
        }
        let missing = grid
            .iter()
            .find(|c| !logs_ready(&level.ground, **c, recipe));
        if let Some(c) = missing {
            push_logs(&mut level.ground, *c, rho);
        }
        Ok(missing.is_none())
    }

    /// One part (the whole, or one fold) at one value of C, in bites.
    fn curve(&mut self, recipe: &Recipe) -> Result<Progress> {
        let method = Method {
            components: 1,
            ..self.method(recipe)
        };
        let (Some(ground), Some(design), Some(keep)) = (&mut self.ground, &self.design, self.keep)
        else {
            return Err(lost());
        };
        if self.curve.end != self.sheet.leading {
            let end = self.sheet.leading;
            self.curve = CurveWork {
                end,
                ..CurveWork::default()
            };
        }
        let grid = curve_grid(ground.space.dimensions(), keep);
        let parts = self.folds.len() + 1;
        let of = (grid.len() * parts) as u64;
        let points = &mut self.curve.points;
        let Some(at) = grid.iter().position(|c| !points.contains_key(c)) else {
            self.sheet.curve = Some(curve_of(&grid, points));
            self.curve.shown = true;
            cards::guides(&mut self.sheet);
            return Ok(progress(Stage::Curve, of, of, true));
        };
        let c = grid[at];
        let part = self.curve.part;
        let step = (at * parts + part) as u64;
        let target = if part == 0 {
            ground
        } else {
            &mut self.folds[part - 1]
        };
        if !logs_ready(target, c, recipe) {
            push_logs(target, c, method.rho());
            return Ok(progress(Stage::Curve, step, of, false));
        }
        let labels = Labels {
            signal: &design.signal,
            train: &target.train,
        };
        let ends = fit(target.view(&self.covariances.weights, c), labels, &method);
        let Some(u) = ends
            .as_ref()
            .and_then(|e| Some(&cards::leading_direction(e, self.sheet.leading)?.u))
        else {
            // The reference is singular at this C: the curve has no value there.
            self.curve.points.insert(c, None);
            self.curve.part = 0;
            return Ok(progress(Stage::Curve, step + 1, of, false));
        };
        if part == 0 {
            let v = variances(&target.space, u, &design.signal);
            let log = match recipe.measure {
                Measure::Typical => log_typical(&v, design),
                Measure::Total => log_total(&v, &self.covariances.weights, design, |_| true),
            };
            self.curve.fitted = log.exp();
            self.curve.scores = vec![f64::NAN; v.len()];
        } else {
            score_into(
                &mut self.curve.scores,
                target,
                &self.covariances.weights,
                design,
                part - 1,
                u,
            );
        }
        let wanted =
            Some(c.min(target.space.dimensions())) == Some(keep.min(target.space.dimensions()));
        if !wanted && recipe.keep != Keep::Word(KeepWord::Best) {
            target.logs.remove(&c.min(target.space.dimensions()));
        }
        self.curve.part += 1;
        if self.curve.part > self.folds.len() {
            let (mean, error) = mean_and_error(
                &self.curve.scores,
                &self.covariances.weights,
                design,
                recipe.measure,
            );
            let point = [self.curve.fitted, mean.exp(), error];
            let whole = point.iter().all(|x| x.is_finite());
            self.curve.points.insert(c, whole.then_some(point));
            self.curve.part = 0;
        }
        Ok(progress(Stage::Curve, step + 1, of, false))
    }

    pub(super) fn series(&self) -> Option<Series> {
        let prepared = self.prepared.as_ref()?;
        let components = self.sheet.stronger.iter().chain(&self.sheet.weaker);
        let all = prepared.samples.first().map_or(0, Vec::len);
        let samples: Vec<Vec<f64>> = components
            .map(|c| {
                let mut out = vec![0.0; all];
                let filter = inner(&self.basis, &c.filter);
                super::describing::add_projection(&mut out, prepared, &filter, 0, all);
                out
            })
            .collect();
        if samples.is_empty() {
            return None;
        }
        let names = (1..=self.sheet.stronger.len())
            .map(|i| format!("stronger {i}"))
            .chain((1..=self.sheet.weaker.len()).map(|i| format!("weaker {i}")))
            .collect();
        Some(Series {
            names,
            samples,
            rate_hz: prepared.rate_hz,
            stretches: prepared.stretches.clone(),
        })
    }
}

fn progress(stage: Stage, done: u64, of: u64, news: bool) -> Progress {
    Progress {
        stage,
        done,
        of,
        news,
    }
}

/// A filter of the sheet for the samples that `prepared` holds.
pub(super) fn inner<'a>(basis: &Option<Basis>, filter: &'a [f64]) -> Cow<'a, [f64]> {
    match basis {
        Some(basis) => Cow::Owned(basis.lower(filter)),
        None => Cow::Borrowed(filter),
    }
}

/// Prepared channels, as recorded where nothing was changed.
struct Pixels<'a> {
    prepared: &'a Prepared,
    recording: &'a Recording,
}

impl Channels for Pixels<'_> {
    fn count(&self) -> usize {
        self.prepared.channels.len()
    }
    fn samples(&self, channel: usize) -> &[f32] {
        self.prepared.of_channel(self.recording, channel)
    }
}

fn not_numbers() -> Problem {
    Problem::new(
        Kind::Contrast,
        "the windows hold values that are not numbers",
        "leave the channel out that holds them",
    )
}

/// A state that the order of tasks rules out; said rather than panicked about.
pub(super) fn lost() -> Problem {
    Problem::new(
        Kind::Contrast,
        "a step began before what it needs",
        "open the recording again; this is a fault of the program",
    )
}

/// Refuses work whose covariances would not fit: every window's, as they are and whitened for the whole and for each fold.
fn afford(channels: usize, windows: usize, recipe: &Recipe) -> Result<()> {
    const MOST_BYTES: f64 = if cfg!(target_pointer_width = "32") {
        1.5e9
    } else {
        16e9
    };
    let bytes = |n: usize| windows as f64 * 4.0 * n as f64 * (n as f64 + 1.0);
    let whitened = bytes(channels.min(limit(recipe)));
    // The logarithms at the C in force double what is whitened.
    let need = bytes(channels) + 2.0 * whitened * (recipe.evidence.folds as f64 + 1.0);
    if need <= MOST_BYTES {
        return Ok(());
    }
    Err(Problem::new(
        Kind::TooLarge,
        "the covariances of these windows do not fit into the memory",
        "use fewer channels, fewer events or fewer folds",
    )
    .at(format!(
        "{windows} windows of {channels} channels, {} folds",
        recipe.evidence.folds
    ))
    .expected_found(
        format!("at most {:.1} GB", MOST_BYTES / 1e9),
        format!("{:.1} GB", need / 1e9),
    ))
}

fn flat_fold(f: usize, dimensions: usize) -> Problem {
    Problem::new(
        Kind::Contrast,
        "without the trials of one fold the channels span fewer than two dimensions",
        "leave out channels that are flat for much of the recording, or use fewer folds",
    )
    .at(format!("fold {}", f + 1))
    .expected_found("a rank of at least 2", dimensions)
}

fn singular_fold(f: usize) -> Problem {
    Problem::new(
        Kind::Contrast,
        "the reference covariance of a fold cannot be inverted",
        "choose shrink \"auto\" or a number above 0, or keep fewer dimensions",
    )
    .at(format!("fold {}", f + 1))
    .expected_found("a positive definite covariance", "a singular one")
}

/// What the windows of both sides are read from.
fn reader<'a>(prepared: &'a Prepared, bands: Option<&'a Banding>, recipe: &Recipe) -> Reader<'a> {
    let plain = &prepared.samples[..];
    let lag = lag_samples(&recipe.contrast, prepared.rate_hz);
    match bands {
        None => Reader {
            signal: plain,
            reference: plain,
            lag,
        },
        Some(bands) => Reader {
            signal: &bands.signal,
            reference: if bands.reference.is_empty() {
                plain
            } else {
                &bands.reference
            },
            lag,
        },
    }
}

/// A bite of covariances.
fn push_windows(into: &mut Covariances, reader: &Reader<'_>, windows: &[Window], courses: bool) {
    let m = reader.channels() as f64;
    let first = into.packed.len();
    let Some(next) = windows.get(first) else {
        return;
    };
    let bite = bites(m * m * next.count as f64);
    for window in windows.iter().skip(first).take(bite) {
        into.push(reader, window, courses);
    }
}

/// Whether the signal side is scaled to the average channel.
pub(super) fn levelled(recipe: &Recipe) -> bool {
    matches!(
        recipe.contrast,
        Contrast::Band {
            reference: BandReference::Broadband,
            ..
        }
    )
}

/// Largest mean square of a channel.
fn largest_mean_square(samples: &[Vec<f32>]) -> f64 {
    let of = |channel: &Vec<f32>| {
        let sum: f64 = channel.iter().map(|x| f64::from(*x) * f64::from(*x)).sum();
        sum / channel.len().max(1) as f64
    };
    samples.iter().map(of).fold(0.0, f64::max)
}

fn prepared_channels(work: &Work) -> usize {
    work.prepared.as_ref().map_or(0, |p| p.samples.len())
}

fn locked_share(recipe: &Recipe) -> Option<f64> {
    recipe.hold_back.map(|h| h.last)
}

fn wants_fourth(recipe: &Recipe) -> bool {
    recipe.measure == Measure::Total && recipe.shrink == Shrink::Word(ShrinkWord::LedoitWolf)
}

/// Whether the logarithms for C are there (the total measure needs none).
fn logs_ready(ground: &Ground, keep: usize, recipe: &Recipe) -> bool {
    recipe.measure == Measure::Total
        || ground
            .logs
            .get(&keep.min(ground.space.dimensions()))
            .is_some_and(|l| l.len() == ground.space.covariances.len())
}

fn push_logs(ground: &mut Ground, keep: usize, rho: f64) -> u64 {
    let keep = keep.min(ground.space.dimensions());
    for _ in 0..bites(log_cost(keep)) {
        if !ground.push_log(keep, rho) {
            break;
        }
    }
    ground.logs.get(&keep).map_or(0, Vec::len) as u64
}

/// Whitens the next windows; also their fourth powers, where asked for.
fn push_space(
    ground: &mut Ground,
    all: &Covariances,
    fourth: Option<(&Reader<'_>, &[Window])>,
) -> usize {
    let (m, r) = (all.channels as f64, ground.space.dimensions() as f64);
    for _ in 0..bites(2.0 * m * r * (m + r)) {
        let more = ground.space.push_next(all);
        let also = fourth.is_some_and(|(reader, windows)| ground.push_fourth(reader, windows));
        if !more && !also {
            break;
        }
    }
    ground.space.covariances.len()
}

fn permutation_cost(keep: usize, windows: usize, grid: &[usize], method: &Method) -> f64 {
    let one = |c: usize| windows as f64 * (c * c) as f64 + 6.0 * (c as f64).powi(3) + 1000.0;
    let fits = if method.measure == Measure::Total {
        4.0 + 24.0 * method.folds as f64
    } else {
        1.0
    };
    fits * (one(keep) + method.folds as f64 * grid.iter().map(|c| 2.0 * one(*c)).sum::<f64>())
}

/// About 18 values of C from 2 to the most, denser below, with the one in force.
fn curve_grid(most: usize, keep: usize) -> Vec<usize> {
    let mut grid: Vec<usize> = if most <= 18 {
        (2..=most).collect()
    } else {
        (0..18)
            .map(|i| (2.0 * (most as f64 / 2.0).powf(f64::from(i) / 17.0)).round() as usize)
            .collect()
    };
    grid.push(keep.min(most));
    grid.sort_unstable();
    grid.dedup();
    grid
}

/// The curve over those values of C that have one.
fn curve_of(grid: &[usize], points: &BTreeMap<usize, Option<[f64; 3]>>) -> KeepCurve {
    let done: Vec<(usize, [f64; 3])> = grid
        .iter()
        .filter_map(|c| Some((*c, (*points.get(c)?)?)))
        .collect();
    let part = |i: usize| done.iter().map(|(_, p)| p[i]).collect();
    KeepCurve {
        keep: done.iter().map(|(c, _)| *c).collect(),
        fitted: part(0),
        held_out: part(1),
        log_se: part(2),
    }
}

/// The values of C that `keep: "best"` chooses from.
fn best_grid(most: usize) -> Vec<usize> {
    let most = most.min(BEST_LIMIT);
    let mut grid: Vec<usize> = (0..8)
        .map(|i| (2.0 * (most as f64 / 2.0).powf(f64::from(i) / 7.0)).round() as usize)
        .collect();
    grid.dedup();
    grid
}
