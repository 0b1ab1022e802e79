//! Saw, square and pulse waves sampled without any band limit, whose aliases are known exactly.
//!
//! Sampling a wave folds each partial above the Nyquist frequency to `|f - fs round(f / fs)|` at its full amplitude.

use core::f64::consts::{FRAC_PI_2, PI};

/// Shape of a wave between -1 and 1 (pulse: 0 and 1).
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Shape {
    /// Rises from -1 to 1, then jumps.
    Saw,
    /// 1, then -1, for half a period each.
    Square,
    /// 1 for this share of the period, then 0.
    Pulse(f64),
}

/// A partial of a sampled wave, or what became of it above the Nyquist frequency.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WavePartial {
    /// Partial number, from 1.
    pub number: u32,
    /// Times it was folded about a multiple of half the sample rate: 0 for a partial in its place.
    pub folds: u32,
    /// Frequency after folding, in Hz.
    pub frequency_hz: f64,
    /// Peak amplitude.
    pub amplitude: f64,
    /// Cosine phase at the first sample, in radians, -pi to pi, after folding.
    pub phase_rad: f64,
}

/// A wave sampled without band limit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NaiveWave {
    /// Sample rate in Hz.
    pub sample_rate_hz: f64,
    /// Shape.
    pub shape: Shape,
    /// Fundamental in Hz.
    pub f0_hz: f64,
    /// Peak of the wave (of a pulse: its height).
    pub peak: f64,
    /// Place in the period of the first sample, 0 to 1.
    pub start_turns: f64,
}

impl NaiveWave {
    /// The samples.
    #[must_use]
    pub fn render(&self, samples: usize) -> Vec<f64> {
        let step = self.f0_hz / self.sample_rate_hz;
        (0..samples)
            .map(|n| self.peak * self.value((self.start_turns + step * n as f64).fract()))
            .collect()
    }

    /// Every partial of at least `floor_db` relative to the strongest (a negative number of dB), in its place or folded,
    /// by rising number.
    #[must_use]
    pub fn partials(&self, floor_db: f64) -> Vec<WavePartial> {
        let coefficients = |number: u32| self.coefficient(number);
        // No partial of these shapes is stronger than 2/(pi n), twice that for the square.
        let strongest = (1..=64).map(|n| coefficients(n).0).fold(0.0, f64::max);
        let floor = strongest * 10.0_f64.powf(floor_db / 20.0);
        (1_u32..)
            .take_while(|&n| 4.0 * self.peak / (PI * f64::from(n)) >= floor)
            .map(|n| self.folded(n))
            .filter(|p| p.amplitude >= floor)
            .collect()
    }

    fn value(&self, turns: f64) -> f64 {
        match self.shape {
            Shape::Saw => 2.0 * turns - 1.0,
            Shape::Square if turns < 0.5 => 1.0,
            Shape::Square => -1.0,
            Shape::Pulse(width) if turns < width => 1.0,
            Shape::Pulse(_) => 0.0,
        }
    }

    /// Amplitude and cosine phase of a Fourier coefficient, for a period that starts at the first sample.
    fn coefficient(&self, number: u32) -> (f64, f64) {
        let n = f64::from(number);
        let (size, phase) = match self.shape {
            Shape::Saw => (2.0 / (PI * n), FRAC_PI_2),
            Shape::Square if number % 2 == 1 => (4.0 / (PI * n), -FRAC_PI_2),
            Shape::Square => (0.0, 0.0),
            // A pulse that starts at 0 is one centred at 0, delayed by half its width.
            Shape::Pulse(width) => {
                let signed = 2.0 * (PI * n * width).sin() / (PI * n);
                let turn = if signed < 0.0 { PI } else { 0.0 };
                (signed.abs(), turn - PI * n * width)
            }
        };
        (self.peak * size, phase + 2.0 * PI * n * self.start_turns)
    }

    #[expect(clippy::cast_possible_truncation, reason = "the number of folds is far below 2^32")]
    #[expect(clippy::cast_sign_loss, reason = "frequencies are positive")]
    fn folded(&self, number: u32) -> WavePartial {
        let (amplitude, phase) = self.coefficient(number);
        let frequency = self.f0_hz * f64::from(number);
        let signed = frequency - self.sample_rate_hz * (frequency / self.sample_rate_hz).round();
        // cos(-w t + phase) = cos(w t - phase).
        let phase = if signed < 0.0 { -phase } else { phase };
        WavePartial {
            number,
            folds: (frequency / (self.sample_rate_hz / 2.0)).floor() as u32,
            frequency_hz: signed.abs(),
            amplitude,
            phase_rad: phase - 2.0 * PI * (phase / (2.0 * PI)).round(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Cosine transform of the sampled wave at one frequency, with a Hann window over a long stretch.
    fn measured(sound: &[f64], turns_per_sample: f64) -> (f64, f64) {
        let count = sound.len() as f64;
        let (mut re, mut im) = (0.0, 0.0);
        for (n, x) in sound.iter().enumerate() {
            let window = 1.0 - (2.0 * PI * n as f64 / count).cos();
            let (sin, cos) = (2.0 * PI * (turns_per_sample * n as f64).fract()).sin_cos();
            re += window * x * cos;
            im -= window * x * sin;
        }
        (2.0 * re.hypot(im) / count, im.atan2(re))
    }

    #[test]
    fn aliases_have_the_stated_frequency_level_and_phase() {
        for shape in [Shape::Saw, Shape::Square, Shape::Pulse(0.31)] {
            let wave = NaiveWave {
                sample_rate_hz: 48_000.0,
                shape,
                f0_hz: 1234.567,
                peak: 0.5,
                start_turns: 0.2,
            };
            let sound = wave.render(480_000);
            for p in wave.partials(-32.0) {
                let (amplitude, phase) = measured(&sound, p.frequency_hz / 48_000.0);
                let turn = (phase - p.phase_rad) / (2.0 * PI);
                assert!(
                    (amplitude / p.amplitude - 1.0).abs() < 0.02,
                    "{shape:?} {p:?}: {amplitude}"
                );
                assert!((turn - turn.round()).abs() < 0.01, "{shape:?} {p:?}: phase {phase}");
            }
        }
    }

    #[test]
    fn folds_follow_the_published_examples() {
        let wave = |f0_hz| NaiveWave {
            sample_rate_hz: 44_100.0,
            shape: Shape::Saw,
            f0_hz,
            peak: 1.0,
            start_turns: 0.0,
        };
        // 7 and 13 times 3520 Hz at 44.1 kHz.
        let (seventh, thirteenth) = (wave(3520.0).folded(7), wave(3520.0).folded(13));
        assert!((seventh.frequency_hz - 19_460.0).abs() < 1e-9, "{seventh:?}");
        assert!((thirteenth.frequency_hz - 1_660.0).abs() < 1e-9, "{thirteenth:?}");
        assert_eq!((seventh.folds, thirteenth.folds), (1, 2), "times folded");
    }
}
