//! Many channels (the pixels of a movie): a basis of a few hundred dimensions, found without ever making a matrix of channels by channels.
//!
//! With A = [X_1 … X_K]/√W the samples of all windows, each about its window's mean, W = Σ(n_k − 1) and P = A Aᵀ the pooled covariance, Q is an
//! orthonormal basis (dimensions × channels, by rows) of
//!
//! * the range of A itself, where the windows hold no more than [`MOST_FRAMES`] samples: from the eigenvectors of the frame-side
//!   Gram matrix AᵀA, which has the eigenvalues of P;
//! * the range of (A Aᵀ)^q A Ω otherwise, Ω normal random numbers from a fixed seed, q = [`ROUNDS`], made orthonormal between rounds
//!   (Halko, Martinsson & Tropp 2011, *SIAM Review* 53:217–288, algorithms 4.3 and 4.4).
//!
//! Everything after works on y = Q x. Filters and patterns go back as w = Qᵀ w_y and a = Qᵀ a_y; for a filter inside the basis P w lies
//! in the basis as far as the basis holds P's leading dimensions, which the bound says.
//!
//! # Labels
//! Q is blind to the labels: it knows which samples lie in a window and not which side the window is on. It is made once, from the windows of
//! all folds; inside it every fold chooses its own C dimensions from its training windows.
//!
//! # Bound
//! Ten more random vectors ω take part in every round and in no basis. With r = 10 of them,
//! ‖(I − QᵀQ)A‖ ≤ (10 √(2/π) max ‖(I − QᵀQ)(A Aᵀ)^q A ω‖)^(1/(2q+1)) but for a probability of 10^−r (eq. 4.3 and proposition 8.6 there). Its square is the most
//! variance that any direction outside the basis can have.
//!
//! # Orthonormal rows
//! By the eigenvectors of the rows' Gram matrix, scaled to a unit diagonal, twice (Stathopoulos & Wu 2002, *SIAM J. Sci. Comput.* 23:2165–2182).
use super::linalg::eigh;
use super::windows::Window;
use nalgebra::DMatrix;
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

/// Largest number of window samples that the frame-side Gram matrix is made of.
pub const MOST_FRAMES: usize = 1024;
/// Power iterations q.
pub const ROUNDS: usize = 2;
/// Dimensions beyond the ones that may be kept.
pub const SPARE: usize = 50;
/// Random vectors that only measure what is left.
const PROBES: usize = 10;
const SEED: u64 = 0x7ea5e1;
/// Multiplications of one bite.
const BITE: f64 = 4e7;

/// A basis, and what is known of what lies outside it.
#[derive(Debug, Clone)]
pub struct Basis {
    /// Q, `dimensions × channels`.
    pub rows: DMatrix<f64>,
    /// What was subtracted from every channel before projecting.
    pub means: Vec<f32>,
    /// Variance of every channel in every window: `windows × channels`.
    pub singles: Vec<Vec<f32>>,
    /// tr P: the variance of all channels together.
    pub total: f64,
    /// Most variance that a direction outside the basis can have.
    pub outside: f64,
    /// Found from the frames' Gram matrix: exact but for rounding.
    pub exact: bool,
}

impl Basis {
    /// Qᵀ v: from the basis to the channels.
    pub fn lift(&self, v: &[f64]) -> Vec<f64> {
        let column = |c: usize| {
            self.rows
                .column(c)
                .iter()
                .zip(v)
                .map(|(q, v)| q * v)
                .sum::<f64>()
        };
        (0..self.rows.ncols()).map(column).collect()
    }

    /// Q v: from the channels to the basis.
    pub fn lower(&self, v: &[f64]) -> Vec<f64> {
        let mut out = vec![0.0; self.rows.nrows()];
        for (column, v) in self.rows.column_iter().zip(v) {
            for (o, q) in out.iter_mut().zip(column.iter()) {
                *o += q * v;
            }
        }
        out
    }
}

/// The samples of many channels, wherever they are kept.
pub trait Channels {
    /// How many.
    fn count(&self) -> usize;
    /// All samples of one.
    fn samples(&self, channel: usize) -> &[f32];
}

/// What is being done.
#[derive(Debug)]
enum Phase {
    /// Variances and means of every channel in the windows.
    Measure,
    /// AᵀA, by channels.
    Gram,
    /// Its eigenvectors.
    Solve,
    /// Rows of Q from the eigenvectors, by channels.
    Spread,
    /// A Ω, or A Aᵀ times the rows, by frames.
    Apply {
        round: usize,
    },
    /// Rows' Gram matrix, by channels; then the transform.
    Overlap {
        round: usize,
        pass: usize,
    },
    /// The transform applied, by channels.
    Turn {
        round: usize,
        pass: usize,
    },
    /// Y = Q X, by frames.
    Project,
    Done,
}

