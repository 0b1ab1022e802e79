//! A damped complex exponential in white noise: `z[m] = a * exp(g t_m)`, `g = -sigma + i 2 pi delta`, by maximum
//! likelihood (nonlinear least squares, Gauss-Newton).
//!
//! The model is analytic in its complex unknowns, so the real normal equations fall apart into two equal halves: the same
//! 2 by 2 matrix of real sums serves amplitude and rate, and its inverse is the Cramer-Rao bound (Y. Hua & T. Sarkar, IEEE
//! TASSP 38(5):814-824, 1990, treat the same model).

use core::f64::consts::TAU;

use realfft::num_complex::Complex;

/// Rounds of Gauss-Newton.
const ROUNDS: usize = 5;
/// Decay rates tried first, in nepers per second: about 60 dB in never, 4, 1.2, 0.4 and 0.15 s.
const DECAYS: [f64; 5] = [0.0, 1.7, 5.8, 17.0, 46.0];
/// Frequencies tried first are this many resolutions (one over the duration) apart.
const GRID: f64 = 0.5;

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
    /// Noise variance of one block.
    pub(crate) noise: f64,
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

/// Sums of one pass over the signal for a rate `g`.
#[derive(Default)]
struct Sums {
    s0: f64,
    s1: f64,
    s2: f64,
    b0: Complex<f64>,
    b1: Complex<f64>,
}

/// First guess: the best of a grid of decays and frequencies within `reach_hz` of `around_hz`.
pub(crate) fn search(z: &[Complex<f64>], times: Times, around_hz: f64, reach_hz: f64) -> Damped {
    let duration = z.len() as f64 * times.step_s;
    let spacing = GRID / duration;
    let steps = crate::convert::nearest_index((reach_hz / spacing).ceil()).clamp(1, 64);
    let mut best = (0.0, 0.0, 0.0);
    for i in 0..=2 * steps {
        let delta = around_hz + (i as f64 - steps as f64) * spacing;
        for sigma in DECAYS {
            if sigma * duration < 0.5 && sigma > 0.0 {
                continue;
            }
            let s = pass(z, times, Complex::new(-sigma, TAU * delta), 0);
            let power = s.b0.norm_sqr() / s.s0;
            if power > best.0 {
                best = (power, sigma, delta);
            }
        }
    }
    let s = pass(z, times, Complex::new(-best.1, TAU * best.2), 0);
    Damped { a: s.b0 / s.s0, sigma: best.1, delta_hz: best.2, ..Damped::default() }
}

/// Fits from a first guess. Deviations are those of white noise of the residual's own variance, widened where the
/// residual is not white.
pub(crate) fn fit(z: &[Complex<f64>], times: Times, guess: &Damped) -> Damped {
    let duration = z.len() as f64 * times.step_s;
    let mut g = Complex::new(-guess.sigma, TAU * guess.delta_hz);
    let mut a = guess.a;
    let mut sums = Sums::default();
    for _ in 0..ROUNDS {
        sums = pass(z, times, g, 1);
        let det = sums.s0 * sums.s2 - sums.s1 * sums.s1;
        if !(det > 0.0) {
            break;
        }
        // With a at its best for this rate, the step of the rate alone remains.
        a = sums.b0 / sums.s0;
        let step = (sums.b1 * sums.s0 - sums.b0 * sums.s1) / det;
        if !(a.norm_sqr() > 0.0) {
            break;
        }
        let step = step / a;
        let limit = 2.0 / duration;
        let step = if step.norm() > limit { step * (limit / step.norm()) } else { step };
        g += step;
        g.re = g.re.clamp(-400.0, 20.0 / duration);
        if step.norm() * duration < 1e-9 {
            break;
        }
    }
    let sums_now = pass(z, times, g, 1);
    if sums_now.s0 > 0.0 {
        a = sums_now.b0 / sums_now.s0;
        sums = sums_now;
    }
    describe(z, times, a, g, &sums)
}

/// Residual variance, deviations and the like of a fitted exponential.
fn describe(
    z: &[Complex<f64>],
    times: Times,
    a: Complex<f64>,
    g: Complex<f64>,
    sums: &Sums,
) -> Damped {
    let mut y = a * (g * times.first_s).exp();
    let ratio = (g * times.step_s).exp();
    let (mut energy, mut lagged, mut total, mut rough) = (0.0, 0.0, 0.0, 0.0);
    let (mut before, mut z_before) = (Complex::default(), Complex::default());
    for (m, z) in z.iter().enumerate() {
        let r = z - y;
        energy += r.norm_sqr();
        total += z.norm_sqr();
        if m > 0 {
            lagged += (r * Complex::conj(&before)).re;
            rough += (r - before).norm_sqr();
        }
        before = r;
        z_before = *z;
        y *= ratio;
    }
    let _ = z_before;
    let count = z.len() as f64;
    let noise = energy / (count - 2.0).max(1.0);
    // Noise as the differences of neighbouring residuals show it: a slow misfit is not in it.
    let fine = (0.5 * rough / (count - 1.0).max(1.0)).min(noise);
    let rho = if energy > 0.0 { lagged / energy } else { 0.0 };
    let widen = if rho > 2.0 / count.sqrt() {
        ((1.0 + rho) / (1.0 - rho).max(0.01)).min(100.0)
    } else {
        1.0
    };
    let det = (sums.s0 * sums.s2 - sums.s1 * sums.s1).max(f64::MIN_POSITIVE);
    let half = 0.5 * noise * widen / a.norm_sqr().max(f64::MIN_POSITIVE);
    let rate_sd = (half * sums.s0 / det).sqrt();
    Damped {
        a,
        sigma: -g.re,
        delta_hz: g.im / TAU,
        snr: a.norm_sqr() * sums.s0 / noise.max(f64::MIN_POSITIVE),
        delta_sd_hz: rate_sd / TAU,
        sigma_sd: rate_sd,
        log_sd: (half * sums.s2 / det).sqrt(),
        noise: fine,
        mean_square: (total / count - fine).max(0.0),
    }
}

/// One pass: sums for the amplitude, and with `order` 1 for the rate too.
fn pass(z: &[Complex<f64>], times: Times, g: Complex<f64>, order: usize) -> Sums {
    let mut e = (g * times.first_s).exp();
    let ratio = (g * times.step_s).exp();
    let mut t = times.first_s;
    let mut s = Sums::default();
    if order == 0 {
        for z in z {
            s.s0 += e.norm_sqr();
            s.b0 += e.conj() * z;
            e *= ratio;
        }
        return s;
    }
    for z in z {
        let power = e.norm_sqr();
        let share = e.conj() * z;
        s.s0 += power;
        s.s1 += power * t;
        s.s2 += power * t * t;
        s.b0 += share;
        s.b1 += share * t;
        e *= ratio;
        t += times.step_s;
    }
    s
}
