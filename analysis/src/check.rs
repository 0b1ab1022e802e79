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
mod trace;

pub use allan::OverlappingAllan;
pub use outcome::{Drift, Outcome, Stability, Unmeasured, Verdict, Vibrato};
pub use reference::{Expected, Reference};
pub use settings::CheckSettings;
pub use spans::Span;
pub use trace::{Column, Trace};

use crate::reading::{Gap, Reading, State};
use crate::settings::SettingsError;
use crate::tuning::cents;
use heard::{Hearing, Judged, Point};
use outcome::Totals;
use reference::Resolver;
use sounding::Sounding;
use spans::Spans;

/// Confidence from which a pitch is judged: chords taken for one voice stay below 0.1, a wide vibrato on a low string has 0.4.
const SURE: f64 = 0.3;
/// Reference of absolute cents, in Hz; any would do.
const ORIGIN_HZ: f64 = 440.0;
/// Longest drop-out that leaves a pitch one piece, in seconds: shorter than the shortest note.
const BRIDGED_S: f64 = 0.08;

/// Readings in a row that may lie off the pitch before and after them, and are then left out: an estimate that slips for an
/// instant is no note, for none is that short.
const SLIPS_MAX: usize = 3;

/// Where a [`Check`] delivers.
pub trait CheckSink {
    /// The pitch heard at the next instant that was judged.
    fn heard(&mut self, _heard: &Heard) {}

    /// The next span that was outside, once it has ended.
    fn span(&mut self, _span: &Span) {}

    /// The span now running counts from this sample position on: what was heard up to there is surely outside.
    fn established(&mut self, _position: u64) {}

