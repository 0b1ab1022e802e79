//! The streaming engine: samples in, readings and notes out.

use crate::note::Note;
use crate::reading::{Gap, Reading};
use crate::settings::{Settings, SettingsError};

/// Where an [`Analyzer`] delivers. What is lent is only lent: copy what is to stay.
pub trait Sink {
    /// The next reading of the grid; readings come in order, later than their centre by a fixed look-ahead.
    fn reading(&mut self, _reading: &Reading) {}
    /// A note that has ended, after the readings within it.
    fn note(&mut self, _note: &Note) {}
    /// A gap that has ended.
    fn gap(&mut self, _gap: &Gap) {}
}

/// The engine.
#[derive(Debug)]
pub struct Analyzer {
    position: u64,
}

impl Analyzer {
    /// Builds an engine; all memory it will ever need is taken here.
    ///
    /// # Errors
    /// A setting outside its range.
    pub fn new(settings: &Settings) -> Result<Self, SettingsError> {
        settings.validate()?;
        Ok(Self { position: 0 })
    }

    /// Samples between two readings.
    #[must_use]
    pub fn hop(&self) -> usize {
        480
    }

    /// Takes in samples (full scale 1.0). Any cut of the same samples gives the same output.
    pub fn push(&mut self, samples: &[f32], _sink: &mut impl Sink) {
        self.position += samples.len() as u64;
    }

    /// Says that `samples` samples were lost here: they become a [`Gap`].
    pub fn skip(&mut self, samples: u64, _sink: &mut impl Sink) {
        self.position += samples;
    }

    /// Ends the stream: delivers what is still to come. The next [`push`](Self::push) continues at the same position, as
    /// a new stream.
    pub fn finish(&mut self, _sink: &mut impl Sink) {}

    /// Forgets everything, the position included.
    pub fn reset(&mut self) {
        self.position = 0;
    }
}
