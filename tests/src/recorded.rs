//! Recorded instruments: the pitched samples of a General MIDI sound bank, unrolled to notes, with the pitch that the
//! bank itself states as the truth.

mod score;

use std::collections::BTreeMap;
use std::path::PathBuf;

use crate::cast::index;
use crate::lowest_peak::lowest_peak_hz;
use crate::periodicity::Periodicity;
use crate::soundfont::{self, Sample, Zone};
use crate::take::cents;

pub use score::{FamilyScore, Score, score};

/// Length to which a looped sample is unrolled, in seconds.
const UNROLLED_S: f64 = 1.8;
/// Shortest sound that is used, in seconds.
const SHORTEST_S: f64 = 0.3;
/// Shortest loop, in samples.
const SHORTEST_LOOP: usize = 4;
/// Fundamentals used, in Hz: the engine's whole search range.
const RANGE_HZ: (f64, f64) = (20.0, 5_000.0);
/// Farthest that the period of the sound may lie from the stated one, in cents.
const NEAR_CENTS: f64 = 30.0;
/// Least correlation at the stated period for the stated pitch to stand (see [`Recording::disputed`]).
const STANDS: f64 = 0.5;
/// How close the correlation at an integer fraction of the period comes to overturn the stated pitch.
const TIES: f64 = 0.005;
/// Share of what the stated period leaves unexplained that any other period must leave at most to overturn it, and the
/// correlation from which the stated period leaves too little for that.
const CLEARLY_BETTER: f64 = 0.25;
const BEYOND_DOUBT: f64 = 0.997;
/// Periods that are tried against the stated one, as multiples of it, and the step between them in cents.
const RIVALS: (f64, f64) = (0.18, 3.2);
const RIVAL_STEP_CENTS: f64 = 5.0;
/// Start of the stretch whose periodicity is measured, in seconds: after the attack.
const AFTER_ATTACK_S: f64 = 0.1;

/// A family of General MIDI instruments: eight programs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct Family(u16);

impl Family {
    /// Names in the order of the programs.
    const NAMES: [&str; 11] = [
        "piano",
        "chromatic percussion",
        "organ",
        "guitar",
        "bass",
        "strings",
        "ensemble",
        "brass",
        "reed",
        "pipe",
        "lead",
    ];

    /// The family of a program, if it is one of the pitched ones.
    #[must_use]
    pub fn of_program(program: u16) -> Option<Self> {
        (usize::from(program / 8) < Self::NAMES.len()).then_some(Self(program / 8))
    }

    /// Name.
    #[must_use]
    pub fn name(self) -> &'static str {
        Self::NAMES[usize::from(self.0)]
    }
}

/// One recorded note.
#[derive(Debug, Clone)]
pub struct Recording {
    /// Name in the bank.
    pub name: String,
    /// Family of the first program that plays it.
    pub family: Family,
    /// Sample rate in Hz: the recording's own.
    pub sample_rate_hz: f64,
    /// Stated fundamental when played at that rate, in Hz.
    pub f0_hz: f64,
    /// The note: the recording, then its loop over and over; without envelope, at the recorded level.
    pub samples: Vec<f32>,
    /// Samples before the loop first repeats.
    pub raw_samples: usize,
    /// Whether the sound itself contradicts the stated pitch: it does not repeat with the stated period, repeats as well
    /// with an integer fraction of it, or clearly better with another (a loop of few samples that cannot hold the pitch,
    /// an organ stop that sounds an octave lower, a preset that plays the sample as another note). Such recordings are
    /// reported, but no figure counts them. Bars and bells make no period: for them it is enough that the lowest strong
    /// line lies at the stated pitch.
    pub disputed: bool,
}

/// Where the bank lies once `cargo xtask test` has fetched it.
#[must_use]
pub fn bank_path() -> PathBuf {
    let target = std::env::var_os("CARGO_TARGET_DIR").map_or_else(
        || PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("..").join("target"),
        PathBuf::from,
    );
    target.join("sound-bank").join("TimGM6mb.sf2")
}

/// Reads the recordings of the fetched bank; `None` when it is not there.
///
/// # Errors
/// A file that is there but cannot be read as a sound bank.
pub fn recordings() -> Result<Option<Vec<Recording>>, Box<dyn std::error::Error>> {
    let path = bank_path();
    if !path.exists() {
        return Ok(None);
    }
    let samples = soundfont::read(&std::fs::read(path)?)?;
    Ok(Some(samples.iter().filter_map(recording).collect()))
}

