//! How a pitch moves: drift, vibrato, steps and glides, in cents over time, and when it pauses.

use core::f64::consts::TAU;

/// A sinusoidal vibrato.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Vibrato {
    /// Rate in Hz.
    pub rate_hz: f64,
    /// Half of the whole range, in cents.
    pub extent_cents: f64,
    /// Sine phase at time 0, in radians.
    pub phase_rad: f64,
}

/// A point of a course of steps and glides.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Point {
    /// Time in seconds.
    pub time_s: f64,
    /// Distance from the tone's own pitch, in cents.
    pub cents: f64,
}

/// A movement: the sum of a drift, a vibrato and a course.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Motion {
    /// Linear drift, in cents per second.
    pub drift_cents_per_s: f64,
    /// Vibrato.
    pub vibrato: Option<Vibrato>,
    /// Points in order of time, joined by straight lines in cents and held before the first and after the last. Two
    /// points at one time make a step.
    pub course: Vec<Point>,
    /// Silences, from and to, in seconds, in order.
    pub pauses: Vec<(f64, f64)>,
}

impl Motion {
    /// Distance from the tone's own pitch at a time, in cents. At a step it is the later value.
    #[must_use]
    pub fn cents(&self, time_s: f64) -> f64 {
        let vibrato = self
            .vibrato
            .map_or(0.0, |v| v.extent_cents * (TAU * v.rate_hz * time_s + v.phase_rad).sin());
        self.drift_cents_per_s * time_s + vibrato + self.course_cents(time_s)
    }

    /// Highest distance from the tone's own pitch up to a time, in cents; not below it.
    #[must_use]
    pub fn highest_cents(&self, duration_s: f64) -> f64 {
        let vibrato = self.vibrato.map_or(0.0, |v| v.extent_cents);
        let course = self.course.iter().map(|p| p.cents).fold(0.0, f64::max);
        (self.drift_cents_per_s * duration_s).max(0.0) + vibrato + course
    }

    /// Distance in time to the nearest step, in seconds; infinite without steps.
    #[must_use]
    #[expect(clippy::float_cmp, reason = "a step is two points at the very same time")]
    pub fn nearest_step_s(&self, time_s: f64) -> f64 {
        self.course
            .windows(2)
            .filter(|pair| pair[0].time_s == pair[1].time_s)
            .map(|pair| (pair[0].time_s - time_s).abs())
            .fold(f64::INFINITY, f64::min)
    }

    fn course_cents(&self, time_s: f64) -> f64 {
        let after = self.course.partition_point(|p| p.time_s <= time_s);
        match (after.checked_sub(1).map(|i| self.course[i]), self.course.get(after)) {
            (Some(a), Some(b)) => {
                a.cents + (b.cents - a.cents) * (time_s - a.time_s) / (b.time_s - a.time_s)
            }
            (Some(only), None) => only.cents,
            (None, Some(only)) => only.cents,
            (None, None) => 0.0,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_course_steps_glides_and_holds() {
        let points = [(1.0, 0.0), (1.0, 100.0), (2.0, 100.0), (3.0, 300.0)];
        let course = points.map(|(time_s, cents)| Point { time_s, cents }).to_vec();
        let motion = Motion { course, ..Motion::default() };
        for (time, expected) in [(0.0, 0.0), (0.99, 0.0), (1.0, 100.0), (2.5, 200.0), (9.0, 300.0)]
        {
            assert!((motion.cents(time) - expected).abs() < 1e-9, "at {time} s");
        }
        assert!((motion.nearest_step_s(1.25) - 0.25).abs() < 1e-12, "the only step is at 1 s");
    }
}
