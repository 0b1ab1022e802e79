//! Arithmetic on whole sounds: sums, powers, levels, narrowing.

/// Narrows to the engine's sample format.
#[must_use]
#[expect(clippy::cast_possible_truncation, reason = "rounding to the sample format is the purpose")]
pub fn narrow(samples: &[f64]) -> Vec<f32> {
    samples.iter().map(|&x| x as f32).collect()
}

/// Number of samples nearest to a duration; 0 for a negative one.
#[must_use]
#[expect(clippy::cast_possible_truncation, reason = "rounded first, and `as` saturates")]
#[expect(clippy::cast_sign_loss, reason = "`as` saturates at 0")]
pub fn sample_count(seconds: f64, sample_rate_hz: f64) -> usize {
    (seconds * sample_rate_hz).round() as usize
}

/// Adds `part` to the start of `sound`; what reaches beyond its end is left out.
pub fn add(sound: &mut [f64], part: &[f64]) {
    add_at(sound, 0, part);
}

/// Adds `part` to `sound` from sample `start` on; what reaches beyond its end is left out.
pub fn add_at(sound: &mut [f64], start: usize, part: &[f64]) {
    for (x, y) in sound.iter_mut().skip(start).zip(part) {
        *x += y;
    }
}

/// Mean of the squares; 0 for no samples.
#[must_use]
pub fn mean_power(samples: &[f64]) -> f64 {
    samples.iter().map(|x| x * x).sum::<f64>() / samples.len().max(1) as f64
}

/// Peak amplitude of a sine of the given level.
#[must_use]
pub fn amplitude(level_dbfs: f64) -> f64 {
    10.0_f64.powf(level_dbfs / 20.0)
}

/// Level in dBFS of a sine of the given peak amplitude.
#[must_use]
pub fn level_db(amplitude: f64) -> f64 {
    20.0 * amplitude.log10()
}
