//! Figures on tones whose partials fall at rates of their own.

use plumbtone_analysis::signals::level_db;
use plumbtone_analysis::{Settings, SettingsError};
use rayon::prelude::*;

use super::Draw;
use super::case::Case;
use super::errors::{Errors, Tally};
use crate::take::{Take, cents};

/// Error of a note's f0 that is gross, in cents.
const GROSS_CENTS: f64 = 50.0;
/// Lowest ratio to the noise in 1 s at which a partial is judged, in dB.
const JUDGED_DB: f64 = 10.0;
/// Farthest from the truth that is the same partial, in Hz.
const SAME_HZ: f64 = 2.0;

/// The figures.
#[derive(Debug, Clone, Default)]
pub struct DecayFigures {
    /// Cases with a note whose f0 is right.
    pub right: Tally,
    /// Partials due that were found.
    pub found: Tally,
    /// Decays, in percent of the truth.
    pub decay_percent: Errors,
    /// Decays over their stated deviations.
    pub decay_calibration: Errors,
    /// Levels at the start, in dB.
    pub level_db: Errors,
    /// Levels over their stated deviations.
    pub level_calibration: Errors,
}

/// Measures the figures on decaying tones drawn by seed.
///
/// # Errors
/// Settings that the engine refuses.
pub fn decays(draw: Draw) -> Result<DecayFigures, SettingsError> {
    let all: Result<Vec<_>, _> =
        draw.seeds().into_par_iter().map(|seed| one(&Case::decaying(seed))).collect();
    Ok(all?.into_iter().fold(DecayFigures::default(), DecayFigures::plus))
}

fn one(case: &Case) -> Result<DecayFigures, SettingsError> {
    let take = Take::of(&Settings::new(case.tone.sample_rate_hz), &case.samples)?;
    let mut figures = DecayFigures::default();
    let right =
        take.longest_note().filter(|note| cents(note.f0_hz, case.tone.f0_hz).abs() <= GROSS_CENTS);
    figures.right.push(right.is_some(), &case.name);
    let Some(note) = right else { return Ok(figures) };
    let start_s = note.start as f64 / case.tone.sample_rate_hz;
    for truth in case.tone.partials.iter().filter(|p| case.snr_in_1_s_db(p) > JUDGED_DB) {
        let found = note.partials.iter().find(|p| {
            p.number == truth.number && (p.frequency_hz - truth.frequency_hz).abs() < SAME_HZ
        });
        let name = format!(
            "{}; partial {}, {:.1} dB/s, {:.0} dB",
            case.name,
            truth.number,
            truth.decay_db_per_s,
            case.snr_in_1_s_db(truth)
        )
        .into();
        figures.found.push(found.is_some(), &name);
        let Some(partial) = found else { continue };
        let error = partial.decay_db_per_s - truth.decay_db_per_s;
        figures.decay_percent.push(100.0 * error / truth.decay_db_per_s, &name);
        figures.decay_calibration.push(error / partial.decay_sd, &name);
        let level = level_db(truth.amplitude) - truth.decay_db_per_s * start_s;
        figures.level_db.push(partial.level_dbfs - level, &name);
        figures.level_calibration.push((partial.level_dbfs - level) / partial.level_sd_db, &name);
    }
    Ok(figures)
}

impl DecayFigures {
    fn plus(mut self, other: Self) -> Self {
        self.right.append(other.right);
        self.found.append(other.found);
        self.decay_percent.append(other.decay_percent);
        self.decay_calibration.append(other.decay_calibration);
        self.level_db.append(other.level_db);
        self.level_calibration.append(other.level_calibration);
        self
    }
}
