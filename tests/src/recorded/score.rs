//! How well the engine reads recorded instruments.

use std::collections::BTreeMap;

use plumbtone_analysis::{Settings, SettingsError};
use rayon::prelude::*;

use super::{Family, Recording};
use crate::cast::index;
use crate::take::{Take, cents};

/// Time between two judged frames and the first one's centre, in seconds.
const EVERY_S: f64 = 0.01;
const FIRST_S: f64 = 0.05;
/// Half of the stretch over which the level of a frame is taken, in seconds.
const LEVEL_HALF_S: f64 = 0.01;
/// A frame is judged when its level is within this many dB of the recording's highest.
const SOUNDING_DB: f64 = -50.0;
/// Farthest from the stated pitch that is right, in cents.
const RIGHT_CENTS: f64 = 50.0;
/// Confidence above which a wrong pitch is a claim.
const CLAIM: f64 = 0.8;

/// The judgement of one recording.
#[derive(Debug, Clone)]
pub struct Score {
    /// Name in the bank.
    pub name: String,
    /// Family.
    pub family: Family,
    /// Stated fundamental, in Hz.
    pub f0_hz: f64,
    /// Whether the stated fundamental is disputed.
    pub disputed: bool,
    /// Frames judged.
    pub frames: usize,
    /// Of these, frames with a wrong pitch.
    pub wrong: usize,
    /// Of the wrong ones, those claimed with a confidence above 0.8.
    pub claimed: usize,
    /// Frames without an answer.
    pub unanswered: usize,
    /// The wrong answer given most often, in cents from the truth, to 50 cents.
    pub usual_error_cents: Option<i64>,
    /// Distance of the longest note's fundamental from the truth, in cents; `None` without a note.
    pub note_cents: Option<f64>,
}

impl Score {
    /// Whether the recording as a whole was misread.
    #[must_use]
    pub fn misread(&self) -> bool {
        self.note_cents.is_none_or(|cents| cents.abs() > RIGHT_CENTS)
    }
}

/// The sum over a family, or over all.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct FamilyScore {
    /// Recordings.
    pub recordings: usize,
    /// Recordings misread.
    pub misread: usize,
    /// Frames judged.
    pub frames: usize,
    /// Frames with a wrong pitch.
    pub wrong: usize,
    /// Frames with a wrong pitch claimed with a confidence above 0.8.
    pub claimed: usize,
    /// Frames without an answer.
    pub unanswered: usize,
}

impl FamilyScore {
    /// Sums scores.
    #[must_use]
    pub fn of<'a>(scores: impl IntoIterator<Item = &'a Score>) -> Self {
        scores.into_iter().fold(Self::default(), |sum, score| Self {
            recordings: sum.recordings + 1,
            misread: sum.misread + usize::from(score.misread()),
            frames: sum.frames + score.frames,
            wrong: sum.wrong + score.wrong,
            claimed: sum.claimed + score.claimed,
            unanswered: sum.unanswered + score.unanswered,
        })
    }

    /// Share of the judged frames, in percent.
    #[must_use]
    pub fn percent(&self, frames: usize) -> f64 {
        100.0 * frames as f64 / self.frames.max(1) as f64
    }
}

/// Analyses and judges every recording.
///
/// # Errors
/// A sample rate that the engine does not accept.
pub fn score(recordings: &[Recording]) -> Result<Vec<Score>, SettingsError> {
    recordings.par_iter().map(score_one).collect()
}

fn score_one(recording: &Recording) -> Result<Score, SettingsError> {
    let rate = recording.sample_rate_hz;
    let take = Take::of(&Settings::new(rate), &recording.samples)?;
    let mut score = Score {
        name: recording.name.clone(),
        family: recording.family,
        f0_hz: recording.f0_hz,
        disputed: recording.disputed,
        frames: 0,
        wrong: 0,
        claimed: 0,
        unanswered: 0,
        usual_error_cents: None,
        note_cents: take.longest_note().map(|note| cents(note.f0_hz, recording.f0_hz)),
    };
    let mut errors: BTreeMap<i64, usize> = BTreeMap::new();
    for position in judged(recording) {
        score.frames += 1;
        let reading = take.nearest(position as u64);
        let Some(pitch) = reading.and_then(|reading| reading.pitch) else {
            score.unanswered += 1;
            continue;
        };
        let error = cents(pitch.f0_hz, recording.f0_hz);
        if error.abs() > RIGHT_CENTS {
            score.wrong += 1;
            score.claimed += usize::from(pitch.confidence > CLAIM);
            *errors.entry(rounded(error)).or_default() += 1;
        }
    }
    score.usual_error_cents = errors.into_iter().max_by_key(|&(_, count)| count).map(|(e, _)| e);
    Ok(score)
}

/// Centres of the frames that are judged, in samples.
fn judged(recording: &Recording) -> Vec<usize> {
    let rate = recording.sample_rate_hz;
    let frames = (0..).map(|i| index((FIRST_S + EVERY_S * f64::from(i)) * rate));
    let centres: Vec<usize> = frames.take_while(|&n| n < recording.samples.len()).collect();
    let half = index(LEVEL_HALF_S * rate);
    let power = |&centre: &usize| {
        let end = recording.samples.len().min(centre + half);
        let frame = &recording.samples[centre.saturating_sub(half)..end];
        frame.iter().map(|&x| f64::from(x) * f64::from(x)).sum::<f64>() / frame.len() as f64
    };
    let powers: Vec<f64> = centres.iter().map(power).collect();
    let floor = powers.iter().fold(0.0, |a: f64, &b| a.max(b)) * 10.0_f64.powf(SOUNDING_DB / 10.0);
    centres.into_iter().zip(powers).filter(|&(_, p)| p > floor).map(|(n, _)| n).collect()
}

#[expect(clippy::cast_possible_truncation, reason = "a few thousand cents")]
fn rounded(error_cents: f64) -> i64 {
    (error_cents / 50.0).round() as i64 * 50
}
