//! Mains hum under a tone: is every line named?

use plumbtone_analysis::signals::{
    Hum, Random, Timbre, Tone, TonePartial, add_noise, narrow, sample_count,
};
use plumbtone_analysis::{Settings, SettingsError, Stray, StrayKind};
use rayon::prelude::*;

use super::Draw;
use super::errors::Tally;
use crate::take::Take;

/// Length of every sound, in seconds.
const DURATION_S: f64 = 3.0;
/// Levels of the lines, in dBFS.
const LEVEL_DBFS: (f64, f64) = (-70.0, -40.0);
/// Least distance in Hz from a partial for a line to be due: closer ones cannot be told apart in 3 s.
const APART_HZ: f64 = 3.0;
/// Farthest in Hz from the truth that is right.
const RIGHT_HZ: f64 = 0.5;

/// Lines of hum that are named as such, with the right mains frequency and multiple, under tones drawn by seed.
///
/// # Errors
/// Settings that the engine refuses.
pub fn hum(draw: Draw) -> Result<Tally, SettingsError> {
    let all: Result<Vec<_>, _> = draw.seeds().into_par_iter().map(one).collect();
    let mut sum = Tally::default();
    all?.into_iter().for_each(|tally| sum.append(tally));
    Ok(sum)
}

fn one(seed: u64) -> Result<Tally, SettingsError> {
    let mut random = Random::new(seed);
    let rate = random.pick(&[44_100.0, 48_000.0]);
    let f0 = random.log_between(60.0, 1500.0);
    let b = random.pick(&[0.0, 1e-4, 5e-4]);
    let tone = Tone::random(&mut random, rate, f0, b, &Timbre::default());
    let base = random.pick(&[50.0, 60.0]);
    let mut line = |multiple| (multiple, random.between(LEVEL_DBFS.0, LEVEL_DBFS.1));
    let lines = [line(1), line(2), line(3), line(5)];
    let hum = Hum::new(&mut random, base, &lines);
    let mut sound = tone.render(sample_count(DURATION_S, rate));
    add_noise(&mut random, &mut sound, 70.0);
    hum.add_to(&mut sound, rate);
    let take = Take::of(&Settings::new(rate), &narrow(&sound))?;
    let strays = take.longest_note().map_or(&[][..], |note| &note.strays);
    let mut tally = Tally::default();
    for line in &hum.lines {
        let apart = |p: &TonePartial| (p.frequency_hz - line.frequency_hz).abs() > APART_HZ;
        if tone.partials.iter().all(apart) {
            let name =
                format!("seed {seed}: f0 {f0:.2} Hz, B {b}, line of {} Hz", line.frequency_hz);
            tally.push(strays.iter().any(|stray| names(stray, line, base)), &name.into());
        }
    }
    Ok(tally)
}

fn names(stray: &Stray, line: &TonePartial, base: f64) -> bool {
    let kind = matches!(
        stray.kind,
        StrayKind::Mains { base_hz, multiple }
            if (base_hz - base).abs() < 1.0 && multiple == line.number
    );
    kind && (stray.frequency_hz - line.frequency_hz).abs() < RIGHT_HZ
}
