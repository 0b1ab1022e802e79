//! One row per note: how an instrument or a patch behaves over the keyboard.

use crate::masking;
use crate::note::Note;
use crate::reading::{Reading, Stray, StrayKind};
use crate::stiff::CENTS_PER_NEPER;
use crate::tuning::{NoteName, Tuning};

/// Distance from the note's pitch within which it has settled, in cents, and in deviations of the reading.
const SETTLED_CENTS: f64 = 3.0;
const SETTLED_SD: f64 = 3.0;
/// Readings in a row beyond that distance that say that it has not: fewer are not heard.
const UNSETTLED: usize = 3;
/// What is not judged before a note's end, where a sound is let go: so many seconds, or this share of the note.
const LET_GO_S: f64 = 0.1;
const LET_GO_SHARE: f64 = 0.25;
/// Readings of a note kept to judge how it settles: of more, the later ones are left out (40 s at 10 ms).
const READINGS_MAX: usize = 4096;
/// A stretch is told from none when it is this many of its deviations.
const SURE_SD: f64 = 2.0;
/// A note that lies this many times as far off as four of five others, and farther than so many cents, is out of order.
const ASTRAY: f64 = 8.0;
const ASTRAY_CENTS: f64 = 40.0;
/// Readings without a pitch after which no note is under way: more than a note bridges.
const NOTHING_UNDER_WAY: usize = 16;

/// One note of a key sheet.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct KeyRow {
    /// The key: the one played, or the note of the tuning nearest to the pitch.
    pub key: NoteName,
    /// Whether it was told (by a host's note, or by a file's name) rather than found.
    pub told: bool,
    /// Sample positions of the note's onset and end.
    pub start: u64,
    /// See above.
    pub end: u64,
    /// Fundamental of the stiff-string model, in Hz.
    pub f0_hz: f64,
    /// Distance from the key's frequency in the tuning, in cents.
    pub cents: f64,
    /// Standard deviation of both.
    pub f0_sd_cents: f64,
    /// Inharmonicity and its standard deviation.
    pub stretch: Option<(f64, f64)>,
    /// Slope of the partials' levels, in dB per octave.
    pub tilt_db_per_octave: Option<f64>,
    /// Mean level of the partials together, in dBFS.
    pub level_dbfs: f64,
    /// The alias that stands out most.
    pub alias: Option<AliasHeard>,
    /// Time from the onset until the pitch stays within 3 cents (or 3 of its deviations) of the note's, in seconds; `None` when
    /// it never does. Less than 30 ms beyond that, and the last tenth of a second, do not count.
    pub settling_s: Option<f64>,
}

/// An alias, and how much it stands out among the partials.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AliasHeard {
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// Number of the partial that folded.
    pub partial: u32,
    /// How often it folded.
    pub folds: u32,
    /// Level against the strongest partial, in dB.
    pub relative_db: f64,
    /// Level over what the partials and the ear's own threshold hide there, in dB: positive where it may be heard.
    pub over_mask_db: f64,
}

/// The alias of a note that lies highest over what hides it, if there is any.
#[must_use]
pub fn worst_alias(note: &Note) -> Option<AliasHeard> {
    worst(&note.partials.iter().map(|p| (p.frequency_hz, p.level_mean_dbfs)), &note.strays)
}

/// The same of a reading.
#[must_use]
pub fn worst_alias_now(reading: &Reading) -> Option<AliasHeard> {
    worst(&reading.partials.iter().map(|p| (p.frequency_hz, p.level_dbfs)), &reading.strays)
}

/// Partials come as (frequency in Hz, level in dBFS).
fn worst(
    partials: &(impl Iterator<Item = (f64, f64)> + Clone),
    strays: &[Stray],
) -> Option<AliasHeard> {
    let aliases = strays.iter().filter_map(|stray| heard(partials, stray));
    aliases.max_by(|a, b| a.over_mask_db.total_cmp(&b.over_mask_db))
}

/// How much one of a reading's strays stands out, if it is an alias.
#[must_use]
pub fn alias_now(reading: &Reading, stray: &Stray) -> Option<AliasHeard> {
    heard(&reading.partials.iter().map(|p| (p.frequency_hz, p.level_dbfs)), stray)
}

