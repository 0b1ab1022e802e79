//! Captures: averaged readings that are kept with a name, to compare with others and with what sounds.
//!
//! They are shared by the editor, which shows and changes them, and the worker, which adds one when the parameter Capture is
//! switched on. The lock is held for as long as a list takes to change or to be copied, never over a file; the audio thread
//! never takes it.

mod capture;
mod file;
mod press;
mod stored;

use std::sync::{Arc, Mutex, MutexGuard, PoisonError, TryLockError};
use std::thread::{self, JoinHandle};

use nice_plug::params::persist::PersistentField;
use serde::{Deserialize, Serialize};

pub use self::capture::{COLOURS, Capture, Place};
pub(crate) use self::press::Press;
pub(crate) use self::stored::read;

/// Version of the stored form, which is that of an exported file too. A newer one is read as far as it is understood.
const FORMAT: u64 = 1;
/// Most captures kept.
pub const CAPTURES_MAX: usize = 24;
/// Most characters of a name.
pub const NAME_MAX: usize = 80;

/// Captures, shared: clones are the same ones.
#[derive(Debug, Clone, Default)]
pub struct Captures(Arc<Mutex<Shelf>>);

#[derive(Debug, Default)]
struct Shelf {
    kept: Kept,
    revision: u64,
    told: Option<Told>,
    /// What is being read or written.
    errands: Vec<JoinHandle<()>>,
}

/// What a session keeps of the captures, and what an exported file holds.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Kept {
    /// Version of this form.
    #[serde(rename = "plumbtone_captures")]
    pub format: u64,
    /// The captures, oldest first.
    pub captures: Vec<Capture>,
}

/// What came of the last thing that was asked for.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Told {
    /// In a sentence.
    pub text: String,
    /// Whether it was done.
    pub done: bool,
    /// How many things were told before.
    pub number: u64,
}

/// All of it as it stands at one time.
#[derive(Debug, Clone, Default)]
pub struct Snapshot {
    revision: Option<u64>,
    /// The captures.
    pub captures: Vec<Capture>,
    /// What was told last.
    pub told: Option<Told>,
    /// Whether a file is being read or written.
    pub busy: bool,
}

impl Default for Kept {
    fn default() -> Self {
        Self { format: FORMAT, captures: Vec::new() }
    }
}

impl Captures {
    /// Brings a snapshot up to date, unless somebody else is at it just now.
    pub fn look(&self, snapshot: &mut Snapshot) {
        let shelf = match self.0.try_lock() {
            Ok(shelf) => shelf,
            Err(TryLockError::Poisoned(poisoned)) => poisoned.into_inner(),
            Err(TryLockError::WouldBlock) => return,
        };
        snapshot.busy = shelf.errands.iter().any(|errand| !errand.is_finished());
        if snapshot.revision != Some(shelf.revision) {
            snapshot.revision = Some(shelf.revision);
            snapshot.captures.clone_from(&shelf.kept.captures);
            snapshot.told.clone_from(&shelf.told);
        }
    }

    /// Keeps a capture; gives the number it got. `None`, with the reason told, where there was nothing to capture or no room.
    pub fn add(&self, capture: Option<Capture>) -> Option<u64> {
        let mut shelf = self.lock();
        let Some(mut capture) = capture else {
            shelf.tell(false, "Nothing was captured: there is no single pitch.".to_owned());
            return None;
        };
        if shelf.kept.captures.len() >= CAPTURES_MAX {
            let text = format!(
                "Nothing was captured: {CAPTURES_MAX} are kept already. Forget one to make room."
            );
            shelf.tell(false, text);
            return None;
        }
        let number = shelf.next_number();
        capture.number = number;
        capture.name = format!("{} {number}", capture.note_name());
        capture.colour = shelf.free_colour();
        let text = format!("Captured: {}.", capture.name);
        shelf.kept.captures.push(capture);
        shelf.tell(true, text);
        Some(number)
    }

    /// Forgets one.
    pub fn remove(&self, number: u64) {
        self.change(|captures| captures.retain(|capture| capture.number != number));
    }

