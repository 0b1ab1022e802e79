//! The picture of a file: stand-in until drawn.

use crate::measure::{FileFacts, Timebase};
use crate::output::Report;
use crate::output::spool::Spool;
use anyhow::Result;
use std::path::PathBuf;

pub(crate) struct PictureReport {}

impl PictureReport {
    pub(crate) fn new(_place: PathBuf, _note: Option<u32>, _timebase: Timebase) -> Self {
        Self {}
    }
}

impl Report for PictureReport {
    fn finish(self: Box<Self>, _facts: &FileFacts) -> Result<Option<Spool>> {
        Ok(None)
    }
}
