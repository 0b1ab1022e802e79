//! Key sheets: with notes played from the host, one row per key is collected by itself, and kept with the session.
//!
//! [`Keys`] is the worker's side: whatever the engine measures whole is a note, and the key that the host held while it
//! sounded is its key. The newest take of a key replaces the one before, for what is played again was changed; of the notes
//! that one press of a key makes (an attack, a tail) the longest is its take. Positions are those of the stream, so neither
//! block sizes nor speed change a row.

mod csv;
mod presses;
mod row;
mod sheet;
mod stored;

use plumbtone_analysis::keys::KeySheet;
use plumbtone_analysis::tuning::{NoteName, Tuning};
use plumbtone_analysis::{Note, Reading};

pub(crate) use self::csv::text as csv;
use self::presses::{Match, Presses};
pub use self::row::{KeyAlias, Row};
pub use self::sheet::{Declined, Sheet, Snapshot, Stored};
pub(crate) use self::stored::read;

/// Length from which a note that no key was held for is taken, in seconds, when such notes are taken at all.
const UNPLAYED_LEAST_S: f64 = 0.15;
/// A note without a key that begins so soon after the last one of the same pitch ended, in seconds, is the same take.
const SAME_TAKE_S: f64 = 0.3;
/// Keys of MIDI.
const KEYS: usize = 128;

/// The key sheet of one instance, as the worker fills it.
#[derive(Debug)]
pub(crate) struct Keys {
    sheet: Sheet,
    rows: Option<KeySheet>,
    sample_rate_hz: f64,
    presses: Presses,
    /// The note that each key's row is of.
    taken: Vec<Option<Taken>>,
}

/// A note that was taken.
#[derive(Debug, Clone, Copy)]
struct Taken {
    /// Number of the press, if a key was held.
    press: Option<u64>,
    start: u64,
    end: u64,
}

impl Keys {
    pub(crate) fn new(sheet: Sheet) -> Self {
        Self {
            sheet,
            rows: None,
            sample_rate_hz: 0.0,
            presses: Presses::default(),
            taken: vec![None; KEYS],
        }
    }

    /// A new stream begins: positions count from 0 again.
    pub(crate) fn start(&mut self) {
        self.presses.clear();
        self.taken.fill(None);
    }

    /// An engine begins.
    pub(crate) fn begin(&mut self, tuning: Tuning, sample_rate_hz: f64) {
        self.sample_rate_hz = sample_rate_hz;
        self.rows = Some(KeySheet::new(tuning, sample_rate_hz));
    }

    /// Notes are called otherwise from here on.
    pub(crate) fn tune(&mut self, tuning: Tuning) {
        if let Some(rows) = &mut self.rows {
            rows.tune(tuning);
        }
    }

    /// A key goes down or up at a position.
    pub(crate) fn key(&mut self, at: u64, key: u8, down: bool) {
        self.presses.key(at, key, down);
    }

    /// Word of the keys is lost from a position on: which of them are still held nobody knows.
    pub(crate) fn lose(&mut self, at: u64) {
        self.presses.release_all(at);
    }

    pub(crate) fn reading(&mut self, reading: &Reading) {
        if let Some(rows) = &mut self.rows {
            rows.reading(reading);
        }
    }

    /// Takes a note, as the row of the key that was held for it.
    pub(crate) fn note(&mut self, note: &Note) {
        let Some(rows) = &mut self.rows else { return };
        let rate = self.sample_rate_hz;
        let found = self.presses.of(note.start, note.end, rate);
        let told = match found {
            Match::Key { key, .. } => Some(NoteName::from_midi(i16::from(key))),
            Match::Several { newest } => {
                self.sheet.decline(Declined { key: newest });
                None
            }
            Match::Nothing => None,
        };
        // Whatever comes of it, its readings are used up.
        let Some(row) = rows.note(note, told) else { return };
        let length_s = (note.end - note.start) as f64 / rate;
        let taken = Taken { press: found.press(), start: note.start, end: note.end };
        let wanted = match found {
            Match::Key { .. } => true,
            Match::Several { .. } => false,
            Match::Nothing => self.sheet.takes_unplayed() && length_s >= UNPLAYED_LEAST_S,
        };
        let Some(row) = Row::new(&row, length_s).filter(|_| wanted) else { return };
        let last = &mut self.taken[usize::from(row.key) % KEYS];
        if last.is_some_and(|last| last.is_same_take(&taken, rate) && !taken.is_longer_than(&last))
        {
            return;
        }
        *last = Some(taken);
        self.sheet.take(row);
    }
}

impl Taken {
    /// Whether two notes of a key, this one first, are of one press, or without a key follow each other closely.
    fn is_same_take(&self, next: &Self, sample_rate_hz: f64) -> bool {
        let apart_s = next.start.saturating_sub(self.end) as f64 / sample_rate_hz;
        self.press == next.press && (self.press.is_some() || apart_s < SAME_TAKE_S)
    }

