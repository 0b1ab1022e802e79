//! Fisher information of sinusoids in white noise, with sums over the samples in closed form.
//!
//! Time is counted from the centre of the samples, which makes odd sums vanish.

use core::f64::consts::TAU;

use nalgebra::DMatrix;
use plumbtone_analysis::signals::Tone;

use super::Observation;

/// Below this many radians over the whole observation, the sums are replaced by their limits (relative error 1e-8, as
/// large as the cancellation in the closed form there).
const SLOW: f64 = 1e-4;

/// Samples from the first one to the centre.
pub(super) fn centre(samples: usize) -> f64 {
    (samples as f64 - 1.0) / 2.0
}

/// Information on all frequencies (radians per sample), then all amplitudes, then all phases at the centre.
pub(super) fn free(tone: &Tone, observation: &Observation) -> DMatrix<f64> {
    let waves: Vec<Wave> = tone
        .partials
        .iter()
        .map(|partial| {
            let w = TAU * partial.frequency_hz / tone.sample_rate_hz;
            let phase = partial.phase_rad + w * centre(observation.samples);
            Wave { w, amplitude: partial.amplitude, phase }
        })
        .collect();
    let count = waves.len();
    let mut information = DMatrix::zeros(3 * count, 3 * count);
    for (l, a) in waves.iter().enumerate() {
        for (m, b) in waves.iter().enumerate() {
            let products = a.products(b, observation.samples);
            for (row, entries) in products.iter().enumerate() {
                for (column, entry) in entries.iter().enumerate() {
                    information[(row * count + l, column * count + m)] = *entry;
                }
            }
        }
    }
    information / observation.noise_sd.powi(2)
}

/// `amplitude * cos(w * t + phase)`, t in samples from the centre.
struct Wave {
    w: f64,
    amplitude: f64,
    phase: f64,
}

impl Wave {
    /// Sums over the samples of the products of the derivatives of this wave (rows: by w, amplitude, phase) and of
    /// another (columns). The derivatives are `-A t sin`, `cos`, `-A sin`.
    fn products(&self, other: &Self, samples: usize) -> [[f64; 3]; 3] {
        let (a, b) = (self.amplitude, other.amplitude);
        let difference = Sums::over(self.w - other.w, self.phase - other.phase, samples);
        let sum = Sums::over(self.w + other.w, self.phase + other.phase, samples);
        let t_sin_sin = (difference.t_cos - sum.t_cos) / 2.0;
        [
            [
                a * b * (difference.tt_cos - sum.tt_cos) / 2.0,
                -a * (sum.t_sin + difference.t_sin) / 2.0,
                a * b * t_sin_sin,
            ],
            [
                -b * (sum.t_sin - difference.t_sin) / 2.0,
                (difference.cos + sum.cos) / 2.0,
                -b * (sum.sin - difference.sin) / 2.0,
            ],
            [
                a * b * t_sin_sin,
                -a * (sum.sin + difference.sin) / 2.0,
                a * b * (difference.cos - sum.cos) / 2.0,
            ],
        ]
    }
}

/// Sums over the samples of cosines and sines of `w * t + phase`, weighted with 1, t or t^2.
struct Sums {
    cos: f64,
    sin: f64,
    t_cos: f64,
    t_sin: f64,
    tt_cos: f64,
}

impl Sums {
    fn over(w: f64, phase: f64, samples: usize) -> Self {
        let (even, odd, even_tt) = centred_sums(w, samples);
        let (sin, cos) = phase.sin_cos();
        Self {
            cos: even * cos,
            sin: even * sin,
            t_cos: -odd * sin,
            t_sin: odd * cos,
            tt_cos: even_tt * cos,
        }
    }
}

/// Sums over the centred samples of `cos(w t)`, `t sin(w t)`, `t^2 cos(w t)`: the Dirichlet kernel D and its
/// derivatives -D', -D''.
fn centred_sums(w: f64, samples: usize) -> (f64, f64, f64) {
    let n = samples as f64;
    let turns = (w / TAU).round();
    let w = w - turns * TAU;
    // Half-integer times see a whole turn as a change of sign.
    let sign = if samples.is_multiple_of(2) && turns % 2.0 != 0.0 { -1.0 } else { 1.0 };
    if w.abs() * n < SLOW {
        let moment = n * (n * n - 1.0) / 12.0;
        return (sign * n, sign * moment * w, sign * moment);
    }
    let (s, c) = (w / 2.0).sin_cos();
    let (wide_s, wide_c) = (n * w / 2.0).sin_cos();
    let d = wide_s / s;
    let d1 = (n / 2.0 * wide_c - d * c / 2.0) / s;
    let d2 = (-n * n / 4.0 * wide_s - d1 * c + d * s / 4.0) / s;
    (sign * d, -sign * d1, -sign * d2)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn closed_sums_equal_the_sums() {
        for samples in [7, 8, 101, 1000] {
            for w in [0.0, 1e-9, 1e-4, 0.01, 1.0, -2.0, 3.1, 6.2, TAU - 1e-9, TAU] {
                let closed = centred_sums(w, samples);
                let mut direct = (0.0, 0.0, 0.0);
                for n in 0..samples {
                    let t = n as f64 - centre(samples);
                    direct.0 += (w * t).cos();
                    direct.1 += t * (w * t).sin();
                    direct.2 += t * t * (w * t).cos();
                }
                let n = samples as f64;
                let near = |a: f64, b: f64, scale: f64| (a - b).abs() < 1e-7 * scale;
                assert!(
                    near(closed.0, direct.0, n)
                        && near(closed.1, direct.1, n * n)
                        && near(closed.2, direct.2, n * n * n),
                    "{samples} samples, w {w}: {closed:?} for {direct:?}"
                );
            }
        }
    }
    #[test]
    fn information_equals_the_products_of_the_derivatives() {
        // So short that the partials and their images leak into one another.
        let mut tone = Tone::new(1000.0, 31.0, 0.01, 5, |n| 1.0 / f64::from(n));
        for (partial, phase) in tone.partials.iter_mut().zip([0.3, -2.0, 1.7, 2.9, -0.4]) {
            partial.phase_rad = phase;
        }
        for samples in [40, 41] {
            let count = tone.partials.len();
            let derivatives = DMatrix::from_fn(samples, 3 * count, |n, column| {
                let partial = tone.partials[column % count];
                let w = TAU * partial.frequency_hz / 1000.0;
                let t = n as f64 - centre(samples);
                let angle = w * n as f64 + partial.phase_rad;
                match column / count {
                    0 => -partial.amplitude * t * angle.sin(),
                    1 => angle.cos(),
                    _ => -partial.amplitude * angle.sin(),
                }
            });
            let expected = derivatives.transpose() * &derivatives / 0.25;
            let found = free(&tone, &Observation { samples, noise_sd: 0.5 });
            let error = (&found - &expected).amax();
            assert!(error < 1e-8 * expected.amax(), "{samples} samples: off by {error}");
        }
    }
}
