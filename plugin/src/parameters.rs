//! The parameters: what a host stores, shows and automates. Ids never change; values are stored in these units.

mod choices;
mod text;

use std::sync::Arc;
use std::sync::atomic::Ordering;

use atomic_float::AtomicF32;
use nice_plug::prelude::*;

pub use choices::{Channel, MidiOutput, Reference, TemperamentChoice};

use crate::captures::Captures;
use crate::check::Results;
use crate::keys::Sheet;
use crate::state::{Kept, Unsound};

/// All parameters, and what a session keeps beside them.
#[derive(Params, Debug)]
pub struct Parameters {
    /// What notes are called.
    #[nested(group = "Tuning")]
    pub tuning: TuningParameters,
    /// What is measured, and how.
    #[nested(group = "Analysis")]
    pub analysis: AnalysisParameters,
    /// The drift check.
    #[nested(group = "Check")]
    pub check: CheckParameters,
    /// What is sent while a check is outside.
    #[nested(group = "MIDI")]
    pub midi: MidiParameters,
    /// The part of the state that is no parameter.
    #[persist = "kept"]
    pub kept: Kept,
    /// The results of drift checks.
    #[persist = "checks"]
    pub results: Results,
    /// The key sheet.
    #[persist = "keys"]
    pub sheet: Sheet,
    /// The captures.
    #[persist = "captures"]
    pub captures: Captures,
    /// What of the last loaded state was unsound.
    #[persist = "unsound"]
    pub unsound: Unsound,
}

/// Concert pitch and temperament: they name notes and change no measurement.
#[derive(Params, Debug)]
pub struct TuningParameters {
    /// Frequency of A4, in Hz.
    #[id = "concert_pitch"]
    pub concert_pitch: FloatParam,
    /// The temperament.
    #[id = "temperament"]
    pub temperament: EnumParam<TemperamentChoice>,
}

/// What is measured.
#[derive(Params, Debug)]
pub struct AnalysisParameters {
    /// Which signal of a stereo pair.
    #[id = "channel"]
    pub channel: EnumParam<Channel>,
    /// Lowest fundamental searched, in Hz.
    #[id = "lowest"]
    pub lowest: FloatParam,
    /// Highest fundamental searched, in Hz.
    #[id = "highest"]
    pub highest: FloatParam,
    /// Time over which partials are averaged, in milliseconds.
    #[id = "integration"]
    pub integration: FloatParam,
    /// Number of partials.
    #[id = "partials"]
    pub partials: IntParam,
    /// Keeps the present reading on display.
    #[id = "freeze"]
    pub freeze: BoolParam,
    /// Keeps a capture each time it is switched on.
    #[id = "capture"]
    pub capture: BoolParam,
}

/// The drift check.
#[derive(Params, Debug)]
pub struct CheckParameters {
    /// Whether the check is armed.
    #[id = "check"]
    pub check: BoolParam,
    /// Largest distance from the reference that is still within, in cents.
    #[id = "tolerance"]
    pub tolerance: FloatParam,
    /// Where the pitch should be.
    #[id = "reference"]
    pub reference: EnumParam<Reference>,
    /// The pitch of [`Reference::Pitch`], in Hz.
    #[id = "reference_pitch"]
    pub reference_pitch: FloatParam,
}

/// The message that is sent while a check is outside.
#[derive(Params, Debug)]
pub struct MidiParameters {
    /// Which kind of message.
    #[id = "midi_output"]
    pub output: EnumParam<MidiOutput>,
    /// Number of the note or controller, 0 to 127.
    #[id = "midi_number"]
    pub number: IntParam,
    /// Channel, 1 to 16.
    #[id = "midi_channel"]
    pub channel: IntParam,
}

impl Default for Parameters {
    fn default() -> Self {
        let concert_pitch_hz = Arc::new(AtomicF32::new(STANDARD_HZ));
        Self {
            tuning: TuningParameters::new(&concert_pitch_hz),
            analysis: AnalysisParameters::new(&concert_pitch_hz),
            check: CheckParameters::new(&concert_pitch_hz),
            midi: MidiParameters::default(),
            kept: Kept::default(),
            results: Results::default(),
            sheet: Sheet::default(),
            captures: Captures::default(),
            unsound: Unsound::default(),
        }
    }
}

/// The standard pitch of A4, in Hz (ISO 16:1975).
const STANDARD_HZ: f32 = 440.0;

impl TuningParameters {
    fn new(concert_pitch_hz: &Arc<AtomicF32>) -> Self {
        let told = Arc::clone(concert_pitch_hz);
        let range = FloatRange::SymmetricalSkewed {
            min: 300.0,
            max: 600.0,
            factor: FloatRange::skew_factor(-1.0),
            center: STANDARD_HZ,
        };
        Self {
            concert_pitch: FloatParam::new("Concert pitch", STANDARD_HZ, range)
                .with_unit(" Hz")
                .with_callback(Arc::new(move |hz| told.store(hz, Ordering::Relaxed)))
                .with_value_to_string(Arc::new(|hz| format!("{hz:.2}")))
                .with_string_to_value(Arc::new(text::concert_pitch)),
            temperament: EnumParam::new("Temperament", TemperamentChoice::default()),
        }
    }
}

