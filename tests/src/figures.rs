//! The accuracy figures of the project, measured on seeded random sounds: what the tests hold to thresholds and the study
//! prints.

mod aliases;
mod calibration;
mod case;
mod claims;
mod decays;
mod drift;
mod errors;
mod exact;
mod hum;
mod live;
mod moving;
mod vibrato;

pub use aliases::{AliasFigures, aliases, detuned_aliases};
pub use calibration::Calibration;
pub use case::Case;
pub use claims::{ClaimFigures, claims};
pub use decays::{DecayFigures, decays};
pub use drift::{DriftFigures, drifts};
pub use errors::{Errors, Tally};
pub use exact::{ExactFigures, exact};
pub use hum::hum;
pub use live::{LiveFigure, live};
pub use moving::{MovingFigures, moving};
pub use vibrato::recorded_vibrato;

/// Which random cases are drawn.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Draw {
    /// Seed of the first case; the others follow.
    pub seed: u64,
    /// Number of cases.
    pub count: u64,
}

impl Draw {
    /// The seeds.
    #[must_use]
    pub fn seeds(self) -> std::ops::Range<u64> {
        self.seed..self.seed + self.count
    }
}
