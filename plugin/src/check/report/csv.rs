//! The report as CSV: a row for each check and, below it, one for each span outside. What there is none of is left empty.

use std::io;

use super::super::result::{CheckResult, Extent};
use super::Job;

const HEAD: [&str; 24] = [
    "row",
    "number",
    "verdict",
    "start_s",
    "end_s",
    "start_sample",
    "end_sample",
    "start_bar",
    "start_beat",
    "end_bar",
    "end_beat",
    "worst_cents",
    "mean_cents",
    "tolerance_cents",
    "reference",
    "reference_hz",
    "drift_cents_per_s",
    "drift_sd",
    "vibrato_hz",
    "vibrato_extent_cents",
    "measured_share",
    "outside_s",
    "reason",
    "comment",
];

/// All of it.
pub(super) fn text(job: &Job) -> io::Result<String> {
    let mut rows = csv::Writer::from_writer(Vec::new());
    rows.write_record(HEAD)?;
    for result in &job.results {
        rows.write_record(whole(result))?;
        for span in &result.spans {
            let mut row = row("outside", result.number, &span.extent);
            row.extend([span.worst_cents.to_string(), span.mean_cents.to_string()]);
            row.resize(HEAD.len(), String::new());
            rows.write_record(row)?;
        }
    }
    let bytes = rows.into_inner().map_err(|error| error.into_error())?;
    String::from_utf8(bytes).map_err(io::Error::other)
}

fn whole(result: &CheckResult) -> Vec<String> {
    let mut row = row("check", result.number, &result.extent);
    result.verdict.name().clone_into(&mut row[2]);
    row.extend([
        number(result.worst_cents),
        number(result.mean_cents),
        result.tolerance_cents.to_string(),
        result.reference.clone(),
        number(result.reference_hz),
        number(result.drift_cents_per_s),
        number(result.drift_sd),
        number(result.vibrato_hz),
        number(result.vibrato_extent_cents),
        number(result.measured_share),
        result.outside_s.to_string(),
        result.reason.clone().unwrap_or_default(),
        result.comment.clone(),
    ]);
    row
}

fn row(kind: &str, result: u64, extent: &Extent) -> Vec<String> {
    vec![
        kind.to_owned(),
        result.to_string(),
        String::new(),
        extent.start_s.to_string(),
        extent.end_s.to_string(),
        extent.start_sample.to_string(),
        extent.end_sample.to_string(),
        number(extent.start_bar),
        number(extent.start_beat),
        number(extent.end_bar),
        number(extent.end_beat),
    ]
}

fn number(value: Option<impl ToString>) -> String {
    value.map_or_else(String::new, |value| value.to_string())
}