fn recording(sample: &Sample) -> Option<Recording> {
    let zones: Vec<(Family, f64)> = sample.zones.iter().filter_map(|z| stated(sample, z)).collect();
    let &(family, _) = zones.first()?;
    let samples = unroll(sample);
    let long_enough = samples.len() as f64 >= SHORTEST_S * sample.sample_rate_hz;
    let pitches = by_frequency(&zones);
    let verdicts: Vec<(f64, f64)> =
        pitches.iter().map(|&f0| (f0, standing(&samples, sample.sample_rate_hz, f0))).collect();
    let &(f0_hz, stands) = verdicts.iter().rev().max_by(|a, b| a.1.total_cmp(&b.1))?;
    let in_range = f0_hz > RANGE_HZ.0 && f0_hz < RANGE_HZ.1.min(0.4 * sample.sample_rate_hz);
    (long_enough && in_range).then(|| Recording {
        name: sample.name.clone(),
        family,
        sample_rate_hz: sample.sample_rate_hz,
        f0_hz,
        raw_samples: sample.samples.len().min(samples.len()),
        samples,
        disputed: stands < STANDS,
    })
}

/// What a zone of a melodic preset states: the frequency heard when the sample is played at its own rate. A player adds
/// the correction and the tuning to the pitch, so the raw sample lies that much below its root key.
fn stated(sample: &Sample, zone: &Zone) -> Option<(Family, f64)> {
    let family = Family::of_program(zone.program).filter(|_| zone.bank == 0)?;
    let root = zone.root_key.unwrap_or(sample.root_key);
    let keyed = root < 128 && zone.scale_cents == 100;
    let (semitones, cents) = zone.tune;
    let above_a4 = f64::from(root) - 69.0 - f64::from(semitones);
    let cents = 100.0 * above_a4 - f64::from(cents) - f64::from(sample.correction_cents);
    keyed.then(|| (family, 440.0 * 2.0_f64.powf(cents / 1200.0)))
}

/// The distinct stated frequencies, the most often stated first. Zones within 10 cents are one statement: presets detune
/// layers on purpose.
fn by_frequency(zones: &[(Family, f64)]) -> Vec<f64> {
    let mut counts: BTreeMap<u64, (usize, f64)> = BTreeMap::new();
    for &(_, f0) in zones {
        let key = (f0.log2() * 120.0).round().to_bits();
        counts.entry(key).or_insert((0, f0)).0 += 1;
    }
    let mut pitches: Vec<(usize, f64)> = counts.into_values().collect();
    pitches.sort_by(|a, b| b.0.cmp(&a.0).then(a.1.total_cmp(&b.1)));
    pitches.into_iter().map(|(_, f0)| f0).collect()
}

/// 1 when the lowest strong line lies at the stated pitch; else the correlation at the stated period, or 0 when another
/// period overturns it.
fn standing(samples: &[f32], sample_rate_hz: f64, f0_hz: f64) -> f64 {
    let start = index(AFTER_ATTACK_S * sample_rate_hz).min(samples.len() / 4);
    let sound = &samples[start..];
    let lowest = lowest_peak_hz(sound, sample_rate_hz).ok().flatten();
    if lowest.is_some_and(|lowest| cents(lowest, f0_hz).abs() < NEAR_CENTS) {
        return 1.0;
    }
    let period = sample_rate_hz / f0_hz;
    let Ok(periodicity) = Periodicity::of(sound, period, RIVALS.1 * period) else {
        return 0.0;
    };
    let best = |from_cents: f64, to_cents: f64| {
        let steps = index((to_cents - from_cents) / RIVAL_STEP_CENTS);
        (0..=steps)
            .map(|step| from_cents + RIVAL_STEP_CENTS * step as f64)
            .map(|cents| periodicity.at(period * 2.0_f64.powf(cents / 1200.0)))
            .fold(0.0, f64::max)
    };
    let own = best(-NEAR_CENTS, NEAR_CENTS);
    let (shortest, longest) = (1200.0 * RIVALS.0.log2(), 1200.0 * RIVALS.1.log2());
    let step = NEAR_CENTS + RIVAL_STEP_CENTS;
    let rival = best(shortest, -step).max(best(step, longest));
    let tied = [2.0_f64, 3.0, 5.0].into_iter().any(|factor| {
        let cents = -1200.0 * factor.log2();
        best(cents - NEAR_CENTS, cents + NEAR_CENTS) > own - TIES
    });
    let beaten = own < BEYOND_DOUBT && 1.0 - rival < CLEARLY_BETTER * (1.0 - own);
    let overturned = tied || beaten;
    if overturned { 0.0 } else { own }
}

fn unroll(sample: &Sample) -> Vec<f32> {
    let raw: Vec<f32> = sample.samples.iter().map(|&x| f32::from(x) / 32_768.0).collect();
    let length = index(UNROLLED_S * sample.sample_rate_hz);
    let (start, end) = sample.loop_points;
    let looped = end <= raw.len() && end >= start + SHORTEST_LOOP;
    if !looped {
        return raw.into_iter().take(length).collect();
    }
    let repeats = raw[start..end].iter().cycle();
    raw[..end].iter().chain(repeats).copied().take(length).collect()
}