impl AnalysisParameters {
    fn new(concert_pitch_hz: &Arc<AtomicF32>) -> Self {
        Self {
            channel: EnumParam::new("Channel", Channel::Mid),
            lowest: frequency("Lowest pitch", 20.0, concert_pitch_hz),
            highest: frequency("Highest pitch", 5000.0, concert_pitch_hz),
            integration: FloatParam::new(
                "Integration time",
                400.0,
                FloatRange::Skewed {
                    min: 20.0,
                    max: 10_000.0,
                    factor: FloatRange::skew_factor(-2.0),
                },
            )
            .with_step_size(1.0)
            .with_unit(" ms")
            .with_value_to_string(Arc::new(|ms| format!("{ms:.0}")))
            .with_string_to_value(Arc::new(text::milliseconds)),
            partials: IntParam::new("Partials", 40, IntRange::Linear { min: 1, max: 128 }),
            freeze: BoolParam::new("Freeze", false),
            capture: BoolParam::new("Capture", false),
        }
    }
}

impl CheckParameters {
    fn new(concert_pitch_hz: &Arc<AtomicF32>) -> Self {
        Self {
            check: BoolParam::new("Check", false),
            tolerance: FloatParam::new(
                "Tolerance",
                5.0,
                FloatRange::Skewed { min: 0.1, max: 100.0, factor: FloatRange::skew_factor(-1.5) },
            )
            .with_unit(" ct")
            .with_value_to_string(Arc::new(|cents| format!("{cents:.1}")))
            .with_string_to_value(Arc::new(text::cents)),
            reference: EnumParam::new("Reference", Reference::NearestNote),
            reference_pitch: frequency("Reference pitch", STANDARD_HZ, concert_pitch_hz),
        }
    }
}

impl Default for MidiParameters {
    fn default() -> Self {
        let range = |min, max| IntRange::Linear { min, max };
        Self {
            output: EnumParam::new("MIDI output", MidiOutput::Off),
            // Middle C, and a controller without a meaning of its own.
            number: IntParam::new("MIDI number", 60, range(0, 127))
                .with_string_to_value(Arc::new(text::midi_number)),
            // Away from the channel that a track is mostly played on, which passes through.
            channel: IntParam::new("MIDI channel", 16, range(1, 16)),
        }
    }
}

/// A frequency in the engine's search range; entered as a note or in Hz.
fn frequency(name: &str, default_hz: f32, concert_pitch_hz: &Arc<AtomicF32>) -> FloatParam {
    let concert_pitch_hz = Arc::clone(concert_pitch_hz);
    let range =
        FloatRange::Skewed { min: 20.0, max: 5000.0, factor: FloatRange::skew_factor(-2.0) };
    FloatParam::new(name, default_hz, range)
        .with_unit(" Hz")
        .with_value_to_string(Arc::new(|hz| format!("{hz:.2}")))
        .with_string_to_value(Arc::new(move |entry| {
            text::frequency(entry, concert_pitch_hz.load(Ordering::Relaxed))
        }))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ids_are_those_of_the_sessions_out_there() {
        let ids: Vec<String> =
            Parameters::default().param_map().into_iter().map(|(id, ..)| id).collect();
        let stable = [
            "concert_pitch",
            "temperament",
            "channel",
            "lowest",
            "highest",
            "integration",
            "partials",
            "freeze",
            "capture",
            "check",
            "tolerance",
            "reference",
            "reference_pitch",
            "midi_output",
            "midi_number",
            "midi_channel",
        ];
        assert_eq!(ids, stable, "renaming one loses it in stored sessions");
    }

    #[test]
    fn shown_values_read_back_as_themselves() {
        let parameters = Parameters::default();
        for (id, ..) in parameters.param_map() {
            for step in 0..=50u8 {
                let normalized = f32::from(step) / 50.0;
                let shown = shown(&parameters, &id, normalized);
                let again = shown_of(&parameters, &id, &shown);
                assert_eq!(again.as_deref(), Some(shown.as_str()), "{id} at {normalized}");
            }
        }
    }

    fn shown(parameters: &Parameters, id: &str, normalized: f32) -> String {
        each(parameters, id, |p| p.shown(normalized))
    }

    fn shown_of(parameters: &Parameters, id: &str, text: &str) -> Option<String> {
        each(parameters, id, |p| p.entered(text).map(|normalized| p.shown(normalized)))
    }

    /// What the tests need of a parameter, whatever its type.
    trait Text {
        fn shown(&self, normalized: f32) -> String;
        fn entered(&self, text: &str) -> Option<f32>;
    }

    impl<P: Param> Text for P {
        fn shown(&self, normalized: f32) -> String {
            self.normalized_value_to_string(normalized, true)
        }
        fn entered(&self, text: &str) -> Option<f32> {
            self.string_to_normalized_value(text)
        }
    }

    fn each<R>(parameters: &Parameters, id: &str, f: impl Fn(&dyn Text) -> R) -> R {
        let Parameters { tuning, analysis, check, midi, .. } = parameters;
        match id {
            "concert_pitch" => f(&tuning.concert_pitch),
            "temperament" => f(&tuning.temperament),
            "channel" => f(&analysis.channel),
            "lowest" => f(&analysis.lowest),
            "highest" => f(&analysis.highest),
            "integration" => f(&analysis.integration),
            "partials" => f(&analysis.partials),
            "freeze" => f(&analysis.freeze),
            "capture" => f(&analysis.capture),
            "check" => f(&check.check),
            "tolerance" => f(&check.tolerance),
            "reference" => f(&check.reference),
            "reference_pitch" => f(&check.reference_pitch),
            "midi_output" => f(&midi.output),
            "midi_number" => f(&midi.number),
            "midi_channel" => f(&midi.channel),
            _ => panic!("no parameter {id}"),
        }
    }
}
