//! A sound's recipe: what a synthesiser needs to make it again, and the making of it.
//!
//! The recipe of one instant holds the partials' amplitudes, phases and ratios. A [`cycle`](Recipe::cycle) is one period of
//! the harmonic sound with these amplitudes and phases (partial `n` at harmonic `n`: one period cannot be stretched);
//! [`sound`](Recipe::sound) keeps the measured frequencies.

use core::f64::consts::TAU;

use crate::convert::{nearest, single};
use crate::reading::Reading;
use crate::stiff::DB_PER_NEPER;

/// One partial of a recipe.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ingredient {
    /// Partial number, from 1.
    pub number: u32,
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// Frequency over the fundamental of the stiff-string model.
    pub ratio: f64,
    /// Its standard deviation.
    pub ratio_sd: f64,
    /// Peak amplitude, full scale 1.0.
    pub amplitude: f64,
    /// Its standard deviation.
    pub amplitude_sd: f64,
    /// Cosine phase at the recipe's instant, in radians, -pi to pi.
    pub phase_rad: f64,
}

/// The recipe of one instant.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Recipe {
    /// Sample position of the instant.
    pub centre: u64,
    /// Fundamental of the stiff-string model, in Hz.
    pub f0_hz: f64,
    /// Partials by rising number.
    pub ingredients: Vec<Ingredient>,
}

impl Recipe {
    /// The recipe of a reading. `None` without a pitch or without partials.
    #[must_use]
    pub fn of(reading: &Reading) -> Option<Self> {
        let pitch = reading.pitch?;
        let ingredients: Vec<_> = (reading.partials.iter())
            .map(|p| {
                let amplitude = 10f64.powf(p.level_dbfs / 20.0);
                Ingredient {
                    number: p.number,
                    frequency_hz: p.frequency_hz,
                    ratio: p.frequency_hz / pitch.f0_hz,
                    ratio_sd: p.frequency_sd_hz / pitch.f0_hz,
                    amplitude,
                    amplitude_sd: amplitude * p.level_sd_db / DB_PER_NEPER,
                    phase_rad: p.phase_rad,
                }
            })
            .collect();
        let recipe = Self { centre: reading.centre, f0_hz: pitch.f0_hz, ingredients };
        (!recipe.ingredients.is_empty()).then_some(recipe)
    }

    /// The same recipe as it would stand at another moment: every phase turned so that the fundamental has phase `phase_rad`.
    /// Cycles cut at different moments then line up.
    #[must_use]
    pub fn turned_to(mut self, phase_rad: f64) -> Self {
        let first = self.ingredients.first().map_or(0.0, |p| p.phase_rad / f64::from(p.number));
        for p in &mut self.ingredients {
            let turned = p.phase_rad + f64::from(p.number) * (phase_rad - first);
            p.phase_rad = turned - TAU * nearest(turned / TAU);
        }
        self
    }

    /// One period in so many samples, beginning at the recipe's instant. Partials at half the sample count and above are left
    /// out, so that it is band-limited. Full scale is that of the sound.
    #[must_use]
    pub fn cycle(&self, samples: usize) -> Vec<f32> {
        let mut sums = vec![0.0f64; samples];
        let band = (self.ingredients.iter()).filter(|p| f64::from(p.number) < 0.5 * samples as f64);
        for p in band {
            let step = TAU * f64::from(p.number) / samples as f64;
            for (i, sum) in sums.iter_mut().enumerate() {
                *sum += p.amplitude * (step * i as f64 + p.phase_rad).cos();
            }
        }
        sums.into_iter().map(single).collect()
    }

    /// So many samples of the partials as they stand at the instant, which is sample `at` of them; partials at the Nyquist
    /// frequency and above are left out.
    #[must_use]
    pub fn sound(&self, sample_rate_hz: f64, samples: usize, at: usize) -> Vec<f32> {
        let mut sums = vec![0.0f64; samples];
        for p in self.ingredients.iter().filter(|p| p.frequency_hz < 0.5 * sample_rate_hz) {
            let step = TAU * p.frequency_hz / sample_rate_hz;
            for (i, sum) in sums.iter_mut().enumerate() {
                *sum += p.amplitude * (step * (i as f64 - at as f64) + p.phase_rad).cos();
            }
        }
        sums.into_iter().map(single).collect()
    }

    /// What the recipe leaves of the sound around its instant, in dB relative to the sound, under a Hann window over
    /// `around`, whose middle sample is the instant. `None` for silence.
    #[must_use]
    pub fn residual_db(&self, sample_rate_hz: f64, around: &[f32]) -> Option<f64> {
        let made = self.sound(sample_rate_hz, around.len(), around.len() / 2);
        let (mut left, mut whole) = (0.0, 0.0);
        for (i, (x, y)) in around.iter().zip(&made).enumerate() {
            let hann = 0.5 - 0.5 * (TAU * i as f64 / around.len() as f64).cos();
            let (x, y) = (hann * f64::from(*x), hann * f64::from(*y));
            left += (x - y) * (x - y);
            whole += x * x;
        }
        (whole > 0.0).then(|| 10.0 * (left / whole).log10())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn recipe() -> Recipe {
        let ingredient = |number: u32, amplitude, phase_rad| Ingredient {
            number,
            frequency_hz: 200.0 * f64::from(number),
            ratio: f64::from(number),
            ratio_sd: 0.0,
            amplitude,
            amplitude_sd: 0.0,
            phase_rad,
        };
        let ingredients =
            vec![ingredient(1, 0.5, 0.3), ingredient(2, 0.25, -2.0), ingredient(700, 0.1, 1.0)];
        Recipe { centre: 0, f0_hz: 200.0, ingredients }
    }

    #[test]
    fn a_cycle_is_the_defining_sum_without_what_it_cannot_hold() {
        let cycle = recipe().cycle(1024);
        for (i, x) in cycle.iter().enumerate() {
            let t = TAU * i as f64 / 1024.0;
            let exact = 0.5 * (t + 0.3).cos() + 0.25 * (2.0 * t - 2.0).cos();
            assert!((f64::from(*x) - exact).abs() < 1e-6, "sample {i}: {x} for {exact}");
        }
    }

    #[test]
    fn turning_shifts_the_cycle_in_time() {
        let (plain, turned) =
            (recipe().cycle(1024), recipe().turned_to(0.3 + TAU / 4.0).cycle(1024));
        for i in 0..1024 {
            let off = turned[i] - plain[(i + 256) % 1024];
            assert!(off.abs() < 1e-5, "sample {i}: off by {off}");
        }
    }

    #[test]
    fn the_sound_of_a_recipe_leaves_nothing_of_itself() {
        let recipe = recipe();
        let sound = recipe.sound(48_000.0, 4096, 2048);
        let left = recipe.residual_db(48_000.0, &sound).expect("it sounds");
        assert!(left < -120.0, "{left} dB are left");
        assert_eq!(recipe.residual_db(48_000.0, &[0.0; 64]), None, "silence");
    }
}
