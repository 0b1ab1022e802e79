//! One file through the engine.

use crate::args::What;
use crate::convert;
use crate::drift::record::DriftRecord;
use crate::input::{Block, Input};
use crate::keys::record::KeyRecord;
use crate::output::Report;
use crate::output::records::NoteRecord;
use crate::output::spool::Spool;
use anyhow::{Result, bail};
use plumbtone_analysis::tuning::{Temperament, Tuning};
use plumbtone_analysis::{Analyzer, Gap, GapReason, Note, Reading, Settings, Sink};
use std::ops::Range;
use std::path::{Path, PathBuf};

/// Turns the engine's sample positions into seconds from the file's first sample.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Timebase {
    /// Sample of the file where the engine's stream starts.
    pub(crate) offset: u64,
    /// Sample rate in Hz.
    pub(crate) sample_rate_hz: f64,
    /// Samples between two readings.
    pub(crate) hop: usize,
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
    pub(crate) temperament: Temperament,
    /// Notes found.
    pub(crate) notes: u64,
}

/// What came of a file.
#[derive(Debug)]
pub(crate) struct Measured {
    /// To be printed.
    pub(crate) text: Option<Spool>,
    /// Sentences that follow "FILE: ", for the user's attention.
    pub(crate) remarks: Vec<String>,
    /// What was asked for and could not be had.
    pub(crate) unmet: Vec<String>,
    /// What a drift check came to, where one was made.
    pub(crate) checked: Option<DriftRecord>,
    /// The rows of a key sheet.
    pub(crate) keys: Vec<KeyRecord>,
}

/// Measures a file into the reports. `progress` hears from time to time which share of the file has been read.
///
/// # Errors
/// Whatever keeps the file from being measured, in words that follow "FILE: ".
pub(crate) fn measure(
    path: &Path,
    what: &What,
    reports: impl FnOnce(Timebase) -> Result<Vec<Box<dyn Report>>>,
    mut progress: impl FnMut(f64) -> Result<()>,
) -> Result<Measured> {
    let mut input = Input::open(path, what.channel)?;
    let sample_rate_hz = f64::from(input.sample_rate_hz);
    let mut analyzer = Analyzer::new(&settings(what, sample_rate_hz))?;
    let start = convert::samples_in(what.start, sample_rate_hz);
    let end = what.end.map_or(u64::MAX, |end| convert::samples_in(end, sample_rate_hz));
    if end <= start {
        bail!("has nothing between the start and end asked for");
    }
    let timebase = Timebase { offset: start, sample_rate_hz, hop: analyzer.hop() };
    let mut fan =
        Fan::new(reports(timebase)?, timebase, Tuning::new(what.concert_pitch, what.temperament)?);

    let mut samples = Vec::new();
    while input.position < end
        && let Some(block) = input.next_block(&mut samples)?
    {
        feed(&mut analyzer, &block, &samples, input.position, start..end, &mut fan);
        fan.failure()?;
        progress(share(&input, end))?;
    }
    analyzer.finish(&mut fan);
    fan.failure()?;
    let read_to_end = input.position < end;
    if input.position == 0 {
        bail!("holds no samples");
    }
    if input.position <= start {
        bail!(
            "ends before the start asked for, at {:.3} s",
            input.position as f64 / sample_rate_hz
        );
    }
    let frames = if read_to_end { input.position } else { input.frames.unwrap_or(input.position) };
    let facts = FileFacts {
        path: path.to_owned(),
        sample_rate_hz: input.sample_rate_hz,
        channels: input.channels,
        duration_s: frames as f64 / sample_rate_hz,
        channel: if input.channels == 1 { String::new() } else { what.channel.to_string() },
        concert_pitch_hz: what.concert_pitch,
        temperament: what.temperament,
        notes: fan.notes,
    };
    let mut remarks = input.remarks(read_to_end);
    remarks.extend(fan.remarks());
    fan.finish(&facts, remarks)
}

fn settings(what: &What, sample_rate_hz: f64) -> Settings {
    let defaults = Settings::new(sample_rate_hz);
    Settings {
        lowest_hz: what.lowest,
        highest_hz: what.highest.unwrap_or(defaults.highest_hz),
        partials: usize::from(what.partials),
        integration_s: what.integration_s.unwrap_or(defaults.integration_s),
        ..defaults
    }
}

