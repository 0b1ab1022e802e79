//! Sounds without a single pitch: drums, bursts of noise, clicks.

use core::f64::consts::{PI, TAU};

use super::random::Random;
use super::samples::{amplitude, sample_count};
use super::tone::TonePartial;

/// Frequency ratios of the first modes of an ideal circular membrane: zeros of Bessel functions over 2.4048.
const MEMBRANE: [f64; 8] = [1.0, 1.593, 2.136, 2.296, 2.653, 2.918, 3.156, 3.501];

/// A drum. Every hit differs in its random part.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Drum {
    /// A sine that falls from some 200 Hz towards some 50 Hz, quickly, then slowly.
    Kick,
    /// Two short modes under a burst of noise.
    Snare,
    /// A short burst of high noise.
    Hat,
    /// Modes of a circular membrane, which fit no harmonic series.
    Tom,
}

impl Drum {
    /// All drums.
    pub const ALL: [Self; 4] = [Self::Kick, Self::Snare, Self::Hat, Self::Tom];

    /// One hit with a peak level near `level_dbfs`.
    #[must_use]
    pub fn hit(self, random: &mut Random, sample_rate_hz: f64, level_dbfs: f64) -> Vec<f64> {
        let mut sound = match self {
            Self::Kick => kick(random, sample_rate_hz),
            Self::Snare => snare(random, sample_rate_hz),
            Self::Hat => hat(random, sample_rate_hz),
            Self::Tom => tom(random, sample_rate_hz),
        };
        let peak = sound.iter().fold(0.0_f64, |peak, x| peak.max(x.abs()));
        for x in &mut sound {
            *x *= amplitude(level_dbfs) / peak;
        }
        sound
    }
}

/// Single-sample clicks of random sign and level (-30 to -3 dBFS), `interval_s` apart on average.
#[must_use]
pub fn clicks(
    random: &mut Random,
    samples: usize,
    sample_rate_hz: f64,
    interval_s: f64,
) -> Vec<f64> {
    let mut sound = vec![0.0; samples];
    let mut at = 0;
    loop {
        at += sample_count(interval_s * random.between(0.3, 1.7), sample_rate_hz).max(1);
        let Some(sample) = sound.get_mut(at) else { return sound };
        *sample = random.pick(&[-1.0, 1.0]) * amplitude(random.between(-30.0, -3.0));
    }
}

fn kick(random: &mut Random, rate: f64) -> Vec<f64> {
    let (low, above) = (random.between(42.0, 60.0), random.between(80.0, 160.0));
    let mut turns = 0.0;
    (0..sample_count(0.35, rate))
        .map(|n| {
            let t = n as f64 / rate;
            let fall = above * ((-t / 0.03).exp() + 0.3 * (-t / 0.15).exp());
            turns += (low + fall) / rate;
            (TAU * turns).sin() * (-t / 0.07).exp() + 0.3 * random.normal() * (-t / 0.004).exp()
        })
        .collect()
}

fn snare(random: &mut Random, rate: f64) -> Vec<f64> {
    let (low, high) = (random.between(160.0, 200.0), random.between(280.0, 350.0));
    (0..sample_count(0.3, rate))
        .map(|n| {
            let t = n as f64 / rate;
            let modes = (TAU * low * t).sin() + 0.7 * (TAU * high * t).sin();
            0.6 * modes * (-t / 0.03).exp() + random.normal() * (-t / 0.06).exp()
        })
        .collect()
}

fn hat(random: &mut Random, rate: f64) -> Vec<f64> {
    let mut before = [0.0; 2];
    (0..sample_count(0.12, rate))
        .map(|n| {
            let x = random.normal();
            // The second difference rises by 12 dB per octave.
            let bright = x - 2.0 * before[0] + before[1];
            before = [x, before[0]];
            bright * (-(n as f64) / rate / 0.025).exp()
        })
        .collect()
}

fn tom(random: &mut Random, rate: f64) -> Vec<f64> {
    let lowest = random.between(80.0, 200.0);
    let mut sound = vec![0.0; sample_count(0.6, rate)];
    for (i, ratio) in (1..).zip(MEMBRANE) {
        let mode = TonePartial {
            number: i,
            frequency_hz: lowest * ratio,
            amplitude: random.between(0.3, 1.0),
            phase_rad: random.between(-PI, PI),
            decay_db_per_s: random.between(80.0, 200.0),
        };
        mode.add_to(&mut sound, rate);
    }
    sound
}
