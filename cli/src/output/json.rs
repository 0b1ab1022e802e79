//! JSON: one object per file, on one line, so that the output of many files is JSON Lines.
//!
//! Frames and notes are serialised as they come and wait in spools; the object is put together from its parts at the
//! end, when its duration and gaps, which stand before them, are known.

use super::records::{FrameRecord, GapRecord, NoteRecord};
use super::{Ending, Report, Spool};
use crate::measure::{FileFacts, Timebase};
use anyhow::{Context as _, Result};
use plumbtone_analysis::{Gap, Reading};
use serde::Serialize;
use std::io::Write as _;

/// Version of the engine that measured, as the object says it.
const ENGINE_VERSION: &str = plumbtone_analysis::VERSION;

/// The JSON of one file in the making.
pub(crate) struct JsonReport {
    timebase: Timebase,
    gaps: List,
    frames: List,
    notes: List,
}

/// What stands before the lists.
#[derive(Serialize)]
struct Head<'a> {
    file: &'a str,
    sample_rate_hz: u32,
    channels: usize,
    duration_s: f64,
    concert_pitch_hz: f64,
    engine_version: &'static str,
}

/// Elements of a JSON list, separated.
struct List {
    spool: Spool,
    empty: bool,
}

impl JsonReport {
    pub(crate) fn new(timebase: Timebase) -> Self {
        Self { timebase, gaps: List::new(), frames: List::new(), notes: List::new() }
    }
}

impl Report for JsonReport {
    fn reading(&mut self, reading: &Reading) -> Result<()> {
        self.frames.push(&FrameRecord::new(reading, self.timebase))
    }

    fn note(&mut self, note: &NoteRecord) -> Result<()> {
        self.notes.push(note)
    }

    fn gap(&mut self, gap: &Gap) -> Result<()> {
        self.gaps.push(&GapRecord::new(gap, self.timebase))
    }

    fn finish(self: Box<Self>, facts: &FileFacts) -> Result<Ending> {
        let head = serde_json::to_string(&Head {
            file: &facts.path.to_string_lossy(),
            sample_rate_hz: facts.sample_rate_hz,
            channels: facts.channels,
            duration_s: facts.duration_s,
            concert_pitch_hz: facts.concert_pitch_hz,
            engine_version: ENGINE_VERSION,
        })?;
        let mut object = Spool::new();
        object.write_all(head.trim_end_matches('}').as_bytes())?;
        for (name, list) in [("gaps", self.gaps), ("frames", self.frames), ("notes", self.notes)] {
            write!(object, ",\"{name}\":[")?;
            object.append(list.spool);
            object.write_all(b"]")?;
        }
        object.write_all(b"}\n")?;
        Ok(Ending::print(object))
    }
}

impl List {
    fn new() -> Self {
        Self { spool: Spool::new(), empty: true }
    }

    fn push(&mut self, element: &impl Serialize) -> Result<()> {
        let mut text = serde_json::to_vec(element)?;
        if !self.empty {
            text.insert(0, b',');
        }
        self.empty = false;
        self.spool.write_all(&text).context("cannot write a temporary file")
    }
}
