//! What the user can say to `drift`.

use super::{EXIT_STATUS, What, picture_path};
use clap::Args as ClapArgs;
use plumbtone_analysis::tuning::NoteName;
use std::path::PathBuf;
use std::str::FromStr;

const DETAILS: &str = "\
What is judged is the pitch that a listener hears: the mean under a vibrato, not its swings. A file is \"within\" when that \
pitch stays within the tolerance of its reference, \"outside\" when it leaves it for long enough and by more than its \
standard deviation explains, and \"unmeasured\" when too little of the sound has a single pitch. Drift is the slope of a \
straight line through the pitch.

References:
  A3, F#2, Bb-1   a note (C4 is middle C), by --concert-pitch and --temperament
  220.5           a frequency in Hz
  first           the first pitch of the file that holds still
  nearest         at each instant the nearest note of the temperament
With --expect the reference is the note that a file of notes expects there. A CSV file of notes needs a head line and the \
columns start_s, end_s and note or f0_hz, as the notes that `plumbtone measure --csv` writes. Of a Standard MIDI File the \
notes of all tracks count but for channel 10 (drums); pitch bends are not followed.

Examples:
  plumbtone drift --reference A3 --tolerance 5 drone.wav
      is the drone within 5 cents of A3?
  plumbtone drift --tolerance 15 --junit report.xml stems/
      checks every sound file in a folder, with a report for continuous integration
  plumbtone drift --expect melody.mid --tolerance 20 --picture take.svg take.flac
      against the notes of a MIDI file, with a picture of where it strays
  plumbtone drift --json --reference first 'takes/**/*.wav' > drift.jsonl
      how far does each take wander from where it began? One JSON object per line";

/// Checks whether the pitch stays within a tolerance of its reference, where it does not, how fast it drifts, and
/// whether that is drift or only vibrato.
#[derive(Debug, ClapArgs)]
#[command(after_long_help = format!("{DETAILS}\n\n{EXIT_STATUS}"), after_help = "More with --help.")]
pub(crate) struct Drift {
    /// Sound files, folders (with all sound files below them), or patterns such as 'takes/**/*.wav'
    #[arg(required = true, value_name = "FILE")]
    pub(crate) files: Vec<PathBuf>,
    #[command(flatten)]
    pub(crate) limits: Limits,
    #[command(flatten)]
    pub(crate) to: DriftOutputs,
    #[command(flatten)]
    pub(crate) what: What,
}

/// What the pitch is held against.
#[derive(Debug, Clone, ClapArgs)]
#[command(next_help_heading = "What it is checked against")]
pub(crate) struct Limits {
    /// Where the pitch should be: a note such as A3, a frequency in Hz, first, or nearest
    #[arg(long, value_name = "REFERENCE", default_value = "nearest", conflicts_with = "expect")]
    pub(crate) reference: ReferenceChoice,
    /// The notes that should be heard over time: a CSV or MIDI file
    #[arg(long, value_name = "NOTES")]
    pub(crate) expect: Option<PathBuf>,
    /// How much earlier or later than expected a note may begin or end
    #[arg(long, value_name = "SECONDS", default_value = "0.1", value_parser = super::seconds)]
    pub(crate) leeway: f64,
    /// How far the heard pitch may lie from its reference, to either side, 0.1 to 1200 cents
    #[arg(long, value_name = "CENTS", default_value = "10")]
    pub(crate) tolerance: f64,
    /// Shortest time outside that counts, 0.02 to 60 s
    #[arg(long, value_name = "SECONDS", default_value = "0.15", value_parser = super::seconds)]
    pub(crate) min_span: f64,
    /// Share of the sounding time that must have a single pitch for a verdict, 0 to 1
    #[arg(long, value_name = "SHARE", default_value = "0.5")]
    pub(crate) min_share: f64,
}

/// Where the results go.
#[derive(Debug, Clone, ClapArgs)]
#[command(next_help_heading = "Where the results go")]
pub(crate) struct DriftOutputs {
    /// Print JSON instead of the table: one object per file, one file per line
    #[arg(long)]
    pub(crate) json: bool,
    /// Also write CSV files into this folder: NAME.drift.csv (the pitch over time) and NAME.spans.csv (where it is
    /// outside), after each file's name
    #[arg(long, value_name = "FOLDER")]
    pub(crate) csv: Option<PathBuf>,
    /// Also draw the pitch over time, as SVG or PNG; with several files, PICTURE-NAME.svg for each
    #[arg(long, value_name = "PICTURE", value_parser = picture_path)]
    pub(crate) picture: Option<PathBuf>,
    /// Also write a JUnit XML report of all files, one test case per file
    #[arg(long, value_name = "REPORT")]
    pub(crate) junit: Option<PathBuf>,
}

/// A reference as the user names it.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum ReferenceChoice {
    Note(NoteName),
    Frequency(f64),
    First,
    Nearest,
}

impl FromStr for ReferenceChoice {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, Self::Err> {
        match text {
            "first" => return Ok(Self::First),
            "nearest" => return Ok(Self::Nearest),
            _ => {}
        }
        if let Ok(note) = text.parse() {
            return Ok(Self::Note(note));
        }
        match text.trim_end_matches("Hz").trim_end().parse::<f64>() {
            Ok(hz) if (1.0..=20_000.0).contains(&hz) => Ok(Self::Frequency(hz)),
            Ok(_) => Err("a frequency must lie within 1 to 20000 Hz".to_owned()),
            Err(_) => {
                Err("expected a note such as A3, a frequency in Hz, first, or nearest".to_owned())
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn references_are_notes_frequencies_or_words() {
        let note = |number| Ok(ReferenceChoice::Note(NoteName::from_midi(number)));
        for (text, choice) in [
            ("A3", note(57)),
            ("bb-1", note(10)),
            ("220", Ok(ReferenceChoice::Frequency(220.0))),
            ("440.5Hz", Ok(ReferenceChoice::Frequency(440.5))),
            ("27.5 Hz", Ok(ReferenceChoice::Frequency(27.5))),
            ("first", Ok(ReferenceChoice::First)),
            ("nearest", Ok(ReferenceChoice::Nearest)),
        ] {
            assert_eq!(text.parse::<ReferenceChoice>(), choice, "{text}");
        }
        for text in ["", "H3", "0", "-220", "nan", "inf", "99999", "A3.5", "last"] {
            assert!(text.parse::<ReferenceChoice>().is_err(), "{text}");
        }
    }
}
