//! What the user can say on the command line.

mod drift;
mod keys;
mod recipe;

pub(crate) use drift::{Drift, Limits, ReferenceChoice};
pub(crate) use keys::Keys;
pub(crate) use recipe::Recipe;

use crate::input::Channel;
use clap::builder::{PossibleValuesParser, TypedValueParser};
use clap::{Args as ClapArgs, Parser, Subcommand};
use plumbtone_analysis::tuning::Temperament;
use std::path::PathBuf;

const EXIT_STATUS: &str = "\
Exit status:
  0  every file was measured (drift: and is within its tolerance)
  1  drift only: at least one file is outside its tolerance
  2  bad usage, a file that cannot be read, or one without a measurable pitch;
     the other files are measured all the same
  130  interrupted";

const MEASURE_DETAILS: &str = "\
Reads WAV (8, 16, 24, 32 bit, float, RF64), AIFF, AIFF-C and FLAC, at sample rates from 8 to 384 kHz.

Every figure comes with its standard deviation, after ±. Times are seconds from the file's first sample. \
Levels are dBFS, where 0 dBFS is a full-scale sine. \"Cents off\" compares a partial with its place in the \
harmonic series n·f0. What was odd about a file is said on standard error.

Examples:
  plumbtone measure piano.wav
      one table per note
  plumbtone measure --json takes/ > takes.jsonl
      one JSON object for each sound file below the folder, one file per line
  plumbtone measure --concert-pitch 415 --csv figures --picture a3.svg lute-a3.wav
      the figures as CSV files in the folder figures, and a picture, beside the table
  plumbtone measure --start 12.5 --end 15 --channel side mix.wav
      two and a half seconds of the difference of left and right";

/// Measures which partials a sound is made of, how far each lies off the harmonic series, what belongs to no partial,
/// and how sure each figure is.
#[derive(Debug, Parser)]
#[command(name = "plumbtone", version, max_term_width = 100, after_help = EXIT_STATUS)]
pub(crate) struct Args {
    #[command(subcommand)]
    pub(crate) command: Command,
}

#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// Measure the notes of sound files: fundamental, partials, stretch, strays
    Measure(Measure),
    /// Check whether the pitch of sound files holds: within a tolerance of a reference, and where not
    Drift(Drift),
    /// Write down what a sound is made of at one instant: as a list, as a single cycle, as sound
    Recipe(Recipe),
    /// Measure note by note how an instrument or a patch behaves over its keys
    Keys(Keys),
}

#[derive(Debug, ClapArgs)]
#[command(after_long_help = format!("{MEASURE_DETAILS}\n\n{EXIT_STATUS}"), after_help = "More with --help.")]
pub(crate) struct Measure {
    /// Sound files, folders of them, or patterns such as 'takes/*.wav'
    #[arg(required = true, value_name = "FILE")]
    pub(crate) files: Vec<PathBuf>,
    #[command(flatten)]
    pub(crate) what: What,
    #[command(flatten)]
    pub(crate) to: Outputs,
}

/// What is measured, and how.
#[derive(Debug, Clone, ClapArgs)]
#[command(next_help_heading = "What is measured")]
pub(crate) struct What {
    /// Channel: mid (half the sum of the first two), left, right, side (half their difference), or a number from 1
    #[arg(long, value_name = "CHANNEL", default_value = "mid")]
    pub(crate) channel: Channel,
    /// Where to start, in seconds from the file's start
    #[arg(long, value_name = "SECONDS", default_value = "0", value_parser = seconds)]
    pub(crate) start: f64,
    /// Where to stop, in seconds from the file's start [default: the file's end]
    #[arg(long, value_name = "SECONDS", value_parser = seconds)]
    pub(crate) end: Option<f64>,
    /// Lowest fundamental searched for, from 20 Hz
    #[arg(long, value_name = "HZ", default_value = "20")]
    pub(crate) lowest: f64,
    /// Highest fundamental searched for, up to 5000 Hz [default: 5000, or what the sample rate allows]
    #[arg(long, value_name = "HZ")]
    pub(crate) highest: Option<f64>,
    /// Number of partials measured, 1 to 128
    #[arg(long, value_name = "COUNT", default_value = "40", value_parser = clap::value_parser!(u8).range(1..=128))]
    pub(crate) partials: u8,
    /// Concert pitch: the frequency of A4
    #[arg(long, value_name = "HZ", default_value = "440")]
    pub(crate) concert_pitch: f64,
    /// Temperament that names the notes; A has the concert pitch in each
    #[arg(long, value_name = "NAME", default_value = "equal", value_parser = temperament_names())]
    pub(crate) temperament: Temperament,
    /// Time over which the partials of a reading are averaged, where a command wants another than the engine's.
    #[arg(skip)]
    pub(crate) integration_s: Option<f64>,
}

/// Where the figures go.
#[derive(Debug, Clone, ClapArgs)]
#[command(next_help_heading = "Where the figures go")]
pub(crate) struct Outputs {
    /// Print JSON instead of tables: one object per file, one file per line
    #[arg(long)]
    pub(crate) json: bool,
    /// Also write CSV files into this folder: NAME.frames.csv, NAME.notes.csv, NAME.partials.csv, NAME.strays.csv, after
    /// each file's name (NAME-2 and so on where two files have the same one)
    #[arg(long, value_name = "FOLDER")]
    pub(crate) csv: Option<PathBuf>,
    /// Also draw the partials of a note, as SVG or PNG; with several files, PICTURE-NAME.svg for each
    #[arg(long, value_name = "PICTURE", value_parser = picture_path)]
    pub(crate) picture: Option<PathBuf>,
    /// Which note of the file to draw, from 1 [default: the longest]
    #[arg(long, value_name = "NUMBER", requires = "picture", value_parser = clap::value_parser!(u32).range(1..))]
    pub(crate) note: Option<u32>,
}

fn temperament_names() -> impl TypedValueParser<Value = Temperament> {
    PossibleValuesParser::new(Temperament::ALL.map(Temperament::name))
        .try_map(|name| name.parse::<Temperament>())
}

fn seconds(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(value) if value >= 0.0 && value.is_finite() => Ok(value),
        _ => Err("expected a number of seconds, 0 or more".to_owned()),
    }
}

fn picture_path(text: &str) -> Result<PathBuf, String> {
    let path = PathBuf::from(text);
    let extension = path.extension().map(|extension| extension.to_ascii_lowercase());
    match extension.as_deref().and_then(|extension| extension.to_str()) {
        Some("svg" | "png") => Ok(path),
        _ => Err("expected a name that ends in .svg or .png".to_owned()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory as _;

    #[test]
    fn the_command_line_is_consistent() {
        Args::command().debug_assert();
    }

    #[test]
    fn values_outside_their_range_are_refused() {
        for bad in [
            vec!["--start", "-1"],
            vec!["--start", "nan"],
            vec!["--end", "inf"],
            vec!["--partials", "0"],
            vec!["--partials", "129"],
            vec!["--channel", "0"],
            vec!["--picture", "a.gif"],
            vec!["--note", "1"],
        ] {
            let line = ["plumbtone", "measure", "a.wav"].into_iter().chain(bad.iter().copied());
            assert!(Args::try_parse_from(line).is_err(), "{bad:?}");
        }
    }
}