    /// Names one anew; what is empty or too long is cut.
    pub fn rename(&self, number: u64, name: &str) {
        self.change(|captures| {
            if let Some(capture) = captures.iter_mut().find(|c| c.number == number) {
                capture.name = name.chars().take(NAME_MAX).collect();
            }
        });
    }

    /// Gives one another colour, by its index below [`COLOURS`].
    pub fn paint(&self, number: u64, colour: u8) {
        self.change(|captures| {
            if let Some(capture) = captures.iter_mut().find(|c| c.number == number) {
                capture.colour = colour % COLOURS;
            }
        });
    }

    /// Captures as JSON: one by its number, or all of them.
    #[must_use]
    pub fn json(&self, number: Option<u64>) -> String {
        let shelf = self.lock();
        let wanted = |capture: &&Capture| number.is_none_or(|number| capture.number == number);
        let captures = shelf.kept.captures.iter().filter(wanted).cloned().collect();
        let kept = Kept { format: FORMAT, captures };
        // Plain data without maps: there is nothing that could not be written.
        serde_json::to_string_pretty(&kept).unwrap_or_default()
    }

    /// Takes in captures from JSON as [`json`](Self::json) gives it, as far as there is room; tells what came of it.
    pub fn import(&self, text: &str) {
        let mut findings = Vec::new();
        let found = read(Some(text), &mut findings).captures;
        let mut shelf = self.lock();
        let count = found.len();
        let mut taken = 0;
        for mut capture in found {
            if shelf.kept.captures.len() >= CAPTURES_MAX {
                findings.push(format!(
                    "{} found no room beside the {CAPTURES_MAX} that are kept",
                    count - taken
                ));
                break;
            }
            capture.number = shelf.next_number();
            shelf.kept.captures.push(capture);
            taken += 1;
        }
        if count == 0 && findings.is_empty() {
            findings.push("there are no captures in it".to_owned());
        }
        let done = findings.is_empty();
        let mut text = format!("{taken} taken in");
        for finding in findings {
            text = format!("{text}; {finding}");
        }
        shelf.tell(done, format!("{text}."));
    }

    /// Takes in captures from a file, on a thread of its own; tells what came of it.
    pub fn load(&self, path: &str) {
        let path = path.trim().to_owned();
        self.run(move |captures| match file::read(&path) {
            Ok(text) => captures.import(&text),
            Err(why) => captures.lock().tell(false, format!("Nothing was taken in: {why}.")),
        });
    }

    /// Writes all captures into a new file, on a thread of its own; tells what came of it.
    pub fn save(&self, path: &str) {
        let path = path.trim().to_owned();
        let text = self.json(None);
        self.run(move |captures| {
            let (done, told) = match file::write(&path, &text) {
                Ok(()) => (true, format!("Saved: {path}.")),
                Err(why) => (false, format!("Nothing was saved: {why}.")),
            };
            captures.lock().tell(done, told);
        });
    }

    /// Waits for the files that are being read or written.
    pub(crate) fn finish_errands(&self) {
        let errands = core::mem::take(&mut self.lock().errands);
        for errand in errands {
            // One that panicked has told nothing, and there is nothing to add.
            let _ = errand.join();
        }
    }

    fn run(&self, errand: impl FnOnce(&Self) + Send + 'static) {
        let captures = self.clone();
        let thread = thread::Builder::new().name("plumbtone-captures".to_owned());
        let spawned = thread.spawn(move || errand(&captures));
        let mut shelf = self.lock();
        shelf.errands.retain(|errand| !errand.is_finished());
        match spawned {
            Ok(errand) => shelf.errands.push(errand),
            Err(error) => shelf.tell(false, format!("That could not be begun: {error}.")),
        }
    }

    fn change(&self, f: impl FnOnce(&mut Vec<Capture>)) {
        let mut shelf = self.lock();
        shelf.revision += 1;
        f(&mut shelf.kept.captures);
    }

    fn lock(&self) -> MutexGuard<'_, Shelf> {
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

impl Shelf {
    fn next_number(&self) -> u64 {
        self.kept.captures.iter().map(|c| c.number).max().unwrap_or(0).saturating_add(1)
    }