/// A basis in the making, in bites.
#[derive(Debug)]
pub struct Finding {
    windows: Vec<(usize, usize)>,
    weight: f64,
    wanted: usize,
    samples: usize,
    phase: Phase,
    /// Channel, or frame within `window`, at which the phase stands.
    at: usize,
    window: usize,
    means: Vec<f64>,
    singles: Vec<Vec<f32>>,
    grand: Vec<f64>,
    total: f64,
    gram: DMatrix<f64>,
    values: Vec<f64>,
    turn: DMatrix<f64>,
    /// Rows in work, probes last.
    rows: DMatrix<f64>,
    next: DMatrix<f64>,
    rng: ChaCha8Rng,
    outside: f64,
    exact: bool,
    reduced: Vec<Vec<f32>>,
    done: f64,
    all: f64,
}

impl Finding {
    /// Begins for at most `wanted` dimensions from these windows of `channels` channels of `samples` samples.
    pub fn new(channels: usize, samples: usize, windows: &[Window], wanted: usize) -> Self {
        let windows: Vec<(usize, usize)> = windows.iter().map(|w| (w.first, w.count)).collect();
        let frames: usize = windows.iter().map(|w| w.1).sum();
        let weight: usize = windows.iter().map(|w| w.1 - 1).sum();
        let wanted = wanted.min(channels).min(weight.max(1));
        let exact = frames <= MOST_FRAMES && frames <= channels;
        let (m, n, l) = (channels as f64, frames as f64, wanted as f64);
        let product = m * n * (l + PROBES as f64);
        let find = if exact {
            m * n * n + n.powi(3) * 4.0 + m * n * l + 4.0 * m * l * l
        } else {
            product * (1.0 + 2.0 * ROUNDS as f64) + (ROUNDS as f64 + 1.0) * 4.0 * m * l * l
        };
        Finding {
            windows,
            weight: weight.max(1) as f64,
            wanted,
            samples,
            phase: Phase::Measure,
            at: 0,
            window: 0,
            means: Vec::new(),
            singles: Vec::new(),
            grand: vec![0.0; channels],
            total: 0.0,
            gram: DMatrix::zeros(0, 0),
            values: Vec::new(),
            turn: DMatrix::zeros(0, 0),
            rows: DMatrix::zeros(0, channels),
            next: DMatrix::zeros(0, channels),
            rng: ChaCha8Rng::seed_from_u64(SEED),
            outside: 0.0,
            exact,
            reduced: Vec::new(),
            done: 0.0,
            all: find + m * samples as f64 * l,
        }
    }

    /// Whether everything is done.
    pub fn finished(&self) -> bool {
        matches!(self.phase, Phase::Done)
    }

    /// Thousandths done, and 1000.
    pub fn progress(&self) -> (u64, u64) {
        let share = if self.finished() {
            1.0
        } else {
            (self.done / self.all).min(0.999)
        };
        ((share * 1000.0) as u64, 1000)
    }

    /// The basis and the projected samples (`dimensions × samples`), once finished.
    pub fn finish(self) -> (Basis, Vec<Vec<f32>>) {
        let basis = Basis {
            rows: self.rows,
            means: self.grand.iter().map(|x| *x as f32).collect(),
            singles: self.singles,
            total: self.total,
            outside: self.outside,
            exact: self.exact,
        };
        (basis, self.reduced)
    }

    /// The next bite.
    pub fn step(&mut self, channels: &dyn Channels) {
        match self.phase {
            Phase::Measure => self.measure(channels),
            Phase::Gram => self.gram(channels),
            Phase::Solve => self.solve(),
            Phase::Spread => self.spread(channels),
            Phase::Apply { round } => self.apply(channels, round),
            Phase::Overlap { round, pass } => self.overlap(round, pass),
            Phase::Turn { round, pass } => self.turn(round, pass),
            Phase::Project => self.project(channels),
            Phase::Done => {}
        }
    }

    fn enter(&mut self, phase: Phase) {
        self.phase = phase;
        self.at = 0;
        self.window = 0;
    }

    fn frames(&self) -> usize {
        self.windows.iter().map(|w| w.1).sum()
    }

    /// One window: mean and variance of every channel.
    fn measure(&mut self, channels: &dyn Channels) {
        let Some(&(first, count)) = self.windows.get(self.window) else {
            return self.start();
        };
        let weight = (count - 1) as f64;
        let mut single = Vec::with_capacity(channels.count());
        for (c, grand) in self.grand.iter_mut().enumerate() {
            let part = &channels.samples(c)[first..first + count];
            let mean = mean(part);
            let square: f64 = part.iter().map(|x| (f64::from(*x) - mean).powi(2)).sum();
            single.push((square / weight.max(1.0)) as f32);
            self.total += square / self.weight;
            *grand += mean / self.windows.len() as f64;
        }
        self.singles.push(single);
        self.window += 1;
    }

