//! Cramer-Rao bounds: the least standard deviations that any unbiased estimator can reach in white Gaussian noise.
//!
//! The Fisher information of `x[n] = sum A cos(2 pi f n / fs + phase)` is exact for every length; only [`sinusoid`] is
//! the usual approximation, which leaves out a tone's own image. Tones are taken to hold: their decay is not looked at.
//! Sources: D. Rife and R. Boorstyn, IEEE Trans. IT
//! 20(5):591-598, 1974; S. Kay, Fundamentals of Statistical Signal Processing I, 1993, sec. 3.10 and ex. 3.14.

mod fisher;

use core::f64::consts::TAU;

use nalgebra::DMatrix;
use plumbtone_analysis::signals::Tone;

/// How a tone is observed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Observation {
    /// Number of samples, from the tone's first on.
    pub samples: usize,
    /// Standard deviation of the white noise, per sample.
    pub noise_sd: f64,
}

/// Bounds of one partial when every frequency, amplitude and phase is unknown and free.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PartialBound {
    /// Of the frequency, in Hz.
    pub frequency_sd_hz: f64,
    /// Of the peak amplitude.
    pub amplitude_sd: f64,
    /// Of the phase at the first sample, in radians.
    pub phase_sd_rad: f64,
}

/// Bounds of the model's two parameters when both, and all amplitudes and phases, are unknown.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StiffBound {
    /// Of f0, in Hz.
    pub f0_sd_hz: f64,
    /// Of B.
    pub b_sd: f64,
    /// Correlation of the errors of f0 and B.
    pub correlation: f64,
}

/// Bounds of one sinusoid of unknown frequency, amplitude and phase, leaving out its image: good beyond a few periods.
#[must_use]
pub fn sinusoid(sample_rate_hz: f64, amplitude: f64, observation: &Observation) -> PartialBound {
    let n = observation.samples as f64;
    let noise = observation.noise_sd.powi(2);
    let eta = amplitude.powi(2) / (2.0 * noise);
    let radians_per_sample = (12.0 / (eta * n * (n * n - 1.0))).sqrt();
    PartialBound {
        frequency_sd_hz: radians_per_sample * sample_rate_hz / TAU,
        amplitude_sd: (2.0 * noise / n).sqrt(),
        phase_sd_rad: (2.0 * (2.0 * n - 1.0) / (eta * n * (n + 1.0))).sqrt(),
    }
}

/// Bounds of every partial by itself, in the tone's order. `None` when the samples cannot tell them apart.
#[must_use]
pub fn partials(tone: &Tone, observation: &Observation) -> Option<Vec<PartialBound>> {
    let count = tone.partials.len();
    let covariance = covariance(&fisher::free(tone, observation))?;
    let to_start = fisher::centre(observation.samples);
    let bounds = (0..count).map(|l| {
        let (w, a, p) = (l, count + l, 2 * count + l);
        // phase at the start = phase at the centre - to_start * w
        let phase = covariance[(p, p)] - 2.0 * to_start * covariance[(w, p)]
            + to_start.powi(2) * covariance[(w, w)];
        PartialBound {
            frequency_sd_hz: covariance[(w, w)].sqrt() * tone.sample_rate_hz / TAU,
            amplitude_sd: covariance[(a, a)].sqrt(),
            phase_sd_rad: phase.sqrt(),
        }
    });
    Some(bounds.collect())
}

/// Bounds of f0 and B together. `None` when the samples or the partials (fewer than two) cannot tell them apart.
#[must_use]
pub fn stiff(tone: &Tone, observation: &Observation) -> Option<StiffBound> {
    if tone.partials.len() < 2 {
        return None;
    }
    let covariance = model_covariance(tone, observation, &[slope_f0, slope_b])?;
    let (f0_sd_hz, b_sd) = (covariance[(0, 0)].sqrt(), covariance[(1, 1)].sqrt());
    Some(StiffBound { f0_sd_hz, b_sd, correlation: covariance[(0, 1)] / (f0_sd_hz * b_sd) })
}

/// Bound of f0 in Hz when B is known (a harmonic tone, say). `None` when the samples cannot tell the partials apart.
#[must_use]
pub fn f0_hz(tone: &Tone, observation: &Observation) -> Option<f64> {
    model_covariance(tone, observation, &[slope_f0]).map(|covariance| covariance[(0, 0)].sqrt())
}

/// Derivative of a partial's frequency by f0.
fn slope_f0(tone: &Tone, number: u32) -> f64 {
    Tone::frequency_of(1.0, tone.b, number)
}

/// Derivative of a partial's frequency by B.
fn slope_b(tone: &Tone, number: u32) -> f64 {
    let n = f64::from(number);
    tone.f0_hz * n.powi(3) / (2.0 * (1.0 + tone.b * n * n).sqrt())
}

/// Covariance bound of the parameters that move all frequencies, each given by its slopes, then of the amplitudes and
/// phases.
fn model_covariance(
    tone: &Tone,
    observation: &Observation,
    slopes: &[fn(&Tone, u32) -> f64],
) -> Option<DMatrix<f64>> {
    let (count, own) = (tone.partials.len(), slopes.len());
    // Rows: frequencies, amplitudes, phases; columns: the parameters, amplitudes, phases.
    let chain = DMatrix::from_fn(3 * count, own + 2 * count, |row, column| {
        if row < count && column < own {
            slopes[column](tone, tone.partials[row].number) * TAU / tone.sample_rate_hz
        } else if row >= count && column >= own && row - count == column - own {
            1.0
        } else {
            0.0
        }
    });
    covariance(&(chain.transpose() * fisher::free(tone, observation) * &chain))
}

/// Inverse of an information matrix, whose parameters may differ in unit by many powers of ten.
fn covariance(information: &DMatrix<f64>) -> Option<DMatrix<f64>> {
    let scale = information.diagonal().map(|entry| 1.0 / entry.sqrt());
    let scale = DMatrix::from_diagonal(&scale);
    let unit = (&scale * information * &scale).cholesky()?;
    Some(&scale * unit.inverse() * &scale)
}