    /// The colour that the fewest captures have.
    fn free_colour(&self) -> u8 {
        let count = |colour| self.kept.captures.iter().filter(|c| c.colour == colour).count();
        (0..COLOURS).min_by_key(|&colour| count(colour)).unwrap_or(0)
    }

    fn tell(&mut self, done: bool, text: String) {
        self.revision += 1;
        let number = self.told.as_ref().map_or(0, |told| told.number + 1);
        self.told = Some(Told { text, done, number });
    }
}

impl<'a> PersistentField<'a, Kept> for Captures {
    fn set(&self, new_value: Kept) {
        self.change(|captures| *captures = new_value.captures);
    }

    fn map<F: Fn(&Kept) -> R, R>(&self, f: F) -> R {
        f(&self.lock().kept)
    }
}

#[cfg(test)]
mod tests {
    use super::capture::tests::capture;
    use super::*;

    fn snapshot(captures: &Captures) -> Snapshot {
        let mut snapshot = Snapshot::default();
        captures.look(&mut snapshot);
        snapshot
    }

    #[test]
    fn each_gets_a_name_a_number_and_a_colour_of_its_own() {
        let captures = Captures::default();
        for expected in 1..=8 {
            assert_eq!(captures.add(Some(capture(220.0))), Some(expected));
        }
        let kept = snapshot(&captures).captures;
        assert_eq!((kept[0].name.as_str(), kept[7].name.as_str()), ("A3 1", "A3 8"));
        let mut colours: Vec<u8> = kept.iter().map(|c| c.colour).collect();
        colours.sort_unstable();
        assert_eq!(colours, [0, 0, 1, 1, 2, 3, 4, 5], "as different as they can be");
    }

    #[test]
    fn a_full_shelf_and_no_pitch_are_said_and_change_nothing() {
        let captures = Captures::default();
        assert_eq!(captures.add(None), None);
        assert!(snapshot(&captures).told.unwrap().text.contains("no single pitch"));
        for _ in 0..CAPTURES_MAX {
            assert!(captures.add(Some(capture(220.0))).is_some());
        }
        assert_eq!(captures.add(Some(capture(330.0))), None);
        let found = snapshot(&captures);
        assert_eq!(found.captures.len(), CAPTURES_MAX);
        assert!(found.told.is_some_and(|told| !told.done && told.text.contains("24 are kept")));
        captures.remove(5);
        assert_eq!(captures.add(Some(capture(330.0))), Some(25), "no number is given twice");
    }

    #[test]
    fn what_is_exported_comes_back_the_same() {
        let captures = Captures::default();
        for hz in [110.0, 220.0, 333.3] {
            captures.add(Some(capture(hz)));
        }
        captures.rename(2, "Pad \"soft\" \u{2603}");
        let other = Captures::default();
        other.import(&captures.json(None));
        assert_eq!(snapshot(&other).captures, snapshot(&captures).captures);
        other.import(&captures.json(Some(2)));
        let kept = snapshot(&other).captures;
        assert_eq!((kept.len(), kept[3].number, &kept[3].name), (4, 4, &kept[1].name));
        for _ in 0..8 {
            other.import(&captures.json(None));
        }
        let found = snapshot(&other);
        assert_eq!(found.captures.len(), CAPTURES_MAX);
        let told = found.told.unwrap();
        assert!(!told.done && told.text.contains("found no room"), "{told:?}");
    }

    #[test]
    fn what_is_no_capture_is_said() {
        let captures = Captures::default();
        for (text, why) in [
            ("", "could not be read"),
            ("[]", "could not be read"),
            ("{}", "no number"),
            (r#"{"plumbtone_captures":1,"captures":[]}"#, "there are no captures"),
            (r#"{"plumbtone_captures":1,"captures":[{"number":1}]}"#, "1 of 1 captures"),
        ] {
            captures.import(text);
            let told = snapshot(&captures).told.unwrap();
            assert!(!told.done && told.text.contains(why), "{text}: {told:?}");
        }
    }
}
