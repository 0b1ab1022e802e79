//! The parameters' values as the analysis sees them: a snapshot that travels to the worker as a mark.

use plumbtone_analysis::Settings;
use plumbtone_analysis::tuning::Tuning;

use crate::convert::count;
use crate::parameters::{Channel, Parameters, Reference, TemperamentChoice};

/// The parameters' values at one sample position.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Controls {
    pub(crate) concert_pitch_hz: f32,
    pub(crate) temperament: TemperamentChoice,
    pub(crate) channel: Channel,
    pub(crate) lowest_hz: f32,
    pub(crate) highest_hz: f32,
    pub(crate) integration_ms: f32,
    pub(crate) partials: i32,
    pub(crate) freeze: bool,
    pub(crate) capture: bool,
    pub(crate) check: bool,
    pub(crate) tolerance_cents: f32,
    pub(crate) reference: Reference,
    pub(crate) reference_hz: f32,
}

impl Controls {
    /// The present values; atomic loads only.
    pub(crate) fn of(parameters: &Parameters) -> Self {
        let Parameters { tuning, analysis, check, .. } = parameters;
        Self {
            concert_pitch_hz: tuning.concert_pitch.value(),
            temperament: tuning.temperament.value(),
            channel: analysis.channel.value(),
            lowest_hz: analysis.lowest.value(),
            highest_hz: analysis.highest.value(),
            integration_ms: analysis.integration.value(),
            partials: analysis.partials.value(),
            freeze: analysis.freeze.value(),
            capture: analysis.capture.value(),
            check: check.check.value(),
            tolerance_cents: check.tolerance.value(),
            reference: check.reference.value(),
            reference_hz: check.reference_pitch.value(),
        }
    }

    /// Settings of the engine: those of the command line wherever the parameters are at their defaults. The search range
    /// is put in order and spans an octave at least.
    pub(crate) fn settings(&self, sample_rate_hz: f64) -> Settings {
        let defaults = Settings::new(sample_rate_hz);
        let (a, b) = (f64::from(self.lowest_hz), f64::from(self.highest_hz));
        let lowest_hz = a.min(b).clamp(defaults.lowest_hz, defaults.highest_hz / 2.0);
        let highest_hz = a.max(b).clamp(2.0 * lowest_hz, defaults.highest_hz);
        Settings {
            lowest_hz,
            highest_hz,
            partials: count(self.partials),
            integration_s: self.integration_s(),
            ..defaults
        }
    }

    /// Time over which partials are averaged, in seconds.
    pub(crate) fn integration_s(&self) -> f64 {
        f64::from(self.integration_ms) / 1000.0
    }

    /// What notes are called.
    pub(crate) fn tuning(&self) -> Tuning {
        let TemperamentChoice(temperament) = self.temperament;
        Tuning::new(f64::from(self.concert_pitch_hz), temperament).unwrap_or_default()
    }
}

impl Default for Controls {
    fn default() -> Self {
        Self::of(&Parameters::default())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn defaults_are_those_of_the_command_line() {
        for rate in [8_000.0, 44_100.0, 48_000.0, 96_000.0, 192_000.0] {
            assert_eq!(Controls::default().settings(rate), Settings::new(rate), "{rate} Hz");
        }
    }

    #[test]
    fn any_values_make_sound_settings() {
        for lowest_hz in [20.0, 440.0, 5000.0] {
            for highest_hz in [20.0, 440.0, 5000.0] {
                for rate in [8_000.0, 48_000.0] {
                    let controls = Controls { lowest_hz, highest_hz, ..Controls::default() };
                    let settings = controls.settings(rate);
                    assert_eq!(settings.validate(), Ok(()), "{lowest_hz} {highest_hz} {rate}");
                }
            }
        }
    }
}
