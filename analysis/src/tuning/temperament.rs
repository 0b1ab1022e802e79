//! Temperaments, each built from its definition: which fifths of the circle are narrowed by which part of a comma, or
//! the ratios of a just scale.
//!
//! Definitions: J. M. Barbour, Tuning and Temperament, 1951; T. Young, Phil. Trans. R. Soc. 90:106-150, 1800. Names and
//! comma kinds differ between books (a schisma, at most 2 cents); each variant says what it means here.

use core::fmt;
use core::str::FromStr;

use super::cents::cents;

/// A pure fifth.
const FIFTH: f64 = 3.0 / 2.0;
/// The syntonic comma: four pure fifths over two octaves and a pure third.
const SYNTONIC: f64 = 81.0 / 80.0;
/// The Pythagorean comma: twelve pure fifths over seven octaves.
const PYTHAGOREAN: f64 = 531_441.0 / 524_288.0;
/// The just scale from C.
const JUST: [(f64, f64); 12] = [
    (1.0, 1.0),
    (16.0, 15.0),
    (9.0, 8.0),
    (6.0, 5.0),
    (5.0, 4.0),
    (4.0, 3.0),
    (45.0, 32.0),
    (3.0, 2.0),
    (8.0, 5.0),
    (5.0, 3.0),
    (9.0, 5.0),
    (15.0, 8.0),
];

/// A division of the octave into twelve notes.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
pub enum Temperament {
    /// Twelve equal semitones.
    #[default]
    Equal,
    /// Pure fifths from Eb to G#.
    Pythagorean,
    /// Fifths from Eb to G# narrowed by a quarter of the syntonic comma.
    Meantone,
    /// Werckmeister III: C-G, G-D, D-A and B-F# narrowed by a quarter of the Pythagorean comma.
    Werckmeister3,
    /// Kirnberger III: C-G-D-A-E narrowed by a quarter of the syntonic comma, F#-C# by the schisma.
    Kirnberger3,
    /// Vallotti: F-C-G-D-A-E-B narrowed by a sixth of the Pythagorean comma.
    Vallotti,
    /// Young's first: C-G-D-A-E narrowed by 3/16 of the syntonic comma; E-B-F# and Bb-F-C share what is left of the
    /// Pythagorean comma.
    Young1,
    /// Young's second: C-G-D-A-E-B-F# narrowed by a sixth of the Pythagorean comma.
    Young2,
    /// The just scale 1 16/15 9/8 6/5 5/4 4/3 45/32 3/2 8/5 5/3 9/5 15/8 from C.
    Just,
}

impl Temperament {
    /// All of them.
    pub const ALL: [Self; 9] = [
        Self::Equal,
        Self::Pythagorean,
        Self::Meantone,
        Self::Werckmeister3,
        Self::Kirnberger3,
        Self::Vallotti,
        Self::Young1,
        Self::Young2,
        Self::Just,
    ];

    /// The word for it, stable and fit for a command line.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Equal => "equal",
            Self::Pythagorean => "pythagorean",
            Self::Meantone => "meantone",
            Self::Werckmeister3 => "werckmeister-3",
            Self::Kirnberger3 => "kirnberger-3",
            Self::Vallotti => "vallotti",
            Self::Young1 => "young-1",
            Self::Young2 => "young-2",
            Self::Just => "just",
        }
    }

    /// Cents of each pitch class above C, from C (0) to B.
    #[must_use]
    pub fn cents_from_c(self) -> [f64; 12] {
        let (p, s) = (cents(PYTHAGOREAN), cents(SYNTONIC));
        match self {
            Self::Equal => core::array::from_fn(|semitones| 100.0 * semitones as f64),
            Self::Pythagorean => chain_with_wolf(0.0),
            Self::Meantone => chain_with_wolf(s / 4.0),
            Self::Werckmeister3 => {
                let q = p / 4.0;
                circle([q, q, q, 0.0, 0.0, q, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0])
            }
            Self::Kirnberger3 => {
                let (q, schisma) = (s / 4.0, p - s);
                circle([q, q, q, q, 0.0, 0.0, schisma, 0.0, 0.0, 0.0, 0.0, 0.0])
            }
            Self::Vallotti => {
                let x = p / 6.0;
                circle([x, x, x, x, x, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, x])
            }
            Self::Young1 => {
                let m = 3.0 / 16.0 * s;
                let r = (p - 4.0 * m) / 4.0;
                circle([m, m, m, m, r, r, 0.0, 0.0, 0.0, 0.0, r, r])
            }
            Self::Young2 => {
                let x = p / 6.0;
                circle([x, x, x, x, x, x, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0])
            }
            Self::Just => JUST.map(|(upper, lower)| cents(upper / lower)),
        }
    }
}

/// Fifths all narrowed alike, in cents, but for the wolf G#-Eb, which closes the circle.
fn chain_with_wolf(narrowing: f64) -> [f64; 12] {
    let n = narrowing;
    let wolf = cents(PYTHAGOREAN) - 11.0 * n;
    circle([n, n, n, n, n, n, n, n, wolf, n, n, n])
}

/// The scale from C, in cents, whose fifths C-G, G-D, D-A, A-E, E-B, B-F#, F#-C#, C#-G#, G#-Eb, Eb-Bb, Bb-F, F-C are
/// pure but for these narrowings in cents, which add up to the Pythagorean comma.
fn circle(narrowing: [f64; 12]) -> [f64; 12] {
    let mut scale = [0.0; 12];
    let mut note = (0, 0.0);
    for narrowed_by in narrowing {
        scale[note.0] = note.1;
        note = ((note.0 + 7) % 12, (note.1 + cents(FIFTH) - narrowed_by) % 1200.0);
    }
    scale
}

impl fmt::Display for Temperament {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(self.name())
    }
}

impl FromStr for Temperament {
    type Err = UnknownTemperament;

    fn from_str(name: &str) -> Result<Self, Self::Err> {
        let found = Self::ALL.into_iter().find(|temperament| temperament.name() == name);
        found.ok_or_else(|| UnknownTemperament { given: name.to_owned() })
    }
}

/// A word that names no temperament.
#[derive(Debug, Clone, PartialEq, Eq)]
#[non_exhaustive]
pub struct UnknownTemperament {
    /// The word given.
    pub given: String,
}

impl fmt::Display for UnknownTemperament {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let names = Temperament::ALL.map(Temperament::name).join(", ");
        write!(f, "no temperament is called {:?}; there are {names}", self.given)
    }
}

impl core::error::Error for UnknownTemperament {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_temperament_reads_back_from_its_name() {
        for temperament in Temperament::ALL {
            assert_eq!(temperament.name().parse(), Ok(temperament), "{temperament}");
        }
    }

    #[test]
    fn an_unknown_word_is_answered_with_the_known_ones() {
        let message = "bach".parse::<Temperament>().expect_err("no such word").to_string();
        for temperament in Temperament::ALL {
            assert!(message.contains(temperament.name()), "{temperament} in {message}");
        }
    }

    #[test]
    fn scales_rise_from_c() {
        for temperament in Temperament::ALL {
            let scale = temperament.cents_from_c();
            assert!(scale[0].abs() < 1e-12, "{temperament}: {scale:?}");
            assert!(scale.windows(2).all(|pair| pair[1] > pair[0]), "{temperament}: {scale:?}");
        }
    }
}
