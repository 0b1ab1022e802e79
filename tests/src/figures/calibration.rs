//! Errors over the deviations that the engine states for them.

use super::errors::Errors;

/// Errors in units of the stated deviation, per kind of figure.
#[derive(Debug, Clone, Default)]
pub struct Calibration {
    /// Fundamentals of notes.
    pub f0: Errors,
    /// Partial frequencies.
    pub frequency: Errors,
    /// Partial levels.
    pub level: Errors,
    /// Inharmonicity.
    pub b: Errors,
    /// Decays.
    pub decay: Errors,
    /// Fundamentals of readings in the state "steady".
    pub frame_f0: Errors,
}

impl Calibration {
    /// Adds all of another.
    pub fn append(&mut self, other: Self) {
        self.f0.append(other.f0);
        self.frequency.append(other.frequency);
        self.level.append(other.level);
        self.b.append(other.b);
        self.decay.append(other.decay);
        self.frame_f0.append(other.frame_f0);
    }

    /// Each kind with its name.
    #[must_use]
    pub fn kinds(&self) -> [(&'static str, &Errors); 6] {
        [
            ("f0", &self.f0),
            ("partial frequency", &self.frequency),
            ("level", &self.level),
            ("B", &self.b),
            ("decay", &self.decay),
            ("f0 of readings", &self.frame_f0),
        ]
    }
}
