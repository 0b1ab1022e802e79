//! White noise of a known power.

use super::random::Random;
use super::samples::{add, mean_power};

/// White normal noise of variance `power`.
#[must_use]
pub fn white_noise(random: &mut Random, samples: usize, power: f64) -> Vec<f64> {
    let sd = power.sqrt();
    (0..samples).map(|_| sd * random.normal()).collect()
}

/// Adds white noise `snr_db` under the sound and returns its variance. The ratio is total power of the sound, averaged
/// over all of it, over total power of the noise, from 0 to the Nyquist frequency.
pub fn add_noise(random: &mut Random, sound: &mut [f64], snr_db: f64) -> f64 {
    let variance = mean_power(sound) * 10.0_f64.powf(-snr_db / 10.0);
    let noise = white_noise(random, sound.len(), variance);
    add(sound, &noise);
    variance
}
