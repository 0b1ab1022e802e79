//! What the pitch is compared with: a reference as a function of time.

use super::ORIGIN_HZ;
use super::heard::Judged;
use crate::tuning::{NoteName, Tuning, cents, ratio};

/// How fast the pitch may move where it is taken as the reference, in cents per second: slower than a struck or plucked
/// tone settles.
const STEADY_CENTS_PER_S: f64 = 25.0;

/// How much nearer another note must be than the last one to replace it, in cents: a pitch half-way between two notes is
/// not to change its reference with every breath.
const NEARER_CENTS: f64 = 10.0;

/// What the heard pitch is compared with.
#[derive(Debug, Clone, PartialEq)]
pub enum Reference {
    /// One frequency in Hz, throughout.
    Frequency(f64),
    /// At each instant the nearest note of the scale.
    Nearest(Tuning),
    /// The first pitch of the sound that holds still.
    First,
    /// The notes expected over time, by rising start; where none is expected nothing is judged.
    Expected {
        /// The notes.
        notes: Vec<Expected>,
        /// How much earlier or later than told a note may begin or end, in seconds. Where that leaves a choice the nearest
        /// note counts.
        leeway_s: f64,
    },
    /// What [`Check::reading_against`](super::Check::reading_against) says with each reading.
    Given,
}

/// A note that is expected.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Expected {
    /// Start in seconds from the first sample.
    pub start_s: f64,
    /// End in seconds.
    pub end_s: f64,
    /// Frequency in Hz.
    pub f0_hz: f64,
}

/// Finds the reference of each instant.
#[derive(Debug)]
pub(super) struct Resolver {
    reference: Reference,
    sample_rate_hz: f64,
    /// The longest expected note, in seconds: how far back a note that still sounds may begin.
    longest_s: f64,
    /// The first steady pitch, once heard.
    first_hz: Option<f64>,
    /// The note that was nearest last.
    last: Option<NoteName>,
}

impl Resolver {
    pub(super) fn new(reference: Reference, sample_rate_hz: f64) -> Self {
        let longest_s = match &reference {
            Reference::Expected { notes, .. } => {
                notes.iter().map(|note| note.end_s - note.start_s).fold(0.0, f64::max)
            }
            _ => 0.0,
        };
        Self { reference, sample_rate_hz, longest_s, first_hz: None, last: None }
    }

    /// The one reference of the whole check, where there is one.
    pub(super) fn constant_hz(&self) -> Option<f64> {
        match self.reference {
            Reference::Frequency(hz) => Some(hz),
            Reference::First => self.first_hz,
            _ => None,
        }
    }

    /// Says that the pitch is interrupted: the next one is compared afresh.
    pub(super) fn interrupt(&mut self) {
        self.last = None;
    }

    /// Whether a pitch is due at a position at all.
    pub(super) fn is_due(&self, position: u64, given_hz: Option<f64>) -> bool {
        match &self.reference {
            Reference::Expected { .. } => {
                self.around(position as f64 / self.sample_rate_hz, 0.0).next().is_some()
            }
            Reference::Given => given_hz.is_some(),
            _ => true,
        }
    }

    /// The reference for a heard pitch, in Hz.
    pub(super) fn resolve(&mut self, judged: &Judged) -> Option<f64> {
        let heard_hz = ORIGIN_HZ * ratio(judged.cents);
        match &self.reference {
            Reference::Frequency(hz) => Some(*hz),
            Reference::Nearest(tuning) => {
                let nearest = tuning.nearest(heard_hz)?;
                let distance = |note| off(tuning.frequency_hz(note), heard_hz);
                let stays = |last: &NoteName| distance(*last) < nearest.cents.abs() + NEARER_CENTS;
                let note = self.last.filter(stays).unwrap_or(nearest.note);
                self.last = Some(note);
                Some(tuning.frequency_hz(note))
            }
            Reference::First => {
                if self.first_hz.is_none() && judged.slope.abs() < STEADY_CENTS_PER_S {
                    self.first_hz = Some(heard_hz);
                }
                self.first_hz
            }
            Reference::Expected { leeway_s, .. } => self
                .around(judged.point.time_s, *leeway_s)
                .map(|note| note.f0_hz)
                .min_by(|a, b| off(*a, heard_hz).total_cmp(&off(*b, heard_hz))),
            Reference::Given => judged.point.given_hz.filter(|hz| *hz > 0.0),
        }
    }

