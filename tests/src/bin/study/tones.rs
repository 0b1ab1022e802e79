//! The sections on synthesised sounds that hold their pitch, or have none.

use std::error::Error;

use plumbtone_tests::figures::{self, Calibration, Draw, Errors};

use crate::table::{heading, hits, median_and_95th, misses, row, worst_errors, worst_misses};

type Printed = Result<(), Box<dyn Error>>;

/// Tones that hold pitch and levels.
pub(crate) fn exact(draw: Draw, worst: usize) -> Printed {
    let f = figures::exact(draw)?;
    heading("Exact on synthesised tones");
    row("notes with a gross f0 error or none", &misses(&f.right), "0");
    worst_misses(&f.right, worst);
    ratio("note f0: RMS error / bound", &f.f0, "<= 1.5", worst);
    row("readings in the state steady", &hits(&f.steady), "(all)");
    worst_misses(&f.steady, worst);
    row(
        "f0 of those from 40 dB: median, 95th, cents",
        &median_and_95th(&f.frame_cents),
        "0.05, 0.5",
    );
    worst_errors(&f.frame_cents, worst);
    ratio("partial frequency: RMS error / bound", &f.frequency, "<= 1.5", worst);
    row("partials found", &hits(&f.found), ">= 99.5 %");
    worst_misses(&f.found, worst);
    row("partials false", &misses(&f.real), "<= 0.5 %");
    worst_misses(&f.real, worst);
    row("level: median, 95th, dB", &median_and_95th(&f.level_db), "0.02, 0.3");
    worst_errors(&f.level_db, worst);
    ratio("B: RMS error / bound", &f.b, "<= 1.5", worst);
    row("notes with a B", &hits(&f.b_given), "(all)");
    row("phase at the start: median, 95th, rad", &median_and_95th(&f.phase_rad), "(none)");
    worst_errors(&f.phase_rad, worst);
    calibration(&f.calibration, worst);
    Ok(())
}

/// Tones whose partials fall.
pub(crate) fn decays(draw: Draw, worst: usize) -> Printed {
    let f = figures::decays(draw)?;
    heading("Decaying tones (T60 0.3 to 8 s)");
    row("notes with a gross f0 error or none", &misses(&f.right), "0");
    worst_misses(&f.right, worst);
    row("partials found", &hits(&f.found), "(all)");
    worst_misses(&f.found, worst);
    row("decay: median, 95th, percent", &median_and_95th(&f.decay_percent), "0.5, 5");
    worst_errors(&f.decay_percent, worst);
    row("level at the start: median, 95th, dB", &median_and_95th(&f.level_db), "(none)");
    worst_errors(&f.level_db, worst);
    calibrated("decay", &f.decay_calibration, worst);
    calibrated("level", &f.level_calibration, worst);
    Ok(())
}

/// Waves sampled without a band limit.
pub(crate) fn aliases(draw: Draw, worst: usize) -> Printed {
    alias_rows("Naive saw, square, pulse", &figures::aliases(draw)?, worst);
    alias_rows("The same, two to four detuned voices", &figures::detuned_aliases(draw)?, worst);
    Ok(())
}

fn alias_rows(title: &str, f: &figures::AliasFigures, worst: usize) {
    heading(title);
    row("notes with a gross f0 error or none", &misses(&f.right), "0");
    worst_misses(&f.right, worst);
    for (tally, (name, target)) in f.named.iter().zip([
        ("aliases named, down to -40 dB", ">= 99 %"),
        ("aliases named, down to -60 dB", ">= 97 %"),
    ]) {
        row(name, &hits(tally), target);
        worst_misses(tally, worst);
    }
    row("named aliases that are one", &hits(&f.truly), ">= 97 %");
    worst_misses(&f.truly, worst);
    row("strays that are partials in their place", &misses(&f.stray), "(none)");
    worst_misses(&f.stray, worst);
    row("strays left unexplained", &f.unexplained.to_string(), "(few)");
}

/// Mains hum.
pub(crate) fn hum(draw: Draw, worst: usize) -> Printed {
    let tally = figures::hum(draw)?;
    heading("Mains hum under a tone");
    row("lines named", &hits(&tally), ">= 95 %");
    worst_misses(&tally, worst);
    Ok(())
}

/// Sounds without a single pitch.
pub(crate) fn claims(draw: Draw, worst: usize) -> Printed {
    heading("A single pitch claimed with confidence above 0.8 where there is none");
    for f in figures::claims(draw)? {
        row(f.kind, &misses(&f.unclaimed), "0");
        let [silent, unpitched, several, gliding, steady] = f.states;
        println!(
            "      {} readings with any pitch; silent {silent}, unpitched {unpitched}, several {several}, gliding {gliding}, steady {steady}",
            f.pitched
        );
        worst_misses(&f.unclaimed, worst);
    }
    Ok(())
}

fn ratio(name: &str, errors: &Errors, target: &str, worst: usize) {
    row(name, &format!("{:.3} (median {:.3})", errors.rms(), errors.median()), target);
    worst_errors(errors, worst);
}

fn calibration(calibration: &Calibration, worst: usize) {
    for (name, errors) in calibration.kinds() {
        calibrated(name, errors, worst);
    }
}

fn calibrated(name: &str, errors: &Errors, worst: usize) {
    let name = format!("error / stated deviation, RMS: {name}");
    let above = 100.0 * errors.share_above(3.0);
    row(&name, &format!("{:.3} ({above:.1} % above 3)", errors.rms()), "0.7 to 1.5");
    worst_errors(errors, worst);
}
