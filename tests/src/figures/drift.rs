//! Figures on drift checks: verdicts and spans against the truth, and what is told of drift and vibrato.

use std::sync::Arc;

use plumbtone_analysis::check::{Check, CheckSettings, Outcome, Reference, Verdict};
use plumbtone_analysis::signals::{
    Motion, MovingTone, Point, Random, Timbre, Tone, Vibrato, add_noise, narrow, sample_count,
};
use plumbtone_analysis::{Analyzer, Gap, Reading, Settings, SettingsError, Sink};
use rayon::prelude::*;

use super::Draw;
use super::errors::{Errors, Tally};

/// Length of every sound, in seconds.
const DURATION_S: f64 = 5.0;
/// Steps in which the truth is looked up, in seconds.
const STEP_S: f64 = 1e-3;
/// How near the farthest pitch may come to the tolerance, as a share of it: nearer ones are drawn again, for noise decides.
const CLEAR: f64 = 0.08;

/// The figures of one kind of movement.
#[derive(Debug, Clone)]
pub struct DriftFigures {
    /// Kind of movement.
    pub kind: &'static str,
    /// Verdicts that are right.
    pub verdicts: Tally,
    /// What is missing to a whole overlap of the outside spans, found and true, per sound.
    pub overlap: Errors,
    /// The same for all sounds together: seconds in both, seconds in either.
    pub pooled_s: (f64, f64),
    /// Relative errors of the vibrato's rate and extent.
    pub rate: Errors,
    /// See `rate`.
    pub extent: Errors,
    /// Sounds with a vibrato where one was found, and without where none was.
    pub vibrato_told: Tally,
    /// Errors of the drift over its stated deviation.
    pub drift: Errors,
}

impl DriftFigures {
    fn new(kind: &'static str) -> Self {
        Self {
            kind,
            verdicts: Tally::default(),
            overlap: Errors::default(),
            pooled_s: (0.0, 0.0),
            rate: Errors::default(),
            extent: Errors::default(),
            vibrato_told: Tally::default(),
            drift: Errors::default(),
        }
    }

    /// Adds all of another.
    #[must_use]
    pub fn plus(mut self, other: Self) -> Self {
        self.verdicts.append(other.verdicts);
        self.overlap.append(other.overlap);
        self.pooled_s.0 += other.pooled_s.0;
        self.pooled_s.1 += other.pooled_s.1;
        self.rate.append(other.rate);
        self.extent.append(other.extent);
        self.vibrato_told.append(other.vibrato_told);
        self.drift.append(other.drift);
        self
    }

    /// Overlap of all outside spans together, 0 to 1.
    #[must_use]
    pub fn pooled_overlap(&self) -> f64 {
        self.pooled_s.0 / self.pooled_s.1
    }
}

