//! The embedded demo sound: a stiff plucked string a little sharp, over mains hum, with an alias in it; then the same
//! string held while its pitch drifts slowly flat.

use super::mains::Hum;
use super::motion::Motion;
use super::moving::MovingTone;
use super::noise::white_noise;
use super::random::Random;
use super::samples::{add_at, amplitude, narrow, sample_count};
use super::tone::{Timbre, Tone, TonePartial};

/// Sample rate of the demo, in Hz.
const SAMPLE_RATE_HZ: f64 = 48_000.0;
/// A3, and how far above it the string is tuned, in cents.
const NOTE: (f64, f64) = (220.0, 7.0);
/// Stiffness of a wound string.
const B: f64 = 1.2e-4;
/// The partial that folds: 80 * 221 Hz, stretched by its stiffness to 23.5 kHz, would still fit; this one does not.
const ALIASED_PARTIAL: u32 = 88;
/// Level of the alias, in dBFS.
const ALIAS_DBFS: f64 = -52.0;
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
    /// The plucked string's partials, without the alias.
    pub pluck: Tone,
    /// What the aliased partial became.
    pub alias: TonePartial,
    /// First and last second of the held note.
    pub held_s: (f64, f64),
    /// The held note; time 0 is its start.
    pub held: MovingTone,
    /// The hum under all of it.
    pub hum: Hum,
}

/// Renders the demo sound: the same samples every time.
#[must_use]
pub fn demo() -> Demo {
    let mut random = Random::new(220);
    let f0_hz = NOTE.0 * 2.0_f64.powf(NOTE.1 / 1200.0);
    let timbre = Timbre { partials: 30, tilt_db_per_octave: -7.0, ..Timbre::default() };
    let pluck_timbre = Timbre { t60_s: Some((2.0, 5.0)), ..timbre };
    let pluck = Tone::random(&mut random, SAMPLE_RATE_HZ, f0_hz, B, &pluck_timbre);
    let alias = alias(&mut random, f0_hz);
    let held_tone = Tone::random(&mut random, SAMPLE_RATE_HZ, f0_hz, B, &timbre);
    let motion = Motion { drift_cents_per_s: DRIFT_CENTS_PER_S, ..Motion::default() };
    let held = MovingTone::new(held_tone, motion, HELD_S.1);
    let hum = Hum::new(&mut random, 50.0, &[(1, -58.0), (2, -66.0), (3, -62.0)]);

    let mut pluck_sound = pluck.render(sample_count(PLUCK_S.1, SAMPLE_RATE_HZ));
    alias.add_to(&mut pluck_sound, SAMPLE_RATE_HZ);
    let mut held_sound = held.render(sample_count(HELD_S.1, SAMPLE_RATE_HZ));
    let mut sound = white_noise(&mut random, sample_count(WHOLE_S, SAMPLE_RATE_HZ), 1e-9);
    hum.add_to(&mut sound, SAMPLE_RATE_HZ);
    for (part, (start_s, _)) in [(&mut pluck_sound, PLUCK_S), (&mut held_sound, HELD_S)] {
        soften_edges(part);
        add_at(&mut sound, sample_count(start_s, SAMPLE_RATE_HZ), part);
    }
    let span = |(start, length)| (start, start + length);
    Demo {
        sample_rate_hz: SAMPLE_RATE_HZ,
        samples: narrow(&sound),
        pluck_s: span(PLUCK_S),
        pluck,
        alias,
        held_s: span(HELD_S),
        held,
        hum,
    }
}

fn alias(random: &mut Random, f0_hz: f64) -> TonePartial {
    let unfolded = Tone::frequency_of(f0_hz, B, ALIASED_PARTIAL);
    TonePartial {
        number: ALIASED_PARTIAL,
        frequency_hz: SAMPLE_RATE_HZ - unfolded,
        amplitude: amplitude(ALIAS_DBFS),
        phase_rad: random.phase(),
        decay_db_per_s: 0.0,
    }
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
