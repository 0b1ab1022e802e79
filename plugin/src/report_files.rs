//! Files that a session writes beside itself: into a folder of the user's choosing, under a name that holds the time; whole
//! or not at all, never over another file, and on a thread of their own.

use std::io::{self, Write as _};
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, PoisonError};
use std::thread::JoinHandle;
use std::time::SystemTime;

use tempfile::NamedTempFile;
use time::OffsetDateTime;

/// What a name begins with when none is set, and its most characters.
const NAME: &str = "Plumbtone";
const NAME_MAX: usize = 80;
/// Most files of one name and second.
const TRIES: u32 = 1000;

/// What came of writing.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Told {
    /// It is there: its files without their endings.
    Written(String),
    /// It could not be written: why.
    Failed(String),
}

/// Where files go, what they are called, and when that was asked for.
#[derive(Debug, Clone)]
pub(crate) struct Place {
    folder: String,
    name: String,
    pub(crate) time: OffsetDateTime,
}

impl Place {
    /// Files of this name, written now.
    pub(crate) fn new(folder: String, name: String) -> Self {
        Self { folder, name, time: OffsetDateTime::from(SystemTime::now()) }
    }

    /// The same with a word after the name.
    pub(crate) fn and(self, word: &str) -> Self {
        let name = format!("{} {word}", self.title());
        Self { name, ..self }
    }

    /// What they are called, without the time.
    pub(crate) fn title(&self) -> &str {
        let name = self.name.trim();
        if name.is_empty() { NAME } else { name }
    }

    /// The time as a file says it.
    pub(crate) fn stamp(&self) -> String {
        format!("{}Z", self.time(('-', 'T', ':')))
    }

    /// Writes files by their endings. Gives where they are, without endings.
    ///
    /// # Errors
    /// In a sentence, why there are none.
    pub(crate) fn write(
        &self,
        contents: impl FnOnce() -> io::Result<Vec<(&'static str, String)>>,
    ) -> Result<String, String> {
        let folder = Path::new(self.folder.trim());
        if folder.as_os_str().is_empty() {
            return Err("no folder is set".to_owned());
        }
        if !folder.is_absolute() {
            return Err(format!("{} is not a whole path", folder.display()));
        }
        if !folder.is_dir() {
            return Err(format!("the folder {} is not there", folder.display()));
        }
        let written = contents().and_then(|contents| self.place(folder, &contents));
        written.map_err(|error| format!("{}: {error}", folder.display()))
    }

    fn place(&self, folder: &Path, contents: &[(&str, String)]) -> io::Result<String> {
        let stem = self.stem();
        for number in 1..=TRIES {
            let name = if number == 1 { stem.clone() } else { format!("{stem} {number}") };
            if publish(folder, &name, contents)? {
                return Ok(folder.join(name).display().to_string());
            }
        }
        Err(io::Error::from(io::ErrorKind::AlreadyExists))
    }

    /// The name of the files, without their endings.
    fn stem(&self) -> String {
        let allowed = |c: char| !c.is_control() && !"/\\:*?\"<>|".contains(c);
        let clean: String =
            self.title().chars().map(|c| if allowed(c) { c } else { '_' }).take(NAME_MAX).collect();
        // A name that begins with a dot would be hidden.
        format!("{} {}", clean.trim_start_matches('.').trim(), self.time(('-', ' ', '-')))
    }

    /// The time in UTC; `gap` stands between its parts.
    fn time(&self, (dash, gap, colon): (char, char, char)) -> String {
        let t = self.time;
        format!(
            "{:04}{dash}{:02}{dash}{:02}{gap}{:02}{colon}{:02}{colon}{:02}",
            t.year(),
            u8::from(t.month()),
            t.day(),
            t.hour(),
            t.minute(),
            t.second()
        )
    }
}

/// Writes all files of a name; false when one of them is there already.
fn publish(folder: &Path, name: &str, contents: &[(&str, String)]) -> io::Result<bool> {
    let mut ready = Vec::new();
    for (ending, text) in contents {
        let place = folder.join(format!("{name}.{ending}"));
        if place.try_exists()? {
            return Ok(false);
        }
        let mut file = new_file(folder)?;
        file.write_all(text.as_bytes())?;
        file.as_file().sync_all()?;
        ready.push((file, place));
    }
    let mut done: Vec<PathBuf> = Vec::new();
    for (file, place) in ready {
        match file.persist_noclobber(&place) {
            Ok(_) => done.push(place),
            Err(error) => {
                // Somebody else took the name just now, or the folder is gone: no part is left behind.
                for place in done {
                    std::fs::remove_file(place)?;
                }
                let taken = error.error.kind() == io::ErrorKind::AlreadyExists;
                return if taken { Ok(false) } else { Err(error.error) };
            }
        }
    }
    Ok(true)
}

fn new_file(folder: &Path) -> io::Result<NamedTempFile> {
    let mut builder = tempfile::Builder::new();
    #[cfg(unix)]
    {
        // The same rights as any new file, less the user's mask, instead of those of a secret.
        use std::os::unix::fs::PermissionsExt as _;
        builder.permissions(std::fs::Permissions::from_mode(0o666));
    }
    builder.prefix(".plumbtone-").tempfile_in(folder)
}

/// The threads that write, and what came of the last one.
#[derive(Debug, Default)]
pub(crate) struct Writers {
    threads: Vec<JoinHandle<()>>,
    told: Arc<Mutex<Option<Told>>>,
}

impl Writers {
    /// Writes on a thread of its own.
    pub(crate) fn start(
        &mut self,
        write: impl FnOnce() -> Result<String, String> + Send + 'static,
    ) {
        self.threads.retain(|thread| !thread.is_finished());
        let told = Arc::clone(&self.told);
        let thread = std::thread::Builder::new().name("plumbtone-report".to_owned());
        match thread.spawn(move || tell(&told, write())) {
            Ok(thread) => self.threads.push(thread),
            Err(error) => tell(&self.told, Err(error.to_string())),
        }
    }

    /// The threads, to be waited for without a lock held.
    pub(crate) fn take(&mut self) -> Vec<JoinHandle<()>> {
        core::mem::take(&mut self.threads)
    }

    /// Whether something is being written.
    pub(crate) fn is_busy(&self) -> bool {
        self.threads.iter().any(|thread| !thread.is_finished())
    }

    /// Brings what was told up to date, unless somebody else is at it just now.
    pub(crate) fn look(&self, to: &mut Option<Told>) {
        if let Ok(told) = self.told.try_lock() {
            to.clone_from(&told);
        }
    }
}

/// Waits until all of it is written.
pub(crate) fn finish(threads: Vec<JoinHandle<()>>) {
    for thread in threads {
        // A writer that panicked has told nothing, and there is nothing to add.
        let _ = thread.join();
    }
}

fn tell(to: &Mutex<Option<Told>>, came: Result<String, String>) {
    let told = match came {
        Ok(place) => Told::Written(place),
        Err(why) => Told::Failed(why),
    };
    *to.lock().unwrap_or_else(PoisonError::into_inner) = Some(told);
}
