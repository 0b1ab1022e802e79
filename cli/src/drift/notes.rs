//! The notes that are expected over time, from a file.

mod midi;
mod sheet;

use anyhow::{Context as _, Result, bail};
use plumbtone_analysis::check::Expected;
use plumbtone_analysis::tuning::Tuning;
use std::path::Path;

/// Beginning of every Standard MIDI File.
const MIDI_MAGIC: &[u8] = b"MThd";
/// Larger files are no lists of notes.
const BYTES_MAX: u64 = 64 << 20;

/// Reads the notes of a MIDI or CSV file, by rising start.
///
/// # Errors
/// A file that cannot be read, is neither, or expects nothing.
pub(super) fn read(path: &Path, tuning: &Tuning) -> Result<Vec<Expected>> {
    let size = std::fs::metadata(path).context("cannot be read")?.len();
    if size > BYTES_MAX {
        bail!("is too large for a file of notes");
    }
    let bytes = std::fs::read(path).context("cannot be read")?;
    let is_midi = bytes.starts_with(MIDI_MAGIC) || bytes.starts_with(b"RIFF");
    let mut notes =
        if is_midi { midi::notes(&bytes, tuning)? } else { sheet::notes(&bytes, tuning)? };
    notes.retain(|note| note.end_s > note.start_s);
    if notes.is_empty() {
        bail!("expects no note");
    }
    notes.sort_by(|a, b| a.start_s.total_cmp(&b.start_s));
    Ok(notes)
}
