//! A first guess of a damped exponential's frequency and decay: running sums of the signal turned by each of a row of
//! frequencies. The sum to a time `L` answers best to a decay of `1.256 / L` (the maximum of `(1 - exp(-x))^2 / x`), so one
//! pass tries every decay.

use core::f64::consts::TAU;

use pulp::{Arch, NullaryFnOnce};
use realfft::num_complex::Complex;

use super::damped::{Damped, Times};
use crate::convert::{floor_index, nearest_index, single};

/// Frequencies tried together.
const LANES: usize = 8;
/// Frequencies are this many resolutions (one over the duration) apart.
const GRID: f64 = 0.5;
/// Most frequencies tried.
const FREQUENCIES_MAX: usize = 512;
/// Most blocks summed into one step: 20 ms of them, within which the fastest decay is still seen.
const MERGED_MAX: usize = 4;
/// Halvings of the duration tried.
const HALVINGS: usize = 6;
/// Where `(1 - exp(-x))^2 / x` is greatest.
const BEST_DECAY: f64 = 1.256;

/// The search; owns its scratch.
#[derive(Debug)]
pub(crate) struct Search {
    merged: Vec<Complex<f32>>,
}

impl Search {
    /// Room for so many blocks.
    pub(crate) fn new(blocks_max: usize) -> Self {
        Self { merged: Vec::with_capacity(blocks_max) }
    }

    /// The best guess within so many Hz of a frequency, with a decay of up to `sigma_max` nepers per second.
    pub(crate) fn run(
        &mut self,
        z: &[Complex<f64>],
        times: Times,
        (around_hz, reach_hz): (f64, f64),
        sigma_max: f64,
    ) -> Damped {
        let merge = floor_index(0.2 / (reach_hz * times.step_s)).clamp(1, MERGED_MAX);
        self.merge(z, times, around_hz, merge);
        let step_s = merge as f64 * times.step_s;
        let spacing = GRID / times.duration(z.len());
        let half = nearest_index((reach_hz / spacing).ceil()).clamp(1, FREQUENCIES_MAX / 2);
        let mut best = Best::default();
        for first in (0..=2 * half).step_by(LANES) {
            // Lanes beyond the last frequency repeat it.
            let off = core::array::from_fn(|i| {
                ((first + i).min(2 * half) as f64 - half as f64) * spacing
            });
            self.lanes(off, step_s, sigma_max, &mut best);
        }
        Damped { sigma: best.sigma, delta_hz: around_hz + best.hz, ..Damped::default() }
    }

    /// Tries frequencies side by side, over the whole and halved again and again.
    fn lanes(&self, off: [f64; LANES], step_s: f64, sigma_max: f64, best: &mut Best) {
        let mut sums = Sums::new(off.map(|hz| TAU * hz * step_s));
        let mut from = 0;
        for halving in (0..=HALVINGS).rev() {
            let to = self.merged.len() >> halving;
            let sigma = if halving == 0 { 0.0 } else { BEST_DECAY / (to as f64 * step_s) };
            if to <= from || sigma > sigma_max {
                continue;
            }
            sums.add(&self.merged[from..to]);
            from = to;
            for (power, hz) in sums.powers(to).into_iter().zip(off) {
                if power > best.power {
                    *best = Best { power, sigma, hz };
                }
            }
        }
    }

    /// Sums of so many blocks, turned back by a frequency.
    fn merge(&mut self, z: &[Complex<f64>], times: Times, hz: f64, merge: usize) {
        let turn = Complex::cis(-TAU * hz * times.step_s);
        let mut e = Complex::new(1.0, 0.0);
        self.merged.clear();
        for group in z.chunks_exact(merge) {
            let mut sum = Complex::default();
            for z in group {
                sum += z * e;
                e *= turn;
            }
            self.merged.push(Complex::new(single(sum.re), single(sum.im)));
        }
    }
}

/// The best so far.
#[derive(Debug, Default)]
struct Best {
    power: f32,
    sigma: f64,
    hz: f64,
}

/// Running sums at several frequencies.
struct Sums {
    turn: ([f32; LANES], [f32; LANES]),
    e: ([f32; LANES], [f32; LANES]),
    sum: ([f32; LANES], [f32; LANES]),
}

impl Sums {
    /// From radians per step.
    fn new(steps: [f64; LANES]) -> Self {
        Self {
            turn: (steps.map(|s| single(s.cos())), steps.map(|s| single(-s.sin()))),
            e: ([1.0; LANES], [0.0; LANES]),
            sum: ([0.0; LANES], [0.0; LANES]),
        }
    }

    fn add(&mut self, z: &[Complex<f32>]) {
        Arch::new().dispatch(Add { sums: self, z });
    }

    fn powers(&self, count: usize) -> [f32; LANES] {
        let scale = 1.0 / count as f32;
        core::array::from_fn(|i| (self.sum.0[i].powi(2) + self.sum.1[i].powi(2)) * scale)
    }
}

/// Adds a piece of the signal to the sums.
struct Add<'a> {
    sums: &'a mut Sums,
    z: &'a [Complex<f32>],
}

impl NullaryFnOnce for Add<'_> {
    type Output = ();

    #[inline(always)]
    fn call(self) {
        let Self { sums, z } = self;
        let ((t_re, t_im), (mut e_re, mut e_im)) = (sums.turn, sums.e);
        let (mut s_re, mut s_im) = sums.sum;
        for z in z {
            for i in 0..LANES {
                s_re[i] += z.re * e_re[i] - z.im * e_im[i];
                s_im[i] += z.re * e_im[i] + z.im * e_re[i];
                let re = e_re[i] * t_re[i] - e_im[i] * t_im[i];
                e_im[i] = e_re[i] * t_im[i] + e_im[i] * t_re[i];
                e_re[i] = re;
            }
        }
        sums.e = (e_re, e_im);
        sums.sum = (s_re, s_im);
    }
}
