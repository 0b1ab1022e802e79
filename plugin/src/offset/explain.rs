//! What a constant offset fits: another concert pitch, a wrong sample rate, a film or record speed, a tape's speed.

use core::fmt;

use plumbtone_analysis::tuning::{cents, ratio};

use super::Offset;

/// Concert pitches with a history, in Hz.
const CONCERT_PITCHES_HZ: [f64; 9] =
    [392.0, 415.0, 430.0, 432.0, 435.0, 442.0, 443.0, 444.0, 466.0];
/// Speeds that are mixed up, as (played at, made for, name).
const SPEEDS: [(f64, f64, &str); 5] = [
    (48_000.0, 44_100.0, "44.1 kHz played as 48 kHz"),
    (44_100.0, 48_000.0, "48 kHz played as 44.1 kHz"),
    (25.0, 24.0, "24 frames/s film played at 25"),
    (24.0, 25.0, "25 frames/s film played at 24"),
    (30.0, 29.97, "0.1 % video pull-up"),
];
/// Below this many cents (and two deviations) a track is where it should be.
const NOTHING_CENTS: f64 = 0.5;
/// How near an offset must be to what it is said to fit, in cents, beside two of its deviations.
const FIT_CENTS: f64 = 0.6;

/// What an offset fits.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Explanation {
    /// None to speak of.
    InTune,
    /// A concert pitch in use.
    ConcertPitch {
        /// In Hz.
        hz: f64,
    },
    /// Two speeds mixed up.
    Speed {
        /// In words.
        name: &'static str,
    },
    /// Any other constant: a tape that runs this much too fast, varispeed.
    Tape {
        /// How much faster, in percent; negative is slower.
        faster_percent: f64,
    },
}

/// What an offset fits best, the most usual first, at most two; against the concert pitch set, in Hz. Offsets are known to
/// a semitone only, so a speed is compared by what it leaves of one.
#[must_use]
pub fn explain(offset: &Offset, concert_pitch_hz: f64) -> Vec<Explanation> {
    let allowed = FIT_CENTS.hypot(2.0 * offset.sd_cents);
    if offset.cents.abs() < NOTHING_CENTS.max(2.0 * offset.sd_cents) {
        return vec![Explanation::InTune];
    }
    let off = |expected: f64| ((offset.cents - expected + 50.0).rem_euclid(100.0) - 50.0).abs();
    let pitches = CONCERT_PITCHES_HZ.into_iter().filter_map(|hz| {
        let distance = off(cents(hz / concert_pitch_hz));
        (distance <= allowed).then_some((distance, Explanation::ConcertPitch { hz }))
    });
    let speeds = SPEEDS.into_iter().filter_map(|(played, made, name)| {
        let distance = off(cents(played / made));
        (distance <= allowed).then_some((distance, Explanation::Speed { name }))
    });
    let mut fits: Vec<_> = pitches.chain(speeds).collect();
    fits.sort_by(|a, b| a.0.total_cmp(&b.0));
    fits.truncate(2);
    if fits.is_empty() {
        return vec![Explanation::Tape { faster_percent: 100.0 * (ratio(offset.cents) - 1.0) }];
    }
    fits.into_iter().map(|(_, explanation)| explanation).collect()
}

impl fmt::Display for Explanation {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::InTune => write!(f, "in tune with the concert pitch set"),
            Self::ConcertPitch { hz } => write!(f, "fits {hz:.0} Hz, a concert pitch in use"),
            Self::Speed { name } => write!(f, "fits {name}"),
            Self::Tape { faster_percent } => {
                let word = if *faster_percent < 0.0 { "slow" } else { "fast" };
                write!(f, "or tape, varispeed {:.2} % {word}", faster_percent.abs())
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn words(off_cents: f64, concert_pitch_hz: f64) -> String {
        let offset = Offset { cents: off_cents, sd_cents: 0.1 };
        let found = explain(&offset, concert_pitch_hz);
        found.iter().map(Explanation::to_string).collect::<Vec<_>>().join("; ")
    }

    #[test]
    fn usual_causes_are_named() {
        for (off_cents, concert_pitch_hz, expected) in [
            (0.2, 440.0, "in tune with the concert pitch set"),
            // 442/440 and 432/440.
            (7.85, 440.0, "fits 442 Hz"),
            (-31.77, 440.0, "fits 432 Hz"),
            // 415/440 is 101.3 cents down, which leaves 1.3 of a semitone.
            (-1.27, 440.0, "fits 415 Hz"),
            // 48000/44100 is 146.7 cents up.
            (46.71, 440.0, "fits 44.1 kHz played as 48 kHz"),
            (-46.71, 440.0, "fits 48 kHz played as 44.1 kHz"),
            // 25/24 is 70.67 cents up.
            (-29.33, 440.0, "fits 24 frames/s film played at 25"),
            (20.0, 440.0, "varispeed 1.16 % fast"),
            (-20.5, 442.0, "varispeed 1.18 % slow"),
        ] {
            let found = words(off_cents, concert_pitch_hz);
            assert!(found.contains(expected), "{off_cents} at {concert_pitch_hz}: {found}");
        }
    }

    #[test]
    fn an_unsure_offset_explains_nothing() {
        let unsure = Offset { cents: 3.0, sd_cents: 2.0 };
        assert_eq!(explain(&unsure, 440.0), [Explanation::InTune], "within two deviations");
    }
}
