//! One note, or one stretch of a long one, from samples to figures.

use core::f64::consts::TAU;

use realfft::num_complex::Complex;

use super::baseband::Baseband;
use super::damped::{self, Damped, Times};
use super::lines::LongSpectrum;
use crate::convert::{index, nearest_index};
use crate::history::History;
use crate::refine::Tone;
use crate::stiff::{self, CENTS_PER_NEPER, Point, StiffFit, partial_hz};

/// Block of the slow signals, in seconds.
const BLOCK_S: f64 = 0.005;
/// Longest stretch measured at once, in seconds.
pub(crate) const STRETCH_S: f64 = 6.0;
/// Partials modelled beyond those asked for, so that the last one is not disturbed.
const SPARE: usize = 3;
/// Rounds in which the others' shares are taken away.
const ROUNDS: usize = 2;
/// Energy over the noise at which a partial is there: 10.5 dB.
const PRESENT: f64 = 11.2;
/// Energy over the noise of a partial that the model may be built on: 16 dB.
const CERTAIN: f64 = 40.0;
/// Share of another partial that is worth taking away, against the noise of a block, and of the whole stretch.
const WORTH: f64 = 0.1;
const WORTH_SUMMED: f64 = 0.03;
/// Scatter of the pitch over the note, against its own deviations and in cents, that makes it move.
const MOVES_CHI: f64 = 4.0;
const MOVES_CENTS: f64 = 0.3;

/// The pitch of one instant of the note.
#[derive(Debug, Clone, Copy)]
struct TrackPoint {
    centre: u64,
    log_f0: f64,
    sd: f64,
}

/// What the instants of the note said of one partial's distance from the harmonic series.
#[derive(Debug, Clone, Copy, Default)]
struct Ratio {
    weight: f64,
    sum: f64,
    count: usize,
}

/// One partial of the stretch.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Row {
    /// Partial number.
    pub(crate) n: usize,
    /// Frequency that it was brought down by, in Hz.
    pub(crate) expected_hz: f64,
    /// How far around it was searched.
    reach_hz: f64,
    /// What was fitted.
    pub(crate) fit: Damped,
    /// Whether the partial is there.
    pub(crate) present: bool,
}

/// The measurement of notes: owns all its memory, some of it large.
#[derive(Debug)]
pub(crate) struct Meter {
    sample_rate_hz: f64,
    partials: usize,
    samples: Vec<f32>,
    baseband: Baseband,
    /// Lines of the stretch.
    pub(crate) long: LongSpectrum,
    /// Rows of the stretch, by rising number.
    pub(crate) rows: Vec<Row>,
    track: Vec<TrackPoint>,
    ratios: Vec<Ratio>,
    bend: Vec<f64>,
    steps: Vec<f64>,
    points: Vec<Point>,
    /// Mean square of the stretch.
    pub(crate) mean_square: f64,
    /// Half the range of the pitch over the stretch, as a natural logarithm; 0 where it holds.
    pub(crate) sweep: f64,
}

impl Meter {
    /// Room for the longest stretch.
    pub(crate) fn new(sample_rate_hz: f64, partials: usize, hop: usize) -> Self {
        let block = nearest_index(BLOCK_S * sample_rate_hz).max(8);
        let longest = nearest_index(STRETCH_S * sample_rate_hz) + 4 * hop;
        let rows = partials + SPARE;
        Self {
            sample_rate_hz,
            partials,
            samples: Vec::with_capacity(longest),
            baseband: Baseband::new(rows, longest / block, block),
            long: LongSpectrum::new(sample_rate_hz),
            rows: Vec::with_capacity(rows),
            track: Vec::with_capacity(longest / hop + 64),
            ratios: vec![Ratio::default(); rows + 1],
            bend: Vec::with_capacity(longest / block),
            steps: Vec::with_capacity(rows),
            points: Vec::with_capacity(rows),
            mean_square: 0.0,
            sweep: 0.0,
        }
    }

    /// Forgets the instants of the last stretch.
    pub(crate) fn clear(&mut self) {
        self.track.clear();
        self.ratios.fill(Ratio::default());
    }

