//! The JUnit XML report of a batch: one test case per file, failed when outside, in error when not measured.

use super::record::{DriftRecord, VerdictWord};
use super::table;
use crate::measure::Measured;
use crate::output::{new_file_for, publish};
use anyhow::{Context as _, Result};
use quick_junit::{NonSuccessKind, Report, TestCase, TestCaseStatus, TestSuite};
use std::io::Write as _;
use std::path::{Path, PathBuf};
use tempfile::NamedTempFile;

/// A report in the making, beside its place.
pub(super) struct Junit {
    file: NamedTempFile,
    place: PathBuf,
    suite: TestSuite,
}

impl Junit {
    /// # Errors
    /// The place cannot be written to.
    pub(super) fn new(place: &Path) -> Result<Self> {
        let (file, place) = (new_file_for(place)?, place.to_owned());
        Ok(Self { file, place, suite: TestSuite::new("pitch drift") })
    }

    /// Takes in the result of the next file.
    pub(super) fn add(&mut self, path: &Path, result: &Result<Measured>) {
        let error = |message: String| {
            let mut status = TestCaseStatus::non_success(NonSuccessKind::Error);
            status.set_message(message);
            status
        };
        let checked = match result {
            Ok(measured) => measured.checked.as_ref(),
            Err(_) => None,
        };
        let status = match (result, checked) {
            (Err(why), _) => error(format!("{why:#}")),
            (Ok(_), Some(record)) => match record.verdict {
                VerdictWord::Within => TestCaseStatus::success(),
                VerdictWord::Outside => failure(record),
                VerdictWord::Unmeasured => {
                    error(format!("unmeasured: {}", record.reason.as_deref().unwrap_or_default()))
                }
            },
            (Ok(_), None) => error("was not checked".to_owned()),
        };
        let mut case = TestCase::new(path.to_string_lossy().into_owned(), status);
        case.set_classname("plumbtone.drift");
        if let Some(record) = checked {
            case.set_system_out(table::figures(record));
        }
        self.suite.add_test_case(case);
    }

    /// Puts the report in its place.
    ///
    /// # Errors
    /// It cannot be written.
    pub(super) fn publish(mut self) -> Result<()> {
        let mut report = Report::new("plumbtone drift");
        report.add_test_suite(self.suite);
        let text = report.to_string().context("cannot be written as XML")?;
        self.file
            .write_all(text.as_bytes())
            .with_context(|| format!("cannot write {}", self.place.display()))?;
        publish(self.file, &self.place)
    }
}

fn failure(record: &DriftRecord) -> TestCaseStatus {
    let mut status = TestCaseStatus::non_success(NonSuccessKind::Failure);
    status.set_message(table::verdict(record)).set_description(table::spans(record));
    status
}
