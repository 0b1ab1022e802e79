//! What the user can say to the command `recipe`.

use super::{EXIT_STATUS, What, seconds};
use clap::Args as ClapArgs;
use std::path::PathBuf;

const DETAILS: &str = "\
Takes the partials of one instant: their amplitudes, phases and frequency ratios, each with its standard deviation. \
Without --at it is the loudest instant at which a single pitch holds.

A cycle has partial n at harmonic n, as one period must: the stretch of a stiff string is in the list of partials and \
in --sound, not in cycles. Cycles are scaled to just under full scale, all of a table alike; how much is said. The \
residual is what the recipe's own sound leaves of the recording around the instant.

Examples:
  plumbtone recipe pad.wav
      the recipe as a table
  plumbtone recipe --at 1.25 --json --cycle cycle.wav --sound pad-again.wav pad.wav
      the recipe as JSON, one period of 2048 samples, and two seconds of its sound
  plumbtone recipe --table sweep.wav --cycles 64 sweep-note.wav
      64 periods from the file's start to its end, one after the other in one WAV file";

/// Write down what a sound is made of, to make it again.
#[derive(Debug, ClapArgs)]
#[command(after_long_help = format!("{DETAILS}\n\n{EXIT_STATUS}"), after_help = "More with --help.")]
pub(crate) struct Recipe {
    /// Sound files, folders of them, or patterns such as 'takes/*.wav'
    #[arg(required = true, value_name = "FILE")]
    pub(crate) files: Vec<PathBuf>,
    /// The instant, in seconds from the file's start [default: the loudest steady one]
    #[arg(long, value_name = "SECONDS", value_parser = seconds)]
    pub(crate) at: Option<f64>,
    #[command(flatten)]
    pub(crate) what: What,
    #[command(flatten)]
    pub(crate) to: RecipeOutputs,
}

/// Where a recipe goes.
#[derive(Debug, Clone, ClapArgs)]
#[command(next_help_heading = "Where the recipe goes")]
pub(crate) struct RecipeOutputs {
    /// Print JSON instead of tables: one object per file, one file per line
    #[arg(long)]
    pub(crate) json: bool,
    /// Also write NAME.recipe.csv into this folder, after each file's name
    #[arg(long, value_name = "FOLDER")]
    pub(crate) csv: Option<PathBuf>,
    /// Also write one period of 2048 samples, band-limited and phase-true, as WAV; with several files, CYCLE-NAME.wav for
    /// each, and so for the others
    #[arg(long, value_name = "CYCLE.wav", value_parser = wav_path)]
    pub(crate) cycle: Option<PathBuf>,
    /// Also write periods from the file's start to its end, one after the other, as WAV
    #[arg(long, value_name = "TABLE.wav", value_parser = wav_path)]
    pub(crate) table: Option<PathBuf>,
    /// How many periods the table has
    #[arg(long, value_name = "COUNT", default_value = "64", value_parser = clap::value_parser!(u16).range(2..=1024))]
    pub(crate) cycles: u16,
    /// Also write the sound of the instant's partials, as they are measured, as WAV
    #[arg(long, value_name = "SOUND.wav", value_parser = wav_path)]
    pub(crate) sound: Option<PathBuf>,
    /// How long that sound lasts
    #[arg(long, value_name = "SECONDS", default_value = "2", value_parser = clap::value_parser!(u16).range(1..=600))]
    pub(crate) length: u16,
}

fn wav_path(text: &str) -> Result<PathBuf, String> {
    let path = PathBuf::from(text);
    let extension = path.extension().map(|extension| extension.to_ascii_lowercase());
    match extension.as_deref().and_then(|extension| extension.to_str()) {
        Some("wav") => Ok(path),
        _ => Err("expected a name that ends in .wav".to_owned()),
    }
}
