//! Recorded instruments under a drift check: what swings about a pitch that holds must not fail for its swings.

use std::sync::Arc;

use plumbtone_analysis::check::{Check, CheckSettings, Reference, Verdict};
use plumbtone_analysis::{Analyzer, Reading, Settings, SettingsError};
use rayon::prelude::*;

use super::errors::Tally;
use crate::recorded::Recording;
use crate::take::{Take, cents};

/// Least half range of a recording's readings for it to swing, in cents.
const SWINGS_CENTS: f64 = 6.0;
/// Tolerance of the check as a share of that half range: readings are sure to lie outside.
const TOLERANCE: f64 = 0.6;
/// How far the pitch averaged over a listener's half second may stray, as a share of the tolerance, to hold.
const HOLDS: f64 = 0.7;
const LISTENED_S: f64 = 0.5;
/// What is left out at either end, in seconds: attack and loop seam.
const ENDS_S: f64 = 0.25;
/// Share of the readings that must have a pitch.
const PITCHED: f64 = 0.95;

/// Of the recordings whose readings swing beyond a tolerance while their mean holds, those found within it.
///
/// # Errors
/// Settings that the engine or the check refuses.
pub fn recorded_vibrato(recordings: &[Recording]) -> Result<Tally, SettingsError> {
    let all: Result<Vec<_>, _> = recordings.par_iter().map(one).collect();
    let mut tally = Tally::default();
    for (within, told) in all?.into_iter().flatten() {
        tally.push(within, &told);
    }
    Ok(tally)
}

/// Whether a recording that swings about a pitch that holds is found within; `None` for any other.
fn one(recording: &Recording) -> Result<Option<(bool, Arc<str>)>, SettingsError> {
    let rate = recording.sample_rate_hz;
    let settings = Settings::new(rate);
    let take = Take::of(&settings, &recording.samples)?;
    let end_s = recording.samples.len() as f64 / rate - ENDS_S;
    let inside = |r: &&Reading| {
        let time_s = r.centre as f64 / rate;
        time_s > ENDS_S && time_s < end_s
    };
    let kept: Vec<&Reading> = take.readings.iter().filter(inside).collect();
    let pitches: Vec<f64> = kept.iter().filter_map(|r| r.pitch.map(|p| p.f0_hz)).collect();
    if pitches.len() < 50 || (pitches.len() as f64) < PITCHED * kept.len() as f64 {
        return Ok(None);
    }
    let mut sorted = pitches.clone();
    sorted.sort_by(f64::total_cmp);
    let reference_hz = sorted[sorted.len() / 2];
    let course: Vec<f64> = pitches.iter().map(|&hz| cents(hz, reference_hz)).collect();
    let range = |x: &[f64]| {
        let high = x.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        (x.iter().copied().fold(f64::INFINITY, f64::min), high)
    };
    let (low, high) = range(&course);
    let swing = 0.5 * (high - low);
    let tolerance = TOLERANCE * swing;
    let window = crate::cast::index(LISTENED_S * rate / Analyzer::new(&settings)?.hop() as f64);
    let means: Vec<f64> =
        course.windows(window).map(|w| w.iter().sum::<f64>() / window as f64).collect();
    let (lowest, highest) = range(&means);
    let holds = highest.max(-lowest) < HOLDS * tolerance;
    if !(swing > SWINGS_CENTS && swing < 200.0 && holds) {
        return Ok(None);
    }
    let (verdict, told) = check(recording, &take, reference_hz, tolerance)?;
    let told = format!("{}, ±{swing:.1} cents, tolerance {tolerance:.1}; {told}", recording.name);
    Ok(Some((verdict == Verdict::Within, told.into())))
}

fn check(
    recording: &Recording,
    take: &Take,
    reference_hz: f64,
    tolerance_cents: f64,
) -> Result<(Verdict, String), SettingsError> {
    let rate = recording.sample_rate_hz;
    let hop = Analyzer::new(&Settings::new(rate))?.hop();
    let settings = CheckSettings { tolerance_cents, ..CheckSettings::new(rate, hop) };
    let mut check = Check::new(&settings, Reference::Frequency(reference_hz))?;
    let end_s = recording.samples.len() as f64 / rate - ENDS_S;
    for reading in &take.readings {
        let time_s = reading.centre as f64 / rate;
        if time_s > ENDS_S && time_s < end_s {
            check.reading(reading, &mut ());
        }
    }
    check.finish(&mut ());
    let outcome = check.outcome();
    let spans: Vec<_> = outcome
        .spans
        .iter()
        .map(|s| (s.start as f64 / rate, s.end as f64 / rate, s.worst_cents))
        .collect();
    Ok((outcome.verdict, format!("{:?}, {:.2?}, {spans:.2?}", outcome.verdict, outcome.vibrato)))
}
