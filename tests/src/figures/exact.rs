//! Figures on tones that hold pitch and levels: errors of notes and readings against the truth and the bound.

use std::f64::consts::TAU;
use std::sync::Arc;

use plumbtone_analysis::signals::{TonePartial, level_db};
use plumbtone_analysis::{Note, NotePartial, Settings, SettingsError, State};
use rayon::prelude::*;

use super::Draw;
use super::calibration::Calibration;
use super::case::Case;
use super::errors::{Errors, Tally};
use crate::bounds::{self, PartialBound};
use crate::take::{Take, cents};

/// Error of a note's f0 that is gross, in cents.
const GROSS_CENTS: f64 = 50.0;
/// Lowest ratio to the noise in 1 s at which a partial is due, in dB.
const DUE_DB: f64 = 10.0;
/// Lowest signal-to-noise ratio at which readings are judged, in dB.
const READINGS_FROM_DB: f64 = 40.0;
/// Deviations (of the bound) and Hz, of which the larger separates a partial found from a wrong peak.
const FOUND: (f64, f64) = (10.0, 0.2);

/// The figures. Ratios are error over Cramer-Rao bound.
#[derive(Debug, Clone, Default)]
pub struct ExactFigures {
    /// Cases with a note whose f0 is off by 50 cents or less; the misses are the gross errors.
    pub right: Tally,
    /// f0 of notes, ratio.
    pub f0: Errors,
    /// f0 of readings in the state "steady", in cents, from 40 dB on.
    pub frame_cents: Errors,
    /// Readings in the state "steady" among all.
    pub steady: Tally,
    /// Partial frequencies of notes, ratio.
    pub frequency: Errors,
    /// Partials due that were found.
    pub found: Tally,
    /// Partials listed that are real.
    pub real: Tally,
    /// Levels at the start, in dB.
    pub level_db: Errors,
    /// Inharmonicity, ratio.
    pub b: Errors,
    /// Notes with an inharmonicity.
    pub b_given: Tally,
    /// Phases at the start, in radians.
    pub phase_rad: Errors,
    /// Errors over stated deviations.
    pub calibration: Calibration,
}

/// Measures the figures on tones drawn by seed.
///
/// # Errors
/// Settings that the engine refuses.
pub fn exact(draw: Draw) -> Result<ExactFigures, SettingsError> {
    let all: Result<Vec<_>, _> =
        draw.seeds().into_par_iter().map(|seed| one(&Case::steady(seed))).collect();
    Ok(all?.into_iter().fold(ExactFigures::default(), ExactFigures::plus))
}

fn one(case: &Case) -> Result<ExactFigures, SettingsError> {
    let take = Take::of(&Settings::new(case.tone.sample_rate_hz), &case.samples)?;
    let mut figures = ExactFigures::default();
    figures.judge_readings(case, &take);
    let right =
        take.longest_note().filter(|note| cents(note.f0_hz, case.tone.f0_hz).abs() <= GROSS_CENTS);
    figures.right.push(right.is_some(), &case.name);
    if let Some(note) = right {
        figures.judge_note(case, note);
    }
    Ok(figures)
}

impl ExactFigures {
    fn plus(mut self, other: Self) -> Self {
        self.right.append(other.right);
        self.f0.append(other.f0);
        self.frame_cents.append(other.frame_cents);
        self.steady.append(other.steady);
        self.frequency.append(other.frequency);
        self.found.append(other.found);
        self.real.append(other.real);
        self.level_db.append(other.level_db);
        self.b.append(other.b);
        self.b_given.append(other.b_given);
        self.phase_rad.append(other.phase_rad);
        self.calibration.append(other.calibration);
        self
    }

    fn judge_readings(&mut self, case: &Case, take: &Take) {
        for reading in &take.readings {
            let steady = reading.pitch.filter(|_| reading.state == State::Steady);
            self.steady.push(steady.is_some(), &case.name);
            let Some(pitch) = steady.filter(|_| case.snr_db >= READINGS_FROM_DB) else { continue };
            let time_s = reading.centre as f64 / case.tone.sample_rate_hz;
            let name: Arc<str> = format!("{}; at {time_s:.2} s", case.name).into();
            let error = cents(pitch.f0_hz, case.tone.f0_hz);
            self.frame_cents.push(error, &name);
            self.calibration.frame_f0.push(error / pitch.f0_sd_cents, &name);
        }
    }

    fn judge_note(&mut self, case: &Case, note: &Note) {
        let observation = case.observation();
        let error_hz = note.f0_hz - case.tone.f0_hz;
        let f0_cents = cents(note.f0_hz, case.tone.f0_hz);
        self.calibration.f0.push(f0_cents / note.f0_sd_cents, &case.name);
        if let Some(bound) = bounds::stiff(&case.tone, &observation) {
            self.f0.push(error_hz / bound.f0_sd_hz, &case.name);
            self.b_given.push(note.stretch.is_some(), &case.name);
            if let Some(stretch) = note.stretch {
                let error = stretch.b - case.tone.b;
                self.b.push(error / bound.b_sd, &case.name);
                self.calibration.b.push(error / stretch.b_sd, &case.name);
            }
        }
        let bounds = bounds::partials(&case.tone, &observation).unwrap_or_default();
        self.judge_partials(case, note, &bounds);
    }

    fn judge_partials(&mut self, case: &Case, note: &Note, bounds: &[PartialBound]) {
        let truths: Vec<(&TonePartial, &PartialBound)> =
            case.tone.partials.iter().zip(bounds).collect();
        for &(truth, bound) in &truths {
            let found = note.partials.iter().find(|p| is(p, truth, bound));
            let name = partial_name(case, truth.number);
            let due = case.snr_in_1_s_db(truth) > DUE_DB;
            if due {
                self.found.push(found.is_some(), &name);
            }
            if let Some(partial) = found.filter(|_| due) {
                self.judge_partial(case, note, partial, (truth, bound));
            }
        }
        for partial in &note.partials {
            let real = truths.iter().any(|(truth, bound)| is(partial, truth, bound));
            self.real.push(real, &partial_name(case, partial.number));
        }
    }

    fn judge_partial(
        &mut self,
        case: &Case,
        note: &Note,
        partial: &NotePartial,
        (truth, bound): (&TonePartial, &PartialBound),
    ) {
        let name = partial_name(case, truth.number);
        let error = partial.frequency_hz - truth.frequency_hz;
        self.frequency.push(error / bound.frequency_sd_hz, &name);
        self.calibration.frequency.push(error / partial.frequency_sd_hz, &name);
        let level = partial.level_dbfs - level_db(truth.amplitude);
        self.level_db.push(level, &name);
        self.calibration.level.push(level / partial.level_sd_db, &name);
        self.calibration.decay.push(partial.decay_db_per_s / partial.decay_sd, &name);
        let start_s = note.start as f64 / case.tone.sample_rate_hz;
        let turns = (partial.phase_rad - truth.phase_rad) / TAU - truth.frequency_hz * start_s;
        self.phase_rad.push(TAU * (turns - turns.round()), &name);
    }
}

fn is(partial: &NotePartial, truth: &TonePartial, bound: &PartialBound) -> bool {
    let tolerance = FOUND.1.max(FOUND.0 * bound.frequency_sd_hz);
    partial.number == truth.number && (partial.frequency_hz - truth.frequency_hz).abs() < tolerance
}

fn partial_name(case: &Case, number: u32) -> Arc<str> {
    format!("{}; partial {number}", case.name).into()
}
