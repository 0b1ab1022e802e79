//! The check of a file for reading.

use super::record::{DriftRecord, VerdictWord};
use crate::measure::FileFacts;
use crate::output::words::{plain, signed, with_deviation, with_unit};
use comfy_table::{CellAlignment, Table, presets};
use std::fmt::Write as _;

/// Spans listed; the other forms list more.
const SPANS_SHOWN: usize = 20;

/// All that is printed of a file.
pub(super) fn text(record: &DriftRecord, facts: &FileFacts) -> String {
    let mut text = format!("{}: {}\n", facts.path.display(), verdict(record));
    text += &figures(record);
    if !record.spans.is_empty() {
        text += &spans(record);
    }
    text + "\n"
}

/// The verdict in one line.
pub(super) fn verdict(record: &DriftRecord) -> String {
    let tolerance = format!("{} cents of {}", record.tolerance_cents, reference(record));
    match record.verdict {
        VerdictWord::Within => format!("WITHIN ±{tolerance}"),
        VerdictWord::Outside => {
            let count = record.spans.len() as u64 + record.spans_left_out;
            let spans = if count == 1 { "span" } else { "spans" };
            let seconds = plain(Some(record.outside_s), 2);
            format!("OUTSIDE ±{tolerance}: {seconds} s in {count} {spans}")
        }
        VerdictWord::Unmeasured => {
            format!("UNMEASURED: {}", record.reason.as_deref().unwrap_or_default())
        }
    }
}

/// The figures in a few lines.
pub(super) fn figures(record: &DriftRecord) -> String {
    let cents = |value| with_unit(&signed(value, 2), "cents");
    let share = record.measured_share.map(|share| 100.0 * share);
    let drift = with_deviation(record.drift_cents_per_min, record.drift_per_min_sd, 3, true);
    let per_s = with_deviation(record.drift_cents_per_s, record.drift_sd, 4, true);
    let vibrato = match (record.vibrato_hz, record.vibrato_extent_cents, record.vibrato_share) {
        (Some(rate), Some(extent), Some(share)) => {
            format!("{rate:.2} Hz, ±{extent:.1} cents, in {:.0} % of it", 100.0 * share)
        }
        _ => "none".to_owned(),
    };
    let lines = [
        ("worst", cents(record.worst_cents)),
        ("mean", cents(record.mean_cents)),
        ("drift", format!("{} ({})", with_unit(&drift, "cents/min"), with_unit(&per_s, "cents/s"))),
        ("vibrato", vibrato),
        (
            "readings",
            format!(
                "from {} to {} cents",
                signed(record.raw_lowest_cents, 2),
                signed(record.raw_highest_cents, 2)
            ),
        ),
        (
            "measured",
            format!(
                "{} s, {} of the sounding time",
                plain(Some(record.measured_s), 2),
                with_unit(&plain(share, 0), "%")
            ),
        ),
    ];
    lines.iter().fold(String::new(), |mut text, (label, value)| {
        // Writing to a string cannot fail.
        let _ = writeln!(text, "  {label:<9}{value}");
        text
    })
}

/// The spans as a table.
pub(super) fn spans(record: &DriftRecord) -> String {
    let mut table = Table::new();
    table.load_style(presets::NOTHING);
    table.set_header(["outside", "from s", "to s", "worst cents", "mean cents"]);
    for (index, span) in record.spans.iter().take(SPANS_SHOWN).enumerate() {
        table.add_row([
            (index + 1).to_string(),
            format!("{:.3}", span.start_s),
            format!("{:.3}", span.end_s),
            signed(Some(span.worst_cents), 2),
            signed(Some(span.mean_cents), 2),
        ]);
    }
    for column in table.column_iter_mut() {
        column.set_cell_alignment(CellAlignment::Right);
    }
    let unlisted = record.spans.len().saturating_sub(SPANS_SHOWN) as u64 + record.spans_left_out;
    let more = if unlisted > 0 { format!("  and {unlisted} more\n") } else { String::new() };
    format!("{table}\n{more}")
}

/// The reference in words.
pub(super) fn reference(record: &DriftRecord) -> String {
    match record.reference_hz {
        Some(hz) if record.reference_kind != "frequency" => {
            format!("{} ({hz:.2} Hz)", record.reference)
        }
        _ => record.reference.clone(),
    }
}