    /// Takes in an instant of the note.
    pub(crate) fn add(&mut self, centre: u64, f0: f64, f0_sd_cents: f64, tones: &[Tone]) {
        if self.track.len() < self.track.capacity() {
            let sd = f0_sd_cents / CENTS_PER_NEPER;
            self.track.push(TrackPoint { centre, log_f0: f0.ln(), sd });
        }
        for tone in tones {
            let Some(ratio) = self.ratios.get_mut(tone.n) else { continue };
            let w = (tone.hz / tone.sd_hz).powi(2);
            ratio.weight += w;
            ratio.sum += w * (tone.hz / (tone.n as f64 * f0)).ln();
            ratio.count += 1;
        }
    }

    /// Measures the stretch from `start` to `end`. `None` when there is too little of it.
    pub(crate) fn run(&mut self, history: &History, start: u64, end: u64) -> Option<StiffFit> {
        self.samples.clear();
        let length = index(end - start).min(self.samples.capacity());
        self.samples.resize(length, 0.0);
        history.read(i64::try_from(start).unwrap_or(0), &mut self.samples);
        if length < 6 * self.baseband.block() || self.track.is_empty() {
            return None;
        }
        self.mean_square =
            self.samples.iter().map(|&x| f64::from(x) * f64::from(x)).sum::<f64>() / length as f64;
        self.long.run(&self.samples);
        let (f0, b) = self.expect()?;
        let mean_log = self.follow(start, f0);
        self.place(mean_log.exp(), b);
        self.baseband.run(&self.samples, &self.steps, &self.bend);
        let times = self.times();
        for i in 0..self.rows.len() {
            self.first_fit(i, times, 0.0);
        }
        self.look_again(times, f0);
        if self.bend.is_empty() {
            for _ in 0..ROUNDS {
                for i in 0..self.rows.len() {
                    self.relax(i, times);
                }
            }
        }
        self.judge(f0)
    }

    fn times(&self) -> Times {
        let block = self.baseband.block() as f64;
        Times {
            first_s: (block - 1.0) / 2.0 / self.sample_rate_hz,
            step_s: block / self.sample_rate_hz,
        }
    }

    /// The model that the instants of the note agree on.
    fn expect(&mut self) -> Option<(f64, f64)> {
        let middle = self.track.len() / 2;
        self.bend.clear();
        self.bend.extend(self.track.iter().map(|p| p.log_f0));
        let (_, median, _) = self.bend.select_nth_unstable_by(middle, f64::total_cmp);
        let f0 = median.exp();
        self.points.clear();
        let least = (self.track.len() / 4).max(1);
        for (n, r) in self.ratios.iter().enumerate() {
            if r.count >= least {
                let number = n as f64;
                let hz = number * f0 * (r.sum / r.weight).exp();
                // The instants overlap, and share what the model gets wrong.
                let sd_hz = hz * (4.0 / r.weight).sqrt().max(1e-7);
                self.points.push(Point { n: number, hz, sd_hz });
            }
        }
        let fit = stiff::fit(&self.points, None)?;
        Some((fit.f0, fit.b))
    }

    /// Decides whether the pitch moves; if so, `bend` follows it. Returns the mean of `ln f0`.
    fn follow(&mut self, start: u64, f0: f64) -> f64 {
        self.bend.clear();
        self.sweep = 0.0;
        let track = &self.track;
        let edge = (track.len() / 6).min(4);
        let inner = &track[edge..track.len() - edge];
        let count = inner.len() as f64;
        let mean = inner.iter().map(|p| p.log_f0).sum::<f64>() / count;
        let square = inner.iter().map(|p| (p.log_f0 - mean).powi(2)).sum::<f64>() / count;
        let own = inner.iter().map(|p| p.sd * p.sd).sum::<f64>() / count;
        if square < MOVES_CHI * own
            || square.sqrt() * CENTS_PER_NEPER < MOVES_CENTS
            || inner.len() < 8
        {
            return f0.ln();
        }
        let blocks = self.samples.len() / self.baseband.block();
        let block = self.baseband.block() as f64;
        let (mut low, mut high, mut sum) = (f64::INFINITY, f64::NEG_INFINITY, 0.0);
        let hop = (inner[1].centre - inner[0].centre) as f64;
        for m in 0..blocks {
            let at = start as f64 + (m as f64 + 0.5) * block;
            let log = smooth_at(inner, (at - inner[0].centre as f64) / hop);
            (low, high) = (low.min(log), high.max(log));
            sum += log;
            self.bend.push(log);
        }
        let mean = sum / blocks as f64;
        for bend in &mut self.bend {
            *bend = (*bend - mean).exp();
        }
        self.sweep = 0.5 * (high - low);
        mean
    }

