//! Note names with octaves, C4 being middle C (MIDI note number 60).

use core::fmt;
use core::str::FromStr;

/// How each pitch class is written: the black keys as the notes of the chain of fifths Eb to G#, which the unequal
/// temperaments tune.
const SPELLING: [&str; 12] = ["C", "C#", "D", "Eb", "E", "F", "F#", "G", "G#", "A", "Bb", "B"];

/// A note of the keyboard, continued without end in both directions.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct NoteName(i16);

impl NoteName {
    /// The note with a MIDI note number (60 is C4); numbers outside 0 to 127 continue the scale.
    #[must_use]
    pub const fn from_midi(number: i16) -> Self {
        Self(number)
    }

    /// MIDI note number; outside 0 to 127 for what MIDI cannot play.
    #[must_use]
    pub const fn midi(self) -> i16 {
        self.0
    }

    /// Octave: 4 from middle C to the B above it.
    #[must_use]
    pub const fn octave(self) -> i16 {
        self.0.div_euclid(12) - 1
    }

    /// Semitones above the C of the same octave, 0 to 11.
    #[must_use]
    pub fn pitch_class(self) -> usize {
        usize::from(self.0.rem_euclid(12).unsigned_abs())
    }
}

/// Writes letter, accidental and octave in ASCII, such as `C#4`, `Bb3` or `A-1`.
impl fmt::Display for NoteName {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(&format!("{}{}", SPELLING[self.pitch_class()], self.octave()))
    }
}

/// Reads a letter A to G of either case, at most one accidental (`#` or `b`, or the signs for them) and an octave of
/// -128 to 127. The octave is that of the letter: `Cb4` is `B3`.
impl FromStr for NoteName {
    type Err = NoteNameError;

    fn from_str(text: &str) -> Result<Self, Self::Err> {
        parse(text).ok_or_else(|| NoteNameError { given: text.to_owned() })
    }
}

fn parse(text: &str) -> Option<NoteName> {
    let mut characters = text.chars();
    let natural = match characters.next()?.to_ascii_uppercase() {
        'C' => 0,
        'D' => 2,
        'E' => 4,
        'F' => 5,
        'G' => 7,
        'A' => 9,
        'B' => 11,
        _ => return None,
    };
    let rest = characters.as_str();
    let (accidental, octave) = if let Some(octave) = rest.strip_prefix(['#', '\u{266f}']) {
        (1, octave)
    } else if let Some(octave) = rest.strip_prefix(['b', '\u{266d}']) {
        (-1, octave)
    } else {
        (0, rest)
    };
    // The number parser takes a plus sign, which is no part of a note name.
    let octave: i8 = if octave.starts_with('+') { None } else { octave.parse().ok() }?;
    Some(NoteName(12 * (i16::from(octave) + 1) + natural + accidental))
}

/// A text that is no note name.
#[derive(Debug, Clone, PartialEq, Eq)]
#[non_exhaustive]
pub struct NoteNameError {
    /// The text given.
    pub given: String,
}

impl fmt::Display for NoteNameError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{:?} is no note name such as A3, F#2 or Bb-1 (C4 is middle C)", self.given)
    }
}

impl core::error::Error for NoteNameError {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_and_numbers_agree() {
        for (text, number, shown) in [
            ("C4", 60, "C4"),
            ("A4", 69, "A4"),
            ("a3", 57, "A3"),
            ("F#2", 42, "F#2"),
            ("Gb2", 42, "F#2"),
            ("bb3", 58, "Bb3"),
            ("D\u{266f}4", 63, "Eb4"),
            ("E\u{266d}4", 63, "Eb4"),
            ("Cb4", 59, "B3"),
            ("B#3", 60, "C4"),
            ("C-1", 0, "C-1"),
            ("Bb-1", 10, "Bb-1"),
            ("G9", 127, "G9"),
            ("B-2", -1, "B-2"),
        ] {
            let note: NoteName = text.parse().unwrap();
            assert_eq!(note.midi(), number, "{text}");
            assert_eq!(note.to_string(), shown, "{text}");
        }
    }

    #[test]
    fn what_is_no_name_is_refused() {
        for text in
            ["", "A", "4", "H4", "A##4", "A#", "A+4", "A4x", "A 4", "A4 ", "A128", "\u{e9}4", "BB3"]
        {
            let error = text.parse::<NoteName>().expect_err(text);
            assert_eq!(error.given, text, "{error}");
        }
    }

    #[test]
    fn every_number_reads_back_from_its_name() {
        for number in -1500..1500 {
            let note = NoteName::from_midi(number);
            assert_eq!(note.to_string().parse(), Ok(note), "{number}");
        }
    }
}
