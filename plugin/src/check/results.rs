//! The results of an instance and what is set about them: kept in the session, shared by worker and editor.
//!
//! The lock is held for as long as a list takes to change or to be copied, never over a file; the audio thread never
//! takes it.

use std::sync::{Arc, Mutex, MutexGuard, PoisonError, TryLockError};

use nice_plug::params::persist::PersistentField;
use serde::{Deserialize, Serialize};

use super::curve::{COLUMNS_IN_ALL_MAX, Curve};
use super::report::{self, Job};
use super::result::{COMMENT_MAX, CheckResult, VerdictWord};
use crate::report_files::{Place, Told, Writers};

/// Version of the stored form. A newer one is read as far as it is understood.
pub(super) const FORMAT: u64 = 1;
/// Most results kept, and most spans of all of them together: the oldest go first.
pub(super) const RESULTS_MAX: usize = 256;
const SPANS_IN_ALL_MAX: usize = 4096;
/// Most characters of a setting.
pub(super) const TEXT_MAX: usize = 4096;

/// Results and their settings, shared: clones are the same one.
#[derive(Debug, Clone, Default)]
pub struct Results(Arc<Mutex<Book>>);

#[derive(Debug, Default)]
struct Book {
    stored: Stored,
    revision: u64,
    running: Option<RunningCheck>,
    /// What the host calls the track; empty while it does not tell.
    track: String,
    /// Reports being written.
    writers: Writers,
}

/// What a session keeps of the checks.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Stored {
    /// Version of this form.
    pub format: u64,
    /// Whether a pass over a stretch that was checked before is kept beside that.
    pub every_pass: bool,
    /// How reports are written.
    pub reports: Reports,
    /// Results that had to go for newer ones.
    pub left_out: u64,
    /// The results, oldest first.
    pub results: Vec<CheckResult>,
}

/// How reports are written.
#[derive(Debug, Clone, PartialEq, Eq, Default, Serialize, Deserialize)]
pub struct Reports {
    /// Whether a bounce ends with one.
    pub automatic: bool,
    /// The folder.
    pub folder: String,
    /// What their names begin with; without it the track's name as the host tells it.
    pub name: String,
}

/// How the check that is on stands.
#[derive(Debug, Clone, PartialEq)]
pub struct RunningCheck {
    /// The verdict so far.
    pub verdict: VerdictWord,
    /// The heard pitch farthest from the reference so far, in cents.
    pub worst_cents: Option<f64>,
    /// Largest distance that is within, in cents: set when the check began.
    pub tolerance_cents: f64,
    /// What it compares with.
    pub reference: String,
    /// Index in the trail of its first reading.
    pub from: f64,
}

/// All of it as it stands at one time.
#[derive(Debug, Clone, Default)]
pub struct Snapshot {
    revision: Option<u64>,
    /// Results and settings.
    pub stored: Stored,
    /// The check that is on.
    pub running: Option<RunningCheck>,
    /// What came of the last report.
    pub told: Option<Told>,
    /// Whether a report is being written.
    pub writing: bool,
}

impl Default for Stored {
    fn default() -> Self {
        Self {
            format: FORMAT,
            every_pass: false,
            reports: Reports::default(),
            left_out: 0,
            results: Vec::new(),
        }
    }
}

impl Results {
    /// Brings a snapshot up to date, unless somebody else is at it just now.
    pub fn look(&self, snapshot: &mut Snapshot) {
        let book = match self.0.try_lock() {
            Ok(book) => book,
            Err(TryLockError::Poisoned(poisoned)) => poisoned.into_inner(),
            Err(TryLockError::WouldBlock) => return,
        };
        snapshot.running.clone_from(&book.running);
        snapshot.writing = book.writers.is_busy();
        book.writers.look(&mut snapshot.told);
        if snapshot.revision != Some(book.revision) {
            snapshot.revision = Some(book.revision);
            snapshot.stored.clone_from(&book.stored);
        }
    }

    /// Forgets all results.
    pub fn clear(&self) {
        self.change(|stored| {
            stored.results.clear();
            stored.left_out = 0;
        });
    }

    /// Forgets one.
    pub fn remove(&self, number: u64) {
        self.change(|stored| stored.results.retain(|result| result.number != number));
    }

    /// Writes a comment to a result.
    pub fn comment(&self, number: u64, text: &str) {
        self.change(|stored| {
            if let Some(result) = stored.results.iter_mut().find(|r| r.number == number) {
                result.comment = text.chars().take(COMMENT_MAX).collect();
            }
        });
    }

    /// Sets whether every pass is kept.
    pub fn keep_every_pass(&self, every: bool) {
        self.change(|stored| stored.every_pass = every);
    }

    /// How reports are written.
    #[must_use]
    pub fn reports(&self) -> Reports {
        self.lock().stored.reports.clone()
    }

    /// Sets how reports are written.
    pub fn set_reports(&self, reports: Reports) {
        let fits = |text: &String| text.chars().count() <= TEXT_MAX;
        if fits(&reports.folder) && fits(&reports.name) {
            self.change(|stored| stored.reports = reports);
        }
    }

    /// The host calls the track this: reports are named by it when no other name is set.
    pub(crate) fn set_track(&self, name: &str) {
        name.clone_into(&mut self.lock().track);
    }