    /// Lays out the rows for a model.
    fn place(&mut self, f0: f64, b: f64) {
        self.rows.clear();
        self.steps.clear();
        let top = 0.495 * self.sample_rate_hz * (-self.sweep).exp();
        let duration = self.samples.len() as f64 / self.sample_rate_hz;
        for n in 1..=self.partials + SPARE {
            let model_hz = partial_hz(f0, b, n as f64);
            let r = self.ratios[n];
            let seen = r.count >= (self.track.len() / 4).max(1);
            let expected_hz =
                if seen { n as f64 * f0 * (r.sum / r.weight).exp() } else { model_hz };
            if expected_hz > top {
                break;
            }
            let loose = if seen { 0.0005 } else { 0.003 };
            let reach_hz = (loose * expected_hz + 1.5 / duration).min(0.3 * f0).min(40.0);
            self.rows.push(Row { n, expected_hz, reach_hz, ..Row::default() });
            self.steps.push(TAU * expected_hz / self.sample_rate_hz);
        }
    }

    fn first_fit(&mut self, i: usize, times: Times, around_hz: f64) {
        let row = &mut self.rows[i];
        let z = self.baseband.copy_row(i);
        let guess = damped::search(z, times, around_hz, row.reach_hz);
        row.fit = damped::fit(z, times, &guess);
    }

    /// Searches the weak partials again, close to where the strong ones let expect them: a wide search finds something in
    /// noise alone, and a false partial far up turns the whole model.
    fn look_again(&mut self, times: Times, f0: f64) {
        self.points.clear();
        for row in self.rows.iter().filter(|r| r.fit.snr > CERTAIN) {
            let hz = row.expected_hz + row.fit.delta_hz;
            self.points.push(Point { n: row.n as f64, hz, sd_hz: row.fit.delta_sd_hz });
        }
        let Some(model) = stiff::fit(&self.points, None) else { return };
        let sd = model.f0_sd_cents.hypot(model.scatter_cents) / CENTS_PER_NEPER;
        for i in 0..self.rows.len() {
            let row = &mut self.rows[i];
            if row.fit.snr > CERTAIN {
                continue;
            }
            let n = row.n as f64;
            let hz = partial_hz(model.f0, model.b, n);
            let bend = if model.b_sd.is_finite() { 0.5 * n * n * model.b_sd } else { 0.0 };
            row.reach_hz = (4.0 * hz * sd.hypot(bend)
                + 1.0 / times.duration(self.baseband.blocks()))
            .min(0.3 * f0)
            .min(40.0);
            let around = hz - row.expected_hz;
            self.first_fit(i, times, around);
            self.rows[i].reach_hz += around.abs();
        }
    }

    /// Fits row `i` again in what the others leave.
    fn relax(&mut self, i: usize, times: Times) {
        let row = self.rows[i];
        let noise = self.long.noise_of_sum(row.expected_hz, self.baseband.block()).sqrt();
        let z = self.baseband.copy_row(i);
        let blocks = z.len() as f64;
        let worth = (WORTH * noise, WORTH_SUMMED * noise / blocks.sqrt());
        let share = Share { times, rate: self.sample_rate_hz, duration: blocks * times.step_s };
        for (k, other) in self.rows.iter().enumerate() {
            if k != i && other.fit.snr > PRESENT {
                share.take(z, row.expected_hz, other, false, worth);
            }
            if other.fit.snr > PRESENT {
                share.take(z, row.expected_hz, other, true, worth);
            }
        }
        self.rows[i].fit = damped::fit(z, times, &row.fit);
    }

