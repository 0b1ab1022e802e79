//! CSV: four files per input, written beside their final place and moved there when whole.

use super::records::{FrameRecord, NoteRecord, PartialRecord, StrayRecord};
use super::{Ending, Report, words};
use crate::measure::{FileFacts, Timebase};
use anyhow::{Context as _, Result};
use plumbtone_analysis::Reading;
use std::io::BufWriter;
use std::path::{Path, PathBuf};
use tempfile::NamedTempFile;

/// A column: its name and how it is filled from the note's number and what is listed. What was not measured is left empty.
pub(crate) type Column<T> = (&'static str, fn(u64, &T) -> String);

const FRAMES: &[Column<FrameRecord>] = &[
    ("time_s", |_, frame| frame.time_s.to_string()),
    ("state", |_, frame| frame.state.to_owned()),
    ("f0_hz", |_, frame| figure(frame.f0_hz)),
    ("f0_sd_cents", |_, frame| figure(frame.f0_sd_cents)),
    ("confidence", |_, frame| figure(frame.confidence)),
    ("level_dbfs", |_, frame| figure(frame.level_dbfs)),
];

const NOTES: &[Column<NoteRecord>] = &[
    ("note_number", |number, _| number.to_string()),
    ("start_s", |_, note| note.start_s.to_string()),
    ("end_s", |_, note| note.end_s.to_string()),
    ("f0_hz", |_, note| figure(note.f0_hz)),
    ("f0_sd_cents", |_, note| figure(note.f0_sd_cents)),
    ("note", |_, note| note.note.clone().unwrap_or_default()),
    ("cents", |_, note| figure(note.cents)),
    ("inharmonicity_b", |_, note| figure(note.inharmonicity_b)),
    ("inharmonicity_sd", |_, note| figure(note.inharmonicity_sd)),
    ("odd_even_db", |_, note| figure(note.odd_even_db)),
    ("tilt_db_per_octave", |_, note| figure(note.tilt_db_per_octave)),
    ("thd_f_percent", |_, note| figure(note.thd_f_percent)),
    ("thd_r_percent", |_, note| figure(note.thd_r_percent)),
    ("hnr_db", |_, note| figure(note.hnr_db)),
    ("tristimulus_1", |_, note| figure(note.tristimulus.map(|three| three[0]))),
    ("tristimulus_2", |_, note| figure(note.tristimulus.map(|three| three[1]))),
    ("tristimulus_3", |_, note| figure(note.tristimulus.map(|three| three[2]))),
    ("centroid_partial", |_, note| figure(note.centroid_partial)),
    ("strays_left_out", |_, note| note.strays_left_out.to_string()),
    ("waveform", |_, note| note.waveform.as_ref().map(|w| w.name.to_owned()).unwrap_or_default()),
    ("pulse_width", |_, note| figure(note.waveform.as_ref().and_then(|w| w.width))),
];

const PARTIALS: &[Column<PartialRecord>] = &[
    ("note_number", |number, _| number.to_string()),
    ("number", |_, partial| partial.number.to_string()),
    ("frequency_hz", |_, partial| figure(partial.frequency_hz)),
    ("frequency_sd_hz", |_, partial| figure(partial.frequency_sd_hz)),
    ("cents_from_harmonic", |_, partial| figure(partial.cents_from_harmonic)),
    ("cents_sd", |_, partial| figure(partial.cents_sd)),
    ("level_dbfs", |_, partial| figure(partial.level_dbfs)),
    ("level_relative_db", |_, partial| figure(partial.level_relative_db)),
    ("level_sd_db", |_, partial| figure(partial.level_sd_db)),
    ("level_mean_dbfs", |_, partial| figure(partial.level_mean_dbfs)),
    ("phase_rad", |_, partial| figure(partial.phase_rad)),
    ("decay_db_per_s", |_, partial| figure(partial.decay_db_per_s)),
    ("decay_sd", |_, partial| figure(partial.decay_sd)),
    ("snr_db", |_, partial| figure(partial.snr_db)),
    ("lines", |_, partial| partial.cluster.as_ref().map_or(1, |c| c.lines).to_string()),
    ("spread_cents", |_, partial| figure(partial.cluster.as_ref().and_then(|c| c.spread_cents))),
    ("beat_hz", |_, partial| figure(partial.cluster.as_ref().and_then(|c| c.beat_hz))),
];

const STRAYS: &[Column<StrayRecord>] = &[
    ("note_number", |number, _| number.to_string()),
    ("frequency_hz", |_, stray| figure(stray.frequency_hz)),
    ("level_dbfs", |_, stray| figure(stray.level_dbfs)),
    ("kind", |_, stray| stray.kind.to_owned()),
    ("partial", |_, stray| stray.partial.map(|partial| partial.to_string()).unwrap_or_default()),
    ("explanation", |_, stray| words::explanation(stray.explanation)),
    ("folds", |_, stray| stray.folds.map(|folds| folds.to_string()).unwrap_or_default()),
    ("relative_db", |_, stray| figure(stray.relative_db)),
    ("over_mask_db", |_, stray| figure(stray.over_mask_db)),
];

/// The CSV files of one input in the making.
pub(crate) struct CsvReport {
    timebase: Timebase,
    notes_so_far: u64,
    frames: Sheet,
    notes: Sheet,
    partials: Sheet,
    strays: Sheet,
}

impl CsvReport {
    /// # Errors
    /// The folder cannot be written to.
    pub(crate) fn new(folder: &Path, name: &str, timebase: Timebase) -> Result<Self> {
        Ok(Self {
            timebase,
            notes_so_far: 0,
            frames: Sheet::new(folder, &format!("{name}.frames.csv"), FRAMES)?,
            notes: Sheet::new(folder, &format!("{name}.notes.csv"), NOTES)?,
            partials: Sheet::new(folder, &format!("{name}.partials.csv"), PARTIALS)?,
            strays: Sheet::new(folder, &format!("{name}.strays.csv"), STRAYS)?,
        })
    }
}

impl Report for CsvReport {
    fn reading(&mut self, reading: &Reading) -> Result<()> {
        self.frames.row(FRAMES, 0, &FrameRecord::new(reading, self.timebase))
    }

    fn note(&mut self, note: &NoteRecord) -> Result<()> {
        self.notes_so_far += 1;
        let number = self.notes_so_far;
        self.notes.row(NOTES, number, note)?;
        note.partials
            .iter()
            .try_for_each(|partial| self.partials.row(PARTIALS, number, partial))?;
        note.strays.iter().try_for_each(|stray| self.strays.row(STRAYS, number, stray))
    }

    fn finish(self: Box<Self>, _: &FileFacts) -> Result<Ending> {
        for sheet in [self.frames, self.notes, self.partials, self.strays] {
            sheet.publish()?;
        }
        Ok(Ending::default())
    }
}

/// Makes the folder for CSV files, if there is to be one.
///
/// # Errors
/// It cannot be made.
pub(crate) fn folder_for(folder: Option<&Path>) -> Result<()> {
    folder.map_or(Ok(()), |folder| {
        std::fs::create_dir_all(folder)
            .with_context(|| format!("cannot make the folder {}", folder.display()))
    })
}

/// One CSV file, not yet in its place.
pub(crate) struct Sheet {
    rows: csv::Writer<BufWriter<NamedTempFile>>,
    place: PathBuf,
}

impl Sheet {
    /// # Errors
    /// The folder cannot be written to.
    pub(crate) fn new<T>(folder: &Path, name: &str, columns: &[Column<T>]) -> Result<Self> {
        let place = folder.join(name);
        let file = super::new_file_for(&place)?;
        let mut rows = csv::Writer::from_writer(BufWriter::new(file));
        rows.write_record(columns.iter().map(|(name, _)| name))?;
        Ok(Self { rows, place })
    }

    /// # Errors
    /// The file cannot be written.
    pub(crate) fn row<T>(
        &mut self,
        columns: &[Column<T>],
        note_number: u64,
        row: &T,
    ) -> Result<()> {
        self.rows
            .write_record(columns.iter().map(|(_, fill)| fill(note_number, row)))
            .with_context(|| format!("cannot write {}", self.place.display()))
    }

    /// # Errors
    /// The file cannot be written.
    pub(crate) fn publish(self) -> Result<()> {
        let broken = || format!("cannot write {}", self.place.display());
        let buffer =
            self.rows.into_inner().map_err(csv::IntoInnerError::into_error).with_context(broken)?;
        let file = buffer
            .into_inner()
            .map_err(std::io::IntoInnerError::into_error)
            .with_context(broken)?;
        super::publish(file, &self.place)
    }
}

/// A figure, or nothing.
pub(crate) fn figure(value: Option<f64>) -> String {
    value.map(|value| value.to_string()).unwrap_or_default()
}
