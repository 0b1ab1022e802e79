//! The parameters as the editor handles them: by name, normalised, as text, and changed through gestures of the host.

use nice_plug::context::gui::ParamSetter;
use nice_plug::prelude::Param;

use crate::parameters::Parameters;

/// One of the parameters.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Knob {
    /// Frequency of A4.
    ConcertPitch,
    /// Temperament.
    Temperament,
    /// Which signal of a stereo pair.
    Channel,
    /// Lowest pitch searched.
    Lowest,
    /// Highest pitch searched.
    Highest,
    /// Integration time.
    Integration,
    /// Number of partials.
    Partials,
    /// Freeze.
    Freeze,
    /// Whether the drift check is armed.
    Check,
    /// Tolerance of the drift check.
    Tolerance,
    /// Reference of the drift check.
    Reference,
    /// Pitch of a fixed reference.
    ReferencePitch,
    /// What is sent while a check is outside.
    MidiOutput,
    /// Number of that note or controller.
    MidiNumber,
    /// Its channel.
    MidiChannel,
}

/// One step of a change that a host can undo and record. `Set` carries a normalised value, 0 to 1.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Gesture {
    /// A change begins.
    Begin(Knob),
    /// The value changes.
    Set(Knob, f32),
    /// The change ends.
    End(Knob),
}

/// What the editor needs of a parameter, whatever its type.
pub(crate) trait Handle {
    fn value(&self) -> f32;
    fn default(&self) -> f32;
    /// Number of steps, when there are few enough to choose from.
    fn steps(&self) -> Option<usize>;
    fn shown(&self, normalized: f32) -> String;
    fn entered(&self, text: &str) -> Option<f32>;
    fn snapped(&self, normalized: f32) -> f32;
    fn begin(&self, setter: &ParamSetter<'_>);
    fn set(&self, setter: &ParamSetter<'_>, normalized: f32);
    fn end(&self, setter: &ParamSetter<'_>);
}

impl<P: Param> Handle for P {
    fn value(&self) -> f32 {
        self.unmodulated_normalized_value()
    }

    fn default(&self) -> f32 {
        self.default_normalized_value()
    }

    fn steps(&self) -> Option<usize> {
        self.step_count()
    }

    fn shown(&self, normalized: f32) -> String {
        self.normalized_value_to_string(normalized, true)
    }

    fn entered(&self, text: &str) -> Option<f32> {
        self.string_to_normalized_value(text)
    }

    fn snapped(&self, normalized: f32) -> f32 {
        self.preview_normalized(self.preview_plain(normalized.clamp(0.0, 1.0)))
    }

    fn begin(&self, setter: &ParamSetter<'_>) {
        setter.begin_set_parameter(self);
    }

    fn set(&self, setter: &ParamSetter<'_>, normalized: f32) {
        setter.set_parameter_normalized(self, normalized);
    }

    fn end(&self, setter: &ParamSetter<'_>) {
        setter.end_set_parameter(self);
    }
}

impl Knob {
    /// The parameter.
    pub(crate) fn of(self, parameters: &Parameters) -> &dyn Handle {
        let Parameters { tuning, analysis, check, midi, .. } = parameters;
        match self {
            Self::ConcertPitch => &tuning.concert_pitch,
            Self::Temperament => &tuning.temperament,
            Self::Channel => &analysis.channel,
            Self::Lowest => &analysis.lowest,
            Self::Highest => &analysis.highest,
            Self::Integration => &analysis.integration,
            Self::Partials => &analysis.partials,
            Self::Freeze => &analysis.freeze,
            Self::Check => &check.check,
            Self::Tolerance => &check.tolerance,
            Self::Reference => &check.reference,
            Self::ReferencePitch => &check.reference_pitch,
            Self::MidiOutput => &midi.output,
            Self::MidiNumber => &midi.number,
            Self::MidiChannel => &midi.channel,
        }
    }
}

impl Gesture {
    /// Tells the host.
    pub(crate) fn apply(self, parameters: &Parameters, setter: &ParamSetter<'_>) {
        match self {
            Self::Begin(knob) => knob.of(parameters).begin(setter),
            Self::Set(knob, normalized) => knob.of(parameters).set(setter, normalized),
            Self::End(knob) => knob.of(parameters).end(setter),
        }
    }

    /// A whole change in one go.
    pub(crate) fn jump(knob: Knob, normalized: f32) -> [Self; 3] {
        [Self::Begin(knob), Self::Set(knob, normalized), Self::End(knob)]
    }
}
