//! Explanations for lines that belong to no partial: alias of a partial ([`aliases`]), mains hum ([`mains`]), or none. [`peaks`] does it for one reading.

pub(crate) mod aliases;
pub(crate) mod mains;
pub(crate) mod peaks;

use crate::measure::lines::Line;
use crate::reading::{Stray, StrayKind};

/// A line with what is known of it.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Candidate {
    /// The line.
    pub(crate) line: Line,
    /// Its explanation so far.
    pub(crate) kind: StrayKind,
    /// Number of the partial that the trace of that number took it for.
    traced: (usize, u32),
}

impl Candidate {
    /// A line without an explanation.
    pub(crate) fn new(line: Line) -> Self {
        Self { line, kind: StrayKind::Unexplained, traced: (0, 0) }
    }
}

/// A candidate as a stray.
pub(crate) fn stray(candidate: &Candidate) -> Stray {
    Stray {
        frequency_hz: candidate.line.hz,
        level_dbfs: 20.0 * candidate.line.amplitude.log10(),
        kind: candidate.kind,
    }
}
