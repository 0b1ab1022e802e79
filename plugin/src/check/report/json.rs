//! The report as JSON: the results under the names that the command line's JSON gives them.

use std::io;

use plumbtone_analysis::VERSION;
use serde::Serialize;

use super::super::result::CheckResult;
use super::{CAUTION, Job};

#[derive(Serialize)]
struct Report<'a> {
    name: &'a str,
    written: String,
    engine_version: &'a str,
    caution: &'a str,
    results: &'a [CheckResult],
}

/// All of it.
pub(super) fn text(job: &Job) -> io::Result<String> {
    let report = Report {
        name: job.place.title(),
        written: job.place.stamp(),
        engine_version: VERSION,
        caution: CAUTION,
        results: &job.results,
    };
    let mut text = serde_json::to_string_pretty(&report)?;
    text.push('\n');
    Ok(text)
}
