//! Figures on saw, square and pulse waves sampled without a band limit: which aliases are named, and how truly.

use std::sync::Arc;

use plumbtone_analysis::signals::{
    NaiveWave, Random, Shape, WavePartial, add, add_noise, narrow, sample_count,
};
use plumbtone_analysis::{Note, Settings, SettingsError, StrayKind};
use rayon::prelude::*;

use super::Draw;
use super::errors::Tally;
use crate::take::{Take, cents};

/// Length of every wave, in seconds.
const DURATION_S: f64 = 3.0;
/// Fundamentals, in Hz.
const F0_HZ: (f64, f64) = (55.0, 4_186.0);
/// Fundamentals of detuned voices, in Hz, and the cents between neighbours: 4 resolutions and more.
const VOICES_HZ: (f64, f64) = (220.0, 1_800.0);
const VOICES_CENTS: (f64, f64) = (12.0, 20.0);
/// Levels below the strongest partial down to which aliases are due, in dB.
const DUE_DB: [f64; 2] = [-40.0, -60.0];
/// Level below the strongest partial down to which a named alias counts as true, in dB.
const TRUE_DB: f64 = -100.0;
/// Least distance in Hz from anything stronger for an alias to be due: closer ones cannot be told apart in 3 s.
const APART_HZ: f64 = 2.0;
/// Most aliases due: the least that a note lists.
const DUE_MAX: usize = 512;
/// Farthest in Hz from the truth that is right.
const RIGHT_HZ: f64 = 0.5;

/// The figures.
#[derive(Debug, Clone, Default)]
pub struct AliasFigures {
    /// Cases with a note whose f0 is right.
    pub right: Tally,
    /// Aliases due that were named, down to -40 and to -60 dB.
    pub named: [Tally; 2],
    /// Named aliases that are one.
    pub truly: Tally,
    /// Strays that are not a partial in its place; the misses are.
    pub stray: Tally,
    /// Strays of the notes left unexplained.
    pub unexplained: usize,
}

/// Measures the figures on waves drawn by seed.
///
/// # Errors
/// Settings that the engine refuses.
pub fn aliases(draw: Draw) -> Result<AliasFigures, SettingsError> {
    let all: Result<Vec<_>, _> = draw.seeds().into_par_iter().map(one).collect();
    Ok(all?.into_iter().fold(AliasFigures::default(), AliasFigures::plus))
}

fn one(seed: u64) -> Result<AliasFigures, SettingsError> {
    let mut random = Random::new(seed);
    let wave = NaiveWave {
        sample_rate_hz: random.pick(&[44_100.0, 48_000.0, 96_000.0]),
        shape: random.pick(&[Shape::Saw, Shape::Square, Shape::Pulse(0.37), Shape::Pulse(0.1)]),
        f0_hz: random.log_between(F0_HZ.0, F0_HZ.1),
        peak: random.between(0.1, 0.8),
        start_turns: random.uniform(),
    };
    measure(seed, &mut random, &[wave])
}

/// The same on two to four equal waves, detuned against each other.
///
/// # Errors
/// Settings that the engine refuses.
pub fn detuned_aliases(draw: Draw) -> Result<AliasFigures, SettingsError> {
    let all: Result<Vec<_>, _> = draw.seeds().into_par_iter().map(voices).collect();
    Ok(all?.into_iter().fold(AliasFigures::default(), AliasFigures::plus))
}

fn voices(seed: u64) -> Result<AliasFigures, SettingsError> {
    let mut random = Random::new(seed);
    let count = random.pick(&[2, 3, 4]);
    let apart_cents = random.between(VOICES_CENTS.0, VOICES_CENTS.1);
    let lowest = NaiveWave {
        sample_rate_hz: random.pick(&[44_100.0, 48_000.0]),
        shape: random.pick(&[Shape::Saw, Shape::Square, Shape::Pulse(0.37)]),
        f0_hz: random.log_between(VOICES_HZ.0, VOICES_HZ.1),
        peak: 0.8 / f64::from(count),
        start_turns: 0.0,
    };
    let waves: Vec<NaiveWave> = (0..count)
        .map(|k| NaiveWave {
            f0_hz: lowest.f0_hz * (apart_cents * f64::from(k) / 1200.0).exp2(),
            start_turns: random.uniform(),
            ..lowest
        })
        .collect();
    measure(seed, &mut random, &waves)
}

