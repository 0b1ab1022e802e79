//! The notes of one file as rows.

use super::record::KeyRecord;
use crate::measure::{FileFacts, Timebase};
use crate::output::{Ending, Report};
use anyhow::Result;
use plumbtone_analysis::keys::{KeyRow, KeySheet};
use plumbtone_analysis::tuning::{NoteName, Tuning};
use plumbtone_analysis::{Note, Reading};

/// The rows of one file.
pub(super) struct KeysReport {
    sheet: KeySheet,
    told: Option<NoteName>,
    timebase: Timebase,
    rows: Vec<KeyRow>,
}

impl KeysReport {
    pub(super) fn new(tuning: Tuning, told: Option<NoteName>, timebase: Timebase) -> Self {
        let sheet = KeySheet::new(tuning, timebase.sample_rate_hz);
        Self { sheet, told, timebase, rows: Vec::new() }
    }
}

impl Report for KeysReport {
    fn reading(&mut self, reading: &Reading) -> Result<()> {
        self.sheet.reading(reading);
        Ok(())
    }

    fn engine_note(&mut self, note: &Note) {
        self.rows.extend(self.sheet.note(note, self.told));
    }

    fn finish(mut self: Box<Self>, facts: &FileFacts) -> Result<Ending> {
        if self.told.is_some() {
            // The file is one note: what rings on or sounds before it is none.
            let longest = self.rows.iter().copied().max_by_key(|row| row.end - row.start);
            self.rows = longest.into_iter().collect();
        }
        let file = facts.path.to_string_lossy();
        let record = |row: &KeyRow| KeyRecord {
            file: file.clone().into_owned(),
            ..KeyRecord::new(row, self.timebase)
        };
        Ok(Ending { keys: self.rows.iter().map(record).collect(), ..Ending::default() })
    }
}
