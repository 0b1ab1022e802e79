//! One file through the engine.

use crate::args::What;
use crate::convert;
use crate::input::{Block, Input};
use crate::output::Report;
use crate::output::records::NoteRecord;
use crate::output::spool::Spool;
use anyhow::{Result, bail};
use plumbtone_analysis::{Analyzer, Gap, Note, Reading, Settings, Sink};
use std::path::{Path, PathBuf};

/// Turns the engine's sample positions into seconds from the file's first sample.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Timebase {
    /// Sample of the file where the engine's stream starts.
    pub(crate) offset: u64,
    /// Sample rate in Hz.
    pub(crate) sample_rate_hz: f64,
}

impl Timebase {
    pub(crate) fn seconds(self, position: u64) -> f64 {
        (self.offset + position) as f64 / self.sample_rate_hz
    }
}

/// What is known of a file beside its figures.
#[derive(Debug, Clone)]
pub(crate) struct FileFacts {
    pub(crate) path: PathBuf,
    pub(crate) sample_rate_hz: u32,
    pub(crate) channels: usize,
    pub(crate) duration_s: f64,
    /// Which channel was measured, in words; empty when the file has one only.
    pub(crate) channel: String,
    pub(crate) concert_pitch_hz: f64,
    /// Notes found.
    pub(crate) notes: u64,
}

/// What came of a file.
#[derive(Debug)]
pub(crate) struct Measured {
    /// To be printed.
    pub(crate) text: Option<Spool>,
    /// Sentences that continue "FILE ", for the user's attention.
    pub(crate) remarks: Vec<String>,
    /// Whether a pitch was found anywhere.
    pub(crate) pitched: bool,
}

/// Measures a file into the reports. `progress` hears from time to time which share of the file has been read.
///
/// # Errors
/// Whatever keeps the file from being measured, in words that continue "FILE ".
pub(crate) fn measure(
    path: &Path,
    what: &What,
    reports: impl FnOnce(Timebase) -> Result<Vec<Box<dyn Report>>>,
    mut progress: impl FnMut(f64),
) -> Result<Measured> {
    let mut input = Input::open(path, what.channel)?;
    let sample_rate_hz = f64::from(input.sample_rate_hz);
    let mut analyzer = Analyzer::new(&settings(what, sample_rate_hz))?;
    let start = convert::samples_in(what.start, sample_rate_hz);
    let end = what.end.map_or(u64::MAX, |end| convert::samples_in(end, sample_rate_hz));
    if end <= start {
        bail!("has nothing between the start and end asked for");
    }
    let timebase = Timebase { offset: start, sample_rate_hz };
    let mut fan = Fan { reports: reports(timebase)?, timebase, ..Fan::default_at(timebase) };

    let mut samples = Vec::new();
    while input.position < end
        && let Some(block) = input.next_block(&mut samples)?
    {
        feed(&mut analyzer, &block, &samples, &input, (start, end), &mut fan);
        fan.failure()?;
        progress(share(&input, end));
    }
    analyzer.finish(&mut fan);
    fan.failure()?;
    let read_to_end = input.position < end;
    if input.position == 0 {
        bail!("holds no samples");
    }
    if input.position <= start {
        bail!("ends before the start asked for, at {:.3} s", input.position as f64 / sample_rate_hz);
    }
    let frames = if read_to_end { input.position } else { input.frames.unwrap_or(input.position) };
    let facts = FileFacts {
        path: path.to_owned(),
        sample_rate_hz: input.sample_rate_hz,
        channels: input.channels,
        duration_s: frames as f64 / sample_rate_hz,
        channel: if input.channels == 1 { String::new() } else { what.channel.to_string() },
        concert_pitch_hz: what.concert_pitch,
        notes: fan.notes,
    };
    let mut remarks = input.remarks(read_to_end);
    remarks.extend(fan.remarks());
    let (text, pitched) = fan.finish(&facts)?;
    Ok(Measured { text, remarks, pitched })
}

fn settings(what: &What, sample_rate_hz: f64) -> Settings {
    let defaults = Settings::new(sample_rate_hz);
    Settings {
        lowest_hz: what.lowest,
        highest_hz: what.highest.unwrap_or(defaults.highest_hz),
        partials: usize::from(what.partials),
        ..defaults
    }
}