/// Gives the engine the part of a block that lies in the span asked for. `position` is where the block ends.
fn feed(
    analyzer: &mut Analyzer,
    block: &Block,
    samples: &[f32],
    position: u64,
    span: Range<u64>,
    sink: &mut Fan,
) {
    let length = match block {
        Block::Samples => samples.len() as u64,
        Block::Lost(count) => *count,
    };
    let start = position - length;
    let from = span.start.clamp(start, position);
    let to = span.end.clamp(from, position);
    match block {
        Block::Samples => {
            let samples = &samples[convert::index(from - start)..convert::index(to - start)];
            sink.samples(from - span.start, samples);
            analyzer.push(samples, sink);
        }
        Block::Lost(_) if to > from => analyzer.skip(to - from, sink),
        Block::Lost(_) => {}
    }
}

/// Share of the work done, 0 to 1.
fn share(input: &Input, end: u64) -> f64 {
    let all = input.frames.unwrap_or(u64::MAX).min(end).max(1);
    (input.position as f64 / all as f64).min(1.0)
}

/// Hands what the engine delivers to every report, and keeps the first failure, which the engine cannot be told of.
struct Fan {
    reports: Vec<Box<dyn Report>>,
    timebase: Timebase,
    tuning: Tuning,
    failed: Result<()>,
    notes: u64,
    strays_left_out: usize,
    non_finite: u64,
    /// Whether a pitch was claimed at any instant, or a note found.
    pitched: bool,
}

impl Fan {
    fn new(reports: Vec<Box<dyn Report>>, timebase: Timebase, tuning: Tuning) -> Self {
        let failed = Ok(());
        Self {
            reports,
            timebase,
            tuning,
            failed,
            notes: 0,
            strays_left_out: 0,
            non_finite: 0,
            pitched: false,
        }
    }

    fn each(&mut self, mut write: impl FnMut(&mut dyn Report) -> Result<()>) {
        if self.failed.is_ok() {
            self.failed = self.reports.iter_mut().try_for_each(|report| write(report.as_mut()));
        }
    }

    fn samples(&mut self, from: u64, samples: &[f32]) {
        self.reports.iter_mut().for_each(|report| report.samples(from, samples));
    }

    fn failure(&mut self) -> Result<()> {
        std::mem::replace(&mut self.failed, Ok(()))
    }

    fn remarks(&self) -> Vec<String> {
        let mut remarks = Vec::new();
        if self.non_finite > 0 {
            let seconds = self.non_finite as f64 / self.timebase.sample_rate_hz;
            remarks
                .push(format!("samples that are not numbers: {seconds:.3} s are left out as gaps"));
        }
        if self.strays_left_out > 0 {
            remarks.push(format!(
                "more strays than a note lists: the {} weakest are left out",
                self.strays_left_out
            ));
        }
        remarks
    }

    fn finish(self, facts: &FileFacts, remarks: Vec<String>) -> Result<Measured> {
        let mut measured =
            Measured { text: None, remarks, unmet: Vec::new(), checked: None, keys: Vec::new() };
        for report in self.reports {
            let ending = report.finish(facts)?;
            measured.text = ending.text.or(measured.text);
            measured.unmet.extend(ending.unmet);
            measured.checked = ending.checked.or(measured.checked);
            measured.keys.extend(ending.keys);
        }
        // A check says itself why it came to no verdict.
        if measured.checked.is_none() && !self.pitched {
            measured.unmet.push("nothing measurable: no single pitch was found".to_owned());
        }
        Ok(measured)
    }
}

impl Sink for Fan {
    fn reading(&mut self, reading: &Reading) {
        self.pitched |= reading.pitch.is_some();
        self.each(|report| report.reading(reading));
    }

    fn note(&mut self, note: &Note) {
        self.notes += 1;
        self.pitched = true;
        self.strays_left_out += note.strays_left_out;
        self.reports.iter_mut().for_each(|report| report.engine_note(note));
        let record = NoteRecord::new(note, self.timebase, &self.tuning);
        self.each(|report| report.note(&record));
    }

    fn gap(&mut self, gap: &Gap) {
        if gap.reason == GapReason::NonFinite {
            self.non_finite += gap.end - gap.start;
        }
        self.each(|report| report.gap(gap));
    }
}
