//! All partials of a stretch together: each fitted in what the others leave of the sound, round after round until nothing
//! moves (the relaxation of J. Li & P. Stoica, IEEE TSP 44(2):281-295, 1996).

use realfft::num_complex::Complex;

use super::baseband::Baseband;
use super::coarse::Search;
use super::damped::{self, Damped, Limits, Times};
use super::shares::{Shares, block_response};
use crate::stiff::{self, CENTS_PER_NEPER, Point, StiffFit, partial_hz};

/// Rounds in which the others' shares are taken away: before what is not where the others let expect it is searched again,
/// then at most until nothing moves, and at most once more when what strayed is out.
const ROUNDS_BETWEEN: [usize; 2] = [2, 2];
const ROUNDS: usize = 12;
const ROUNDS_LAST: usize = 6;
/// A round in which no partial moves by more than this many of its deviations is the last.
const SETTLED: f64 = 0.1;
/// Energy over the noise at which a partial is there, 10.5 dB, when it is searched within so many resolutions.
const PRESENT: f64 = 11.2;
const PLACES: f64 = 2.0;
/// Energy over the noise of a partial that the model may be built on: 16 dB.
const CERTAIN: f64 = 40.0;
/// A fit beyond this share of its limits is held back by them.
const HELD: f64 = 0.98;
/// Farthest that a partial is searched, as a share of the fundamental, and in Hz.
const REACH_OF_F0: f64 = 0.3;
const REACH_HZ: f64 = 40.0;
/// Fastest decay fitted, in nepers per second, as a share of the fundamental's frequency and within limits (60 dB in 0.23
/// and 0.017 s): faster, a partial is nearly as wide as the distance to the next.
const SIGMA_OF_F0: f64 = 0.4;
const SIGMA_MAX: (f64, f64) = (30.0, 400.0);

/// One partial of the stretch.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Row {
    /// Partial number.
    pub(crate) n: usize,
    /// Frequency that it is brought down by, in Hz.
    pub(crate) expected_hz: f64,
    /// How far around it is searched, and one over the duration, in Hz.
    pub(crate) reach_hz: f64,
    /// See above.
    pub(crate) resolution_hz: f64,
    /// Mean power as the instants of the note saw it, to begin with the strongest.
    pub(crate) power: f64,
    /// Noise variance of one block, as the long transform sees it.
    pub(crate) noise: f64,
    /// What was fitted.
    pub(crate) fit: Damped,
    /// Whether the partial is there.
    pub(crate) present: bool,
}

impl Row {
    /// Frequency as fitted, in Hz.
    pub(crate) fn hz(&self) -> f64 {
        self.expected_hz + self.fit.delta_hz
    }

    /// Whether it stands out, where it was searched, and not held back by the limits of the fit.
    fn there(&self, limits: Limits) -> bool {
        let fit = &self.fit;
        let near = fit.delta_hz.abs() <= self.reach_hz + 2.0 * fit.delta_sd_hz;
        let held = fit.sigma > HELD * limits.sigma || fit.delta_hz.abs() > HELD * limits.off_hz;
        fit.snr > self.least() && near && !held
    }

    /// Energy over the noise at which it is there: noise alone exceeds a level with a chance of `exp(-level)` at each of
    /// the places searched.
    fn least(&self) -> f64 {
        PRESENT + (self.reach_hz / self.resolution_hz / PLACES).max(1.0).ln()
    }

    /// Whether the model may be built on it.
    fn certain(&self, limits: Limits) -> bool {
        self.there(limits) && self.fit.snr > CERTAIN
    }
}

/// The partials and what it takes to fit them.
#[derive(Debug)]
pub(crate) struct Rows {
    /// By rising number.
    pub(crate) rows: Vec<Row>,
    shares: Shares,
    search: Search,
    order: Vec<usize>,
    points: Vec<Point>,
    clean: Vec<Complex<f64>>,
    limits: Limits,
}