fn heard(
    partials: &(impl Iterator<Item = (f64, f64)> + Clone),
    stray: &Stray,
) -> Option<AliasHeard> {
    let StrayKind::Alias { partial, folds } = stray.kind else { return None };
    let strongest = partials.clone().map(|p| p.1).fold(f64::NEG_INFINITY, f64::max);
    let unheard = masking::unheard_below_dbfs(stray.frequency_hz, partials.clone());
    Some(AliasHeard {
        frequency_hz: stray.frequency_hz,
        partial,
        folds,
        relative_db: stray.level_dbfs - strongest,
        over_mask_db: stray.level_dbfs - unheard,
    })
}

/// What an inharmonicity and its deviation come to.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum StretchFound {
    /// It can be told from none.
    Measured {
        /// Inharmonicity.
        b: f64,
        /// Its standard deviation.
        b_sd: f64,
    },
    /// It cannot; it is below this.
    Below(f64),
}

impl StretchFound {
    /// What these figures come to; `None` when they say nothing.
    #[must_use]
    pub fn of(b: f64, b_sd: f64) -> Option<Self> {
        if !(b.is_finite() && b_sd >= 0.0 && b_sd.is_finite()) {
            return None;
        }
        if b > SURE_SD * b_sd {
            return Some(Self::Measured { b, b_sd });
        }
        Some(b.max(0.0) + SURE_SD * b_sd).filter(|&below| below > 0.0).map(Self::Below)
    }
}

/// The distance from their keys, in cents, within which notes are in order among others that lie so far off; a note beyond
/// is better marked than shown to scale.
#[must_use]
pub fn in_order_cents(off: impl Iterator<Item = f64>) -> f64 {
    let mut off: Vec<f64> = off.map(f64::abs).filter(|cents| cents.is_finite()).collect();
    off.sort_by(f64::total_cmp);
    // Four of five lie nearer than this.
    let usual = off.len().checked_sub(1).map_or(0.0, |last| off[last * 4 / 5]);
    (ASTRAY * usual).max(ASTRAY_CENTS)
}

/// The keys between the lowest and the highest of some that are not among them, from low to high.
#[must_use]
pub fn missing(keys: &[NoteName]) -> Vec<NoteName> {
    let Some((first, last)) = keys.iter().min().zip(keys.iter().max()) else { return Vec::new() };
    let between = (first.midi()..=last.midi()).map(NoteName::from_midi);
    between.filter(|key| !keys.contains(key)).collect()
}

/// The same as runs of keys that follow each other: the first and the last of each.
#[must_use]
pub fn missing_runs(keys: &[NoteName]) -> Vec<(NoteName, NoteName)> {
    let mut runs: Vec<(NoteName, NoteName)> = Vec::new();
    for key in missing(keys) {
        match runs.last_mut() {
            Some(run) if run.1.midi() + 1 == key.midi() => run.1 = key,
            _ => runs.push((key, key)),
        }
    }
    runs
}

/// Makes rows of notes, from the readings within them.
#[derive(Debug)]
pub struct KeySheet {
    tuning: Tuning,
    sample_rate_hz: f64,
    /// Position, logarithm of the fundamental, and its deviation in cents, of the readings since the last note.
    readings: Vec<(u64, f64, f64)>,
    /// Readings without a pitch in a row.
    unpitched: usize,
}

impl KeySheet {
    /// A sheet of notes as a tuning names them.
    #[must_use]
    pub fn new(tuning: Tuning, sample_rate_hz: f64) -> Self {
        Self { tuning, sample_rate_hz, readings: Vec::with_capacity(READINGS_MAX), unpitched: 0 }
    }

    /// Names notes by another tuning from here on.
    pub fn tune(&mut self, tuning: Tuning) {
        self.tuning = tuning;
    }

    /// Takes in the next reading.
    pub fn reading(&mut self, reading: &Reading) {
        let Some(pitch) = reading.pitch else {
            self.unpitched += 1;
            if self.unpitched == NOTHING_UNDER_WAY {
                self.readings.clear();
            }
            return;
        };
        self.unpitched = 0;
        if self.readings.len() < READINGS_MAX {
            self.readings.push((reading.centre, pitch.f0_hz.ln(), pitch.f0_sd_cents));
        }
    }

