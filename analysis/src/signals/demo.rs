//! The embedded demo sound: a stiff plucked string a little sharp, over mains hum, with aliases in it; then the same string
//! held while its pitch drifts slowly flat.

use super::mains::Hum;
use super::motion::Motion;
use super::moving::MovingTone;
use super::noise::white_noise;
use super::random::Random;
use super::samples::{add_at, narrow, sample_count};
use super::tone::{Timbre, Tone, TonePartial};

/// Sample rate of the demo, in Hz.
const SAMPLE_RATE_HZ: f64 = 48_000.0;
/// A3, and how far above it the string is tuned, in cents.
const NOTE: (f64, f64) = (220.0, 7.0);
/// Stiffness of a wound string.
const B: f64 = 1.2e-4;
/// Partials of the plucked string, as a synthesiser without band limit makes them: partial 82 and those above it fold.
const PLUCKED_PARTIALS: u32 = 100;
/// Partials of the held string.
const HELD_PARTIALS: u32 = 30;
/// Start and length of the two notes, in seconds, and the length of the whole.
const PLUCK_S: (f64, f64) = (0.25, 3.0);
const HELD_S: (f64, f64) = (3.75, 6.0);
const WHOLE_S: f64 = 10.0;
/// Drift of the held note, in cents per second.
const DRIFT_CENTS_PER_S: f64 = -3.0;
/// Attack and release of both notes, in seconds.
const EDGE_S: f64 = 0.004;

/// The demo sound with its truth.
#[derive(Debug, Clone)]
pub struct Demo {
    /// Sample rate in Hz.
    pub sample_rate_hz: f64,
    /// The samples.
    pub samples: Vec<f32>,
    /// First and last second of the plucked note.
    pub pluck_s: (f64, f64),
    /// The plucked string's partials below the Nyquist frequency.
    pub pluck: Tone,
    /// What the others became: folded, under their numbers.
    pub aliases: Vec<TonePartial>,
    /// First and last second of the held note.
    pub held_s: (f64, f64),
    /// The held note; time 0 is its start.
    pub held: MovingTone,
    /// The hum under both notes, as behind a noise gate: alone it would be a note of its own.
    pub hum: Hum,
}

/// Renders the demo sound: the same samples every time.
#[must_use]
pub fn demo() -> Demo {
    let mut random = Random::new(220);
    let f0_hz = NOTE.0 * 2.0_f64.powf(NOTE.1 / 1200.0);
    let timbre = Timbre { tilt_db_per_octave: -7.0, ..Timbre::default() };
    let (pluck, aliases) = pluck(&mut random, f0_hz, &timbre);
    let timbre = Timbre { partials: HELD_PARTIALS, ..timbre };
    let held_tone = Tone::random(&mut random, SAMPLE_RATE_HZ, f0_hz, B, &timbre);
    let motion = Motion { drift_cents_per_s: DRIFT_CENTS_PER_S, ..Motion::default() };
    let held = MovingTone::new(held_tone, motion, HELD_S.1);
    let hum = Hum::new(&mut random, 50.0, &[(1, -58.0), (2, -66.0), (3, -62.0)]);

    let mut pluck_sound = pluck.render(sample_count(PLUCK_S.1, SAMPLE_RATE_HZ));
    for alias in &aliases {
        alias.add_to(&mut pluck_sound, SAMPLE_RATE_HZ);
    }
    let mut held_sound = held.render(sample_count(HELD_S.1, SAMPLE_RATE_HZ));
    let mut sound = white_noise(&mut random, sample_count(WHOLE_S, SAMPLE_RATE_HZ), 1e-9);
    for (part, (start_s, _)) in [(&mut pluck_sound, PLUCK_S), (&mut held_sound, HELD_S)] {
        hum.add_to(part, SAMPLE_RATE_HZ);
        soften_edges(part);
        add_at(&mut sound, sample_count(start_s, SAMPLE_RATE_HZ), part);
    }
    let span = |(start, length)| (start, start + length);
    Demo {
        sample_rate_hz: SAMPLE_RATE_HZ,
        samples: narrow(&sound),
        pluck_s: span(PLUCK_S),
        pluck,
        aliases,
        held_s: span(HELD_S),
        held,
        hum,
    }
}

/// The plucked string: what stays below the Nyquist frequency, and what folds about it.
fn pluck(random: &mut Random, f0_hz: f64, timbre: &Timbre) -> (Tone, Vec<TonePartial>) {
    let timbre = Timbre { partials: PLUCKED_PARTIALS, t60_s: Some((2.0, 5.0)), ..*timbre };
    let mut tone = Tone::random(random, 2.0 * SAMPLE_RATE_HZ, f0_hz, B, &timbre);
    let nyquist = SAMPLE_RATE_HZ / 2.0;
    let folding = tone.partials.iter().position(|p| p.frequency_hz >= nyquist);
    let mut aliases = tone.partials.split_off(folding.unwrap_or(tone.partials.len()));
    for alias in &mut aliases {
        alias.frequency_hz = SAMPLE_RATE_HZ - alias.frequency_hz;
        alias.phase_rad = -alias.phase_rad;
    }
    tone.sample_rate_hz = SAMPLE_RATE_HZ;
    (tone, aliases)
}

fn soften_edges(sound: &mut [f64]) {
    let edge = sample_count(EDGE_S, SAMPLE_RATE_HZ);
    let last = sound.len() - 1;
    for n in 0..edge {
        let gain = n as f64 / edge as f64;
        sound[n] *= gain;
        sound[last - n] *= gain;
    }
}
