//! The command `measure`: the notes of many files into tables, JSON, CSV and pictures.

use crate::args::{Measure, What};
use crate::files::expand;
use crate::measure::Timebase;
use crate::names::{distinct_names, picture_place};
use crate::output::Report;
use crate::output::csv::{CsvReport, folder_for};
use crate::output::json::JsonReport;
use crate::output::table::TableReport;
use crate::picture::PictureReport;
use crate::run::{self, Job};
use anyhow::Result;
use std::path::PathBuf;
use std::process::ExitCode;

/// Measures every file and prints what comes of it.
pub(crate) fn measure_files(command: Measure) -> ExitCode {
    let ended = MeasureJob::new(command).and_then(|job| run::run(&job, |_, _| {}));
    run::exit_code(ended)
}

struct MeasureJob {
    command: Measure,
    names: Vec<String>,
}

impl MeasureJob {
    fn new(mut command: Measure) -> Result<Self> {
        command.files = expand(&command.files)?;
        folder_for(command.to.csv.as_deref())?;
        Ok(Self { names: distinct_names(&command.files), command })
    }
}

impl Job for MeasureJob {
    fn files(&self) -> &[PathBuf] {
        &self.command.files
    }

    fn what(&self) -> &What {
        &self.command.what
    }

    fn reports(&self, index: usize, timebase: Timebase) -> Result<Vec<Box<dyn Report>>> {
        let to = &self.command.to;
        let mut reports: Vec<Box<dyn Report>> = Vec::new();
        if to.json {
            reports.push(Box::new(JsonReport::new(timebase)));
        } else {
            reports.push(Box::new(TableReport::new()));
        }
        if let Some(folder) = &to.csv {
            reports.push(Box::new(CsvReport::new(folder, &self.names[index], timebase)?));
        }
        if let Some(picture) = &to.picture {
            let place = picture_place(picture, &self.names, index);
            reports.push(Box::new(PictureReport::new(place, to.note, timebase)));
        }
        Ok(reports)
    }
}
