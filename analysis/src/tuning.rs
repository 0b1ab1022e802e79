//! Note names and the frequencies they stand for: concert pitch, temperament, cents.
//!
//! Pure arithmetic that names what was measured and changes no measurement. Octaves are numbered so that C4 is middle C
//! and A4 bears the concert pitch (ISO 16:1975 puts it at 440 Hz). In every temperament A keeps the concert pitch; the
//! other notes move around it, although tables of temperaments commonly start from C.

mod cents;
pub mod midi_tuning;
mod note_name;
mod temperament;

use core::fmt;

use crate::convert::nearest_short;

pub use cents::{cents, ratio};
pub use note_name::{NoteName, NoteNameError};
pub use temperament::{Temperament, UnknownTemperament};

/// Lowest and highest concert pitch accepted, in Hz: room for historic pitches and for a tape run at a wrong speed.
const CONCERT_PITCH_HZ: (f64, f64) = (300.0, 600.0);
/// The standard pitch of A4, in Hz (ISO 16:1975).
const STANDARD_PITCH_HZ: f64 = 440.0;
/// Pitch class of A.
const A: usize = 9;
/// Note number of A4.
const A4: f64 = 69.0;

/// A concert pitch and a temperament: together the frequency of every note.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tuning {
    concert_pitch_hz: f64,
    temperament: Temperament,
    /// Cents of each pitch class, from C upwards, above the A that ends the same octave.
    cents_from_a: [f64; 12],
}

/// The note nearest to a frequency, and the rest.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Nearest {
    /// The nearest note.
    pub note: NoteName,
    /// How far the frequency lies above that note (negative: below), in cents.
    pub cents: f64,
}

impl Tuning {
    /// Combines a concert pitch (frequency of A4 in Hz, 300 to 600) with a temperament.
    ///
    /// # Errors
    /// A concert pitch outside its range, or not a number.
    pub fn new(concert_pitch_hz: f64, temperament: Temperament) -> Result<Self, TuningError> {
        let (low, high) = CONCERT_PITCH_HZ;
        if concert_pitch_hz >= low && concert_pitch_hz <= high {
            Ok(Self::of(concert_pitch_hz, temperament))
        } else {
            Err(TuningError { concert_pitch_hz })
        }
    }

    /// Frequency of A4, in Hz.
    #[must_use]
    pub fn concert_pitch_hz(&self) -> f64 {
        self.concert_pitch_hz
    }

    /// The temperament.
    #[must_use]
    pub fn temperament(&self) -> Temperament {
        self.temperament
    }

    /// Frequency of a note, in Hz.
    #[must_use]
    pub fn frequency_hz(&self, note: NoteName) -> f64 {
        let octaves = f64::from(note.octave() - 4);
        self.concert_pitch_hz * ratio(1200.0 * octaves + self.cents_from_a[note.pitch_class()])
    }

    /// The note of the tempered scale nearest to a frequency in Hz, the lower of two equally near. `None` for what is no
    /// frequency: zero, negative, infinite or not a number.
    #[must_use]
    pub fn nearest(&self, frequency_hz: f64) -> Option<Nearest> {
        if !(frequency_hz > 0.0 && frequency_hz.is_finite()) {
            return None;
        }
        let equal = nearest_short(A4 + cents(frequency_hz / self.concert_pitch_hz) / 100.0);
        // No note of these temperaments lies a semitone off the equal one, so it is this note or one beside it.
        [equal - 1, equal, equal + 1]
            .map(|number| {
                let note = NoteName::from_midi(number);
                Nearest { note, cents: cents(frequency_hz / self.frequency_hz(note)) }
            })
            .into_iter()
            .min_by(|a, b| a.cents.abs().total_cmp(&b.cents.abs()))
    }

    fn of(concert_pitch_hz: f64, temperament: Temperament) -> Self {
        let from_c = temperament.cents_from_c();
        Self { concert_pitch_hz, temperament, cents_from_a: from_c.map(|c| c - from_c[A]) }
    }
}

impl Default for Tuning {
    /// Equal temperament at 440 Hz.
    fn default() -> Self {
        Self::of(STANDARD_PITCH_HZ, Temperament::Equal)
    }
}

/// A concert pitch outside its range.
#[derive(Debug, Clone, Copy, PartialEq)]
#[non_exhaustive]
pub struct TuningError {
    /// The concert pitch given, in Hz.
    pub concert_pitch_hz: f64,
}

impl fmt::Display for TuningError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (low, high) = CONCERT_PITCH_HZ;
        write!(f, "concert pitch is {} Hz, outside {low} to {high} Hz", self.concert_pitch_hz)
    }
}

impl core::error::Error for TuningError {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn concert_pitch_outside_its_range_is_refused_with_the_range() {
        for pitch in [f64::NAN, 0.0, 299.9, 600.1, f64::INFINITY] {
            let error = Tuning::new(pitch, Temperament::Equal).expect_err("must be refused");
            assert!(error.to_string().contains("300 to 600 Hz"), "{pitch}: {error}");
        }
    }

    #[test]
    fn a_keeps_the_concert_pitch_in_every_temperament() {
        for temperament in Temperament::ALL {
            let tuning = Tuning::new(415.0, temperament).unwrap();
            for (number, expected) in [(57, 207.5), (69, 415.0), (81, 830.0)] {
                let frequency = tuning.frequency_hz(NoteName::from_midi(number));
                assert!((frequency - expected).abs() < 1e-9, "{temperament} {number}: {frequency}");
            }
        }
    }

    #[test]
    fn nearest_crosses_octave_boundaries() {
        let tuning = Tuning::default();
        let c4 = tuning.frequency_hz(NoteName::from_midi(60));
        for (offset, name, rest) in
            [(-49.0, "C4", -49.0), (-51.0, "B3", 49.0), (51.0, "C#4", -49.0)]
        {
            let nearest = tuning.nearest(c4 * ratio(offset)).unwrap();
            assert_eq!(nearest.note.to_string(), name, "{offset} cents from C4");
            assert!((nearest.cents - rest).abs() < 1e-9, "{offset} cents from C4: {nearest:?}");
        }
    }

    #[test]
    fn nearest_goes_by_the_tempered_scale() {
        // With A in common, meantone's Eb4 lies 20.53 cents above the equal one and its E4 3.42 below: they part at
        // 358.55 cents from C4, where the equal notes would at 350.
        let meantone = Tuning::new(440.0, Temperament::Meantone).unwrap();
        let eb4 = NoteName::from_midi(63);
        let below = meantone.nearest(meantone.frequency_hz(eb4) * ratio(37.0)).unwrap();
        assert_eq!(below.note, eb4, "{below:?}");
        let next = meantone.nearest(meantone.frequency_hz(eb4) * ratio(39.0)).unwrap();
        assert_eq!(next.note.to_string(), "E4", "{next:?}");
    }

    #[test]
    fn what_is_no_frequency_has_no_nearest_note() {
        for frequency in [0.0, -440.0, f64::NAN, f64::INFINITY] {
            assert_eq!(Tuning::default().nearest(frequency), None, "{frequency}");
        }
        assert!(Tuning::default().nearest(f64::MIN_POSITIVE).is_some(), "tiny");
        assert!(Tuning::default().nearest(f64::MAX).is_some(), "huge");
    }
}
