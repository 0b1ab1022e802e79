//! The check of one file in the making, and all the forms in which it is written down.

use super::record::{DriftRecord, ReferenceWords, SpanRecord, VerdictWord};
use super::table;
use crate::measure::{FileFacts, Timebase};
use crate::output::csv::{Column, Sheet};
use crate::output::records::GapRecord;
use crate::output::{Ending, Report, Spool};
use crate::picture::drift::{self as picture, DriftPicture};
use anyhow::Result;
use plumbtone_analysis::check::{Check, CheckSettings, CheckSink, Heard, Reference, Span, Trace};
use plumbtone_analysis::{Gap, Reading};
use std::io::Write as _;
use std::path::{Path, PathBuf};

/// Columns of the trace that a picture is drawn from, at most: more than it is wide.
const COLUMNS_MAX: usize = 4096;

/// Gaps listed at most.
const GAPS_MAX: usize = 1024;

/// What is written of an instant.
struct Instant {
    time_s: f64,
    heard: Heard,
    outside: bool,
}

const DRIFT: &[Column<Instant>] = &[
    ("time_s", |_, at| at.time_s.to_string()),
    ("reference_hz", |_, at| at.heard.reference_hz.to_string()),
    ("heard_cents", |_, at| at.heard.cents.to_string()),
    ("heard_sd_cents", |_, at| at.heard.sd_cents.to_string()),
    ("raw_cents", |_, at| at.heard.raw_cents.to_string()),
    ("beyond_tolerance", |_, at| at.outside.to_string()),
];

const SPANS: &[Column<SpanRecord>] = &[
    ("span_number", |number, _| number.to_string()),
    ("start_s", |_, span| span.start_s.to_string()),
    ("end_s", |_, span| span.end_s.to_string()),
    ("worst_cents", |_, span| span.worst_cents.to_string()),
    ("mean_cents", |_, span| span.mean_cents.to_string()),
];

/// Where the results of a file go.
pub(super) struct Places<'a> {
    pub(super) json: bool,
    pub(super) csv: Option<&'a Path>,
    pub(super) name: &'a str,
    pub(super) picture: Option<PathBuf>,
}

/// The check of one file.
pub(super) struct DriftReport {
    check: Check,
    settings: CheckSettings,
    words: ReferenceWords,
    timebase: Timebase,
    json: bool,
    picture: Option<PathBuf>,
    written: Written,
    gaps: Vec<GapRecord>,
    gaps_left_out: u64,
}

/// What is written and kept while the check runs.
struct Written {
    timebase: Timebase,
    tolerance_cents: f64,
    sheets: Option<(Sheet, Sheet)>,
    trace: Option<Trace>,
    spans: u64,
    failed: Result<()>,
}

impl DriftReport {
    pub(super) fn new(
        settings: &CheckSettings,
        reference: Reference,
        words: ReferenceWords,
        timebase: Timebase,
        places: Places<'_>,
    ) -> Result<Self> {
        let Places { json, csv, name, picture } = places;
        let sheets = csv.map(|folder| {
            let drift = Sheet::new(folder, &format!("{name}.drift.csv"), DRIFT)?;
            let spans = Sheet::new(folder, &format!("{name}.spans.csv"), SPANS)?;
            anyhow::Ok((drift, spans))
        });
        let written = Written {
            timebase,
            tolerance_cents: settings.tolerance_cents,
            sheets: sheets.transpose()?,
            trace: picture.is_some().then(|| Trace::new(COLUMNS_MAX)),
            spans: 0,
            failed: Ok(()),
        };
        Ok(Self {
            check: Check::new(settings, reference)?,
            settings: settings.clone(),
            words,
            timebase,
            json,
            picture,
            written,
            gaps: Vec::new(),
            gaps_left_out: 0,
        })
    }
}

impl CheckSink for Written {
    fn heard(&mut self, heard: &Heard) {
        if let Some(trace) = &mut self.trace {
            trace.push(heard);
        }
        let Some((sheet, _)) = &mut self.sheets else { return };
        let outside = heard.cents.abs() > self.tolerance_cents;
        let time_s = self.timebase.seconds(heard.position);
        if self.failed.is_ok() {
            self.failed = sheet.row(DRIFT, 0, &Instant { time_s, heard: *heard, outside });
        }
    }

    fn span(&mut self, span: &Span) {
        self.spans += 1;
        let Some((_, sheet)) = &mut self.sheets else { return };
        if self.failed.is_ok() {
            self.failed = sheet.row(SPANS, self.spans, &SpanRecord::new(span, self.timebase));
        }
    }
}

impl Report for DriftReport {
    fn reading(&mut self, reading: &Reading) -> Result<()> {
        self.check.reading(reading, &mut self.written);
        std::mem::replace(&mut self.written.failed, Ok(()))
    }

    fn gap(&mut self, gap: &Gap) -> Result<()> {
        self.check.gap(gap, &mut self.written);
        if self.gaps.len() < GAPS_MAX {
            self.gaps.push(GapRecord::new(gap, self.timebase));
        } else {
            self.gaps_left_out += 1;
        }
        std::mem::replace(&mut self.written.failed, Ok(()))
    }

    fn finish(mut self: Box<Self>, facts: &FileFacts) -> Result<Ending> {
        self.check.finish(&mut self.written);
        std::mem::replace(&mut self.written.failed, Ok(()))?;
        let outcome = self.check.outcome();
        let record = DriftRecord {
            gaps: self.gaps,
            gaps_left_out: self.gaps_left_out,
            ..DriftRecord::new(&outcome, &self.settings, &self.words, facts, self.timebase)
        };
        if let Some((drift, spans)) = self.written.sheets {
            drift.publish()?;
            spans.publish()?;
        }
        if let (Some(place), Some(trace)) = (&self.picture, &self.written.trace) {
            let drawn = DriftPicture { facts, record: &record, trace, timebase: self.timebase };
            picture::write(place, &drawn)?;
        }
        let mut text = Spool::new();
        if self.json {
            serde_json::to_writer(&mut text, &record)?;
            text.write_all(b"\n")?;
        } else {
            text.write_all(table::text(&record, facts).as_bytes())?;
        }
        let unmet = record.reason.as_ref().map(|why| format!("unmeasured: {why}"));
        let unmet = unmet.filter(|_| record.verdict == VerdictWord::Unmeasured);
        Ok(Ending { text: Some(text), unmet, checked: Some(record), ..Ending::default() })
    }
}
