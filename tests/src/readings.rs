//! The readings that running plugins logged, and those of the engine to compare them with.

use std::fs;
use std::path::Path;

use plumbtone_analysis::{Reading, State};
use serde::Deserialize;

use crate::clap_host::Failure;

/// The environment variable that makes plugins log into a folder.
pub const VARIABLE: &str = "PLUMBTONE_READINGS";

/// One logged reading, as much of it as the checks compare.
#[derive(Debug, Clone, PartialEq, Deserialize)]
pub struct Logged {
    /// Number of the stream since the instance was made.
    pub stream: u64,
    /// Sample position of the centre.
    pub centre: u64,
    /// The session's time there, in seconds.
    pub session_s: Option<f64>,
    /// Bar from 1.
    pub bar: Option<i64>,
    /// Beat from 1.
    pub beat: Option<f64>,
    /// State in a word.
    pub state: String,
    /// Fundamental in Hz.
    pub f0_hz: Option<f64>,
    /// Its standard deviation in cents.
    pub f0_sd_cents: Option<f64>,
    /// Confidence.
    pub confidence: Option<f64>,
    /// Level in dBFS.
    pub level_dbfs: Option<f64>,
    /// Number, frequency in Hz and level in dBFS of each partial.
    pub partials: Vec<(u32, f64, f64)>,
    /// Number of strays.
    pub strays: usize,
}

impl Logged {
    /// Whether this is that reading of the engine, bit for bit.
    #[must_use]
    pub fn is(&self, reading: &Reading) -> bool {
        let bits = |x: Option<f64>| x.map(f64::to_bits);
        let pitch = reading.pitch.as_ref();
        let same_partials = self.partials.len() == reading.partials.len()
            && self.partials.iter().zip(&reading.partials).all(|(logged, partial)| {
                let of_engine = (partial.frequency_hz.to_bits(), partial.level_dbfs.to_bits());
                (logged.0, (logged.1.to_bits(), logged.2.to_bits())) == (partial.number, of_engine)
            });
        self.centre == reading.centre
            && self.state == word(reading.state)
            && bits(self.f0_hz) == bits(pitch.map(|p| p.f0_hz))
            && bits(self.f0_sd_cents) == bits(pitch.map(|p| p.f0_sd_cents))
            && bits(self.confidence) == bits(pitch.map(|p| p.confidence))
            && bits(self.level_dbfs) == bits(Some(reading.level_dbfs).filter(|l| l.is_finite()))
            && same_partials
            && self.strays == reading.strays.len()
    }
}

/// Reads all logs of a folder: one list of readings per instance, in the order in which the instances were made.
///
/// # Errors
/// A folder or file that cannot be read.
pub fn read_logs(folder: &Path) -> Result<Vec<Vec<Logged>>, Failure> {
    let mut files: Vec<_> =
        fs::read_dir(folder)?.map(|entry| entry.map(|e| e.path())).collect::<Result<_, _>>()?;
    files.sort_by_key(|path| {
        let name = path.file_stem().and_then(|name| name.to_str()).unwrap_or_default();
        name.rsplit('-').next().and_then(|number| number.parse::<u64>().ok())
    });
    files.iter().map(|file| read_log(file)).collect()
}

fn read_log(file: &Path) -> Result<Vec<Logged>, Failure> {
    let text = fs::read_to_string(file)?;
    Ok(text.lines().map(serde_json::from_str).collect::<Result<_, _>>()?)
}

fn word(state: State) -> &'static str {
    match state {
        State::Silent => "silent",
        State::Unpitched => "unpitched",
        State::Several => "several",
        State::Gliding => "gliding",
        State::Steady => "steady",
    }
}
