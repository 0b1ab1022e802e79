//! The command `recipe`: what a sound is made of at one instant, to make it again.

mod record;
mod report;
mod wav;

use crate::args::{Recipe, What};
use crate::files::expand;
use crate::measure::Timebase;
use crate::names::{distinct_names, picture_place};
use crate::output::Report;
use crate::output::csv::folder_for;
use crate::run::{self, Job};
use anyhow::Result;
use plumbtone_analysis::tuning::Tuning;
use report::{Places, RecipeReport};
use std::path::PathBuf;
use std::process::ExitCode;

/// Time over which the partials of a reading are averaged, in seconds: hardly any, for an instant is asked for.
const INTEGRATION_S: f64 = 0.02;

/// Writes down the recipe of every file.
pub(crate) fn write_recipes(command: Recipe) -> ExitCode {
    let ended = RecipeJob::new(command).and_then(|job| run::run(&job, |_, _| {}));
    run::exit_code(ended)
}

struct RecipeJob {
    command: Recipe,
    names: Vec<String>,
    tuning: Tuning,
}

impl RecipeJob {
    fn new(mut command: Recipe) -> Result<Self> {
        command.files = expand(&command.files)?;
        command.what.integration_s = Some(INTEGRATION_S);
        folder_for(command.to.csv.as_deref())?;
        let tuning = Tuning::new(command.what.concert_pitch, command.what.temperament)?;
        Ok(Self { names: distinct_names(&command.files), command, tuning })
    }
}

impl Job for RecipeJob {
    fn files(&self) -> &[PathBuf] {
        &self.command.files
    }

    fn what(&self) -> &What {
        &self.command.what
    }

    fn reports(&self, index: usize, timebase: Timebase) -> Result<Vec<Box<dyn Report>>> {
        let to = &self.command.to;
        let place = |path: &Option<PathBuf>| {
            path.as_deref().map(|path| picture_place(path, &self.names, index))
        };
        let sheet =
            |folder: &PathBuf| (folder.clone(), format!("{}.recipe.csv", self.names[index]));
        let places = Places {
            json: to.json,
            csv: to.csv.as_ref().map(sheet),
            cycle: place(&to.cycle),
            table: place(&to.table).map(|place| (place, usize::from(to.cycles))),
            sound: place(&to.sound).map(|place| (place, f64::from(to.length))),
        };
        Ok(vec![Box::new(RecipeReport::new(self.command.at, timebase, self.tuning, places))])
    }
}
