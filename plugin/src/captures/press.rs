//! The parameter Capture: each time it is switched on, the first reading from there on is kept.

use super::{Capture, Captures};
use crate::convert::nearest;
use crate::readout::Readout;

/// Waits for the reading that a switched-on parameter asks for.
#[derive(Debug)]
pub(crate) struct Press {
    captures: Captures,
    integration_s: f64,
    /// Stream position from which on the next reading is to be kept.
    wanted: Option<u64>,
    /// Centre of the first reading since somebody listens.
    since: Option<u64>,
}

impl Press {
    pub(crate) fn new(captures: Captures) -> Self {
        Self { captures, integration_s: 0.0, wanted: None, since: None }
    }

    /// A new stream begins.
    pub(crate) fn start(&mut self) {
        (self.wanted, self.since) = (None, None);
    }

    /// Partials are averaged over this time from here on.
    pub(crate) fn integrate(&mut self, seconds: f64) {
        self.integration_s = seconds;
    }

    /// It was switched on at a position.
    pub(crate) fn press(&mut self, at: u64) {
        self.wanted = Some(at);
    }

    /// A readout with a new reading has come; true when it was kept, or there was nothing in it to keep. Right after somebody
    /// began to listen there is nothing to average yet.
    pub(crate) fn reading(&mut self, readout: &Readout) -> bool {
        let centre = readout.reading.centre;
        let since = *self.since.get_or_insert(centre);
        let averaged = nearest(self.integration_s * readout.sample_rate_hz);
        if self.wanted.is_none_or(|at| centre < at.max(since.saturating_add(averaged))) {
            return false;
        }
        self.take(readout);
        true
    }

    /// No more readings come for now: what is wanted is the last one. True as above.
    pub(crate) fn close(&mut self, readout: &Readout) -> bool {
        self.since = None;
        let wanted = self.wanted.is_some();
        if wanted {
            self.take(readout);
        }
        wanted
    }

    /// Keeps what a readout shows.
    pub(crate) fn take(&mut self, readout: &Readout) {
        self.wanted = None;
        self.captures.add(Capture::of(readout, self.integration_s));
    }
}