    /// Writes a report of all results, on a thread of its own.
    pub fn report(&self) {
        self.report_of(|_| true);
    }

    /// Waits for the reports that are being written.
    pub(crate) fn finish_reports(&self) {
        let threads = self.lock().writers.take();
        threads.finish();
    }

    /// A bounce has ended in which these results came.
    pub(super) fn bounced(&self, numbers: &[u64]) {
        if !numbers.is_empty() && self.lock().stored.reports.automatic {
            self.report_of(|result| numbers.contains(&result.number));
        }
    }

    /// Adds a result; gives the number it got. It replaces those it covers, unless every pass is kept.
    pub fn add(&self, mut result: CheckResult) -> u64 {
        self.change(|stored| {
            result.number = stored.results.iter().map(|r| r.number).max().unwrap_or(0) + 1;
            if !stored.every_pass {
                stored.results.retain(|old| !old.is_covered_by(&result));
            }
            let number = result.number;
            stored.results.push(result);
            stored.shorten();
            number
        })
    }

    /// Says how the check that is on stands.
    pub fn run(&self, running: Option<RunningCheck>) {
        self.lock().running = running;
    }

    /// Where a report goes, and what it is called.
    pub(crate) fn place(&self) -> Place {
        self.lock().place()
    }

    fn report_of(&self, wanted: impl Fn(&CheckResult) -> bool) {
        let mut book = self.lock();
        let results = book.stored.results.iter().filter(|r| wanted(r)).cloned().collect();
        let job = Job { place: book.place(), results };
        book.writers.start(move || report::write(&job));
    }

    fn change<R>(&self, f: impl FnOnce(&mut Stored) -> R) -> R {
        let mut book = self.lock();
        book.revision += 1;
        f(&mut book.stored)
    }

    fn lock(&self) -> MutexGuard<'_, Book> {
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

impl Book {
    fn place(&self) -> Place {
        let Reports { folder, name, .. } = &self.stored.reports;
        let name = if name.trim().is_empty() { &self.track } else { name };
        Place::new(folder.clone(), name.clone())
    }
}

impl Stored {
    /// Lets the oldest results go until what is left is small enough.
    pub(super) fn shorten(&mut self) {
        let mut spans: usize = self.results.iter().map(|result| result.spans.len()).sum();
        let mut surplus = 0;
        for result in &self.results {
            let left = self.results.len() - surplus;
            if left <= RESULTS_MAX && (spans <= SPANS_IN_ALL_MAX || left == 1) {
                break;
            }
            spans -= result.spans.len();
            surplus += 1;
        }
        self.results.drain(..surplus);
        self.left_out += surplus as u64;
        let mut columns = 0;
        for result in self.results.iter_mut().rev() {
            columns += result.curve.as_ref().map_or(0, Curve::columns);
            if columns > COLUMNS_IN_ALL_MAX {
                result.curve = None;
            }
        }
    }
}

impl<'a> PersistentField<'a, Stored> for Results {
    fn set(&self, new_value: Stored) {
        self.change(|stored| *stored = new_value);
    }

    fn map<F: Fn(&Stored) -> R, R>(&self, f: F) -> R {
        f(&self.lock().stored)
    }
}

#[cfg(test)]
mod tests {
    use std::fs;

    use super::super::fixtures::result;
    use super::*;

    fn starts(results: &Results) -> Vec<f64> {
        let mut snapshot = Snapshot::default();
        results.look(&mut snapshot);
        snapshot.stored.results.iter().map(|result| result.extent.start_s).collect()
    }

    #[test]
    fn a_pass_replaces_what_it_covers_and_nothing_else() {
        let results = Results::default();
        let stream = |start_s| CheckResult { in_session: false, ..result(start_s, start_s + 1.0) };
        for added in [result(0.0, 4.0), result(4.0, 8.0), result(6.0, 12.0), stream(20.0)] {
            results.add(added);
        }
        results.add(result(4.02, 9.0));
        assert_eq!(starts(&results), [0.0, 6.0, 20.0, 4.02], "the second one is covered");
        results.add(stream(20.0));
        results.add(result(0.0, 30.0));
        assert_eq!(starts(&results), [20.0, 20.0, 0.0], "no session tells that these are the same");
        results.keep_every_pass(true);
        results.add(result(0.0, 30.0));
        assert_eq!(starts(&results), [20.0, 20.0, 0.0, 0.0], "every pass is kept");
    }

    #[test]
    fn a_report_is_named_by_the_track_unless_a_name_is_set() {
        for (set, name) in [("", "Lead vocal"), ("Take", "Take")] {
            let folder = tempfile::tempdir().unwrap();
            let results = Results::default();
            results.add(result(0.0, 3.0));
            results.set_track("Lead vocal");
            results.set_reports(Reports {
                automatic: false,
                folder: folder.path().display().to_string(),
                name: set.to_owned(),
            });
            results.report();
            results.finish_reports();
            let names: Vec<String> = fs::read_dir(folder.path())
                .unwrap()
                .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
                .collect();
            assert_eq!(names.len(), 3, "{names:?}");
            assert!(names.iter().all(|file| file.starts_with(name)), "{names:?}, not {name}");
        }
    }
}
