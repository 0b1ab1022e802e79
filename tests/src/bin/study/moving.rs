//! The sections on moving pitch and on the first reading after an onset.

use std::error::Error;

use plumbtone_tests::figures::{self, Draw};

use crate::table::{heading, hits, median_and_95th, misses, row, worst_errors, worst_misses};

/// Pitch that moves.
pub(crate) fn moving(draw: Draw, worst: usize) -> Result<(), Box<dyn Error>> {
    heading("Moving pitch");
    let mut all = figures::Errors::default();
    for f in figures::moving(draw)? {
        row(&format!("{}: median, 95th, cents", f.kind), &median_and_95th(&f.cents), "0.1, 1");
        worst_errors(&f.cents, worst);
        row(&format!("{}: readings with a pitch", f.kind), &hits(&f.answered), "(all)");
        worst_misses(&f.answered, worst);
        row(&format!("{}: off by more than 50 cents", f.kind), &misses(&f.right), "(none)");
        worst_misses(&f.right, worst);
        let rms = format!("{:.3}", f.calibration.rms());
        row(&format!("{}: error / stated deviation, RMS", f.kind), &rms, "0.7 to 1.5");
        worst_errors(&f.calibration, worst);
        all.append(f.cents);
    }
    row("all: median, 95th, cents", &median_and_95th(&all), "0.1, 1");
    Ok(())
}

/// The first right reading after an onset.
pub(crate) fn live() -> Result<(), Box<dyn Error>> {
    heading("Live: first right reading after the onset, worst of 5 sounds");
    for figure in figures::live(5)? {
        let reached =
            format!("{:.1} ms (settled at {:.0} ms)", figure.reached_ms, figure.settled_ms);
        row(&format!("{} Hz", figure.f0_hz), &reached, &format!("{} ms", figure.due_ms));
    }
    Ok(())
}
