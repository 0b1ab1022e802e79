//! A tone whose pitch moves, rendered with the exact integral of its frequency as phase.

use core::f64::consts::{PI, TAU};

use super::motion::Motion;
use super::tone::Tone;

/// Length of the fade at the edges of a pause, in seconds: short, but without a click.
const FADE_S: f64 = 0.005;

/// A tone and its movement.
#[derive(Debug, Clone, PartialEq)]
pub struct MovingTone {
    /// The tone at rest; its partials keep their frequency ratios and amplitudes, and their decays.
    pub tone: Tone,
    /// The movement.
    pub motion: Motion,
}

impl MovingTone {
    /// Joins a tone and a movement over `duration_s`, leaving out the partials that would reach the Nyquist frequency.
    #[must_use]
    pub fn new(mut tone: Tone, motion: Motion, duration_s: f64) -> Self {
        let highest = 2.0_f64.powf(motion.highest_cents(duration_s) / 1200.0);
        let nyquist = tone.sample_rate_hz / 2.0;
        tone.partials.retain(|p| p.frequency_hz * highest < nyquist);
        Self { tone, motion }
    }

    /// Fundamental (of the stiff-string model) at a time in seconds, in Hz.
    #[must_use]
    pub fn f0_hz(&self, time_s: f64) -> f64 {
        self.tone.f0_hz * 2.0_f64.powf(self.motion.cents(time_s) / 1200.0)
    }

    /// Whether the tone sounds at full level at a time in seconds.
    #[must_use]
    #[expect(clippy::float_cmp, reason = "the gain is exactly 1 outside pauses and fades")]
    pub fn sounds(&self, time_s: f64) -> bool {
        self.gain(time_s) == 1.0
    }

    /// The samples, from the tone's first on.
    #[must_use]
    pub fn render(&self, samples: usize) -> Vec<f64> {
        let rate = self.tone.sample_rate_hz;
        let mut sound = vec![0.0; samples];
        // Turns of the fundamental, by the midpoint rule: its error over one sample is below 1e-10 turns even for a
        // semitone of vibrato at 10 Hz, and does not add up.
        let mut turns = 0.0;
        for (n, sample) in sound.iter_mut().enumerate() {
            let time_s = n as f64 / rate;
            let gain = self.gain(time_s);
            if gain > 0.0 {
                *sample = gain * self.sample(turns, time_s);
            }
            turns += self.f0_hz((n as f64 + 0.5) / rate) / rate;
        }
        sound
    }

    fn sample(&self, turns: f64, time_s: f64) -> f64 {
        let partials = self.tone.partials.iter();
        partials
            .map(|p| {
                let phase = TAU * turns * (p.frequency_hz / self.tone.f0_hz) + p.phase_rad;
                let fall = if p.decay_db_per_s == 0.0 {
                    1.0
                } else {
                    10.0_f64.powf(-p.decay_db_per_s * time_s / 20.0)
                };
                p.amplitude * fall * phase.cos()
            })
            .sum()
    }

    fn gain(&self, time_s: f64) -> f64 {
        let fade = |distance_s: f64| {
            let x = (distance_s / FADE_S).clamp(0.0, 1.0);
            0.5 - 0.5 * (PI * x).cos()
        };
        let pauses = self.motion.pauses.iter();
        pauses.map(|&(from, to)| fade((from - time_s).max(time_s - to))).fold(1.0, f64::min)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_motion_of_nothing_renders_the_tone_itself() {
        let tone = Tone::new(48_000.0, 220.0, 1e-4, 20, |n| 0.1 / f64::from(n));
        let still = tone.render(20_000);
        let moving = MovingTone::new(tone, Motion::default(), 1.0).render(20_000);
        let worst = still.iter().zip(&moving).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max);
        assert!(worst < 1e-9, "worst difference {worst}");
    }

    #[test]
    fn a_linear_drift_has_the_phase_of_its_closed_integral() {
        let tone = Tone::new(48_000.0, 220.0, 0.0, 1, |_| 1.0);
        let motion = Motion { drift_cents_per_s: 600.0, ..Motion::default() };
        let sound = MovingTone::new(tone, motion, 2.0).render(96_000);
        let rate = 600.0 / 1200.0 * core::f64::consts::LN_2;
        for n in [1_usize, 1000, 95_999] {
            let turns = 220.0 * (rate * n as f64 / 48_000.0).exp_m1() / rate;
            let expected = (TAU * turns).cos();
            assert!(
                (sound[n] - expected).abs() < 1e-6,
                "sample {n}: {} against {expected}",
                sound[n]
            );
        }
    }
}
