//! A damped complex exponential in white noise: `z[m] = a * exp(g t_m)`, `g = -sigma + i 2 pi delta`, by maximum
//! likelihood (nonlinear least squares, Gauss-Newton).
//!
//! The model is analytic in its complex unknowns, so the real normal equations fall apart into two equal halves: the same
//! 2 by 2 matrix of real sums serves amplitude and rate, and its inverse is the Cramer-Rao bound (Y. Hua & T. Sarkar, IEEE
//! TASSP 38(5):814-824, 1990, treat the same model).

use core::f64::consts::TAU;

use pulp::{Arch, NullaryFnOnce};
use realfft::num_complex::Complex;

/// Most rounds of Gauss-Newton, those that have to step back included.
const ROUNDS: usize = 16;
/// A step of less than this many of its own deviations ends the rounds.
const SETTLED: f64 = 0.01;
/// Most nepers by which a partial may grow over the stretch.
const GROWTH: f64 = 20.0;
/// Oscillators side by side, so that no product waits for the last.
const LANES: usize = 4;

/// A fitted exponential, referred to the note's first sample.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(crate) struct Damped {
    /// Amplitude and phase at time 0.
    pub(crate) a: Complex<f64>,
    /// Decay in nepers per second.
    pub(crate) sigma: f64,
    /// Frequency off the one brought down by, in Hz.
    pub(crate) delta_hz: f64,
    /// Energy over the noise: twice the log likelihood ratio against noise alone.
    pub(crate) snr: f64,
    /// Standard deviations: of `delta_hz`, of `sigma`, of the logarithm of the amplitude at time 0.
    pub(crate) delta_sd_hz: f64,
    /// See above.
    pub(crate) sigma_sd: f64,
    /// See above.
    pub(crate) log_sd: f64,
    /// Noise variance of one block, without slow misfit.
    pub(crate) noise: f64,
    /// The same with all that is left.
    pub(crate) left: f64,
    /// Mean power over the note, as squared amplitude.
    pub(crate) mean_square: f64,
}

/// Times of the blocks: the first block's centre and the spacing, in seconds.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Times {
    /// Centre of the first block.
    pub(crate) first_s: f64,
    /// From block to block.
    pub(crate) step_s: f64,
}

impl Times {
    /// Duration of so many blocks, in seconds.
    pub(crate) fn duration(self, blocks: usize) -> f64 {
        blocks as f64 * self.step_s
    }
}

/// How far a fit may go.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Limits {
    /// Off the frequency brought down by, in Hz.
    pub(crate) off_hz: f64,
    /// Decay, in nepers per second.
    pub(crate) sigma: f64,
}

/// Sums of one pass over the signal for a rate `g`, with `e = exp(g t)`.
#[derive(Debug, Clone, Copy, Default)]
struct Sums {
    /// Of `|e|^2`, and that times `t` and `t^2`.
    s0: f64,
    s1: f64,
    s2: f64,
    /// Of `conj(e) z`, and that times `t`.
    b0: Complex<f64>,
    b1: Complex<f64>,
}

impl Sums {
    fn det(&self) -> f64 {
        self.s0 * self.s2 - self.s1 * self.s1
    }

    /// Energy that the best amplitude at this rate explains.
    fn energy(&self) -> f64 {
        self.b0.norm_sqr() / self.s0
    }
}

/// Fits from a first guess of decay and frequency. Deviations are those of white noise of the residual's own variance,
/// widened where the residual is not white.
pub(crate) fn fit(z: &[Complex<f64>], times: Times, guess: &Damped, limits: Limits) -> Damped {
    let duration = times.duration(z.len());
    let count = z.len() as f64;
    let total: f64 = z.iter().map(Complex::norm_sqr).sum();
    let widest = TAU * limits.off_hz;
    let bounded = |g: Complex<f64>| {
        let re = g.re.clamp(-limits.sigma, GROWTH / duration);
        Complex::new(re, g.im.clamp(-widest, widest))
    };
    let mut g = bounded(Complex::new(-guess.sigma, TAU * guess.delta_hz));
    let mut sums = pass(z, times, g);
    let mut shrink = 1.0;
    for _ in 0..ROUNDS {
        let det = sums.det();
        if !(det > 0.0 && sums.energy() > 0.0) {
            break;
        }
        // With the amplitude at its best for this rate, the step of the rate alone remains.
        let step = (sums.b1 * sums.s0 - sums.b0 * sums.s1) * sums.s0 / (sums.b0 * det);
        // One over the spread of the times that count is as far as the linearisation reaches.
        let reach = 0.5 * sums.s0 / det.sqrt();
        let step = step * (shrink * (reach / step.norm()).min(1.0));
        let next = bounded(g + step);
        let tried = pass(z, times, next);
        if !(tried.energy() >= sums.energy()) {
            shrink *= 0.25;
            if shrink < 1e-3 {
                break;
            }
            continue;
        }
        let noise = (total - tried.energy()).max(0.0) / count;
        let sd = (0.5 * noise * tried.s0 / det / (tried.energy() / tried.s0)).sqrt();
        g = next;
        sums = tried;
        shrink = 1.0;
        if step.norm() < SETTLED * sd {
            break;
        }
    }
    describe(z, times, g, &sums)
}

