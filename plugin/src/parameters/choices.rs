//! The choices among the parameters. Their ids are stored in sessions and never change.

use nice_plug::prelude::Enum;
use plumbtone_analysis::tuning::Temperament;

/// Which signal of a stereo pair is measured; a mono input is measured as it is.
#[derive(Enum, Debug, Clone, Copy, PartialEq, Eq)]
pub enum Channel {
    /// Half the sum of left and right.
    #[id = "mid"]
    Mid,
    /// Left.
    #[id = "left"]
    Left,
    /// Right.
    #[id = "right"]
    Right,
    /// Half the difference, left less right.
    #[id = "side"]
    Side,
}

/// Where a drift check expects the pitch.
#[derive(Enum, Debug, Clone, Copy, PartialEq, Eq)]
pub enum Reference {
    /// On the nearest note of the temperament.
    #[id = "nearest"]
    #[name = "Nearest note"]
    NearestNote,
    /// On the note that the plugin's note input holds.
    #[id = "played"]
    #[name = "Played notes"]
    PlayedNotes,
    /// Where it was when it first held steady.
    #[id = "first"]
    #[name = "First pitch"]
    FirstPitch,
    /// On the reference pitch.
    #[id = "pitch"]
    #[name = "Reference pitch"]
    Pitch,
}

/// What is sent to the note output while a check is outside.
#[derive(Enum, Debug, Clone, Copy, PartialEq, Eq)]
pub enum MidiOutput {
    /// Nothing.
    #[id = "off"]
    Off,
    /// A note that is held as long.
    #[id = "note"]
    Note,
    /// A controller at 127, and at 0 afterwards.
    #[id = "controller"]
    Controller,
}

/// A temperament as a parameter.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct TemperamentChoice(pub Temperament);

const TEMPERAMENTS: usize = Temperament::ALL.len();

const TEMPERAMENT_IDS: [&str; TEMPERAMENTS] = {
    let mut ids = [""; TEMPERAMENTS];
    let mut index = 0;
    while index < TEMPERAMENTS {
        ids[index] = Temperament::ALL[index].name();
        index += 1;
    }
    ids
};

const TEMPERAMENT_NAMES: [&str; TEMPERAMENTS] = [
    "Equal",
    "Pythagorean",
    "Quarter-comma meantone",
    "Werckmeister III",
    "Kirnberger III",
    "Vallotti",
    "Young I",
    "Young II",
    "Just from C",
];

impl Enum for TemperamentChoice {
    fn variants() -> &'static [&'static str] {
        &TEMPERAMENT_NAMES
    }

    fn ids() -> Option<&'static [&'static str]> {
        Some(&TEMPERAMENT_IDS)
    }

    fn to_index(self) -> usize {
        Temperament::ALL.iter().position(|&temperament| temperament == self.0).unwrap_or_default()
    }

    fn from_index(index: usize) -> Self {
        Self(Temperament::ALL.get(index).copied().unwrap_or_default())
    }
}
