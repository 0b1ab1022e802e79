//! Random tones over the ranges that the project's figures are stated for.

use std::sync::Arc;

use plumbtone_analysis::signals::{
    Random, Timbre, Tone, TonePartial, add_noise, narrow, sample_count,
};

use crate::bounds;

/// Length of every tone, in seconds.
const DURATION_S: f64 = 3.0;
/// Sample rates in Hz.
const RATES_HZ: [f64; 3] = [44_100.0, 48_000.0, 96_000.0];
/// Fundamentals: A0 to C8.
const F0_HZ: (f64, f64) = (27.5, 4_186.0);
/// Inharmonicity other than 0.
const B: (f64, f64) = (1e-5, 2e-3);
/// Ratios of total tone power to total noise power, in dB.
const SNR_DB: [f64; 4] = [20.0, 40.0, 60.0, 80.0];
/// Decay times of a tone's first partial, in seconds.
const T60_S: (f64, f64) = (0.3, 8.0);

/// A tone in noise, with its truth.
#[derive(Debug, Clone)]
pub struct Case {
    /// What it is, for messages.
    pub name: Arc<str>,
    /// The tone.
    pub tone: Tone,
    /// Total tone power over total noise power, in dB.
    pub snr_db: f64,
    /// Standard deviation of the noise.
    pub noise_sd: f64,
    /// The sound.
    pub samples: Vec<f32>,
}

impl Case {
    /// A tone that holds its levels: f0 27.5 to 4186 Hz, B 0 to 2e-3, up to 40 partials, some missing or weak.
    #[must_use]
    pub fn steady(seed: u64) -> Self {
        let mut random = Random::new(seed);
        let tone = steady_tone(&mut random);
        let snr_db = random.pick(&SNR_DB);
        Self::noisy(seed, random, tone, snr_db)
    }

    /// A tone whose partials each fall at their own rate: T60 from 0.3 to 8 s, the upper partials never slower.
    #[must_use]
    pub fn decaying(seed: u64) -> Self {
        let mut random = Random::new(seed);
        let mut tone = steady_tone(&mut random);
        let first = random.log_between(T60_S.0, T60_S.1);
        let faster = random.between(0.0, 0.7);
        for partial in &mut tone.partials {
            let scatter = random.log_between(0.8, 1.0);
            let t60 = first * scatter * f64::from(partial.number).powf(-faster);
            partial.decay_db_per_s = 60.0 / t60.max(T60_S.0);
        }
        let snr_db = random.pick(&SNR_DB[1..]);
        Self::noisy(seed, random, tone, snr_db)
    }

    fn noisy(seed: u64, mut random: Random, tone: Tone, snr_db: f64) -> Self {
        let mut sound = tone.render(sample_count(DURATION_S, tone.sample_rate_hz));
        let variance = add_noise(&mut random, &mut sound, snr_db);
        let name = format!(
            "seed {seed}: f0 {:.3} Hz, B {:.2e}, {} partials, SNR {snr_db} dB, {} Hz",
            tone.f0_hz,
            tone.b,
            tone.partials.len(),
            tone.sample_rate_hz
        );
        Self { name: name.into(), snr_db, noise_sd: variance.sqrt(), samples: narrow(&sound), tone }
    }

    /// What a bound needs to know of the observation.
    #[must_use]
    pub fn observation(&self) -> bounds::Observation {
        bounds::Observation { samples: self.samples.len(), noise_sd: self.noise_sd }
    }

    /// Mean power of a partial over the noise within 1 Hz, in dB.
    #[must_use]
    pub fn snr_in_1_s_db(&self, partial: &TonePartial) -> f64 {
        let duration = self.samples.len() as f64 / self.tone.sample_rate_hz;
        // Power falls by e^-r over the sound; its mean over an exponential is (1 - e^-r) / r of the start's.
        let r = partial.decay_db_per_s * duration * core::f64::consts::LN_10 / 10.0;
        let mean = if r > 0.0 { -(-r).exp_m1() / r } else { 1.0 };
        let in_1_hz = 2.0 * self.noise_sd.powi(2) / self.tone.sample_rate_hz;
        10.0 * (mean * partial.amplitude.powi(2) / 2.0 / in_1_hz).log10()
    }
}

fn steady_tone(random: &mut Random) -> Tone {
    let rate = random.pick(&RATES_HZ);
    let f0_hz = random.log_between(F0_HZ.0, F0_HZ.1);
    let b = if random.uniform() < 0.25 { 0.0 } else { random.log_between(B.0, B.1) };
    let timbre = Timbre {
        partials: random.pick(&[40, 40, 40, 30, 20, 10, 6]),
        level_dbfs: random.between(-30.0, -9.0),
        tilt_db_per_octave: random.between(-10.0, -1.0),
        scatter_db: random.between(0.0, 5.0),
        t60_s: None,
    };
    let mut tone = Tone::random(random, rate, f0_hz, b, &timbre);
    match random.pick(&[0, 0, 0, 1, 2, 3]) {
        // Odd partials only, as of a stopped pipe.
        1 => tone.partials.retain(|p| p.number % 2 == 1),
        // Some upper partials missing.
        2 => tone.partials.retain(|p| p.number < 5 || random.uniform() < 0.8),
        // A fundamental 20 dB weaker than it would be, as of a low guitar string.
        3 => tone.partials[0].amplitude *= 0.1,
        _ => {}
    }
    tone
}
