//! What the pitch is compared with: a reference as a function of time.

use super::ORIGIN_HZ;
use super::heard::Judged;
use crate::tuning::{Tuning, cents, ratio};

/// How fast the pitch may move where it is taken as the reference, in cents per second: slower than a struck or plucked
/// tone settles.
const STEADY_CENTS_PER_S: f64 = 25.0;

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
}

impl Resolver {
    pub(super) fn new(reference: Reference, sample_rate_hz: f64) -> Self {
        let longest_s = match &reference {
            Reference::Expected { notes, .. } => {
                notes.iter().map(|note| note.end_s - note.start_s).fold(0.0, f64::max)
            }
            _ => 0.0,
        };
        Self { reference, sample_rate_hz, longest_s, first_hz: None }
    }

    /// The one reference of the whole check, where there is one.
    pub(super) fn constant_hz(&self) -> Option<f64> {
        match self.reference {
            Reference::Frequency(hz) => Some(hz),
            Reference::First => self.first_hz,
            _ => None,
        }
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
                tuning.nearest(heard_hz).map(|nearest| tuning.frequency_hz(nearest.note))
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
