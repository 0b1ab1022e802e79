//! The key sheet of an instance: kept in the session, shared by worker, editor and state.
//!
//! The lock is held for as long as a row takes to change or the sheet to be copied, never over a file; the audio thread
//! never takes it.

use std::sync::{Arc, Mutex, MutexGuard, PoisonError, TryLockError};

use nice_plug::params::persist::PersistentField;
use plumbtone_analysis::tuning::Tuning;
use serde::{Deserialize, Serialize};

use super::csv;
use super::row::Row;
use crate::report_files::{self, Place, Told, Writers};

/// Version of the stored form. A newer one is read as far as it is understood.
pub(super) const FORMAT: u64 = 1;

/// The sheet, shared: clones are the same one.
#[derive(Debug, Clone, Default)]
pub struct Sheet(Arc<Mutex<Book>>);

#[derive(Debug, Default)]
struct Book {
    stored: Stored,
    revision: u64,
    declined: Option<Declined>,
    /// Sheets being written to files.
    writers: Writers,
}

/// What a session keeps of the sheet.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Stored {
    /// Version of this form.
    pub format: u64,
    /// Whether sound for which no key is held makes a row of the nearest note.
    pub unplayed: bool,
    /// The rows, one per key, from low to high.
    pub rows: Vec<Row>,
}

/// A note that made no row, for several keys were held while it sounded.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Declined {
    /// The newest of those keys.
    pub key: u8,
}

/// All of it as it stands at one time.
#[derive(Debug, Clone, Default)]
pub struct Snapshot {
    revision: Option<u64>,
    /// Rows and settings.
    pub stored: Stored,
    /// The last note, if it made no row.
    pub declined: Option<Declined>,
    /// What came of the last file.
    pub told: Option<Told>,
    /// Whether one is being written.
    pub writing: bool,
}

impl Default for Stored {
    fn default() -> Self {
        Self { format: FORMAT, unplayed: false, rows: Vec::new() }
    }
}

impl Stored {
    /// Puts a row in its place; true when there was one of this key.
    pub(super) fn put(&mut self, row: Row) -> bool {
        match self.rows.binary_search_by_key(&row.key, |row| row.key) {
            Ok(at) => {
                self.rows[at] = row;
                true
            }
            Err(at) => {
                self.rows.insert(at, row);
                false
            }
        }
    }

    /// The newest row.
    #[must_use]
    pub fn newest(&self) -> Option<&Row> {
        self.rows.iter().max_by_key(|row| row.take)
    }
}

impl Sheet {
    /// Brings a snapshot up to date, unless somebody else is at it just now.
    pub fn look(&self, snapshot: &mut Snapshot) {
        let book = match self.0.try_lock() {
            Ok(book) => book,
            Err(TryLockError::Poisoned(poisoned)) => poisoned.into_inner(),
            Err(TryLockError::WouldBlock) => return,
        };
        snapshot.declined = book.declined;
        snapshot.writing = book.writers.is_busy();
        book.writers.look(&mut snapshot.told);
        if snapshot.revision != Some(book.revision) {
            snapshot.revision = Some(book.revision);
            snapshot.stored.clone_from(&book.stored);
        }
    }

    /// Takes a row: the newest take of its key replaces the one before.
    pub fn take(&self, row: Row) {
        let mut book = self.lock();
        let take = book.stored.newest().map_or(0, |newest| newest.take).saturating_add(1);
        book.stored.put(Row { take, ..row });
        book.declined = None;
        book.revision += 1;
    }

    /// Says that a note made no row.
    pub fn decline(&self, declined: Declined) {
        self.lock().declined = Some(declined);
    }

    /// Forgets all rows.
    pub fn clear(&self) {
        let mut book = self.lock();
        book.stored.rows.clear();
        book.declined = None;
        book.revision += 1;
    }

    /// Sets whether sound for which no key is held makes rows.
    pub fn take_unplayed(&self, unplayed: bool) {
        let mut book = self.lock();
        book.stored.unplayed = unplayed;
        book.revision += 1;
    }

    /// Writes the sheet as a file, on a thread of its own; cents are against a tuning.
    pub(crate) fn write(&self, place: Place, tuning: Tuning) {
        let mut book = self.lock();
        let rows = book.stored.rows.clone();
        let place = place.and("keys");
        book.writers.start(move || place.write(|| Ok(vec![("csv", csv::text(&rows, &tuning))])));
    }

    /// Waits for the files that are being written.
    pub(crate) fn finish_reports(&self) {
        let threads = self.lock().writers.take();
        report_files::finish(threads);
    }

    /// Whether it does.
    pub(super) fn takes_unplayed(&self) -> bool {
        self.lock().stored.unplayed
    }

    fn lock(&self) -> MutexGuard<'_, Book> {
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

impl<'a> PersistentField<'a, Stored> for Sheet {
    fn set(&self, new_value: Stored) {
        let mut book = self.lock();
        book.stored = new_value;
        book.declined = None;
        book.revision += 1;
    }

    fn map<F: Fn(&Stored) -> R, R>(&self, f: F) -> R {
        f(&self.lock().stored)
    }
}
