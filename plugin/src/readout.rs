//! What the worker publishes for the editor: plain data in engineering units, complete in itself.

use plumbtone_analysis::tuning::{NoteName, Tuning};
use plumbtone_analysis::{Pitch, Reading, SettingsError, State};

use crate::offset::{Offset, Offsets};
use crate::session::SessionPosition;
use crate::trail::CONFIDENCE_SHOWN;
use crate::voices::Voices;

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
    /// Centre of the first reading of those that said the same as [`reading`](Self::reading): its state, and its note.
    pub since: u64,
    /// How far the track so far lies off the notes.
    pub offset: Option<Offset>,
    /// Index in the trail after [`reading`](Self::reading).
    pub trail_end: u64,
    /// The newest provisional reading, quicker and less sure; only while an editor is open.
    pub live: Option<Live>,
    /// Where in the session the centre of [`reading`](Self::reading) lies.
    pub session: SessionPosition,
    /// What notes are called.
    pub tuning: Tuning,
    /// The key that the note input holds, the last one pressed of several.
    pub played: Option<NoteName>,
    /// What the last note told of its partials' lines.
    pub voices: Voices,
    /// What did not reach the engine in this stream.
    pub gaps: Gaps,
    /// The last stretch of this stream that did not reach the engine though somebody listened.
    pub last_gap: Option<Missing>,
    offsets: Offsets,
}

/// Samples that did not reach the engine.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Missing {
    /// How many.
    pub samples: u64,
    /// First sample position present again.
    pub end: u64,
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
    /// Takes a reading, and what follows from it over time.
    pub fn take(&mut self, reading: &Reading, session: SessionPosition) {
        if !self.measured || !self.goes_on(reading) {
            self.since = reading.centre;
        }
        copy_reading(&mut self.reading, reading);
        self.session = session;
        self.measured = true;
    }

    /// Counts a reading towards the track's offset.
    pub fn weigh(&mut self, reading: &Reading) {
        if reading.state == State::Steady
            && let Some(pitch) = reading.pitch
            && let Some(nearest) = self.tuning.nearest(pitch.f0_hz)
        {
            self.offsets.add(nearest.cents, pitch.confidence);
            self.offset = self.offsets.offset();
        }
    }

    /// Forgets the track's offset: other notes apply from here on.
    pub fn forget_offset(&mut self) {
        self.offsets = Offsets::default();
        self.offset = None;
    }

    /// The pitch, when one is claimed surely enough to be shown.
    #[must_use]
    pub fn pitch(&self) -> Option<Pitch> {
        self.reading.pitch.filter(|pitch| pitch.confidence >= CONFIDENCE_SHOWN)
    }

    /// Whether a reading says the same as the one before: the same state, and the same note if there is one.
    fn goes_on(&self, reading: &Reading) -> bool {
        let note = |pitch: Option<Pitch>| Some(self.tuning.nearest(pitch?.f0_hz)?.note);
        self.reading.state == reading.state && note(self.reading.pitch) == note(reading.pitch)
    }

    /// Copies another one into this one, keeping the memory of its lists.
    pub(crate) fn copy(&mut self, from: &Self) {
        let Self {
            condition,
            sample_rate_hz,
            stream,
            measured,
            reading,
            since,
            offset,
            trail_end,
            live,
            session,
            tuning,
            played,
            voices,
            gaps,
            last_gap,
            offsets,
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
        self.voices.copy(voices);
        self.gaps = *gaps;
        self.since = *since;
        self.offset = *offset;
        self.trail_end = *trail_end;
        self.last_gap = *last_gap;
        self.offsets = *offsets;
    }
}

/// Copies a reading, keeping the memory of its lists.
pub(crate) fn copy_reading(to: &mut Reading, from: &Reading) {
    to.centre = from.centre;
    to.state = from.state;
    to.pitch = from.pitch;
    to.level_dbfs = from.level_dbfs;
    to.noise_dbfs = from.noise_dbfs;
    to.stretch = from.stretch;
    to.partials.clone_from(&from.partials);
    to.strays.clone_from(&from.strays);
}