    /// What was established last ended at this sample position. It may yet have turned out to be none that counts: its mean
    /// has sunk since.
    fn over(&mut self, _position: u64) {}
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
    /// Readings that jumped away, and may come back.
    jumped: Vec<Point>,
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
            jumped: Vec::with_capacity(SLIPS_MAX + 1),
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
        if self.hearing.last_position().is_some_and(|last| reading.centre <= last) {
            // The stream began anew.
            self.interrupt(sink);
        }
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
        if self.idle_s(reading.centre) > BRIDGED_S {
            self.end_piece(sink);
        }
        self.take(point, sink);
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
        self.resolver.interrupt();
        self.spans.interrupt(sink);
    }

    /// Takes in a point of the piece, or of the next one when the pitch has jumped for good.
    fn take(&mut self, point: Point, sink: &mut impl CheckSink) {
        if self.hearing.is_jump(&point) {
            self.jumped.push(point);
            if self.jumped.len() > SLIPS_MAX {
                self.take_jumped(sink);
            }
        } else {
            self.jumped.clear();
            self.hearing.push(point);
            self.judge(sink);
        }
    }

    /// Begins another piece with the points that jumped away.
    fn take_jumped(&mut self, sink: &mut impl CheckSink) {
        for index in 0..self.jumped.len() {
            let point = self.jumped[index];
            if self.hearing.is_jump(&point) {
                self.close_piece(sink);
            }
            self.hearing.push(point);
            self.judge(sink);
        }
        self.jumped.clear();
    }

    fn end_piece(&mut self, sink: &mut impl CheckSink) {
        self.take_jumped(sink);
        self.close_piece(sink);
    }

    fn close_piece(&mut self, sink: &mut impl CheckSink) {
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::reading::{GapReason, Pitch};

    const RATE_HZ: f64 = 48_000.0;
    const HOP: u64 = 480;

    /// Readings of cents above 440 Hz over time, from a position on; `None` for silence.
    fn readings(start: u64, cents_at: impl Fn(f64) -> Option<f64>, seconds: u64) -> Vec<Reading> {
        (0..seconds * 100)
            .map(|index| {
                let pitch = cents_at(index as f64 / 100.0).map(|cents| Pitch {
                    f0_hz: 440.0 * crate::tuning::ratio(cents),
                    f0_sd_cents: 0.2,
                    confidence: 0.9,
                });
                let state = if pitch.is_some() { State::Steady } else { State::Silent };
                Reading {
                    centre: start + index * HOP,
                    state,
                    pitch,
                    level_dbfs: -20.0,
                    ..Reading::default()
                }
            })
            .collect()
    }

    fn check(tolerance_cents: f64) -> Check {
        let settings = CheckSettings { tolerance_cents, ..CheckSettings::new(RATE_HZ, 480) };
        Check::new(&settings, Reference::Frequency(440.0)).unwrap()
    }

    fn outcome(tolerance_cents: f64, readings: &[Reading]) -> Outcome {
        let mut check = check(tolerance_cents);
        readings.iter().for_each(|reading| check.reading(reading, &mut ()));
        check.finish(&mut ());
        check.outcome()
    }

    fn seconds(spans: &[Span]) -> Vec<(f64, f64)> {
        spans.iter().map(|s| (s.start as f64 / RATE_HZ, s.end as f64 / RATE_HZ)).collect()
    }

    #[test]
    fn a_wide_vibrato_about_the_reference_is_within() {
        for (rate_hz, extent) in [(4.0, 100.0), (5.7, 60.0), (8.0, 30.0)] {
            let swing = |t: f64| Some(extent * (core::f64::consts::TAU * rate_hz * t).sin());
            let outcome = outcome(5.0, &readings(0, swing, 3));
            assert_eq!(outcome.verdict, Verdict::Within, "{rate_hz} Hz ±{extent}: {outcome:?}");
            let vibrato = outcome.vibrato.unwrap();
            assert!((vibrato.rate_hz / rate_hz - 1.0).abs() < 0.01, "{rate_hz} Hz: {vibrato:?}");
            assert!((vibrato.extent_cents / extent - 1.0).abs() < 0.01, "±{extent}: {vibrato:?}");
        }
    }

    #[test]
    fn a_step_stays_sharp_under_a_vibrato() {
        let cents_at = |t: f64| {
            let step = if (1.0..2.5).contains(&t) { 20.0 } else { 0.0 };
            Some(step + 15.0 * (core::f64::consts::TAU * 6.0 * t).sin())
        };
        let outcome = outcome(8.0, &readings(0, cents_at, 4));
        let spans = seconds(&outcome.spans);
        let near = matches!(spans[..], [(from, to)] if (from - 1.0).abs() < 0.03 && (to - 2.5).abs() < 0.03);
        assert!(near, "{spans:?}");
        assert!((outcome.spans[0].mean_cents - 20.0).abs() < 0.5, "{outcome:?}");
    }

    #[test]
    fn spans_mirror_and_shift_with_the_sound() {
        let cents_at = |t: f64| Some(if t < 1.0 { 3.0 } else { 4.0 * t });
        let up = outcome(9.0, &readings(0, cents_at, 5));
        let down = outcome(9.0, &readings(0, |t| cents_at(t).map(|c| -c), 5));
        let late = outcome(9.0, &readings(480_000, cents_at, 5));
        assert_eq!(up.verdict, Verdict::Outside, "{up:?}");
        let near = |a: f64, b: f64| (a - b).abs() < 1e-6;
        for (other, sign, shift) in [(&down, -1.0, 0), (&late, 1.0, 480_000)] {
            assert_eq!(other.spans.len(), up.spans.len(), "{other:?}");
            for (a, b) in up.spans.iter().zip(&other.spans) {
                let same = a.start.abs_diff(b.start - shift) <= 1
                    && a.end.abs_diff(b.end - shift) <= 1
                    && near(a.worst_cents, sign * b.worst_cents)
                    && near(a.mean_cents, sign * b.mean_cents);
                assert!(same, "{a:?} {b:?}, shifted by {shift}");
            }
        }
    }

    #[test]
    fn excursions_too_short_to_count_are_none() {
        for (length_s, counts) in [(0.1, false), (0.3, true)] {
            let bump = |t: f64| Some(if (1.0..1.0 + length_s).contains(&t) { 30.0 } else { 0.0 });
            let outcome = outcome(10.0, &readings(0, bump, 3));
            assert_eq!(outcome.verdict == Verdict::Outside, counts, "{length_s} s: {outcome:?}");
        }
    }

    /// Where spans were established, and where they ended.
    #[derive(Default)]
    struct Ends(Vec<(u64, bool)>);

    impl CheckSink for Ends {
        fn established(&mut self, position: u64) {
            self.0.push((position, true));
        }
        fn over(&mut self, position: u64) {
            self.0.push((position, false));
        }
    }

    #[test]
    fn what_is_established_is_told_once_and_its_end_too() {
        // Outside for a second, for too short, and until the sound stops.
        let cents_at = |t: f64| {
            let high = (1.0..2.0).contains(&t) || (3.0..3.1).contains(&t) || t >= 4.0;
            (t < 5.0).then_some(if high { 25.0 } else { 0.0 })
        };
        let mut check = check(10.0);
        let mut ends = Ends::default();
        readings(0, cents_at, 6).iter().for_each(|reading| check.reading(reading, &mut ends));
        let told: Vec<(f64, bool)> =
            ends.0.iter().map(|&(at, on)| (at as f64 / RATE_HZ, on)).collect();
        // What counts lasts 0.15 s at least.
        let expected = [(1.15, true), (2.0, false), (4.15, true), (5.0, false)];
        let near =
            |(a, on): (f64, bool), (b, other): (f64, bool)| on == other && (a - b).abs() < 0.02;
        let as_expected = told.len() == 4 && told.iter().zip(expected).all(|(&a, b)| near(a, b));
        assert!(as_expected, "{told:?}, not {expected:?}");
        let spans = seconds(&check.outcome().spans);
        let ends = [(told[1].0, spans[0].1), (told[3].0, spans[1].1)];
        assert!(ends.iter().all(|(a, b)| (a - b).abs() < 1e-9), "where the spans end: {ends:?}");
    }

    #[test]
    fn gaps_and_silence_end_a_span() {
        let high = |_| Some(25.0);
        let mut check = check(10.0);
        for reading in readings(0, high, 1) {
            check.reading(&reading, &mut ());
        }
        assert!(check.outside_since().is_some(), "it is established while it runs");
        let gap = Gap { start: 48_000, end: 96_000, reason: GapReason::Lost };
        check.gap(&gap, &mut ());
        for reading in readings(96_000, high, 1) {
            check.reading(&reading, &mut ());
        }
        for reading in readings(144_000, |t| (t > 0.5).then_some(25.0), 1) {
            check.reading(&reading, &mut ());
        }
        check.finish(&mut ());
        let outcome = check.outcome();
        assert_eq!(outcome.spans.len(), 3, "{:?}", seconds(&outcome.spans));
        // Three seconds sound as far as is known (one is lost), half a second is silent; two and a half have a pitch.
        let share = outcome.measured_share.unwrap();
        assert!((share - 2.49 / 3.49).abs() < 0.01, "{share}");
    }

    #[test]
    fn what_has_no_pitch_is_unmeasured_with_its_reason() {
        let noise: Vec<Reading> = readings(0, |_| None, 2)
            .into_iter()
            .map(|reading| Reading { state: State::Unpitched, ..reading })
            .collect();
        let two = |state| noise.iter().map(|r| Reading { state, ..r.clone() }).collect::<Vec<_>>();
        let short = readings(0, |t| (t < 0.05).then_some(0.0), 2);
        for (readings, why) in [
            (noise.clone(), Unmeasured::NoPitch),
            (two(State::Several), Unmeasured::SeveralPitches),
            (two(State::Silent), Unmeasured::Silent),
            (short, Unmeasured::Short(0.05)),
        ] {
            assert_eq!(outcome(10.0, &readings).verdict, Verdict::Unmeasured(why), "{why:?}");
        }
        let later =
            noise.iter().map(|r| Reading { centre: r.centre + 48_000, ..r.clone() }).collect();
        let mixed = [readings(0, |_| Some(0.0), 1), later].concat();
        let verdict = outcome(10.0, &mixed).verdict;
        let share = matches!(verdict, Verdict::Unmeasured(Unmeasured::Share(s)) if (s - 1.0 / 3.0).abs() < 0.01);
        assert!(share, "{verdict:?}");
    }

    #[test]
    fn a_stream_that_begins_anew_is_another_piece() {
        let mut check = check(10.0);
        for _ in 0..2 {
            readings(0, |_| Some(25.0), 1).iter().for_each(|r| check.reading(r, &mut ()));
        }
        check.finish(&mut ());
        assert_eq!(seconds(&check.outcome().spans).len(), 2, "{:?}", check.outcome());
    }

    #[test]
    fn the_list_of_spans_is_bounded_and_the_rest_counted() {
        let mut check = check(10.0);
        for index in 0..Outcome::SPANS_MAX as u64 + 10 {
            for reading in readings(index * 96_000, |t| (t < 0.5).then_some(25.0), 1) {
                check.reading(&reading, &mut ());
            }
        }
        check.finish(&mut ());
        let outcome = check.outcome();
        assert_eq!(
            (outcome.spans.len(), outcome.spans_left_out),
            (Outcome::SPANS_MAX, 10),
            "spans"
        );
    }

    #[test]
    fn settings_outside_their_range_are_refused() {
        let usual = CheckSettings::new(RATE_HZ, 480);
        for bad in [
            CheckSettings { tolerance_cents: 0.0, ..usual.clone() },
            CheckSettings { tolerance_cents: f64::NAN, ..usual.clone() },
            CheckSettings { min_span_s: 0.0, ..usual.clone() },
            CheckSettings { min_share: 1.1, ..usual.clone() },
            CheckSettings { hop: 0, ..usual.clone() },
            CheckSettings { sample_rate_hz: 0.0, ..usual },
        ] {
            assert!(Check::new(&bad, Reference::First).is_err(), "{bad:?}");
        }
    }
}
