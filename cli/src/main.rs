//! The program `plumbtone`: sound files in; tables, JSON, CSV, pictures and an exit status out.
//!
//! The way of a file: [`input`] decodes it in blocks, [`measure`] feeds the engine, [`output`] writes down what the
//! engine delivers while it does, and [`run`] spreads the files over the processor cores and prints in order. No step
//! holds a whole file, so a ten-hour one takes no more memory than a short one.
#![forbid(unsafe_code)]
#![expect(clippy::print_stderr, reason = "printing is what this program is for")]

mod args;
mod convert;
mod drift;
mod files;
#[cfg(test)]
mod fixtures;
mod input;
mod keys;
mod measure;
mod measure_job;
mod names;
mod output;
mod picture;
mod recipe;
mod run;

use clap::Parser as _;
use std::process::ExitCode;

fn main() -> ExitCode {
    let args = args::Args::parse();
    match args.command {
        args::Command::Measure(measure) => measure_job::measure_files(measure),
        args::Command::Drift(drift) => drift::check_files(drift),
        args::Command::Recipe(recipe) => recipe::write_recipes(recipe),
        args::Command::Keys(keys) => keys::write_sheet(keys),
    }
}
