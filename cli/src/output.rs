//! Where the figures of a file go: each form takes them in as the engine delivers them and keeps none in memory.

pub(crate) mod csv;
pub(crate) mod json;
pub(crate) mod records;
pub(crate) mod spool;
pub(crate) mod table;
pub(crate) mod words;

use crate::measure::FileFacts;
use anyhow::Result;
use plumbtone_analysis::{Gap, Reading};
use records::NoteRecord;
use spool::Spool;

/// A form in which the figures of one file are written down.
pub(crate) trait Report {
    /// Takes in the next reading.
    ///
    /// # Errors
    /// The place written to fails; so for the others.
    fn reading(&mut self, _reading: &Reading) -> Result<()> {
        Ok(())
    }

    /// Takes in the next note.
    fn note(&mut self, _note: &NoteRecord) -> Result<()> {
        Ok(())
    }

    /// Takes in the next gap.
    fn gap(&mut self, _gap: &Gap) -> Result<()> {
        Ok(())
    }

    /// Ends the report, and gives what is to be printed.
    fn finish(self: Box<Self>, facts: &FileFacts) -> Result<Option<Spool>>;
}
