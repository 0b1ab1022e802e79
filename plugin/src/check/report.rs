//! Reports: results as CSV, JSON and a page, written into a folder of the user's choosing.
//!
//! Three files of one name that holds the time; whole or not at all, and never over another file. The same results give
//! the same bytes but for that time.

mod csv;
mod json;
mod page;

use std::io::{self, Write as _};
use std::path::{Path, PathBuf};
use std::time::SystemTime;

use tempfile::NamedTempFile;
use time::OffsetDateTime;

use super::result::CheckResult;
use super::results::Reports;

/// What every report says of itself.
pub(crate) const CAUTION: &str =
    "A pitch check is a measurement aid; acceptance limits are the session's own.";
/// What a name begins with when none is set, and its most characters.
const NAME: &str = "Plumbtone";
const NAME_MAX: usize = 80;
/// Most reports of one name and second.
const TRIES: u32 = 1000;

/// A report to be written.
#[derive(Debug, Clone)]
pub(crate) struct Job {
    reports: Reports,
    results: Vec<CheckResult>,
    time: OffsetDateTime,
}

impl Job {
    /// A report of these results, written now.
    pub(crate) fn new(reports: Reports, results: Vec<CheckResult>) -> Self {
        Self { reports, results, time: OffsetDateTime::from(SystemTime::now()) }
    }

    /// The time in UTC; `gap` stands between its parts.
    fn time(&self, (dash, gap, colon): (char, char, char)) -> String {
        let t = self.time;
        format!(
            "{:04}{dash}{:02}{dash}{:02}{gap}{:02}{colon}{:02}{colon}{:02}",
            t.year(),
            u8::from(t.month()),
            t.day(),
            t.hour(),
            t.minute(),
            t.second()
        )
    }

    /// The time as a report says it.
    fn stamp(&self) -> String {
        format!("{}Z", self.time(('-', 'T', ':')))
    }

    /// What the report is called.
    fn title(&self) -> &str {
        let name = self.reports.name.trim();
        if name.is_empty() { NAME } else { name }
    }

    /// The name of its files, without their endings.
    fn stem(&self) -> String {
        let allowed = |c: char| !c.is_control() && !"/\\:*?\"<>|".contains(c);
        let clean: String =
            self.title().chars().map(|c| if allowed(c) { c } else { '_' }).take(NAME_MAX).collect();
        // A name that begins with a dot would be hidden.
        format!("{} {}", clean.trim_start_matches('.').trim(), self.time(('-', ' ', '-')))
    }
}

/// Writes a report. Gives where it is, without endings.
///
/// # Errors
/// In a sentence, why there is none.
pub(crate) fn write(job: &Job) -> Result<String, String> {
    let folder = Path::new(job.reports.folder.trim());
    if folder.as_os_str().is_empty() {
        return Err("no folder is set".to_owned());
    }
    if !folder.is_absolute() {
        return Err(format!("{} is not a whole path", folder.display()));
    }
    if !folder.is_dir() {
        return Err(format!("the folder {} is not there", folder.display()));
    }
    if job.results.is_empty() {
        return Err("there are no results".to_owned());
    }
    place(job, folder).map_err(|error| format!("{}: {error}", folder.display()))
}

fn place(job: &Job, folder: &Path) -> io::Result<String> {
    let contents = [("csv", csv::text(job)?), ("json", json::text(job)?), ("svg", page::text(job))];
    let stem = job.stem();
    for number in 1..=TRIES {
        let name = if number == 1 { stem.clone() } else { format!("{stem} {number}") };
        if publish(folder, &name, &contents)? {
            return Ok(folder.join(name).display().to_string());
        }
    }
    Err(io::Error::from(io::ErrorKind::AlreadyExists))
}

/// Writes all files of a name; false when one of them is there already.
fn publish(folder: &Path, name: &str, contents: &[(&str, String)]) -> io::Result<bool> {
    let mut ready = Vec::new();
    for (ending, text) in contents {
        let place = folder.join(format!("{name}.{ending}"));
        if place.try_exists()? {
            return Ok(false);
        }
        let mut file = new_file(folder)?;
        file.write_all(text.as_bytes())?;
        file.as_file().sync_all()?;
        ready.push((file, place));
    }
    let mut done: Vec<PathBuf> = Vec::new();
    for (file, place) in ready {
        match file.persist_noclobber(&place) {
            Ok(_) => done.push(place),
            Err(error) => {
                // Somebody else took the name just now, or the folder is gone: no part of a report is left behind.
                for place in done {
                    std::fs::remove_file(place)?;
                }
                let taken = error.error.kind() == io::ErrorKind::AlreadyExists;
                return if taken { Ok(false) } else { Err(error.error) };
            }
        }
    }
    Ok(true)
}

fn new_file(folder: &Path) -> io::Result<NamedTempFile> {
    let mut builder = tempfile::Builder::new();
    #[cfg(unix)]
    {
        // The same rights as any new file, less the user's mask, instead of those of a secret.
        use std::os::unix::fs::PermissionsExt as _;
        builder.permissions(std::fs::Permissions::from_mode(0o666));
    }
    builder.prefix(".plumbtone-").tempfile_in(folder)
}

#[cfg(test)]
mod tests {
    use std::fs;

    use super::super::fixtures::result;
    use super::*;

    fn job(folder: &Path, name: &str) -> Job {
        let reports = Reports {
            automatic: false,
            folder: folder.display().to_string(),
            name: name.to_owned(),
        };
        let commented = CheckResult {
            number: 2,
            comment: "flat, \"again\" <here> & there".to_owned(),
            ..result(12.0, 15.0)
        };
        Job::new(reports, vec![result(1.0, 4.0), commented])
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
        job.time = OffsetDateTime::UNIX_EPOCH;
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
                .map(|text| text.replace(&job.stamp(), "TIME"))
        };
        let first = texts(&job);
        job.time = OffsetDateTime::UNIX_EPOCH;
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
