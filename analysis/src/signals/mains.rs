//! Mains hum: steady cosines at multiples of the mains frequency.

use super::random::Random;
use super::samples::amplitude;
use super::tone::{Tone, TonePartial};

/// A hum with its truth.
#[derive(Debug, Clone, PartialEq)]
pub struct Hum {
    /// Mains frequency, 50 or 60 Hz.
    pub base_hz: f64,
    /// The multiples present; `number` is the multiple.
    pub lines: Vec<TonePartial>,
}

impl Hum {
    /// Lines at the given multiples and levels in dBFS, with random phases.
    #[must_use]
    pub fn new(random: &mut Random, base_hz: f64, lines: &[(u32, f64)]) -> Self {
        let lines = lines
            .iter()
            .map(|&(number, level_dbfs)| TonePartial {
                number,
                frequency_hz: Tone::frequency_of(base_hz, 0.0, number),
                amplitude: amplitude(level_dbfs),
                phase_rad: random.phase(),
                decay_db_per_s: 0.0,
            })
            .collect();
        Self { base_hz, lines }
    }

    /// Adds the hum to `sound`, from its first sample on.
    pub fn add_to(&self, sound: &mut [f64], sample_rate_hz: f64) {
        for line in &self.lines {
            line.add_to(sound, sample_rate_hz);
        }
    }
}