    /// Says which partials are there and fits the stiff string through them.
    fn judge(&mut self, f0: f64) -> Option<StiffFit> {
        let times = self.times();
        self.points.clear();
        for row in &mut self.rows {
            let hz = row.expected_hz + row.fit.delta_hz;
            let near = row.fit.delta_hz.abs() <= row.reach_hz + 2.0 * row.fit.delta_sd_hz;
            row.present = row.fit.snr > PRESENT && near && row.fit.delta_sd_hz < 0.1 * f0;
            if row.present {
                let correction = block_response(row.fit.delta_hz, row.fit.sigma, times.step_s);
                row.fit.a /= correction;
                row.fit.mean_square /= correction * correction;
                self.points.push(Point { n: row.n as f64, hz, sd_hz: row.fit.delta_sd_hz });
            }
        }
        stiff::fit(&self.points, None)
    }
}

/// The other partials' share of a row.
struct Share {
    times: Times,
    rate: f64,
    duration: f64,
}

impl Share {
    /// Takes the share of `other`, or of its image at negative frequencies, away from a row brought down by `own_hz`.
    fn take(
        &self,
        z: &mut [Complex<f64>],
        own_hz: f64,
        other: &Row,
        image: bool,
        worth: (f64, f64),
    ) {
        let sign = if image { -1.0 } else { 1.0 };
        let fit = &other.fit;
        let hz = sign * (other.expected_hz + fit.delta_hz);
        let off_hz = hz - own_hz;
        let samples = self.times.step_s * self.rate;
        let half = core::f64::consts::PI * off_hz / self.rate;
        let response = (half * samples).sin() / (samples * half.sin());
        let rate_hz = 1.0 / self.times.step_s;
        let alias = off_hz - (off_hz / rate_hz).round() * rate_hz;
        let span = self.duration.min(1.0 / fit.sigma.max(1e-9));
        let leak = fit.a.norm() * response.abs();
        let summed = leak / (1.0 + core::f64::consts::PI * alias.abs() * span);
        if !(leak > worth.0 || summed > worth.1) {
            return;
        }
        let g = Complex::new(-fit.sigma, TAU * off_hz);
        let a = if image { fit.a.conj() } else { fit.a };
        let mut y = a * response * (g * self.times.first_s).exp();
        let ratio = (g * self.times.step_s).exp();
        for z in z {
            *z -= y;
            y *= ratio;
        }
    }
}

/// What a block's sum makes of an exponential that is off by `delta_hz` and decays by `sigma`, against its value at the
/// block's centre.
fn block_response(delta_hz: f64, sigma: f64, block_s: f64) -> f64 {
    let x = core::f64::consts::PI * delta_hz * block_s;
    let y = 0.5 * sigma * block_s;
    let sinc = if x.abs() < 1e-6 { 1.0 } else { x.sin() / x };
    let sinhc = if y.abs() < 1e-6 { 1.0 } else { y.sinh() / y };
    sinc * sinhc
}

/// The track at a fractional index: each point smoothed over five by a parabola (A. Savitzky & M. Golay, 1964), then a
/// cubic through four.
fn smooth_at(track: &[TrackPoint], at: f64) -> f64 {
    let last = track.len() - 1;
    let at = at.clamp(0.0, last as f64);
    let base = crate::convert::floor_index(at).min(last - 1);
    let x = at - base as f64;
    let value = |i: usize| -> f64 {
        let p = |j: usize| track[j].log_f0;
        if i < 2 || i + 2 > last {
            return p(i);
        }
        (-3.0 * (p(i - 2) + p(i + 2)) + 12.0 * (p(i - 1) + p(i + 1)) + 17.0 * p(i)) / 35.0
    };
    let (b, c) = (value(base), value(base + 1));
    let a = if base > 0 { value(base - 1) } else { 2.0 * b - c };
    let d = if base + 2 <= last { value(base + 2) } else { 2.0 * c - b };
    let slope_b = 0.5 * (c - a);
    let slope_c = 0.5 * (d - b);
    let (x2, x3) = (x * x, x * x * x);
    b * (2.0 * x3 - 3.0 * x2 + 1.0)
        + slope_b * (x3 - 2.0 * x2 + x)
        + c * (3.0 * x2 - 2.0 * x3)
        + slope_c * (x3 - x2)
}
