//! Figures on saw, square and pulse waves sampled without a band limit: which aliases are named, and how truly.

use std::sync::Arc;

use plumbtone_analysis::signals::{
    NaiveWave, Random, Shape, WavePartial, add_noise, narrow, sample_count,
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
    let name: Arc<str> = format!(
        "seed {seed}: {:?}, f0 {:.3} Hz, {} Hz",
        wave.shape, wave.f0_hz, wave.sample_rate_hz
    )
    .into();
    let mut sound = wave.render(sample_count(DURATION_S, wave.sample_rate_hz));
    add_noise(&mut random, &mut sound, 80.0);
    let take = Take::of(&Settings::new(wave.sample_rate_hz), &narrow(&sound))?;
    let right = take.longest_note().filter(|note| cents(note.f0_hz, wave.f0_hz).abs() < 50.0);
    let mut figures = AliasFigures::default();
    figures.right.push(right.is_some(), &name);
    if let Some(note) = right {
        figures.judge(&name, &wave.partials(TRUE_DB), note);
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
            let due = by_strength.iter().enumerate().filter(|&(rank, truth)| {
                // A partial folded to 0 Hz has no place of its own.
                let own_place = apart(rank, truth) && far(truth.frequency_hz / 2.0);
                truth.folds > 0 && truth.amplitude >= floor && own_place
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
