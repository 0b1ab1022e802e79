//! What the engine says of one instant: a [`Reading`], with its partials and strays, and the [`Gap`]s between.

/// State of a reading.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum State {
    /// Nothing above the silence threshold.
    #[default]
    Silent,
    /// Sound without a pitch: noise, a click, a drum.
    Unpitched,
    /// More than one pitch at once.
    Several,
    /// One pitch, on the move.
    Gliding,
    /// One pitch, holding.
    Steady,
}

/// A single pitch claimed at one instant.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Pitch {
    /// Fundamental of the stiff-string model, in Hz.
    pub f0_hz: f64,
    /// Its standard deviation, in cents.
    pub f0_sd_cents: f64,
    /// How sure the engine is that this is the pitch and not another one, 0 to 1.
    pub confidence: f64,
}

/// Inharmonicity of the stiff-string model.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stretch {
    /// Inharmonicity coefficient B (0 for a harmonic sound).
    pub b: f64,
    /// Its standard deviation.
    pub b_sd: f64,
}

/// One partial of a reading, averaged over the integration time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Partial {
    /// Partial number, from 1.
    pub number: u32,
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// Standard deviation of the frequency, in Hz.
    pub frequency_sd_hz: f64,
    /// Distance from `number * f0`, in cents.
    pub cents_from_harmonic: f64,
    /// Standard deviation of that distance, in cents.
    pub cents_sd: f64,
    /// Level in dBFS.
    pub level_dbfs: f64,
    /// Standard deviation of the level, in dB.
    pub level_sd_db: f64,
    /// Cosine phase at the reading's centre, in radians, -pi to pi; not averaged.
    pub phase_rad: f64,
    /// Level above the noise in one bin of the analysis window, in dB.
    pub snr_db: f64,
}

/// Why a spectral peak belongs to no partial.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum StrayKind {
    /// A partial above the Nyquist frequency, folded back.
    Alias {
        /// Number of the partial that folded.
        partial: u32,
        /// How often it folded about a multiple of half the sample rate.
        folds: u32,
    },
    /// Mains hum.
    Mains {
        /// 50 or 60 Hz.
        base_hz: f64,
        /// Multiple of it.
        multiple: u32,
    },
    /// Anything else.
    Unexplained,
}

/// A spectral peak that belongs to no partial.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stray {
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// Level in dBFS.
    pub level_dbfs: f64,
    /// Its explanation.
    pub kind: StrayKind,
}

/// What the engine says of one instant. Readings come on a fixed grid of sample positions, 10 ms apart or less.
#[derive(Debug, Clone, Default)]
pub struct Reading {
    /// Sample position of the centre of what was analysed.
    pub centre: u64,
    /// State.
    pub state: State,
    /// The pitch, when a single one is claimed.
    pub pitch: Option<Pitch>,
    /// Level (root mean square) around the centre, in dBFS; negative infinity where no sample near it reaches -95 dBFS.
    pub level_dbfs: f64,
    /// Level of the noise floor over the whole band, in dBFS: what lies between the spectral lines. Lines closer than about
    /// 30 Hz, and such as move, leave less room between them and count towards it with their skirts. Negative infinity in
    /// digital silence.
    pub noise_dbfs: f64,
    /// Inharmonicity, when the partials allow an estimate.
    pub stretch: Option<Stretch>,
    /// Partials found, by rising number; empty without a single pitch.
    pub partials: Vec<Partial>,
    /// Strays found, strongest first; empty without a single pitch.
    pub strays: Vec<Stray>,
}

/// Why samples did not reach the engine.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum GapReason {
    /// Samples that were not finite numbers (NaN, infinity).
    NonFinite,
    /// Samples lost on the way, as told through [`Analyzer::skip`](crate::Analyzer::skip).
    Lost,
}

/// A stretch of audio that did not reach the engine.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Gap {
    /// First sample position missing.
    pub start: u64,
    /// First sample position present again.
    pub end: u64,
    /// Why.
    pub reason: GapReason,
}
