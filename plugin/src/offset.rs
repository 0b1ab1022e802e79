//! How far a whole track lies off the notes: one offset that all its notes share, or none.
//!
//! Cents off the nearest note live on a circle of 100 cents, so they are averaged there (K. Mardia and P. Jupp,
//! Directional Statistics, 2000, section 2.2): a track 50 cents off has notes at +49 and at -49.

mod explain;

use core::f64::consts::TAU;

pub use explain::{Explanation, explain};

/// Confidence from which a reading counts.
const CONFIDENCE: f64 = 0.8;
/// Readings before anything is said: three seconds of steady pitch.
const READINGS: f64 = 300.0;
/// Spread of the readings above which there is no offset that all notes share, in cents.
const SPREAD_CENTS: f64 = 12.0;
/// Readings that hold as much as one independent note: a note lasts about this long.
const READINGS_A_NOTE: f64 = 50.0;

/// The readings so far.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Offsets {
    count: f64,
    cosine: f64,
    sine: f64,
}

/// An offset that all notes share.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Offset {
    /// In cents off the nearest note, -50 to 50.
    pub cents: f64,
    /// Its standard deviation, with half a second of readings counted as one observation.
    pub sd_cents: f64,
}

impl Offsets {
    /// Adds a steady reading, as cents off its nearest note.
    pub fn add(&mut self, cents: f64, confidence: f64) {
        if !(confidence >= CONFIDENCE && cents.is_finite()) {
            return;
        }
        let (sine, cosine) = (TAU * cents / 100.0).sin_cos();
        self.count += 1.0;
        self.cosine += cosine;
        self.sine += sine;
    }

    /// The offset, when there is one.
    #[must_use]
    pub fn offset(&self) -> Option<Offset> {
        let length = self.cosine.hypot(self.sine) / self.count;
        if !(self.count >= READINGS && length > 0.0) {
            return None;
        }
        // Circular standard deviation, from radians to cents.
        let spread = (-2.0 * length.min(1.0).ln()).sqrt() * 100.0 / TAU;
        (spread <= SPREAD_CENTS).then(|| Offset {
            cents: self.sine.atan2(self.cosine) * 100.0 / TAU,
            sd_cents: spread / (self.count / READINGS_A_NOTE).sqrt(),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn offset_of(cents: impl Fn(u32) -> f64) -> Option<Offset> {
        let mut offsets = Offsets::default();
        for number in 0..600 {
            offsets.add(cents(number), 0.95);
        }
        offsets.offset()
    }

    #[test]
    fn a_constant_offset_is_found_across_the_half_step_too() {
        for off in [0.0, 1.8, -31.8, 46.7, 49.9] {
            let found = offset_of(|number| {
                let cents = off + if number % 2 == 0 { 1.0 } else { -1.0 };
                if cents > 50.0 { cents - 100.0 } else { cents }
            })
            .unwrap();
            let error = (found.cents - off + 50.0).rem_euclid(100.0) - 50.0;
            assert!(error.abs() < 0.01 && found.sd_cents < 0.5, "{off}: {found:?}");
        }
    }

    #[test]
    fn scattered_notes_or_few_readings_have_none() {
        assert_eq!(offset_of(|number| f64::from(number * 37 % 100) - 50.0), None, "scattered");
        let mut few = Offsets::default();
        for _ in 0..100 {
            few.add(3.0, 1.0);
            few.add(f64::NAN, 1.0);
            few.add(3.0, 0.2);
        }
        assert_eq!(few.offset(), None, "a second is not a track");
    }
}