/// Residual variance, deviations and the like of a fitted exponential.
fn describe(z: &[Complex<f64>], times: Times, g: Complex<f64>, sums: &Sums) -> Damped {
    let a = if sums.s0 > 0.0 { sums.b0 / sums.s0 } else { Complex::default() };
    let mut y = a * (g * times.first_s).exp();
    let ratio = (g * times.step_s).exp();
    let (mut energy, mut lagged, mut rough) = (0.0, 0.0, 0.0);
    let mut before = Complex::<f64>::default();
    for (m, z) in z.iter().enumerate() {
        let r = z - y;
        energy += r.norm_sqr();
        if m > 0 {
            lagged += (r * before.conj()).re;
            rough += (r - before).norm_sqr();
        }
        before = r;
        y *= ratio;
    }
    let count = z.len() as f64;
    let noise = energy / (count - 2.0).max(1.0);
    // Noise as the differences of neighbouring residuals show it: a slow misfit is not in it.
    let fine = (0.5 * rough / (count - 1.0).max(1.0)).min(noise);
    let rho = if energy > 0.0 { lagged / energy } else { 0.0 };
    let coloured = rho > 2.0 / count.sqrt();
    let widen = if coloured { ((1.0 + rho) / (1.0 - rho).max(0.01)).min(100.0) } else { 1.0 };
    let det = sums.det().max(f64::MIN_POSITIVE);
    let half = 0.5 * noise * widen / a.norm_sqr().max(f64::MIN_POSITIVE);
    let rate_sd = (half * sums.s0 / det).sqrt();
    let explained = a.norm_sqr() * sums.s0;
    Damped {
        a,
        sigma: -g.re,
        delta_hz: g.im / TAU,
        snr: explained / noise.max(f64::MIN_POSITIVE),
        delta_sd_hz: rate_sd / TAU,
        sigma_sd: rate_sd,
        log_sd: (half * sums.s2 / det).sqrt(),
        noise: fine,
        left: noise,
        mean_square: explained / count + if coloured { noise - fine } else { 0.0 },
    }
}

/// One pass over the signal.
fn pass(z: &[Complex<f64>], times: Times, g: Complex<f64>) -> Sums {
    Arch::new().dispatch(Pass { z, times, g })
}

/// See [`pass`].
struct Pass<'a> {
    z: &'a [Complex<f64>],
    times: Times,
    g: Complex<f64>,
}