    /// The notes expected within `leeway_s` of a time.
    fn around(&self, time_s: f64, leeway_s: f64) -> impl Iterator<Item = &Expected> {
        let notes: &[Expected] = match &self.reference {
            Reference::Expected { notes, .. } => notes,
            _ => &[],
        };
        let from = notes.partition_point(|n| n.start_s < time_s - leeway_s - self.longest_s);
        let to = notes.partition_point(|n| n.start_s <= time_s + leeway_s);
        notes[from.min(to)..to].iter().filter(move |n| n.end_s > time_s - leeway_s)
    }
}

fn off(reference_hz: f64, heard_hz: f64) -> f64 {
    cents(heard_hz / reference_hz).abs()
}

#[cfg(test)]
mod tests {
    use super::super::heard::{Judged, Point};
    use super::*;
    use crate::tuning::Temperament;

    fn heard(time_s: f64, hz: f64) -> Judged {
        let cents = cents(hz / ORIGIN_HZ);
        let position = crate::convert::nearest_position(48_000.0 * time_s);
        let point = Point { position, time_s, cents, sd: 0.1, given_hz: None };
        Judged { point, cents, sd: 0.1, slope: 0.0, without_vibrato: cents, vibrato: None }
    }

    #[test]
    fn expected_notes_have_leeway_and_the_nearest_counts() {
        let note = |start_s, end_s, f0_hz| Expected { start_s, end_s, f0_hz };
        // A long note under two short ones, then a rest.
        let notes = vec![note(0.0, 10.0, 110.0), note(1.0, 2.0, 220.0), note(2.0, 3.0, 440.0)];
        let mut resolver = Resolver::new(Reference::Expected { notes, leeway_s: 0.1 }, 48_000.0);
        for (time_s, hz, reference) in [
            (1.5, 222.0, Some(220.0)),
            (1.5, 112.0, Some(110.0)),
            (1.95, 430.0, Some(440.0)),
            (2.05, 225.0, Some(220.0)),
            (2.5, 225.0, Some(440.0)),
            (9.0, 440.0, Some(110.0)),
            (10.05, 110.0, Some(110.0)),
            (10.2, 110.0, None),
        ] {
            assert_eq!(resolver.resolve(&heard(time_s, hz)), reference, "{hz} Hz at {time_s} s");
        }
        for (time_s, due) in [(0.5, true), (9.9, true), (10.05, false)] {
            let position = crate::convert::nearest_position(48_000.0 * time_s);
            assert_eq!(resolver.is_due(position, None), due, "at {time_s} s");
        }
    }

    #[test]
    fn the_nearest_note_is_kept_until_another_is_clearly_nearer() {
        let tuning = Tuning::new(440.0, Temperament::Equal).unwrap();
        let mut resolver = Resolver::new(Reference::Nearest(tuning), 48_000.0);
        for (off, semitones) in [(45.0, 0.0), (53.0, 0.0), (56.0, 1.0), (47.0, 1.0), (44.0, 0.0)] {
            let found = resolver.resolve(&heard(0.0, 440.0 * ratio(off)));
            let expected = 440.0 * ratio(100.0 * semitones);
            let close = found.is_some_and(|hz| (hz - expected).abs() < 1e-6);
            assert!(close, "{off} cents: {found:?}, not {expected}");
        }
    }

    #[test]
    fn the_first_pitch_that_holds_still_stays_the_reference() {
        let mut resolver = Resolver::new(Reference::First, 48_000.0);
        let settling = Judged { slope: -300.0, ..heard(0.0, 450.0) };
        assert_eq!(resolver.resolve(&settling), None, "while it settles");
        let first = resolver.resolve(&heard(0.1, 440.0)).unwrap();
        let later = resolver.resolve(&heard(5.0, 470.0)).unwrap();
        assert_eq!(first.to_bits(), later.to_bits(), "{first} Hz, then {later} Hz");
        assert!((first - 440.0).abs() < 1e-9, "{first} Hz");
    }
}
