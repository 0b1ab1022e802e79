//! Where the figures of a file go: each form takes them in as the engine delivers them and keeps none in memory.

pub(crate) mod csv;
pub(crate) mod json;
pub(crate) mod records;
pub(crate) mod spool;
pub(crate) mod table;
pub(crate) mod words;

use crate::drift::record::DriftRecord;
use crate::keys::record::KeyRecord;
use crate::measure::FileFacts;
use anyhow::{Context as _, Result};
use plumbtone_analysis::{Gap, Note, Reading};
use records::NoteRecord;
pub(crate) use spool::Spool;
use std::path::Path;
use tempfile::NamedTempFile;

/// A form in which the figures of one file are written down.
pub(crate) trait Report {
    /// Takes in the next reading.
    ///
    /// # Errors
    /// The place written to fails; so for the others.
    fn reading(&mut self, _reading: &Reading) -> Result<()> {
        Ok(())
    }

    /// Takes in samples on their way to the engine, from a position of its stream on, before what they lead to.
    fn samples(&mut self, _from: u64, _samples: &[f32]) {}

    /// Takes in the next note as the engine delivers it.
    fn engine_note(&mut self, _note: &Note) {}

    /// Takes in the next note.
    fn note(&mut self, _note: &NoteRecord) -> Result<()> {
        Ok(())
    }

    /// Takes in the next gap.
    fn gap(&mut self, _gap: &Gap) -> Result<()> {
        Ok(())
    }

    /// Ends the report.
    fn finish(self: Box<Self>, facts: &FileFacts) -> Result<Ending>;
}

/// How a report ended.
#[derive(Debug, Default)]
pub(crate) struct Ending {
    /// What is to be printed.
    pub(crate) text: Option<Spool>,
    /// What was asked for and could not be had.
    pub(crate) unmet: Option<String>,
    /// What a drift check came to.
    pub(crate) checked: Option<DriftRecord>,
    /// The rows of a key sheet.
    pub(crate) keys: Vec<KeyRecord>,
}

impl Ending {
    pub(crate) fn print(text: Spool) -> Self {
        Self { text: Some(text), ..Self::default() }
    }

    pub(crate) fn unmet(what: String) -> Self {
        Self { unmet: Some(what), ..Self::default() }
    }
}

/// A file beside its final place, for [`publish`]; it vanishes if it never gets there.
///
/// # Errors
/// The folder cannot be written to.
pub(crate) fn new_file_for(place: &Path) -> Result<NamedTempFile> {
    let folder =
        place.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
    let mut builder = tempfile::Builder::new();
    #[cfg(unix)]
    {
        // The same rights as any new file, less the user's mask, instead of those of a secret.
        use std::os::unix::fs::PermissionsExt as _;
        builder.permissions(std::fs::Permissions::from_mode(0o666));
    }
    builder
        .prefix(".plumbtone-")
        .tempfile_in(folder)
        .with_context(|| format!("cannot write {}", place.display()))
}

/// Moves a finished file to its place in one step, so that no reader ever sees half of it.
///
/// # Errors
/// The place cannot be written to.
pub(crate) fn publish(file: NamedTempFile, place: &Path) -> Result<()> {
    file.persist(place).map(drop).with_context(|| format!("cannot write {}", place.display()))
}
