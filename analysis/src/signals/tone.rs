//! A stiff harmonic tone that holds its pitch: every partial a decaying cosine of known frequency, amplitude and phase.

use core::f64::consts::{LN_10, TAU};

use super::random::Random;
use super::samples::amplitude;

/// Samples between two exact evaluations of an oscillator; between them it is turned on by complex multiplication,
/// whose rounding stays below 1e-13 over such a stretch.
const EXACT_EVERY: usize = 512;

/// One partial of a tone: `amplitude * 10^(-decay t / 20) * cos(2 pi f t + phase)`, `t` from the tone's first sample.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TonePartial {
    /// Partial number, from 1.
    pub number: u32,
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// Peak amplitude at the first sample.
    pub amplitude: f64,
    /// Cosine phase at the first sample, in radians.
    pub phase_rad: f64,
    /// Decay in dB per second.
    pub decay_db_per_s: f64,
}

impl TonePartial {
    /// Adds the partial to `sound`, from its first sample on.
    pub fn add_to(&self, sound: &mut [f64], sample_rate_hz: f64) {
        let step = TAU * self.frequency_hz / sample_rate_hz;
        let shrink = (-self.decay_db_per_s * LN_10 / 20.0 / sample_rate_hz).exp();
        let (turn_im, turn_re) = step.sin_cos();
        let (turn_re, turn_im) = (turn_re * shrink, turn_im * shrink);
        for (block, samples) in sound.chunks_mut(EXACT_EVERY).enumerate() {
            let first = (block * EXACT_EVERY) as f64;
            // Whole turns are dropped before they are multiplied by 2 pi, to keep the phase exact late in a long sound.
            let turns = (self.frequency_hz / sample_rate_hz * first).fract();
            let size = self.amplitude * shrink.powf(first);
            let (im, re) = (TAU * turns + self.phase_rad).sin_cos();
            let (mut re, mut im) = (re * size, im * size);
            for sample in samples {
                *sample += re;
                (re, im) = (re * turn_re - im * turn_im, re * turn_im + im * turn_re);
            }
        }
    }
}

/// How the partials of a random tone are drawn.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Timbre {
    /// Most partials; those at or above the Nyquist frequency are left out.
    pub partials: u32,
    /// Level of the strongest partial in dBFS.
    pub level_dbfs: f64,
    /// Slope of the levels over the partial number, in dB per octave.
    pub tilt_db_per_octave: f64,
    /// Standard deviation of the levels about that slope, in dB.
    pub scatter_db: f64,
    /// Shortest and longest time in which a partial falls by 60 dB, in seconds; drawn uniformly in the logarithm for
    /// each partial. `None` for partials that hold.
    pub t60_s: Option<(f64, f64)>,
}

impl Default for Timbre {
    fn default() -> Self {
        Self {
            partials: 40,
            level_dbfs: -12.0,
            tilt_db_per_octave: -6.0,
            scatter_db: 3.0,
            t60_s: None,
        }
    }
}

/// A tone that holds its pitch, with its truth.
#[derive(Debug, Clone, PartialEq)]
pub struct Tone {
    /// Sample rate in Hz.
    pub sample_rate_hz: f64,
    /// Fundamental of the stiff-string model, in Hz.
    pub f0_hz: f64,
    /// Inharmonicity coefficient.
    pub b: f64,
    /// The partials, by rising number.
    pub partials: Vec<TonePartial>,
}

impl Tone {
    /// A tone of up to `count` partials below the Nyquist frequency, each of the amplitude that `amplitude_of` gives for
    /// its number, in cosine phase and without decay.
    #[must_use]
    pub fn new(
        sample_rate_hz: f64,
        f0_hz: f64,
        b: f64,
        count: u32,
        mut amplitude_of: impl FnMut(u32) -> f64,
    ) -> Self {
        let partials = (1..=count)
            .map(|number| (number, Self::frequency_of(f0_hz, b, number)))
            .filter(|&(_, frequency_hz)| frequency_hz < sample_rate_hz / 2.0)
            .map(|(number, frequency_hz)| TonePartial {
                number,
                frequency_hz,
                amplitude: amplitude_of(number),
                phase_rad: 0.0,
                decay_db_per_s: 0.0,
            })
            .collect();
        Self { sample_rate_hz, f0_hz, b, partials }
    }

    /// A tone with random levels, phases and decays as `timbre` says.
    #[must_use]
    pub fn random(
        random: &mut Random,
        sample_rate_hz: f64,
        f0_hz: f64,
        b: f64,
        timbre: &Timbre,
    ) -> Self {
        let mut tone = Self::new(sample_rate_hz, f0_hz, b, timbre.partials, |number| {
            let slope = timbre.tilt_db_per_octave * f64::from(number).log2();
            amplitude(slope + timbre.scatter_db * random.normal())
        });
        let strongest = tone.partials.iter().map(|p| p.amplitude).fold(0.0, f64::max);
        for partial in &mut tone.partials {
            partial.amplitude *= amplitude(timbre.level_dbfs) / strongest;
            partial.phase_rad = random.phase();
            if let Some((shortest, longest)) = timbre.t60_s {
                partial.decay_db_per_s = 60.0 / random.log_between(shortest, longest);
            }
        }
        tone
    }

    /// Frequency of a partial of the stiff-string model.
    #[must_use]
    pub fn frequency_of(f0_hz: f64, b: f64, number: u32) -> f64 {
        let n = f64::from(number);
        n * f0_hz * (1.0 + b * n * n).sqrt()
    }

    /// The samples, from the tone's first on.
    #[must_use]
    pub fn render(&self, samples: usize) -> Vec<f64> {
        let mut sound = vec![0.0; samples];
        for partial in &self.partials {
            partial.add_to(&mut sound, self.sample_rate_hz);
        }
        sound
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rendering_equals_the_defining_formula() {
        let timbre = Timbre { t60_s: Some((0.3, 8.0)), ..Timbre::default() };
        let tone = Tone::random(&mut Random::new(5), 44_100.0, 311.1, 3e-4, &timbre);
        let sound = tone.render(50_000);
        for n in [0_u32, 1, 511, 512, 49_999] {
            let t = f64::from(n) / 44_100.0;
            let expected: f64 = tone
                .partials
                .iter()
                .map(|p| {
                    let size = p.amplitude * amplitude(-p.decay_db_per_s * t);
                    size * (TAU * p.frequency_hz * t + p.phase_rad).cos()
                })
                .sum();
            let found = sound[n as usize];
            assert!((found - expected).abs() < 1e-10, "sample {n}: {found} against {expected}");
        }
    }

    #[test]
    fn partials_stay_below_the_nyquist_frequency() {
        let tone = Tone::new(44_100.0, 4_186.0, 1e-3, 40, |_| 1.0);
        let numbers: Vec<u32> = tone.partials.iter().map(|p| p.number).collect();
        assert_eq!(numbers, [1, 2, 3, 4, 5], "partials of 4186 Hz under 22050 Hz");
    }
}
