//! A row of the key sheet: plain data as it is kept, shown and exported, under the names of the command line's JSON.

use plumbtone_analysis::keys::{AliasHeard, KeyRow};
use plumbtone_analysis::tuning::{NoteName, Tuning, cents};
use serde::{Deserialize, Serialize};

/// Keys of MIDI, from 0.
const HIGHEST_KEY: u8 = 127;

/// What was measured of one key.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Row {
    /// MIDI note number, 0 to 127 (60 is C4).
    pub key: u8,
    /// Which take of the sheet it is: the largest is the newest.
    pub take: u64,
    /// Whether the host played the key; otherwise it is the note nearest to the pitch.
    pub told: bool,
    /// Length of the note in seconds.
    pub length_s: f64,
    /// Fundamental of the stiff-string model, in Hz. How far it lies off the key follows from the tuning.
    pub f0_hz: f64,
    /// Its standard deviation in cents.
    pub f0_sd_cents: f64,
    /// Inharmonicity, where partials allow an estimate.
    pub inharmonicity_b: Option<f64>,
    /// Its standard deviation.
    pub inharmonicity_sd: Option<f64>,
    /// Slope of the partials' levels, in dB per octave.
    pub tilt_db_per_octave: Option<f64>,
    /// Mean level of the partials together, in dBFS.
    pub level_dbfs: Option<f64>,
    /// Time from the onset until the pitch stays, in seconds; none when it never does.
    pub settling_s: Option<f64>,
    /// The alias that stands out most, if there is any.
    pub worst_alias: Option<KeyAlias>,
}

/// The alias of a key that stands out most.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct KeyAlias {
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// Number of the partial that folded.
    pub partial: u32,
    /// How often it folded.
    pub folds: u32,
    /// Level against the strongest partial, in dB.
    pub relative_db: f64,
    /// Level over what the partials and the ear's own threshold hide there, in dB: positive where it may be heard.
    pub over_mask_db: Option<f64>,
}

impl Row {
    /// A row as kept; `None` for a key that MIDI has not, or figures that are no numbers.
    pub(super) fn new(row: &KeyRow, length_s: f64) -> Option<Self> {
        let finite = |x: f64| Some(x).filter(|x| x.is_finite());
        let (b, sd) = row.stretch.filter(|(b, sd)| b.is_finite() && sd.is_finite()).unzip();
        let made = Self {
            key: u8::try_from(row.key.midi()).ok()?,
            take: 0,
            told: row.told,
            length_s,
            f0_hz: row.f0_hz,
            f0_sd_cents: row.f0_sd_cents,
            inharmonicity_b: b,
            inharmonicity_sd: sd,
            tilt_db_per_octave: row.tilt_db_per_octave.and_then(finite),
            level_dbfs: finite(row.level_dbfs),
            settling_s: row.settling_s.and_then(finite),
            worst_alias: row.alias.and_then(KeyAlias::new),
        };
        Some(made).filter(Self::is_sound)
    }

    /// The key's name.
    #[must_use]
    pub fn note(&self) -> NoteName {
        NoteName::from_midi(i16::from(self.key))
    }

    /// How far the pitch lies off the key in a tuning, in cents.
    #[must_use]
    pub fn cents(&self, tuning: &Tuning) -> f64 {
        cents(self.f0_hz / tuning.frequency_hz(self.note()))
    }

    /// Whether a row that was read back can be one.
    pub(super) fn is_sound(&self) -> bool {
        let finite = |x: Option<f64>| x.is_none_or(f64::is_finite);
        let figures = [
            self.inharmonicity_b,
            self.inharmonicity_sd,
            self.tilt_db_per_octave,
            self.level_dbfs,
            self.settling_s,
        ];
        self.key <= HIGHEST_KEY
            && (self.f0_hz > 0.0 && self.f0_hz.is_finite())
            && (self.f0_sd_cents >= 0.0 && self.f0_sd_cents.is_finite())
            && (self.length_s > 0.0 && self.length_s.is_finite())
            && figures.into_iter().all(finite)
            && self.worst_alias.is_none_or(|alias| alias.is_sound())
    }
}

impl KeyAlias {
    fn new(alias: AliasHeard) -> Option<Self> {
        let made = Self {
            frequency_hz: alias.frequency_hz,
            partial: alias.partial,
            folds: alias.folds,
            relative_db: alias.relative_db,
            over_mask_db: Some(alias.over_mask_db).filter(|over| over.is_finite()),
        };
        Some(made).filter(Self::is_sound)
    }

    fn is_sound(&self) -> bool {
        self.frequency_hz > 0.0
            && self.frequency_hz.is_finite()
            && self.relative_db.is_finite()
            && self.over_mask_db.is_none_or(f64::is_finite)
    }
}

/// Notes and rows for tests.
#[cfg(test)]
pub(super) mod fixtures {
    use plumbtone_analysis::Note;

    use super::{KeyAlias, Row};

    /// A note of a pitch, without anything else.
    pub(crate) fn note(start: u64, end: u64, f0_hz: f64) -> Note {
        Note { start, end, f0_hz, f0_sd_cents: 0.02, ..Note::default() }
    }

    /// A row with all figures.
    pub(crate) fn row(key: u8) -> Row {
        Row {
            key,
            take: u64::from(key),
            told: true,
            length_s: 1.25,
            f0_hz: 440.0 * 2f64.powf((f64::from(key) - 69.0) / 12.0) * 1.001,
            f0_sd_cents: 0.02,
            inharmonicity_b: Some(1.6e-4),
            inharmonicity_sd: Some(2e-6),
            tilt_db_per_octave: Some(-6.1),
            level_dbfs: Some(-18.25),
            settling_s: Some(0.03),
            worst_alias: Some(KeyAlias {
                frequency_hz: 2_999.6,
                partial: 204,
                folds: 1,
                relative_db: -52.5,
                over_mask_db: Some(3.5),
            }),
        }
    }
}
