//! Drift checks: whether the pitch that a listener hears stays within a tolerance of a reference, where it does not, how
//! fast it drifts, and how stable it is.
//!
//! [`Reading`]s and [`Gap`]s go in, in order; [`Heard`] pitches and [`Span`]s come out through a [`CheckSink`], up to 0.7 s
//! later, and an [`Outcome`] at any time. Memory is bounded however long the sound; nothing depends on how it was cut.
//!
//! # What is judged
//! The heard pitch: the local trend of the readings, with a vibrato (3.8 to 9 Hz) taken out. A reading is judged by the
//! windows around it that the trend fits, so that steps and bends stay sharp and noise is averaged. A stretch counts as
//! outside when it lasts long enough and exceeds the tolerance by more than its own uncertainty explains.

mod allan;
mod fit;
mod heard;
mod outcome;
mod reference;
mod settings;
mod slope;
mod sounding;
mod spans;

pub use allan::OverlappingAllan;
pub use outcome::{Drift, Outcome, Stability, Unmeasured, Verdict, Vibrato};
pub use reference::{Expected, Reference};
pub use settings::CheckSettings;
pub use spans::Span;

use crate::reading::{Gap, Reading, State};
use crate::settings::SettingsError;
use crate::tuning::cents;
use heard::{Hearing, Judged, Point};
use outcome::Totals;
use reference::Resolver;
use sounding::Sounding;
use spans::Spans;

/// Confidence from which a pitch is judged: more likely right than not.
const SURE: f64 = 0.5;
/// Reference of absolute cents, in Hz; any would do.
const ORIGIN_HZ: f64 = 440.0;
/// Longest drop-out that leaves a pitch one piece, in seconds: shorter than the shortest note.
const BRIDGED_S: f64 = 0.08;

/// Where a [`Check`] delivers.
pub trait CheckSink {
    /// The pitch heard at the next instant that was judged.
    fn heard(&mut self, _heard: &Heard) {}

    /// The next span that was outside, once it has ended.
    fn span(&mut self, _span: &Span) {}
}

/// Takes nothing.
impl CheckSink for () {}

/// What was heard at one instant.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Heard {
    /// Sample position.
    pub position: u64,
    /// The reference there, in Hz.
    pub reference_hz: f64,
    /// The heard pitch above the reference, in cents.
    pub cents: f64,
    /// Its standard deviation, in cents.
    pub sd_cents: f64,
    /// The reading itself above the reference, in cents: with its vibrato.
    pub raw_cents: f64,
}

/// A check over a stream of readings.
#[derive(Debug)]
pub struct Check {
    settings: CheckSettings,
    resolver: Resolver,
    hearing: Hearing,
    spans: Spans,
    sounding: Sounding,
    totals: Totals,
}

impl Check {
    /// Starts a check; nothing of it grows later but the list of spans, up to [`Outcome::SPANS_MAX`].
    ///
    /// # Errors
    /// A setting outside its range.
    pub fn new(settings: &CheckSettings, reference: Reference) -> Result<Self, SettingsError> {
        settings.validate()?;
        Ok(Self {
            resolver: Resolver::new(reference, settings.sample_rate_hz),
            hearing: Hearing::new(settings),
            spans: Spans::new(settings),
            sounding: Sounding::default(),
            totals: Totals::new(settings),
            settings: settings.clone(),
        })
    }

    /// Takes in the next reading.
    pub fn reading(&mut self, reading: &Reading, sink: &mut impl CheckSink) {
        self.reading_against(reading, None, sink);
    }

    /// Takes in the next reading with the reference there, in Hz, for a check against [`Reference::Given`]; `None` where
    /// there is none.
    pub fn reading_against(
        &mut self,
        reading: &Reading,
        given_hz: Option<f64>,
        sink: &mut impl CheckSink,
    ) {
        let due = self.resolver.is_due(reading.centre, given_hz);
        let pitch = reading.pitch.filter(|pitch| pitch.confidence >= SURE && pitch.f0_hz > 0.0);
        if due {
            self.sounding.push(reading.state, reading.level_dbfs, pitch.is_some());
        }
        let Some(pitch) = pitch else {
            if reading.state == State::Silent || self.idle_s(reading.centre) > BRIDGED_S {
                self.interrupt(sink);
            }
            return;
        };
        let point = Point {
            position: reading.centre,
            time_s: reading.centre as f64 / self.settings.sample_rate_hz,
            cents: cents(pitch.f0_hz / ORIGIN_HZ),
            sd: pitch.f0_sd_cents,
            given_hz,
        };
        if self.idle_s(reading.centre) > BRIDGED_S || self.hearing.is_jump(&point) {
            self.end_piece(sink);
        }
        self.hearing.push(point);
        self.judge(sink);
    }

    /// Takes in a gap: nothing is bridged over it.
    pub fn gap(&mut self, gap: &Gap, sink: &mut impl CheckSink) {
        self.interrupt(sink);
        let readings = (gap.end - gap.start) as f64 / self.settings.hop as f64;
        self.sounding.lose(readings);
    }

    /// Judges what is still to be judged, as at the end of the sound. More may follow, as after a pause.
    pub fn finish(&mut self, sink: &mut impl CheckSink) {
        self.interrupt(sink);
    }

    /// The outcome of what has been judged so far.
    #[must_use]
    pub fn outcome(&self) -> Outcome {
        self.totals.outcome(&self.sounding, &self.spans, &self.resolver)
    }

    /// Where it was established that the span now running is outside, as a sample position; `None` while none runs.
    #[must_use]
    pub fn outside_since(&self) -> Option<u64> {
        self.spans.established()
    }

    fn idle_s(&self, position: u64) -> f64 {
        let last = self.hearing.last_position();
        last.map_or(0.0, |last| (position - last) as f64 / self.settings.sample_rate_hz)
    }

    fn interrupt(&mut self, sink: &mut impl CheckSink) {
        self.end_piece(sink);
        self.spans.interrupt(sink);
    }

    fn end_piece(&mut self, sink: &mut impl CheckSink) {
        self.hearing.end_piece();
        self.judge(sink);
        self.totals.end_piece();
    }

    fn judge(&mut self, sink: &mut impl CheckSink) {
        while let Some(judged) = self.hearing.next() {
            self.account(&judged, sink);
        }
    }

    fn account(&mut self, judged: &Judged, sink: &mut impl CheckSink) {
        let Some(reference_hz) = self.resolver.resolve(judged) else {
            self.spans.interrupt(sink);
            return;
        };
        let reference = cents(reference_hz / ORIGIN_HZ);
        let heard = Heard {
            position: judged.point.position,
            reference_hz,
            cents: judged.cents - reference,
            sd_cents: judged.sd,
            raw_cents: judged.point.cents - reference,
        };
        sink.heard(&heard);
        self.totals.push(&heard, judged);
        self.spans.push(&heard, sink);
    }
}