impl Rows {
    /// Room for so many rows of so many blocks.
    pub(crate) fn new(sample_rate_hz: f64, rows_max: usize, blocks_max: usize) -> Self {
        Self {
            rows: Vec::with_capacity(rows_max),
            shares: Shares::new(sample_rate_hz, rows_max, blocks_max),
            search: Search::new(blocks_max),
            order: Vec::with_capacity(rows_max),
            points: Vec::with_capacity(rows_max),
            clean: Vec::with_capacity(blocks_max),
            limits: Limits { off_hz: 0.0, sigma: 0.0 },
        }
    }

    /// Drops all but the strongest rows, as the instants of the note saw them.
    pub(crate) fn keep_strongest(&mut self, count: usize) {
        self.rows.sort_unstable_by(|a, b| b.power.total_cmp(&a.power));
        self.rows.truncate(count);
        self.rows.sort_unstable_by_key(|r| r.n);
    }

    /// Fits every row by itself; the mean of the logarithms of what is left, which is minus the logarithm of the likelihood
    /// but for factors.
    pub(crate) fn misfit(&mut self, baseband: &Baseband, times: Times, f0: f64) -> f64 {
        self.begin(baseband, times, f0);
        let mut sum = 0.0;
        for i in 0..self.rows.len() {
            self.find(baseband, times, i, 0.0);
            sum += self.rows[i].fit.left.ln();
        }
        sum / self.rows.len().max(1) as f64
    }

    /// Fits every row. `relaxed` says that the pitch holds, so that shares of others are what [`Shares`] expects.
    pub(crate) fn fit(&mut self, baseband: &Baseband, times: Times, f0: f64, relaxed: bool) {
        self.begin(baseband, times, f0);
        self.order.clear();
        self.order.extend(0..self.rows.len());
        self.order.sort_unstable_by(|&i, &j| self.rows[j].power.total_cmp(&self.rows[i].power));
        for k in 0..self.order.len() {
            let i = self.order[k];
            self.find(baseband, times, i, 0.0);
            self.enter(i, relaxed);
        }
        self.look_again(baseband, times, f0, relaxed);
        if !relaxed {
            return;
        }
        let mut settled = false;
        for rounds in ROUNDS_BETWEEN {
            settled = settled || self.settle(baseband, times, rounds);
            settled &= !self.look_again(baseband, times, f0, relaxed);
        }
        settled = settled || self.settle(baseband, times, ROUNDS);
        settled &= !self.drop_strayed();
        if !settled {
            self.settle(baseband, times, ROUNDS_LAST);
        }
    }

    /// Fits in what the others leave until nothing moves, or for so many rounds; says whether nothing moves.
    fn settle(&mut self, baseband: &Baseband, times: Times, rounds: usize) -> bool {
        for _ in 0..rounds {
            let mut moved = 0.0f64;
            for k in 0..self.order.len() {
                moved = moved.max(self.relax(baseband, times, self.order[k]));
            }
            if moved < SETTLED {
                return true;
            }
        }
        false
    }

    /// Takes out for good what is no partial: it may have taken a partial's share with it. Says whether there was any.
    fn drop_strayed(&mut self) -> bool {
        let before = self.order.len();
        for (i, row) in self.rows.iter().enumerate().filter(|(_, r)| !r.there(self.limits)) {
            self.shares.set(i, row.expected_hz, None);
        }
        let rows = &self.rows;
        self.order.retain(|&i| rows[i].there(self.limits));
        self.order.len() < before
    }

    fn begin(&mut self, baseband: &Baseband, times: Times, f0: f64) {
        self.shares.clear(times, baseband.blocks());
        let sigma = (SIGMA_OF_F0 * f0).clamp(SIGMA_MAX.0, SIGMA_MAX.1);
        self.limits = Limits { off_hz: reach(f64::INFINITY, f0), sigma };
    }

    /// Says which partials are there and fits the stiff string through them.
    pub(crate) fn judge(&mut self, times: Times, f0: f64) -> Option<StiffFit> {
        self.points.clear();
        for row in &mut self.rows {
            row.present = row.there(self.limits) && row.fit.delta_sd_hz < 0.1 * f0;
            if row.present {
                let response = block_response(row.fit.delta_hz, row.fit.sigma, times.step_s);
                row.fit.a /= response;
                row.fit.mean_square /= response * response;
                self.points.push(point(row));
            }
        }
        stiff::fit(&self.points)
    }

