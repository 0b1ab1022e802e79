//! What the worker publishes for the editor: plain data in engineering units, complete in itself.

use plumbtone_analysis::tuning::{NoteName, Tuning};
use plumbtone_analysis::{Pitch, Reading, SettingsError};

use crate::session::SessionPosition;

/// The newest reading of an instance, and how its analysis stands.
#[derive(Debug, Clone, Default)]
pub struct Readout {
    /// How the analysis stands.
    pub condition: Condition,
    /// Sample rate in Hz; 0 before the first activation.
    pub sample_rate_hz: f64,
    /// Number of the stream since the instance was made; positions count from the stream's start.
    pub stream: u64,
    /// Whether [`reading`](Self::reading) holds one of this stream.
    pub measured: bool,
    /// The newest reading.
    pub reading: Reading,
    /// The newest provisional reading, quicker and less sure; only while an editor is open.
    pub live: Option<Live>,
    /// Where in the session the centre of [`reading`](Self::reading) lies.
    pub session: SessionPosition,
    /// What notes are called.
    pub tuning: Tuning,
    /// The key that the note input holds, the last one pressed of several.
    pub played: Option<NoteName>,
    /// What did not reach the engine in this stream.
    pub gaps: Gaps,
}

/// What a provisional reading says.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Live {
    /// Sample position of its centre in the stream.
    pub centre: u64,
    /// The pitch, when a single one is claimed.
    pub pitch: Option<Pitch>,
    /// Level in dBFS.
    pub level_dbfs: f64,
}

/// How an analysis stands.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub enum Condition {
    /// No sound has come yet.
    #[default]
    Waiting,
    /// Sound is being measured.
    Measuring,
    /// The reading is held on display while measuring goes on.
    Frozen,
    /// Nobody listens: no editor is open and no check armed.
    Paused,
    /// The host stopped the stream.
    Ended,
    /// The engine does not work at these settings, such as this sample rate.
    Refused(SettingsError),
    /// The analysis broke down by a defect; it begins anew with the next stream.
    Failed,
}

/// What did not reach the engine, in samples.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Gaps {
    /// Lost because the worker fell behind.
    pub overrun: u64,
    /// Not taken because nobody listened.
    pub unwatched: u64,
    /// Not finite numbers.
    pub non_finite: u64,
}

impl Readout {
    /// Copies another one into this one, keeping the memory of its lists.
    pub(crate) fn copy(&mut self, from: &Self) {
        let Self {
            condition,
            sample_rate_hz,
            stream,
            measured,
            reading,
            live,
            session,
            tuning,
            played,
            gaps,
        } = from;
        copy_reading(&mut self.reading, reading);
        self.condition = *condition;
        self.sample_rate_hz = *sample_rate_hz;
        self.stream = *stream;
        self.measured = *measured;
        self.live = *live;
        self.session = *session;
        self.tuning = *tuning;
        self.played = *played;
        self.gaps = *gaps;
    }
}

/// Copies a reading, keeping the memory of its lists.
pub(crate) fn copy_reading(to: &mut Reading, from: &Reading) {
    to.centre = from.centre;
    to.state = from.state;
    to.pitch = from.pitch;
    to.level_dbfs = from.level_dbfs;
    to.stretch = from.stretch;
    to.partials.clone_from(&from.partials);
    to.strays.clone_from(&from.strays);
}
