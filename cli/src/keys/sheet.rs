//! The key sheet of all files together.

use super::record::{COLUMNS, KeyRecord};
use crate::args::{Keys, What};
use crate::output::csv::Sheet;
use crate::output::words::{plain, signed, with_deviation};
use crate::picture::keys::{self as picture, KeysPicture};
use anyhow::{Context as _, Result, bail};
use comfy_table::{CellAlignment, Table, presets};
use plumbtone_analysis::keys;
use plumbtone_analysis::tuning::NoteName;
use serde::Serialize;
use std::collections::BTreeMap;
use std::io::{ErrorKind, Write as _};
use std::path::Path;

/// The sheet as JSON.
#[derive(Serialize)]
struct SheetRecord<'a> {
    concert_pitch_hz: f64,
    temperament: &'static str,
    engine_version: &'static str,
    keys: &'a [KeyRecord],
    missing: Vec<String>,
}

/// Writes the sheet to all places asked for.
///
/// # Errors
/// A place cannot be written to.
pub(super) fn write(mut rows: Vec<KeyRecord>, command: &Keys) -> Result<()> {
    rows.sort_by(|a, b| a.note.cmp(&b.note).then(a.start_s.total_cmp(&b.start_s)));
    if let Some(place) = &command.csv {
        let folder = place.parent().filter(|f| !f.as_os_str().is_empty()).unwrap_or(Path::new("."));
        let name = place.file_name().unwrap_or_default().to_string_lossy();
        let mut sheet = Sheet::new(folder, &name, COLUMNS)?;
        rows.iter().try_for_each(|row| sheet.row(COLUMNS, 0, row))?;
        sheet.publish()?;
    }
    let text = if command.json {
        let record = SheetRecord {
            concert_pitch_hz: command.what.concert_pitch,
            temperament: command.what.temperament.name(),
            engine_version: plumbtone_analysis::VERSION,
            keys: &rows,
            missing: missing(&rows).iter().map(ToString::to_string).collect(),
        };
        serde_json::to_string(&record)? + "\n"
    } else {
        table(&rows)
    };
    match std::io::stdout().write_all(text.as_bytes()) {
        Err(error) if error.kind() != ErrorKind::BrokenPipe => {
            return Err(error).context("cannot print");
        }
        _ => {}
    }
    let Some(place) = &command.picture else { return Ok(()) };
    let What { concert_pitch, temperament, .. } = command.what;
    match KeysPicture::new(&rows, concert_pitch, temperament) {
        Some(drawn) => picture::write(place, &drawn),
        None => bail!("no picture was drawn: no key was found"),
    }
}

/// Keys between the lowest and the highest that have no row.
fn missing(rows: &[KeyRecord]) -> Vec<NoteName> {
    let keys: Vec<NoteName> = rows.iter().map(|row| row.note).collect();
    keys::missing(&keys)
}

fn table(rows: &[KeyRecord]) -> String {
    let mut table = Table::new();
    table.load_style(presets::NOTHING);
    table.set_header([
        "key",
        "cents",
        "Hz",
        "B",
        "tilt dB/oct",
        "dBFS",
        "settles in s",
        "worst alias dB",
        "over mask dB",
        "file",
    ]);
    let mut lines: BTreeMap<NoteName, Vec<&KeyRecord>> = BTreeMap::new();
    for row in rows {
        lines.entry(row.note).or_default().push(row);
    }
    for key in missing(rows) {
        lines.insert(key, Vec::new());
    }
    for (key, rows) in lines {
        if rows.is_empty() {
            table.add_row([key.to_string(), "not found".to_owned()]);
        }
        for row in rows {
            table.add_row(line(row));
        }
    }
    for column in table.column_iter_mut() {
        column.set_cell_alignment(CellAlignment::Right);
    }
    format!("{table}\n")
}

fn line(row: &KeyRecord) -> [String; 10] {
    let alias = row.worst_alias.as_ref();
    let file = Path::new(&row.file).file_name().unwrap_or_default().to_string_lossy();
    [
        row.key.clone(),
        with_deviation(Some(row.cents), Some(row.f0_sd_cents), 3, true),
        plain(Some(row.f0_hz), 3),
        row.inharmonicity_b.map_or_else(|| plain(None, 0), |b| format!("{b:.2e}")),
        signed(row.tilt_db_per_octave, 1),
        plain(row.level_dbfs, 1),
        plain(row.settling_s, 3),
        plain(alias.map(|a| a.relative_db), 1),
        signed(alias.and_then(|a| a.over_mask_db), 1),
        format!("{file} {:.2}", row.start_s),
    ]
}
