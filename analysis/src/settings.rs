//! What an [`Analyzer`](crate::Analyzer) is told before the first sample: validated once, so that no later step fails.

use core::fmt;

/// Lowest and highest sample rate accepted, in Hz.
const SAMPLE_RATE_HZ: (f64, f64) = (8_000.0, 384_000.0);
/// Widest search range for the fundamental, in Hz.
const SEARCH_HZ: (f64, f64) = (20.0, 5_000.0);
/// Most partials that can be asked for.
const PARTIALS_MAX: usize = 128;
/// Shortest and longest integration time, in seconds.
const INTEGRATION_S: (f64, f64) = (0.02, 10.0);

/// Settings of an [`Analyzer`](crate::Analyzer). Concert pitch and temperament name notes and change no measurement, so
/// they are not here: see the module `tuning`.
#[derive(Debug, Clone, PartialEq)]
pub struct Settings {
    /// Sample rate in Hz, 8 000 to 384 000.
    pub sample_rate_hz: f64,
    /// Lowest fundamental searched, in Hz, at least 20.
    pub lowest_hz: f64,
    /// Highest fundamental searched, in Hz, at most 5 000 (and below the Nyquist frequency).
    pub highest_hz: f64,
    /// Number of partials measured, 1 to 128.
    pub partials: usize,
    /// Time over which the partials of a reading are averaged, in seconds, 0.02 to 10. The fundamental is never averaged.
    pub integration_s: f64,
}

impl Settings {
    /// The defaults at a sample rate: the whole search range, 40 partials, 400 ms.
    #[must_use]
    pub fn new(sample_rate_hz: f64) -> Self {
        Self {
            sample_rate_hz,
            lowest_hz: SEARCH_HZ.0,
            highest_hz: SEARCH_HZ.1.min(0.45 * sample_rate_hz),
            partials: 40,
            integration_s: 0.4,
        }
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
        within("sample rate in Hz", self.sample_rate_hz, SAMPLE_RATE_HZ)?;
        within("highest fundamental in Hz", self.highest_hz, (SEARCH_HZ.0, SEARCH_HZ.1))?;
        within(
            "highest fundamental in Hz",
            self.highest_hz,
            (SEARCH_HZ.0, self.sample_rate_hz / 2.0),
        )?;
        within("lowest fundamental in Hz", self.lowest_hz, (SEARCH_HZ.0, self.highest_hz))?;
        within("number of partials", self.partials as f64, (1.0, PARTIALS_MAX as f64))?;
        within("integration time in seconds", self.integration_s, INTEGRATION_S)
    }
}

/// A setting outside its range.
#[derive(Debug, Clone, Copy, PartialEq)]
#[non_exhaustive]
pub struct SettingsError {
    /// What was set, with its unit.
    pub what: &'static str,
    /// The value given.
    pub value: f64,
    /// Lowest value accepted.
    pub low: f64,
    /// Highest value accepted.
    pub high: f64,
}

impl fmt::Display for SettingsError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Self { what, value, low, high } = self;
        write!(f, "{what} is {value}, outside {low} to {high}")
    }
}

impl core::error::Error for SettingsError {}
