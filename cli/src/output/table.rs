//! The table a person reads: per note a head line, what the partials say together, the partials, and the strays.

use super::records::{NoteRecord, PartialRecord, StrayRecord, WaveformRecord};
use super::spool::write;
use super::words::{
    deviation_hz, explanation, inharmonicity, plain, signed, with_deviation, with_unit,
};
use super::{Ending, Report, Spool};
use crate::measure::FileFacts;
use anyhow::Result;
use comfy_table::{CellAlignment, Table, presets};

/// Strays listed per note; the other forms list them all.
const STRAYS_SHOWN: usize = 12;

/// The table of one file in the making.
pub(crate) struct TableReport {
    notes: Spool,
    count: u64,
}

impl TableReport {
    pub(crate) fn new() -> Self {
        Self { notes: Spool::new(), count: 0 }
    }
}

impl Report for TableReport {
    fn note(&mut self, note: &NoteRecord) -> Result<()> {
        self.count += 1;
        write(&mut self.notes, format_args!("\n{}", note_text(self.count, note)))
    }

    fn finish(self: Box<Self>, facts: &FileFacts) -> Result<Ending> {
        let mut text = Spool::new();
        let channels = match (facts.channels, facts.channel.as_str()) {
            (1, _) => "1 channel".to_owned(),
            (count, measured) => format!("{count} channels ({measured} measured)"),
        };
        let notes = match facts.notes {
            0 => "no note".to_owned(),
            1 => "1 note".to_owned(),
            count => format!("{count} notes"),
        };
        write(
            &mut text,
            format_args!(
                "{}: {} Hz, {channels}, {:.3} s, {notes}\n",
                facts.path.display(),
                facts.sample_rate_hz,
                facts.duration_s,
            ),
        )?;
        text.append(self.notes);
        write(&mut text, format_args!("\n"))?;
        Ok(Ending::print(text))
    }
}

fn note_text(number: u64, note: &NoteRecord) -> String {
    let name = note.note.as_deref().unwrap_or("?");
    let cents = with_deviation(note.cents, note.f0_sd_cents, 3, true);
    let f0 = with_deviation(note.f0_hz, deviation_hz(note), 5, false);
    let mut text = format!(
        "note {number}: {name} {cents} cents, {f0} Hz, from {:.3} to {:.3} s\n",
        note.start_s, note.end_s
    );
    text += &descriptors_text(note);
    text += &note.waveform.as_ref().map(WaveformRecord::text).unwrap_or_default();
    text += &clusters_text(note);
    if !note.partials.is_empty() {
        text += &format!("{}\n", partials_table(&note.partials));
    }
    if !note.strays.is_empty() {
        text += &strays_text(note);
    }
    text
}

fn descriptors_text(note: &NoteRecord) -> String {
    let tristimulus = note.tristimulus.map_or_else(
        || super::words::UNMEASURED.to_owned(),
        |three| three.map(|part| format!("{part:.3}")).join(" "),
    );
    let line = |facts: &[(&str, String)]| {
        facts
            .iter()
            .map(|(label, figure)| format!("  {label} {figure}"))
            .collect::<Vec<_>>()
            .join("  ")
            + "\n"
    };
    line(&[
        ("stretch B", inharmonicity(note)),
        ("tilt", with_unit(&signed(note.tilt_db_per_octave, 2), "dB/octave")),
        ("odd − even", with_unit(&signed(note.odd_even_db, 2), "dB")),
        ("harmonic to noise", with_unit(&plain(note.hnr_db, 1), "dB")),
    ]) + &line(&[
        ("THD to partial 1", with_unit(&plain(note.thd_f_percent, 2), "%")),
        ("to the whole", with_unit(&plain(note.thd_r_percent, 2), "%")),
        ("tristimulus", tristimulus),
        ("centroid at partial", plain(note.centroid_partial, 2)),
    ])
}

/// Which partials are several lines.
fn clusters_text(note: &NoteRecord) -> String {
    let clusters: Vec<_> =
        note.partials.iter().filter_map(|p| Some((p.number, p.cluster.as_ref()?))).collect();
    let Some(first) = clusters.first() else { return String::new() };
    let spreads = clusters.iter().filter_map(|c| c.1.spread_cents);
    let (low, high) =
        spreads.fold((f64::INFINITY, 0.0), |s, x| (f64::min(s.0, x), f64::max(s.1, x)));
    let most = clusters.iter().map(|c| c.1.lines).max().unwrap_or(0);
    format!(
        "  {} partials are clusters of up to {most} lines, {low:.1} to {high:.1} cents wide; partial {} beats at {} Hz\n",
        clusters.len(),
        first.0,
        plain(first.1.beat_hz, 2),
    )
}

fn partials_table(partials: &[PartialRecord]) -> Table {
    let mut table = Table::new();
    table.load_style(presets::NOTHING);
    table.set_header([
        "partial",
        "Hz",
        "cents off",
        "dBFS at start",
        "dB rel.",
        "dBFS mean",
        "decay dB/s",
        "phase",
        "SNR dB",
    ]);
    for partial in partials {
        table.add_row([
            partial.number.to_string(),
            with_deviation(partial.frequency_hz, partial.frequency_sd_hz, 5, false),
            with_deviation(partial.cents_from_harmonic, partial.cents_sd, 3, true),
            with_deviation(partial.level_dbfs, partial.level_sd_db, 3, false),
            plain(partial.level_relative_db, 1),
            plain(partial.level_mean_dbfs, 1),
            with_deviation(partial.decay_db_per_s, partial.decay_sd, 3, false),
            signed(partial.phase_rad, 3),
            plain(partial.snr_db, 1),
        ]);
    }
    for column in table.column_iter_mut() {
        column.set_cell_alignment(CellAlignment::Right);
    }
    table
}

fn strays_text(note: &NoteRecord) -> String {
    let mut text = "  belongs to no partial:\n".to_owned();
    for stray in note.strays.iter().take(STRAYS_SHOWN) {
        text += &stray_line(stray);
    }
    let unlisted = note.strays.len().saturating_sub(STRAYS_SHOWN) + note.strays_left_out;
    if unlisted > 0 {
        text +=
            &format!("    and {unlisted} weaker (--json and --csv list {})\n", note.strays.len());
    }
    text
}

fn stray_line(stray: &StrayRecord) -> String {
    let frequency = plain(stray.frequency_hz, 2);
    let level = with_unit(&plain(stray.level_dbfs, 1), "dBFS");
    let audible = match (stray.kind, stray.over_mask_db) {
        ("alias", Some(over)) if over > 0.0 => {
            format!(", {over:.0} dB over what the partials mask")
        }
        ("alias", Some(_)) => ", masked by the partials".to_owned(),
        _ => String::new(),
    };
    format!("  {frequency:>11} Hz  {level:>12}  {}{audible}\n", explanation(stray.explanation))
}
