//! What each fitted partial leaves in the slow signals of all others.
//!
//! A block's sum is a coarse low pass: neighbours, and the images at negative frequencies, come through it. Their share is
//! known once they are fitted. The exponential of each partial is kept once, `E_k[m] = exp((-sigma_k + i 2 pi f_k) t_m)`;
//! in the signal of another it differs by that one's own turning and by one complex factor (R. Prony's geometric sum over
//! the block), so a share costs two real products a sample and no oscillator.

use core::f64::consts::{PI, TAU};

use pulp::{Arch, NullaryFnOnce};
use realfft::num_complex::Complex;

use super::damped::{Damped, Times};
use crate::convert::{nearest, single};
use crate::stiff::quadrature;

/// Share of another partial that is worth taking away, against the noise of the whole stretch.
const WORTH: f64 = 0.05;

/// One fitted partial.
#[derive(Debug, Clone, Copy, Default)]
struct Source {
    hz: f64,
    sigma: f64,
    /// Amplitude at time 0, free of the block's own response; 0 for none.
    a: Complex<f64>,
    /// `exp(g block / 2)` and `exp(g / (2 fs))` of its rate.
    half_block: Turn,
    half_sample: Turn,
}

/// The exponentials of a stretch's partials.
#[derive(Debug)]
pub(crate) struct Shares {
    rate_hz: f64,
    times: Times,
    blocks: usize,
    blocks_max: usize,
    sources: Vec<Source>,
    re: Vec<f32>,
    im: Vec<f32>,
    sum_re: Vec<f32>,
    sum_im: Vec<f32>,
    arch: Arch,
}

impl Shares {
    /// Room for so many rows of so many blocks.
    pub(crate) fn new(rate_hz: f64, rows_max: usize, blocks_max: usize) -> Self {
        Self {
            rate_hz,
            times: Times { first_s: 0.0, step_s: 0.0 },
            blocks: 0,
            blocks_max,
            sources: vec![Source::default(); rows_max],
            re: vec![0.0; rows_max * blocks_max],
            im: vec![0.0; rows_max * blocks_max],
            sum_re: vec![0.0; blocks_max],
            sum_im: vec![0.0; blocks_max],
            arch: Arch::new(),
        }
    }

    /// Begins a stretch: nothing is fitted yet.
    pub(crate) fn clear(&mut self, times: Times, blocks: usize) {
        self.times = times;
        self.blocks = blocks;
        self.sources.fill(Source::default());
    }

    /// Enters (or replaces) what was fitted in a row brought down by `expected_hz`; `None` takes it out.
    pub(crate) fn set(&mut self, row: usize, expected_hz: f64, fit: Option<&Damped>) {
        let Some(fit) = fit else {
            self.sources[row] = Source::default();
            return;
        };
        let hz = expected_hz + fit.delta_hz;
        let block_s = self.times.step_s;
        let g = Complex::new(-fit.sigma, TAU * hz);
        self.sources[row] = Source {
            hz,
            sigma: fit.sigma,
            a: fit.a / block_response(fit.delta_hz, fit.sigma, block_s),
            half_block: Turn::new(g * (0.5 * block_s)),
            half_sample: Turn::new(g * (0.5 / self.rate_hz)),
        };
        let mut e = (g * self.times.first_s).exp();
        let turn = (g * block_s).exp();
        let from = row * self.blocks_max;
        let re = &mut self.re[from..from + self.blocks];
        for (re, im) in re.iter_mut().zip(&mut self.im[from..]) {
            (*re, *im) = (single(e.re), single(e.im));
            e *= turn;
        }
    }

