//! What the user can say to the command `keys`.

use super::{EXIT_STATUS, What, picture_path};
use clap::Args as ClapArgs;
use std::path::PathBuf;

const DETAILS: &str = "\
Makes one row per note: the key, how far the pitch lies off it, stretch, tilt, level, the alias that stands out most, and \
how long after the onset the pitch settles. The notes may all be in one file that plays the scale, or in a folder with \
one file per note. A key that is found more than once has a row for each. Keys between the lowest and the highest that \
no note was found for are listed, so that one sees what to play.

Examples:
  plumbtone keys scale.wav
      one row for each note of the file
  plumbtone keys --named takes/
      a folder of files such as pad-C4.wav and pad-F#4.wav, the keys taken from the names
  plumbtone keys --json --csv sheet.csv --picture sheet.svg scale.wav
      the sheet as JSON, as CSV, and drawn over the keyboard";

/// Measure how an instrument behaves over its keys.
#[derive(Debug, ClapArgs)]
#[command(after_long_help = format!("{DETAILS}\n\n{EXIT_STATUS}"), after_help = "More with --help.")]
pub(crate) struct Keys {
    /// Sound files, folders of them, or patterns such as 'takes/*.wav'
    #[arg(required = true, value_name = "FILE")]
    pub(crate) files: Vec<PathBuf>,
    /// Take each file's key from the last note name or MIDI number in its name, instead of the nearest note
    #[arg(long)]
    pub(crate) named: bool,
    #[command(flatten)]
    pub(crate) what: What,
    /// Print JSON instead of a table
    #[arg(long)]
    pub(crate) json: bool,
    /// Draw the figures of all keys over the keyboard as SVG or, if the name ends in .png, as PNG
    #[arg(long, value_name = "PICTURE", value_parser = picture_path)]
    pub(crate) picture: Option<PathBuf>,
    /// Also write the sheet as CSV into this file
    #[arg(long, value_name = "SHEET.csv")]
    pub(crate) csv: Option<PathBuf>,
}
