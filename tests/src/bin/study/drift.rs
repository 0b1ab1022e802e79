//! The section on drift checks.

use std::error::Error;

use plumbtone_tests::figures::{self, Draw};
use plumbtone_tests::recorded;

use crate::table::{heading, hits, median_and_95th, row, worst_errors, worst_misses};

/// Drift checks against the truth.
pub(crate) fn drift(draw: Draw, worst: usize) -> Result<(), Box<dyn Error>> {
    heading("Drift checks");
    let mut all = figures::Errors::default();
    for f in figures::drifts(draw)? {
        let kind = f.kind;
        row(&format!("{kind}: verdicts right"), &hits(&f.verdicts), "100 %");
        worst_misses(&f.verdicts, worst);
        if !f.overlap.is_empty() {
            let overlap = format!("{:.4}", f.pooled_overlap());
            row(&format!("{kind}: overlap of outside spans"), &overlap, "0.95");
            let missing = median_and_95th(&f.overlap);
            row(&format!("{kind}: missing to it per sound: median, 95th"), &missing, "0.05");
            worst_errors(&f.overlap, worst);
        }
        row(&format!("{kind}: vibrato told from none"), &hits(&f.vibrato_told), "(all)");
        worst_misses(&f.vibrato_told, worst);
        if !f.rate.is_empty() {
            row(&format!("{kind}: vibrato rate, median, 95th"), &median_and_95th(&f.rate), "0.02");
            worst_errors(&f.rate, worst);
            let extent = median_and_95th(&f.extent);
            row(&format!("{kind}: vibrato extent, median, 95th"), &extent, "0.05");
            worst_errors(&f.extent, worst);
        }
        if !f.drift.is_empty() {
            let rms = format!("{:.3}", f.drift.rms());
            row(&format!("{kind}: drift error / deviation, RMS"), &rms, "0.7 to 1.5");
            worst_errors(&f.drift, worst);
        }
        all.append(f.drift);
    }
    row("all: drift error / deviation, RMS", &format!("{:.3}", all.rms()), "0.7 to 1.5");
    if let Some(recordings) = recorded::recordings()? {
        let tally = figures::recorded_vibrato(&recordings)?;
        row("recorded: swings about a held pitch, within", &hits(&tally), "(all)");
        worst_misses(&tally, worst);
    }
    Ok(())
}
