//! What a check is set to.

use crate::settings::SettingsError;

/// Default of the shortest span that counts, in seconds: longer than half a swing of the slowest vibrato (132 ms at 3.8 Hz),
/// so that one swing that is not recognised as vibrato is no span.
const MIN_SPAN_S: f64 = 0.15;

/// Settings of a [`Check`](super::Check).
#[derive(Debug, Clone, PartialEq)]
pub struct CheckSettings {
    /// Sample rate in Hz.
    pub sample_rate_hz: f64,
    /// Samples between two readings: [`Analyzer::hop`](crate::Analyzer::hop).
    pub hop: usize,
    /// How far the heard pitch may lie from its reference, in cents, 0.1 to 1200.
    pub tolerance_cents: f64,
    /// Shortest stretch outside the tolerance that counts, in seconds, 0.02 to 60.
    pub min_span_s: f64,
    /// Share of the sounding time that must be measured for a verdict, 0 to 1.
    pub min_share: f64,
}

impl CheckSettings {
    /// The defaults for the readings of an engine: 10 cents, 150 ms, half of the sounding time.
    #[must_use]
    pub fn new(sample_rate_hz: f64, hop: usize) -> Self {
        Self { sample_rate_hz, hop, tolerance_cents: 10.0, min_span_s: MIN_SPAN_S, min_share: 0.5 }
    }

    /// Checks every value against its range.
    ///
    /// # Errors
    /// The first value found outside its range, with that range.
    pub fn validate(&self) -> Result<(), SettingsError> {
        let within = |what, value: f64, (low, high): (f64, f64)| {
            if value >= low && value <= high {
                Ok(())
            } else {
                Err(SettingsError { what, value, low, high })
            }
        };
        within("sample rate in Hz", self.sample_rate_hz, (8_000.0, 384_000.0))?;
        within("time between readings in seconds", self.hop_s(), (0.001, 0.02))?;
        within("tolerance in cents", self.tolerance_cents, (0.1, 1200.0))?;
        within("shortest span in seconds", self.min_span_s, (0.02, 60.0))?;
        within("least measured share", self.min_share, (0.0, 1.0))
    }

    /// Seconds between two readings.
    pub(super) fn hop_s(&self) -> f64 {
        self.hop as f64 / self.sample_rate_hz
    }
}
