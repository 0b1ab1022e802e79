//! One note, or one stretch of a long one, from samples to figures.

use core::f64::consts::TAU;

use super::baseband::Baseband;
use super::damped::Times;
use super::lines::LongSpectrum;
use super::path::{self, PathPoint};
use super::rows::{Row, Rows, reach};
use crate::convert::{index, nearest_index};
use crate::history::{History, Span};
use crate::refine::Tone;
use crate::stiff::{self, CENTS_PER_NEPER, Point, StiffFit, partial_hz};

/// Block of the slow signals, in seconds.
const BLOCK_S: f64 = 0.005;
/// Longest stretch measured at once, in seconds.
pub(crate) const STRETCH_S: f64 = 6.0;
/// Partials modelled beyond those asked for, so that the last one is not disturbed.
pub(crate) const SPARE: usize = 3;
/// Nearest to the Nyquist frequency at which a partial can be told from its own image, in resolutions.
const CLEAR_OF_IMAGE: f64 = 4.0;

/// Partials by which it is decided whether the pitch moves.
const STRONGEST: usize = 8;
/// A moving pitch must leave less of the strongest partials than a held one by this much, in nepers of power each on
/// average: the pitch of the instants may waver where the tone does not.
const BENT_LEAVES_LESS: f64 = 0.1;

/// What the instants of the note said of one partial.
#[derive(Debug, Clone, Copy, Default)]
struct Seen {
    /// Weight, and weighted logarithmic distance from the harmonic series.
    weight: f64,
    sum: f64,
    /// Weighted square of that distance.
    square: f64,
    /// Sum of squared amplitudes.
    power: f64,
    count: usize,
}

/// The measurement of notes: owns all its memory, some of it large.
#[derive(Debug)]
pub(crate) struct Meter {
    sample_rate_hz: f64,
    partials: usize,
    /// Longest stretch, in samples.
    longest: usize,
    /// Duration of the current one.
    duration_s: f64,
    baseband: Baseband,
    /// Lines of the stretch.
    pub(crate) long: LongSpectrum,
    /// Partials of the stretch.
    pub(crate) rows: Rows,
    path: Vec<PathPoint>,
    seen: Vec<Seen>,
    bend: Vec<f64>,
    steps: Vec<f64>,
    points: Vec<Point>,
    /// Half the range of the pitch over the stretch, as a natural logarithm; 0 where it holds.
    pub(crate) sweep: f64,
    /// Standard deviation of the instants' pitch, as a natural logarithm.
    spread: f64,
}

impl Meter {
    /// Room for the longest stretch.
    pub(crate) fn new(sample_rate_hz: f64, partials: usize, hop: usize) -> Self {
        let block = nearest_index(BLOCK_S * sample_rate_hz).max(8);
        let longest = nearest_index(STRETCH_S * sample_rate_hz) + 4 * hop;
        let (rows, blocks) = (partials + SPARE, longest / block);
        Self {
            sample_rate_hz,
            partials,
            longest,
            duration_s: 0.0,
            baseband: Baseband::new(rows, blocks, block),
            long: LongSpectrum::new(sample_rate_hz),
            rows: Rows::new(sample_rate_hz, rows, blocks),
            path: Vec::with_capacity(longest / hop + 64),
            seen: vec![Seen::default(); rows + 1],
            bend: Vec::with_capacity((longest / hop + 64).max(blocks)),
            steps: Vec::with_capacity(rows),
            points: Vec::with_capacity(rows),
            sweep: 0.0,
            spread: 0.0,
        }
    }

    /// Forgets the instants of the last stretch.
    pub(crate) fn clear(&mut self) {
        self.path.clear();
        self.seen.fill(Seen::default());
    }

    /// Takes in an instant of the note.
    pub(crate) fn add(&mut self, centre: u64, f0: f64, f0_sd_cents: f64, tones: &[Tone]) {
        if self.path.len() < self.path.capacity() {
            let sd = f0_sd_cents / CENTS_PER_NEPER;
            self.path.push(PathPoint { centre, log_f0: f0.ln(), sd });
        }
        for tone in tones {
            let Some(seen) = self.seen.get_mut(tone.n) else { continue };
            let w = (tone.hz / tone.sd_hz).powi(2);
            seen.weight += w;
            let off = (tone.hz / (tone.n as f64 * f0)).ln();
            seen.sum += w * off;
            seen.square += w * off * off;
            seen.power += tone.amplitude.norm_sqr();
            seen.count += 1;
        }
    }

