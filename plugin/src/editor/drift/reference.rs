//! Where the pitch should be: the nearest note, or one pitch; in the trail's cents, so that it costs a few operations.

use plumbtone_analysis::tuning::{NoteName, Tuning};

use crate::convert::{floor, index};
use crate::trail::Point;

/// Notes that readings can lie near, as MIDI numbers.
const NOTES: (i16, i16) = (0, 120);

/// A reference.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Target {
    /// The nearest of the notes, given by their place in the trail's cents, rising.
    Nearest(Vec<f64>),
    /// One pitch, in the trail's cents.
    Fixed(f64),
}

impl Target {
    /// The nearest note of a tuning.
    pub(crate) fn nearest(tuning: &Tuning) -> Self {
        let note = |midi| tuning.frequency_hz(NoteName::from_midi(midi));
        Self::Nearest((NOTES.0..=NOTES.1).map(|midi| Point::cents_of(note(midi))).collect())
    }

    /// One pitch, in Hz.
    pub(crate) fn fixed(hz: f64) -> Self {
        Self::Fixed(Point::cents_of(hz))
    }

    /// Which note a pitch is held against, and the cents off it.
    pub(crate) fn off(&self, cents: f64) -> (i64, f64) {
        match self {
            Self::Fixed(at) => (0, cents - at),
            Self::Nearest(notes) => {
                let guess = floor((cents - notes[0]) / 100.0 + 0.5).max(0);
                let last = notes.len() - 1;
                let guess = index(guess.unsigned_abs()).min(last);
                let near = [guess.saturating_sub(1), guess, (guess + 1).min(last)];
                let off = |k: usize| cents - notes[k];
                let best = near.into_iter().min_by(|&a, &b| off(a).abs().total_cmp(&off(b).abs()));
                let best = best.unwrap_or(guess);
                (i64::try_from(best).unwrap_or(0), off(best))
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use plumbtone_analysis::tuning::Temperament;

    use super::*;

    #[test]
    fn it_agrees_with_the_tuning_in_every_temperament() {
        for temperament in Temperament::ALL {
            let tuning = Tuning::new(443.0, temperament).unwrap();
            let target = Target::nearest(&tuning);
            for step in 0..500 {
                let hz = 25.0 * f64::powf(1.0106, f64::from(step));
                let expected = tuning.nearest(hz).unwrap().cents;
                let (_, found) = target.off(Point::cents_of(hz));
                // At the middle between two notes either is the nearest.
                let same =
                    (found - expected).abs() < 0.01 || (found.abs() - expected.abs()).abs() < 0.01;
                assert!(same, "{temperament} {hz}: {found} {expected}");
            }
        }
    }
}