    fn start(&mut self) {
        let channels = self.grand.len();
        if self.exact {
            let n = self.frames();
            self.gram = DMatrix::zeros(n, n);
            self.enter(Phase::Gram);
        } else {
            let rows = self.wanted + PROBES;
            self.next = DMatrix::zeros(rows, channels);
            self.enter(Phase::Apply { round: 0 });
        }
    }

    /// `samples × channels from..to`: all windows one below the other, each about its mean, over √W.
    fn tall(&self, channels: &dyn Channels, from: usize, to: usize) -> DMatrix<f64> {
        let scale = 1.0 / self.weight.sqrt();
        let mut out = Vec::with_capacity((to - from) * self.frames());
        for c in from..to {
            for &(first, count) in &self.windows {
                let part = &channels.samples(c)[first..first + count];
                let mean = mean(part);
                out.extend(part.iter().map(|x| (f64::from(*x) - mean) * scale));
            }
        }
        DMatrix::from_vec(self.frames(), to - from, out)
    }

    fn gram(&mut self, channels: &dyn Channels) {
        let n = self.frames();
        let to = (self.at + block((n * n) as f64)).min(channels.count());
        let tall = self.tall(channels, self.at, to);
        self.gram.gemm(1.0, &tall, &tall.transpose(), 1.0);
        self.done += (to - self.at) as f64 * (n * n) as f64;
        self.at = to;
        if to == channels.count() {
            self.enter(Phase::Solve);
        }
    }

    fn solve(&mut self) {
        let n = self.frames();
        let (values, vectors) = eigh(&self.gram);
        let floor = values.first().copied().unwrap_or(0.0) * n as f64 * f64::EPSILON;
        let kept = values
            .iter()
            .take(self.wanted)
            .take_while(|e| **e > floor)
            .count();
        // Rows of Q are vᵀ Aᵀ/√e.
        self.turn = DMatrix::from_fn(kept, n, |i, t| vectors[(t, i)] / values[i].sqrt());
        self.outside = values.get(kept).copied().unwrap_or(0.0).max(0.0);
        self.values = values;
        self.gram = DMatrix::zeros(0, 0);
        self.rows = DMatrix::zeros(kept, self.grand.len());
        self.done += 4.0 * (n as f64).powi(3);
        self.enter(Phase::Spread);
    }

    fn spread(&mut self, channels: &dyn Channels) {
        let to = (self.at + block(self.turn.len() as f64)).min(channels.count());
        let tall = self.tall(channels, self.at, to);
        let part = &self.turn * tall;
        self.rows
            .columns_mut(self.at, to - self.at)
            .copy_from(&part);
        self.done += (to - self.at) as f64 * self.turn.len() as f64;
        self.at = to;
        if to == channels.count() {
            self.enter(Phase::Overlap {
                round: ROUNDS,
                pass: 0,
            });
        }
    }

    /// Some frames of one window: next += (rows · D) Dᵀ, or Ω Dᵀ in round 0.
    fn apply(&mut self, channels: &dyn Channels, round: usize) {
        let Some(&(first, count)) = self.windows.get(self.window) else {
            let next = DMatrix::zeros(0, self.grand.len());
            self.rows = std::mem::replace(&mut self.next, next);
            return self.enter(Phase::Overlap { round, pass: 0 });
        };
        if self.at == 0 {
            self.means = (0..channels.count())
                .map(|c| mean(&channels.samples(c)[first..first + count]))
                .collect();
        }
        let m = channels.count();
        let frames = block((m * self.next.nrows()) as f64).min(count - self.at);
        let from = first + self.at;
        let scale = 1.0 / self.weight.sqrt();
        let mut flat = Vec::with_capacity(m * frames);
        for (c, mean) in self.means.iter().enumerate() {
            let part = &channels.samples(c)[from..from + frames];
            flat.extend(part.iter().map(|x| (f64::from(*x) - mean) * scale));
        }
        // `frames × channels`.
        let panel = DMatrix::from_vec(frames, m, flat);
        let weights = if round == 0 {
            let rng = &mut self.rng;
            DMatrix::from_fn(self.next.nrows(), frames, |_, _| StandardNormal.sample(rng))
        } else {
            &self.rows * panel.transpose()
        };
        self.next.gemm(1.0, &weights, &panel, 1.0);
        let product = (m * frames * self.next.nrows()) as f64;
        self.done += if round == 0 { product } else { 2.0 * product };
        self.at += frames;
        if self.at == count {
            self.at = 0;
            self.window += 1;
        }
    }