    fn is_longer_than(&self, other: &Self) -> bool {
        self.end - self.start > other.end - other.start
    }
}

#[cfg(test)]
mod tests {
    use plumbtone_analysis::tuning::Tuning;

    use super::row::fixtures::note;
    use super::*;

    const RATE_HZ: f64 = 48_000.0;

    fn keys(unplayed: bool) -> (Keys, Sheet) {
        let sheet = Sheet::default();
        sheet.take_unplayed(unplayed);
        let mut keys = Keys::new(sheet.clone());
        keys.begin(Tuning::default(), RATE_HZ);
        (keys, sheet)
    }

    /// Key and cents of all rows.
    fn rows(sheet: &Sheet) -> Vec<(u8, f64)> {
        let mut snapshot = Snapshot::default();
        sheet.look(&mut snapshot);
        let cents = |row: &Row| (10.0 * row.cents(&Tuning::default())).round() / 10.0;
        snapshot.stored.rows.iter().map(|row| (row.key, cents(row))).collect()
    }

    #[test]
    fn the_newest_take_of_a_key_replaces_the_one_before() {
        let (mut keys, sheet) = keys(false);
        for (at, hz) in [(0, 442.0), (96_000, 441.0)] {
            keys.key(at, 69, true);
            keys.key(at + 40_000, 69, false);
            keys.note(&note(at + 500, at + 50_000 - at / 4, hz));
        }
        assert_eq!(rows(&sheet), [(69, 3.9)], "though it is shorter");
    }

    #[test]
    fn of_the_notes_of_one_press_the_longest_is_the_take() {
        let (mut keys, sheet) = keys(false);
        keys.key(0, 69, true);
        for (start, end, hz) in
            [(200, 4_000, 450.0), (4_500, 48_000, 441.0), (48_300, 60_000, 445.0)]
        {
            keys.note(&note(start, end, hz));
        }
        assert_eq!(rows(&sheet), [(69, 3.9)], "neither the attack nor the tail");
    }

    #[test]
    fn sound_without_a_key_is_taken_only_where_that_is_set() {
        for (unplayed, expected) in [(false, vec![]), (true, vec![(69, 3.9)])] {
            let (mut keys, sheet) = keys(unplayed);
            keys.note(&note(1_000, 48_000, 441.0));
            keys.note(&note(48_100, 58_000, 446.0));
            keys.note(&note(90_000, 94_000, 466.0));
            assert_eq!(rows(&sheet), expected, "{unplayed}; neither its tail nor a blip");
        }
    }

    #[test]
    fn several_keys_at_once_give_no_row_and_that_is_told() {
        let (mut keys, sheet) = keys(true);
        keys.key(0, 57, true);
        keys.key(100, 69, true);
        keys.note(&note(500, 48_000, 220.0));
        assert_eq!(rows(&sheet), [], "two keys");
        let mut snapshot = Snapshot::default();
        sheet.look(&mut snapshot);
        assert_eq!(snapshot.declined, Some(Declined { key: 69 }), "the newest is named");
        keys.key(48_000, 57, false);
        keys.key(48_000, 69, false);
        keys.key(60_000, 69, true);
        keys.note(&note(60_300, 96_000, 440.0));
        sheet.look(&mut snapshot);
        assert_eq!((rows(&sheet), snapshot.declined), (vec![(69, 0.0)], None), "one key");
    }

    #[test]
    fn after_a_gap_nobody_knows_which_keys_are_held() {
        let (mut keys, sheet) = keys(false);
        keys.key(1_000, 57, true);
        keys.lose(48_000);
        keys.note(&note(96_000, 144_000, 220.0));
        assert_eq!(rows(&sheet), [], "its release may have been lost");
        keys.key(144_000, 69, true);
        keys.note(&note(144_300, 192_000, 440.0));
        assert_eq!(rows(&sheet), [(69, 0.0)], "and it does not stand beside the next key");
    }

    #[test]
    fn a_stream_begins_without_keys() {
        let (mut keys, sheet) = keys(false);
        keys.key(1_000, 69, true);
        keys.start();
        keys.note(&note(2_000, 48_000, 440.0));
        assert_eq!(rows(&sheet), [], "the key was of the stream before");
    }

    #[test]
    fn figures_that_are_no_numbers_make_no_row() {
        let (mut keys, sheet) = keys(false);
        keys.key(0, 69, true);
        for hz in [f64::NAN, f64::INFINITY, 0.0, -440.0] {
            keys.note(&note(200, 48_000, hz));
        }
        assert_eq!(rows(&sheet), [], "no row");
    }
}
