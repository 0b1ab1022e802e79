//! Reports: results as CSV, JSON and a page, in three files of one name that holds the time. The same results give the same
//! bytes but for that time.

mod csv;
mod json;
mod page;

use super::result::CheckResult;
use crate::report_files::Place;

/// What every report says of itself.
pub(crate) const CAUTION: &str =
    "A pitch check is a measurement aid; acceptance limits are the session's own.";

/// A report to be written.
#[derive(Debug, Clone)]
pub(crate) struct Job {
    pub(super) place: Place,
    pub(super) results: Vec<CheckResult>,
}

/// Writes a report. Gives where it is, without endings.
///
/// # Errors
/// In a sentence, why there is none.
pub(crate) fn write(job: &Job) -> Result<String, String> {
    if job.results.is_empty() {
        return Err("there are no results".to_owned());
    }
    job.place.write(|| {
        Ok(vec![("csv", csv::text(job)?), ("json", json::text(job)?), ("svg", page::text(job))])
    })
}

#[cfg(test)]
mod tests {
    use std::path::Path;
    use std::{fs, io};

    use time::OffsetDateTime;

    use super::super::fixtures::result;
    use super::*;

    fn job(folder: &Path, name: &str) -> Job {
        let commented = CheckResult {
            number: 2,
            comment: "flat, \"again\" <here> & there".to_owned(),
            ..result(12.0, 15.0)
        };
        let place = Place::new(folder.display().to_string(), name.to_owned());
        Job { place, results: vec![result(1.0, 4.0), commented] }
    }

    fn files(folder: &Path) -> Vec<String> {
        let entry = |entry: io::Result<fs::DirEntry>| entry.unwrap().file_name();
        let mut names: Vec<String> = fs::read_dir(folder)
            .unwrap()
            .map(|e| entry(e).to_string_lossy().into_owned())
            .collect();
        names.sort();
        names
    }

    #[test]
    fn a_report_never_takes_another_files_place() {
        let folder = tempfile::tempdir().unwrap();
        let mut job = job(folder.path(), "Bass / take: 2");
        job.place.time = OffsetDateTime::UNIX_EPOCH;
        let first = write(&job).unwrap();
        assert!(first.ends_with("Bass _ take_ 2 1970-01-01 00-00-00"), "{first}");
        let csv = fs::read(format!("{first}.csv")).unwrap();
        fs::remove_file(format!("{first}.json")).unwrap();
        let second = write(&job).unwrap();
        assert_eq!(second, format!("{first} 2"), "the name is taken while one file has it");
        assert_eq!(fs::read(format!("{first}.csv")).unwrap(), csv, "the first one is as it was");
        assert_eq!(files(folder.path()).len(), 5, "{:?}", files(folder.path()));
    }

    #[test]
    fn only_the_time_differs_from_report_to_report() {
        let folder = tempfile::tempdir().unwrap();
        let mut job = job(folder.path(), "");
        let texts = |job: &Job| {
            [csv::text(job).unwrap(), json::text(job).unwrap(), page::text(job)]
                .map(|text| text.replace(&job.place.stamp(), "TIME"))
        };
        let first = texts(&job);
        job.place.time = OffsetDateTime::UNIX_EPOCH;
        assert_eq!(texts(&job), first);
    }

    #[test]
    fn what_stands_in_the_way_is_said_and_leaves_nothing() {
        let folder = tempfile::tempdir().unwrap();
        let missing = folder.path().join("gone");
        let empty = Job { results: Vec::new(), ..job(folder.path(), "") };
        for (job, why) in [
            (job(&missing, ""), "is not there"),
            (job(Path::new(""), ""), "no folder"),
            (job(Path::new("reports"), ""), "whole path"),
            (empty, "no results"),
        ] {
            let found = write(&job).unwrap_err();
            assert!(found.contains(why), "{found}, not {why}");
        }
        assert_eq!(files(folder.path()), Vec::<String>::new());
    }

    #[test]
    fn every_number_and_word_is_in_the_files() {
        let folder = tempfile::tempdir().unwrap();
        let job = job(folder.path(), "Bass");
        let json: serde_json::Value = serde_json::from_str(&json::text(&job).unwrap()).unwrap();
        let results: Vec<CheckResult> = serde_json::from_value(json["results"].clone()).unwrap();
        assert_eq!(results, job.results, "the JSON holds all of them");
        assert_eq!(json["name"], "Bass");
        let csv = csv::text(&job).unwrap();
        // Two checks with a span each, below a head.
        assert_eq!(csv.lines().count(), 5, "{csv}");
        assert!(csv.contains("\"flat, \"\"again\"\" <here> & there\""), "{csv}");
        let page = page::text(&job);
        let words =
            ["&lt;here&gt; &amp; there", "outside, +7.1 ct", "no pitch", "1|2.33", "2|1", CAUTION];
        for word in words {
            assert!(page.contains(word), "{word} in {page}");
        }
        let curves = |job: &Job| page::text(job).matches("stroke-linejoin").count();
        assert_eq!(curves(&job), 4, "each check's curve, with the pause in it");
        let mut without = job.clone();
        without.results.iter_mut().for_each(|result| result.curve = None);
        assert_eq!(curves(&without), 0, "results that have lost theirs");
    }
}
