//! The figures as text for people and as CSV for programs.

use std::fmt::Write as _;

use plumbtone_analysis::recipe::Recipe;

use super::screen::Shown;
use super::steady::signed;
use super::words;
use crate::captures::Capture;

/// The figures as lines of text.
pub(crate) fn text(shown: &Shown<'_>) -> String {
    let readout = shown.readout;
    let reading = &readout.reading;
    let mut out = String::new();
    let tuning = &readout.tuning;
    let nearest = readout.pitch().and_then(|pitch| Some((pitch, tuning.nearest(pitch.f0_hz)?)));
    let head = match (readout.measured, nearest) {
        (true, Some((pitch, nearest))) => format!(
            "{} {} \u{b1} {:.2} ct, {:.4} Hz",
            nearest.note,
            signed(nearest.cents, 2),
            pitch.f0_sd_cents,
            pitch.f0_hz
        ),
        _ => match words::saying(readout, shown.position) {
            words::Saying::Pitch(word) | words::Saying::NoPitch(word) => word.to_owned(),
        },
    };
    let concert = tuning.concert_pitch_hz();
    // Writing to a string cannot fail.
    let _ = writeln!(out, "{head}\nconcert pitch {concert:.2} Hz, {}", tuning.temperament());
    if !readout.measured || nearest.is_none() {
        return out;
    }
    if let Some(stretch) = reading.stretch {
        let _ = writeln!(out, "stretch B {:.3e} \u{b1} {:.1e}", stretch.b, stretch.b_sd);
    }
    let _ = writeln!(out, "level {}\n", words::level_dbfs(reading));
    let _ =
        writeln!(out, "{:>7} {:>12} {:>9} {:>7} {:>8}", "partial", "Hz", "ct", "\u{b1} ct", "dBFS");
    for p in &reading.partials {
        let _ = writeln!(
            out,
            "{:>7} {:>12.3} {:>9} {:>7.2} {:>8}",
            p.number,
            p.frequency_hz,
            signed(p.cents_from_harmonic, 2),
            p.cents_sd,
            signed(p.level_dbfs, 2)
        );
    }
    for stray in &reading.strays {
        let (hz, level) = (stray.frequency_hz, signed(stray.level_dbfs, 2));
        let _ = writeln!(out, "{:>7} {hz:>12.3} {:>25} {}", "\u{2013}", level, words::stray(stray));
    }
    out
}

/// What a capture's partials are made of, as CSV: the columns of the command line's recipe.
pub(crate) fn recipe_csv(capture: &Capture) -> String {
    let mut out = String::from(
        "number,ratio,ratio_sd,frequency_hz,amplitude,amplitude_sd,level_dbfs,phase_rad\n",
    );
    let Some(recipe) = Recipe::of(&capture.reading()) else { return out };
    for p in &recipe.ingredients {
        let level_dbfs = 20.0 * p.amplitude.log10();
        let _ = writeln!(
            out,
            "{},{},{},{},{},{},{level_dbfs},{}",
            p.number, p.ratio, p.ratio_sd, p.frequency_hz, p.amplitude, p.amplitude_sd, p.phase_rad
        );
    }
    out
}

/// The figures as CSV: one row per partial and stray, numbers with all their digits, what was not measured left empty.
pub(crate) fn csv(shown: &Shown<'_>) -> String {
    let mut out = String::from(
        "kind,number,frequency_hz,frequency_sd_hz,cents_from_harmonic,cents_sd,level_dbfs,level_sd_db,phase_rad,snr_db,explanation\n",
    );
    if !shown.readout.measured {
        return out;
    }
    let reading = &shown.readout.reading;
    if let Some(pitch) = shown.readout.pitch() {
        let sd_hz = pitch.f0_hz * pitch.f0_sd_cents * core::f64::consts::LN_2 / 1200.0;
        let _ = writeln!(out, "f0,,{},{sd_hz},,,{},,,,", pitch.f0_hz, reading.level_dbfs);
    }
    for p in &reading.partials {
        let _ = writeln!(
            out,
            "partial,{},{},{},{},{},{},{},{},{},",
            p.number,
            p.frequency_hz,
            p.frequency_sd_hz,
            p.cents_from_harmonic,
            p.cents_sd,
            p.level_dbfs,
            p.level_sd_db,
            p.phase_rad,
            p.snr_db
        );
    }
    for stray in &reading.strays {
        let what = words::stray(stray);
        let _ = writeln!(out, "stray,,{},,,,{},,,,{what}", stray.frequency_hz, stray.level_dbfs);
    }
    out
}