impl NullaryFnOnce for Pass<'_> {
    type Output = Sums;

    #[inline(always)]
    fn call(self) -> Sums {
        let Self { z, times, g } = self;
        let step = (g * times.step_s).exp();
        let mut e = (g * times.first_s).exp();
        let (mut e_re, mut e_im) = ([0.0; LANES], [0.0; LANES]);
        for i in 0..LANES {
            (e_re[i], e_im[i]) = (e.re, e.im);
            e *= step;
        }
        let far = step * step * step * step;
        let mut t: [f64; LANES] = core::array::from_fn(|i| times.first_s + i as f64 * times.step_s);
        let hop = LANES as f64 * times.step_s;
        let (mut s0, mut s1, mut s2) = ([0.0; LANES], [0.0; LANES], [0.0; LANES]);
        let (mut b0_re, mut b0_im) = ([0.0; LANES], [0.0; LANES]);
        let (mut b1_re, mut b1_im) = ([0.0; LANES], [0.0; LANES]);
        let mut take = |i: usize, z: Complex<f64>| {
            let power = e_re[i] * e_re[i] + e_im[i] * e_im[i];
            let re = e_re[i] * z.re + e_im[i] * z.im;
            let im = e_re[i] * z.im - e_im[i] * z.re;
            s0[i] += power;
            s1[i] += power * t[i];
            s2[i] += power * t[i] * t[i];
            b0_re[i] += re;
            b0_im[i] += im;
            b1_re[i] += re * t[i];
            b1_im[i] += im * t[i];
            let turned = e_re[i] * far.re - e_im[i] * far.im;
            e_im[i] = e_re[i] * far.im + e_im[i] * far.re;
            e_re[i] = turned;
            t[i] += hop;
        };
        let (whole, rest) = z.as_chunks::<LANES>();
        for z in whole {
            z.iter().enumerate().for_each(|(i, z)| take(i, *z));
        }
        rest.iter().enumerate().for_each(|(i, z)| take(i, *z));
        let sum = |x: [f64; LANES]| x.iter().sum::<f64>();
        Sums {
            s0: sum(s0),
            s1: sum(s1),
            s2: sum(s2),
            b0: Complex::new(sum(b0_re), sum(b0_im)),
            b1: Complex::new(sum(b1_re), sum(b1_im)),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::coarse::Search;
    use super::*;

    const TIMES: Times = Times { first_s: 0.0025, step_s: 0.005 };
    const LIMITS: Limits = Limits { off_hz: 30.0, sigma: 100.0 };

    /// Uniform numbers of -1 to 1 by D. Lehmer's method; twelve make a normal one.
    struct Noise(u64);

    impl Noise {
        fn normal(&mut self) -> f64 {
            let mut sum = 0.0;
            for _ in 0..12 {
                self.0 = self.0 * 48_271 % 2_147_483_647;
                sum += self.0 as f64 / 2_147_483_647.0;
            }
            sum - 6.0
        }
    }

    fn decaying(a: Complex<f64>, g: Complex<f64>, noise: f64, seed: u64) -> Vec<Complex<f64>> {
        let mut random = Noise(seed);
        let mut at = |m: f64| {
            let each = noise / 2.0f64.sqrt();
            let off = Complex::new(each * random.normal(), each * random.normal());
            a * (g * (TIMES.first_s + m * TIMES.step_s)).exp() + off
        };
        (0..600).map(|m| at(f64::from(m))).collect()
    }

    #[test]
    fn exact_exponentials_are_found_exactly() {
        for (sigma, hz) in
            [(0.0, 0.3), (0.9, -4.2), (6.9, 2.0), (23.0, 5.5), (60.0, -1.0), (-0.5, 1.0)]
        {
            let z = decaying(Complex::new(0.1, -0.2), Complex::new(-sigma, TAU * hz), 0.0, 1);
            let guess = Search::new(z.len()).run(&z, TIMES, (0.0, 6.0), 100.0);
            let found = fit(&z, TIMES, &guess, LIMITS);
            assert!((found.sigma - sigma).abs() < 1e-6, "{sigma} Np/s, {hz} Hz: {found:?}");
            assert!((found.delta_hz - hz).abs() < 1e-6, "{sigma} Np/s, {hz} Hz: {found:?}");
            let off = (found.a - Complex::new(0.1, -0.2)).norm();
            assert!(off < 1e-7, "{sigma} Np/s, {hz} Hz: {found:?}");
        }
    }

    #[test]
    fn errors_reach_the_bound_and_are_stated() {
        for (sigma, hz, noise) in [(0.0, 0.7, 0.3), (2.3, -3.1, 0.1), (23.0, 4.0, 0.03)] {
            let truth = Complex::from_polar(0.5, 1.0);
            let (mut rate, mut decay, mut level) = (0.0, 0.0, 0.0);
            let trials = 200;
            for seed in 1..=trials {
                let g = Complex::new(-sigma, TAU * hz);
                let z = decaying(truth, g, noise, 7919 * seed);
                let guess = Search::new(z.len()).run(&z, TIMES, (0.0, 6.0), 100.0);
                let found = fit(&z, TIMES, &guess, LIMITS);
                rate += ((found.delta_hz - hz) / found.delta_sd_hz).powi(2);
                decay += ((found.sigma - sigma) / found.sigma_sd).powi(2);
                level += ((found.a.norm() / truth.norm()).ln() / found.log_sd).powi(2);
            }
            for (what, sum) in [("frequency", rate), ("decay", decay), ("level", level)] {
                let rms = (sum / trials as f64).sqrt();
                assert!((0.85..1.15).contains(&rms), "{what}, {sigma} Np/s: {rms} deviations");
            }
        }
    }
}