/// Measures waves of one shape that sound together.
fn measure(
    seed: u64,
    random: &mut Random,
    waves: &[NaiveWave],
) -> Result<AliasFigures, SettingsError> {
    let NaiveWave { sample_rate_hz, shape, f0_hz, .. } = waves[0];
    let name: Arc<str> =
        format!("seed {seed}: {} x {shape:?}, f0 {f0_hz:.3} Hz, {sample_rate_hz} Hz", waves.len())
            .into();
    let count = sample_count(DURATION_S, sample_rate_hz);
    let mut sound = vec![0.0; count];
    for wave in waves {
        add(&mut sound, &wave.render(count));
    }
    add_noise(random, &mut sound, 80.0);
    let take = Take::of(&Settings::new(sample_rate_hz), &narrow(&sound))?;
    let near = |note: &&Note| waves.iter().any(|wave| cents(note.f0_hz, wave.f0_hz).abs() < 50.0);
    let right = take.longest_note().filter(near);
    let mut figures = AliasFigures::default();
    figures.right.push(right.is_some(), &name);
    if let Some(note) = right {
        let truths: Vec<WavePartial> =
            waves.iter().flat_map(|wave| wave.partials(TRUE_DB)).collect();
        figures.judge(&name, &truths, note);
    }
    Ok(figures)
}

impl AliasFigures {
    fn plus(mut self, other: Self) -> Self {
        self.right.append(other.right);
        for (mine, theirs) in self.named.iter_mut().zip(other.named) {
            mine.append(theirs);
        }
        self.truly.append(other.truly);
        self.stray.append(other.stray);
        self.unexplained += other.unexplained;
        self
    }

    fn judge(&mut self, name: &Arc<str>, truths: &[WavePartial], note: &Note) {
        let strongest = truths.iter().map(|p| p.amplitude).fold(0.0, f64::max);
        let mut by_strength: Vec<&WavePartial> = truths.iter().collect();
        by_strength.sort_by(|a, b| b.amplitude.total_cmp(&a.amplitude));
        for (tally, due_db) in self.named.iter_mut().zip(DUE_DB) {
            let floor = strongest * 10.0_f64.powf(due_db / 20.0);
            let apart = |rank: usize, truth: &WavePartial| {
                let stronger = by_strength[..rank].iter();
                stronger.map(|other| other.frequency_hz - truth.frequency_hz).all(far)
            };
            let strong = by_strength.iter().enumerate().take_while(|(_, t)| t.amplitude >= floor);
            let due = strong.filter(|&(rank, truth)| {
                // A partial folded to 0 Hz has no place of its own.
                truth.folds > 0 && far(truth.frequency_hz / 2.0) && apart(rank, truth)
            });
            for (_, truth) in due.take(DUE_MAX) {
                tally.push(named(note, truth), name);
            }
        }
        for stray in &note.strays {
            let near =
                |truth: &&WavePartial| (truth.frequency_hz - stray.frequency_hz).abs() < RIGHT_HZ;
            match stray.kind {
                StrayKind::Alias { partial, .. } => {
                    let mut there = truths.iter().filter(near);
                    self.truly.push(there.any(|t| t.number == partial && t.folds > 0), name);
                }
                StrayKind::Unexplained => self.unexplained += 1,
                StrayKind::Mains { .. } => {}
            }
            let in_place = truths.iter().filter(near).any(|truth| truth.folds == 0);
            self.stray.push(!in_place, name);
        }
    }
}

fn far(difference_hz: f64) -> bool {
    difference_hz.abs() > APART_HZ
}

fn named(note: &Note, truth: &WavePartial) -> bool {
    note.strays.iter().any(|stray| {
        matches!(stray.kind, StrayKind::Alias { partial, .. } if partial == truth.number)
            && (stray.frequency_hz - truth.frequency_hz).abs() < RIGHT_HZ
    })
}
