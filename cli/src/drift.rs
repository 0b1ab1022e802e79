//! The command `drift`: the pitch of many files against a reference.

mod junit;
mod notes;
pub(crate) mod record;
mod report;
mod table;

use crate::args::{Drift, Limits, ReferenceChoice, What};
use crate::files::expand;
use crate::measure::Timebase;
use crate::names::{distinct_names, picture_place};
use crate::output::Report;
use crate::output::csv::folder_for;
use crate::run::{self, Ended, Job};
use anyhow::{Context as _, Result};
use junit::Junit;
use plumbtone_analysis::check::{CheckSettings, Expected, Reference};
use plumbtone_analysis::tuning::Tuning;
use record::{ReferenceWords, VerdictWord};
use report::{DriftReport, Places};
use std::path::PathBuf;
use std::process::ExitCode;

/// Exit status when a file is outside its tolerance.
const EXIT_OUTSIDE: u8 = 1;

/// Checks every file and prints what comes of it.
pub(crate) fn check_files(command: Drift) -> ExitCode {
    match try_check_files(command) {
        Ok(code) => ExitCode::from(code),
        Err(error) => {
            eprintln!("plumbtone: {error:#}");
            ExitCode::from(run::EXIT_BAD)
        }
    }
}

fn try_check_files(command: Drift) -> Result<u8> {
    let job = DriftJob::new(command)?;
    let mut outside = false;
    let mut junit = job.command.to.junit.as_deref().map(Junit::new).transpose()?;
    let ended = run::run(&job, |path, result| {
        let checked = result.as_ref().ok().and_then(|measured| measured.checked.as_ref());
        outside |= checked.is_some_and(|record| record.verdict == VerdictWord::Outside);
        if let Some(junit) = &mut junit {
            junit.add(path, result);
        }
    })?;
    // An interrupted batch is no report.
    if let Some(junit) = junit.filter(|_| ended != Ended::Interrupted) {
        junit.publish()?;
    }
    Ok(match ended {
        Ended::Interrupted => run::EXIT_INTERRUPTED,
        Ended::Lacking => run::EXIT_BAD,
        Ended::Whole if outside => EXIT_OUTSIDE,
        Ended::Whole => 0,
    })
}

struct DriftJob {
    command: Drift,
    names: Vec<String>,
    tuning: Tuning,
    /// From the file of expected notes, times from the sound file's first sample.
    expected: Option<Vec<Expected>>,
}

impl DriftJob {
    fn new(mut command: Drift) -> Result<Self> {
        command.files = expand(&command.files)?;
        let tuning = Tuning::new(command.what.concert_pitch, command.what.temperament)?;
        settings(&command.limits, 48_000.0, 480).validate()?;
        let read =
            |path: &PathBuf| notes::read(path, &tuning).with_context(|| path.display().to_string());
        let expected = command.limits.expect.as_ref().map(read).transpose()?;
        folder_for(command.to.csv.as_deref())?;
        Ok(Self { names: distinct_names(&command.files), command, tuning, expected })
    }

    /// The reference for a stream that starts within the file, and how it is called.
    fn reference(&self, timebase: Timebase) -> (Reference, ReferenceWords) {
        let limits = &self.command.limits;
        if let (Some(notes), Some(path)) = (&self.expected, &limits.expect) {
            let offset_s = timebase.seconds(0);
            let shifted = |note: &Expected| Expected {
                start_s: note.start_s - offset_s,
                end_s: note.end_s - offset_s,
                ..*note
            };
            let notes = notes.iter().map(shifted).collect();
            let name = path.file_name().unwrap_or_default().to_string_lossy().into_owned();
            let reference = Reference::Expected { notes, leeway_s: limits.leeway };
            return (reference, ReferenceWords { kind: "expected", name });
        }
        let words = |kind, name: &str| ReferenceWords { kind, name: name.to_owned() };
        match &limits.reference {
            ReferenceChoice::Note(note) => (
                Reference::Frequency(self.tuning.frequency_hz(*note)),
                words("note", &note.to_string()),
            ),
            ReferenceChoice::Frequency(hz) => {
                (Reference::Frequency(*hz), words("frequency", &format!("{hz} Hz")))
            }
            ReferenceChoice::First => (Reference::First, words("first", "first steady pitch")),
            ReferenceChoice::Nearest => {
                (Reference::Nearest(self.tuning), words("nearest", "nearest note"))
            }
        }
    }
}

impl Job for DriftJob {
    fn files(&self) -> &[PathBuf] {
        &self.command.files
    }

    fn what(&self) -> &What {
        &self.command.what
    }

    fn reports(&self, index: usize, timebase: Timebase) -> Result<Vec<Box<dyn Report>>> {
        let to = &self.command.to;
        let (reference, words) = self.reference(timebase);
        let settings = settings(&self.command.limits, timebase.sample_rate_hz, timebase.hop);
        let places = Places {
            json: to.json,
            csv: to.csv.as_deref(),
            name: &self.names[index],
            picture: to.picture.as_deref().map(|p| picture_place(p, &self.names, index)),
        };
        Ok(vec![Box::new(DriftReport::new(&settings, reference, words, timebase, places)?)])
    }
}

fn settings(limits: &Limits, sample_rate_hz: f64, hop: usize) -> CheckSettings {
    CheckSettings {
        tolerance_cents: limits.tolerance,
        min_span_s: limits.min_span,
        min_share: limits.min_share,
        ..CheckSettings::new(sample_rate_hz, hop)
    }
}
