//! Chords: several tones at once.

use super::random::Random;
use super::samples::add;
use super::tone::{Timbre, Tone};

/// Tones of one timbre at the given distances from a lowest pitch, in semitones of equal temperament.
#[must_use]
pub fn chord(random: &mut Random, lowest: &Tone, semitones: &[f64], timbre: &Timbre) -> Vec<Tone> {
    let pitch = |semitones: f64| lowest.f0_hz * 2.0_f64.powf(semitones / 12.0);
    let rest = semitones.iter().map(|&distance| {
        Tone::random(random, lowest.sample_rate_hz, pitch(distance), lowest.b, timbre)
    });
    core::iter::once(lowest.clone()).chain(rest).collect()
}

/// The samples of tones that start together.
#[must_use]
pub fn render_together(tones: &[Tone], samples: usize) -> Vec<f64> {
    let mut sound = vec![0.0; samples];
    for tone in tones {
        add(&mut sound, &tone.render(samples));
    }
    sound
}
