//! Periodicity in the lag domain: the normalised autocorrelation of a Hann frame, divided by the window's own
//! (P. Boersma, Proc. Inst. Phonetic Sci. Amsterdam 17:97-110, 1993), from the power spectrum by an inverse transform.
//!
//! Only the lower part of the spectrum is taken back to the lag domain: a pitch repeats there, and the transform is shorter
//! by as much. The circular wrap of the unpadded frame is left in: for lags up to a third of the frame the window's tails make it
//! smaller than the estimate's own scatter.

use std::sync::Arc;

use realfft::num_complex::Complex;
use realfft::{ComplexToReal, RealFftPlanner};

use crate::convert::{floor_index, nearest_index, single};
use crate::spectrum::{Frame, TransformRuns};

/// Maxima in the lag domain handed to the search.
pub(crate) const MAXIMA: usize = 6;
/// Least of them.
const LEAST: f32 = 0.2;
/// Longest lag used, as a share of the frame.
const LONGEST: f64 = 0.36;
/// Half-width of the search for the maximum around a candidate's period, as a share of the period.
const SLACK: f64 = 0.012;

/// Autocorrelation of one frame length.
pub(crate) struct Autocorrelation {
    /// Runs so far.
    pub(crate) runs: TransformRuns,
    plan: Arc<dyn ComplexToReal<f32>>,
    spectrum: Vec<Complex<f32>>,
    scratch: Vec<Complex<f32>>,
    output: Vec<f32>,
    /// One over the window's own autocorrelation, up to the longest lag.
    correction: Vec<f32>,
    normalised: Vec<f32>,
    sample_rate_hz: f64,
}

impl core::fmt::Debug for Autocorrelation {
    fn fmt(&self, f: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        f.debug_struct("Autocorrelation")
            .field("lags", &self.normalised.len())
            .finish_non_exhaustive()
    }
}

impl Autocorrelation {
    /// Plans for frames of `len` samples, of whose spectrum the lower part, one in `narrower`, is used.
    pub(crate) fn new(
        len: usize,
        narrower: usize,
        sample_rate_hz: f64,
        planner: &mut RealFftPlanner<f32>,
    ) -> Self {
        let len = len / narrower;
        let sample_rate_hz = sample_rate_hz / narrower as f64;
        let plan = planner.plan_fft_inverse(len);
        let lags = floor_index(LONGEST * len as f64);
        Self {
            runs: TransformRuns::none(len, true),
            spectrum: plan.make_input_vec(),
            scratch: plan.make_scratch_vec(),
            output: plan.make_output_vec(),
            correction: (0..lags)
                .map(|k| single(1.0 / hann_autocorrelation(k as f64 / len as f64)))
                .collect(),
            normalised: vec![0.0; lags],
            plan,
            sample_rate_hz,
        }
    }

    /// Computes the normalised autocorrelation of a frame.
    pub(crate) fn run(&mut self, frame: &Frame) {
        self.runs.runs += 1;
        for (s, p) in self.spectrum.iter_mut().zip(&frame.power) {
            *s = Complex::new(*p, 0.0);
        }
        // A constant is no periodicity.
        for s in &mut self.spectrum[..2] {
            *s = Complex::default();
        }
        if let Some(last) = self.spectrum.last_mut() {
            last.im = 0.0;
        }
        let done =
            self.plan.process_with_scratch(&mut self.spectrum, &mut self.output, &mut self.scratch);
        debug_assert!(done.is_ok(), "lengths are planned");
        let scale = 1.0 / self.output[0].max(f32::MIN_POSITIVE);
        for ((n, r), c) in self.normalised.iter_mut().zip(&self.output).zip(&self.correction) {
            *n = r * scale * c;
        }
    }

    /// Highest value around a period.
    fn at(&self, hz: f64) -> f64 {
        let lag = self.sample_rate_hz / hz;
        let slack = (SLACK * lag).max(1.0);
        let (a, b) = (nearest_index(lag - slack), nearest_index(lag + slack));
        if b >= self.normalised.len() {
            return 0.0;
        }
        let r = &self.normalised;
        let best = (a..=b).fold(a, |best, k| if r[k] >= r[best] { k } else { best });
        if best == 0 || best + 1 == r.len() {
            return 0.0;
        }
        let [before, here, after] = [r[best - 1], r[best], r[best + 1]].map(f64::from);
        let curve = before - 2.0 * here + after;
        let rise = if curve < 0.0 { -0.125 * (before - after).powi(2) / curve } else { 0.0 };
        here + rise
    }

    /// Adds the strongest maxima between two lags to a list kept in falling order.
    fn collect(&self, lags: (usize, usize), out: &mut Vec<(f32, f64)>) {
        let (first, end) = (lags.0.max(1), lags.1.min(self.normalised.len() - 1));
        let Some(around) = self.normalised.get(first - 1..=end) else { return };
        for (k, around) in (first..).zip(around.windows(3)) {
            let &[before, here, after] = around else { continue };
            if here <= before || here < after || here < LEAST {
                continue;
            }
            let at = out.partition_point(|m| m.0 > here);
            if at < MAXIMA {
                out.truncate(MAXIMA - 1);
                let curve = before - 2.0 * here + after;
                let shift = if curve < 0.0 { 0.5 * (before - after) / curve } else { 0.0 };
                let lag = k as f64 + f64::from(shift);
                out.insert(at.min(out.len()), (here, self.sample_rate_hz / lag));
            }
        }
    }
}

/// Autocorrelation of the Hann window at a lag given as a share of its length, 1 at lag 0.
fn hann_autocorrelation(x: f64) -> f64 {
    let t = core::f64::consts::TAU * x;
    (1.0 - x) * (2.0 / 3.0 + t.cos() / 3.0) + t.sin() / (2.0 * core::f64::consts::PI)
}

/// Periodicity over the whole search range, from two frame lengths.
#[derive(Debug)]
pub(crate) struct Periodicity {
    /// The shorter frame, for periods up to its limit.
    pub(crate) short: Autocorrelation,
    /// The longest frame, for the rest.
    pub(crate) long: Autocorrelation,
    /// Lowest fundamental judged by the shorter frame, in Hz.
    limit_hz: f64,
    highest_hz: f64,
    maxima: Vec<(f32, f64)>,
}

impl Periodicity {
    /// Joins two frame lengths.
    pub(crate) fn new(short: Autocorrelation, long: Autocorrelation, highest_hz: f64) -> Self {
        let limit_hz = 1.25 * short.sample_rate_hz / short.normalised.len() as f64;
        Self { short, long, limit_hz, highest_hz, maxima: Vec::with_capacity(MAXIMA + 1) }
    }

    /// Finds the maxima, after both frames have run.
    pub(crate) fn update(&mut self) {
        self.maxima.clear();
        let rate = self.short.sample_rate_hz;
        let (shortest, limit) = (rate / self.highest_hz, rate / self.limit_hz);
        self.short.collect((floor_index(shortest), floor_index(limit)), &mut self.maxima);
        let limit = floor_index(self.long.sample_rate_hz / self.limit_hz);
        self.long.collect((limit, self.long.normalised.len()), &mut self.maxima);
    }

    /// Periodicity at a fundamental, at most 1.
    pub(crate) fn at(&self, hz: f64) -> f64 {
        if hz >= self.limit_hz { self.short.at(hz).min(1.0) } else { self.long.at(hz).min(1.0) }
    }

    /// Fundamentals of the strongest maxima.
    pub(crate) fn maxima(&self) -> impl Iterator<Item = f64> {
        self.maxima.iter().map(|m| m.1)
    }
}
