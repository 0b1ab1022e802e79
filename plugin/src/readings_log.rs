//! Every reading of every instance as a line of JSON, for scripts and tests that have no editor to look at.
//!
//! Off unless the environment variable [`VARIABLE`] names a folder when an instance is made (or [`log_into`] does, in a
//! program that links the plugin). Each instance writes a file of its own there, from the worker, never from the audio
//! thread.

use std::cell::RefCell;
use std::fs::{self, File};
use std::io::{self, BufWriter, Write as _};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicU64, Ordering};

use plumbtone_analysis::{Reading, State};
use serde::Serialize;

use crate::session::SessionPosition;

/// The environment variable that names the folder.
pub const VARIABLE: &str = "PLUMBTONE_READINGS";

thread_local! {
    static FOLDER: RefCell<Option<PathBuf>> = const { RefCell::new(None) };
}

/// Makes the instances that this thread makes from here on log into a folder, or as the environment says.
pub fn log_into(folder: Option<&Path>) {
    FOLDER.set(folder.map(Path::to_path_buf));
}

/// One reading. Fields are named as in the command line's JSON; numbers are printed with all their digits, and what
/// could not be measured is null.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Line {
    /// Number of the stream since the instance was made: a host's reset begins a new one.
    pub stream: u64,
    /// Sample position of the reading's centre in the stream.
    pub centre: u64,
    /// The same in seconds.
    pub time_s: f64,
    /// The session's time there, in seconds.
    pub session_s: Option<f64>,
    /// Bar from 1.
    pub bar: Option<i64>,
    /// Beat from 1, with its fraction.
    pub beat: Option<f64>,
    /// `silent`, `unpitched`, `several`, `gliding` or `steady`.
    pub state: String,
    /// Fundamental in Hz, when a single pitch is claimed.
    pub f0_hz: Option<f64>,
    /// Its standard deviation in cents.
    pub f0_sd_cents: Option<f64>,
    /// Confidence, 0 to 1.
    pub confidence: Option<f64>,
    /// Level in dBFS; null for digital silence.
    pub level_dbfs: Option<f64>,
    /// Partials: number, frequency in Hz, level in dBFS.
    pub partials: Vec<(u32, f64, f64)>,
    /// Number of strays.
    pub strays: usize,
}

impl Line {
    /// The line of a reading.
    #[must_use]
    pub fn of(
        stream: u64,
        sample_rate_hz: f64,
        reading: &Reading,
        session: &SessionPosition,
    ) -> Self {
        Self {
            stream,
            centre: reading.centre,
            time_s: reading.centre as f64 / sample_rate_hz,
            session_s: session.seconds,
            bar: session.bar_beat.map(|at| at.bar),
            beat: session.bar_beat.map(|at| at.beat),
            state: state_name(reading.state).to_owned(),
            f0_hz: reading.pitch.map(|pitch| pitch.f0_hz),
            f0_sd_cents: reading.pitch.map(|pitch| pitch.f0_sd_cents),
            confidence: reading.pitch.map(|pitch| pitch.confidence),
            level_dbfs: Some(reading.level_dbfs).filter(|level| level.is_finite()),
            partials: reading
                .partials
                .iter()
                .map(|partial| (partial.number, partial.frequency_hz, partial.level_dbfs))
                .collect(),
            strays: reading.strays.len(),
        }
    }
}

/// The word for a state.
#[must_use]
pub fn state_name(state: State) -> &'static str {
    match state {
        State::Silent => "silent",
        State::Unpitched => "unpitched",
        State::Several => "several",
        State::Gliding => "gliding",
        State::Steady => "steady",
    }
}

/// An open log.
#[derive(Debug)]
pub(crate) struct ReadingsLog {
    file: BufWriter<File>,
}

impl ReadingsLog {
    /// The log of a new instance, if one is wanted and its file can be made.
    pub(crate) fn open() -> Option<Self> {
        let told = FOLDER.with_borrow(Clone::clone);
        let folder = told.or_else(|| {
            let set = std::env::var_os(VARIABLE).filter(|folder| !folder.is_empty())?;
            Some(PathBuf::from(set))
        })?;
        Self::create(&folder).ok()
    }

    fn create(folder: &Path) -> io::Result<Self> {
        static INSTANCES: AtomicU64 = AtomicU64::new(0);
        let instance = INSTANCES.fetch_add(1, Ordering::Relaxed);
        fs::create_dir_all(folder)?;
        let name: PathBuf = format!("{}-{instance}.jsonl", std::process::id()).into();
        Ok(Self { file: BufWriter::new(File::create(folder.join(name))?) })
    }

    /// Adds a line. A full disk ends the log, not the analysis.
    pub(crate) fn add(&mut self, line: &Line) -> io::Result<()> {
        serde_json::to_writer(&mut self.file, line)?;
        self.file.write_all(b"\n")
    }

    pub(crate) fn flush(&mut self) -> io::Result<()> {
        self.file.flush()
    }
}