    /// The row of a note that has ended; `told` is its key where that is known. `None` when no key is told and none is near.
    pub fn note(&mut self, note: &Note, told: Option<NoteName>) -> Option<KeyRow> {
        let key = told.or_else(|| self.tuning.nearest(note.f0_hz).map(|nearest| nearest.note))?;
        let cents = CENTS_PER_NEPER * (note.f0_hz / self.tuning.frequency_hz(key)).ln();
        let power: f64 = note.partials.iter().map(|p| 10f64.powf(p.level_mean_dbfs / 10.0)).sum();
        let row = KeyRow {
            key,
            told: told.is_some(),
            start: note.start,
            end: note.end,
            f0_hz: note.f0_hz,
            cents,
            f0_sd_cents: note.f0_sd_cents,
            stretch: note.stretch.map(|s| (s.b, s.b_sd)),
            tilt_db_per_octave: note.descriptors.tilt_db_per_octave,
            level_dbfs: 10.0 * power.log10(),
            alias: worst_alias(note),
            settling_s: self.settling_s(note),
        };
        self.readings.clear();
        Some(row)
    }

    /// Time from the onset to the first reading from which on the pitch stays.
    fn settling_s(&self, note: &Note) -> Option<f64> {
        let length = (note.end - note.start) as f64;
        let judged = length - (LET_GO_S * self.sample_rate_hz).min(LET_GO_SHARE * length);
        let log_f0 = note.f0_hz.ln();
        let mut settled = None;
        let mut off = 0;
        for &(at, log, sd) in self.readings.iter().filter(|reading| reading.0 >= note.start) {
            let since = (at - note.start) as f64;
            if since >= judged {
                break;
            }
            if CENTS_PER_NEPER * (log - log_f0).abs() < SETTLED_CENTS.max(SETTLED_SD * sd) {
                off = 0;
                settled.get_or_insert(since / self.sample_rate_hz);
            } else {
                off += 1;
                if off >= UNSETTLED {
                    settled = None;
                }
            }
        }
        // A pitch that swings passes by at the end too; it has not settled.
        settled.filter(|&since| {
            judged / self.sample_rate_hz - since
                >= LET_GO_S.min(LET_GO_SHARE * length / self.sample_rate_hz)
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::note::NotePartial;
    use crate::reading::Pitch;
    use crate::tuning::Temperament;

    fn note() -> Note {
        let partial = NotePartial {
            number: 1,
            frequency_hz: 440.5,
            frequency_sd_hz: 0.01,
            cents_from_harmonic: 0.0,
            cents_sd: 0.0,
            level_dbfs: -6.0,
            level_sd_db: 0.0,
            level_relative_db: 0.0,
            level_mean_dbfs: -10.0,
            phase_rad: 0.0,
            decay_db_per_s: 0.0,
            decay_sd: 0.0,
            snr_db: 60.0,
            cluster: None,
        };
        let stray = |frequency_hz, level_dbfs, kind| Stray { frequency_hz, level_dbfs, kind };
        let alias = |partial| StrayKind::Alias { partial, folds: 1 };
        Note {
            start: 1000,
            end: 101_000,
            f0_hz: 440.5,
            f0_sd_cents: 0.02,
            partials: vec![partial],
            strays: vec![
                stray(100.0, -20.0, StrayKind::Mains { base_hz: 50.0, multiple: 2 }),
                stray(460.0, -40.0, alias(60)),
                stray(9000.0, -60.0, alias(70)),
            ],
            ..Note::default()
        }
    }

    #[test]
    fn the_alias_that_is_heard_most_is_not_the_strongest() {
        let worst = worst_alias(&note()).expect("there are two");
        assert_eq!(worst.partial, 70, "the one beside the partial is masked: {worst:?}");
        assert!((worst.relative_db + 50.0).abs() < 1e-9 && worst.over_mask_db > 0.0, "{worst:?}");
    }

    #[test]
    fn a_row_says_key_distance_and_when_the_pitch_settled() {
        let mut sheet = KeySheet::new(Tuning::default(), 48_000.0);
        for (at, hz) in [(1200, 430.0), (5800, 436.0), (10_600, 440.4), (15_400, 440.5)] {
            let pitch = Some(Pitch { f0_hz: hz, f0_sd_cents: 0.1, confidence: 0.9 });
            sheet.reading(&Reading { centre: at, pitch, ..Reading::default() });
        }
        let row = sheet.note(&note(), None).expect("A4 is near");
        assert_eq!((row.key.to_string(), row.told), ("A4".to_owned(), false), "{row:?}");
        assert!((row.cents - 1.966_2).abs() < 1e-3, "{row:?}");
        assert_eq!(row.settling_s, Some(0.2), "{row:?}");
        let told = sheet.note(&note(), Some(NoteName::from_midi(70))).expect("told");
        assert!((told.cents + 98.034).abs() < 1e-3 && told.settling_s.is_none(), "{told:?}");
        sheet.tune(Tuning::new(450.0, Temperament::Equal).expect("in range"));
        let row = sheet.note(&note(), None).expect("A4 is near");
        assert!((row.cents + 36.940).abs() < 1e-3, "{row:?}");
    }

    #[test]
    fn neither_a_blip_nor_the_release_unsettles_a_pitch() {
        let settling = |off: fn(u64) -> f64| {
            let mut sheet = KeySheet::new(Tuning::default(), 48_000.0);
            for k in 0..200 {
                let f0_hz = 440.5 * (off(k) / CENTS_PER_NEPER).exp();
                let pitch = Some(Pitch { f0_hz, f0_sd_cents: 0.1, confidence: 0.9 });
                sheet.reading(&Reading { centre: 1480 + 480 * k, pitch, ..Reading::default() });
            }
            sheet.note(&note(), None).expect("A4 is near").settling_s
        };
        let glide = |k: u64| (-20.0 + k as f64).min(0.0);
        assert_eq!(settling(glide), Some(0.19), "a glide of 20 cents");
        assert_eq!(settling(|k| if k % 20 < 2 { 8.0 } else { 0.0 }), Some(0.03), "blips");
        assert_eq!(settling(|k| if k > 198 { 90.0 } else { 0.0 }), Some(0.01), "a release");
        assert_eq!(settling(|k| 12.0 * (0.35 * k as f64).sin()), None, "a vibrato");
        assert_eq!(settling(|k| if k > 150 { 9.0 } else { 0.0 }), None, "it goes off");
    }

    #[test]
    fn what_was_no_note_is_forgotten() {
        let mut sheet = KeySheet::new(Tuning::default(), 48_000.0);
        let pitch = |f0_hz| Some(Pitch { f0_hz, f0_sd_cents: 0.1, confidence: 0.9 });
        // A pitch now and then for an hour, and then the note.
        for k in 0..360_000 {
            let pitch = if k % 64 == 0 { pitch(300.0) } else { None };
            sheet.reading(&Reading { centre: 0, pitch, ..Reading::default() });
        }
        sheet.reading(&Reading { centre: 1480, pitch: pitch(440.5), ..Reading::default() });
        let row = sheet.note(&note(), None).expect("A4 is near");
        assert_eq!(row.settling_s, Some(0.01), "{row:?}");
    }

    #[test]
    fn a_stretch_is_measured_only_where_it_is_more_than_noise() {
        let measured = StretchFound::Measured { b: 1e-4, b_sd: 1e-6 };
        for (b, b_sd, expected) in [
            (1e-4, 1e-6, Some(measured)),
            (1e-6, 1e-6, Some(StretchFound::Below(3e-6))),
            (-4e-6, 1e-6, Some(StretchFound::Below(2e-6))),
            (0.0, 0.0, None),
            (f64::NAN, 1e-6, None),
            (-1e-4, 0.0, None),
            (1e-4, f64::NAN, None),
            (f64::INFINITY, 1e-6, None),
        ] {
            assert_eq!(StretchFound::of(b, b_sd), expected, "{b} {b_sd}");
        }
    }

    #[test]
    fn one_key_of_many_is_out_of_order_and_all_of_them_are_not() {
        let one = [1.0, -2.0, 3.0, 1190.0, 2.0, -1.0].into_iter();
        assert_eq!(in_order_cents(one).to_bits(), 40f64.to_bits(), "one an octave off");
        let all = [1190.0, 1200.0, 1210.0].into_iter();
        assert!(in_order_cents(all) > 1210.0, "all an octave off");
        let none = [f64::NAN].into_iter();
        assert_eq!(in_order_cents(none).to_bits(), 40f64.to_bits(), "no number");
    }

    #[test]
    fn missing_keys_lie_between_the_outermost() {
        let keys = |midi: &[i16]| -> Vec<NoteName> {
            midi.iter().copied().map(NoteName::from_midi).collect()
        };
        assert_eq!(missing(&keys(&[63, 60, 61, 66])), keys(&[62, 64, 65]), "in any order");
        let runs: Vec<(i16, i16)> = missing_runs(&keys(&[63, 60, 61, 66]))
            .into_iter()
            .map(|(from, to)| (from.midi(), to.midi()))
            .collect();
        assert_eq!(runs, [(62, 62), (64, 65)], "as runs");
        assert_eq!(missing(&keys(&[60])), [], "one key");
        assert_eq!(missing(&[]), [], "no key");
    }
}