    /// Takes all others' shares away from a row brought down by `own_hz` and looked at within `reach_hz` of that, with `noise`
    /// the variance of one block.
    pub(crate) fn take(
        &mut self,
        z: &mut [Complex<f64>],
        row: usize,
        (own_hz, reach_hz): (f64, f64),
        noise: f64,
    ) {
        self.sum_re.fill(0.0);
        self.sum_im.fill(0.0);
        let block = self.times.step_s * self.rate_hz;
        let own_block = Complex::cis(PI * own_hz * self.times.step_s);
        let own_sample = Complex::cis(PI * own_hz / self.rate_hz);
        let worth = WORTH * (noise / self.blocks as f64).sqrt();
        for k in 0..self.sources.len() {
            let source = self.sources[k];
            if source.a.norm_sqr() <= 0.0 {
                continue;
            }
            let response = |half_block: Turn, half_sample: Turn| {
                half_block.sinh_against(own_block) / (half_sample.sinh_against(own_sample) * block)
            };
            let direct = if k == row {
                Complex::default()
            } else {
                source.a * response(source.half_block, source.half_sample)
            };
            let image =
                source.a.conj() * response(source.half_block.conj(), source.half_sample.conj());
            let shows = direct.norm_sqr().sqrt()
                * self.summed(&source, source.hz - own_hz, reach_hz)
                + image.norm_sqr().sqrt() * self.summed(&source, source.hz + own_hz, reach_hz);
            if shows > worth {
                self.add(k, direct, image);
            }
        }
        let mut e = Complex::cis(-TAU * own_hz * self.times.first_s);
        let turn = Complex::cis(-TAU * own_hz * self.times.step_s);
        for ((z, re), im) in z.iter_mut().zip(&self.sum_re).zip(&self.sum_im) {
            *z -= e * Complex::new(f64::from(*re), f64::from(*im));
            e *= turn;
        }
    }

    /// How much of an exponential off by `off_hz` is left, at most, in the mean over the stretch at a frequency in reach.
    fn summed(&self, source: &Source, off_hz: f64, reach_hz: f64) -> f64 {
        let turns = off_hz * self.times.step_s;
        let alias_hz = (turns - nearest(turns)) / self.times.step_s;
        let span = self.times.duration(self.blocks);
        let long = 1.0 / span + source.sigma.max(0.0);
        let away = PI * (alias_hz.abs() - reach_hz).max(0.0);
        1.0 / (span * quadrature(long, away))
    }

    /// Adds `direct E + image conj(E)` of a partial to the sums.
    fn add(&mut self, k: usize, direct: Complex<f64>, image: Complex<f64>) {
        let from = k * self.blocks_max;
        let (sum, difference) = (direct + image, direct - image);
        self.arch.dispatch(Add {
            e: (&self.re[from..][..self.blocks], &self.im[from..][..self.blocks]),
            sums: (&mut self.sum_re[..self.blocks], &mut self.sum_im[..self.blocks]),
            by: [sum.re, -difference.im, sum.im, difference.re].map(single),
        });
    }
}

/// Adds to the real sums the first two factors times real and imaginary part of an exponential, to the imaginary ones the
/// other two.
struct Add<'a> {
    e: (&'a [f32], &'a [f32]),
    sums: (&'a mut [f32], &'a mut [f32]),
    by: [f32; 4],
}

impl NullaryFnOnce for Add<'_> {
    type Output = ();

    #[inline(always)]
    fn call(self) {
        let [p, q, r, s] = self.by;
        let e = self.e.0.iter().zip(self.e.1);
        for ((sum_re, sum_im), (re, im)) in self.sums.0.iter_mut().zip(self.sums.1).zip(e) {
            *sum_re += p * re + q * im;
            *sum_im += r * re + s * im;
        }
    }
}

/// What a block's sum makes of an exponential that is off by `delta_hz` and decays by `sigma`, against its value at the
/// block's centre (the imaginary part, third order in both, is left out).
pub(crate) fn block_response(delta_hz: f64, sigma: f64, block_s: f64) -> f64 {
    let x = PI * delta_hz * block_s;
    let y = 0.5 * sigma * block_s;
    let sinc = if x.abs() < 1e-6 { 1.0 } else { x.sin() / x };
    let sinhc = if y.abs() < 1e-6 { 1.0 } else { y.sinh() / y };
    sinc * sinhc
}

/// An exponential and its inverse.
#[derive(Debug, Clone, Copy, Default)]
struct Turn {
    e: Complex<f64>,
    inverse: Complex<f64>,
}

impl Turn {
    fn new(exponent: Complex<f64>) -> Self {
        Self { e: exponent.exp(), inverse: (-exponent).exp() }
    }

    fn conj(self) -> Self {
        Self { e: self.e.conj(), inverse: self.inverse.conj() }
    }

    /// Hyperbolic sine of the exponent less that of a pure rotation.
    fn sinh_against(self, own: Complex<f64>) -> Complex<f64> {
        (self.e * own.conj() - self.inverse * own) * 0.5
    }
}
