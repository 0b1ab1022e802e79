//! The sound that is measured: notes of all registers, one after the other, in a little noise.

use plumbtone_analysis::signals::{Random, Timbre, Tone, add_at, add_noise, sample_count};

/// Length of each note, in seconds.
const NOTE_S: f64 = 1.0;

/// Seeded notes from 40 to 1500 Hz, decaying, some stiff, at 60 dB over white noise.
pub(crate) fn notes(sample_rate_hz: f64, duration_s: f64) -> Vec<f64> {
    let mut random = Random::new(150);
    let mut sound = vec![0.0; sample_count(duration_s, sample_rate_hz)];
    let note = sample_count(NOTE_S, sample_rate_hz);
    for start in (0..sound.len()).step_by(note) {
        let f0 = random.log_between(40.0, 1500.0);
        let b = random.pick(&[0.0, 1e-4, 5e-4]);
        let timbre = Timbre { partials: 128, t60_s: Some((1.0, 8.0)), ..Timbre::default() };
        let tone = Tone::random(&mut random, sample_rate_hz, f0, b, &timbre);
        add_at(&mut sound, start, &tone.render(note));
    }
    add_noise(&mut random, &mut sound, 60.0);
    sound
}
