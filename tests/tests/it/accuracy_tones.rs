//! The project's figures on synthesised sounds that hold their pitch, or have none.

use plumbtone_tests::figures::{self, Draw};

use crate::verdicts::Verdicts;

/// Root mean square of errors over stated deviations.
const CALIBRATED: (f64, f64) = (0.7, 1.5);

#[test]
fn steady_tones_are_measured_at_the_bound() {
    let f = figures::exact(Draw { seed: 5_000, count: 60 }).unwrap();
    let mut verdicts = Verdicts::default();
    verdicts.at_least_percent("notes with the right f0", &f.right, 100.0);
    verdicts.at_most("f0 of notes, RMS of error / bound", f.f0.rms(), 1.5, &f.f0);
    let cents = &f.frame_cents;
    verdicts.at_most("f0 of readings, median, cents", cents.median(), 0.05, cents);
    verdicts.at_most("f0 of readings, 95th, cents", cents.percentile(95.0), 0.5, cents);
    let frequency = &f.frequency;
    verdicts.at_most("partials, RMS of error / bound", frequency.rms(), 1.5, frequency);
    verdicts.at_least_percent("partials found", &f.found, 99.5);
    verdicts.at_least_percent("partials real", &f.real, 99.5);
    verdicts.at_most("level, median, dB", f.level_db.median(), 0.02, &f.level_db);
    verdicts.at_most("level, 95th, dB", f.level_db.percentile(95.0), 0.3, &f.level_db);
    verdicts.at_most("B, RMS of error / bound", f.b.rms(), 1.5, &f.b);
    for (name, errors) in f.calibration.kinds() {
        let name = format!("{name}, RMS of error / stated deviation");
        verdicts.within(&name, errors.rms(), CALIBRATED, errors);
    }
    verdicts.assert_all_reached();
}

#[test]
fn decays_are_measured() {
    let f = figures::decays(Draw { seed: 6_000, count: 40 }).unwrap();
    let mut verdicts = Verdicts::default();
    verdicts.at_least_percent("notes with the right f0", &f.right, 100.0);
    let percent = &f.decay_percent;
    verdicts.at_most("decay, median, percent", percent.median(), 0.5, percent);
    verdicts.at_most("decay, 95th, percent", percent.percentile(95.0), 5.0, percent);
    for (name, errors) in [("decay", &f.decay_calibration), ("level", &f.level_calibration)] {
        let name = format!("{name}, RMS of error / stated deviation");
        verdicts.within(&name, errors.rms(), CALIBRATED, errors);
    }
    verdicts.assert_all_reached();
}

#[test]
fn aliases_are_named() {
    let f = figures::aliases(Draw { seed: 7_000, count: 24 }).unwrap();
    let mut verdicts = Verdicts::default();
    // The figure to reach is 100 %: a pulse above 2 kHz at 44.1 kHz, whose aliases are as strong as its partials and nearly
    // periodic with a multiple of its period, may be read as that.
    verdicts.at_least_percent("notes with the right f0", &f.right, 95.0);
    verdicts.at_least_percent("aliases named down to -40 dB", &f.named[0], 99.0);
    verdicts.at_least_percent("aliases named down to -60 dB", &f.named[1], 97.0);
    verdicts.at_least_percent("named aliases that are one", &f.truly, 97.0);
    verdicts.assert_all_reached();
}

#[test]
fn aliases_of_detuned_voices_are_named() {
    let f = figures::detuned_aliases(Draw { seed: 7_500, count: 16 }).unwrap();
    let mut verdicts = Verdicts::default();
    // Three and four equal voices that beat down to nothing are cut into notes too short for the weaker lines.
    verdicts.at_least_percent("notes with the right f0", &f.right, 90.0);
    verdicts.at_least_percent("aliases named down to -40 dB", &f.named[0], 92.0);
    verdicts.at_least_percent("aliases named down to -60 dB", &f.named[1], 80.0);
    verdicts.at_least_percent("named aliases that are one", &f.truly, 97.0);
    verdicts.assert_all_reached();
}

#[test]
fn mains_hum_is_named() {
    let named = figures::hum(Draw { seed: 8_000, count: 24 }).unwrap();
    let mut verdicts = Verdicts::default();
    verdicts.at_least_percent("lines named", &named, 95.0);
    verdicts.assert_all_reached();
}

#[test]
fn no_single_pitch_is_claimed_where_there_is_none() {
    let mut verdicts = Verdicts::default();
    for f in figures::claims(Draw { seed: 9_000, count: 20 }).unwrap() {
        verdicts.at_least_percent(&format!("{} unclaimed", f.kind), &f.unclaimed, 100.0);
    }
    verdicts.assert_all_reached();
}
