//! The command `keys`: one row per note, over many files.

mod named;
pub(crate) mod record;
mod report;
mod sheet;

use crate::args::{Keys, What};
use crate::files::expand;
use crate::measure::Timebase;
use crate::output::Report;
use crate::run::{self, Ended, Job};
use anyhow::{Result, anyhow};
use plumbtone_analysis::tuning::{NoteName, Tuning};
use report::KeysReport;
use std::path::PathBuf;
use std::process::ExitCode;

/// Measures the notes of every file and prints the sheet.
pub(crate) fn write_sheet(command: Keys) -> ExitCode {
    run::exit_code(try_write_sheet(command))
}

fn try_write_sheet(command: Keys) -> Result<Ended> {
    let job = KeysJob::new(command)?;
    let mut rows = Vec::new();
    let ended = run::run(&job, |_, result| {
        rows.extend(result.iter().flat_map(|measured| measured.keys.iter().cloned()));
    })?;
    // An interrupted sheet is none.
    if ended != Ended::Interrupted {
        sheet::write(rows, &job.command)?;
    }
    Ok(ended)
}

struct KeysJob {
    command: Keys,
    tuning: Tuning,
    /// The key that each file's name tells, where it is asked for.
    told: Vec<Option<NoteName>>,
}

impl KeysJob {
    fn new(mut command: Keys) -> Result<Self> {
        command.files = expand(&command.files)?;
        let tuning = Tuning::new(command.what.concert_pitch, command.what.temperament)?;
        let told = |file: &PathBuf| {
            let key = named::key_in(file).filter(|_| command.named);
            if command.named && key.is_none() {
                return Err(anyhow!("{}: no key in the name", file.display()));
            }
            Ok(key)
        };
        let told = command.files.iter().map(told).collect::<Result<_>>()?;
        Ok(Self { command, tuning, told })
    }
}

impl Job for KeysJob {
    fn files(&self) -> &[PathBuf] {
        &self.command.files
    }

    fn what(&self) -> &What {
        &self.command.what
    }

    fn reports(&self, index: usize, timebase: Timebase) -> Result<Vec<Box<dyn Report>>> {
        Ok(vec![Box::new(KeysReport::new(self.tuning, self.told[index], timebase))])
    }
}
