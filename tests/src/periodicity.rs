//! How well a sound repeats with each period, by the plain definition: a reference without any decision in it.

use realfft::RealFftPlanner;
use realfft::num_complex::Complex;

use crate::cast::index;

/// Points of the correlation per sample of lag: between them the straight line is off by less than 1 % of the height of
/// a cosine at a quarter of the sample rate.
const POINTS: usize = 8;
/// Samples compared: at least this many, and at least this many periods.
const COMPARED: (usize, usize) = (2048, 6);

/// Correlation of the start of a sound with the sound later on, as a function of the lag.
#[derive(Debug, Clone)]
pub struct Periodicity(Vec<f64>);

impl Periodicity {
    /// Compares the start of `sound` (six times `period` samples, if it is that long) with later stretches of the same
    /// length, up to `longest` samples later. The lag is continuous: the correlation is interpolated without band limit.
    ///
    /// # Errors
    /// Never in practice: the buffers are made by the transforms themselves.
    pub fn of(sound: &[f32], period: f64, longest: f64) -> Result<Self, realfft::FftError> {
        let lags = index(longest.ceil()) + 2;
        let wanted = COMPARED.0.max(COMPARED.1 * index(period));
        let count = wanted.min(sound.len().saturating_sub(lags));
        let later = &sound[..sound.len().min(count + lags)];
        let products = products(later, count)?;
        let energies = energies(later, count);
        let own = energies.first().copied().unwrap_or(0.0);
        let correlation =
            products.into_iter().take(lags * POINTS).enumerate().map(|(i, product)| {
                let energy = between(&energies, i as f64 / POINTS as f64);
                if energy > 0.0 && own > 0.0 { product / (own * energy).sqrt() } else { 0.0 }
            });
        Ok(Self(correlation.collect()))
    }

    /// Normalised correlation at a lag in samples: 1 for an exact repetition; 0 beyond the longest lag.
    #[must_use]
    pub fn at(&self, lag: f64) -> f64 {
        between(&self.0, lag * POINTS as f64)
    }
}

/// Sum over the first `count` samples of their products with the samples a lag later, `POINTS` values per sample of lag.
fn products(sound: &[f32], count: usize) -> Result<Vec<f64>, realfft::FftError> {
    let length = (2 * sound.len()).next_power_of_two();
    let mut planner = RealFftPlanner::<f64>::new();
    let forward = planner.plan_fft_forward(length);
    let transform = |samples: &[f32]| {
        let mut input = forward.make_input_vec();
        for (x, &sample) in input.iter_mut().zip(samples) {
            *x = f64::from(sample);
        }
        let mut output = forward.make_output_vec();
        forward.process(&mut input, &mut output)?;
        Ok(output)
    };
    let (start, whole) = (transform(&sound[..count])?, transform(sound)?);
    // A longer spectrum of the same lines is the same function on a finer grid.
    let inverse = planner.plan_fft_inverse(length * POINTS);
    let mut lines = inverse.make_input_vec();
    for ((line, a), b) in lines.iter_mut().zip(&start).zip(&whole) {
        *line = a.conj() * b / length as f64;
    }
    // The line at the old Nyquist frequency would count double.
    lines[length / 2] = Complex::default();
    let mut products = inverse.make_output_vec();
    inverse.process(&mut lines, &mut products)?;
    Ok(products)
}

/// Energy of each stretch of `count` samples, by its start.
fn energies(sound: &[f32], count: usize) -> Vec<f64> {
    let square = |n: usize| f64::from(sound[n]).powi(2);
    let mut energy: f64 = (0..count).map(square).sum();
    let mut energies = vec![energy];
    for start in 1..=sound.len() - count {
        energy += square(start + count - 1) - square(start - 1);
        energies.push(energy.max(0.0));
    }
    energies
}

fn between(values: &[f64], place: f64) -> f64 {
    let whole = index(place.floor());
    match (values.get(whole), values.get(whole + 1)) {
        (Some(a), Some(b)) => a + (b - a) * (place - place.floor()),
        _ => 0.0,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use plumbtone_analysis::signals::{Tone, narrow};

    #[test]
    fn a_tone_repeats_with_its_period_only() {
        let tone = Tone::new(48_000.0, 311.1, 0.0, 30, |n| 0.1 / f64::from(n));
        let period = 48_000.0 / 311.1;
        let sound = narrow(&tone.render(20_000));
        let periodicity = Periodicity::of(&sound, period, 2.5 * period).unwrap();
        for (periods, least, most) in [(1.0, 0.999, 1.001), (2.0, 0.999, 1.001), (1.5, -0.6, 0.2)] {
            let found = periodicity.at(periods * period);
            assert!(found > least && found < most, "{periods} periods: {found}");
        }
    }
}
