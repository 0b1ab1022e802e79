//! Runs the engine over a whole sound and keeps what it delivers.

use plumbtone_analysis::{Analyzer, Gap, Note, Reading, Settings, SettingsError, Sink};

/// All that an engine delivered.
#[derive(Debug, Clone, Default)]
pub struct Take {
    /// Readings in order.
    pub readings: Vec<Reading>,
    /// Notes in order.
    pub notes: Vec<Note>,
    /// Gaps in order.
    pub gaps: Vec<Gap>,
}

impl Sink for Take {
    fn reading(&mut self, reading: &Reading) {
        self.readings.push(reading.clone());
    }

    fn note(&mut self, note: &Note) {
        self.notes.push(note.clone());
    }

    fn gap(&mut self, gap: &Gap) {
        self.gaps.push(*gap);
    }
}

impl Take {
    /// Analyses a whole sound.
    ///
    /// # Errors
    /// A setting outside its range.
    pub fn of(settings: &Settings, samples: &[f32]) -> Result<Self, SettingsError> {
        let mut analyzer = Analyzer::new(settings)?;
        let mut take = Self::default();
        analyzer.push(samples, &mut take);
        analyzer.finish(&mut take);
        Ok(take)
    }

    /// The longest note.
    #[must_use]
    pub fn longest_note(&self) -> Option<&Note> {
        self.notes.iter().max_by_key(|note| note.end - note.start)
    }

    /// The reading whose centre is nearest to a sample position.
    #[must_use]
    pub fn nearest(&self, position: u64) -> Option<&Reading> {
        let after = self.readings.partition_point(|r| r.centre < position);
        let around =
            self.readings.get(after.saturating_sub(1)..self.readings.len().min(after + 1))?;
        around.iter().min_by_key(|r| r.centre.abs_diff(position))
    }
}

/// Distance from `reference_hz` to `frequency_hz`, in cents.
#[must_use]
pub fn cents(frequency_hz: f64, reference_hz: f64) -> f64 {
    1200.0 * (frequency_hz / reference_hz).log2()
}
