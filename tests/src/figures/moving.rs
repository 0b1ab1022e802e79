//! Figures on pitch that moves: the f0 of readings against the true one at their centres.

use std::sync::Arc;

use plumbtone_analysis::signals::{
    Motion, MovingTone, Point, Random, Timbre, Tone, Vibrato, add_noise, narrow, sample_count,
};
use plumbtone_analysis::{Settings, SettingsError};
use rayon::prelude::*;

use super::Draw;
use super::errors::{Errors, Tally};
use crate::take::{Take, cents};

/// Length of every sound, in seconds.
const DURATION_S: f64 = 3.0;
/// Readings nearer to a step than this are not judged: their frames hold both pitches. In seconds and in periods, of which
/// the longer counts.
const STEP_MARGIN: (f64, f64) = (0.04, 6.0);
/// The same at the ends of the sound.
const END_MARGIN_S: f64 = 0.05;
/// Error that is gross, in cents.
const GROSS_CENTS: f64 = 50.0;

/// The figures of one kind of movement.
#[derive(Debug, Clone)]
pub struct MovingFigures {
    /// Kind of movement.
    pub kind: &'static str,
    /// Readings with a pitch.
    pub answered: Tally,
    /// Errors of the f0, in cents.
    pub cents: Errors,
    /// Of the answered readings, those within 50 cents.
    pub right: Tally,
    /// Errors over stated deviations.
    pub calibration: Errors,
}

/// Measures the figures for every kind of movement.
///
/// # Errors
/// Settings that the engine refuses.
pub fn moving(draw: Draw) -> Result<Vec<MovingFigures>, SettingsError> {
    let kinds: [(&'static str, Draws); 4] =
        [("drift", drift), ("vibrato", vibrato), ("steps", steps), ("glides", glides)];
    kinds
        .into_iter()
        .map(|(kind, motion)| {
            let all: Result<Vec<_>, _> =
                draw.seeds().into_par_iter().map(|seed| one(seed, kind, motion)).collect();
            Ok(all?.into_iter().fold(MovingFigures::new(kind), MovingFigures::plus))
        })
        .collect()
}

/// Draws a movement.
type Draws = fn(&mut Random) -> Motion;

fn one(seed: u64, kind: &'static str, motion: Draws) -> Result<MovingFigures, SettingsError> {
    let mut random = Random::new(seed);
    let rate = random.pick(&[44_100.0, 48_000.0]);
    let f0 = random.log_between(55.0, 1500.0);
    let b = random.pick(&[0.0, 0.0, 1e-4, 4e-4]);
    let timbre = Timbre { partials: random.pick(&[10, 20, 40]), ..Timbre::default() };
    let tone = Tone::random(&mut random, rate, f0, b, &timbre);
    let moving = MovingTone::new(tone, motion(&mut random), DURATION_S);
    let mut sound = moving.render(sample_count(DURATION_S, rate));
    let snr_db = random.pick(&[20.0, 40.0, 60.0]);
    add_noise(&mut random, &mut sound, snr_db);
    let take = Take::of(&Settings::new(rate), &narrow(&sound))?;
    let name: Arc<str> = format!(
        "seed {seed}: f0 {f0:.2} Hz, B {b}, SNR {snr_db} dB, {rate} Hz, {}",
        describe(&moving.motion)
    )
    .into();
    let mut figures = MovingFigures::new(kind);
    for reading in &take.readings {
        let time_s = reading.centre as f64 / rate;
        let margin = STEP_MARGIN.0.max(STEP_MARGIN.1 / f0);
        let inside = time_s > END_MARGIN_S && time_s < DURATION_S - END_MARGIN_S;
        if inside && moving.motion.nearest_step_s(time_s) > margin {
            let truth = moving.f0_hz(time_s);
            let error = reading.pitch.map(|p| (cents(p.f0_hz, truth), p.f0_sd_cents));
            figures.push(error, &format!("{name}; at {time_s:.2} s").into());
        }
    }
    Ok(figures)
}

impl MovingFigures {
    fn new(kind: &'static str) -> Self {
        Self {
            kind,
            answered: Tally::default(),
            cents: Errors::default(),
            right: Tally::default(),
            calibration: Errors::default(),
        }
    }

    fn push(&mut self, answer: Option<(f64, f64)>, name: &Arc<str>) {
        self.answered.push(answer.is_some(), name);
        if let Some((error, sd)) = answer {
            self.cents.push(error, name);
            self.right.push(error.abs() <= GROSS_CENTS, name);
            self.calibration.push(error / sd, name);
        }
    }

    fn plus(mut self, other: Self) -> Self {
        self.answered.append(other.answered);
        self.cents.append(other.cents);
        self.right.append(other.right);
        self.calibration.append(other.calibration);
        self
    }
}

fn describe(motion: &Motion) -> String {
    if let Some(vibrato) = motion.vibrato {
        return format!("vibrato {:.2} Hz +-{:.1} cents", vibrato.rate_hz, vibrato.extent_cents);
    }
    let points: Vec<String> =
        motion.course.iter().map(|p| format!("{:.2} s {:+.0}", p.time_s, p.cents)).collect();
    format!("drift {:.1} cents/s, {}", motion.drift_cents_per_s, points.join(", "))
}

fn drift(random: &mut Random) -> Motion {
    let rate = random.log_between(0.5, 60.0) * random.pick(&[-1.0, 1.0]);
    Motion { drift_cents_per_s: rate, ..Motion::default() }
}

fn vibrato(random: &mut Random) -> Motion {
    let vibrato = Vibrato {
        rate_hz: random.between(4.0, 8.0),
        extent_cents: random.log_between(5.0, 100.0),
        phase_rad: random.phase(),
    };
    Motion { vibrato: Some(vibrato), ..Motion::default() }
}

fn steps(random: &mut Random) -> Motion {
    let mut course = Vec::new();
    let (mut time_s, mut cents) = (0.0, 0.0);
    while time_s < DURATION_S {
        time_s += random.between(0.4, 1.0);
        course.push(Point { time_s, cents });
        cents += random.between(20.0, 700.0) * random.pick(&[-1.0, 1.0]);
        course.push(Point { time_s, cents });
    }
    Motion { course, ..Motion::default() }
}

fn glides(random: &mut Random) -> Motion {
    let mut course = Vec::new();
    let (mut time_s, mut cents) = (0.0, 0.0);
    while time_s < DURATION_S {
        time_s += random.between(0.3, 0.8);
        course.push(Point { time_s, cents });
        time_s += random.between(0.2, 0.8);
        cents += random.between(50.0, 700.0) * random.pick(&[-1.0, 1.0]);
        course.push(Point { time_s, cents });
    }
    Motion { course, ..Motion::default() }
}