/// Measures the figures for every kind of movement.
///
/// # Errors
/// Settings that the engine or the check refuses.
pub fn drifts(draw: Draw) -> Result<Vec<DriftFigures>, SettingsError> {
    let kinds: [(&'static str, Draws); 7] = [
        ("linear", linear),
        ("vibrato", vibrato),
        ("linear and vibrato", linear_and_vibrato),
        ("steps", steps),
        ("steps and vibrato", steps_and_vibrato),
        ("glides", glides),
        ("pauses", pauses),
    ];
    kinds
        .into_iter()
        .map(|(kind, motion)| {
            let all: Result<Vec<_>, _> =
                draw.seeds().into_par_iter().map(|seed| one(seed, kind, motion)).collect();
            Ok(all?.into_iter().fold(DriftFigures::new(kind), DriftFigures::plus))
        })
        .collect()
}

/// Draws a movement for a tolerance in cents.
type Draws = fn(&mut Random, f64) -> Motion;

/// A sound to be checked, with its truth.
struct Sound {
    name: Arc<str>,
    moving: MovingTone,
    samples: Vec<f32>,
    tolerance: f64,
}

fn one(seed: u64, kind: &'static str, motion: Draws) -> Result<DriftFigures, SettingsError> {
    let sound = sound(seed, motion);
    let (outcome, hop_s) = check(&sound)?;
    let mut figures = DriftFigures::new(kind);
    let truth = true_spans(&sound.moving.motion, sound.tolerance);
    let found: Vec<(f64, f64)> = outcome
        .spans
        .iter()
        .map(|s| {
            let rate = sound.moving.tone.sample_rate_hz;
            (s.start as f64 / rate, s.end as f64 / rate)
        })
        .collect();
    let expected = if truth.is_empty() { Verdict::Within } else { Verdict::Outside };
    let told =
        format!("{}; {:?}, found {found:.2?}, true {truth:.2?}", sound.name, outcome.verdict);
    let told: Arc<str> = told.into();
    figures.verdicts.push(outcome.verdict == expected, &told);
    if !truth.is_empty() {
        let (both, either) = overlap_s(&found, &truth);
        figures.overlap.push(1.0 - both / either, &told);
        figures.pooled_s = (both, either);
    }
    judge_vibrato(&sound, &outcome, &mut figures);
    // A straight line is what there is to be found only where the pitch is one.
    if sound.moving.motion.course.is_empty()
        && let Some(drift) = outcome.drift
    {
        let error = drift.cents_per_s - sound.moving.motion.drift_cents_per_s;
        let told = format!("{}; {drift:?}, hop {hop_s:.4} s", sound.name);
        figures.drift.push(error / drift.sd, &told.into());
    }
    Ok(figures)
}

fn judge_vibrato(sound: &Sound, outcome: &Outcome, figures: &mut DriftFigures) {
    let told: Arc<str> = format!("{}; {:?}", sound.name, outcome.vibrato).into();
    let truth = sound.moving.motion.vibrato;
    figures.vibrato_told.push(outcome.vibrato.is_some() == truth.is_some(), &told);
    if let (Some(found), Some(truth)) = (outcome.vibrato, truth) {
        figures.rate.push(found.rate_hz / truth.rate_hz - 1.0, &told);
        figures.extent.push(found.extent_cents / truth.extent_cents - 1.0, &told);
    }
}

fn sound(seed: u64, motion: Draws) -> Sound {
    let mut random = Random::new(seed);
    let rate = random.pick(&[44_100.0, 48_000.0]);
    let f0 = random.log_between(55.0, 1500.0);
    let timbre = Timbre { partials: random.pick(&[10, 20, 30]), ..Timbre::default() };
    let tone = Tone::random(&mut random, rate, f0, random_b(seed), &timbre);
    let tolerance = random.log_between(3.0, 30.0);
    let motion = loop {
        let drawn = motion(&mut random, tolerance);
        if is_clear(&drawn, tolerance) {
            break drawn;
        }
    };
    let moving = MovingTone::new(tone, motion, DURATION_S);
    let mut samples = moving.render(sample_count(DURATION_S, rate));
    let snr_db = random.pick(&[20.0, 30.0, 40.0, 60.0]);
    add_noise(&mut random, &mut samples, snr_db);
    let name = format!(
        "seed {seed}: f0 {f0:.1} Hz, SNR {snr_db} dB, {rate} Hz, within {tolerance:.1} cents, {}",
        describe(&moving.motion)
    );
    Sound { name: name.into(), moving, samples: narrow(&samples), tolerance }
}

fn random_b(seed: u64) -> f64 {
    if seed.is_multiple_of(2) { 0.0 } else { 2e-4 }
}

fn check(sound: &Sound) -> Result<(Outcome, f64), SettingsError> {
    let rate = sound.moving.tone.sample_rate_hz;
    let mut analyzer = Analyzer::new(&Settings::new(rate))?;
    let settings = CheckSettings {
        tolerance_cents: sound.tolerance,
        ..CheckSettings::new(rate, analyzer.hop())
    };
    let reference = Reference::Frequency(sound.moving.tone.f0_hz);
    let mut checked = Checked(Check::new(&settings, reference)?);
    analyzer.push(&sound.samples, &mut checked);
    analyzer.finish(&mut checked);
    checked.0.finish(&mut ());
    Ok((checked.0.outcome(), analyzer.hop() as f64 / rate))
}

struct Checked(Check);

impl Sink for Checked {
    fn reading(&mut self, reading: &Reading) {
        self.0.reading(reading, &mut ());
    }

    fn gap(&mut self, gap: &Gap) {
        self.0.gap(gap, &mut ());
    }
}

/// Where the mean pitch under the vibrato lies outside, and the tone sounds, for at least the shortest span that counts.
fn true_spans(motion: &Motion, tolerance: f64) -> Vec<(f64, f64)> {
    let mean = Motion { vibrato: None, ..motion.clone() };
    let mut spans: Vec<(f64, f64)> = Vec::new();
    for step in 0..sample_count(DURATION_S, 1.0 / STEP_S) {
        let time_s = step as f64 * STEP_S;
        let sounds = motion.pauses.iter().all(|&(from, to)| time_s < from || time_s > to);
        if sounds && mean.cents(time_s).abs() > tolerance {
            match spans.last_mut() {
                Some(last) if time_s - last.1 < 1.5 * STEP_S => last.1 = time_s,
                _ => spans.push((time_s, time_s)),
            }
        }
    }
    spans.retain(|(from, to)| to - from >= MIN_SPAN_S);
    spans
}

/// Shortest span that counts, in seconds: the check's default.
const MIN_SPAN_S: f64 = 0.15;

/// Whether the verdict is clear: the same for a somewhat larger and a somewhat smaller tolerance.
fn is_clear(motion: &Motion, tolerance: f64) -> bool {
    let spans = |scale: f64| true_spans(motion, scale * tolerance);
    spans(1.0 - CLEAR).is_empty() == spans(1.0 + CLEAR).is_empty()
}

/// Seconds in both lists of spans, and in either.
fn overlap_s(a: &[(f64, f64)], b: &[(f64, f64)]) -> (f64, f64) {
    let length = |spans: &[(f64, f64)]| spans.iter().map(|(from, to)| to - from).sum::<f64>();
    let both: f64 =
        a.iter().flat_map(|x| b.iter().map(move |y| (x.1.min(y.1) - x.0.max(y.0)).max(0.0))).sum();
    (both, length(a) + length(b) - both)
}

fn describe(motion: &Motion) -> String {
    let mut parts = Vec::new();
    if motion.drift_cents_per_s != 0.0 {
        parts.push(format!("drift {:.2} cents/s", motion.drift_cents_per_s));
    }
    if let Some(vibrato) = motion.vibrato {
        parts.push(format!("vibrato {:.2} Hz +-{:.1}", vibrato.rate_hz, vibrato.extent_cents));
    }
    parts.extend(motion.course.iter().map(|p| format!("{:.2} s {:+.1}", p.time_s, p.cents)));
    parts.extend(motion.pauses.iter().map(|(from, to)| format!("pause {from:.2} to {to:.2} s")));
    parts.join(", ")
}

fn sign(random: &mut Random) -> f64 {
    random.pick(&[-1.0, 1.0])
}

/// Half of them come to lie outside within the sound.
fn linear(random: &mut Random, tolerance: f64) -> Motion {
    let end = tolerance * random.log_between(0.3, 4.0) * sign(random);
    Motion { drift_cents_per_s: end / DURATION_S, ..Motion::default() }
}

fn vibrato(random: &mut Random, _: f64) -> Motion {
    let vibrato = Vibrato {
        rate_hz: random.between(4.0, 8.0),
        extent_cents: random.log_between(5.0, 100.0),
        phase_rad: random.phase(),
    };
    Motion { vibrato: Some(vibrato), ..Motion::default() }
}

fn linear_and_vibrato(random: &mut Random, tolerance: f64) -> Motion {
    let drift_cents_per_s = linear(random, tolerance).drift_cents_per_s;
    Motion { drift_cents_per_s, ..vibrato(random, tolerance) }
}

/// Every second sound stays within; the others step out of the tolerance and back.
fn steps(random: &mut Random, tolerance: f64) -> Motion {
    let most = random.pick(&[0.85, 4.0]);
    let mut course = Vec::new();
    let (mut time_s, mut cents) = (0.0, 0.0);
    while time_s < DURATION_S {
        time_s += random.between(0.4, 1.5);
        course.push(Point { time_s, cents });
        cents = level(random, tolerance, most);
        course.push(Point { time_s, cents });
    }
    Motion { course, ..Motion::default() }
}

/// A level up to `most` tolerances to either side, clear of the tolerance itself.
fn level(random: &mut Random, tolerance: f64, most: f64) -> f64 {
    loop {
        let size = random.between(0.0, most);
        if (size - 1.0).abs() > CLEAR {
            return tolerance * size * sign(random);
        }
    }
}

fn steps_and_vibrato(random: &mut Random, tolerance: f64) -> Motion {
    let course = steps(random, tolerance).course;
    Motion { course, ..vibrato(random, tolerance) }
}

fn glides(random: &mut Random, tolerance: f64) -> Motion {
    let most = random.pick(&[0.85, 5.0]);
    let mut course = Vec::new();
    let (mut time_s, mut cents) = (0.0, 0.0);
    while time_s < DURATION_S {
        time_s += random.between(0.3, 1.0);
        course.push(Point { time_s, cents });
        time_s += random.between(0.2, 1.0);
        cents = level(random, tolerance, most);
        course.push(Point { time_s, cents });
    }
    Motion { course, ..Motion::default() }
}

/// A drift that goes on through pauses.
fn pauses(random: &mut Random, tolerance: f64) -> Motion {
    let mut pauses = Vec::new();
    let mut time_s = random.between(0.4, 1.2);
    while time_s < DURATION_S {
        let end_s = time_s + random.between(0.2, 0.8);
        pauses.push((time_s, end_s));
        time_s = end_s + random.between(0.4, 1.2);
    }
    Motion { pauses, ..linear(random, tolerance) }
}
