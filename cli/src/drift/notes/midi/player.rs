//! One channel: the notes that sound on it, and how far they are bent.
//!
//! Pitch bend and registered parameter 0, pitch bend sensitivity, are those of the MIDI 1.0 Detailed Specification; after
//! power-up a bend reaches two semitones.

use plumbtone_analysis::check::Expected;
use plumbtone_analysis::tuning::{NoteName, Tuning, ratio};
use std::collections::BTreeMap;

/// What a full bend downwards counts; upwards it is one less.
pub(super) const BEND_FULL: f64 = 8192.0;
/// Semitones of a full bend until the file tells others.
const RANGE_SEMITONES: u8 = 2;

/// Controllers: data entry, the number of the parameter that it is for, and the reset of all of them.
const DATA_COARSE: u8 = 6;
const DATA_FINE: u8 = 38;
const UNREGISTERED: [u8; 2] = [98, 99];
const REGISTERED_FINE: u8 = 100;
const REGISTERED_COARSE: u8 = 101;
const RESET: u8 = 121;

/// A key of a track.
type Key = (usize, u8);

/// A channel as it stands.
#[derive(Debug)]
pub(super) struct Player {
    sounding: BTreeMap<Key, Piece>,
    /// How far the bend is out, of -1 to 1.
    bend: f64,
    /// How far that reaches: semitones, and cents beside them.
    range: (u8, u8),
    /// The registered parameter that data entry is for, coarse and fine; none for others.
    parameter: (Option<u8>, Option<u8>),
}

/// A stretch of a note over which the bend stands still.
#[derive(Debug, Clone, Copy)]
pub(super) struct Piece {
    key: u8,
    start_s: f64,
    cents: f64,
}

impl Default for Player {
    fn default() -> Self {
        Self {
            sounding: BTreeMap::new(),
            bend: 0.0,
            range: (RANGE_SEMITONES, 0),
            parameter: (None, None),
        }
    }
}

impl Piece {
    /// The note that is expected up to a time.
    pub(super) fn until(self, end_s: f64, tuning: &Tuning) -> Expected {
        let Self { key, start_s, cents } = self;
        let name = NoteName::from_midi(i16::from(key));
        Expected { start_s, end_s, f0_hz: tuning.frequency_hz(name) * ratio(cents) }
    }
}

impl Player {
    pub(super) fn strike(&mut self, key: Key, time_s: f64) {
        let piece = Piece { key: key.1, start_s: time_s, cents: self.cents() };
        self.sounding.insert(key, piece);
    }

    /// Ends a note, if it sounds.
    pub(super) fn end(&mut self, key: Key) -> Option<Piece> {
        self.sounding.remove(&key)
    }

    /// Ends all notes of a track.
    pub(super) fn end_track(&mut self, track: usize) -> Vec<Piece> {
        let others = self.sounding.split_off(&(track + 1, 0));
        let ended = self.sounding.split_off(&(track, 0));
        self.sounding.extend(others);
        ended.into_values().collect()
    }

    /// Bends what sounds from here on; `ends` takes the pieces up to here.
    pub(super) fn bend(&mut self, bend: f64, time_s: f64, ends: impl FnMut(Piece)) {
        self.bend = bend;
        self.cut(time_s, ends);
    }

    /// Takes in a controller.
    pub(super) fn control(&mut self, number: u8, value: u8, time_s: f64, ends: impl FnMut(Piece)) {
        let is_range = self.parameter == (Some(0), Some(0));
        match number {
            REGISTERED_COARSE => self.parameter.0 = Some(value),
            REGISTERED_FINE => self.parameter.1 = Some(value),
            DATA_COARSE if is_range => self.range.0 = value,
            DATA_FINE if is_range => self.range.1 = value,
            RESET => {
                self.bend = 0.0;
                self.parameter = (None, None);
            }
            other if UNREGISTERED.contains(&other) => self.parameter = (None, None),
            _ => {}
        }
        self.cut(time_s, ends);
    }

    fn cents(&self) -> f64 {
        let (semitones, cents) = self.range;
        self.bend * (100.0 * f64::from(semitones) + f64::from(cents))
    }

    /// Begins another piece of what sounds, where it is bent otherwise.
    fn cut(&mut self, time_s: f64, mut ends: impl FnMut(Piece)) {
        let cents = self.cents();
        for piece in self.sounding.values_mut() {
            if piece.cents.total_cmp(&cents).is_ne() {
                ends(*piece);
                *piece = Piece { start_s: time_s, cents, ..*piece };
            }
        }
    }
}