    /// The signal of row `i` without the others' shares.
    fn clean(&mut self, baseband: &Baseband, i: usize) {
        let row = &self.rows[i];
        self.clean.clear();
        self.clean
            .extend(baseband.row(i).iter().map(|z| Complex::new(f64::from(z.re), f64::from(z.im))));
        // Where lines are wide, the long transform takes their skirts for noise.
        let noise = if row.fit.left > 0.0 { row.noise.min(row.fit.left) } else { row.noise };
        self.shares.take(&mut self.clean, i, (row.expected_hz, row.reach_hz), noise);
    }

    /// Searches and fits row `i` from nothing, around `around_hz` off the frequency that it is brought down by.
    fn find(&mut self, baseband: &Baseband, times: Times, i: usize, around_hz: f64) {
        self.clean(baseband, i);
        let row = &mut self.rows[i];
        let guess =
            self.search.run(&self.clean, times, (around_hz, row.reach_hz), self.limits.sigma);
        row.fit = damped::fit(&self.clean, times, &guess, self.limits);
    }

    /// Makes row `i` known to the others.
    fn enter(&mut self, i: usize, relaxed: bool) {
        let row = &self.rows[i];
        // Even what strayed explains something for now; taken out, it would come back as everyone's trouble.
        let there = relaxed && row.fit.snr > PRESENT;
        self.shares.set(i, row.expected_hz, there.then_some(&row.fit));
    }

    /// Fits row `i` again in what the others leave; says by how many of its deviations it moved.
    fn relax(&mut self, baseband: &Baseband, times: Times, i: usize) -> f64 {
        self.clean(baseband, i);
        let row = &mut self.rows[i];
        let before = row.fit;
        row.fit = damped::fit(&self.clean, times, &before, self.limits);
        let now = row.fit;
        self.enter(i, true);
        if !self.rows[i].there(self.limits) {
            return 0.0;
        }
        let turned = ((now.a / before.a).norm().ln()).abs() / now.log_sd;
        let off = (now.delta_hz - before.delta_hz).abs() / now.delta_sd_hz;
        off.max((now.sigma - before.sigma).abs() / now.sigma_sd).max(turned)
    }

    /// Searches the weak partials again, close to where the strong ones let expect them: a wide search finds something in
    /// noise alone, and a false partial far up turns the whole model. Says whether there was any.
    fn look_again(&mut self, baseband: &Baseband, times: Times, f0: f64, relaxed: bool) -> bool {
        let limits = self.limits;
        self.points.clear();
        self.points.extend(self.rows.iter().filter(|r| r.certain(limits)).map(point));
        let Some(model) = stiff::fit(&self.points) else { return false };
        let mut searched = false;
        let sd = model.f0_sd_cents.hypot(model.scatter_cents) / CENTS_PER_NEPER;
        for k in 0..self.order.len() {
            let i = self.order[k];
            let row = &mut self.rows[i];
            if row.certain(self.limits) {
                continue;
            }
            searched = true;
            let n = row.n as f64;
            let hz = partial_hz(model.f0, model.b, n);
            let bend = if model.b_sd.is_finite() { 0.5 * n * n * model.b_sd } else { 0.0 };
            row.reach_hz = reach(4.0 * hz * sd.hypot(bend) + row.resolution_hz, f0);
            let around = hz - row.expected_hz;
            self.find(baseband, times, i, around);
            self.enter(i, relaxed);
            self.rows[i].reach_hz += around.abs();
        }
        searched
    }
}

/// A distance in Hz to search within, kept clear of the neighbours.
pub(crate) fn reach(hz: f64, f0: f64) -> f64 {
    hz.min(REACH_OF_F0 * f0).min(REACH_HZ)
}

fn point(row: &Row) -> Point {
    Point { n: row.n as f64, hz: row.hz(), sd_hz: row.fit.delta_sd_hz }
}