    /// Measures the stretch from `start` to `end`. `None` when there is too little of it.
    pub(crate) fn run(&mut self, history: &History, start: u64, end: u64) -> Option<StiffFit> {
        let length = index(end - start).min(self.longest);
        let sound = Span { history, start, length };
        let block = self.baseband.block();
        if length < 6 * block || self.path.is_empty() {
            return None;
        }
        self.duration_s = length as f64 / self.sample_rate_hz;
        self.long.run(sound);
        let seen = self.expect()?;
        let (f0, b) = (seen.f0, seen.b);
        let grid = (start, block, length / block);
        let times = self.times();
        let moves = path::follow(&self.path, grid, &mut self.bend);
        let moves = moves.filter(|m| {
            let straight = self.misfit(sound, (f0, b), times, false);
            self.sweep = m.sweep;
            self.misfit(sound, (m.mean_log.exp(), b), times, true) < straight - BENT_LEAVES_LESS
        });
        if moves.is_none() {
            self.bend.clear();
            self.sweep = 0.0;
        }
        self.place(moves.map_or(f0, |m| m.mean_log.exp()), b);
        self.lay_out();
        self.baseband.run(sound, &self.steps, &self.bend);
        self.rows.fit(&self.baseband, times, f0, self.bend.is_empty());
        // Where no partial holds still enough for a line of its own, what the instants saw is all there is to say.
        Some(self.rows.judge(times, f0).unwrap_or(seen))
    }

    /// How badly the strongest partials are explained by a pitch that holds, or that follows `bend`.
    fn misfit(&mut self, sound: Span<'_>, (f0, b): (f64, f64), times: Times, bent: bool) -> f64 {
        self.place(f0, b);
        self.rows.keep_strongest(STRONGEST);
        self.lay_out();
        self.baseband.run(sound, &self.steps, if bent { &self.bend } else { &[] });
        self.rows.misfit(&self.baseband, times, f0)
    }

    fn times(&self) -> Times {
        let block = self.baseband.block() as f64;
        Times {
            first_s: (block - 1.0) / 2.0 / self.sample_rate_hz,
            step_s: block / self.sample_rate_hz,
        }
    }

    /// The model that the instants of the note agree on.
    fn expect(&mut self) -> Option<StiffFit> {
        let middle = self.path.len() / 2;
        self.bend.clear();
        self.bend.extend(self.path.iter().map(|p| p.log_f0));
        let (_, median, _) = self.bend.select_nth_unstable_by(middle, f64::total_cmp);
        let log_f0 = *median;
        let f0 = log_f0.exp();
        let square: f64 = self.path.iter().map(|p| (p.log_f0 - log_f0).powi(2)).sum();
        self.spread = (square / self.path.len() as f64).sqrt();
        self.points.clear();
        let least = self.often();
        for (n, r) in self.seen.iter().enumerate().filter(|(_, r)| r.count >= least) {
            let number = n as f64;
            let hz = number * f0 * (r.sum / r.weight).exp();
            self.points.push(Point { n: number, hz, sd_hz: hz * r.sd().max(1e-7) });
        }
        let fit = stiff::fit(&self.points)?;
        Some(StiffFit { f0_sd_cents: fit.f0_sd_cents.hypot(CENTS_PER_NEPER * self.spread), ..fit })
    }

    /// Says how fast each row turns.
    fn lay_out(&mut self) {
        let turn = TAU / self.sample_rate_hz;
        self.steps.clear();
        self.steps.extend(self.rows.rows.iter().map(|r| turn * r.expected_hz));
    }

    /// Instants that must have seen a partial.
    fn often(&self) -> usize {
        (self.path.len() / 4).max(1)
    }

    /// Lays out the rows for a model.
    fn place(&mut self, f0: f64, b: f64) {
        self.rows.rows.clear();
        let duration = self.duration_s;
        let nyquist = 0.5 * self.sample_rate_hz;
        let top = (nyquist - CLEAR_OF_IMAGE / duration) * (-self.sweep).exp();
        let least = self.often();
        for n in 1..=self.partials + SPARE {
            let seen = self.seen[n];
            let model_hz = partial_hz(f0, b, n as f64);
            let seen_hz = n as f64 * f0 * (seen.sum / seen.weight).exp();
            // Instants that were wrong about the model took one partial for another.
            let often =
                seen.count >= least && (seen_hz - model_hz).abs() < reach(f64::INFINITY, f0);
            let expected_hz = if often { seen_hz } else { model_hz };
            if expected_hz > top {
                break;
            }
            let wide = (5.0 * seen.sd()).max(3.0 * seen.spread()).max(3.0 * self.spread);
            let loose = if often { wide.clamp(5e-5, 3e-3) } else { 3e-3 };
            self.rows.rows.push(Row {
                n,
                expected_hz,
                reach_hz: reach(loose * expected_hz + 1.5 / duration, f0),
                resolution_hz: 1.0 / duration,
                power: seen.power,
                noise: self.long.noise_of_sum(expected_hz, self.baseband.block()),
                ..Row::default()
            });
        }
    }
}

impl Seen {
    /// Relative deviation of the mean: the instants overlap, and share what the model gets wrong.
    fn sd(&self) -> f64 {
        (4.0 / self.weight).sqrt()
    }

    /// How far the instants lie apart, relative: the attack of a note is louder than the rest, and elsewhere.
    fn spread(&self) -> f64 {
        let mean = self.sum / self.weight;
        (self.square / self.weight - mean * mean).max(0.0).sqrt()
    }
}