    /// Rows that belong to the basis.
    fn own(&self) -> usize {
        if self.exact {
            self.rows.nrows()
        } else {
            self.rows.nrows() - PROBES
        }
    }

    fn overlap(&mut self, round: usize, pass: usize) {
        let own = self.own();
        if self.at == 0 {
            self.gram = DMatrix::zeros(own, own);
        }
        let m = self.rows.ncols();
        let to = (self.at + block((own * own) as f64)).min(m);
        let part = self.rows.view((0, self.at), (own, to - self.at));
        self.gram.gemm(1.0, &part, &part.transpose(), 1.0);
        self.done += ((to - self.at) * own * own) as f64;
        self.at = to;
        if to < m {
            return;
        }
        let size: Vec<f64> = (0..own)
            .map(|i| self.gram[(i, i)].sqrt().max(f64::MIN_POSITIVE))
            .collect();
        let even = DMatrix::from_fn(own, own, |i, j| self.gram[(i, j)] / (size[i] * size[j]));
        let (values, vectors) = eigh(&even);
        let floor = values.first().copied().unwrap_or(0.0) * own as f64 * f64::EPSILON;
        let kept = values.iter().take_while(|e| **e > floor).count();
        self.turn = DMatrix::from_fn(kept, own, |i, j| {
            vectors[(j, i)] / (values[i].sqrt() * size[j])
        });
        self.enter(Phase::Turn { round, pass });
    }

    fn turn(&mut self, round: usize, pass: usize) {
        let (own, kept, m) = (self.own(), self.turn.nrows(), self.rows.ncols());
        if self.at == 0 {
            self.next = DMatrix::zeros(kept + self.rows.nrows() - own, m);
        }
        let to = (self.at + block((own * kept) as f64)).min(m);
        let part = &self.turn * self.rows.view((0, self.at), (own, to - self.at));
        self.next
            .view_mut((0, self.at), (kept, to - self.at))
            .copy_from(&part);
        let probes = self.rows.nrows() - own;
        let rest = self
            .rows
            .view((own, self.at), (probes, to - self.at))
            .into_owned();
        self.next
            .view_mut((kept, self.at), (probes, to - self.at))
            .copy_from(&rest);
        self.done += ((to - self.at) * own * kept) as f64;
        self.at = to;
        if to < m {
            return;
        }
        self.rows = std::mem::replace(&mut self.next, DMatrix::zeros(0, m));
        if pass == 0 {
            self.enter(Phase::Overlap { round, pass: 1 });
        } else if round < ROUNDS {
            self.next = DMatrix::zeros(self.rows.nrows(), m);
            self.enter(Phase::Apply { round: round + 1 });
        } else {
            self.bound();
            self.reduced = vec![Vec::with_capacity(self.samples); self.rows.nrows()];
            self.enter(Phase::Project);
        }
    }

    /// The bound from the probes, which then leave.
    fn bound(&mut self) {
        if self.exact {
            return;
        }
        let own = self.own();
        let basis = self.rows.rows(0, own).into_owned();
        let probes = self.rows.rows(own, PROBES).into_owned();
        let inside = &probes * basis.transpose();
        let rest = probes - inside * &basis;
        let largest = rest.row_iter().map(|r| r.norm()).fold(0.0, f64::max);
        let factor = 10.0 * std::f64::consts::FRAC_2_PI.sqrt();
        let power = 1.0 / (2.0 * ROUNDS as f64 + 1.0);
        self.outside = (factor * largest).powf(power).powi(2);
        self.rows = basis;
    }

    fn project(&mut self, channels: &dyn Channels) {
        let m = channels.count();
        let frames = block((m * self.rows.nrows()) as f64)
            .max(16)
            .min(self.samples - self.at);
        let mut flat = Vec::with_capacity(m * frames);
        for (c, mean) in self.grand.iter().enumerate() {
            let part = &channels.samples(c)[self.at..self.at + frames];
            flat.extend(part.iter().map(|x| f64::from(*x) - mean));
        }
        let panel = DMatrix::from_vec(frames, m, flat).transpose();
        let y = &self.rows * panel;
        for (out, row) in self.reduced.iter_mut().zip(y.row_iter()) {
            out.extend(row.iter().map(|x| *x as f32));
        }
        self.done += (m * frames * self.rows.nrows()) as f64;
        self.at += frames;
        if self.at == self.samples {
            self.enter(Phase::Done);
        }
    }
}

fn mean(part: &[f32]) -> f64 {
    part.iter().map(|x| f64::from(*x)).sum::<f64>() / part.len().max(1) as f64
}

/// Columns (or frames) of this many multiplications each in one bite.
fn block(each: f64) -> usize {
    (BITE / each.max(1.0)).clamp(1.0, 4096.0) as usize
}
