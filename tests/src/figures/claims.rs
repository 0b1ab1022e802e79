//! Sounds without a single pitch: how often is one claimed?

use std::sync::Arc;

use plumbtone_analysis::signals::{
    Drum, Random, Timbre, Tone, add_at, add_noise, amplitude, chord, clicks, narrow,
    render_together, sample_count, white_noise,
};
use plumbtone_analysis::{Settings, SettingsError, State};
use rayon::prelude::*;

use super::Draw;
use super::errors::Tally;
use crate::take::Take;

/// Length of every sound, in seconds.
const DURATION_S: f64 = 3.0;
/// Confidence above which a pitch counts as claimed.
const CLAIM: f64 = 0.8;
/// Chords as semitones above the lowest note. None is an octave or a fifth alone: those can be heard as one pitch.
const CHORDS: [&[f64]; 8] = [
    &[4.0, 7.0],
    &[3.0, 7.0],
    &[3.0, 6.0],
    &[4.0, 8.0],
    &[4.0, 7.0, 10.0],
    &[3.0, 7.0, 10.0],
    &[6.0],
    &[4.0],
];

/// The figures of one kind of sound.
#[derive(Debug, Clone)]
pub struct ClaimFigures {
    /// Kind of sound.
    pub kind: &'static str,
    /// Readings without a pitch claimed above a confidence of 0.8.
    pub unclaimed: Tally,
    /// Readings with any pitch at all.
    pub pitched: usize,
    /// Readings in each state: silent, unpitched, several, gliding, steady.
    pub states: [usize; 5],
}

/// Measures the figures on every kind of sound.
///
/// # Errors
/// Settings that the engine refuses.
pub fn claims(draw: Draw) -> Result<Vec<ClaimFigures>, SettingsError> {
    let kinds: [(&'static str, Make); 10] = [
        ("chords", chords),
        ("noise", noise),
        ("coloured noise", coloured_noise),
        ("silence", silence),
        ("kicks", |random, rate| drums(random, rate, &[Drum::Kick])),
        ("snares", |random, rate| drums(random, rate, &[Drum::Snare])),
        ("hats", |random, rate| drums(random, rate, &[Drum::Hat])),
        ("toms", |random, rate| drums(random, rate, &[Drum::Tom])),
        ("drums together", |random, rate| drums(random, rate, &Drum::ALL)),
        ("clicks", sparse_clicks),
    ];
    kinds.into_iter().map(|(kind, make)| one_kind(draw, kind, make)).collect()
}

/// Samples, and what they are.
type Sound = (Vec<f64>, String);

/// Makes a sound at a sample rate.
type Make = fn(&mut Random, f64) -> Sound;

fn one_kind(draw: Draw, kind: &'static str, make: Make) -> Result<ClaimFigures, SettingsError> {
    let takes: Result<Vec<(Take, Arc<str>)>, SettingsError> = draw
        .seeds()
        .into_par_iter()
        .map(|seed| {
            let mut random = Random::new(seed);
            let rate = random.pick(&[44_100.0, 48_000.0]);
            let (sound, name) = make(&mut random, rate);
            let take = Take::of(&Settings::new(rate), &narrow(&sound))?;
            Ok((take, format!("seed {seed}: {name}, {rate} Hz").into()))
        })
        .collect();
    let mut figures =
        ClaimFigures { kind, unclaimed: Tally::default(), pitched: 0, states: [0; 5] };
    for (take, name) in takes? {
        for reading in &take.readings {
            let claimed = reading.pitch.is_some_and(|pitch| pitch.confidence > CLAIM);
            figures.unclaimed.push(!claimed, &name);
            figures.pitched += usize::from(reading.pitch.is_some());
            figures.states[state_index(reading.state)] += 1;
        }
    }
    Ok(figures)
}

fn state_index(state: State) -> usize {
    match state {
        State::Silent => 0,
        State::Unpitched => 1,
        State::Several => 2,
        State::Gliding => 3,
        State::Steady => 4,
    }
}

fn chords(random: &mut Random, rate: f64) -> Sound {
    let f0 = random.log_between(65.0, 800.0);
    let b = random.pick(&[0.0, 1e-4, 4e-4]);
    let timbre = Timbre {
        partials: 20,
        tilt_db_per_octave: random.between(-9.0, -4.0),
        ..Timbre::default()
    };
    let lowest = Tone::random(random, rate, f0, b, &timbre);
    let semitones = random.pick(&CHORDS);
    let tones = chord(random, &lowest, semitones, &timbre);
    let mut sound = render_together(&tones, sample_count(DURATION_S, rate));
    let snr_db = random.between(30.0, 70.0);
    add_noise(random, &mut sound, snr_db);
    (sound, format!("{f0:.2} Hz and {semitones:?} semitones above, B {b}, SNR {snr_db:.0} dB"))
}

fn noise(random: &mut Random, rate: f64) -> Sound {
    let level = random.between(-60.0, -10.0);
    let power = amplitude(level).powi(2);
    (white_noise(random, sample_count(DURATION_S, rate), power), format!("{level:.0} dB"))
}

/// Noise through one pole: falls by 6 dB per octave above a corner frequency.
fn coloured_noise(random: &mut Random, rate: f64) -> Sound {
    let (mut sound, name) = noise(random, rate);
    let corner = random.log_between(30.0, 3000.0);
    let keep = (-core::f64::consts::TAU * corner / rate).exp();
    let mut before = 0.0;
    for x in &mut sound {
        before = keep * before + (1.0 - keep) * *x;
        *x = before * 4.0;
    }
    (sound, format!("{name}, corner at {corner:.0} Hz"))
}

fn silence(random: &mut Random, rate: f64) -> Sound {
    // Nothing, dither of 24 bits, dither of 16 bits.
    let level = random.pick(&[f64::NEG_INFINITY, -144.0, -96.0]);
    let power = amplitude(level).powi(2);
    (white_noise(random, sample_count(DURATION_S, rate), power), format!("{level} dB"))
}

fn drums(random: &mut Random, rate: f64, kit: &[Drum]) -> Sound {
    let mut sound = white_noise(random, sample_count(DURATION_S, rate), 1e-9);
    let beat = random.between(0.12, 0.35);
    let mut at = random.between(0.05, 0.2);
    while at < DURATION_S - 0.1 {
        let level = random.between(-24.0, -4.0);
        let hit = random.pick(kit).hit(random, rate, level);
        add_at(&mut sound, sample_count(at, rate), &hit);
        at += beat * random.pick(&[1.0, 1.0, 2.0]);
    }
    (sound, format!("every {beat:.2} s"))
}

fn sparse_clicks(random: &mut Random, rate: f64) -> Sound {
    let interval = random.between(0.1, 0.5);
    (
        clicks(random, sample_count(DURATION_S, rate), rate, interval),
        format!("every {interval:.2} s"),
    )
}
