//! Cuts the stream of instants into notes: where one begins (a pitch appears, jumps or is struck again), where it ends.
//!
//! A note follows its pitch through vibrato and glides; only a jump that stays makes a new one. A few instants without a
//! pitch, or on a wrong one, are bridged.

use crate::stiff::CENTS_PER_NEPER;

/// Instants with a pitch that make a note.
const BEGIN: usize = 3;
/// Instants without a pitch that end it.
const END: usize = 6;
/// Move from one instant to the next that is a jump, in cents: a fast, wide vibrato stays below.
const JUMP_CENTS: f64 = 65.0;
/// Instants for which a jump must stay.
const STAY: usize = 4;
/// Rise of level over [`STRIKE_SPAN`] instants that is a new onset, in dB.
const STRIKE_DB: f64 = 6.0;
const STRIKE_SPAN: usize = 4;
/// Instants after an onset in which the level may still rise.
const ATTACK: usize = 12;

/// What one instant says to the segmentation.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Step {
    /// Centre of the instant, in samples.
    pub(crate) centre: u64,
    /// Fundamental in Hz, if a pitch is claimed.
    pub(crate) f0: Option<f64>,
    /// Level in dBFS.
    pub(crate) level_dbfs: f64,
}

/// How a note begins or ends, between two centres.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Event {
    /// A note begins with the instant at `first`; the one before belongs to something else.
    Begin {
        /// Centre of its first instant.
        first: u64,
    },
    /// The note ends with the instant at `last`.
    End {
        /// Centre of its last instant.
        last: u64,
    },
}

/// The segmentation.
#[derive(Debug, Default)]
pub(crate) struct Segmenter {
    /// In a note: the last instant that belongs to it.
    note: Option<Step>,
    begun: u64,
    age: usize,
    /// Instants in a row that may become a new note (pitched, close to each other).
    pending: usize,
    pending_first: u64,
    pending_last: f64,
    /// Instants in a row without a pitch.
    silent: usize,
    levels: [f64; STRIKE_SPAN],
}

impl Segmenter {
    /// Forgets everything.
    pub(crate) fn restart(&mut self) {
        *self = Self::default();
    }

    /// Takes the next instant; says what ended and what began (in this order).
    pub(crate) fn step(&mut self, step: Step) -> (Option<Event>, Option<Event>) {
        let struck = self.struck(step.level_dbfs);
        let Some(f0) = step.f0 else {
            self.silent += 1;
            self.pending = 0;
            let ended = (self.silent >= END).then(|| self.close()).flatten();
            return (ended, None);
        };
        self.silent = 0;
        let Some(last) = self.note else {
            self.pend(step, f0);
            return (None, self.begin(step, BEGIN));
        };
        let own = last.f0.map_or(f64::INFINITY, |own| cents_between(own, f0));
        let missed = (step.centre - last.centre) as f64;
        let hop = (step.centre - last.centre).min(step.centre - self.begun).max(1) as f64;
        let allowed = JUMP_CENTS * if self.pending > 0 { 1.0 } else { (missed / hop).max(1.0) };
        if own < allowed && !(struck && self.age > ATTACK) {
            self.note = Some(step);
            self.age += 1;
            self.pending = 0;
            return (None, None);
        }
        if own < allowed {
            self.note = Some(step);
        }
        if struck && self.age > ATTACK {
            let ended = self.close();
            self.pending = BEGIN;
            self.pending_first = step.centre;
            self.pending_last = f0;
            return (ended, self.begin(step, BEGIN));
        }
        self.age += 1;
        self.pend(step, f0);
        if self.pending >= STAY {
            let ended = self.close();
            return (ended, self.begin(step, STAY));
        }
        (None, None)
    }

    /// Whether the instant just taken in belongs to the note.
    pub(crate) fn holds(&self, centre: u64) -> bool {
        self.note.is_some_and(|n| n.centre == centre)
    }

    /// Ends the stream.
    pub(crate) fn finish(&mut self) -> Option<Event> {
        let ended = self.close();
        self.restart();
        ended
    }

    fn pend(&mut self, step: Step, f0: f64) {
        if self.pending == 0 || cents_between(self.pending_last, f0) > JUMP_CENTS {
            self.pending = 0;
            self.pending_first = step.centre;
        }
        self.pending += 1;
        self.pending_last = f0;
    }

    fn begin(&mut self, step: Step, needed: usize) -> Option<Event> {
        if self.pending < needed {
            return None;
        }
        self.note = Some(step);
        self.begun = self.pending_first;
        self.age = self.pending;
        self.pending = 0;
        Some(Event::Begin { first: self.pending_first })
    }

    fn close(&mut self) -> Option<Event> {
        self.note.take().map(|last| Event::End { last: last.centre })
    }

    /// Whether the level has risen as at an onset.
    fn struck(&mut self, level_dbfs: f64) -> bool {
        let lowest = self.levels.iter().copied().fold(f64::INFINITY, f64::min);
        self.levels.rotate_left(1);
        self.levels[STRIKE_SPAN - 1] = level_dbfs;
        level_dbfs - lowest > STRIKE_DB
    }
}

/// Distance of two frequencies in cents.
fn cents_between(a: f64, b: f64) -> f64 {
    CENTS_PER_NEPER * (b / a).ln().abs()
}
